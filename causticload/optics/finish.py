"""A finish: what a surface sends back at each angle, and how sure that is."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from causticload.optics.fresnel import Floats

# Reflectance of (band, polarisation) for cosines of incidence (n,): (2, 2, n). Bands: solar,
# visible. Polarisations: s, p.
Law = Callable[[Floats], Floats]


@dataclass(frozen=True)
class Lobe:
    """One reflecting sheet of a finish: a pane of a unit, or the surface of a metal."""

    name: str  # "outer pane", "inner pane", "sheet"
    law: Law


@dataclass(frozen=True, kw_only=True)
class Finish:
    """What a surface sends back."""

    name: str
    lobes: tuple[Lobe, ...]
    source: str  # a sentence: the published source, "from memory" or "common practice"
    solar_range: tuple[float, float]  # usual range of the solar reflectance at normal incidence
    slope_error_rad: float = 0.0  # rms slope of the surface about its shape, per axis
    diffuse_fraction: float = 0.0  # share of the reflected light that leaves the mirror direction
    band: Law | None = None  # half width of what an unknown angular law leaves open, or None
    assumed: tuple[str, ...] = ()

    def reflectance(self, cos_i: Floats) -> Floats:
        """Return the reflectance of all lobes together.

        Parameters
        ----------
        cos_i : (n,) float
            Cosine of the angle of incidence, in [0, 1].

        Returns
        -------
        reflectance : (2, 2, n) float
            Solar and visible band by s and p polarisation. [1]
        """
        return np.sum([lobe.law(cos_i) for lobe in self.lobes], axis=0)

    def low(self, cos_i: Floats) -> Floats:
        """Return the least reflectance that the data leave open, (2, 2, n). [1]"""
        return self._shifted(cos_i, -1.0)

    def high(self, cos_i: Floats) -> Floats:
        """Return the largest reflectance that the data leave open, (2, 2, n). [1]"""
        return self._shifted(cos_i, 1.0)

    def _shifted(self, cos_i: Floats, sign: float) -> Floats:
        nominal = self.reflectance(cos_i)
        if self.band is None:
            return nominal
        return np.clip(nominal + sign * self.band(cos_i), 0.0, 1.0)

    def combined(self) -> Finish:
        """Return the finish with its lobes as one: panes that stay parallel."""
        if len(self.lobes) == 1:
            return self
        return replace(self, lobes=(Lobe("unit", self.reflectance),))
