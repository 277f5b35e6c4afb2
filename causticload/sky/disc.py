"""The sun's disc: how its light is spread over the half degree it fills.

A ray tube carries light from uniform discs. A sun darkened towards its limb, and a sun widened by
a slightly rough surface, are therefore written as sums of a few concentric uniform discs, called
rings here. All of it is done once for a sun of radius 1 and kept.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import Any, Literal, get_args

import numpy as np
from numpy.typing import ArrayLike, NDArray

from causticload.errors import InputError

__all__ = ["DiscKind", "SunDisc"]

Floats = NDArray[np.float64]
DiscKind = Literal["limb-darkened", "uniform"]

# I(mu) = a + b mu + c mu², mu the cosine of the angle at which sunlight leaves the photosphere.
# At 550 nm; Cox (ed.), Allen's Astrophysical Quantities, 4th ed. (2000).
LAW: dict[DiscKind, tuple[float, float, float]] = {
    "limb-darkened": (0.3, 0.93, -0.23),
    "uniform": (1.0, 0.0, 0.0),
}
RINGS = 3  # encircled energy within 1.3 %
ROUGH_RINGS = 6  # with a slope error; encircled energy within 1.3 %
MAX_SLOPE_ERROR = 0.1  # rad; beyond it small angles no longer hold
LEAST_BLUR = 0.02  # of the sun's radius; adds less than 0.1 % to the disc's radius
BLUR_STEP = 0.01  # the Earth's distance moves the ratio of blur to radius; kept in 1 % steps
TAIL = 5.0  # the Gaussian is followed to this many sigma; 4e-6 of its energy lies beyond


@dataclass(frozen=True)
class SunDisc:
    """Radiance of the sun's disc.

    Parameters
    ----------
    kind : {"limb-darkened", "uniform"}
        Law of radiance from the centre to the limb.
    """

    kind: DiscKind = "limb-darkened"

    def __post_init__(self) -> None:
        if self.kind not in get_args(DiscKind):
            raise InputError(
                f"there is no sun disc {self.kind!r}", hint="Use limb-darkened or uniform."
            )

    def relative_radiance(self, x: ArrayLike) -> Floats:
        """Radiance over the mean of the disc.

        Parameters
        ----------
        x : (n,) float
            Distance from the centre over the disc's radius, in [0, 1]. [1]

        Returns
        -------
        radiance : (n,) float
            1.2422 at the centre of the limb-darkened disc, 0.3727 at its limb. [1]

        Raises
        ------
        InputError
            If `x` is out of its range.
        """
        mu = np.sqrt(1.0 - _in_disc(x) ** 2)
        a, b, c = LAW[self.kind]
        return np.asarray((a + b * mu + c * mu**2) / _mean(self.kind))

    def encircled_energy(self, x: ArrayLike) -> Floats:
        """Share of the disc's light within a circle about its centre.

        Parameters
        ----------
        x : (n,) float
            Radius of the circle over the disc's radius, in [0, 1]. [1]

        Returns
        -------
        energy : (n,) float
            From 0 to 1. [1]

        Raises
        ------
        InputError
            If `x` is out of its range.
        """
        mu = np.sqrt(1.0 - _in_disc(x) ** 2)
        return np.asarray(1.0 - _energy_outside(self.kind, mu))

    @property
    def variance(self) -> float:
        """Variance of the radiance along one axis, over the radius squared. [1]"""
        return _variance(self.kind)

    def solid_angle(self, radius_rad: ArrayLike) -> Floats:
        """Solid angle of the disc.

        Parameters
        ----------
        radius_rad : (n,) float
            Angular radius, >= 0. [rad]

        Returns
        -------
        solid_angle : (n,) float
            4 pi sin²(radius / 2). [sr]
        """
        return np.asarray(4.0 * np.pi * np.sin(np.asarray(radius_rad, dtype=float) / 2.0) ** 2)

    def rings(
        self, radius_rad: float, *, slope_error_rad: float = 0.0, count: int | None = None
    ) -> tuple[Floats, Floats]:
        """The disc as a sum of concentric uniform discs.

        The radiance at distance r from the centre is ``sum_i w_i [r <= r_i] / (pi r_i²)``. The
        sum keeps the energy and the second moment, and the radiance at the centre (to 0.2 % with a
        slope error). With the default counts the encircled energy stays within 1.3 % of the
        disc's at every radius. Without slope error the rings are the nodes of a Gauss rule, which
        keeps the next even moments too.

        A surface with slope error sigma tilts the normal by sigma (rms) about each axis and so
        the reflected ray by 2 sigma; the disc is convolved with that Gaussian. Out of the plane of
        incidence the tilt counts less, by the cosine of the angle of incidence: the sum holds for
        near-normal incidence and is wider than the truth, across, at grazing.

        Parameters
        ----------
        radius_rad : float
            Angular radius of the sun, > 0. [rad]
        slope_error_rad : float
            Root mean square tilt of the surface about each axis, in [0, 0.1]. [rad]
        count : int, optional
            Number of rings k, from 2 to 8. Default 3, or 6 with a slope error. A uniform disc
            without slope error is one ring, whatever the count.

        Returns
        -------
        radii_rad : (k,) float
            Rising. [rad]
        weights : (k,) float
            Share of the light in each, > 0; they sum to 1. [1]

        Raises
        ------
        InputError
            If an argument is out of its range.
        """
        if not 0.0 < radius_rad < 0.1:
            raise InputError(f"radius_rad must be in (0, 0.1) rad, got {radius_rad!r}")
        if not 0.0 <= slope_error_rad <= MAX_SLOPE_ERROR:
            raise InputError(
                f"slope_error_rad must be in [0, {MAX_SLOPE_ERROR}] rad, got {slope_error_rad!r}",
                hint="A rougher surface is no mirror: model it as an obstruction.",
            )
        if count is not None and not 2 <= count <= 8:
            raise InputError(f"count must be from 2 to 8, got {count!r}")
        blur = 2.0 * slope_error_rad / radius_rad
        kept = 0.0
        if blur >= LEAST_BLUR:
            kept = float(np.exp(BLUR_STEP * np.round(np.log(blur) / BLUR_STEP)))
        radii, weights = _unit_rings(self.kind, kept, count or (ROUGH_RINGS if kept else RINGS))
        # The rings were found for a blur within half a step of this one: restore the variance.
        stretch = np.sqrt((self.variance + blur**2) / (self.variance + kept**2))
        return radii * (radius_rad * stretch), weights.copy()

    def sample(self, rng: np.random.Generator, n: int, radius_rad: float) -> Floats:
        """Random points of the disc, as likely as they are bright.

        Parameters
        ----------
        rng : numpy.random.Generator
            Source of random numbers.
        n : int
            Number of points, >= 0.
        radius_rad : float
            Angular radius of the sun, > 0. [rad]

        Returns
        -------
        offsets : (n, 2) float
            Offsets from the centre in the tangent plane, along two perpendicular axes; an angle
            and its tangent are alike here to 1e-5. [rad]
        """
        u, turn = rng.random(n), 2.0 * np.pi * rng.random(n)
        r = radius_rad * np.sqrt(1.0 - _mu_of_energy_outside(self.kind, u) ** 2)
        return np.stack([r * np.cos(turn), r * np.sin(turn)], axis=1)


def _in_disc(x: ArrayLike) -> Floats:
    x = np.asarray(x, dtype=float)
    if not np.all((x >= 0.0) & (x <= 1.0)):
        raise InputError("x must be in [0, 1]")
    return x


def _mean(kind: DiscKind) -> float:
    """Mean of the law over the disc: integral of I(mu) 2 mu dmu."""
    a, b, c = LAW[kind]
    return a + 2.0 * b / 3.0 + c / 2.0


def _variance(kind: DiscKind) -> float:
    """Half the mean of r² = 1 - mu², weighted with the radiance."""
    a, b, c = LAW[kind]
    return 0.5 * (1.0 - (a / 2.0 + 2.0 * b / 5.0 + c / 3.0) / _mean(kind))


def _energy_outside(kind: DiscKind, mu: Floats) -> Floats:
    """Share of the light beyond the circle on which the law's cosine is mu."""
    a, b, c = LAW[kind]
    return mu**2 * (a + 2.0 * b / 3.0 * mu + c / 2.0 * mu**2) / _mean(kind)


def _mu_of_energy_outside(kind: DiscKind, u: Floats) -> Floats:
    """Inverse of :func:`_energy_outside`, by Newton's method on its almost straight square root."""
    a, b, c = LAW[kind]
    aim = np.sqrt(u)
    mu = aim.copy()
    for _ in range(6):
        root = np.sqrt(_energy_outside(kind, mu))
        slope = mu * (a + b * mu + c * mu**2) / _mean(kind) / np.maximum(root, 1e-300)
        mu = np.clip(mu - (root - aim) / np.maximum(slope, 1e-3), 0.0, 1.0)
    return mu


@lru_cache(maxsize=256)
def _unit_rings(kind: DiscKind, blur: float, count: int) -> tuple[Floats, Floats]:
    """Rings of a sun of radius 1 whose blur is `blur` (sigma per axis)."""
    if blur == 0.0:
        if kind == "uniform":
            return np.ones(1), np.ones(1)
        t, v = _steps(kind)
        return _gauss_rings(t, v, count)
    r, profile = _blurred(kind, blur)
    middle = 0.5 * (r[1:] + r[:-1])
    falls = np.maximum(
        -np.pi * np.diff(profile), 0.0
    )  # rounding lifts a flat profile here and there
    radii, weights = _gauss_rings(middle**2, falls, count)
    return _refined(
        radii,
        weights,
        grid=r,
        profile=profile,
        moment=4.0 * (_variance(kind) + blur**2),
    )


def _steps(kind: DiscKind) -> tuple[Floats, Floats]:
    """The falling profile p(r) as many small steps: places t = r² and sizes -pi dp."""
    _, b, c = LAW[kind]
    x, h = np.polynomial.legendre.leggauss(40)
    mu, dmu = 0.5 * (x + 1.0), 0.5 * h
    a = LAW[kind][0]
    # The last step is the limb itself, where the radiance drops from a to nothing.
    t = np.append(1.0 - mu**2, 1.0)
    return t, np.append((b + 2.0 * c * mu) * dmu, a) / _mean(kind)


def _gauss_rings(t: Floats, v: Floats, count: int) -> tuple[Floats, Floats]:
    """Few steps in place of many, by Gauss's rule.

    A uniform disc of radius r and weight w is one step of size w / r² at t = r². Gauss's rule for
    the measure v keeps the integrals of 1, t, ... t^(2k-1): the radiance at the centre, the
    energy, the second moment and so on. Stieltjes' recurrence gives the Jacobi matrix, whose
    eigenvalues are the nodes: Golub & Welsch, Math. Comp. 23 (1969).
    """
    alpha, beta = np.empty(count), np.empty(count)
    before, now = np.zeros_like(t), np.ones_like(t)
    size = 1.0
    for i in range(count):
        last, size = size, float(np.sum(v * now**2))
        alpha[i] = np.sum(v * t * now**2) / size
        beta[i] = size / last
        before, now = now, (t - alpha[i]) * now - (beta[i] if i else 0.0) * before
    off = np.sqrt(beta[1:])
    nodes, vectors = np.linalg.eigh(np.diag(alpha) + np.diag(off, 1) + np.diag(off, -1))
    weights = beta[0] * vectors[0] ** 2 * nodes
    return np.sqrt(nodes), weights / weights.sum()


def _blurred(kind: DiscKind, blur: float) -> tuple[Floats, Floats]:
    """Profile of the disc convolved with a Gaussian, on a grid of radii; its integral is 1."""
    from scipy.special import i0e

    x, h = np.polynomial.legendre.leggauss(300)
    mu = 0.5 * (x + 1.0)
    s = np.sqrt(1.0 - mu**2)
    a, b, c = LAW[kind]
    light = (a + b * mu + c * mu**2) / _mean(kind) * mu * h  # share of the light at radius s
    r = np.linspace(0.0, 1.0 + TAIL * blur, 1200)
    # A ring of light of radius s, blurred: the Rice distribution over 2 pi r.
    around = np.exp(-0.5 * ((r[:, None] - s) / blur) ** 2) * i0e(r[:, None] * s / blur**2)
    profile = around @ light / (2.0 * np.pi * blur**2)
    return r, profile / _trapezoid(2.0 * np.pi * r * profile, r)[-1]


def _trapezoid(f: Floats, x: Floats) -> Floats:
    """Running integral."""
    return np.append(0.0, np.cumsum(0.5 * (f[1:] + f[:-1]) * np.diff(x)))


def _refined(
    radii: Floats, weights: Floats, *, grid: Floats, profile: Floats, moment: float
) -> tuple[Floats, Floats]:
    """Rings with the closest encircled energy (least squares) of equal sums.

    Gauss's rule spends rings on the far tail of a Gaussian; this moves them inwards, which
    quarters the error and halves the area that light has to be spread over. Kept: energy, second
    moment and radiance at the centre.
    """
    from scipy.optimize import minimize

    k = len(radii)
    energy = _trapezoid(2.0 * np.pi * grid * profile, grid)[::4]
    x = grid[::4]
    centre = np.pi * profile[0]

    def misfit(z: Floats) -> tuple[float, Floats]:
        r, w = z[:k], z[k:]
        inside = x[:, None] < r
        within = np.where(inside, (x[:, None] / r) ** 2, 1.0)
        e = within @ w - energy
        slope = np.where(inside, -2.0 * within / r * w, 0.0)
        scale = 1e4 / len(x)
        return scale * float(e @ e), 2.0 * scale * np.append(e @ slope, e @ within)

    def sums(z: Floats) -> Floats:
        r, w = z[:k], z[k:]
        return np.array(
            [w.sum() - 1.0, (w * r**2).sum() / moment - 1.0, (w / r**2).sum() / centre - 1.0]
        )

    def sums_slope(z: Floats) -> Floats:
        r, w = z[:k], z[k:]
        return np.array(
            [
                np.append(np.zeros(k), np.ones(k)),
                np.append(2.0 * w * r, r**2) / moment,
                np.append(-2.0 * w / r**3, r**-2) / centre,
            ]
        )

    kept: Any = {"type": "eq", "fun": sums, "jac": sums_slope}
    found = minimize(
        misfit,
        np.append(radii, weights),
        jac=True,
        method="SLSQP",
        bounds=[(1e-3, None)] * k + [(1e-6, None)] * k,
        constraints=kept,
        options={"maxiter": 300, "ftol": 1e-9},
    )
    better = misfit(found.x)[0] < misfit(np.append(radii, weights))[0]
    if not (better and np.abs(sums(found.x)).max() < 1e-6):
        return radii, weights  # Gauss's rule keeps the same sums
    order = np.argsort(found.x[:k])
    r, w = found.x[:k][order], found.x[k:][order]
    w = w / w.sum()
    return r * np.sqrt(moment / np.sum(w * r**2)), w
