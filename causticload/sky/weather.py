"""Hourly weather files of a typical year: EPW and TMY3.

Both formats stamp an hour at its end, in local standard time: irradiance is the mean over the
hour before the stamp, temperature and wind hold at the stamp. A typical year is stitched from
months of several years, so its rows are found by month, day and hour.
"""

from __future__ import annotations

import io
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from causticload.errors import InputError, WeatherError
from causticload.sky.beam import clear_beam
from causticload.sky.calendar import Times, utc_times
from causticload.sky.position import SunPosition, solar_position

__all__ = ["Weather", "WeatherBeam", "read_weather"]

Floats = NDArray[np.float64]

HOURS = 8760  # of a typical year; it has no 29 February
MONTH_STARTS = np.cumsum([0, 31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30])  # day of the year
MONTH_DAYS = np.diff(np.append(MONTH_STARTS, 365))

CLEAREST_TURBIDITY = 2.0  # Linke turbidity of very clear cold air, common practice
CAP = 1.1  # times the beam of the clearest sky; above it the file and the sun do not agree
SAMPLES = 12  # per hour, to find the mean of the clear-sky beam over it
MAX_BEAM = 1500.0  # W/m²; above the beam outside the atmosphere

FAR_KM = 50.0  # common practice
HIGH_M = 300.0  # common practice
EARTH_RADIUS_KM = 6371.0


@dataclass(frozen=True, kw_only=True)
class WeatherBeam:
    """Irradiance from a weather file at given times.

    Parameters
    ----------
    beam : (n,) float
        On a plane that faces the sun. [W/m²]
    diffuse : (n,) float
        From the sky, on the ground. [W/m²]
    capped : (n,) bool
        Times in an hour whose beam was cut to 1.1 times that of the clearest sky.
    capped_hours : int
        Number of those hours.
    """

    beam: Floats
    diffuse: Floats
    capped: NDArray[np.bool_]
    capped_hours: int


@dataclass(frozen=True, kw_only=True)
class Weather:
    """A typical year of hours. Row k is hour k of a 365-day year in local standard time.

    Parameters
    ----------
    name : str
        Name of the station.
    path : pathlib.Path
        File it was read from.
    latitude_deg : float
        North positive. [degrees]
    longitude_deg : float
        East positive. [degrees]
    elevation_m : float
        Above sea level. [m]
    utc_offset_h : float
        Local standard time less UTC. [h]
    beam : (8760,) float
        Mean over hour k, on a plane that faces the sun. [W/m²]
    diffuse : (8760,) float
        Mean over hour k, on the ground. [W/m²]
    temperature_c : (8760,) float
        Dry-bulb temperature at the end of hour k. [°C]
    wind_ms : (8760,) float
        Wind speed at the end of hour k. [m/s]
    notes : tuple of str
        Sentences on what had to be filled or left out.
    """

    name: str
    path: Path
    latitude_deg: float
    longitude_deg: float
    elevation_m: float
    utc_offset_h: float
    beam: Floats
    diffuse: Floats
    temperature_c: Floats
    wind_ms: Floats
    notes: tuple[str, ...] = ()

    def hour_of_year(self, times: Any) -> Floats:
        """Place of times in the typical year. 29 February takes the place of 28 February.

        Parameters
        ----------
        times : (n,) datetime64 or pandas DatetimeIndex
            UTC, or with a zone.

        Returns
        -------
        hour : (n,) float
            Hours since the year began in local standard time, in [0, 8760). [h]
        """
        return self._hour_of_year(utc_times(times))

    def _hour_of_year(self, utc: Times) -> Floats:
        local = utc + np.timedelta64(round(self.utc_offset_h * 3600e6), "us")
        month = local.astype("datetime64[M]")
        date = local.astype("datetime64[D]")
        m = month.astype(np.int64) % 12
        day = np.minimum((date - month.astype("datetime64[D]")).astype(np.int64), MONTH_DAYS[m] - 1)
        hours = (local - date).astype("timedelta64[us]").astype(np.int64) / 3600e6
        return np.asarray((MONTH_STARTS[m] + day) * 24.0 + hours)

    def beam_at(
        self,
        times: Any,
        position: SunPosition,
        *,
        latitude_deg: float,
        longitude_deg: float,
        elevation_m: float,
    ) -> WeatherBeam:
        """Beam and diffuse irradiance at times, from the hour each falls in.

        The beam of an hour is spread in the shape of the clear-sky beam over that hour, so the
        mean of the hour is kept and there is none while the sun is down. It is cut to 1.1 times
        the beam of the clearest sky (Linke turbidity 2), and the hours where that happens are
        counted. The diffuse irradiance is the hour's mean throughout: twilight has some too.

        Parameters
        ----------
        times : (n,) datetime64 or pandas DatetimeIndex
            UTC, or with a zone.
        position : SunPosition
            Where the sun stands at `times` at the site.
        latitude_deg : float
            Of the site, north positive. [degrees]
        longitude_deg : float
            Of the site, east positive. [degrees]
        elevation_m : float
            Of the site, above sea level. [m]

        Returns
        -------
        result : WeatherBeam
            Arrays (n,), and how many of the hours were cut. [W/m²]
        """
        place = {
            "latitude_deg": latitude_deg,
            "longitude_deg": longitude_deg,
            "elevation_m": elevation_m,
        }
        utc = utc_times(times)
        if len(utc) != len(position.elevation_rad):
            raise InputError(f"{len(utc)} times, but {len(position.elevation_rad)} positions")
        row = self._hour_of_year(utc).astype(np.int64)
        # Hours of the clock need not be hours of UTC: some zones are 30 or 45 minutes off.
        offset = np.timedelta64(round(self.utc_offset_h * 3600e6), "us")
        begins = (utc + offset).astype("datetime64[h]").astype("datetime64[us]") - offset
        hour, first, of_hour = np.unique(begins, return_index=True, return_inverse=True)
        file_beam = self.beam[row[first]]

        clear_mean = np.zeros(len(hour))
        bright = np.flatnonzero(file_beam > 0.0)
        inside = ((np.arange(SAMPLES) + 0.5) * 3600e6 / SAMPLES).astype("timedelta64[us]")
        samples = (hour[bright, None] + inside).ravel()
        clear = _clearest_beam(solar_position(samples, **place), samples, **place)
        clear_mean[bright] = clear.reshape(-1, SAMPLES).mean(axis=1)

        share = np.divide(file_beam, clear_mean, out=np.zeros(len(hour)), where=clear_mean > 0.0)
        capped = share > CAP
        beam = np.minimum(share, CAP)[of_hour] * _clearest_beam(position, utc, **place)
        return WeatherBeam(
            beam=beam,
            diffuse=self.diffuse[row],
            capped=capped[of_hour],
            capped_hours=int(capped.sum()),
        )

    def air_at(self, times: Any) -> tuple[Floats, Floats]:
        """Air temperature and wind speed at times, straight between the hourly values.

        Parameters
        ----------
        times : (n,) datetime64 or pandas DatetimeIndex
            UTC, or with a zone.

        Returns
        -------
        temperature_c : (n,) float
            Dry-bulb temperature. [°C]
        wind_ms : (n,) float
            Wind speed. [m/s]
        """
        x = self.hour_of_year(times)
        stamps = np.arange(1.0, HOURS + 1.0)
        return (
            np.interp(x, stamps, self.temperature_c, period=HOURS),
            np.interp(x, stamps, self.wind_ms, period=HOURS),
        )

    def station_warnings(
        self, *, latitude_deg: float, longitude_deg: float, elevation_m: float
    ) -> tuple[str, ...]:
        """Sentences that say whether the station is too far from a site.

        Parameters
        ----------
        latitude_deg : float
            Of the site, north positive. [degrees]
        longitude_deg : float
            Of the site, east positive. [degrees]
        elevation_m : float
            Of the site, above sea level. [m]

        Returns
        -------
        warnings : tuple of str
            Empty if the station is within 50 km and 300 m of height.
        """
        a1, b1, a2, b2 = np.radians(
            [self.latitude_deg, self.longitude_deg, latitude_deg, longitude_deg]
        )
        half = np.sin((a2 - a1) / 2) ** 2 + np.cos(a1) * np.cos(a2) * np.sin((b2 - b1) / 2) ** 2
        km = 2.0 * EARTH_RADIUS_KM * np.arcsin(np.sqrt(min(1.0, float(half))))
        higher = self.elevation_m - elevation_m
        said = []
        if km > FAR_KM:
            said.append(
                f"The weather file is for {self.name}, {km:.0f} km from the site: its clouds, "
                "temperature and wind may not be those of the site."
            )
        if abs(higher) > HIGH_M:
            side = "above" if higher > 0 else "below"
            said.append(
                f"The weather station {self.name} lies {abs(higher):.0f} m {side} the site: its "
                "beam, temperature and wind may not be those of the site."
            )
        return tuple(said)


def _clearest_beam(position: SunPosition, utc: Times, **place: float) -> Floats:
    beam, _, _ = clear_beam(position, utc, turbidity=CLEAREST_TURBIDITY, **place)
    return beam


def read_weather(path: str | Path) -> Weather:
    """Read an EPW or TMY3 file.

    A missing temperature or wind speed is filled in a straight line between its neighbours, and
    said. A missing irradiance is an error: nobody can know what the sky did.

    Parameters
    ----------
    path : str or pathlib.Path
        File; which format it has is seen from its first lines.

    Returns
    -------
    weather : Weather
        The typical year.

    Raises
    ------
    WeatherError
        If the file cannot be read, is neither EPW nor TMY3, is not a full year of hours, or holds
        values that are missing or impossible.

    References
    ----------
    EnergyPlus Auxiliary Programs, "EnergyPlus Weather File (EPW) Data Dictionary". Wilcox &
    Marion, Users Manual for TMY3 Data Sets, NREL/TP-581-43156 (2008).
    """
    path = Path(path)
    where = path.name
    try:
        text = path.read_text(encoding="utf-8-sig", errors="replace")
    except OSError as err:
        raise WeatherError(f"cannot be read: {err.strerror or err}", where=where) from err
    head = text[:4000].splitlines()
    if head and head[0].upper().startswith("LOCATION,"):
        table, meta, kind = *_parsed("read_epw", text, where), "EPW"
    elif len(head) > 1 and head[1].startswith("Date (MM/DD/YYYY),Time (HH:MM)"):
        table, meta, kind = *_parsed("read_tmy3", text, where), "TMY3"
    else:
        raise WeatherError(
            "is neither an EPW nor a TMY3 file",
            where=where,
            hint="EPW begins with LOCATION; TMY3 has Date (MM/DD/YYYY) at the head of line 2.",
        )
    row, leap = _rows(table, kind, where)
    columns, notes = {}, []
    for key, name in (("dni", "beam"), ("dhi", "diffuse"), ("temp_air", "temperature"),
                      ("wind_speed", "wind")):  # fmt: skip
        values = np.full(HOURS, np.nan)
        values[row[~leap]] = np.asarray(table[key], dtype=float)[~leap]
        columns[name], filled = _checked(values, name, where)
        if filled:
            notes.append(f"{filled} hours of {name} are missing in {where} and were filled.")
    if leap.any():
        notes.append(f"29 February was left out of {where}; 28 February stands for it.")
    return Weather(
        name=str(meta["city" if kind == "EPW" else "Name"]).strip().strip('"'),
        path=path,
        latitude_deg=float(meta["latitude"]),
        longitude_deg=float(meta["longitude"]),
        elevation_m=float(meta["altitude"]),
        utc_offset_h=float(meta["TZ"]),
        beam=columns["beam"],
        diffuse=columns["diffuse"],
        temperature_c=columns["temperature"],
        wind_ms=columns["wind"],
        notes=tuple(notes),
    )


def _parsed(reader: str, text: str, where: str) -> tuple[Any, dict[str, Any]]:
    """Table and header of a weather file, by pvlib."""
    from pvlib import iotools

    try:
        table, meta = getattr(iotools, reader)(io.StringIO(text))
    except (ValueError, KeyError, IndexError, TypeError, AttributeError) as err:
        raise WeatherError(
            f"does not follow its format: {err}", where=where, hint="Fetch the file anew."
        ) from err
    places = {"latitude": (-90, 90), "longitude": (-180, 180), "altitude": (-500, 9000),
              "TZ": (-12, 14)}  # fmt: skip
    for key, (low, high) in places.items():
        if not low <= meta[key] <= high:
            raise WeatherError(f"the station's {key} is {meta[key]!r}", where=where)
    return table, meta


def _rows(table: Any, kind: str, where: str) -> tuple[NDArray[np.int64], NDArray[np.bool_]]:
    """Hour of the typical year of each line, and which lines are of 29 February.

    Taken from the columns of the file: pvlib's index shifts a stamp of 24:00 to the next day,
    which is another day in a leap year than in a typical one.
    """
    try:
        if kind == "EPW":
            month, day, hour = (table[c].to_numpy(dtype=int) for c in ("month", "day", "hour"))
            minute = np.zeros_like(hour)  # 0 or 60 by habit; the hour alone counts
        else:
            month, day = (
                table["Date (MM/DD/YYYY)"].str.split("/").str[i].to_numpy(dtype=int) for i in (0, 1)
            )
            hour, minute = (
                table["Time (HH:MM)"].str.split(":").str[i].to_numpy(dtype=int) for i in (0, 1)
            )
    except (ValueError, KeyError) as err:
        raise WeatherError(f"a date or time cannot be read: {err}", where=where) from err
    leap = (month == 2) & (day == 29)
    bad = np.flatnonzero(
        (month < 1) | (month > 12) | (day < 1) | (hour < 1) | (hour > 24) | (minute != 0)
    )
    if not bad.size:
        bad = np.flatnonzero((day > MONTH_DAYS[month - 1]) & ~leap)
    if bad.size:
        i = bad[0]
        raise WeatherError(
            f"data row {i + 1} is stamped {month[i]}/{day[i]} {hour[i]}:{minute[i]:02d}",
            where=where,
            hint="Rows must be stamped on the hour, at its end, from 1 to 24.",
        )
    row = (MONTH_STARTS[month - 1] + day - 1) * 24 + hour - 1
    times, counts = np.unique(row[~leap], return_counts=True)
    if len(times) != HOURS or counts.max() > 1:
        raise WeatherError(
            f"holds {len(row)} rows for {len(times)} of the 8760 hours of a year",
            where=where,
            hint="Use a full year of hourly values, each hour once.",
        )
    return row, leap


def _checked(values: Floats, name: str, where: str) -> tuple[Floats, int]:
    """Values without gaps, and how many were filled. Gaps in irradiance are errors."""
    missing_from = {"beam": 9999.0, "diffuse": 9999.0, "temperature": 99.9, "wind": 999.0}[name]
    # EPW marks a gap with nines, TMY3 with -9900.
    missing = ~((values < missing_from) & (values > -9000.0))
    if name in ("beam", "diffuse") and missing.any():
        raise WeatherError(
            f"{name} is missing in {missing.sum()} hours, first {_stamp(np.argmax(missing))}",
            where=where,
            hint='Use another file, or source = "clear".',
        )
    if missing.all():
        raise WeatherError(f"{name} is missing in every hour", where=where)
    limits = {"beam": (0.0, MAX_BEAM), "diffuse": (0.0, MAX_BEAM), "temperature": (-90.0, 70.0),
              "wind": (0.0, 110.0)}  # fmt: skip
    low, high = limits[name]
    bad = ~missing & ((values < low) | (values > high))
    if bad.any():
        i = int(np.argmax(bad))
        raise WeatherError(
            f"{name} is {values[i]:g} at {_stamp(i)}; it must be from {low:g} to {high:g}",
            where=where,
        )
    k = np.arange(HOURS)
    return np.interp(k, k[~missing], values[~missing], period=HOURS), int(missing.sum())


def _stamp(row: int | np.integer[Any]) -> str:
    """Month, day and end of an hour of the typical year."""
    day, hour = divmod(int(row), 24)
    month = int(np.searchsorted(MONTH_STARTS, day, side="right"))
    return f"{month}/{day - MONTH_STARTS[month - 1] + 1} {hour + 1}:00"
