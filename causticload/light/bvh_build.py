"""Build a bounding volume hierarchy by the binned surface-area heuristic.

Method: I. Wald, "On fast construction of SAH-based bounding volume hierarchies", IEEE Symposium
on Interactive Ray Tracing (2007). Each node holds the boxes of its two children side by side, so
that one visit decides on both.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from causticload.scene.model import Floats, Ints

BINS = 16
LEAF = 4  # most triangles in a leaf
DEEPEST = 62  # the traversal's stack holds two more


class Hierarchy(NamedTuple):
    """A tree of boxes over triangles. ``b`` nodes, ``m`` triangles in the order of the leaves."""

    box: NDArray[np.float32]  # (b, 2, 6) m: low and high corner of each child, rounded outwards
    child: Ints  # (b, 2) node, or first triangle of a leaf
    leaf: Ints  # (b, 2) triangles of a leaf; 0 for a node
    corner: Floats  # (m, 9) m: first corner, and the edges to the second and third
    number: Ints  # (m,) number of the triangle before it was sorted


def build_hierarchy(triangles: Floats) -> Hierarchy:
    """Build the tree.

    Parameters
    ----------
    triangles : (m, 3, 3) float
        Corners, finite, m > 0. [m]

    Returns
    -------
    tree : Hierarchy
        The tree.
    """
    m = len(triangles)
    low, high = triangles.min(axis=1), triangles.max(axis=1)
    middle = 0.5 * (low + high)
    order = np.arange(m, dtype=np.int32)
    most = max(1, 2 * m)
    node_low, node_high = np.full((most, 3), np.inf), np.full((most, 3), -np.inf)
    right, count = np.zeros(most, np.int32), np.zeros(most, np.int32)
    used = _build(low, high, middle, order, node_low, node_high, right, count)
    box, child, leaf = _pair(node_low[:used], node_high[:used], right[:used], count[:used])
    T = triangles[order]
    return Hierarchy(
        box=box,
        child=child,
        leaf=leaf,
        corner=np.concatenate([T[:, 0], T[:, 1] - T[:, 0], T[:, 2] - T[:, 0]], axis=1),
        number=order,
    )


def _pair(
    low: Floats, high: Floats, right: Ints, count: Ints
) -> tuple[NDArray[np.float32], Ints, Ints]:
    """Put the boxes of siblings side by side; a tree of one leaf gets a node over it."""
    bounds = np.concatenate([_outwards(low, -np.inf), _outwards(high, np.inf)], axis=1)
    inner = np.flatnonzero(count == 0) if len(count) > 1 else np.zeros(0, int)
    number = np.full(len(count), -1, np.int32)
    number[inner] = np.arange(len(inner))
    pair = np.stack([inner + 1, right[inner]], axis=1)
    if not len(inner):  # one leaf: both children are that leaf
        pair = np.zeros((1, 2), int)
    leaf = count[pair]
    child = np.where(leaf > 0, right[pair], number[pair]).astype(np.int32)
    return np.ascontiguousarray(bounds[pair]), child, leaf.astype(np.int32)


def _outwards(bounds: Floats, towards: float) -> NDArray[np.float32]:
    """Bounds in single precision, never inside the true ones."""
    return np.nextafter(bounds.astype(np.float32), np.float32(towards))


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
        mid_low[:] = math.inf
        mid_high[:] = -math.inf
        for k in range(first, last):
            t = order[k]
            for i in range(3):
                node_low[node, i] = min(node_low[node, i], low[t, i])
                node_high[node, i] = max(node_high[node, i], high[t, i])
                mid_low[i] = min(mid_low[i], middle[t, i])
                mid_high[i] = max(mid_high[i], middle[t, i])
        n = last - first
        axis, bin_, cost = -1, 0, math.inf
        if n > 1 and depth < DEEPEST:
            axis, bin_, cost = _best_split(low, high, middle, order, first, last, mid_low, mid_high)
        whole = _half_area(node_low[node], node_high[node])
        if axis < 0 or (n <= LEAF and cost + whole >= n * whole):
            right[node], count[node] = first, n
            continue
        scale = BINS / (mid_high[axis] - mid_low[axis])
        i, j = first, last - 1
        while i <= j:
            t = order[i]
            if min(BINS - 1, int((middle[t, axis] - mid_low[axis]) * scale)) <= bin_:
                i += 1
            else:
                order[i], order[j] = order[j], order[i]
                j -= 1
        stack[top, 0], stack[top, 1], stack[top, 2], stack[top, 3] = i, last, node, depth + 1
        top += 1
        stack[top, 0], stack[top, 1], stack[top, 2], stack[top, 3] = first, i, -1, depth + 1
        top += 1
    return used
