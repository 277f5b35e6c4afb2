"""Clear-sky irradiance: what reaches the ground of the sun's 1361 W/m²."""

from __future__ import annotations

from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from causticload.errors import InputError
from causticload.sky.calendar import utc_times
from causticload.sky.position import SunPosition

__all__ = ["SOLAR_CONSTANT", "clear_beam", "extraterrestrial_beam", "table_turbidity"]

Floats = NDArray[np.float64]

SOLAR_CONSTANT = 1361.0  # W/m² at 1 AU; Kopp & Lean, Geophys. Res. Lett. 38 (2011); from memory
MONTH_MIDDLES = np.array([15.5, 45, 74.5, 105, 135.5, 166, 196.5, 227.5, 258, 288.5, 319, 349.5])


def extraterrestrial_beam(distance_au: ArrayLike) -> Floats:
    """Beam irradiance above the atmosphere.

    Parameters
    ----------
    distance_au : (n,) float
        Distance of the Earth from the sun, > 0. [AU]

    Returns
    -------
    beam : (n,) float
        1361 W/m² over the distance squared. [W/m²]
    """
    distance = np.asarray(distance_au, dtype=float)
    if not np.all(distance > 0.0):
        raise InputError("distance_au must be > 0")
    return np.asarray(SOLAR_CONSTANT / distance**2)


def table_turbidity(times: Any, *, latitude_deg: float, longitude_deg: float) -> Floats:
    """Linke turbidity from the monthly world table that pvlib carries.

    Monthly means on a grid of 5 minutes of arc, interpolated to the day of the year.

    Parameters
    ----------
    times : (n,) datetime64 or pandas DatetimeIndex
        UTC, or with a zone.
    latitude_deg : float
        North positive. [degrees]
    longitude_deg : float
        East positive. [degrees]

    Returns
    -------
    turbidity : (n,) float
        Linke turbidity. [1]

    References
    ----------
    Remund, Wald, Lefèvre, Ranchin & Page, Worldwide Linke turbidity information, ISES Solar World
    Congress, Gothenburg (2003).
    """
    day = utc_times(times).astype("datetime64[D]")
    day_of_year = (day - day.astype("datetime64[Y]").astype("datetime64[D]")).astype(float) + 0.5
    monthly = _monthly_turbidity(latitude_deg, longitude_deg)
    return np.interp(day_of_year, MONTH_MIDDLES, monthly, period=365.0)


@lru_cache(maxsize=64)
def _monthly_turbidity(latitude_deg: float, longitude_deg: float) -> Floats:
    """The table's twelve values at a place."""
    import pandas as pd
    from pvlib import clearsky

    months = pd.date_range("2025-01-01", periods=12, freq="MS", tz="UTC")
    table = clearsky.lookup_linke_turbidity(
        months, latitude_deg, longitude_deg, interp_turbidity=False
    )
    return np.asarray(table, dtype=float)


def clear_beam(
    position: SunPosition,
    times: Any,
    *,
    latitude_deg: float,
    longitude_deg: float,
    elevation_m: float,
    turbidity: float | None = None,
) -> tuple[Floats, Floats, Floats]:
    """Beam, diffuse and global irradiance under a clear sky.

    The Ineichen-Perez model, with the air mass of Kasten and Young from the apparent elevation,
    corrected to the pressure of the place. Without the factor that Perez put in for high air mass,
    which strays near the horizon.

    Parameters
    ----------
    position : SunPosition
        Where the sun stands at `times`, arrays (n,).
    times : (n,) datetime64 or pandas DatetimeIndex
        UTC, or with a zone; looked at only when the turbidity comes from the table.
    latitude_deg : float
        North positive. [degrees]
    longitude_deg : float
        East positive. [degrees]
    elevation_m : float
        Above sea level. [m]
    turbidity : float, optional
        Linke turbidity, in [1, 15]. None takes the monthly table. [1]

    Returns
    -------
    beam : (n,) float
        On a plane that faces the sun. Zero when the sun's centre is not above the horizon. [W/m²]
    diffuse_horizontal : (n,) float
        From the sky, on the ground; zero likewise. [W/m²]
    global_horizontal : (n,) float
        Both, on the ground; zero likewise. [W/m²]

    Raises
    ------
    InputError
        If the turbidity is out of its range.

    References
    ----------
    Ineichen & Perez, A new airmass independent formulation for the Linke turbidity coefficient,
    Solar Energy 73(3) (2002). Kasten & Young, Revised optical air mass tables and approximation
    formula, Applied Optics 28(22) (1989).
    """
    from pvlib import atmosphere, clearsky

    if turbidity is not None and not 1.0 <= turbidity <= 15.0:
        raise InputError(
            f"turbidity must be from 1 (clean dry air) to 15, got {turbidity!r}",
            hint="Linke turbidity is 2 to 3 in clear cold air and 4 to 6 over towns in summer.",
        )
    linke: float | Floats = (
        table_turbidity(times, latitude_deg=latitude_deg, longitude_deg=longitude_deg)
        if turbidity is None
        else turbidity
    )
    elevation = position.elevation_rad
    up = elevation > 0.0
    # Below the horizon any value in range will do: it is set to zero at the end.
    zenith_deg = np.degrees(np.pi / 2.0 - np.where(up, elevation, 0.0))
    airmass = atmosphere.get_absolute_airmass(
        atmosphere.get_relative_airmass(zenith_deg, model="kastenyoung1989"),
        pressure=atmosphere.alt2pres(elevation_m),
    )
    sky = clearsky.ineichen(
        zenith_deg,
        airmass,
        linke,
        altitude=elevation_m,
        dni_extra=extraterrestrial_beam(position.distance_au),
    )
    beam, diffuse, total = (np.where(up, sky[key], 0.0) for key in ("dni", "dhi", "ghi"))
    return beam, diffuse, total
