"""Send rays through the package's own hierarchy.

Boxes by the slab test, eight at once in single precision, with planes, origins and intervals
rounded outwards; triangles by Möller and Trumbore, J. Graphics Tools 2(1), 1997, in double
precision, two-sided, with their edges taken in by ``EDGE``, so that a ray cannot slip between two
triangles that share an edge. Rays are worked off in an order in which neighbours in space follow
one another: the tree is larger than the processor's cache.
"""

from __future__ import annotations

import math

import numpy as np
from numba import njit

from causticload.light.bvh_build import DEEPEST, SHARE
from causticload.light.bvh_lanes import WIDTH, lowest, slabs

# Rounding of a barycentric coordinate for triangles up to a thousand times as long as wide.
EDGE = 1e-9
# Each end of a slab's interval is wrong by three roundings in single precision (2^-24 each).
WIDEN = np.float32(1.0 + 4.0 * 2.0**-23)
ROUNDING = np.float32(2.0**-23)
HUGE = np.float32(3e38)
STACK = (WIDTH - 1) * DEEPEST
SORT_FROM = 4096  # rays; sorting fewer does not pay
CELL_BITS = 4  # rays are sorted by 16 cells along each axis, and by octant


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
def _axis(o, d, low):
    """One axis of a ray in single precision, where the low planes of a node stand at ``low``.

    Returns the rows of the near and the far planes, the origins that bring the near ones nearer
    and take the far ones farther, and the inverse directions; a large number for 1 / 0, since a
    ray along a slab is inside it or far outside.
    """
    inverse = np.float32(1.0 / d) if abs(d) > 1e-18 else np.float32(math.copysign(1e18, d))
    single = np.float32(o)
    step = abs(single) * ROUNDING
    high = low + 3 * WIDTH
    if inverse > np.float32(0.0):
        return low, high, single + step, single - step, inverse, inverse * WIDEN
    return high, low, single - step, single + step, inverse, inverse * WIDEN


@njit(cache=True, nogil=True, error_model="numpy", inline="always")
def _aim(ox, oy, oz, dx, dy, dz):
    """Rows, origins and inverse directions of a ray for the near and the far planes."""
    nx, fx, anx, afx, inx, ifx = _axis(ox, dx, 0)
    ny, fy, any_, afy, iny, ify = _axis(oy, dy, WIDTH)
    nz, fz, anz, afz, inz, ifz = _axis(oz, dz, 2 * WIDTH)
    return (
        (nx, ny, nz, fx, fy, fz),
        (anx, any_, anz, afx, afy, afz),
        (inx, iny, inz, ifx, ify, ifz),
    )


@njit(cache=True, nogil=True, error_model="numpy", inline="always")
def _at(rows, node):
    """The same rows in a node's planes."""
    start = np.int64(node) * (6 * WIDTH)
    return (
        start + rows[0],
        start + rows[1],
        start + rows[2],
        start + rows[3],
        start + rows[4],
        start + rows[5],
    )


@njit(cache=True, nogil=True, error_model="numpy", inline="always")
def _leaf(child):
    """First and last triangle, exclusive, of the leaf that a child below 0 stands for."""
    leaf = np.uint64(~child)
    first = leaf // np.uint64(SHARE)
    return first, first + leaf % np.uint64(SHARE) + np.uint64(1)


@njit(cache=True, nogil=True, error_model="numpy")
def _in_order(O, D, low, high):
    """Numbers of the rays, sorted by the cell they start in and the octant they point to."""
    n, cells = len(O), 1 << CELL_BITS
    order, key = np.empty(n, np.int32), np.empty(n, np.int32)
    if n < SORT_FROM:
        for k in range(n):
            order[k] = k
        return order
    start = np.zeros((8 << (3 * CELL_BITS)) + 1, np.int32)
    for k in range(n):
        c = 0
        for i in range(3):
            share = (O[k, i] - low[i]) / (high[i] - low[i])
            inside = 0.0 <= share < 1.0  # not so for a nan
            c = c * cells + (int(share * cells) if inside else 0)
        for i in range(3):
            c = 2 * c + (1 if D[k, i] > 0.0 else 0)
        key[k] = c
        start[c + 1] += 1
    for c in range(len(start) - 1):
        start[c + 1] += start[c]
    for k in range(n):
        c = key[k]
        order[start[c]] = k
        start[c] += 1
    return order


@njit(cache=True, nogil=True, error_model="numpy")
def first_hits(H, O, D, t_min, triangle, distance):
    """First triangle and distance of each ray O + t D, t > ``t_min``; -1 and inf on a miss."""
    box, children, T = H.box, H.child, H.corner
    stack, when = np.empty(STACK, np.int32), np.empty(STACK, np.float32)
    entered = np.empty(WIDTH, np.float32)
    for k in _in_order(O, D, H.low, H.high):
        ox, oy, oz, dx, dy, dz = O[k, 0], O[k, 1], O[k, 2], D[k, 0], D[k, 1], D[k, 2]
        rows, origin, inverse = _aim(ox, oy, oz, dx, dy, dz)
        best, found = math.inf, -1
        reach = HUGE  # best, in single precision and rounded up
        child, top = np.int32(0), np.uint64(0)
        while True:
            met = np.uint64(0)
            if child >= 0:
                met = slabs(box, _at(rows, child), origin, inverse, reach, entered)
            else:
                first, last = _leaf(child)
                for m in range(first, last):
                    d = _hit(T, m, ox, oy, oz, dx, dy, dz)
                    if t_min < d < best:
                        best, found = d, np.int64(m)
                        reach = np.float32(d) * WIDEN
            if met != np.uint64(0):  # go on with the nearest, keep the others
                node, c = np.uint64(child), lowest(met)
                child, nearest = children[node, c], entered[c]
                met &= met - np.uint64(1)
                while met != np.uint64(0):
                    c = lowest(met)
                    met &= met - np.uint64(1)
                    other, later = children[node, c], entered[c]
                    if later < nearest:
                        child, other, nearest, later = other, child, later, nearest
                    stack[top], when[top] = other, later
                    top += np.uint64(1)
                continue
            while top > np.uint64(0):
                top -= np.uint64(1)
                if when[top] < reach:
                    break
            else:
                break
            child = stack[top]
        triangle[k] = H.number[found] if found >= 0 else -1
        distance[k] = best


@njit(cache=True, nogil=True, error_model="numpy")
def occlusions(H, O, D, t_min, limit, met):
    """Whether any triangle stands at t_min < t < limit along each ray."""
    box, children, T = H.box, H.child, H.corner
    stack, entered = np.empty(STACK, np.int32), np.empty(WIDTH, np.float32)
    for k in _in_order(O, D, H.low, H.high):
        ox, oy, oz, dx, dy, dz = O[k, 0], O[k, 1], O[k, 2], D[k, 0], D[k, 1], D[k, 2]
        rows, origin, inverse = _aim(ox, oy, oz, dx, dy, dz)
        t_max = limit[k]
        reach = np.float32(t_max) * WIDEN if t_max < 1e30 else HUGE
        stack[0], top = 0, np.uint64(1)
        hit = False
        while top > np.uint64(0) and not hit:
            top -= np.uint64(1)
            child = stack[top]
            if child < 0:
                first, last = _leaf(child)
                for m in range(first, last):
                    if t_min < _hit(T, m, ox, oy, oz, dx, dy, dz) < t_max:
                        hit = True
                        break
                continue
            entry = slabs(box, _at(rows, child), origin, inverse, reach, entered)
            while entry != np.uint64(0):
                stack[top] = children[np.uint64(child), lowest(entry)]
                top += np.uint64(1)
                entry &= entry - np.uint64(1)
        met[k] = hit
