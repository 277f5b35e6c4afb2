"""Times: from what people write to UTC and back.

Inside the program a time is a ``numpy.datetime64`` in UTC. Local clock times exist at the edges
only, always with their offset from UTC.
"""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from typing import Any
from zoneinfo import ZoneInfo

import numpy as np
from numpy.typing import NDArray

from causticload.errors import InputError

__all__ = ["Times", "format_local", "parse_local", "time_zone", "utc_times"]

Times = NDArray[np.datetime64]

CLOCK_HINT = "Write it like 2026-06-21T13:30, or with its offset: 2026-06-21T13:30+01:00."


def time_zone(name: str) -> ZoneInfo:
    """Time zone of an IANA name.

    Parameters
    ----------
    name : str
        Name such as ``Europe/London``.

    Returns
    -------
    zone : zoneinfo.ZoneInfo
        The zone.

    Raises
    ------
    InputError
        If there is no such zone.
    """
    try:
        return ZoneInfo(name)
    except (KeyError, ValueError, OSError) as err:  # OSError: a folder such as "Europe"
        raise InputError(
            f"there is no time zone {name!r}",
            hint="Use an IANA name such as Europe/London or America/New_York.",
        ) from err


def parse_local(text: str, zone: str) -> np.datetime64:
    """Read a local clock time, or a time with an offset, as UTC.

    Parameters
    ----------
    text : str
        ISO 8601 date and time. Without an offset it is the clock of `zone`.
    zone : str
        IANA name of the site's time zone.

    Returns
    -------
    utc : numpy.datetime64
        UTC, to the second.

    Raises
    ------
    InputError
        If the text is no date and time, or if the clock never shows it or shows it twice on
        that day because daylight saving begins or ends. The hint gives the two readings.
    """
    where = time_zone(zone)
    try:
        clock = datetime.fromisoformat(text.strip())
    except ValueError as err:
        raise InputError(f"{text!r} is not a date and time", hint=CLOCK_HINT) from err
    if len(text.strip()) <= len("2026-06-21") and clock.time() == datetime.min.time():
        raise InputError(f"{text!r} has no time of day", hint=CLOCK_HINT)
    if clock.tzinfo is not None:
        return _as_seconds(clock)
    readings = [clock.replace(tzinfo=where, fold=fold).astimezone(UTC) for fold in (0, 1)]
    if readings[0] == readings[1]:
        return _as_seconds(readings[0])
    # The two folds differ only around a jump of the clock. In a gap neither comes back unchanged.
    shown = [r.astimezone(where) for r in readings]
    happens = any(s.replace(tzinfo=None, fold=0) == clock for s in shown)
    fault = "happens twice" if happens else "does not exist"
    first, second = (s.isoformat(timespec="minutes") for s in shown)
    raise InputError(
        f"the local time {text.strip()} {fault} in {zone}: daylight saving moves the clock then",
        hint=f"Write {first} or {second}.",
    )


def _as_seconds(moment: datetime) -> np.datetime64:
    return np.datetime64(moment.astimezone(UTC).replace(tzinfo=None), "s")


def format_local(utc: np.datetime64 | datetime, zone: str) -> str:
    """Write a UTC time as the local clock shows it.

    Parameters
    ----------
    utc : numpy.datetime64 or datetime.datetime
        Time in UTC; a datetime without a zone is UTC too.
    zone : str
        IANA name of the site's time zone.

    Returns
    -------
    text : str
        Such as ``2026-06-21 13:30 +01:00``, to the nearest minute.

    Raises
    ------
    InputError
        If there is no such zone, or the time is not a time.
    """
    if isinstance(utc, datetime):
        moment = utc if utc.tzinfo is not None else utc.replace(tzinfo=UTC)
    else:
        plain: Any = utc.astype("datetime64[us]").item()
        if plain is None:
            raise InputError("the time is missing (NaT)")
        moment = plain.replace(tzinfo=UTC)
    local = (moment + timedelta(seconds=30)).astimezone(time_zone(zone))
    offset = local.isoformat(timespec="minutes")[16:]
    return f"{local:%Y-%m-%d %H:%M} {offset}"


def utc_times(times: Any) -> Times:
    """Read times in any of the usual kinds as a flat array in UTC.

    Parameters
    ----------
    times : object
        ``numpy.datetime64`` scalar or array (UTC), pandas DatetimeIndex or Timestamp with a zone,
        datetime with a zone, ISO 8601 string with an offset, or a sequence of these.

    Returns
    -------
    utc : (n,) datetime64[us]
        UTC.

    Raises
    ------
    InputError
        If a time is missing, cannot be read, or does not say in which zone it is.
    """
    if isinstance(times, np.datetime64 | np.ndarray) and np.asarray(times).dtype.kind == "M":
        utc = np.atleast_1d(np.asarray(times)).ravel().astype("datetime64[us]")
    elif hasattr(times, "tz") and hasattr(times, "tz_convert") and hasattr(times, "to_numpy"):
        if times.tz is None:  # a pandas DatetimeIndex or Timestamp
            raise InputError("the times do not say in which zone they are", hint="Use tz_localize.")
        plain = times.tz_convert("UTC").tz_localize(None)
        utc = np.atleast_1d(np.asarray(plain.to_numpy())).astype("datetime64[us]")
    elif isinstance(times, str | datetime):
        utc = np.array([_moment(times)], dtype="datetime64[us]")
    else:
        try:
            utc = np.array([_moment(t) for t in times], dtype="datetime64[us]").ravel()
        except TypeError as err:
            raise InputError(f"{times!r} is not a time", hint=CLOCK_HINT) from err
    missing = np.flatnonzero(np.isnat(utc))
    if missing.size:
        raise InputError(f"times[{missing[0]}] is missing (NaT)")
    return utc


def _moment(time: Any) -> np.datetime64:
    """One time of a sequence, in UTC."""
    if isinstance(time, np.datetime64):
        return time.astype("datetime64[us]")
    if isinstance(time, str):
        try:
            time = datetime.fromisoformat(time.strip())
        except ValueError as err:
            raise InputError(f"{time!r} is not a date and time", hint=CLOCK_HINT) from err
    if not isinstance(time, datetime):
        raise InputError(f"{time!r} is not a time", hint=CLOCK_HINT)
    if time.tzinfo is None:
        raise InputError(
            f"{time.isoformat()} does not say in which zone it is",
            hint="Add its offset, such as +01:00 or Z, or give a numpy.datetime64 in UTC.",
        )
    return np.datetime64(time.astimezone(UTC).replace(tzinfo=None), "us")
