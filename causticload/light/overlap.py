"""How much of a ray tube's image a disc covers: the overlap of a triangle and a disc.

A ray tube lands as a triangle ``T`` on the plane across its chief ray. The sun is a disc, so
each point of ``T`` is really a disc; a receiver point ``P`` takes light from the part of ``T``
within the disc's radius of ``P``. The kernels here give that part as a fraction of ``T``, exactly
for any triangle, down to slivers and points, which is what a tube becomes on a caustic.
"""

from __future__ import annotations

import math

import numpy as np
from numba import njit

from causticload.errors import InputError
from causticload.scene.model import Floats

# Below this share of rho² the signed sum over edges would lose digits to cancellation (it is
# exact to about 1e-15 rho²), and the triangle is so thin that it is a line of light to 1e-8.
THIN = 1e-8


@njit(cache=True, nogil=True, error_model="numpy")
def _sector(ax, ay, bx, by, rho2):
    """Signed area of the disc's sector from direction a to direction b."""
    return 0.5 * rho2 * math.atan2(ax * by - ay * bx, ax * bx + ay * by)


@njit(cache=True, nogil=True, error_model="numpy")
def _edge_area(ax, ay, bx, by, rho2):
    """Signed area of the disc about 0 within the triangle (0, a, b)."""
    dx, dy = bx - ax, by - ay
    A = dx * dx + dy * dy
    if A == 0.0:
        return 0.0
    B = ax * dx + ay * dy
    C = ax * ax + ay * ay - rho2
    disc = B * B - A * C
    if disc <= 0.0:  # the edge's line passes outside the disc
        return _sector(ax, ay, bx, by, rho2)
    root = math.sqrt(disc)
    t1, t2 = (-B - root) / A, (-B + root) / A
    if t1 >= 1.0 or t2 <= 0.0:  # the edge ends before the disc or starts after it
        return _sector(ax, ay, bx, by, rho2)
    area = 0.0
    px, py = ax, ay
    if t1 > 0.0:
        px, py = ax + t1 * dx, ay + t1 * dy
        area += _sector(ax, ay, px, py, rho2)
    qx, qy = bx, by
    if t2 < 1.0:
        qx, qy = ax + t2 * dx, ay + t2 * dy
        area += _sector(qx, qy, bx, by, rho2)
    return area + 0.5 * (px * qy - py * qx)


@njit(cache=True, nogil=True, error_model="numpy")
def _ramp_share(s, s0, s1, s2):
    """Share of a thin triangle's area before ``s``: its width rises to s1, then falls to s2."""
    if s <= s0:
        return 0.0
    if s >= s2:
        return 1.0
    L = s2 - s0
    if s < s1:
        return (s - s0) ** 2 / (L * (s1 - s0))
    return 1.0 - (s2 - s) ** 2 / (L * (s2 - s1))


@njit(cache=True, nogil=True, error_model="numpy")
def _thin_fraction(ax, ay, bx, by, cx, cy, rho2):
    """Fraction of a sliver (or point) inside the disc about 0: a line with a ramp of weight."""
    ab = (bx - ax) ** 2 + (by - ay) ** 2
    bc = (cx - bx) ** 2 + (cy - by) ** 2
    ca = (ax - cx) ** 2 + (ay - cy) ** 2
    if ab >= bc and ab >= ca:
        ox, oy, dx, dy, L2 = ax, ay, bx - ax, by - ay, ab
    elif bc >= ca:
        ox, oy, dx, dy, L2 = bx, by, cx - bx, cy - by, bc
    else:
        ox, oy, dx, dy, L2 = cx, cy, ax - cx, ay - cy, ca
    if 1e-24 * rho2 >= L2:  # a point
        return 1.0 if ox * ox + oy * oy <= rho2 else 0.0
    L = math.sqrt(L2)
    ex, ey = dx / L, dy / L
    h = ox * ey - oy * ex  # distance of the line from the disc's middle
    c2 = rho2 - h * h
    if c2 <= 0.0:
        return 0.0
    c = math.sqrt(c2)
    sa, sb, sc = ax * ex + ay * ey, bx * ex + by * ey, cx * ex + cy * ey
    s0, s2 = min(sa, sb, sc), max(sa, sb, sc)
    s1 = sa + sb + sc - s0 - s2
    return _ramp_share(c, s0, s1, s2) - _ramp_share(-c, s0, s1, s2)


@njit(cache=True, nogil=True, error_model="numpy")
def covered_fraction(ax, ay, bx, by, cx, cy, rho):
    """Fraction of the triangle a b c that lies within ``rho`` of the origin, in [0, 1]."""
    rho2 = rho * rho
    twice = (bx - ax) * (cy - ay) - (by - ay) * (cx - ax)
    A = 0.5 * abs(twice)
    if THIN * rho2 > A:
        return _thin_fraction(ax, ay, bx, by, cx, cy, rho2)
    S = (
        _edge_area(ax, ay, bx, by, rho2)
        + _edge_area(bx, by, cx, cy, rho2)
        + _edge_area(cx, cy, ax, ay, rho2)
    )
    return min(1.0, max(0.0, abs(S) / A))


@njit(cache=True, nogil=True, error_model="numpy")
def _distance2_to_edge(ax, ay, bx, by):
    """Squared distance of the origin from the segment a b."""
    dx, dy = bx - ax, by - ay
    L2 = dx * dx + dy * dy
    t = 0.0
    if L2 > 0.0:
        t = min(1.0, max(0.0, -(ax * dx + ay * dy) / L2))
    x, y = ax + t * dx, ay + t * dy
    return x * x + y * y


@njit(cache=True, nogil=True, error_model="numpy")
def flux_density(ax, ay, bx, by, cx, cy, D, radii, weights):
    """Irradiance across the beam at the origin per watt in the tube. [1/m²]

    ``radii`` (k,) are the tangents of the angular radii of the concentric discs that make up the
    sun, ``weights`` (k,) their shares of the flux, ``D`` the path length. The sum is

        sum_k w_k covered_fraction(rho_k) / (pi rho_k²),  rho_k = D radii_k.

    The plain cases of each disc, an image within it and a disc within the image or clear of it,
    need no arc.
    """
    farthest2 = max(ax * ax + ay * ay, bx * bx + by * by, cx * cx + cy * cy)
    nearest2 = min(
        _distance2_to_edge(ax, ay, bx, by),
        _distance2_to_edge(bx, by, cx, cy),
        _distance2_to_edge(cx, cy, ax, ay),
    )
    w1, w2, w3 = ax * by - ay * bx, bx * cy - by * cx, cx * ay - cy * ax
    inside = (w1 > 0 and w2 > 0 and w3 > 0) or (w1 < 0 and w2 < 0 and w3 < 0)
    area = 0.5 * abs(w1 + w2 + w3)
    density = 0.0
    for k in range(radii.size):
        rho = D * radii[k]
        rho2 = rho * rho
        if farthest2 <= rho2:
            density += weights[k] / (math.pi * rho2)
        elif nearest2 < rho2:
            share = covered_fraction(ax, ay, bx, by, cx, cy, rho)
            density += weights[k] * share / (math.pi * rho2)
        elif inside:
            density += weights[k] / area
    return density


def triangle_disc_fraction(triangle: Floats, *, centre: Floats, radius: float) -> float:
    """Fraction of a triangle's area that a disc covers.

    Parameters
    ----------
    triangle : (3, 2) float
        Corners in the plane, either way round. [m]
    centre : (2,) float
        Middle of the disc. [m]
    radius : float
        Radius of the disc, > 0. [m]

    Returns
    -------
    fraction : float
        In [0, 1]. For a triangle without area, the fraction of its length, or 0 or 1 for a
        point. [1]

    Raises
    ------
    InputError
        If a shape is wrong, a value is not finite or the radius is not positive.
    """
    T = np.asarray(triangle, dtype=float)
    P = np.asarray(centre, dtype=float)
    if T.shape != (3, 2) or P.shape != (2,):
        raise InputError(f"triangle must be (3, 2) and centre (2,), got {T.shape} and {P.shape}")
    if not (np.isfinite(T).all() and np.isfinite(P).all() and 0.0 < radius < math.inf):
        raise InputError(f"corners and centre must be finite and radius > 0, got radius {radius}")
    a, b, c = T - P
    return float(covered_fraction(a[0], a[1], b[0], b[1], c[0], c[1], float(radius)))
