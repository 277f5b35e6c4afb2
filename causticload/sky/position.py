"""Where the sun stands, and its direction in the model.

Positions come from the NREL solar position algorithm (SPA) of pvlib. Azimuth is clockwise from
true north. Elevation is apparent, that is, raised by refraction, unless a name says otherwise.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from causticload.errors import InputError
from causticload.sky.calendar import Times, utc_times

__all__ = [
    "ASTRONOMICAL_UNIT",
    "SOLAR_RADIUS",
    "SunAngles",
    "SunPosition",
    "angular_radius",
    "geocentric_sun",
    "solar_position",
    "sun_angles",
    "sun_direction",
    "sun_position",
]

Floats = NDArray[np.float64]

SOLAR_RADIUS = 695_700e3  # m, nominal, IAU 2015 Resolution B3; from memory, high
ASTRONOMICAL_UNIT = 149_597_870_700.0  # m, exact, IAU 2012 Resolution B2

AIR_TEMPERATURE_C = 12.0  # for refraction; 10 K more lifts a sun on the horizon 0.02 degrees less
HORIZON_REFRACTION_DEG = 0.5667  # SPA: refraction at sunrise and sunset


@dataclass(frozen=True, kw_only=True)
class SunPosition:
    """Positions of the sun at one place.

    Parameters
    ----------
    azimuth_rad : (n,) float
        Clockwise from true north, in [0, 2 pi). [rad]
    elevation_rad : (n,) float
        Apparent elevation of the sun's centre. [rad]
    distance_au : (n,) float
        Distance of the Earth from the sun. [AU]
    radius_rad : (n,) float
        Angular radius of the sun's disc. [rad]
    """

    azimuth_rad: Floats
    elevation_rad: Floats
    distance_au: Floats
    radius_rad: Floats


@dataclass(frozen=True, kw_only=True)
class SunAngles:
    """What :func:`sun_position` returns: arrays of the shape of the times.

    Parameters
    ----------
    azimuth : float array
        Clockwise from true north. [degrees]
    elevation : float array
        Apparent elevation of the sun's centre. [degrees]
    radius : float array
        Angular radius of the sun's disc. [rad]
    """

    azimuth: Floats
    elevation: Floats
    radius: Floats


def check_place(*, latitude_deg: float, longitude_deg: float, elevation_m: float) -> None:
    """Check that a place is on Earth.

    Parameters
    ----------
    latitude_deg : float
        North positive, in [-90, 90]. [degrees]
    longitude_deg : float
        East positive, in [-180, 180]. [degrees]
    elevation_m : float
        Above sea level, in [-500, 9000]. [m]

    Raises
    ------
    InputError
        If a value is out of its range.
    """
    ranges = {
        "latitude": (latitude_deg, -90.0, 90.0, "degrees"),
        "longitude": (longitude_deg, -180.0, 180.0, "degrees"),
        "elevation": (elevation_m, -500.0, 9000.0, "m"),
    }
    for name, (value, low, high, unit) in ranges.items():
        if not low <= value <= high:  # nan lands here too
            raise InputError(f"{name} must be from {low:g} to {high:g} {unit}, got {value!r}")


def solar_position(
    times: Any, *, latitude_deg: float, longitude_deg: float, elevation_m: float
) -> SunPosition:
    """Position of the sun, by the NREL solar position algorithm.

    Air pressure follows from the elevation (standard atmosphere) and TT - UT from the year;
    refraction takes air at 12 °C.

    Parameters
    ----------
    times : (n,) datetime64 or pandas DatetimeIndex
        UTC, or with a zone; see :func:`causticload.sky.calendar.utc_times`.
    latitude_deg : float
        North positive, in [-90, 90]. [degrees]
    longitude_deg : float
        East positive, in [-180, 180]. [degrees]
    elevation_m : float
        Above sea level, in [-500, 9000]. [m]

    Returns
    -------
    position : SunPosition
        Arrays (n,). [rad, AU]

    Raises
    ------
    InputError
        If the place is not on Earth, or a time is missing or without a zone.

    References
    ----------
    Reda & Andreas, Solar position algorithm for solar radiation applications, Solar Energy 76(5)
    (2004), and NREL/TP-560-34302 (2008).
    """
    from pvlib import atmosphere

    check_place(latitude_deg=latitude_deg, longitude_deg=longitude_deg, elevation_m=elevation_m)
    utc = utc_times(times)
    _, _, apparent, _, azimuth, _ = _spa(
        utc,
        latitude_deg=latitude_deg,
        longitude_deg=longitude_deg,
        elevation_m=elevation_m,
        pressure_mbar=float(atmosphere.alt2pres(elevation_m)) / 100.0,
    )
    (distance,) = _spa(utc, esd=True)
    return SunPosition(
        azimuth_rad=np.radians(azimuth) % (2.0 * np.pi),
        elevation_rad=np.radians(apparent),
        distance_au=distance,
        radius_rad=angular_radius(distance),
    )


def _spa(
    utc: Times,
    *,
    latitude_deg: float = 0.0,
    longitude_deg: float = 0.0,
    elevation_m: float = 0.0,
    pressure_mbar: float = 0.0,
    sst: bool = False,
    esd: bool = False,
) -> tuple[Floats, ...]:
    """pvlib's vectorised SPA; ``sst`` and ``esd`` ask it for its intermediate results."""
    from pvlib import spa

    seconds = utc.astype("datetime64[us]").astype(np.int64) / 1e6
    year = utc.astype("datetime64[Y]").astype(np.int64) + 1970
    month = utc.astype("datetime64[M]").astype(np.int64) % 12 + 1
    # Whole months are enough: TT - UT moves by 0.1 s in one, the sun by 1e-6 degrees.
    delta_t = np.asarray(spa.calculate_deltat(year, month), dtype=float)
    result: tuple[Floats, ...] = spa.solar_position_numpy(
        seconds,
        latitude_deg,
        longitude_deg,
        elevation_m,
        pressure_mbar,
        AIR_TEMPERATURE_C,
        delta_t,
        HORIZON_REFRACTION_DEG,
        1,
        sst=sst,
        esd=esd,
    )
    return result


def geocentric_sun(times: Any, *, longitude_deg: float) -> tuple[Floats, Floats]:
    """Declination and local hour angle of the sun, seen from the Earth's centre.

    Parameters
    ----------
    times : (n,) datetime64 or pandas DatetimeIndex
        UTC, or with a zone.
    longitude_deg : float
        East positive. [degrees]

    Returns
    -------
    declination_rad : (n,) float
        Apparent declination. [rad]
    hour_angle_rad : (n,) float
        Zero at solar noon, positive in the afternoon, in [-pi, pi). [rad]
    """
    sidereal, right_ascension, declination = _spa(utc_times(times), sst=True)
    hour_angle = np.radians(sidereal + longitude_deg - right_ascension)
    return np.radians(declination), (hour_angle + np.pi) % (2.0 * np.pi) - np.pi


def angular_radius(distance_au: ArrayLike) -> Floats:
    """Angular radius of the sun's disc.

    Parameters
    ----------
    distance_au : (n,) float
        Distance of the Earth from the sun, > 0. [AU]

    Returns
    -------
    radius_rad : (n,) float
        asin(695 700 km / distance); 4.6505 mrad at 1 AU. [rad]
    """
    distance = np.asarray(distance_au, dtype=float)
    if not np.all(distance > 0.0):
        raise InputError("distance_au must be > 0")
    return np.asarray(np.arcsin(SOLAR_RADIUS / (distance * ASTRONOMICAL_UNIT)))


def sun_direction(azimuth_rad: ArrayLike, elevation_rad: ArrayLike, *, north_rad: float) -> Floats:
    """Unit vectors that point to the sun, in the model frame (Z up).

    Parameters
    ----------
    azimuth_rad : (n,) float
        Clockwise from true north. [rad]
    elevation_rad : (n,) float
        Above the horizon. [rad]
    north_rad : float
        Bearing of the model's +Y axis, clockwise from true north. [rad]

    Returns
    -------
    d_sun : (n, 3) float
        Unit vectors; +X bears 90 degrees clockwise from +Y. [1]
    """
    azimuth, elevation = np.broadcast_arrays(
        np.atleast_1d(np.asarray(azimuth_rad, dtype=float)),
        np.atleast_1d(np.asarray(elevation_rad, dtype=float)),
    )
    turn = azimuth - north_rad
    level = np.cos(elevation)
    return np.stack([level * np.sin(turn), level * np.cos(turn), np.sin(elevation)], axis=-1)


def sun_angles(d_sun: ArrayLike, *, north_rad: float) -> tuple[Floats, Floats]:
    """Azimuth and elevation of directions: the inverse of :func:`sun_direction`.

    Parameters
    ----------
    d_sun : (n, 3) float
        Vectors to the sun in the model frame, of any length > 0.
    north_rad : float
        Bearing of the model's +Y axis, clockwise from true north. [rad]

    Returns
    -------
    azimuth_rad : (n,) float
        Clockwise from true north, in [0, 2 pi). [rad]
    elevation_rad : (n,) float
        Above the horizon. [rad]

    Raises
    ------
    InputError
        If a vector has no length or the array is not (n, 3).
    """
    d = np.asarray(d_sun, dtype=float)
    if d.ndim != 2 or d.shape[1] != 3:
        raise InputError(f"d_sun must be (n, 3), got shape {d.shape}")
    if not np.all(np.linalg.norm(d, axis=1) > 0.0):
        raise InputError("d_sun holds a vector of no length")
    azimuth = (np.arctan2(d[:, 0], d[:, 1]) + north_rad) % (2.0 * np.pi)
    return azimuth, np.arctan2(d[:, 2], np.hypot(d[:, 0], d[:, 1]))


def sun_position(latitude: float, longitude: float, elevation: float, times: Any) -> SunAngles:
    """Azimuth, apparent elevation and angular radius of the sun.

    Parameters
    ----------
    latitude : float
        North positive, in [-90, 90]. [degrees]
    longitude : float
        East positive, in [-180, 180]. [degrees]
    elevation : float
        Of the place, above sea level. [m]
    times : datetime64, DatetimeIndex, datetime, str or a sequence of these
        ``numpy.datetime64`` is UTC; everything else must carry its zone or offset.

    Returns
    -------
    angles : SunAngles
        ``azimuth`` and ``elevation`` in degrees, ``radius`` in rad; of the shape of `times`.

    Raises
    ------
    InputError
        If the place is not on Earth, or a time is missing or without a zone.

    Examples
    --------
    >>> sun = sun_position(51.07, -1.32, 40.0, "2026-06-21T13:30+01:00")
    >>> round(float(sun.elevation), 1)
    62.0
    """
    p = solar_position(times, latitude_deg=latitude, longitude_deg=longitude, elevation_m=elevation)
    shape = () if isinstance(times, str) else np.shape(times)
    return SunAngles(
        azimuth=np.degrees(p.azimuth_rad).reshape(shape),
        elevation=np.degrees(p.elevation_rad).reshape(shape),
        radius=p.radius_rad.reshape(shape),
    )
