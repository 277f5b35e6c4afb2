"""Surface temperature of a thing under a changing load, followed in time.

One-dimensional conduction with a surface that loses heat by convection and radiation. Implicit in
time, all points at once.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike
from scipy.linalg import cho_solve_banded, cholesky_banded

from causticload.errors import InputError
from causticload.hazard._checks import Floats, history, rising, within
from causticload.hazard.material_table import Material
from causticload.hazard.materials import SIGMA, ZERO_C, Surroundings, balance_root, environment

__all__ = ["surface_history"]

# SDIRK of second order, L-stable and stiffly accurate (Alexander 1977).
_GAMMA = 1.0 - np.sqrt(0.5)


class _Wall:
    """Conduction behind the surface: nodes 0 (surface) to m, finite volumes, implicit in time.

    The inner nodes are linear and the same for all points, so for each step they are removed
    first; what is left is one equation of fourth degree for each surface.
    """

    def __init__(
        self,
        nodes: Floats,
        material: Material,
        *,
        back_conductance: float,
        back_k: float,
    ) -> None:
        gaps = np.diff(nodes)
        self.bridges = material.conductivity / gaps  # W m^-2 K^-1
        volumes = np.concatenate([gaps[:1], gaps[:-1] + gaps[1:], gaps[-1:]]) / 2.0
        self.store = material.density * material.heat_capacity * volumes  # J m^-2 K^-1
        self.back_conductance = back_conductance
        self.back_k = back_k
        self._factors: dict[float, tuple[Floats, Floats]] = {}

    def balance(self, heat: Floats, *, loss: float, quartic: float) -> Floats:
        """Temperatures (m + 1, n) that do not change: a straight line from surface to back."""
        depth = np.concatenate([[0.0], np.cumsum(1.0 / self.bridges)])  # m² K/W
        through = self.back_conductance / (1.0 + self.back_conductance * depth[-1])
        top = balance_root(loss + through, quartic, heat + through * self.back_k)
        return np.asarray(top - depth[:, None] * through * (top - self.back_k))

    def _inner(self, h: float) -> tuple[Floats, Floats]:
        """Cholesky factor of the inner nodes for the step h, and their answer to the surface."""
        if h not in self._factors:
            diagonal = self.store[1:] / h + self.bridges
            diagonal[:-1] += self.bridges[1:]
            diagonal[-1] += self.back_conductance
            banded = np.zeros((2, len(diagonal)))
            banded[1] = diagonal
            banded[0, 1:] = -self.bridges[1:]
            factor = cholesky_banded(banded)
            pull = np.zeros(len(diagonal))
            pull[0] = self.bridges[0]
            self._factors[h] = (factor, cho_solve_banded((factor, False), pull))
        return self._factors[h]

    def stage(self, T: Floats, h: float, *, heat: Floats, loss: float, quartic: float) -> Floats:
        """Backward step of h seconds from T (m + 1, n).

        ``heat`` (n,) is what the surface takes up and would give off at 0 K: absorbed flux and
        the warmth of air and sky.
        """
        factor, follow = self._inner(h)
        right = self.store[1:, None] / h * T[1:]
        right[-1] += self.back_conductance * self.back_k
        rest = cho_solve_banded((factor, False), right)
        slope = self.store[0] / h + self.bridges[0] * (1.0 - follow[0]) + loss
        gained = self.store[0] / h * T[0] + self.bridges[0] * rest[0] + heat
        top = balance_root(slope, quartic, gained)
        return np.vstack([top, rest + follow[:, None] * top])


def _nodes(material: Material, duration: float, step: float) -> Floats:
    """Depths of the nodes: fine at the surface, to the back or beyond the reach of the heat."""
    depth = material.thickness_m or 6.0 * np.sqrt(material.diffusivity * duration)
    first = min(0.2 * np.sqrt(material.diffusivity * step), depth / 8.0)
    ratio = 1.1
    count = int(np.ceil(np.log1p(depth / first * (ratio - 1.0)) / np.log(ratio)))
    x = (ratio ** np.arange(count + 1) - 1.0) / (ratio - 1.0)
    return np.asarray(depth * x / x[-1])


def _substeps(length: float, largest: float, *, begin: bool) -> Floats:
    """Steps that fill ``length``; the first interval starts with small ones."""
    if not begin:
        count = max(1, int(np.ceil(length / largest)))
        return np.full(count, length / count)
    small = np.repeat(min(largest, length) / 2.0 ** np.arange(9, 2, -1), 4)
    left = length - small.sum()
    count = max(1, int(np.ceil(left / largest)))
    return np.concatenate([small, np.full(count, left / count)])


def surface_history(
    times_s: ArrayLike,
    irradiance: ArrayLike,
    *,
    material: Material,
    surroundings: Surroundings | None = None,
    absorptance: float | None = None,
    air_c: ArrayLike | None = None,
    start_c: ArrayLike | None = None,
    max_step_s: float = 30.0,
) -> Floats:
    """Surface temperature of a thing under a changing irradiance.

    Heat flows inwards in one dimension; the surface loses by convection and radiation. Irradiance
    and air temperature are linear between the times. Lateral flow is left out: the edge of a spot
    smaller than the depth of the heat is in truth cooler.

    Parameters
    ----------
    times_s : (t,) array_like of float
        Rising times, any spacing. [s]
    irradiance : (t, n) or (t,) array_like of float
        Total on the surface, >= 0. [W/m²]
    material : Material
        Properties. Without thickness: thick.
    surroundings : Surroundings, optional
        Air, wind, sky and back. The back of a thick body is not reached.
    absorptance : float, optional
        Of sunlight, in [0, 1]; else that of the material.
    air_c : (t,) array_like of float, optional
        Air temperature at the times; else that of the surroundings. [°C]
    start_c : float or (n,) array_like of float, optional
        Temperature of the whole body at the first time; else in balance with the first
        irradiance, which is the warm side. [°C]
    max_step_s : float
        Largest step, > 0. Smaller is finer, in depth too. [s]

    Returns
    -------
    surface : (t, n) or (t,) ndarray of float
        [°C]
    """
    t = rising("times_s", times_s)
    E = history("irradiance", irradiance, len(t))
    if E.ndim > 2:
        raise InputError(f"irradiance must have one or two axes, got {E.ndim}")
    around = surroundings or Surroundings()
    a = float(
        within("absorptance", material.absorptance if absorptance is None else absorptance, 0, 1)
    )
    largest = float(within("max_step_s", max_step_s, above=True))
    air = np.asarray(around.air_c if air_c is None else air_c, dtype=np.float64)
    if air_c is not None and air.shape != t.shape:
        raise InputError(f"air_c must have {len(t)} values, one for each time, got {air.shape}")
    loss, air_k, cold4 = environment(around, np.broadcast_to(air, t.shape))
    quartic = SIGMA * material.emissivity
    absorbed = a * E.reshape(len(t), -1)
    U = 0.0 if material.thickness_m is None else around.back_conductance
    wall = _Wall(
        _nodes(material, t[-1] - t[0], min(largest, float(np.diff(t).min()))),
        material,
        back_conductance=float(within("back_conductance", U)),
        back_k=around.back_c + ZERO_C,
    )
    warmth = loss * air_k + quartic * cold4  # what still air and sky give, W/m²
    heat = absorbed + warmth[:, None]
    if start_c is None:
        T = wall.balance(heat[0], loss=loss, quartic=quartic)
    else:
        start = within("start_c", start_c, -ZERO_C) + ZERO_C
        T = np.tile(np.broadcast_to(start, heat[0].shape), (len(wall.store), 1))
    out = np.empty_like(heat)
    out[0] = T[0]
    for i in range(len(t) - 1):
        slope = (heat[i + 1] - heat[i]) / (t[i + 1] - t[i])
        done = 0.0
        for dt in _substeps(t[i + 1] - t[i], largest, begin=i == 0):
            h = float(_GAMMA * dt)
            at = {"loss": loss, "quartic": quartic}
            first = wall.stage(T, h, heat=heat[i] + slope * (done + h), **at)
            middle = T + (1.0 - _GAMMA) / _GAMMA * (first - T)
            done += dt
            T = wall.stage(middle, h, heat=heat[i] + slope * done, **at)
        out[i + 1] = T[0]
    return (out - ZERO_C).reshape(E.shape)
