"""What the year found, as plain records.

A *hot spot* is a connected region of a receiver over a criterion at one instant. An *episode* is
a hot spot followed through a day. A *season* is one episode as it comes back day after day: the
form in which people ask about it ("19 February to 21 March, and again in autumn, 14:10 to
14:50").
"""

from __future__ import annotations

from dataclasses import dataclass, field
from datetime import date

import numpy as np


@dataclass(frozen=True, kw_only=True)
class HotSpot:
    """A connected region over a criterion at one instant."""

    time: np.datetime64  # UTC, s
    area: float  # m²
    peak: float  # of the criterion's quantity, W/m²
    reflected: float  # W/m² at the same point
    place: tuple[float, float, float]  # of the peak, model coordinates [m]
    centre: tuple[float, float, float]  # middle of the region, model coordinates [m]
    point: int  # number of the receiver point of the peak


@dataclass(frozen=True, kw_only=True)
class Contributor:
    """A panel behind an episode."""

    panel: int
    surface: str
    load: float  # W/m² at the peak
    share: float  # of the reflected peak, [0, 1]
    place: tuple[float, float, float]  # middle of the panel, model coordinates [m]


@dataclass(frozen=True, kw_only=True)
class PeakCheck:
    """A peak looked at closely: finer in space and time, and counted with random rays."""

    time: np.datetime64  # UTC, to the minute
    place: tuple[float, float, float]  # model coordinates [m]
    normal: tuple[float, float, float]  # lit side of the receiver there
    sun_azimuth: float  # degrees
    sun_elevation: float  # degrees
    beam: float  # W/m²
    reflected: float  # W/m² at the sharpest point
    total: float  # W/m²: reflected, direct and diffuse
    images: int
    width: float  # m, across the region over half the peak
    disc_radius: float  # m, of the spot that was counted
    disc_mean: float  # W/m² over that spot by tubes
    count_mean: float  # W/m² over that spot by random rays
    count_error: float  # W/m², standard error of the count
    rays: int
    agrees: bool  # within three standard errors
    reflected_low: float | None = None  # W/m², with the least reflectance that data leave open
    reflected_high: float | None = None  # W/m², with the largest


@dataclass(frozen=True, kw_only=True)
class Episode:
    """A hot spot followed through a day."""

    number: int  # stable within a result folder, from 1, worst first
    criterion: str
    protects: str
    receiver: str
    day: date  # local date
    mirror_day: date | None  # the other date with the same geometry, if it is not a day of its own
    days: float  # calendar days that this day stands for
    start: np.datetime64  # UTC
    end: np.datetime64  # UTC, end of the last step over the limit
    minutes: float
    limit: float  # of the criterion's quantity, W/m²
    peak: float  # largest value of the criterion's quantity on the grid, W/m²
    reflected: float  # W/m²
    peak_time: np.datetime64  # UTC
    area: float  # m², largest at one instant
    path: tuple[HotSpot, ...]
    check: PeakCheck | None = None
    contributors: tuple[Contributor, ...] = ()
    season: int = 0  # number of its season, 0 for none


@dataclass(frozen=True, kw_only=True)
class Season:
    """An episode as it comes back through the year."""

    number: int
    criterion: str
    protects: str
    receiver: str
    spans: tuple[tuple[date, date], ...]  # first and last day of each run of days
    days: float  # calendar days with it
    clock: tuple[str, str]  # earliest start and latest end, local clock time "HH:MM"
    minutes_per_day: float  # longest
    minutes_per_year: float
    peak: float  # W/m²
    worst: int  # number of its worst episode
    episodes: tuple[int, ...] = field(default=())
