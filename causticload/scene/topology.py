"""Which corners are one vertex, which faces share an edge, which faces lie in one plane.

Mesh files often repeat a vertex for every face and wind faces as they like. Everything here works
from positions: corners closer than :data:`WELD_M` are one vertex, and the fold between two faces is
measured as if both were wound the same way.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components
from scipy.spatial import cKDTree

from causticload.errors import InputError
from causticload.scene.model import Bools, Floats

Indices = NDArray[np.int64]

WELD_M = 1e-4  # corners closer than this are one vertex
_STEPS_M = (0.1, 0.05, 0.01, 0.005, 0.001, 0.0005, 0.0001)  # usual last stored digits


def require_triangles(triangles: Floats) -> None:
    """Check that an array holds finite triangles.

    Parameters
    ----------
    triangles : (k, 3, 3) float
        Corners. [m]

    Raises
    ------
    InputError
        The shape is not (k, 3, 3), or a coordinate is not finite.
    """
    if triangles.ndim != 3 or triangles.shape[1:] != (3, 3):
        raise InputError(f"triangles must have shape (k, 3, 3), got {triangles.shape}")
    if not np.isfinite(triangles).all():
        raise InputError("triangles must be finite, got nan or infinity")


def face_normals(triangles: Floats) -> tuple[Floats, Floats]:
    """Unit normals by winding, and areas.

    Parameters
    ----------
    triangles : (k, 3, 3) float
        Corners. [m]

    Returns
    -------
    normals : (k, 3) float
        Unit normals; zero for a triangle without area. [1]
    areas : (k,) float
        Areas. [m²]
    """
    across = np.cross(triangles[:, 1] - triangles[:, 0], triangles[:, 2] - triangles[:, 0])
    length = np.linalg.norm(across, axis=1)
    return across / np.where(length > 0.0, length, 1.0)[:, None], 0.5 * length


def angle_between(a: Floats, b: Floats) -> Floats:
    """Angle between vectors, exact for small angles too.

    Parameters
    ----------
    a, b : (..., 3) float
        Vectors of any length but zero.

    Returns
    -------
    angle : (...) float
        In [0, π]. [rad]
    """
    return np.arctan2(np.linalg.norm(np.cross(a, b), axis=-1), np.einsum("...i,...i", a, b))


def weld(points: Floats, tolerance: float = WELD_M) -> Indices:
    """Number points so that those closer than a tolerance share a number.

    Chains count: if A is near B and B near C, all three are one.

    Parameters
    ----------
    points : (n, d) float
        Points of any dimension.
    tolerance : float
        Distance in the units of ``points``.

    Returns
    -------
    number : (n,) int
        0, 1, 2 ... in the order of first appearance.
    """
    if len(points) == 0:
        return np.zeros(0, np.int64)
    exact = pd.DataFrame(points).groupby(list(range(points.shape[1])), sort=False).ngroup()
    number = exact.to_numpy(np.int64)
    _, first = np.unique(number, return_index=True)
    close = cKDTree(points[first]).query_pairs(tolerance, output_type="ndarray")
    if not len(close):
        return np.asarray(number, np.int64)
    return np.asarray(in_order(components(len(first), close))[number], np.int64)


def components(n: int, links: NDArray[np.integer]) -> Indices:
    """Connected components of an undirected graph.

    Parameters
    ----------
    n : int
        Number of nodes.
    links : (e, 2) int
        Pairs of nodes.

    Returns
    -------
    label : (n,) int
        Component of each node.
    """
    graph = coo_array((np.ones(len(links), bool), (links[:, 0], links[:, 1])), shape=(n, n))
    return connected_components(graph, directed=False)[1].astype(np.int64)


def in_order(label: Indices) -> Indices:
    """Renumber labels 0, 1, 2 ... in the order of first appearance.

    Parameters
    ----------
    label : (n,) int
        Any labels.

    Returns
    -------
    number : (n,) int
        The same partition, renumbered.
    """
    return pd.factorize(label)[0].astype(np.int64)


def coordinate_step(points: Floats) -> float:
    """The last stored digit of the coordinates, 0 if they show none.

    Differences are looked at, so a moved origin does not hide the step.

    Parameters
    ----------
    points : (n, 3) float
        Vertices. [m]

    Returns
    -------
    step : float
        Largest of 100, 50, 10, 5, 1, 0.5 and 0.1 mm that divides all coordinate differences. [m]
    """
    delta = points - points[:1]
    reach = float(np.abs(delta).max(initial=0.0))
    # 1e-6 of the step for decimal-to-binary rounding, 4e-7 of the reach for single precision
    for step in _STEPS_M:
        slack = 1e-6 * step + 4e-7 * reach
        if 5.0 * slack > step:  # random digits would pass as well
            return 0.0
        if np.all(np.abs(delta - step * np.round(delta / step)) <= slack):
            return step
    return 0.0


@dataclass(frozen=True, kw_only=True)
class EdgePairs:
    """Pairs of faces that share an edge. ``e`` pairs; an edge of three faces gives three pairs."""

    face: Indices  # (e, 2) the faces
    edge: Indices  # (e, 2) number of the shared edge in each: edge j runs from corner j to j + 1
    opposed: Bools  # (e,) the faces are wound against each other

    def __len__(self) -> int:
        return len(self.opposed)

    def corner(self, side: int, turn: int) -> Indices:
        """Corner number (0, 1, 2) in the faces of one side.

        Parameters
        ----------
        side : int
            0 or 1, column of ``face``.
        turn : int
            0: where the edge starts, 1: where it ends, 2: opposite the edge.

        Returns
        -------
        corner : (e,) int
            Corner numbers.
        """
        return (self.edge[:, side] + turn) % 3

    def pick(self, keep: Bools) -> EdgePairs:
        """Some of the pairs.

        Parameters
        ----------
        keep : (e,) bool
            Which to keep.

        Returns
        -------
        pairs : EdgePairs
            The kept pairs.
        """
        return EdgePairs(face=self.face[keep], edge=self.edge[keep], opposed=self.opposed[keep])


def shared_edges(vertex: Indices) -> EdgePairs:
    """Find the pairs of faces that share an edge.

    Parameters
    ----------
    vertex : (k, 3) int
        Welded vertex number of every corner.

    Returns
    -------
    pairs : EdgePairs
        Every pair once, faces in ascending order.
    """
    start, end = vertex.ravel(), np.roll(vertex, -1, axis=1).ravel()
    low, high = np.minimum(start, end), np.maximum(start, end)
    key = low * (int(vertex.max(initial=0)) + 1) + high
    key[start == end] = -1 - np.flatnonzero(
        start == end
    )  # an edge welded to a point pairs with none
    order = np.argsort(key, kind="stable")
    key = key[order]
    at = np.arange(len(key) - 1)
    first, second = [], []
    step = 1
    while len(at):  # step 2 and more: edges of three and more faces
        at = at[at + step < len(key)]
        at = at[key[at] == key[at + step]]
        first.append(order[at])
        second.append(order[at + step])
        step += 1
    half = np.stack([np.concatenate([np.zeros(0, np.int64), *s]) for s in (first, second)], axis=1)
    half = half[half[:, 0] // 3 != half[:, 1] // 3]
    return EdgePairs(face=half // 3, edge=half % 3, opposed=start[half[:, 0]] == start[half[:, 1]])


def folds(normals: Floats, pairs: EdgePairs) -> Floats:
    """Fold angle at each shared edge: 0 where the surface goes on flat, π where it doubles back.

    Parameters
    ----------
    normals : (k, 3) float
        Face normals by winding.
    pairs : EdgePairs
        Pairs of faces.

    Returns
    -------
    fold : (e,) float
        In [0, π], as if both faces were wound the same way. [rad]
    """
    other = normals[pairs.face[:, 1]] * np.where(pairs.opposed, -1.0, 1.0)[:, None]
    return angle_between(normals[pairs.face[:, 0]], other)


def coplanar_groups(
    triangles: Floats,
    pairs: EdgePairs,
    *,
    angle_rad: float,
    gap_m: float,
    sliver_gap_m: float = WELD_M,
) -> Indices:
    """Connected faces that lie in one plane.

    Two faces link where their normals agree within ``angle_rad`` and the smaller's free corner
    lies within ``gap_m`` of the larger's plane; or, because the normal of a sliver is mostly
    rounding, where that corner lies within ``sliver_gap_m`` alone. Many small steps can turn a
    long way, so each group is then held against its mean plane and, where it bends off it, cut
    into pieces that lie in the plane of their largest face.

    Parameters
    ----------
    triangles : (k, 3, 3) float
        Corners. [m]
    pairs : EdgePairs
        Neighbours that may link.
    angle_rad : float
        Largest angle between normals. [rad]
    gap_m : float
        Largest distance from the plane. [m]
    sliver_gap_m : float
        Distance from the plane below which the normal does not matter. [m]

    Returns
    -------
    group : (k,) int
        Group numbers in the order of first appearance.
    """
    normals, areas = face_normals(triangles)
    k = len(triangles)
    fold = folds(normals, pairs)
    swap = areas[pairs.face[:, 0]] < areas[pairs.face[:, 1]]
    small = np.where(swap, pairs.face[:, 0], pairs.face[:, 1])
    large = np.where(swap, pairs.face[:, 1], pairs.face[:, 0])
    tip = triangles[small, np.where(swap, pairs.corner(0, 2), pairs.corner(1, 2))]
    gap = np.abs(np.einsum("ei,ei->e", tip - triangles[large, 0], normals[large]))
    near = ((fold <= angle_rad) & (gap <= gap_m)) | ((gap <= sliver_gap_m) & (fold < np.pi / 2))
    links = pairs.face[near]

    group = components(k, links)
    done = np.zeros(k, bool)
    by_area = np.argsort(areas, kind="stable")
    while True:
        seed = np.zeros(k, np.int64)
        seed[group[by_area]] = by_area  # the last written is the largest
        seed = seed[group]
        turned = (
            normals * np.where(np.einsum("ki,ki->k", normals, normals[seed]) < 0, -1, 1)[:, None]
        )
        mean = _group_sum(group, turned * areas[:, None])
        mean /= np.maximum(np.linalg.norm(mean, axis=1), 1e-300)[:, None]
        middle = _group_sum(group, triangles.mean(axis=1) * areas[:, None])
        middle /= np.maximum(_group_sum(group, areas[:, None]), 1e-300)
        # links allow angle_rad between neighbours; either may lie on the other side of the mean
        fits = _in_plane(triangles, turned, middle, mean, 2 * angle_rad, gap_m, sliver_gap_m)
        bent = _group_sum(group, (~fits & ~done)[:, None].astype(float))[:, 0] > 0
        if not bent.any():
            return in_order(group)
        keep = _in_plane(
            triangles, turned, triangles[seed, 0], normals[seed], angle_rad, gap_m, sliver_gap_m
        )
        keep[seed == np.arange(k)] = True
        done |= bent & keep
        side = np.where(bent & keep, 1, 0)
        links = links[side[links[:, 0]] == side[links[:, 1]]]
        group = components(k, links)


def _group_sum(group: Indices, values: Floats) -> Floats:
    """Sum over each group, handed back to every member. (k, c)"""
    n = int(group.max(initial=-1)) + 1
    columns = [np.bincount(group, v, minlength=n)[group] for v in values.T]
    return np.stack(columns, axis=1)


def _in_plane(
    triangles: Floats,
    normals: Floats,
    point: Floats,
    plane: Floats,
    angle_rad: float,
    gap_m: float,
    sliver_gap_m: float,
) -> Bools:
    """Whether each face lies in its own given plane. (k,)"""
    away = np.einsum("kci,ki->kc", triangles - point[:, None], plane)
    gap = np.abs(away).max(axis=1)
    return ((angle_between(normals, plane) <= angle_rad) & (gap <= gap_m)) | (gap <= sliver_gap_m)
