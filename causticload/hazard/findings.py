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


@dataclass(frozen=True, kw_only=True)
class Confidence:
    """How far a finding can be relied on, with the reasons."""

    grade: str  # "firm", "fair" or "weak"
    reasons: tuple[str, ...]


@dataclass(frozen=True, kw_only=True)
class LeastPanels:
    """The fewest panels without which a peak is under its limit."""

    panels: tuple[int, ...]  # strongest first; all of them where that is not enough
    reflected_left: float  # W/m² without them
    enough: bool  # whether the peak is then under the limit
    reflectance_factor: float | None  # of all contributors, that does it too; None if none does
    text: str


@dataclass(frozen=True, kw_only=True)
class SkinFinding:
    """What a person takes in at a peak."""

    absorbed_share: float
    pain_dose: float  # of a person who stands there all day, 1 is pain
    burn_dose: float  # 1 is a second-degree burn
    seconds_to_pain: float | None  # at the peak's load, if it lasted; None: no pain by the law
    walking_speed: float  # m/s
    walking_pain_dose: float  # of a person who walks straight through at the peak's moment
    in_range: bool  # of the laws
    text: str


@dataclass(frozen=True, kw_only=True)
class SurfaceFinding:
    """How hot a surface gets at a peak on the day of its worst episode."""

    material: str
    absorptance: float
    peak_c: float  # °C
    peak_without_c: float  # °C, by sun and sky alone
    limit_c: float | None  # °C, lowest that the table gives
    limit_kind: str
    minutes_over: float
    contact_seconds: float | None  # touch that burns; None: longer than ten minutes or unknown
    text: str


@dataclass(frozen=True, kw_only=True)
class Finding:
    """A season looked at closely: what its worst peak does, and what would cure it."""

    season: int
    confidence: Confidence
    least_panels: LeastPanels
    skin: SkinFinding | None
    surface: SurfaceFinding | None


@dataclass(frozen=True, kw_only=True)
class Sight:
    """What an eye sees of the reflected sun at one moment: its worst bright area."""

    time: np.datetime64  # UTC
    place: tuple[float, float, float]  # of the eye, model coordinates [m]
    images: int  # separate bright areas in view
    subtense_mrad: float
    corneal: float  # W/m²
    retinal: float  # W/m²
    after_image_limit: float  # W/m² on the retina
    burn_limit: float  # W/m² on the retina
    eye_class: int  # 0 low, 1 after-image, 2 burn
    illuminance: float  # lx, all areas, normal to each
    veil: float  # cd/m²
    rogue_veil: float  # cd/m², by 10 E/theta² alone
    contrast_left: float  # share, against a sunlit street of 5,000 cd/m²
    angle_deg: float  # from the line of sight
    azimuth_deg: float  # of the bright area as seen, clockwise from true north
    elevation_deg: float


@dataclass(frozen=True, kw_only=True)
class ObserverFinding:
    """What an observer meets in the year."""

    name: str
    points: int
    age: float
    after_image_days: float  # calendar days
    after_image_minutes: float  # in the year, at the eye's own place or anywhere on its path
    after_image_most: float  # minutes on the worst day
    worst_day: date | None
    burn_minutes: float  # in the year
    rogue_minutes: float  # in the year
    spans: tuple[tuple[date, date], ...]
    clock: tuple[str, str] | None
    daily: tuple[tuple[date, float, float], ...]  # day, days it stands for, after-image minutes
    worst: Sight | None
