"""Which neighbours a vertex is fitted to: rings of the mesh, or the half of them that suits.

A vertex counts once for each side of a crease. Where a smooth surface changes its curvature at a
line (a flat wall runs into a rounded corner), one polynomial across the line is wrong by some
milliradians on both sides of it. Such places show by a large misfit; there the neighbours on one
side of a mesh edge through the vertex are tried alone.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import csr_array

from causticload.scene.jets import Jets, batches, empty_jets, fit_jets, tangent_frame
from causticload.scene.model import Bools, Floats
from causticload.scene.topology import (
    EdgePairs,
    Indices,
    components,
    coordinate_step,
    coplanar_groups,
    face_normals,
    folds,
    in_order,
    shared_edges,
    weld,
)

_FACET_RAD = 1e-4  # faces that fold by less are one facet
_WIDE = 6.0  # a facet this many times wider than its neighbour is flat
_FAR = 8.0  # a neighbour further than this many times the first ring does not count,
_FEW = 5  # if as many as this remain
_LEAST_NOISE_M = 1e-6  # single precision at 10 m
_ENOUGH = 8  # neighbours wanted before a fit; the ring is widened until there are so many
_RINGS = 2
_WIDEST = 5  # rings
_DOUBT_RAD = 2e-5  # a fit with less error needs no second look
_DOUBT_SHARE = 0.06  # nor one that misses by less than this share of the relief: a circle of
# 15-degree facets misses by 2 %, a change from flat to curved by 20 %
_DOUBT_NOISE = 5.0  # nor one that misses by no more than rounded coordinates may
_HALF_RINGS = 3  # so that a half has three rows of vertices, one more than a parabola can fake
_HALF_SPARE = 2  # neighbours beyond the terms fitted
_DEEP = 0.6  # and at least this share of the number or of the depth of the other half: towards the
# end of a mesh a half has but one row or two, which any parabola fits
_BETTER = 0.1  # a half must cut the misfit to this share
_SURER = 0.5  # and the error to expect to this share
_HALF_GAIN = 10.0  # and may make it no more than this times more sensitive to noise
_ON_LINE = 0.15  # share of a half's depth within which a neighbour beyond the line is still on it


@dataclass(frozen=True, kw_only=True)
class Nodes:
    """Vertices, counted once for each side of a crease. ``n`` nodes of ``k`` triangles."""

    of_corner: Indices  # (k, 3) node of each corner
    position: Floats  # (n, 3) m
    normal: Floats  # (n, 3) unit, mean of the faces around
    link: csr_array  # (n, n) bool, nodes that share a triangle
    noise_m: float  # noise that the coordinates carry at least


def find_nodes(triangles: Floats, *, crease_angle_rad: float) -> Nodes:
    """Split every vertex into the fans of faces that creases leave around it.

    Parameters
    ----------
    triangles : (k, 3, 3) float
        Corners. [m]
    crease_angle_rad : float
        Largest fold within a fan. [rad]

    Returns
    -------
    nodes : Nodes
        The fans.
    """
    k = len(triangles)
    vertex = weld(triangles.reshape(-1, 3)).reshape(-1, 3)
    normals, areas = face_normals(triangles)
    pairs = shared_edges(vertex)
    pairs = pairs.pick(folds(normals, pairs) <= crease_angle_rad)
    pairs = pairs.pick(~_wide_meets_narrow(triangles, areas, pairs))
    fa, fb = pairs.face.T
    links = []
    for turn in (0, 1):  # at each end of the edge the two corners are one node
        a = 3 * fa + pairs.corner(0, turn)
        b = 3 * fb + np.where(pairs.opposed, pairs.corner(1, turn), pairs.corner(1, 1 - turn))
        links.append(np.stack([a, b], axis=1))
    node = in_order(components(3 * k, np.concatenate(links)))
    n = int(node.max(initial=-1)) + 1
    corner = np.zeros(n, np.int64)
    corner[node[::-1]] = np.arange(3 * k)[::-1]  # first corner of each node

    # faces of a fan may be wound against each other: turn them to its first face
    face = np.arange(3 * k) // 3
    turned = normals[face]
    turned *= np.where(np.einsum("ki,ki->k", turned, normals[face[corner]][node]) < 0, -1, 1)[
        :, None
    ]
    weighted = turned * areas[face][:, None]
    sums: Floats = np.stack(
        [np.bincount(node, w, minlength=n).astype(float) for w in weighted.T], axis=1
    )
    mean = sums / np.maximum(np.linalg.norm(sums, axis=1), 1e-300)[:, None]

    of_corner = node.reshape(-1, 3)
    i = of_corner[:, [0, 1, 2, 1, 2, 0]].ravel()
    j = of_corner[:, [1, 2, 0, 0, 1, 2]].ravel()
    link = csr_array((np.ones(len(i), bool), (i, j)), shape=(n, n))
    position = triangles.reshape(-1, 3)[corner]
    noise = max(_LEAST_NOISE_M, coordinate_step(position) / np.sqrt(12.0))
    return Nodes(of_corner=of_corner, position=position, normal=mean, link=link, noise_m=noise)


def _wide_meets_narrow(triangles: Floats, areas: Floats, pairs: EdgePairs) -> Bools:
    """Edges (e,) where a facet meets one many times narrower.

    Whoever made the mesh chose narrow facets where the surface bends and wide ones where it does
    not: the wide facet is flat, and a curve through both would bend it.
    """
    facet = coplanar_groups(
        triangles, pairs, angle_rad=_FACET_RAD, gap_m=np.inf, sliver_gap_m=_LEAST_NOISE_M
    )
    extent = _Extents(triangles, facet)
    edge = np.roll(triangles, -1, axis=1) - triangles
    width = np.empty((len(pairs), 2))
    for side in (0, 1):
        face, number = pairs.face[:, side], pairs.edge[:, side]
        width[:, side] = extent.beyond(face, triangles[face, number], edge[face, number])
    wide = facet[pairs.face[np.arange(len(pairs)), np.argmax(width, axis=1)]]
    pane = np.bincount(facet)[wide] > 1  # in a mesh of triangles of all sizes one says nothing
    apart = facet[pairs.face[:, 0]] != facet[pairs.face[:, 1]]
    return apart & pane & (width.max(axis=1) > _WIDE * width.min(axis=1))


class _Extents:
    """How far flat facets reach, in sixteen directions of their planes."""

    def __init__(self, triangles: Floats, facet: Indices) -> None:
        self.facet = facet
        first = np.unique(facet, return_index=True)[1]
        self.normal = face_normals(triangles)[0]
        u, v = tangent_frame(self.normal[first])
        self.axes = np.stack([u, v], axis=1)  # of each facet
        angle = 2.0 * np.pi * np.arange(16) / 16
        self.directions = np.stack([np.cos(angle), np.sin(angle)], axis=1)
        order = np.argsort(facet, kind="stable")
        start = np.searchsorted(facet[order], np.arange(len(first)))
        xy = np.einsum("kci,kai->kca", triangles, self.axes[facet])
        # one direction at a time: all at once would hold 16 numbers for each corner
        reach = [np.maximum.reduceat((xy @ d).max(axis=1)[order], start) for d in self.directions]
        self.support = np.stack(reach, axis=1)

    def beyond(self, face: Indices, point: Floats, edge: Floats) -> Floats:
        """Reach of the facets of some faces inwards from their edges. (e,)"""
        facet = self.facet[face]
        axes = self.axes[facet]
        inward = np.einsum("ei,eai->ea", np.cross(self.normal[face], edge), axes)
        nearest = np.argmax(inward @ self.directions.T, axis=1)
        here = np.einsum("ei,eai,ea->e", point, axes, self.directions[nearest])
        return self.support[facet, nearest] - here


def rings(link: csr_array, rows: Indices, count: int) -> csr_array:
    """Nodes within some rings of given nodes, themselves left out.

    Parameters
    ----------
    link : (n, n) sparse bool
        Neighbours.
    rows : (m,) int
        Nodes to start from.
    count : int
        Rings, >= 1.

    Returns
    -------
    reach : (m, n) sparse bool
        Row i: the nodes within ``count`` steps of node ``rows[i]``.
    """
    reach = link[rows]
    for _ in range(count - 1):
        reach = reach @ link + reach
    here = reach.tocoo()
    keep = here.col != rows[here.row]
    return csr_array(
        (np.ones(int(keep.sum()), bool), (here.row[keep], here.col[keep])), shape=reach.shape
    )


def fit_nodes(nodes: Nodes) -> Jets:
    """Fit every node to two rings of neighbours, or more rings where two hold too few.

    Parameters
    ----------
    nodes : Nodes
        Where to fit.

    Returns
    -------
    jets : Jets
        One fit for each node.
    """
    n = len(nodes.position)
    jets = empty_jets(n)
    rows = np.arange(n)
    metric = _metric(nodes)
    faces = np.bincount(nodes.of_corner.ravel(), minlength=n)
    least = np.where(np.diff(nodes.link.indptr) > faces, _RINGS + 1, _RINGS)
    for count in range(_RINGS, _WIDEST + 1):
        stencil = rings(nodes.link, rows, count)
        size = np.diff(stencil.indptr)
        ready = ((size >= _ENOUGH) & (count >= least[rows])) | (count == _WIDEST)
        for part, width in batches(size):
            part = part[ready[part]]
            if len(part):
                offset, used = _gather(nodes, rows[part], stencil, part, width)
                used = _near(offset, used, metric[rows[part]])
                jets.put(
                    rows[part],
                    fit_jets(offset, used, nodes.normal[rows[part]], noise_m=nodes.noise_m),
                )
        rows = rows[~ready]
        if len(rows) == 0:
            break
    return jets


def _metric(nodes: Nodes) -> Floats:
    """Form (n, 3, 3) that measures tangential distance in root mean squares of the first ring."""
    pair = nodes.link.tocoo()
    n = len(nodes.position)
    axes = np.stack(tangent_frame(nodes.normal), axis=1)
    offset = nodes.position[pair.col] - nodes.position[pair.row]
    xy = np.einsum("ei,eai->ea", offset, axes[pair.row])
    count = np.maximum(np.bincount(pair.row, minlength=n), 1)
    products = [xy[:, i] * xy[:, j] for i, j in ((0, 0), (0, 1), (0, 1), (1, 1))]
    moment = np.stack([np.bincount(pair.row, p, minlength=n) / count for p in products], axis=1)
    inverse = np.linalg.pinv(moment.reshape(n, 2, 2), hermitian=True)
    return axes.swapaxes(1, 2) @ inverse @ axes


def _near(offset: Floats, used: Bools, metric: Floats) -> Bools:
    """Leave out neighbours far beyond the first ring, such as the other end of a wide pane."""
    reach = np.einsum("nsi,nij,nsj->ns", offset, metric, offset)
    near = used & (reach <= _FAR**2)
    return np.where((near.sum(axis=1) >= _FEW)[:, None], near, used)


def _gather(
    nodes: Nodes, rows: Indices, stencil: csr_array, at: Indices, width: int
) -> tuple[Floats, Bools]:
    """Offsets (m, width, 3) of the neighbours and which of them are real (m, width)."""
    start, stop = stencil.indptr[at], stencil.indptr[at + 1]
    place = start[:, None] + np.arange(width)
    used = place < stop[:, None]
    neighbour = stencil.indices[np.minimum(place, len(stencil.indices) - 1)]
    offset = nodes.position[neighbour] - nodes.position[rows][:, None]
    return np.where(used[..., None], offset, 0.0), used


@dataclass(frozen=True, kw_only=True)
class _Halves:
    """The best dividing line through each of ``m`` nodes, and the fits to its two sides."""

    node: Indices  # (m,)
    good: Bools  # (m, 2) the fit to this side is far better than the one to all
    side: tuple[Jets, Jets]


def choose_sides(nodes: Nodes, jets: Jets, triangles: Floats) -> tuple[Jets, Indices]:
    """Replace fits across a change of curvature by fits to one side of it.

    Parameters
    ----------
    nodes : Nodes
        The nodes.
    jets : Jets
        Their fits to all neighbours.
    triangles : (k, 3, 3) float
        Corners. [m]

    Returns
    -------
    jets : Jets
        Rows 0 to n - 1 for the nodes, then a second row for each node with a good fit on both
        sides of a line.
    source : (k, 3) int
        Row of ``jets`` for each corner.
    """
    source = nodes.of_corner.copy()
    doubt = np.flatnonzero(
        (jets.share > _DOUBT_SHARE) & (jets.misfit > _DOUBT_NOISE * nodes.noise_m)
    )
    stencil, ends = rings(nodes.link, doubt, _HALF_RINGS), rings(nodes.link, doubt, 1)
    for part, _ in batches(np.diff(stencil.indptr) * np.diff(ends.indptr) * 2):
        halves = _best_lines(nodes, jets, doubt[part], stencil, ends, part)
        one, two = halves.good.any(axis=1), halves.good.all(axis=1)
        for side in (0, 1):  # the node's own row: the good side, or side 0 of two
            mine = one & halves.good[:, side] & ((side == 0) | ~halves.good[:, 0])
            jets.put(halves.node[mine], halves.side[side].take(mine))
        second = np.full(len(nodes.position), -1)
        second[halves.node[two]] = len(jets.residual) + np.arange(int(two.sum()))
        jets = jets.join(halves.side[1].take(np.asarray(two, bool)))
        own = second[nodes.of_corner]
        face, corner = np.nonzero(own >= 0)
        first = source[face, corner]
        other = own[face, corner]
        nearer = _misses(jets, other, triangles, face, corner) < _misses(
            jets, first, triangles, face, corner
        )
        source[face, corner] = np.where(nearer, other, first)
    return jets, source


def _misses(jets: Jets, row: Indices, triangles: Floats, face: Indices, corner: Indices) -> Floats:
    """How far a face's other two corners lie off a fit at one corner, as a slope. (m,)"""
    here = triangles[face, corner]
    miss = np.zeros(len(face))
    for turn in (1, 2):
        d = triangles[face, (corner + turn) % 3] - here
        bow = 0.5 * np.einsum("mi,mij,mj->m", d, jets.tensor[row], d)
        height = np.einsum("mi,mi->m", d, jets.normal[row])
        miss += np.abs(height - bow) / np.linalg.norm(d, axis=1)
    return miss


def _best_lines(
    nodes: Nodes, jets: Jets, rows: Indices, stencil: csr_array, ends: csr_array, at: Indices
) -> _Halves:
    """Try the line along each edge of each node; keep the one that serves most sides best."""
    offset, used = _gather(nodes, rows, stencil, at, int(np.diff(stencil.indptr)[at].max()))
    to_end, is_end = _gather(nodes, rows, ends, at, int(np.diff(ends.indptr)[at].max()))
    row, line = np.nonzero(is_end)
    normal = nodes.normal[rows]  # the doubtful fit may be far off
    across = np.cross(normal[row], to_end[row, line])
    across /= np.maximum(np.linalg.norm(across, axis=1), 1e-300)[:, None]
    height = np.einsum("csi,ci->cs", offset[row], across)
    sides, miss = [], []
    for sign in (1.0, -1.0):
        out = np.where(used[row], sign * height, 0.0)
        on = used[row] & (out >= -_ON_LINE * out.max(axis=1, keepdims=True))
        fit = fit_jets(offset[row], on, normal[row], noise_m=nodes.noise_m, cubic=False)
        sides.append(fit)
        ratio = fit.residual / np.maximum(jets.misfit[rows][row], 1e-300)
        doubt = fit.gain * np.hypot(fit.residual, nodes.noise_m)
        surer = doubt < _SURER * jets.slope_error[rows][row]
        sound = (fit.free >= _HALF_SPARE) & (fit.gain < _HALF_GAIN * jets.gain[rows][row])
        beyond = (out > _ON_LINE * out.max(axis=1, keepdims=True)).sum(axis=1)
        depth, other = out.max(axis=1), -out.min(axis=1)
        sound &= (beyond > _DEEP * (used[row] & ~on).sum(axis=1)) | (depth > _DEEP * other)
        miss.append(np.where(surer & sound, ratio, np.inf))
    share = np.stack(miss, axis=1)
    good = share < _BETTER
    # two good sides before one, then by the misfit of the good ones
    order = np.lexsort((np.where(good, share, 0.0).max(axis=1), -good.sum(axis=1), row))
    best = order[np.unique(row[order], return_index=True)[1]]
    return _Halves(
        node=rows,
        good=good[best],
        side=(sides[0].take(best), sides[1].take(best)),
    )
