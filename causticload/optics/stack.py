"""Glazing as a stack of panes: incoherent reflections between all surfaces.

A pane is two surfaces and the glass between them; light that goes to and fro is added up as
power, not as waves, since panes are thousands of wavelengths thick. Powers are carried for s and
p polarisation apart.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from causticload.errors import InputError
from causticload.optics.fresnel import Floats, interface_reflectance

GLASS_INDEX = 1.52  # soda-lime float glass (common practice)
GRAZING = 1e-6  # cosine of incidence below which nothing changes any more


@dataclass(frozen=True, kw_only=True)
class Pane:
    """One pane of uncoated glass.

    ``extinction`` times ``thickness`` is the exponent of what the glass takes away at normal
    incidence.
    """

    thickness: float  # m
    extinction: float  # 1/m
    index: float = GLASS_INDEX


@dataclass(frozen=True)
class Slab:
    """Reflectance and transmittance of a layer for light from either side, (2, n) each."""

    R: Floats  # from the front
    R_back: Floats
    T: Floats


def pane_slab(pane: Pane, cos_i: Floats) -> Slab:
    """Reflect and transmit at one pane.

    Parameters
    ----------
    pane : Pane
        The pane.
    cos_i : (n,) float
        Cosine of the angle of incidence. [1]

    Returns
    -------
    slab : Slab
        For s and p polarisation.

    Raises
    ------
    InputError
        If the pane's data are out of range.
    """
    if not (pane.thickness > 0.0 and pane.extinction >= 0.0 and pane.index >= 1.0):
        raise InputError(
            f"a pane must have thickness > 0, extinction >= 0 and index >= 1, got {pane!r}"
        )
    # At grazing incidence itself all is reflected and the sums below would divide by nothing.
    cos_i = np.maximum(np.asarray(cos_i, dtype=float), GRAZING)
    r = interface_reflectance(cos_i, eta=pane.index)
    cos_t = np.sqrt(1.0 - (1.0 - cos_i**2) / pane.index**2)
    a = np.exp(-pane.extinction * pane.thickness / cos_t)
    T = (1.0 - r) ** 2 * a / (1.0 - (r * a) ** 2)
    R = r * (1.0 + a * T)
    return Slab(R, R, T)


def pane_reflectances(panes: Sequence[Pane], cos_i: Floats) -> Floats:
    """Split the reflectance of a glazing unit among its panes.

    Parameters
    ----------
    panes : sequence of Pane
        From outdoors inwards, with gaps between.
    cos_i : (n,) float
        Cosine of the angle of incidence. [1]

    Returns
    -------
    reflectance : (panes, 2, n) float
        What each pane adds to the light sent back outdoors, for s and p polarisation. The rows
        add up to the unit's reflectance. [1]

    Raises
    ------
    InputError
        If there are no panes, or their data are out of range.
    """
    if not panes:
        raise InputError("a glazing unit must have at least one pane")
    front = pane_slab(panes[0], cos_i)
    added = [front.R]
    for pane in panes[1:]:
        slab = pane_slab(pane, cos_i)
        loop = 1.0 / (1.0 - front.R_back * slab.R)
        added.append(front.T**2 * slab.R * loop)
        front = Slab(
            R=front.R + added[-1],
            R_back=slab.R_back + slab.T**2 * front.R_back * loop,
            T=front.T * slab.T * loop,
        )
    return np.stack(added)


def unit_transmittance(panes: Sequence[Pane], cos_i: Floats) -> Floats:
    """Transmittance of a glazing unit.

    Parameters
    ----------
    panes : sequence of Pane
        From outdoors inwards.
    cos_i : (n,) float
        Cosine of the angle of incidence. [1]

    Returns
    -------
    transmittance : (2, n) float
        For s and p polarisation. [1]
    """
    front = pane_slab(panes[0], cos_i)
    for pane in panes[1:]:
        slab = pane_slab(pane, cos_i)
        loop = 1.0 / (1.0 - front.R_back * slab.R)
        front = Slab(
            R=front.R + front.T**2 * slab.R * loop,
            R_back=slab.R_back + slab.T**2 * front.R_back * loop,
            T=front.T * slab.T * loop,
        )
    return front.T
