"""Skin that touches a hot surface, and burns from the temperature of the skin itself."""

from __future__ import annotations

from typing import Literal

import numpy as np
from numpy.typing import ArrayLike

from causticload.errors import InputError
from causticload.hazard._checks import Floats, Ranged, history, rising, within

__all__ = [
    "SKIN_EFFUSIVITY",
    "ContactGroup",
    "contact_burn_threshold_c",
    "henriques_damage",
    "interface_temperature_c",
]

ZERO_C = 273.15  # K

SKIN_EFFUSIVITY = 1190.0  # W s^0.5 m^-2 K^-1, from memory, medium (k 0.37, rho 1100, c 3500)

# Henriques (1947): rate 3.1e98 exp(-75000/T) 1/s, T in kelvin; from memory, high.
HENRIQUES_RATE = 3.1e98
HENRIQUES_ACTIVATION = 75000.0  # K
HENRIQUES_FLOOR_C = 44.0  # damage accumulates above this (SFPE Engineering Guide, 2000; read)
HENRIQUES_FIRST_DEGREE = 0.53
HENRIQUES_SECOND_DEGREE = 1.0

ContactGroup = Literal["bare metal", "ceramic, glass, stone", "plastic", "wood"]

# ISO 13732-1:2006, burn thresholds in °C, lower end of each range. From memory: one minute and
# longer with high confidence, 1 s and 10 s with medium confidence.
_CONTACT_TIMES = np.array([1.0, 10.0, 60.0, 600.0, 28800.0])  # s
_CONTACT_C: dict[ContactGroup, tuple[float, ...]] = {
    "bare metal": (65.0, 55.0, 51.0, 48.0, 43.0),
    "ceramic, glass, stone": (80.0, 66.0, 56.0, 48.0, 43.0),
    "plastic": (85.0, 71.0, 60.0, 48.0, 43.0),
    "wood": (110.0, 89.0, 60.0, 48.0, 43.0),
}


def contact_burn_threshold_c(duration_s: ArrayLike, *, group: ContactGroup) -> Ranged:
    """Surface temperature at which touching for a given time burns.

    Parameters
    ----------
    duration_s : array_like of float
        Contact time, > 0. [s]
    group : str
        "bare metal", "ceramic, glass, stone", "plastic" or "wood".

    Returns
    -------
    threshold : Ranged
        ``value`` in °C, linear in the logarithm of time between the rows; 43 °C for 8 h and
        longer; under 1 s nan, not in range.

    Raises
    ------
    InputError
        If the group is unknown.

    References
    ----------
    ISO 13732-1:2006, values from memory (lower ends of the ranges). It holds for contact of less
    than 10 % of the skin and a surface that keeps its temperature.
    """
    if group not in _CONTACT_C:
        raise InputError(f"group must be one of {', '.join(map(repr, _CONTACT_C))}, got {group!r}")
    t = within("duration_s", duration_s, above=True)
    known = np.asarray(t >= _CONTACT_TIMES[0])
    rows = np.interp(np.log(t), np.log(_CONTACT_TIMES), _CONTACT_C[group])
    return Ranged(np.where(known, rows, np.nan), known)


def interface_temperature_c(
    surface_c: ArrayLike,
    *,
    effusivity: ArrayLike,
    skin_c: ArrayLike = 33.0,
    skin_effusivity: ArrayLike = SKIN_EFFUSIVITY,
) -> Floats:
    """Temperature where skin touches a thick body, from the first instant on.

    Parameters
    ----------
    surface_c : array_like of float
        Temperature of the body before contact. [°C]
    effusivity : array_like of float
        sqrt(k rho c) of the body, > 0. [W s^0.5 m^-2 K^-1]
    skin_c : array_like of float
        Temperature of the skin before contact. [°C]
    skin_effusivity : array_like of float
        sqrt(k rho c) of skin, > 0; from memory, medium. [W s^0.5 m^-2 K^-1]

    Returns
    -------
    interface : ndarray of float
        [°C]

    References
    ----------
    Carslaw & Jaeger, *Conduction of Heat in Solids*: two half spaces brought into contact.
    """
    e1 = within("effusivity", effusivity, above=True)
    e2 = within("skin_effusivity", skin_effusivity, above=True)
    hot = within("surface_c", surface_c, -ZERO_C)
    return np.asarray((e1 * hot + e2 * within("skin_c", skin_c, -ZERO_C)) / (e1 + e2))


def henriques_damage(times_s: ArrayLike, skin_c: ArrayLike) -> Floats:
    """Damage integral of a history of skin temperature at the basal layer.

    0.53 is a first-degree and 1.0 a second-degree burn. Only temperatures above 44 °C count.
    Temperature is linear between the times; within a step the rate is taken as exponential, good
    to 1 % for steps up to 3 K.

    Parameters
    ----------
    times_s : (t,) array_like of float
        Rising times. [s]
    skin_c : (t, ...) array_like of float
        Temperature of the skin, 0 to 100 °C. [°C]

    Returns
    -------
    damage : ndarray of float
        Shape (...), dimensionless.

    References
    ----------
    Henriques, Arch. Pathol. 43 (1947); constants from memory, high.
    """
    t = rising("times_s", times_s)
    temperature = history("skin_c", within("skin_c", skin_c, 0.0, 100.0), len(t))
    low = np.minimum(temperature[:-1], temperature[1:])
    high = np.maximum(temperature[:-1], temperature[1:])
    cut = np.clip(low, HENRIQUES_FLOOR_C, np.maximum(high, HENRIQUES_FLOOR_C))
    rise = high - low
    above = np.maximum(high - cut, 0.0)
    share = np.where(rise > 0.0, above / np.where(rise > 0.0, rise, 1.0), high > HENRIQUES_FLOOR_C)
    cold, hot = cut + ZERO_C, np.maximum(high, cut) + ZERO_C
    x = HENRIQUES_ACTIVATION * (1.0 / cold - 1.0 / hot)  # logarithm of the ratio of the rates
    growth = np.where(x > 0.0, np.expm1(x) / np.where(x > 0.0, x, 1.0), 1.0)
    rate = HENRIQUES_RATE * np.exp(-HENRIQUES_ACTIVATION / cold) * growth
    steps = np.diff(t).reshape(-1, *([1] * (temperature.ndim - 1)))
    return np.asarray((steps * share * rate).sum(axis=0))
