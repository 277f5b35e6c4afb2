"""A finish: what a surface sends back at each angle, and how sure that is."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Literal, NamedTuple

import numpy as np

from causticload.optics.fresnel import Floats
from causticload.optics.stack import Glazing

# Reflectance at angles of incidence (n,) in radians: (lobes, 2, 2, n). Bands: solar, visible.
# Polarisations: s, p.
Law = Callable[[Floats], Floats]
# Least and largest reflectance that the data leave open, shaped like a Law's.
Limits = Callable[[Floats], tuple[Floats, Floats]]

Along = Literal["width", "height"]


class Reflection(NamedTuple):
    """An angular law and what it leaves open."""

    law: Law
    limits: Limits | None = None  # None: the law is known


@dataclass(frozen=True, kw_only=True)
class Lobe:
    """One reflecting sheet of a finish: a pane of a unit, or the surface of a metal.

    The lines of a brushed finish run along ``brush_along``; the surface tilts little along them
    and much across. A plain finish has the same slope error both ways.
    """

    name: str  # "outer pane", "inner pane", "sheet"
    pane: int = 0  # number of the pane it sits on, 0 = outermost
    slope_error_rad: tuple[float, float] = (0.0, 0.0)  # rms tilt along and across the lines
    brush_along: Along = "width"  # of the panel
    diffuse_fraction: float = 0.0  # share of the reflected light that leaves the mirror direction

    @property
    def mean_slope_error_rad(self) -> float:
        """Slope error of the plain finish that widens a beam as much, rms of both ways."""
        return float(np.hypot(*self.slope_error_rad) / np.sqrt(2.0))


@dataclass(frozen=True, kw_only=True)
class Finish:
    """What a surface sends back."""

    name: str
    lobes: tuple[Lobe, ...]
    reflection: Reflection
    angular: str  # name of the angular law
    source: str  # a sentence: the published source, "from memory" or "common practice"
    solar_range: tuple[float, float]  # usual range of the solar reflectance at normal incidence
    glazing: Glazing | None = None  # of glass whose panes are known
    assumed: tuple[str, ...] = ()  # sentences for the user

    def reflectance(self, theta_rad: Floats) -> Floats:
        """Reflectance of each lobe.

        Parameters
        ----------
        theta_rad : (n,) float
            Angle of incidence, in [0, pi/2]. [rad]

        Returns
        -------
        reflectance : (lobes, 2, 2, n) float
            Solar and visible band by s and p polarisation. Sum over the lobes for the whole. It
            holds what ``diffuse_fraction`` takes out of the mirror direction too. [1]

        Raises
        ------
        InputError
            If an angle is out of range.
        """
        return self.reflection.law(np.atleast_1d(theta_rad))

    def low(self, theta_rad: Floats) -> Floats:
        """Least reflectance that the unknown angular law leaves open.

        Parameters
        ----------
        theta_rad : (n,) float
            Angle of incidence, in [0, pi/2]. [rad]

        Returns
        -------
        reflectance : (lobes, 2, 2, n) float
            As :meth:`reflectance`; equal to it where the law is known. The range is that of
            unpolarised light: s or p alone may stray further. [1]
        """
        return self._limit(theta_rad, 0)

    def high(self, theta_rad: Floats) -> Floats:
        """Largest reflectance that the unknown angular law leaves open.

        Parameters
        ----------
        theta_rad : (n,) float
            Angle of incidence, in [0, pi/2]. [rad]

        Returns
        -------
        reflectance : (lobes, 2, 2, n) float
            As :meth:`low`. [1]
        """
        return self._limit(theta_rad, 1)

    def _limit(self, theta_rad: Floats, which: int) -> Floats:
        if self.reflection.limits is None:
            return self.reflectance(theta_rad)
        return self.reflection.limits(np.atleast_1d(theta_rad))[which]

    def combined(self) -> Finish:
        """Merge the lobes into one, for panes that stay parallel.

        Returns
        -------
        finish : Finish
            With one lobe, which reflects the sum. Its slope error and diffuse share are the
            means of the lobes, by their solar reflectance at normal incidence.
        """
        if len(self.lobes) == 1:
            return self
        law, limits = self.reflection

        def merged(theta: Floats) -> Floats:
            return law(theta).sum(axis=0, keepdims=True)

        def merged_limits(theta: Floats) -> tuple[Floats, Floats]:
            low, high = (limits or (lambda t: (law(t), law(t))))(theta)
            return low.sum(axis=0, keepdims=True), high.sum(axis=0, keepdims=True)

        weight = law(np.zeros(1))[:, 0, 0, 0]
        weight = (
            weight / weight.sum() if weight.sum() > 0.0 else np.full(len(weight), 1 / len(weight))
        )
        variance = weight @ np.square([lobe.slope_error_rad for lobe in self.lobes])
        lobe = Lobe(
            name="unit",
            slope_error_rad=(float(np.sqrt(variance[0])), float(np.sqrt(variance[1]))),
            brush_along=self.lobes[0].brush_along,
            diffuse_fraction=float(weight @ [lobe.diffuse_fraction for lobe in self.lobes]),
        )
        reflection = Reflection(merged, merged_limits if limits else None)
        return replace(self, lobes=(lobe,), reflection=reflection)


_PANE_NAMES = {
    1: ("pane",),
    2: ("outer pane", "inner pane"),
    3: ("outer pane", "middle pane", "inner pane"),
    4: ("outer pane", "second pane", "third pane", "inner pane"),
}


def pane_lobes(panes: int) -> tuple[Lobe, ...]:
    """Name the lobes of a glazing unit.

    Parameters
    ----------
    panes : int
        Number of panes, 1 to 4.

    Returns
    -------
    lobes : tuple of Lobe
        One for each pane, smooth.
    """
    return tuple(Lobe(name=name, pane=k) for k, name in enumerate(_PANE_NAMES[panes]))
