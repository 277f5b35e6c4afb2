"""Dates, hours and figures as people read them: one place for all of them."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import UTC, date, datetime
from zoneinfo import ZoneInfo

import numpy as np

from causticload.hazard.findings import Season

MONTHS = (
    "January",
    "February",
    "March",
    "April",
    "May",
    "June",
    "July",
    "August",
    "September",
    "October",
    "November",
    "December",
)
WHOLE_YEAR = 364.0  # days; one more or less is the calendar's
NO_EXCEEDANCE = "No exceedance found under these assumptions."


def local(time: np.datetime64, zone: str) -> datetime:
    """Local clock time of a UTC time.

    Parameters
    ----------
    time : datetime64
        UTC.
    zone : str
        IANA time zone.

    Returns
    -------
    local : datetime
        With its offset.
    """
    seconds = int(time.astype("datetime64[s]").astype(np.int64))
    return datetime.fromtimestamp(seconds, UTC).astimezone(ZoneInfo(zone))


def moment(time: np.datetime64, zone: str) -> str:
    """Write a time as local clock time with its offset: ``2026-06-21 13:30 +01:00``.

    Parameters
    ----------
    time : datetime64
        UTC.
    zone : str
        IANA time zone.

    Returns
    -------
    text : str
        Empty for no time.
    """
    if np.isnat(time):
        return ""
    t = local(time, zone)
    offset = t.strftime("%z")
    return f"{t:%Y-%m-%d %H:%M} {offset[:3]}:{offset[3:]}"


def day(d: date) -> str:
    """Write a date without its year: ``19 February``.

    Parameters
    ----------
    d : date
        The date.

    Returns
    -------
    text : str
        Day and month.
    """
    return f"{d.day} {MONTHS[d.month - 1]}"


def span(first: date, last: date) -> str:
    """Write a run of days: ``19 February to 21 March``.

    Parameters
    ----------
    first, last : date
        Its ends.

    Returns
    -------
    text : str
        One date if they are the same.
    """
    return day(first) if first == last else f"{day(first)} to {day(last)}"


def spans(season: Season) -> str:
    """Write all runs of days of a season.

    Parameters
    ----------
    season : Season
        The season.

    Returns
    -------
    text : str
        Runs joined by "and".
    """
    return runs(season.spans, season.days)


def runs(found: Sequence[tuple[date, date]], days: float) -> str:
    """Write runs of days: ``19 February to 21 March and 4 August to 2 September``.

    Parameters
    ----------
    found : sequence of (date, date)
        First and last day of each run.
    days : float
        Calendar days in all.

    Returns
    -------
    text : str
        "all year" where no day is left out.
    """
    if days >= WHOLE_YEAR:
        return "all year"
    return " and ".join(span(a, b) for a, b in found)


def load(value: float) -> str:
    """Write a load: rounded to 10 W/m² from 200 W/m² on.

    Parameters
    ----------
    value : float
        Load. [W/m²]

    Returns
    -------
    text : str
        With its unit.
    """
    rounded = round(value, -1) if value >= 200.0 else round(value)
    return f"{rounded:,.0f} W/m²"


def length(value: float) -> str:
    """Write minutes: ``45 min`` or ``3 h 10 min``.

    Parameters
    ----------
    value : float
        Time. [min]

    Returns
    -------
    text : str
        Whole minutes.
    """
    minutes = round(value)
    if minutes < 120:
        return f"{minutes} min"
    return f"{minutes // 60} h {minutes % 60:02d} min" if minutes % 60 else f"{minutes // 60} h"


def place(point: tuple[float, float, float]) -> str:
    """Write a place in model coordinates.

    Parameters
    ----------
    point : tuple of float
        x, y, z. [m]

    Returns
    -------
    text : str
        To a decimetre.
    """
    return f"({point[0]:.1f}, {point[1]:.1f}, {point[2]:.1f})"
