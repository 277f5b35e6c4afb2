"""Send rays through the package's own hierarchy.

Boxes by the slab test, in single precision with bounds and intervals rounded outwards; triangles
by Möller and Trumbore, J. Graphics Tools 2(1), 1997, in double precision, two-sided, with their
edges taken in by ``EDGE``, so that a ray cannot slip between two triangles that share an edge.
"""

from __future__ import annotations

import math

import numpy as np
from numba import njit

# Rounding of a barycentric coordinate for triangles up to a thousand times as long as wide.
EDGE = 1e-9
# A slab's interval in single precision is wrong by at most three roundings (2^-24 each).
WIDEN = np.float32(1.0 + 4.0 * 2.0**-23)
HUGE = np.float32(3e38)


@njit(cache=True, nogil=True, error_model="numpy", inline="always")
def _enter(box, k, c, ox, oy, oz, ix, iy, iz, t_max):
    """Distance at which a ray enters child ``c`` of node ``k``; ``HUGE`` if not by ``t_max``."""
    a, b = (box[k, c, 0] - ox) * ix, (box[k, c, 3] - ox) * ix
    near, far = (a, b) if a < b else (b, a)
    a, b = (box[k, c, 1] - oy) * iy, (box[k, c, 4] - oy) * iy
    if a > b:
        a, b = b, a
    near = a if a > near else near
    far = b if b < far else far
    a, b = (box[k, c, 2] - oz) * iz, (box[k, c, 5] - oz) * iz
    if a > b:
        a, b = b, a
    near = a if a > near else near
    far = b if b < far else far
    near = near if near > np.float32(0.0) else np.float32(0.0)
    return near if near <= far * WIDEN and near <= t_max else HUGE


@njit(cache=True, nogil=True, error_model="numpy", inline="always")
def _hit(T, m, ox, oy, oz, dx, dy, dz):
    """Distance along a ray to triangle ``m``; inf on a miss, and for a nan anywhere."""
    e1x, e1y, e1z = T[m, 3], T[m, 4], T[m, 5]
    e2x, e2y, e2z = T[m, 6], T[m, 7], T[m, 8]
    px, py, pz = dy * e2z - dz * e2y, dz * e2x - dx * e2z, dx * e2y - dy * e2x
    det = e1x * px + e1y * py + e1z * pz
    if det == 0.0:  # ray in the plane, or a triangle with no area
        return math.inf
    inv = 1.0 / det
    tx, ty, tz = ox - T[m, 0], oy - T[m, 1], oz - T[m, 2]
    u = (tx * px + ty * py + tz * pz) * inv
    if not (u >= -EDGE and u <= 1.0 + EDGE):
        return math.inf
    qx, qy, qz = ty * e1z - tz * e1y, tz * e1x - tx * e1z, tx * e1y - ty * e1x
    v = (dx * qx + dy * qy + dz * qz) * inv
    if not (v >= -EDGE and u + v <= 1.0 + EDGE):
        return math.inf
    return (e2x * qx + e2y * qy + e2z * qz) * inv


@njit(cache=True, nogil=True, error_model="numpy", inline="always")
def _inverse(d):
    """1 / d, and a large number for 0: a ray along a slab is inside it or far outside."""
    return np.float32(1.0 / d) if abs(d) > 1e-18 else np.float32(math.copysign(1e18, d))


@njit(cache=True, nogil=True, error_model="numpy")
def first_hits(H, O, D, t_min, triangle, distance):
    """First triangle and distance of each ray O + t D, t > ``t_min``; -1 and inf on a miss."""
    box, child, count, T = H.box, H.child, H.leaf, H.corner
    stack, when = np.empty(64, np.int32), np.empty(64, np.float32)
    for k in range(len(O)):
        ox, oy, oz = O[k, 0], O[k, 1], O[k, 2]
        dx, dy, dz = D[k, 0], D[k, 1], D[k, 2]
        fx, fy, fz = np.float32(ox), np.float32(oy), np.float32(oz)
        ix, iy, iz = _inverse(dx), _inverse(dy), _inverse(dz)
        best, found = math.inf, -1
        reach = HUGE  # best, in single precision and rounded up
        node, top = np.int32(0), 0
        while node >= 0:
            t0 = _enter(box, node, 0, fx, fy, fz, ix, iy, iz, reach)
            t1 = _enter(box, node, 1, fx, fy, fz, ix, iy, iz, reach)
            nearer = 0 if t0 <= t1 else 1
            following = np.int32(-1)
            for turn in range(2):
                c = nearer if turn == 0 else 1 - nearer
                entered = t0 if c == 0 else t1
                if not entered < reach:
                    continue
                if count[node, c] > 0:
                    start = child[node, c]
                    for m in range(start, start + count[node, c]):
                        d = _hit(T, m, ox, oy, oz, dx, dy, dz)
                        if t_min < d < best:
                            best, found = d, m
                            reach = np.float32(d) * WIDEN
                elif following < 0:
                    following = child[node, c]
                else:
                    stack[top], when[top] = child[node, c], entered
                    top += 1
            while following < 0 and top > 0:
                top -= 1
                if when[top] < reach:
                    following = stack[top]
            node = following
        triangle[k] = H.number[found] if found >= 0 else -1
        distance[k] = best


@njit(cache=True, nogil=True, error_model="numpy")
def occlusions(H, O, D, t_min, limit, met):
    """Whether any triangle stands at t_min < t < limit along each ray."""
    box, child, count, T = H.box, H.child, H.leaf, H.corner
    stack = np.empty(64, np.int32)
    for k in range(len(O)):
        ox, oy, oz = O[k, 0], O[k, 1], O[k, 2]
        dx, dy, dz = D[k, 0], D[k, 1], D[k, 2]
        fx, fy, fz = np.float32(ox), np.float32(oy), np.float32(oz)
        ix, iy, iz = _inverse(dx), _inverse(dy), _inverse(dz)
        t_max = limit[k]
        reach = np.float32(t_max) * WIDEN if t_max < 1e30 else HUGE
        stack[0], top = 0, 1
        hit = False
        while top > 0 and not hit:
            top -= 1
            node = stack[top]
            for c in range(2):
                if not _enter(box, node, c, fx, fy, fz, ix, iy, iz, reach) < HUGE:
                    continue
                if count[node, c] > 0:
                    start = child[node, c]
                    for m in range(start, start + count[node, c]):
                        d = _hit(T, m, ox, oy, oz, dx, dy, dz)
                        if t_min < d < t_max:
                            hit = True
                            break
                else:
                    stack[top] = child[node, c]
                    top += 1
        met[k] = hit
