"""How hot a surface gets: the steady balance, and closed forms in time.

Balance of an opaque surface, per square metre::

    a E = h (Ts - Ta) + eps sigma [Ts^4 - F Tsky^4 - (1 - F) Ta^4] + U (Ts - Ti)

with a the solar absorptance, E the irradiance, h convection, F the share of sky in the view of
the surface. Temperatures are °C at the doors (names end in ``_c``) and kelvin inside.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import erfcx

from causticload.errors import InputError
from causticload.hazard._checks import Floats, within

__all__ = [
    "ConvectionLaw",
    "Surroundings",
    "convection",
    "ignition_time_s",
    "irradiance_to_hold",
    "semi_infinite_rise",
    "sky_temperature_c",
    "sky_view",
    "steady_temperature_c",
    "thin_sheet_rise",
    "thin_sheet_time_constant_s",
]

ZERO_C = 273.15  # K
SIGMA = 5.670374419e-8  # W m^-2 K^-4, Stefan-Boltzmann constant (CODATA 2018)

ConvectionLaw = Literal["McAdams", "Watmuff", "ISO 6946"]

_CONVECTION: dict[ConvectionLaw, tuple[float, float, float]] = {
    # h = first + second * wind, up to the third (m/s)
    "McAdams": (5.7, 3.8, 5.0),  # McAdams; read. Usually taken to include some radiation
    "Watmuff": (2.8, 3.0, 5.0),  # Watmuff et al. 1977, convection alone; from memory, high
    "ISO 6946": (4.0, 4.0, np.inf),  # ISO 6946:2017, annex; from memory, high
}


def convection(wind: ArrayLike, *, law: ConvectionLaw = "McAdams") -> Floats:
    """Heat transfer coefficient of convection at an outdoor surface.

    Parameters
    ----------
    wind : array_like of float
        Wind speed, >= 0 and below 5 for McAdams and Watmuff. [m/s]
    law : str
        "McAdams" 5.7 + 3.8 v, "Watmuff" 2.8 + 3.0 v, or "ISO 6946" 4 + 4 v. McAdams is usually
        taken to include some radiation, so next to a radiation term it errs on the cool side;
        Watmuff gives the hotter surface.

    Returns
    -------
    h : ndarray of float
        [W m^-2 K^-1]

    Raises
    ------
    InputError
        If the law is unknown or the wind out of its range.
    """
    if law not in _CONVECTION:
        raise InputError(f"convection law must be one of {', '.join(_CONVECTION)}, got {law!r}")
    still, slope, fastest = _CONVECTION[law]
    return np.asarray(still + slope * within(f"wind (with {law})", wind, 0.0, fastest))


def sky_temperature_c(air_c: ArrayLike) -> Floats:
    """Temperature of a clear sky as a black radiator.

    Parameters
    ----------
    air_c : array_like of float
        Air temperature, -60 to 60 °C. [°C]

    Returns
    -------
    sky : ndarray of float
        [°C]

    References
    ----------
    Swinbank, Q. J. R. Meteorol. Soc. 89 (1963): T_sky = 0.0552 T_air^1.5, kelvin.
    """
    return np.asarray(0.0552 * (within("air_c", air_c, -60.0, 60.0) + ZERO_C) ** 1.5 - ZERO_C)


def sky_view(normal_up: ArrayLike) -> Floats:
    """Share of sky in the view of an open tilted surface, (1 + cos tilt)/2.

    Parameters
    ----------
    normal_up : array_like of float
        Upward component of the unit normal, in [-1, 1].

    Returns
    -------
    share : ndarray of float
        1 facing up, 0.5 for a wall.
    """
    return np.asarray((1.0 + within("normal_up", normal_up, -1.0, 1.0)) / 2.0)


@dataclass(frozen=True, kw_only=True)
class Surroundings:
    """Air, wind, sky and back of a surface. The defaults are a wall on a hot, nearly still day."""

    air_c: float = 30.0
    wind: float = 1.0  # m/s
    sky_view: float = 0.5
    convection: ConvectionLaw = "McAdams"
    back_conductance: float = 0.0  # U, W m^-2 K^-1; 0: nothing flows out at the back
    back_c: float = 30.0


def environment(around: Surroundings, air_c: ArrayLike) -> tuple[float, Floats, Floats]:
    """What the air and the sky around a surface do to it.

    Parameters
    ----------
    around : Surroundings
        Wind and share of sky; its air temperature is not used.
    air_c : array_like of float
        Air temperature, -60 to 60 °C. [°C]

    Returns
    -------
    h : float
        Coefficient of convection. [W m^-2 K^-1]
    air : ndarray of float
        [K]
    cold4 : ndarray of float
        F Tsky^4 + (1 - F) Ta^4, what a black surface takes up over sigma. [K^4]
    """
    share = float(within("sky_view", around.sky_view, 0.0, 1.0))
    sky = sky_temperature_c(air_c) + ZERO_C
    air = np.asarray(air_c, dtype=np.float64) + ZERO_C
    h = float(convection(around.wind, law=around.convection))
    return h, air, np.asarray(share * sky**4 + (1.0 - share) * air**4)


def balance_root(slope: Floats | float, quartic: Floats | float, heat: Floats) -> Floats:
    """T > 0 with slope T + quartic T^4 = heat.

    The left side is convex and rising, so Newton's method comes down on the root from above after
    its first step, from any positive start.

    Parameters
    ----------
    slope : ndarray of float or float
        >= 0. [W m^-2 K^-1]
    quartic : ndarray of float or float
        >= 0; not 0 where ``slope`` is. [W m^-2 K^-4]
    heat : ndarray of float
        >= 0. [W/m²]

    Returns
    -------
    T : ndarray of float
        Broadcast shape. [K]
    """
    T = np.full(np.broadcast_shapes(np.shape(slope), np.shape(quartic), heat.shape), 300.0)
    for _ in range(60):
        step = (slope * T + quartic * T**4 - heat) / (slope + 4.0 * quartic * T**3)
        T = T - step
        if np.abs(step).max(initial=0.0) < 1e-9:
            return T
    raise ArithmeticError("the surface balance did not converge")


def steady_temperature_c(
    irradiance: ArrayLike,
    *,
    absorptance: ArrayLike,
    emissivity: ArrayLike,
    surroundings: Surroundings | None = None,
) -> Floats:
    """Surface temperature that a lasting irradiance leads to.

    Parameters
    ----------
    irradiance : array_like of float
        Total on the surface, >= 0. [W/m²]
    absorptance : array_like of float
        Of sunlight, in [0, 1].
    emissivity : array_like of float
        Long-wave, in [0, 1].
    surroundings : Surroundings, optional
        Air, wind, sky and back.

    Returns
    -------
    surface : ndarray of float
        Broadcast shape. [°C]
    """
    around = surroundings or Surroundings()
    h, air, cold4 = environment(around, around.air_c)
    U = float(within("back_conductance", around.back_conductance))
    quartic = SIGMA * within("emissivity", emissivity, 0.0, 1.0)
    absorbed = within("absorptance", absorptance, 0.0, 1.0) * within("irradiance", irradiance)
    heat = absorbed + h * air + quartic * cold4 + U * (around.back_c + ZERO_C)
    return balance_root(h + U, quartic, np.asarray(heat)) - ZERO_C


def irradiance_to_hold(
    surface_c: ArrayLike,
    *,
    absorptance: ArrayLike,
    emissivity: ArrayLike,
    surroundings: Surroundings | None = None,
) -> Floats:
    """Irradiance that holds a surface at a temperature.

    Parameters
    ----------
    surface_c : array_like of float
        Temperature of the surface. [°C]
    absorptance : array_like of float
        Of sunlight, in (0, 1].
    emissivity : array_like of float
        Long-wave, in [0, 1].
    surroundings : Surroundings, optional
        Air, wind, sky and back.

    Returns
    -------
    irradiance : ndarray of float
        Total on the surface; negative where the surface would be warmer without any. [W/m²]
    """
    around = surroundings or Surroundings()
    h, air, cold4 = environment(around, around.air_c)
    T = within("surface_c", surface_c, -ZERO_C) + ZERO_C
    radiated = SIGMA * within("emissivity", emissivity, 0.0, 1.0) * (T**4 - cold4)
    U = float(within("back_conductance", around.back_conductance))
    lost = h * (T - air) + radiated + U * (T - around.back_c - ZERO_C)
    return np.asarray(lost / within("absorptance", absorptance, 0.0, 1.0, above=True))


def semi_infinite_rise(
    time_s: ArrayLike, *, absorbed: ArrayLike, effusivity: ArrayLike, loss: ArrayLike = 0.0
) -> Floats:
    """Rise of the surface of a thick body under constant absorbed flux.

    Parameters
    ----------
    time_s : array_like of float
        Since the flux began, >= 0. [s]
    absorbed : array_like of float
        Absorbed flux, >= 0. [W/m²]
    effusivity : array_like of float
        sqrt(k rho c), > 0. [W s^0.5 m^-2 K^-1]
    loss : array_like of float
        Coefficient of loss at the surface, >= 0. [W m^-2 K^-1]

    Returns
    -------
    rise : ndarray of float
        [K]

    References
    ----------
    Carslaw & Jaeger, *Conduction of Heat in Solids*: (2q/e) sqrt(t/pi), and with loss
    (q/h)[1 - erfcx(h sqrt(t)/e)].
    """
    q, h = within("absorbed", absorbed), within("loss", loss)
    root = np.sqrt(within("time_s", time_s)) / within("effusivity", effusivity, above=True)
    x = h * root
    small = x < 1e-6  # 1 - erfcx(x) loses its digits: series 2x/sqrt(pi) - x²
    open_form = (1.0 - erfcx(x)) / np.where(small, 1.0, h)
    series = root * (2.0 / np.sqrt(np.pi) - x)
    return np.asarray(q * np.where(small, series, open_form))


def thin_sheet_time_constant_s(
    *, density: ArrayLike, heat_capacity: ArrayLike, thickness_m: ArrayLike, loss: ArrayLike
) -> Floats:
    """Time constant of a thin sheet, rho c d/h.

    Parameters
    ----------
    density : array_like of float
        > 0. [kg/m³]
    heat_capacity : array_like of float
        > 0. [J kg^-1 K^-1]
    thickness_m : array_like of float
        > 0. [m]
    loss : array_like of float
        Coefficient of loss, all faces together, > 0. [W m^-2 K^-1]

    Returns
    -------
    tau : ndarray of float
        [s]
    """
    rho = within("density", density, above=True)
    c = within("heat_capacity", heat_capacity, above=True)
    d = within("thickness_m", thickness_m, above=True)
    return np.asarray(rho * c * d / within("loss", loss, above=True))


def thin_sheet_rise(
    time_s: ArrayLike, *, absorbed: ArrayLike, loss: ArrayLike, time_constant_s: ArrayLike
) -> Floats:
    """Rise of a thin sheet under constant absorbed flux, (q/h)[1 - exp(-t/tau)].

    Parameters
    ----------
    time_s : array_like of float
        Since the flux began, >= 0. [s]
    absorbed : array_like of float
        Absorbed flux, >= 0. [W/m²]
    loss : array_like of float
        Coefficient of loss, all faces together, > 0. [W m^-2 K^-1]
    time_constant_s : array_like of float
        tau, > 0. [s]

    Returns
    -------
    rise : ndarray of float
        [K]
    """
    over_tau = within("time_s", time_s) / within("time_constant_s", time_constant_s, above=True)
    q, h = within("absorbed", absorbed), within("loss", loss, above=True)
    return np.asarray(-q / h * np.expm1(-over_tau))


def ignition_time_s(absorbed: ArrayLike, *, effusivity: ArrayLike, rise_k: ArrayLike) -> Floats:
    """Time to ignition of a thick solid at constant absorbed flux, without loss.

    Parameters
    ----------
    absorbed : array_like of float
        Absorbed flux, > 0. [W/m²]
    effusivity : array_like of float
        sqrt(k rho c), > 0. [W s^0.5 m^-2 K^-1]
    rise_k : array_like of float
        Rise to the ignition temperature, > 0. [K]

    Returns
    -------
    time : ndarray of float
        Early, because nothing is lost; near the least flux of the material it never comes. [s]

    References
    ----------
    Thermally thick solution of piloted ignition: (pi/4) k rho c (dT/q)².
    """
    q = within("absorbed", absorbed, above=True)
    e = within("effusivity", effusivity, above=True)
    return np.asarray(np.pi / 4.0 * (e * within("rise_k", rise_k, above=True) / q) ** 2)
