"""Glazing as a stack of panes: incoherent reflections between all surfaces.

A pane is two surfaces and the glass between them; light that goes to and fro is added up as
power, not as waves, since panes are thousands of wavelengths thick. Powers are carried for s and
p polarisation, and for the solar and visible bands, apart.

Surfaces are numbered from outdoors: 1 and 2 are the faces of the outer pane, 3 and 4 those of the
next.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import NamedTuple, Protocol

import numpy as np

from causticload.errors import InputError
from causticload.optics.fresnel import Floats, cosine_of, interface_reflectance

GLASS_INDEX = 1.52  # soda-lime float glass (common practice)
MOST_PANES = 4


class Layer(NamedTuple):
    """What a surface, a pane or a unit does to light from either side.

    Arrays of (..., 2, 2, n): solar and visible band, s and p polarisation, angles. A length of 1
    stands for all; leading axes are free (a spectral coating has one for the wavelength).
    """

    R: Floats  # reflected, light from outdoors
    R_back: Floats  # reflected, light from indoors
    T: Floats  # transmitted, the same both ways


class Coating(Protocol):
    """A thin film between air and glass."""

    def layer(self, cos_i: Floats) -> Layer:
        """Return what the film does: ``R`` seen from the air, ``R_back`` seen from the glass.

        Parameters
        ----------
        cos_i : (n,) float
            Cosine of the angle of incidence *in air*, on either side. [1]

        Returns
        -------
        layer : Layer
            Reflectances and transmittance.
        """
        ...


@dataclass(frozen=True, kw_only=True)
class Pane:
    """One pane of glass.

    ``extinction`` times ``thickness`` is the exponent of what the glass takes away at normal
    incidence. Typical of clear float: 20 per metre solar and 6 visible, from memory; they meet
    the data-sheet transmittances of 6 mm glass, about 0.81 and 0.88.
    """

    thickness: float = 0.006  # m
    extinction: tuple[float, float] = (20.0, 6.0)  # 1/m, solar and visible
    index: float = GLASS_INDEX

    def __post_init__(self) -> None:
        if not (
            0.0 < self.thickness < 1.0
            and all(0.0 <= e < np.inf for e in self.extinction)
            and 1.0 <= self.index < np.inf
        ):
            raise InputError(
                "a pane must have thickness in (0, 1) m, extinction >= 0 and index >= 1, "
                f"got {self!r}"
            )


@dataclass(frozen=True, kw_only=True)
class Glazing:
    """A glazing unit: panes from outdoors inwards, coatings on numbered surfaces, gaps.

    Gas in the gaps takes no light, so their width does not touch the reflectance; it is kept for
    those who ask how panes bow.
    """

    panes: tuple[Pane, ...]
    coatings: Mapping[int, Coating] = field(default_factory=lambda: MappingProxyType({}))
    gaps: tuple[float, ...] = ()  # m; empty: not known

    def __post_init__(self) -> None:
        if not 1 <= len(self.panes) <= MOST_PANES:
            raise InputError(
                f"a glazing unit must have 1 to {MOST_PANES} panes, got {len(self.panes)}"
            )
        for surface in self.coatings:
            if not 1 <= surface <= 2 * len(self.panes):
                raise InputError(
                    f"a unit of {len(self.panes)} pane(s) has surfaces 1 to "
                    f"{2 * len(self.panes)}, got a coating on surface {surface}"
                )
        if self.gaps and len(self.gaps) != len(self.panes) - 1:
            raise InputError(
                f"{len(self.panes)} pane(s) have {len(self.panes) - 1} gap(s) between, "
                f"got {len(self.gaps)}"
            )
        if not all(0.0 < gap < np.inf for gap in self.gaps):
            raise InputError(f"gaps must be wider than 0, got {self.gaps!r}")

    def pane_layers(self, cos_i: Floats) -> list[Layer]:
        """Return each pane as a layer of its own, from outdoors inwards.

        Parameters
        ----------
        cos_i : (n,) float
            Cosine of the angle of incidence, > 0. [1]

        Returns
        -------
        layers : list of Layer
            One for each pane.
        """
        return [
            pane_layer(pane, cos_i, self.coatings.get(2 * k + 1), self.coatings.get(2 * k + 2))
            for k, pane in enumerate(self.panes)
        ]

    def pane_reflectances(self, theta: Floats) -> Floats:
        """Split the reflectance of the unit among its panes.

        Parameters
        ----------
        theta : (n,) float
            Angle of incidence, in [0, pi/2]. [rad]

        Returns
        -------
        reflectance : (panes, ..., 2, 2, n) float
            What each pane adds to the light sent back outdoors: the outer pane its own
            reflectance, each further pane the light that it turns back and that finds its way out
            again. Solar and visible band by s and p. They add up to the unit's reflectance. [1]
        """
        return _added(self.pane_layers(cosine_of(theta)))[0]

    def unit_reflectance(self, theta: Floats) -> Floats:
        """Reflectance of the whole unit, from outdoors.

        Parameters
        ----------
        theta : (n,) float
            Angle of incidence, in [0, pi/2]. [rad]

        Returns
        -------
        reflectance : (..., 2, 2, n) float
            Solar and visible band by s and p. [1]
        """
        return _added(self.pane_layers(cosine_of(theta)))[1].R

    def unit_transmittance(self, theta: Floats) -> Floats:
        """Transmittance of the whole unit.

        Parameters
        ----------
        theta : (n,) float
            Angle of incidence, in [0, pi/2]. [rad]

        Returns
        -------
        transmittance : (..., 2, 2, n) float
            Solar and visible band by s and p. [1]
        """
        return _added(self.pane_layers(cosine_of(theta)))[1].T


def bare_surface(cos_i: Floats, index: float) -> Layer:
    """Describe uncoated glass against air, from the air side.

    Parameters
    ----------
    cos_i : (n,) float
        Cosine of the angle of incidence in air. [1]
    index : float
        Refractive index of the glass. [1]

    Returns
    -------
    layer : Layer
        Lossless, and the same from both sides at corresponding angles.
    """
    r = interface_reflectance(cos_i, eta=index)[None]
    return Layer(r, r, 1.0 - r)


def pane_layer(
    pane: Pane, cos_i: Floats, front: Coating | None = None, back: Coating | None = None
) -> Layer:
    """Describe one pane with what is on its two faces.

    Parameters
    ----------
    pane : Pane
        The glass.
    cos_i : (n,) float
        Cosine of the angle of incidence in air, > 0. [1]
    front, back : Coating, optional
        On the outdoor and the indoor face.

    Returns
    -------
    layer : Layer
        Arrays (..., 2, 2, n).
    """
    one = front.layer(cos_i) if front else bare_surface(cos_i, pane.index)
    air, glass, T = back.layer(cos_i) if back else bare_surface(cos_i, pane.index)
    cos_t = np.sqrt(1.0 - (1.0 - cos_i**2) / pane.index**2)
    path = pane.thickness / cos_t
    through = np.exp(-np.multiply.outer(pane.extinction, path))[:, None, :]
    body = Layer(np.zeros(1), np.zeros(1), through)
    return join(join(one, body), Layer(glass, air, T))


def join(first: Layer, second: Layer) -> Layer:
    """Put one layer behind another and add up all reflections between them.

    Parameters
    ----------
    first, second : Layer
        In the order that light from outdoors meets them.

    Returns
    -------
    layer : Layer
        Both as one.
    """
    loop = 1.0 / (1.0 - first.R_back * second.R)  # geometric series of the turns in between
    return Layer(
        R=first.R + first.T**2 * second.R * loop,
        R_back=second.R_back + second.T**2 * first.R_back * loop,
        T=first.T * second.T * loop,
    )


def _added(layers: list[Layer]) -> tuple[Floats, Layer]:
    """What each layer adds to the reflectance of all of them, and all of them as one."""
    unit = layers[0]
    added = [unit.R]
    for layer in layers[1:]:
        added.append(unit.T**2 * layer.R / (1.0 - unit.R_back * layer.R))
        unit = join(unit, layer)
    return np.stack(np.broadcast_arrays(*added)), unit
