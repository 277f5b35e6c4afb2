"""Settle beams that straddle an edge, point by point.

Where the corners of a beam disagree on what they see and it is small enough, each receiver
sample in its footprint asks for itself: is the way to the reflecting point free, and does that
point see the sun? The reflecting point is the one whose image is nearest to the sample.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numba import njit

from causticload.light.bvh import Tracer
from causticload.light.splat import (
    Grids,
    edge_lines,
    footprint,
    half_width,
    path_at,
    row_interval,
    sample_density,
    samples_per_axis,
)
from causticload.light.tubes import Beams
from causticload.scene.model import Bools, Floats, Ints


class Samples(NamedTuple):
    """Receiver samples within the footprints of beams. ``q`` samples."""

    pair: Ints  # (q,) row of the pair of beam and chart
    point: Ints  # (q,) number of the receiver point
    place: Floats  # (q, 3) m, local
    load: Floats  # (q,) what the sample adds to its cell's mean if the way is free
    weight: Floats  # (q, 3) barycentric coordinates of the reflecting point in the beam


@njit(cache=True, nogil=True, error_model="numpy")
def nearest_in_triangle(Q, x, y, out):
    """Barycentric coordinates of the point of triangle ``Q`` nearest to (x, y), into ``out``."""
    w0 = (Q[1, 0] - x) * (Q[2, 1] - y) - (Q[1, 1] - y) * (Q[2, 0] - x)
    w1 = (Q[2, 0] - x) * (Q[0, 1] - y) - (Q[2, 1] - y) * (Q[0, 0] - x)
    w2 = (Q[0, 0] - x) * (Q[1, 1] - y) - (Q[0, 1] - y) * (Q[1, 0] - x)
    total = w0 + w1 + w2
    if total != 0.0 and w0 / total >= 0.0 and w1 / total >= 0.0 and w2 / total >= 0.0:
        out[0], out[1], out[2] = w0 / total, w1 / total, w2 / total
        return
    best = math.inf
    for j in range(3):
        k = (j + 1) % 3
        ex, ey = Q[k, 0] - Q[j, 0], Q[k, 1] - Q[j, 1]
        L2 = ex * ex + ey * ey
        t = 0.0
        if L2 > 0.0:
            t = min(1.0, max(0.0, ((x - Q[j, 0]) * ex + (y - Q[j, 1]) * ey) / L2))
        d2 = (Q[j, 0] + t * ex - x) ** 2 + (Q[j, 1] + t * ey - y) ** 2
        if d2 < best:
            best = d2
            out[0] = out[1] = out[2] = 0.0
            out[j], out[k] = 1.0 - t, t


@njit(cache=True, nogil=True, error_model="numpy")
def _walk(B, beam, factor, radii, weights, ring, chart, G, S):
    """Write the samples in the footprints into ``S``; without room there, count them at most."""
    Q, M, w, W = np.empty((3, 2)), np.empty((3, 3)), np.empty(3), np.empty(5)
    L = np.empty((3, 3))
    found = 0
    for pair in range(chart.size):
        k, c = beam[pair], chart[pair]
        tan_radii, shares = radii[ring[k]], weights[ring[k]]
        rho, low, high = footprint(B, k, G, c, tan_radii[-1], Q, M, W)
        if rho < 0.0:
            continue
        n, r = G.normal[c], B.frame[k, 0]
        cos_g = -(n[0] * r[0] + n[1] * r[1] + n[2] * r[2])
        h, nu, nv = G.spacing[c], G.shape[c, 0], G.shape[c, 1]
        area = edge_lines(Q, L)
        m = samples_per_axis(h, half_width(Q, rho))
        step = h / m
        j_first = max(0, math.ceil(low / step - 0.5))
        j_last = min(nv * m - 1, math.floor(high / step - 0.5))
        for j in range(j_first, j_last + 1):
            y = (j + 0.5) * step
            px, py = M[1, 0] + y * M[1, 2], M[2, 0] + y * M[2, 2]
            x_in, x_out = row_interval(Q, px, py, M[1, 1], M[2, 1], rho)
            if x_in > x_out:
                continue
            i_first = max(0, math.ceil(x_in / step - 0.5))
            i_last = min(nu * m - 1, math.floor(x_out / step - 0.5))
            if S.pair.size == 0:  # only counting: an upper bound will do
                found += max(0, i_last - i_first + 1)
                continue
            for i in range(i_first, i_last + 1):
                p = G.cell[G.offset[c] + (i // m) * nv + j // m]
                x = (i + 0.5) * step
                a, b = px + x * M[1, 1], py + x * M[2, 1]
                D = path_at(W, a, b, M[0, 0] + x * M[0, 1] + y * M[0, 2])
                if p < 0 or D <= 0.0:
                    continue
                density = sample_density(Q, L, area, a, b, D, rho, tan_radii, shares)
                if density <= 0.0:
                    continue
                nearest_in_triangle(Q, a, b, w)
                S.pair[found], S.point[found] = pair, p
                S.load[found] = factor[k] * cos_g * density / (m * m)
                for q in range(3):
                    S.weight[found, q] = w[q]
                    S.place[found, q] = G.origin[c, q] + x * G.u[c, q] + y * G.v[c, q]
                found += 1
    return found


def _room(q: int) -> Samples:
    return Samples(
        pair=np.empty(q, np.int32),
        point=np.empty(q, np.int32),
        place=np.empty((q, 3)),
        load=np.empty(q),
        weight=np.empty((q, 3)),
    )


def count_samples(
    beams: Beams,
    *,
    beam: Ints,
    chart: Ints,
    radii: Floats,
    ring: Ints,
    grids: Grids,
    enough: int,
) -> Ints:
    """Count the samples in each pair's footprint: what it would cost to settle it.

    Parameters
    ----------
    beams : Beams
        ``k`` beams.
    beam, chart : (p,) int
        Pairs of a beam and a chart.
    radii : (s, r) float
        Tangents of the radii of the sun's discs.
    ring : (k,) int
        Row of ``radii`` for each beam.
    grids : Grids
        The charts.
    enough : int
        Counting stops once there are more.

    Returns
    -------
    count : (p,) int
        Samples in the footprint's rows, by every eighth row where there are many.
    """
    return _count(beams, beam, radii, ring, chart, grids, enough)


@njit(cache=True, nogil=True, error_model="numpy")
def _count(B, beam, radii, ring, chart, G, enough):
    Q, M, W = np.empty((3, 2)), np.empty((3, 3)), np.empty(5)
    count = np.zeros(chart.size, np.int32)
    for pair in range(chart.size):
        k, c = beam[pair], chart[pair]
        rho, low, high = footprint(B, k, G, c, radii[ring[k]][-1], Q, M, W)
        if rho < 0.0:
            continue
        h = G.spacing[c]
        step = h / samples_per_axis(h, half_width(Q, rho))
        low, high = max(0.0, low), min(high, h * G.shape[c, 1])
        if high <= low:
            continue
        rows = int((high - low) / step) + 1
        stride = max(1, rows // 8)  # an eighth of the rows tells enough
        for j in range(0, rows, stride):
            y = low + (j + 0.5) * step
            a, b = row_interval(
                Q, M[1, 0] + y * M[1, 2], M[2, 0] + y * M[2, 2], M[1, 1], M[2, 1], rho
            )
            a, b = max(0.0, a), min(b, h * G.shape[c, 0])
            if b > a:
                count[pair] += (int((b - a) / step) + 1) * stride
            if count[pair] > enough:
                break
    return count


def settle(
    beams: Beams,
    *,
    sources: Beams | None,
    beam: Ints,
    chart: Ints,
    sun_clear: Bools,
    factor: Floats,
    radii: Floats,
    weights: Floats,
    ring: Ints,
    grids: Grids,
    tracer: Tracer,
    sun_direction: Floats,
    clearance_m: float,
    load: Floats,
) -> None:
    """Add what straddling beams give to each receiver sample that can see it.

    Parameters
    ----------
    beams : Beams
        ``k`` beams.
    sources : Beams or None
        The same light before its second reflection; None for a first reflection.
    beam, chart : (p,) int
        Pairs of a beam and a chart.
    sun_clear : (k,) bool
        Whether the whole beam is known to see the sun.
    factor : (k,) float
        Power of each beam. [m² or W]
    radii, weights : (s, r) float
        The sun's discs, as in :func:`causticload.light.splat.splat`.
    ring : (k,) int
        Row of ``radii`` for each beam.
    grids : Grids
        The charts.
    tracer : Tracer
        Finds what rays meet.
    sun_direction : (3,) float
        Unit vector to the sun.
    clearance_m : float
        How far rays keep from the surfaces they start on and end at. [m]
    load : (n,) float
        Mean over each point's cell; added to.
    """
    if not len(beam):
        return
    args = (beams, beam, factor, radii, weights, ring, chart, grids)
    S = _room(_walk(*args, _room(0)))
    used = _walk(*args, S)
    S = Samples(S.pair[:used], S.point[:used], S.place[:used], S.load[:used], S.weight[:used])
    row = beam[S.pair]
    P = S.place + clearance_m * grids.normal[chart[S.pair]]
    X = reflecting_points(beams, row, S.weight, clearance_m)
    free = ~blocked_between(tracer, P, X)
    if sources is not None:
        X1 = reflecting_points(sources, row, S.weight, clearance_m)
        free[free] = ~blocked_between(tracer, X[free], X1[free])
        X = X1
    ask = np.flatnonzero(free & ~sun_clear[row])
    to_sun = np.broadcast_to(sun_direction, (len(ask), 3))
    free[ask] = ~tracer.occluded(X[ask], np.ascontiguousarray(to_sun))
    np.add.at(load, S.point[free], S.load[free])


def reflecting_points(beams: Beams, beam: Ints, weight: Floats, clearance_m: float) -> Floats:
    """Points of beams' starts, clear of their facets.

    Parameters
    ----------
    beams : Beams
        Any number of beams.
    beam : (q,) int
        Row of the beam.
    weight : (q, 3) float
        Barycentric coordinates between the starts of its corner rays.
    clearance_m : float
        How far above the facet the points are raised. [m]

    Returns
    -------
    places : (q, 3) float
        The points. [m]
    """
    on_facet = np.einsum("qj,qji->qi", weight, beams.start[beam, :3])
    return on_facet + clearance_m * beams.side[beam]


def blocked_between(tracer: Tracer, P: Floats, X: Floats) -> Bools:
    """Tell whether something stands between points.

    Parameters
    ----------
    tracer : Tracer
        Finds what rays meet.
    P, X : (q, 3) float
        Ends of the lines of sight, clear of the surfaces they belong to. [m]

    Returns
    -------
    blocked : (q,) bool
        Whether it does.
    """
    way = X - P
    length = np.linalg.norm(way, axis=1)
    length = np.maximum(length, 1e-12)
    return tracer.occluded(P, way / length[:, None], limit=length * (1.0 - 1e-6))
