"""Build a bounding volume hierarchy with eight boxes to a node.

First a binary tree by the binned surface-area heuristic: I. Wald, "On fast construction of
SAH-based bounding volume hierarchies", IEEE Symposium on Interactive Ray Tracing (2007). Then
its nodes are drawn together: I. Wald, C. Benthin and S. Boulos, "Getting rid of packets",
IEEE Symposium on Interactive Ray Tracing (2008).
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from causticload.light.bvh_lanes import WIDTH
from causticload.scene.model import Floats, Ints

BINS = 16
LEAF = 4  # most triangles in a leaf
SHARE = 4  # a leaf is written as SHARE * first triangle + triangles - 1, below 0
PLANNED = 62  # splits above one another by the heuristic; below them triangles are halved
DEEPEST = PLANNED + 32


class Hierarchy(NamedTuple):
    """A tree of boxes over triangles. ``b`` nodes, ``m`` triangles in the order of the leaves."""

    box: NDArray[np.float32]  # (b, 6, 8) m: low planes x, y, z, then high ones, rounded outwards
    child: Ints  # (b, 8) node; below 0 for a leaf, inverted bit by bit
    corner: Floats  # (m, 9) m: first corner, and the edges to the second and third
    number: Ints  # (m,) number of the triangle before it was sorted
    low: Floats  # (3,) m: box of the whole
    high: Floats  # (3,)


def build_hierarchy(triangles: Floats) -> Hierarchy:
    """Build the tree.

    Parameters
    ----------
    triangles : (m, 3, 3) float
        Corners, finite, 0 < m < 2^29. [m]

    Returns
    -------
    tree : Hierarchy
        The tree.
    """
    m = len(triangles)
    low, high = triangles.min(axis=1), triangles.max(axis=1)
    middle = 0.5 * (low + high)
    order = np.arange(m, dtype=np.int32)
    node_low, node_high = np.empty((2 * m, 3)), np.empty((2 * m, 3))
    right, count = np.zeros(2 * m, np.int32), np.zeros(2 * m, np.int32)
    used = _build(low, high, middle, order, node_low, node_high, right, count)
    del low, high, middle
    box, child = _draw_together(node_low[:used], node_high[:used], right[:used], count[:used])
    whole_low, whole_high = node_low[0].copy(), node_high[0].copy()
    del node_low, node_high
    corner = np.empty((m, 9))
    corner[:, :3] = triangles[order, 0]
    corner[:, 3:6] = triangles[order, 1] - corner[:, :3]
    corner[:, 6:] = triangles[order, 2] - corner[:, :3]
    return Hierarchy(box, child, corner, order, whole_low, whole_high)


@njit(cache=True, nogil=True)
def _children(node, right, count, leaves, area, kids):
    """Write up to ``WIDTH`` nodes that make up a binary node; returns how many.

    The largest is opened first. One that could be a whole node by itself is not, so that the
    nodes at the bottom, which are most of them, are well filled.
    """
    if count[node] > 0:  # a tree of one leaf
        kids[0] = node
        return 1
    kids[0], kids[1], n = node + 1, right[node], 2
    while n < WIDTH:
        largest, chosen = -1.0, -1
        for i in range(n):
            c = kids[i]
            may = leaves[c] > WIDTH or (count[c] == 0 and leaves[node] <= WIDTH)
            if may and area[c] > largest:
                largest, chosen = area[c], i
        if chosen < 0:
            break
        kids[n] = right[kids[chosen]]
        kids[chosen] += 1
        n += 1
    return n


@njit(cache=True, nogil=True)
def _draw_together(low, high, right, count):
    """Boxes and children of the wide tree; nodes near the top stand together."""
    b = len(right)
    leaves, area = np.ones(b, np.int32), np.empty(b)
    for k in range(b - 1, -1, -1):
        area[k] = _half_area(low[k], high[k])
        if count[k] == 0:
            leaves[k] = leaves[k + 1] + leaves[right[k]]
    most = b // 2 + 1
    box, child = np.empty((most, 6, WIDTH), np.float32), np.zeros((most, WIDTH), np.int32)
    source, kids = np.zeros(most, np.int32), np.empty(WIDTH, np.int32)
    k, used = 0, 1
    while k < used:
        box[k, :3], box[k, 3:] = math.inf, -math.inf  # nothing enters where no child is
        for i in range(_children(source[k], right, count, leaves, area, kids)):
            c = kids[i]
            for axis in range(3):
                box[k, axis, i] = np.nextafter(np.float32(low[c, axis]), np.float32(-math.inf))
                box[k, 3 + axis, i] = np.nextafter(np.float32(high[c, axis]), np.float32(math.inf))
            if count[c] > 0:
                child[k, i] = ~(right[c] * SHARE + count[c] - 1)
            else:
                child[k, i], source[used] = used, c
                used += 1
        k += 1
    return box[:used].copy(), child[:used].copy()


@njit(cache=True, nogil=True)
def _half_area(low, high):
    x, y, z = high[0] - low[0], high[1] - low[1], high[2] - low[2]
    return x * y + y * z + z * x


@njit(cache=True, nogil=True)
def _best_split(low, high, middle, order, first, last, mid_low, mid_high):
    """Axis and bin boundary of the cheapest split by the heuristic, and its cost."""
    best_cost, best_axis, best_bin = math.inf, -1, 0
    box_low, box_high = np.empty((BINS, 3)), np.empty((BINS, 3))
    number, right_cost = np.empty(BINS, np.int64), np.empty(BINS)
    sweep_low, sweep_high = np.empty(3), np.empty(3)
    for axis in range(3):
        width = mid_high[axis] - mid_low[axis]
        if width <= 0.0:
            continue
        box_low[:] = math.inf
        box_high[:] = -math.inf
        number[:] = 0
        scale = BINS / width
        for k in range(first, last):
            t = order[k]
            b = min(BINS - 1, int((middle[t, axis] - mid_low[axis]) * scale))
            number[b] += 1
            for i in range(3):
                box_low[b, i] = min(box_low[b, i], low[t, i])
                box_high[b, i] = max(box_high[b, i], high[t, i])
        sweep_low[:] = math.inf
        sweep_high[:] = -math.inf
        n = 0
        for b in range(BINS - 1, 0, -1):
            n += number[b]
            for i in range(3):
                sweep_low[i] = min(sweep_low[i], box_low[b, i])
                sweep_high[i] = max(sweep_high[i], box_high[b, i])
            right_cost[b] = n * _half_area(sweep_low, sweep_high) if n else math.inf
        sweep_low[:] = math.inf
        sweep_high[:] = -math.inf
        n = 0
        for b in range(BINS - 1):
            n += number[b]
            for i in range(3):
                sweep_low[i] = min(sweep_low[i], box_low[b, i])
                sweep_high[i] = max(sweep_high[i], box_high[b, i])
            if n:
                cost = n * _half_area(sweep_low, sweep_high) + right_cost[b + 1]
                if cost < best_cost:
                    best_cost, best_axis, best_bin = cost, axis, b
    return best_axis, best_bin, best_cost


@njit(cache=True, nogil=True)
def _part(middle, order, first, last, start, scale, bin_):
    """Put the triangles up to a bin before the others; returns where the others begin."""
    i, j = first, last - 1
    while i <= j:
        t = order[i]
        if min(BINS - 1, int((middle[t] - start) * scale)) <= bin_:
            i += 1
        else:
            order[i], order[j] = order[j], order[i]
            j -= 1
    return i


@njit(cache=True, nogil=True)
def _build(low, high, middle, order, node_low, node_high, right, count):
    """Split from the top, the left side first; returns the number of nodes."""
    stack = np.empty((DEEPEST + 2, 4), np.int64)  # first, last, parent whose right this is, depth
    stack[0, 0], stack[0, 1], stack[0, 2], stack[0, 3] = 0, len(order), -1, 0
    top, used = 1, 0
    mid_low, mid_high = np.empty(3), np.empty(3)
    while top > 0:
        top -= 1
        first, last, parent, depth = stack[top, 0], stack[top, 1], stack[top, 2], stack[top, 3]
        node = used
        used += 1
        if parent >= 0:
            right[parent] = node
        mid_low[:], node_low[node] = math.inf, math.inf
        mid_high[:], node_high[node] = -math.inf, -math.inf
        for k in range(first, last):
            t = order[k]
            for i in range(3):
                node_low[node, i] = min(node_low[node, i], low[t, i])
                node_high[node, i] = max(node_high[node, i], high[t, i])
                mid_low[i] = min(mid_low[i], middle[t, i])
                mid_high[i] = max(mid_high[i], middle[t, i])
        n = last - first
        axis, bin_, cost = -1, 0, math.inf
        if n > 1 and depth < PLANNED:
            axis, bin_, cost = _best_split(low, high, middle, order, first, last, mid_low, mid_high)
        whole = _half_area(node_low[node], node_high[node])
        if n <= LEAF and (axis < 0 or cost + whole >= n * whole):
            right[node], count[node] = first, n
            continue
        if axis < 0:  # middles that are the same, or a tree of splits off the edge
            i = first + n // 2
        else:
            scale = BINS / (mid_high[axis] - mid_low[axis])
            i = _part(middle[:, axis], order, first, last, mid_low[axis], scale, bin_)
        stack[top, 0], stack[top, 1], stack[top, 2], stack[top, 3] = i, last, node, depth + 1
        top += 1
        stack[top, 0], stack[top, 1], stack[top, 2], stack[top, 3] = first, i, -1, depth + 1
        top += 1
    return used
