"""Reflection at one smooth interface: Fresnel's equations, for glass and for metal."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from causticload.errors import InputError

Floats = NDArray[np.float64]


def _check_cosine(cos_i: Floats) -> Floats:
    cos_i = np.asarray(cos_i, dtype=float)
    bad = np.flatnonzero(~((cos_i >= 0.0) & (cos_i <= 1.0)))  # nan lands here too
    if bad.size:
        raise InputError(f"cos_i[{bad[0]}] must be in [0, 1], got {cos_i.ravel()[bad[0]]}")
    return cos_i


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
        For s and p polarisation. Exactly 1 past the critical angle. [1]

    Raises
    ------
    InputError
        If an argument is out of range.

    References
    ----------
    Fresnel's equations, as in any text on optics.
    """
    if not 0.0 < eta < np.inf:
        raise InputError(f"eta must be > 0, got {eta!r}")
    cos_i = _check_cosine(cos_i)
    sin2_t = (1.0 - cos_i**2) / eta**2  # Snell
    cos_t = np.sqrt(np.maximum(0.0, 1.0 - sin2_t))
    with np.errstate(invalid="ignore"):  # 0/0 where eta = 1 at grazing, replaced just below
        r_s = (cos_i - eta * cos_t) / (cos_i + eta * cos_t)
        r_p = (eta * cos_i - cos_t) / (eta * cos_i + cos_t)
    R = np.where(sin2_t >= 1.0, 1.0, np.stack([r_s**2, r_p**2]))
    return np.where(cos_i == 0.0, 1.0, R)


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
        For s and p polarisation. [1]

    Raises
    ------
    InputError
        If an argument is out of range.

    References
    ----------
    Fresnel's equations with a complex index.
    """
    if not (n > 0.0 and k >= 0.0 and np.isfinite(n + k)):
        raise InputError(f"index must have n > 0 and k >= 0, got n={n!r}, k={k!r}")
    cos_i = _check_cosine(cos_i).astype(complex)
    m = complex(n, k)
    cos_t = np.sqrt(1.0 - (1.0 - cos_i**2) / m**2)
    r_s = (cos_i - m * cos_t) / (cos_i + m * cos_t)
    r_p = (m * cos_i - cos_t) / (m * cos_i + cos_t)
    return np.stack([np.abs(r_s) ** 2, np.abs(r_p) ** 2])
