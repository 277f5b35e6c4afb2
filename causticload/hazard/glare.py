"""Disability glare: illuminance at the eye, the veil it makes, and what the veil hides.

Angles are radians here; the formulas are published in degrees and convert inside.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from causticload.errors import InputError
from causticload.hazard._checks import Bools, Floats, Ranged, within
from causticload.hazard.cautions import Confidence

__all__ = [
    "BEAM_EFFICACY",
    "CIE_AGE_ADJUSTED",
    "CIE_GENERAL",
    "CIE_SMALL_ANGLE",
    "EN_13201_3",
    "PIGMENT",
    "ROGUE_VEIL_CONFIDENCE",
    "ROGUE_VEIL_LIMIT",
    "STILES_HOLLADAY",
    "VEIL_LAWS",
    "Veil",
    "VeilLaw",
    "contrast_left",
    "glare_illuminance",
    "illuminance",
    "luminance",
    "rogue_angle",
    "threshold_increment",
    "veil_per_lux",
    "veiling_luminance",
]

BEAM_EFFICACY = 100.0  # lm/W; 70 to 105 measured, rising with altitude (Littlefair 1985; read)

ROGUE_VEIL_LIMIT = 500.0  # cd/m², Hassall, Reflectivity: dealing with rogue solar reflections, 1991
ROGUE_VEIL_CONFIDENCE: Confidence = "from memory, high"

# Eye pigment factor p of CIE 146:2002 (very light from memory, high; the others read).
PIGMENT: dict[str, float] = {
    "very dark": 0.0,
    "brown": 0.5,
    "blue or green": 1.0,
    "very light": 1.2,
}


def illuminance(
    irradiance: ArrayLike, *, efficacy: float = BEAM_EFFICACY, visible_to_solar: ArrayLike = 1.0
) -> Floats:
    """Illuminance of a reflected beam.

    Parameters
    ----------
    irradiance : array_like of float
        Irradiance of the reflected beam, >= 0. [W/m²]
    efficacy : float
        Luminous efficacy of the direct beam, > 0; 70 to 108 depending on sun height. [lm/W]
    visible_to_solar : array_like of float
        Visible over solar reflectance of the surface. Coated glass is far below 1.

    Returns
    -------
    illuminance : ndarray of float
        [lx]
    """
    k = float(within("efficacy", efficacy, above=True))
    ratio = within("visible_to_solar", visible_to_solar)
    return np.asarray(within("irradiance", irradiance) * k * ratio)


def luminance(illuminance_lx: ArrayLike, *, solid_angle: ArrayLike) -> Floats:
    """Mean luminance of a source from the illuminance it gives, normal to its direction.

    Parameters
    ----------
    illuminance_lx : array_like of float
        >= 0. [lx]
    solid_angle : array_like of float
        Of the source at the eye, > 0. [sr]

    Returns
    -------
    luminance : ndarray of float
        [cd/m²]
    """
    omega = within("solid_angle", solid_angle, above=True)
    return np.asarray(within("illuminance_lx", illuminance_lx) / omega)


def glare_illuminance(beam_lx: ArrayLike, *, angle: ArrayLike) -> Floats:
    """Illuminance at the eye on the plane normal to the line of sight.

    Parameters
    ----------
    beam_lx : array_like of float
        Illuminance normal to the beam, >= 0. [lx]
    angle : array_like of float
        Between line of sight and source, in [0, pi]. [rad]

    Returns
    -------
    illuminance : ndarray of float
        0 from behind. [lx]
    """
    facing = np.cos(within("angle", angle, 0.0, np.pi))
    return np.asarray(within("beam_lx", beam_lx) * np.maximum(facing, 0.0))


@dataclass(frozen=True, kw_only=True)
class VeilLaw:
    """Equivalent veiling luminance for one lux at the eye. Angles of the range in degrees."""

    name: str
    formula: Callable[[Floats, float, float], Floats]  # angle (deg), age (yr), pigment -> cd/m²/lx
    min_deg: float
    max_deg: float
    source: str
    confidence: Confidence


def _small_angle(theta: Floats, age: float, _pigment: float) -> Floats:
    return 10.0 / theta**3 + 5.0 / theta**2 * (1.0 + (age / 62.5) ** 4)


def _general(theta: Floats, age: float, pigment: float) -> Floats:
    aged = 1.0 + (age / 62.5) ** 4
    return 10.0 / theta**3 + (5.0 / theta**2 + 0.1 * pigment / theta) * aged + 0.0025 * pigment


def _en_13201(theta: Floats, age: float, pigment: float) -> Floats:
    wide = 9.86 * (1.0 + (age / 66.4) ** 4) / theta**2
    return np.where(theta > 1.5, wide, _small_angle(theta, age, pigment))


STILES_HOLLADAY = VeilLaw(
    name="Stiles-Holladay",
    formula=lambda theta, _age, _pigment: 10.0 / theta**2,
    min_deg=1.0,
    max_deg=30.0,
    source="Stiles-Holladay (CIE 1939)",
    confidence="published, read",
)
CIE_AGE_ADJUSTED = VeilLaw(
    name="CIE age-adjusted",
    formula=lambda theta, age, _pigment: 10.0 / theta**2 * (1.0 + (age / 70.0) ** 4),
    min_deg=1.0,
    max_deg=30.0,
    source="CIE 146:2002, age-adjusted Stiles-Holladay equation",
    confidence="from memory, high",
)
CIE_SMALL_ANGLE = VeilLaw(
    name="CIE small angle",
    formula=_small_angle,
    min_deg=0.1,
    max_deg=30.0,
    source="CIE 146:2002, small-angle disability glare equation",
    confidence="published, read",
)
CIE_GENERAL = VeilLaw(
    name="CIE general",
    formula=_general,
    min_deg=0.1,
    max_deg=100.0,
    source="CIE 146:2002, general disability glare equation",
    confidence="published, read",
)
EN_13201_3 = VeilLaw(
    name="EN 13201-3",
    formula=_en_13201,
    min_deg=0.1,
    max_deg=60.0,
    source="EN 13201-3:2015; the standard observer is 23 years old",
    confidence="published, read",
)
VEIL_LAWS: dict[str, VeilLaw] = {
    law.name: law
    for law in (STILES_HOLLADAY, CIE_AGE_ADJUSTED, CIE_SMALL_ANGLE, CIE_GENERAL, EN_13201_3)
}


class Veil(NamedTuple):
    """Veiling luminance of all sources together, and what the law could not take."""

    luminance: Floats  # cd/m²; nan where a lit source is too close to the line of sight
    too_close: Bools  # a lit source is closer to the line of sight than the law reaches
    left_out: NDArray[np.int64]  # lit sources further out than the law reaches, not in the sum


def veil_per_lux(
    angle: ArrayLike, *, law: VeilLaw = CIE_GENERAL, age: float = 50.0, pigment: float = 0.5
) -> Ranged:
    """Equivalent veiling luminance for one lux at the eye.

    Parameters
    ----------
    angle : array_like of float
        Between line of sight and source, in [0, pi]. [rad]
    law : VeilLaw
        Which equation.
    age : float
        Of the observer, 0 to 120; not used by Stiles-Holladay. [yr]
    pigment : float
        Eye pigment factor, 0 (very dark) to 1.2 (very light); used by the general equation.

    Returns
    -------
    veil : Ranged
        ``value`` in cd/m² per lx; nan and not in range outside the angles of the law.

    References
    ----------
    ``law.source``.
    """
    years = float(within("age", age, 0.0, 120.0))
    p = float(within("pigment", pigment, 0.0, 1.2))
    theta = np.rad2deg(within("angle", angle, 0.0, np.pi))
    grain = 1e-9  # deg: the ends belong to the range, also after a turn through radians
    known = np.asarray((theta >= law.min_deg - grain) & (theta <= law.max_deg + grain))
    value = law.formula(np.where(known, theta, 1.0), years, p)
    return Ranged(np.where(known, value, np.nan), known)


def veiling_luminance(
    illuminance_lx: ArrayLike,
    *,
    angle: ArrayLike,
    law: VeilLaw = CIE_GENERAL,
    age: float = 50.0,
    pigment: float = 0.5,
) -> Veil:
    """Veiling luminance of several sources together.

    Parameters
    ----------
    illuminance_lx : (..., m) array_like of float
        Of each source at the eye, on the plane normal to the line of sight, >= 0. [lx]
    angle : (..., m) array_like of float
        Between line of sight and each source, in [0, pi]. [rad]
    law : VeilLaw
        Which equation.
    age : float
        Of the observer. [yr]
    pigment : float
        Eye pigment factor, 0 to 1.2.

    Returns
    -------
    veil : Veil
        Arrays of shape (...).
    """
    e, theta = np.broadcast_arrays(within("illuminance_lx", illuminance_lx), np.asarray(angle))
    if e.ndim < 1:
        raise InputError("illuminance_lx and angle must have an axis of sources")
    each = veil_per_lux(theta, law=law, age=age, pigment=pigment)
    lit = e > 0.0
    outside = lit & ~each.in_range
    close = outside & (np.rad2deg(theta) < law.min_deg)
    total = np.where(lit & each.in_range, e * each.value, 0.0).sum(axis=-1)
    too_close = np.asarray(close.any(axis=-1))
    return Veil(
        luminance=np.where(too_close, np.nan, total),
        too_close=too_close,
        left_out=np.asarray((outside & ~close).sum(axis=-1)),
    )


def threshold_increment(veil: ArrayLike, *, background: ArrayLike) -> Ranged:
    """Threshold increment of road lighting at night.

    Parameters
    ----------
    veil : array_like of float
        Veiling luminance, >= 0. [cd/m²]
    background : array_like of float
        Mean luminance of the road, >= 0. [cd/m²]

    Returns
    -------
    increment : Ranged
        ``value`` in percent; nan and not in range at or below 0.05 cd/m². It is a measure for
        the night: in daylight use :func:`contrast_left`.

    References
    ----------
    CIE 31 and CIE 140 / EN 13201: 65 L_v/L^0.8 up to 5 cd/m², 95 L_v/L^1.05 above.
    """
    v, scene = within("veil", veil), within("background", background)
    known = np.asarray(scene > 0.05)
    base = np.where(known, scene, 1.0)
    value = np.where(base <= 5.0, 65.0 * v / base**0.8, 95.0 * v / base**1.05)
    known = np.broadcast_to(known, value.shape)
    return Ranged(np.where(known, value, np.nan), known)


def contrast_left(veil: ArrayLike, *, background: ArrayLike) -> Floats:
    """Share of the contrast of a scene that is left behind a veil, L/(L + L_v).

    Parameters
    ----------
    veil : array_like of float
        Veiling luminance, >= 0. [cd/m²]
    background : array_like of float
        Luminance of the scene, > 0; a sunlit street has 10^3 to 10^4. [cd/m²]

    Returns
    -------
    share : ndarray of float
        In [0, 1].
    """
    scene = within("background", background, above=True)
    return np.asarray(scene / (scene + within("veil", veil)))


def rogue_angle(illuminance_lx: ArrayLike) -> Ranged:
    """Angle from the line of sight within which a reflection veils more than 500 cd/m².

    Parameters
    ----------
    illuminance_lx : array_like of float
        At the driver's eye, on the plane normal to the line of sight, >= 0. [lx]

    Returns
    -------
    angle : Ranged
        ``value`` in rad; in range where the angle is one that Stiles-Holladay covers, 1 to 30
        degrees.

    References
    ----------
    Hassall, *Reflectivity: dealing with rogue solar reflections* (1991): 10 E/theta² > 500 cd/m².
    Limit from memory, high; not read.
    """
    theta = np.sqrt(10.0 * within("illuminance_lx", illuminance_lx) / ROGUE_VEIL_LIMIT)
    known = (theta >= STILES_HOLLADAY.min_deg) & (theta <= STILES_HOLLADAY.max_deg)
    return Ranged(np.deg2rad(theta), np.asarray(known))
