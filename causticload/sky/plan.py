"""A year as a set of representative days.

The sun's track depends on its declination, which passes each value twice a year: once rising from
the December solstice to the June solstice, once falling. A representative day is a date of the
rising half with its mirror date of the falling half, the one nearest in declination. Light is
followed once, along the track of the first date, for both; what differs between the two is the
clock (equation of time), the distance of the sun, the beam and the air.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date, datetime

import numpy as np
from numpy.typing import NDArray

from causticload.errors import InputError
from causticload.sky.calendar import Times, time_zone
from causticload.sky.position import geocentric_sun
from causticload.sky.source import Sky
from causticload.study.model import Site, YearSpec

__all__ = ["DayPlan", "plan_year"]

Floats = NDArray[np.float64]
Rows = NDArray[np.int64]

DAY_US = 86_400_000_000
# Refraction shows the sun 0.6° before it rises; the rest is what a day adds to its declination.
TWILIGHT_RAD = np.radians(1.5)


@dataclass(frozen=True, kw_only=True)
class DayPlan:
    """One representative day: ``n`` steps of one track of the sun, on ``d`` = 1 or 2 dates.

    Parameters
    ----------
    index : int
        Number of the day in the plan, by rising declination of the first date.
    dates : tuple of datetime.date
        Local dates, one or two. The track is that of the first.
    weights : (d,) float
        Calendar days that each date stands for. Over a plan they sum to the days of the year.
    azimuth_rad : (n,) float
        Clockwise from true north, at the middle of each step on the first date. [rad]
    elevation_rad : (n,) float
        Apparent elevation there, > 0. [rad]
    radius_rad : (d, n) float
        Angular radius of the sun. [rad]
    times : (d, n) datetime64[s]
        Middle of each step, UTC: the time when the sun has the same hour angle on each date.
    beam : (d, n) float
        On a plane that faces the sun, from each date's own elevation. [W/m²]
    diffuse : (d, n) float
        From the sky, on the ground. [W/m²]
    temperature_c : (d, n) float
        Air temperature. [°C]
    wind_ms : (d, n) float
        Wind speed. [m/s]
    step_s : float
        Length of a step of true solar time; clock time differs by less than 0.1 %. [s]
    declination_deg : (d,) float
        Declination of the sun at solar noon on each date. [degrees]
    capped : (d, n) bool
        Steps in an hour of the weather file whose beam was cut to what a clear sky lets through.
    """

    index: int
    dates: tuple[date, ...]
    weights: Floats
    azimuth_rad: Floats
    elevation_rad: Floats
    radius_rad: Floats
    times: Times
    beam: Floats
    diffuse: Floats
    temperature_c: Floats
    wind_ms: Floats
    step_s: float
    declination_deg: Floats
    capped: NDArray[np.bool_]

    @property
    def declination_mismatch_deg(self) -> float:
        """How far the second date's declination lies from that of the track; 0 with one date."""
        return float(self.declination_deg[-1] - self.declination_deg[0])


def plan_year(site: Site, year_spec: YearSpec, sky: Sky) -> tuple[DayPlan, ...]:
    """Representative days of a year, with their steps.

    Every ``day_stride``-th date of the rising half of the year is taken, in the middle of its
    stretch, with its mirror date. A falling date that is the nearest of two rising ones goes to
    the nearer. Each date of the year counts for the representative of its own half that is nearest
    in declination. Between two neighbouring representatives the declination moves by up to 0.4
    degrees times the stride, around the equinoxes; a date and its mirror differ by up to half of
    0.4 degrees.

    A day is cut into steps of true solar time that tile it from solar midnight to solar midnight;
    those are kept at whose middle the sun's centre is above the horizon on the first date.

    Parameters
    ----------
    site : causticload.study.model.Site
        Where the model stands; that of the sky.
    year_spec : causticload.study.model.YearSpec
        Calendar year, step and stride.
    sky : Sky
        What shines there.

    Returns
    -------
    plan : tuple of DayPlan
        By rising declination. A day on which the sun stays down has no steps.

    Raises
    ------
    InputError
        If the step does not divide the day, the stride is out of its range, the year is outside
        1900 to 2200, or the sky belongs to another site.
    """
    step, stride, year = year_spec.step_minutes, year_spec.day_stride, year_spec.year
    if step < 1 or 1440 % step:
        raise InputError(
            f"step_minutes must divide the day's 1440 minutes, got {step!r}", hint="Use 5 or 10."
        )
    if not 1 <= stride <= 60:
        raise InputError(f"day_stride must be from 1 to 60, got {stride!r}")
    if not 1900 <= year <= 2200:
        raise InputError(f"year must be from 1900 to 2200, got {year!r}")
    if sky.site != site:
        raise InputError("the sky belongs to another site than the plan")

    noons = _solar_noons(site, year)
    declination, _ = geocentric_sun(noons, longitude_deg=site.longitude)
    pairs, weights = _representatives(declination, stride)
    begin = date(year, 1, 1).toordinal()
    middles = (np.arange(1440 // step) + 0.5) * np.radians(step / 4.0) - np.pi  # hour angles

    # All days at once: the sun's position is quick in long arrays only.
    head = np.array([rows[0] for rows in pairs])
    mirror = np.array([rows[1] if len(rows) == 2 else -1 for rows in pairs])
    day, angle = _near_day(site, declination[head], middles)
    first = sky.at(_times_of(site, noons[head[day]], angle))
    up = first.elevation_rad > 0.0
    first, day, angle = first.chosen(up), day[up], angle[up]
    paired = mirror[day] >= 0
    second = sky.at(_times_of(site, noons[mirror[day[paired]]], angle[paired]))

    days = []
    for index, rows in enumerate(pairs):
        states = [first.chosen(day == index)]
        if len(rows) == 2:
            states.append(second.chosen(day[paired] == index))
        days.append(
            DayPlan(
                index=index,
                dates=tuple(date.fromordinal(begin + row) for row in rows),
                weights=weights[list(rows)],
                azimuth_rad=states[0].azimuth_rad,
                elevation_rad=states[0].elevation_rad,
                radius_rad=np.stack([s.radius_rad for s in states]),
                times=np.stack([s.times.astype("datetime64[s]") for s in states]),
                beam=np.stack([s.beam for s in states]),
                diffuse=np.stack([s.diffuse for s in states]),
                temperature_c=np.stack([s.temperature_c for s in states]),
                wind_ms=np.stack([s.wind_ms for s in states]),
                capped=np.stack([s.capped for s in states]),
                step_s=step * 60.0,
                declination_deg=np.degrees(declination[list(rows)]),
            )
        )
    return tuple(days)


def _near_day(site: Site, declination: Floats, middles: Floats) -> tuple[Rows, Floats]:
    """Steps on which the sun may be up, as number of the day and hour angle.

    A generous choice by spherical trigonometry; the exact sun decides later.
    """
    latitude = np.radians(site.latitude)
    sine = np.sin(latitude) * np.sin(declination)[:, None] + np.cos(latitude) * np.cos(declination)[
        :, None
    ] * np.cos(middles)
    day, step = np.nonzero(sine > -np.sin(TWILIGHT_RAD))
    return day, middles[step]


def _solar_noons(site: Site, year: int) -> Times:
    """Time of solar noon, UTC, on each date of the year, (365 or 366,)."""
    dates = np.arange(f"{year}-01-01", f"{year + 1}-01-01", dtype="datetime64[D]")
    # Mean solar noon, plus the whole days that put it on the date of the local clock.
    mean = 12.0 - site.longitude / 15.0
    offset = datetime(year, 1, 1, 12, tzinfo=time_zone(site.timezone)).utcoffset()
    clock = mean + (offset.total_seconds() / 3600.0 if offset is not None else 0.0)
    days_on = np.timedelta64(round((mean / 24.0 - clock // 24.0) * DAY_US), "us")
    noon = np.add(dates.astype("datetime64[us]"), days_on)
    return _at_hour_angle(noon, np.zeros(len(noon)), site.longitude)


def _times_of(site: Site, noon: Times, hour_angles: Floats) -> Times:
    """Times, to the second, at which the sun has these hour angles on the days of solar noons."""
    after_noon = np.round(hour_angles / (2.0 * np.pi) * DAY_US).astype("timedelta64[us]")
    guess: Times = noon + after_noon
    exact = _at_hour_angle(guess, hour_angles, site.longitude)
    return (exact + np.timedelta64(500_000, "us")).astype("datetime64[s]")


def _at_hour_angle(guess: Times, hour_angles: Floats, longitude_deg: float) -> Times:
    """Move times by less than half a day to where the sun has the given hour angles.

    One step is enough: a solar day differs from 24 hours by at most 30 s, so half an hour of
    equation of time leaves an error below 1 s, and a step within a day far less.
    """
    _, now = geocentric_sun(guess, longitude_deg=longitude_deg)
    short = (hour_angles - now + np.pi) % (2.0 * np.pi) - np.pi
    return guess + np.round(short / (2.0 * np.pi) * DAY_US).astype("timedelta64[us]")


def _representatives(declination: Floats, stride: int) -> tuple[list[tuple[int, ...]], Floats]:
    """Pairs of days of the year, rising then falling, and the days that each stands for.

    Parameters
    ----------
    declination : (365 or 366,) float
        At solar noon of each date. [rad]
    stride : int
        Dates of the rising half for one representative.

    Returns
    -------
    pairs : list of tuple of int
        Days of the year counted from 0: a rising date and, mostly, its falling mirror date.
    weights : (365 or 366,) float
        Days that each date stands for; zero for dates that represent none.
    """
    june, december = int(np.argmax(declination)), int(np.argmin(declination))
    day = np.arange(len(declination))
    falling = (day >= june) & (day < december)
    rising, falls = day[~falling], day[falling]
    rising = rising[np.argsort(declination[rising])]

    heads = _middles_of_stretches(rising, stride)
    mirrors: dict[int, int] = {}  # falling date: its rising one
    for r in heads:
        gap = np.abs(declination[falls] - declination[r])
        f = int(falls[np.argmin(gap)])
        if f not in mirrors or gap.min() < abs(declination[f] - declination[mirrors[f]]):
            mirrors[f] = r
    mirror_of = {r: f for f, r in mirrors.items()}

    weights = np.zeros(len(declination))
    for half, chosen in ((rising, np.array(heads)), (falls, np.array(list(mirrors)))):
        nearest = np.abs(declination[half][:, None] - declination[chosen]).argmin(axis=1)
        np.add.at(weights, chosen[nearest], 1.0)
    return [(r, mirror_of[r]) if r in mirror_of else (r,) for r in heads], weights


def _middles_of_stretches(days: Rows, stride: int) -> list[int]:
    """The middle one of each stretch of days; the last stretch may be shorter."""
    starts = range(0, len(days), stride)
    return [int(days[(i + min(i + stride, len(days)) - 1) // 2]) for i in starts]
