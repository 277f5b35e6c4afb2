"""Skin: time to pain and burn, and the dose of a moving hot spot. Contact is in ``contact``.

Fluxes are W/m² here; the published laws are in kW/m² and are converted once, in
:class:`SkinLaw`. The laws take *total* absorbed flux: direct and diffuse sun count as much as
the reflection. No law is used outside its range without saying so: results carry ``in_range``.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike

from causticload.hazard._checks import Floats, Ranged, history, rising, within
from causticload.hazard.cautions import Confidence

__all__ = [
    "ASHRAE_55_ABSORPTANCE",
    "DESR_BURN",
    "EPA_BURN",
    "EPA_PAIN",
    "ISO_13571_BURN",
    "ISO_13571_PAIN",
    "OLDER_PAIN",
    "SFPE_PAIN",
    "SKIN_LAWS",
    "STOLL_BURN",
    "SUN_TURN_RATE",
    "WALKING_SPEED",
    "SkinLaw",
    "absorbed_flux",
    "crossing_dose",
    "dose",
    "icnirp_skin_limit",
    "image_dwell_s",
    "spot_crossing_dose",
    "spot_speed",
    "thermal_dose_units",
    "time_to_effect",
]

ASHRAE_55_ABSORPTANCE = 0.7  # solar absorptance of clothed people in the solar model of ASHRAE 55
WALKING_SPEED = 1.2  # m/s, design speed of pedestrians, common practice
SUN_TURN_RATE = 2.0 * np.pi / 86400.0  # rad/s of hour angle, 15 degrees an hour

# Thermal dose units, (kW/m²)^(4/3) s. Purser; UK HSE practice; from memory, medium.
TDU_PAIN = (80.0, 86.0)
TDU_SECOND_DEGREE = 240.0
TDU_DANGEROUS = 1000.0


@dataclass(frozen=True, kw_only=True)
class SkinLaw:
    """A power law for the time to an effect at constant flux: t = coefficient * q^-exponent.

    ``q`` is in kW/m², as published. ``flux_min`` and ``flux_max`` bound its range, W/m².
    """

    name: str
    effect: Literal["pain", "second-degree burn"]
    coefficient: float  # s at 1 kW/m²
    exponent: float
    flux_min: float  # W/m²
    flux_max: float  # W/m²
    harmless_below: bool  # the source says: no effect at or below flux_min, at any time
    source: str
    confidence: Confidence


ISO_13571_PAIN = SkinLaw(
    name="ISO 13571 pain",
    effect="pain",
    coefficient=4.2 * 60.0,
    exponent=1.9,
    flux_min=2500.0,
    flux_max=np.inf,
    harmless_below=True,
    source="ISO 13571:2012, t = 4.2 q^-1.9 min; no dose at or below 2.5 kW/m²",
    confidence="from memory, high",
)
ISO_13571_BURN = SkinLaw(
    name="ISO 13571 second-degree burn",
    effect="second-degree burn",
    coefficient=6.9 * 60.0,
    exponent=1.56,
    flux_min=2500.0,
    flux_max=np.inf,
    harmless_below=True,
    source="ISO 13571:2012, t = 6.9 q^-1.56 min, within 25 %; no dose at or below 2.5 kW/m²",
    confidence="published, read",
)
OLDER_PAIN = SkinLaw(
    name="older pain law",
    effect="pain",
    coefficient=4.0 * 60.0,
    exponent=1.35,
    flux_min=2500.0,
    flux_max=20000.0,
    harmless_below=False,
    source="t = 4 q^-1.35 min, used before ISO 13571:2012; range not stated, set here",
    confidence="published, read",
)
SFPE_PAIN = SkinLaw(
    name="SFPE pain",
    effect="pain",
    coefficient=35.0**1.33,
    exponent=1.33,
    flux_min=1700.0,
    flux_max=20000.0,
    harmless_below=True,
    source="SFPE Engineering Guide, Predicting 1st and 2nd Degree Skin Burns (2000), (35/q)^1.33 s",
    confidence="from memory, high",
)
STOLL_BURN = SkinLaw(
    name="Stoll and Chianta second-degree burn",
    effect="second-degree burn",
    coefficient=50.123 ** (1.0 / 0.7087),
    exponent=1.0 / 0.7087,
    flux_min=4500.0,
    flux_max=50000.0,
    harmless_below=False,
    source="Stoll & Chianta (1969) as fitted in ASTM F1939: q = 50.123 t^-0.7087, 1 to 30 s",
    confidence="published, read",
)
DESR_BURN = SkinLaw(
    name="DESR 6055 burn",
    effect="second-degree burn",
    coefficient=200.0,
    exponent=1.46,
    flux_min=2500.0,
    flux_max=20000.0,
    harmless_below=False,
    source="US DoD DESR 6055.09, t = 200 q^-1.46 s; range not stated, set here",
    confidence="published, read",
)
EPA_PAIN = SkinLaw(
    name="EPA handbook pain",
    effect="pain",
    coefficient=116.6,
    exponent=1.353,
    flux_min=1000.0,
    flux_max=12000.0,
    harmless_below=False,
    source="Fit (within 7 %) to FEMA/DOT/EPA, Handbook of Chemical Hazard Analysis "
    "Procedures (1989), Table 4.2",
    confidence="derived",
)
EPA_BURN = SkinLaw(
    name="EPA handbook second-degree burn",
    effect="second-degree burn",
    coefficient=596.0,
    exponent=1.643,
    flux_min=1000.0,
    flux_max=12000.0,
    harmless_below=False,
    source="Fit (within 11 %) to FEMA/DOT/EPA, Handbook of Chemical Hazard Analysis "
    "Procedures (1989), Table 4.2",
    confidence="derived",
)

SKIN_LAWS: dict[str, SkinLaw] = {
    law.name: law
    for law in (
        ISO_13571_PAIN,
        ISO_13571_BURN,
        OLDER_PAIN,
        SFPE_PAIN,
        STOLL_BURN,
        DESR_BURN,
        EPA_PAIN,
        EPA_BURN,
    )
}


def absorbed_flux(
    *,
    direct: ArrayLike,
    reflected: ArrayLike,
    diffuse: ArrayLike = 0.0,
    absorptance: ArrayLike = 1.0,
) -> Floats:
    """Flux that the skin takes up.

    Parameters
    ----------
    direct : array_like of float
        Irradiance straight from the sun on the skin, >= 0. [W/m²]
    reflected : array_like of float
        Irradiance by reflection on the same skin, >= 0. [W/m²]
    diffuse : array_like of float
        Irradiance from the sky and the ground, >= 0. [W/m²]
    absorptance : array_like of float
        Share absorbed, in [0, 1]. 1 is the upper bound; ASHRAE 55 uses 0.7.

    Returns
    -------
    absorbed : ndarray of float
        Broadcast shape of the arguments. [W/m²]
    """
    total = within("direct", direct) + within("reflected", reflected) + within("diffuse", diffuse)
    return np.asarray(within("absorptance", absorptance, 0.0, 1.0) * total)


def time_to_effect(flux: ArrayLike, *, law: SkinLaw, extrapolate: bool = False) -> Ranged:
    """Time to pain or burn at constant flux.

    Parameters
    ----------
    flux : array_like of float
        Absorbed flux, >= 0. [W/m²]
    law : SkinLaw
        Which law.
    extrapolate : bool
        True: the bare formula also outside its range; ``in_range`` still says where.

    Returns
    -------
    times : Ranged
        ``value`` in s. Where the source says that a flux has no effect: inf, in range. Elsewhere
        outside the range: nan, not in range.

    References
    ----------
    ``law.source``.
    """
    q = within("flux", flux) / 1000.0
    harmless = law.harmless_below & (q * 1000.0 <= law.flux_min)
    known = (q * 1000.0 >= law.flux_min) & (q * 1000.0 <= law.flux_max) & ~harmless
    with np.errstate(divide="ignore"):  # no flux: never
        bare = law.coefficient * q**-law.exponent
    if extrapolate:
        return Ranged(bare, known | harmless)
    return Ranged(np.where(known, bare, np.where(harmless, np.inf, np.nan)), known | harmless)


def _mean_power(low: Floats, high: Floats, n: float) -> Floats:
    """Mean of q^n while q goes evenly from ``low`` to ``high``, 0 <= low <= high."""
    alive = high > 1e-100  # below it the quotients underflow, and the mean is nothing
    high = np.where(alive, high, 1.0)
    low = np.where(alive, low, 1.0)
    width = high - low
    near = width <= 1e-4 * high  # the quotient would lose digits
    middle = (low + high) / 2.0
    series = middle**n * (1.0 + n * (n - 1.0) / 24.0 * (width / middle) ** 2)
    quotient = (high ** (n + 1.0) - low ** (n + 1.0)) / ((n + 1.0) * np.where(near, 1.0, width))
    return np.asarray(np.where(alive, np.where(near, series, quotient), 0.0))


def _integral_of_power(times: Floats, q: Floats, n: float, floor: float) -> Floats:
    """Integral over time of q^n while q > floor; q linear between the times. Exact."""
    first, last = q[:-1], q[1:]
    low, high = np.minimum(first, last), np.maximum(first, last)
    rise = high - low
    cut = np.clip(low, floor, np.maximum(high, floor))
    above = np.maximum(high - cut, 0.0)
    share = np.where(rise > 0.0, above / np.where(rise > 0.0, rise, 1.0), high > floor)
    steps = np.diff(times).reshape(-1, *([1] * (q.ndim - 1)))
    mean = _mean_power(np.minimum(cut, high), high, n)
    return np.asarray((steps * share * mean).sum(axis=0))


def dose(times_s: ArrayLike, flux: ArrayLike, *, law: SkinLaw) -> Ranged:
    """Dose of a changing flux: the integral of dt / t(q). The effect is reached at 1.

    Flux is taken as linear between the times, and the power law is integrated in closed form, so
    coarse steps add no error of their own. Where the source says that a flux has no effect, it
    adds nothing. Elsewhere outside the range the formula is followed and ``in_range`` is False.

    Parameters
    ----------
    times_s : (t,) array_like of float
        Rising times. [s]
    flux : (t, ...) array_like of float
        Absorbed flux at these times, >= 0. [W/m²]
    law : SkinLaw
        Which law.

    Returns
    -------
    dose : Ranged
        ``value`` of shape (...), dimensionless; ``in_range`` False where any flux of the history
        is outside the range of the law.

    References
    ----------
    ISO 13571:2012 (fractional effective dose of heat); the law's own source.
    """
    t = rising("times_s", times_s)
    q = history("flux", flux, len(t))
    floor = law.flux_min if law.harmless_below else 0.0
    value = _integral_of_power(t, q / 1000.0, law.exponent, floor / 1000.0) / law.coefficient
    inside = q <= law.flux_max
    if not law.harmless_below:
        inside &= q >= law.flux_min
    return Ranged(value, np.asarray(inside.all(axis=0)))


def thermal_dose_units(times_s: ArrayLike, flux: ArrayLike) -> Floats:
    """Thermal dose, the integral of q^(4/3) dt, with q in kW/m².

    Bands from memory (medium confidence): pain about 80 to 86, second-degree burn from about
    240, "dangerous dose" 1000.

    Parameters
    ----------
    times_s : (t,) array_like of float
        Rising times. [s]
    flux : (t, ...) array_like of float
        Absorbed flux at these times, >= 0. [W/m²]

    Returns
    -------
    dose : ndarray of float
        Shape (...). [(kW/m²)^(4/3) s]
    """
    t = rising("times_s", times_s)
    return _integral_of_power(t, history("flux", flux, len(t)) / 1000.0, 4.0 / 3.0, 0.0)


def crossing_dose(
    path_m: ArrayLike, flux: ArrayLike, *, law: SkinLaw, speed: float = WALKING_SPEED
) -> Ranged:
    """Dose of a person who walks along a path through a load that stands still.

    Parameters
    ----------
    path_m : (t,) array_like of float
        Rising distances along the path. [m]
    flux : (t, ...) array_like of float
        Absorbed flux there, >= 0. [W/m²]
    law : SkinLaw
        Which law.
    speed : float
        Walking speed, > 0. [m/s]

    Returns
    -------
    dose : Ranged
        As from :func:`dose`.
    """
    pace = float(within("speed", speed, above=True))
    return dose(rising("path_m", path_m) / pace, flux, law=law)


def spot_crossing_dose(
    *,
    flux: ArrayLike,
    diameter_m: ArrayLike,
    law: SkinLaw,
    speed: ArrayLike = WALKING_SPEED,
    offset_m: ArrayLike = 0.0,
) -> Ranged:
    """Dose while a round spot of even flux and a person pass each other in a straight line.

    With the peak as the flux this is an upper bound for a spot that fades to its edge. For a
    person who stands still, give the speed of the spot (:func:`spot_speed`).

    Parameters
    ----------
    flux : array_like of float
        Absorbed flux within the spot, sun and sky included, >= 0. [W/m²]
    diameter_m : array_like of float
        Diameter of the spot, > 0. [m]
    law : SkinLaw
        Which law.
    speed : array_like of float
        Speed of the person relative to the spot, > 0. [m/s]
    offset_m : array_like of float
        Distance of the line from the middle of the spot. [m]

    Returns
    -------
    dose : Ranged
        ``value`` in the broadcast shape, dimensionless, by the formula of the law also where it
        is out of range; flux at or below a harmless level gives 0.
    """
    width = within("diameter_m", diameter_m, above=True)
    chord = np.sqrt(np.maximum(width**2 - 4.0 * np.square(np.asarray(offset_m, float)), 0.0))
    seconds = chord / within("speed", speed, above=True)
    bare = time_to_effect(flux, law=law, extrapolate=True)
    q = np.asarray(flux, dtype=np.float64)
    harmless = law.harmless_below & (q <= law.flux_min)
    value = np.where(harmless, 0.0, seconds / bare.value)
    return Ranged(value, np.broadcast_to(bare.in_range, value.shape))


def spot_speed(distance_m: ArrayLike, *, declination: ArrayLike = 0.0) -> Floats:
    """Speed, across the beam, of the sun's image from a fixed flat mirror.

    The reflected beam turns as fast as the sun does.

    Parameters
    ----------
    distance_m : array_like of float
        Distance from mirror to image, >= 0. [m]
    declination : array_like of float
        Declination of the sun, in [-pi/2, pi/2]. [rad]

    Returns
    -------
    speed : ndarray of float
        [m/s]
    """
    tilt = np.cos(within("declination", declination, -np.pi / 2.0, np.pi / 2.0))
    return np.asarray(within("distance_m", distance_m) * SUN_TURN_RATE * tilt)


def image_dwell_s(sun_diameter: ArrayLike, *, declination: ArrayLike = 0.0) -> Floats:
    """Time in which the sun's image moves by its own diameter.

    Parameters
    ----------
    sun_diameter : array_like of float
        Angular diameter of the sun, > 0. [rad]
    declination : array_like of float
        Declination of the sun, inside (-pi/2, pi/2). [rad]

    Returns
    -------
    dwell : ndarray of float
        [s]
    """
    size = within("sun_diameter", sun_diameter, above=True)
    tilt = np.cos(within("declination", declination, -1.57, 1.57))
    return np.asarray(size / (SUN_TURN_RATE * tilt))


def icnirp_skin_limit(duration_s: ArrayLike) -> Ranged:
    """Irradiance that skin should not exceed for a given time, 380 to 3000 nm.

    Parameters
    ----------
    duration_s : array_like of float
        Duration of the exposure, > 0. [s]

    Returns
    -------
    limit : Ranged
        ``value`` in W/m². The limit is for times up to 10 s; beyond: nan, not in range.

    References
    ----------
    ICNIRP broadband guidelines and Directive 2006/25/EC: H <= 20 000 t^0.25 J/m² (number from
    memory, high).
    """
    t = within("duration_s", duration_s, above=True)
    known = np.asarray(t <= 10.0)
    return Ranged(np.where(known, 20000.0 * t**-0.75, np.nan), known)
