"""How a pane bends under an even pressure: a thin plate simply supported along its edges.

A plate of any convex polygon. For straight edges that neither lift nor resist turning, the energy
of bending is half of D times the integral of (lap w)² (the term in the Gaussian curvature vanishes
there), and the deflection is the one that makes energy less work smallest (Ritz). It is sought as
the product of the distances from the edges and a polynomial, so every trial is held at the edges.
Deflections of the thickness of a pane do not matter to light, slopes do; those of a polynomial are
exact at every point.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.polynomial import legendre, polynomial

from causticload.errors import InputError
from causticload.scene.model import Floats

YOUNG_PA = 70e9  # soda-lime glass, EN 572-1 (from memory)
POISSON = 0.23  # the same
DEGREE = 8  # of the polynomial beside the edges' product
GAUSS = 12  # points a side of each triangle of the outline
MOST_EDGES = 6
TERMS = DEGREE + MOST_EDGES + 1  # powers 0 to this less one of each coordinate
_SAME = 0.002  # outlines closer than this, over half the width, share a solution


@dataclass(frozen=True, eq=False)
class Plate:
    """A bent plate in coordinates of its bounding box: xi = x / half width, eta likewise."""

    shape: Floats  # (TERMS, TERMS) of xi^i eta^j; the largest deflection is 1
    largest: float  # w D / q / (half width)^4 at the largest deflection [1]
    mean: float  # mean deflection over the largest [1]
    top: tuple[float, float]  # xi, eta of the largest deflection


def stiffness(thickness_m: float) -> float:
    """Stiffness of a pane in bending.

    Parameters
    ----------
    thickness_m : float
        Thickness of the glass, > 0. [m]

    Returns
    -------
    stiffness : float
        D = E t³ / (12 (1 - nu²)). [N m]

    Raises
    ------
    InputError
        If the thickness is not above 0.
    """
    if not thickness_m > 0.0:
        raise InputError(f"a pane's thickness must be > 0, got {thickness_m}")
    return YOUNG_PA * thickness_m**3 / (12.0 * (1.0 - POISSON**2))


def solve_plate(outline: Floats, half: Floats) -> Plate:
    """Solve a simply supported plate under an even pressure.

    Small deflections: beyond half of the thickness the middle of a real pane is stiffer and
    flatter than this, so that this errs towards too short a focal length in the middle.

    Parameters
    ----------
    outline : (n, 2) float
        Corners of a convex polygon, counter-clockwise, about the middle of its bounding box;
        3 to 6 of them. [m]
    half : (2,) float
        Half sizes of the bounding box. [m]

    Returns
    -------
    plate : Plate
        Against the exact series of a rectangle of up to 1 to 5 the deflection errs by less than
        0.1 %.

    Raises
    ------
    InputError
        If there are not 3 to 6 corners.
    """
    if not 3 <= len(outline) <= MOST_EDGES:
        raise InputError(f"a pane must have 3 to {MOST_EDGES} corners, got {len(outline)}")
    unit = np.round(outline / half / _SAME) * _SAME
    # Aspects are rounded in proportion, so that long panes lose no more than square ones.
    aspect = float(np.exp(np.round(np.log(half[1] / half[0]) / _SAME) * _SAME))
    return _solve(tuple(map(tuple, unit.tolist())), aspect)


@lru_cache(maxsize=4096)
def _solve(corners: tuple[tuple[float, float], ...], aspect: float) -> Plate:
    """Ritz solution in the unit box; ``aspect`` is half height over half width."""
    corner = np.array(corners)
    lines = _edges(corner)
    point, weight = _quadrature(corner)
    B = _edge_product(lines)
    i, j = (v.ravel() for v in np.indices((DEGREE + 1, DEGREE + 1)))
    i, j = i[i + j <= DEGREE], j[i + j <= DEGREE]
    x, y = (_legendre(point[:, k]) for k in range(2))
    b = [_value(B, point, *d) for d in ((0, 0), (1, 0), (0, 1), (2, 0), (0, 2))]
    p, px, py, pxx, pyy = (
        x[dx][:, i] * y[dy][:, j] for dx, dy in ((0, 0), (1, 0), (0, 1), (2, 0), (0, 2))
    )
    c = 1.0 / aspect**2
    trial = b[0][:, None] * p
    lap = (
        (b[3] + c * b[4])[:, None] * p
        + 2.0 * (b[1][:, None] * px + c * b[2][:, None] * py)
        + b[0][:, None] * (pxx + c * pyy)
    )
    # Small sums of their own: threads of a linear algebra library would only wait on each other.
    energy = np.einsum("qk,ql,q->kl", lap, lap, weight)
    a = np.linalg.solve(energy, np.einsum("qk,q->k", trial, weight))
    grid = np.zeros((DEGREE + 1, DEGREE + 1))
    grid[i, j] = a
    power = _powers()
    shape = np.zeros((TERMS, TERMS))
    product = _multiply(B, power.T @ grid @ power)
    shape[: product.shape[0], : product.shape[1]] = product
    top, most = _top(shape, corner)
    mean = float((trial @ a) @ weight / weight.sum())
    return Plate(shape / most, most, mean / most, top)


@lru_cache(maxsize=1)
def _powers() -> Floats:
    """Row k: the Legendre polynomial of degree k in powers, (DEGREE + 1, DEGREE + 1)."""
    rows = np.zeros((DEGREE + 1, DEGREE + 1))
    for k in range(DEGREE + 1):
        rows[k, : k + 1] = legendre.leg2poly([0.0] * k + [1.0])
    return rows


def _legendre(x: Floats) -> tuple[Floats, Floats, Floats]:
    """Legendre polynomials and their first and second slopes at points, (q, DEGREE + 1) each."""
    unit = np.eye(DEGREE + 1)
    return (
        np.asarray(legendre.legvander(x, DEGREE), np.float64),
        np.asarray(legendre.legval(x, legendre.legder(unit, 1, axis=0)).T, np.float64),
        np.asarray(legendre.legval(x, legendre.legder(unit, 2, axis=0)).T, np.float64),
    )


def _edges(corner: Floats) -> Floats:
    """Lines of a polygon's edges, (n, 3): a x + b y + c, positive inside, at most about 1."""
    step = np.roll(corner, -1, axis=0) - corner
    normal = np.stack([-step[:, 1], step[:, 0]], axis=1)
    normal /= np.linalg.norm(normal, axis=1, keepdims=True)
    line = np.concatenate([normal, -np.einsum("ni,ni->n", normal, corner)[:, None]], axis=1)
    depth = (line[:, :2] @ corner.T + line[:, 2:]).max(axis=1)
    return np.asarray(line / depth[:, None])


def _multiply(a: Floats, b: Floats) -> Floats:
    """Product of two polynomials in two variables."""
    out = np.zeros((a.shape[0] + b.shape[0] - 1, a.shape[1] + b.shape[1] - 1))
    for i in range(a.shape[0]):
        for j in range(a.shape[1]):
            out[i : i + b.shape[0], j : j + b.shape[1]] += a[i, j] * b
    return out


def _edge_product(lines: Floats) -> Floats:
    product = np.ones((1, 1))
    for a, b, c in lines:
        product = _multiply(product, np.array([[c, b], [a, 0.0]]))
    return product


def _value(coefficients: Floats, point: Floats, dx: int, dy: int) -> Floats:
    """Value or slope of a polynomial at points, (q,)."""
    c = polynomial.polyder(coefficients, dx, axis=0)
    c = polynomial.polyder(c, dy, axis=1)
    return np.asarray(polynomial.polyval2d(point[:, 0], point[:, 1], c))


def _quadrature(corner: Floats) -> tuple[Floats, Floats]:
    """Gauss points and weights over a convex polygon: a fan of triangles, squares folded on each.

    Twelve points a side are exact to degree 23 along a side. The integrands of a rectangle are of
    degree 24 at most; what is left is far below the error of the trial functions.
    """
    g, w = legendre.leggauss(GAUSS)
    u, wu = 0.5 * (g + 1.0), 0.5 * w
    s, t = (v.ravel() for v in np.meshgrid(u, u, indexing="ij"))
    fold = (wu[:, None] * wu * u[:, None]).ravel()
    points, weights = [], []
    for k in range(1, len(corner) - 1):
        a, b, c = corner[0], corner[k], corner[k + 1]
        points.append(a + s[:, None] * (b - a) + (s * t)[:, None] * (c - b))
        twice = (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0])
        weights.append(fold * twice)
    return np.concatenate(points), np.concatenate(weights)


def _top(shape: Floats, corner: Floats) -> tuple[tuple[float, float], float]:
    """Place and value of the largest deflection: the best of a net, then Newton's steps."""
    middle = corner.mean(axis=0)
    rings = np.linspace(0.0, 0.9, 10)
    net = (middle + rings[:, None, None] * (corner - middle)).reshape(-1, 2)
    p = net[np.argmax(_value(shape, net, 0, 0))]
    n = np.arange(len(shape), dtype=np.float64)
    down, down2 = np.maximum(n - 1, 0), np.maximum(n - 2, 0)
    while True:
        x, y = ((v**n, n * v**down, n * (n - 1) * v**down2) for v in p)
        xy = x[1] @ shape @ y[1]
        H = np.array([[x[2] @ shape @ y[0], xy], [xy, x[0] @ shape @ y[2]]])
        step = np.linalg.solve(H, np.array([x[1] @ shape @ y[0], x[0] @ shape @ y[1]]))
        if np.abs(step).max() < 1e-9:
            return (float(p[0]), float(p[1])), float(x[0] @ shape @ y[0])
        p = p - np.clip(step, -0.1, 0.1)
