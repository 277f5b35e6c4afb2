"""How a data sheet's figure at normal incidence goes on to other angles.

``coated glass`` is an engineering closure: no published law gives the *reflectance* of an unknown
coating over angle. It scales the share that is not reflected like that of an uncoated pane,

    R(theta) = 1 - (1 - R0) (1 - R_slab(theta)) / (1 - R_slab(0)).

Against thin-film calculations of four coatings on 6 mm glass at 60, 75 and 85 degrees it was low
by up to 0.09 for silver coatings, and high by up to 0.19 for absorbing metallic ones (computed
for this project). That range is carried along as a band.
"""

from __future__ import annotations

import numpy as np
from scipy.interpolate import PchipInterpolator
from scipy.optimize import brentq

from causticload.errors import InputError
from causticload.optics.finish import Law
from causticload.optics.fresnel import Floats, interface_reflectance, metal_reflectance
from causticload.optics.stack import GLASS_INDEX, Pane, pane_reflectances

# The closure's largest errors at 60, 75 and 85 degrees, silver (low) and absorbing (high).
_BAND_ANGLE = np.radians([0.0, 40.0, 60.0, 75.0, 85.0, 90.0])
_BAND = np.array([0.0, 0.02, 0.07, 0.16, 0.17, 0.0])

PANE_6MM = Pane(thickness=0.006, extinction=20.0)  # clear float (common practice)


def _check_pair(solar: float, visible: float) -> None:
    for name, value in (("solar", solar), ("visible", visible)):
        if not 0.0 <= value <= 1.0:
            raise InputError(f"{name} reflectance must be in [0, 1], got {value!r}")


def lossless_slab(cos_i: Floats) -> Floats:
    """Reflectance of one lossless pane.

    Parameters
    ----------
    cos_i : (n,) float
        Cosine of the angle of incidence. [1]

    Returns
    -------
    reflectance : (2, n) float
        For s and p polarisation: 2 r / (1 + r). [1]
    """
    r = interface_reflectance(cos_i, eta=GLASS_INDEX)
    return 2.0 * r / (1.0 + r)


def constant(solar: float, visible: float) -> Law:
    """Build the same reflectance at every angle.

    Parameters
    ----------
    solar, visible : float
        Reflectance, in [0, 1]. [1]

    Returns
    -------
    law : callable
        See :data:`causticload.optics.finish.Law`.
    """
    _check_pair(solar, visible)

    def law(cos_i: Floats) -> Floats:
        one = np.ones((2, np.size(cos_i)))
        return np.stack([solar * one, visible * one])

    return law


def coated_glass(solar: float, visible: float) -> Law:
    """Build the closure for coated glass.

    Parameters
    ----------
    solar, visible : float
        Reflectance at normal incidence, in [0, 1]. [1]

    Returns
    -------
    law : callable
        See :data:`causticload.optics.finish.Law`.
    """
    _check_pair(solar, visible)
    slab0 = float(lossless_slab(np.array([1.0]))[0, 0])

    def law(cos_i: Floats) -> Floats:
        kept = (1.0 - lossless_slab(cos_i)) / (1.0 - slab0)
        return np.stack([1.0 - (1.0 - r0) * kept for r0 in (solar, visible)]).clip(0.0, 1.0)

    return law


def coated_band(cos_i: Floats) -> Floats:
    """Half width of what the closure leaves open.

    Parameters
    ----------
    cos_i : (n,) float
        Cosine of the angle of incidence. [1]

    Returns
    -------
    band : (2, 2, n) float
        For both bands and polarisations. [1]
    """
    half = np.interp(np.arccos(np.clip(cos_i, 0.0, 1.0)), _BAND_ANGLE, _BAND)
    return np.broadcast_to(half, (2, 2, len(half)))


def clear_glass(panes: int, solar: float | None, visible: float | None) -> Law:
    """Build uncoated glass by Fresnel's equations.

    Parameters
    ----------
    panes : int
        Number of panes, 1 to 4.
    solar, visible : float or None
        Reflectance at normal incidence: the glass's absorption is chosen to meet it. None for
        6 mm clear float. [1]

    Returns
    -------
    law : callable
        See :data:`causticload.optics.finish.Law`.

    Raises
    ------
    InputError
        If no absorption meets the figure: clear glass cannot reflect so much or so little.
    """
    if not 1 <= panes <= 4:
        raise InputError(f"a unit must have 1 to 4 panes, got {panes!r}")
    stacks = [_panes_meeting(panes, r0) for r0 in (solar, visible)]

    def law(cos_i: Floats) -> Floats:
        return np.stack([pane_reflectances(s, cos_i).sum(axis=0) for s in stacks])

    return law


def _panes_meeting(panes: int, r0: float | None) -> list[Pane]:
    if r0 is None:
        return [PANE_6MM] * panes
    one = np.array([1.0])

    def miss(extinction: float) -> float:
        unit = [Pane(thickness=0.006, extinction=extinction)] * panes
        return float(pane_reflectances(unit, one).sum(axis=0)[0, 0]) - r0

    most, least = r0 + miss(0.0), r0 + miss(2000.0)
    if not least <= r0 <= most + 5e-4:
        raise InputError(
            f"{panes} pane(s) of clear glass reflect {least:.3f} to {most:.3f} at normal "
            f"incidence, got {r0}",
            hint="Use angular = 'coated glass' for a coated unit.",
        )
    extinction = 0.0 if r0 >= most else float(brentq(miss, 0.0, 2000.0))
    return [Pane(thickness=0.006, extinction=extinction)] * panes


def metal(solar: float, visible: float) -> Law:
    """Build a metal whose reflectance at normal incidence is given.

    The ratio of the real to the imaginary part of the index is kept between that of aluminium and
    that of iron by the reflectance itself (n = 1 + 2 (1 - R0)); the imaginary part follows. Up to
    60 degrees the choice hardly matters: metals are nearly flat there.

    Parameters
    ----------
    solar, visible : float
        Reflectance at normal incidence, in [0, 1). [1]

    Returns
    -------
    law : callable
        See :data:`causticload.optics.finish.Law`.
    """
    _check_pair(solar, visible)
    indices = [_index_of(r0) for r0 in (solar, visible)]

    def law(cos_i: Floats) -> Floats:
        return np.stack([metal_reflectance(cos_i, n=n, k=k) for n, k in indices])

    return law


def _index_of(r0: float) -> tuple[float, float]:
    """Index n + i k with reflectance r0 at normal incidence: ((n-1)² + k²) / ((n+1)² + k²)."""
    if not r0 < 1.0:
        raise InputError(f"a metal reflects less than 1, got {r0!r}")
    n = 1.0 + 2.0 * (1.0 - r0)
    k2 = (r0 * (n + 1.0) ** 2 - (n - 1.0) ** 2) / (1.0 - r0)
    if k2 < 0.0:  # less than a dielectric of this index reflects: lower the index to fit
        root = np.sqrt(r0)
        return float((1.0 + root) / (1.0 - root)), 0.0
    return n, float(np.sqrt(k2))


def complex_index(n: float, k: float) -> Law:
    """Build a metal of a given index, the same in both bands.

    Parameters
    ----------
    n, k : float
        Real and imaginary part. [1]

    Returns
    -------
    law : callable
        See :data:`causticload.optics.finish.Law`.
    """
    metal_reflectance(np.array([1.0]), n=n, k=k)  # checks the values

    def law(cos_i: Floats) -> Floats:
        R = metal_reflectance(cos_i, n=n, k=k)
        return np.stack([R, R])

    return law


def table(rows: Floats) -> Law:
    """Interpolate measured reflectances over angle, both polarisations alike.

    Parameters
    ----------
    rows : (r, 2) or (r, 3) float
        Angle in degrees from 0, solar and visible reflectance (visible as solar if it is not
        given). Beyond the last angle the curve runs to 1 at 90 degrees.

    Returns
    -------
    law : callable
        See :data:`causticload.optics.finish.Law`.

    Raises
    ------
    InputError
        If there are fewer than two rows, or angles do not rise from 0.
    """
    rows = np.asarray(rows, dtype=float)
    if rows.ndim != 2 or len(rows) < 2 or rows.shape[1] not in (2, 3):
        raise InputError("a table must have at least two rows of angle, solar[, visible]")
    angle = rows[:, 0]
    if angle[0] != 0.0 or (np.diff(angle) <= 0.0).any() or angle[-1] > 90.0:
        raise InputError("angles of a table must start at 0 and rise up to 90 degrees")
    values = rows[:, [1, -1]]
    if not ((values >= 0.0) & (values <= 1.0)).all():
        raise InputError("reflectances of a table must be in [0, 1]")
    if angle[-1] < 90.0:
        angle, values = np.r_[angle, 90.0], np.vstack([values, [1.0, 1.0]])
    curves = [PchipInterpolator(angle, v) for v in values.T]

    def law(cos_i: Floats) -> Floats:
        theta = np.degrees(np.arccos(np.clip(cos_i, 0.0, 1.0)))
        return np.stack([np.tile(curve(theta), (2, 1)) for curve in curves]).clip(0.0, 1.0)

    return law
