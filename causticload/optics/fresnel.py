"""Reflection at one smooth interface: Fresnel's equations, for glass and for metal."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from causticload.errors import InputError

Floats = NDArray[np.float64]

GRAZING = 1e-6  # cosine of incidence below which nothing changes any more


def check_cosine(cos_i: Floats) -> Floats:
    """Refuse what is not the cosine of an angle of incidence.

    Parameters
    ----------
    cos_i : (n,) float
        Must be in [0, 1]. [1]

    Returns
    -------
    cos_i : (n,) float
        As an array of floats. [1]

    Raises
    ------
    InputError
        If a value is out of range or not a number.
    """
    cos_i = np.asarray(cos_i, dtype=float)
    bad = np.flatnonzero(~((cos_i >= 0.0) & (cos_i <= 1.0)))  # nan lands here too
    if bad.size:
        raise InputError(f"cos_i[{bad[0]}] must be in [0, 1], got {cos_i.ravel()[bad[0]]}")
    return cos_i


def cosine_of(theta: Floats) -> Floats:
    """Cosine of angles of incidence, held off grazing by an angle that no result can see.

    At grazing incidence itself everything is reflected, and sums over multiple reflections
    would divide nothing by nothing.

    Parameters
    ----------
    theta : (n,) float
        Angle of incidence, in [0, pi/2]. [rad]

    Returns
    -------
    cos_i : (n,) float
        In [1e-6, 1]. [1]

    Raises
    ------
    InputError
        If an angle is out of range or not a number.
    """
    theta = np.atleast_1d(np.asarray(theta, dtype=float))
    bad = np.flatnonzero(~((theta >= 0.0) & (theta <= np.pi / 2)))
    if bad.size:
        raise InputError(f"theta[{bad[0]}] must be in [0, pi/2] rad, got {theta[bad[0]]}")
    return np.cos(theta).clip(GRAZING, 1.0)


def interface_reflectance(cos_i: Floats, *, eta: float) -> Floats:
    """Reflectance of a smooth, lossless dielectric interface.

    Parameters
    ----------
    cos_i : (n,) float
        Cosine of the angle of incidence, in [0, 1]. [1]
    eta : float
        Refractive index beyond the interface over the index before it, > 0. [1]

    Returns
    -------
    reflectance : (2, n) float
        For s and p polarisation. Exactly 1 past the critical angle and at grazing incidence. [1]

    Raises
    ------
    InputError
        If an argument is out of range.

    References
    ----------
    Fresnel's equations: Born & Wolf, *Principles of Optics*, chapter 1.
    """
    if not 0.0 < eta < np.inf:
        raise InputError(f"eta must be > 0, got {eta!r}")
    cos_i = check_cosine(cos_i)
    sin2_t = (1.0 - cos_i**2) / eta**2  # Snell
    cos_t = np.sqrt(np.maximum(0.0, 1.0 - sin2_t))
    with np.errstate(invalid="ignore"):  # 0/0 where eta = 1 at grazing, replaced just below
        r_s = (cos_i - eta * cos_t) / (cos_i + eta * cos_t)
        r_p = (eta * cos_i - cos_t) / (eta * cos_i + cos_t)
    return np.where((sin2_t >= 1.0) | (cos_i == 0.0), 1.0, np.stack([r_s**2, r_p**2]))


def metal_reflectance(cos_i: Floats, *, n: float, k: float) -> Floats:
    """Reflectance of a smooth metal in air.

    Parameters
    ----------
    cos_i : (n,) float
        Cosine of the angle of incidence, in [0, 1]. [1]
    n, k : float
        Real and imaginary part of the refractive index, n > 0, k >= 0. [1]

    Returns
    -------
    reflectance : (2, n) float
        For s and p polarisation. Exactly 1 at grazing incidence. [1]

    Raises
    ------
    InputError
        If an argument is out of range.

    References
    ----------
    Fresnel's equations with a complex index: Born & Wolf, *Principles of Optics*, chapter on the
    optics of metals.
    """
    if not (n > 0.0 and k >= 0.0 and np.isfinite(n + k)):
        raise InputError(f"index must have n > 0 and k >= 0, got n={n!r}, k={k!r}")
    cos_i = check_cosine(cos_i)
    m = complex(n, k)
    cos_t = np.sqrt(1.0 - (1.0 - cos_i**2) / m**2)
    with np.errstate(invalid="ignore"):  # 0/0 where n = 1, k = 0 at grazing, replaced just below
        r_s = (cos_i - m * cos_t) / (cos_i + m * cos_t)
        r_p = (m * cos_i - cos_t) / (m * cos_i + cos_t)
    return np.where(cos_i == 0.0, 1.0, np.abs(np.stack([r_s, r_p])) ** 2)
