"""Settle beams that straddle an edge, point by point.

Where the rays of a beam disagree on what they see and it is small enough, each receiver sample
in its footprint asks for itself: is the way to the reflecting points free, and do they see the
sun? From a sample the sun's image is a disc on the reflecting surface; a few points spread over
it tell how much of it is in view, so that shadows keep their soft edge.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numba import njit

from causticload.light.blur import Blur
from causticload.light.bvh import Tracer
from causticload.light.splat import (
    COUNT,
    NO_SAMPLES,
    NOTE,
    Grids,
    room_for,
    walk,
)
from causticload.light.tubes import Beams, image_on_plane
from causticload.scene.model import Bools, Floats, Ints

# A sample asks from four places, the quarters of its square, each for one point of the sun's disc.
# At this share of the radius four points keep the second moment of the darkened disc.
ASKED = 4
ASKED_AT = 0.67
# A sample that adds less than this many suns asks once, from its own place for its own image: the
# soft edge of a shadow that weak is below what a criterion can tell.
ASK_ONCE = 0.01


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
def _rays_of(S, first):
    """Number the rays that samples send: sample i sends rays first[i] to first[i + 1]."""
    first[0] = 0
    for i in range(S.pair.size):
        first[i + 1] = first[i] + (1 if S.load[i] < ASK_ONCE else ASKED)
    return first[-1]


@njit(cache=True, nogil=True, error_model="numpy")
def _ask(B, beam, chart, G, S, first, clearance, R):
    """Write the rays that samples ask for: from reflecting points to places on the receiver."""
    Q, w = np.empty((3, 2)), np.empty(3)
    last = -1
    for i in range(S.pair.size):
        k, c = beam[S.pair[i]], chart[S.pair[i]]
        u, v, n, f = G.u[c], G.v[c], G.normal[c], B.frame[k]
        if S.pair[i] != last:
            last = S.pair[i]
            image_on_plane(B.start[k, :3], B.direction[k, :3], B.chief[k], f, G.origin[c], n, Q)
        # A point of the sun's image, turned from cell to cell and by a quarter from ray to ray.
        px = py = quarter = 0.0
        if first[i + 1] - first[i] > 1:
            px = ASKED_AT * S.rho[i] * math.cos(S.point[i])
            py = ASKED_AT * S.rho[i] * math.sin(S.point[i])
            quarter = 0.25 * S.step[i]
        for r in range(first[i], first[i + 1]):
            a = r - first[i]
            du = quarter if a % 2 else -quarter
            dv = quarter if a // 2 else -quarter
            x, y = S.across[i, 0] + px, S.across[i, 1] + py
            px, py = -py, px
            for q in range(3):
                aside = du * u[q] + dv * v[q]
                R.way[r, q] = S.place[i, q] + aside + clearance * n[q]
                x += aside * f[1, q]
                y += aside * f[2, q]
            nearest_in_triangle(Q, x, y, w)
            long2 = 0.0
            for q in range(3):
                R.weight[r, q] = w[q]
                R.start[r, q] = clearance * B.side[k, q]
                for j in range(3):
                    R.start[r, q] += w[j] * B.start[k, j, q]
                R.way[r, q] -= R.start[r, q]
                long2 += R.way[r, q] ** 2
            R.beam[r], R.length[r] = k, math.sqrt(long2)
            for q in range(3):
                R.way[r, q] /= max(R.length[r], 1e-12)


@njit(cache=True, nogil=True, error_model="numpy")
def _add(S, first, free, load, images):
    """Add what samples take, by the share of their rays that are free."""
    for i in range(S.pair.size):
        share = 0.0
        for r in range(first[i], first[i + 1]):
            share += free[r]
        share /= first[i + 1] - first[i]
        load[S.point[i]] += share * S.load[i]
        if S.image[i] and share >= 0.5:
            images[S.point[i]] += 1


class _Rays(NamedTuple):
    """What samples ask for. ``r`` rays."""

    beam: Ints  # (r,) row of the beam
    start: Floats  # (r, 3) m, reflecting point, clear of its facet
    way: Floats  # (r, 3) unit, from there to the sample
    length: Floats  # (r,) m
    weight: Floats  # (r, 3) the reflecting point as weights of the beam's corners


class Settled(NamedTuple):
    """What came of settling: the work, and what stood in the way."""

    rays: int
    beam: Ints  # (h,) row of a beam
    triangle: Ints  # (h,) triangle that it meets before the sample
    direction: Floats  # (h, 3) unit, of the beam there


def settle(
    beams: Beams,
    *,
    sources: Beams | None,
    beam: Ints,
    chart: Ints,
    sun_clear: Bools,
    factor: Floats,
    blur: Blur,
    ring: Ints,
    grids: Grids,
    tracer: Tracer,
    sun_direction: Floats,
    clearance_m: float,
    load: Floats,
    images: Ints,
) -> Settled:
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
    blur : Blur
        The sun as each kind of surface blurs it.
    ring : (k,) int
        Row of ``blur`` for each beam.
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
    images : (n,) int
        Images of the sun in view from the middle of each point's cell; added to.

    Returns
    -------
    settled : Settled
        Number of rays, and what hides samples.
    """
    args = (beams, beam, chart, factor, blur, ring, grids)
    room = room_for(walk(*args, COUNT, load, images, NO_SAMPLES))
    used = walk(*args, NOTE, load, images, room)
    S = room.first(used)
    first = np.empty(used + 1, np.int64)
    n = _rays_of(S, first)
    R = _Rays(
        np.empty(n, np.int32), np.empty((n, 3)), np.empty((n, 3)), np.empty(n), np.empty((n, 3))
    )
    _ask(beams, beam, chart, grids, S, first, clearance_m, R)
    met, distance = tracer.first_hit(R.start, R.way)
    free = distance >= R.length
    hidden = np.flatnonzero(~free)
    rays, X = n, R.start
    if sources is not None:
        X = reflecting_points(sources, R.beam, R.weight, clearance_m)
        rays += int(free.sum())
        free[free] = ~blocked_between(tracer, R.start[free], X[free])
    ask = np.flatnonzero(free & ~sun_clear[R.beam])
    to_sun = np.broadcast_to(sun_direction, (len(ask), 3))
    free[ask] = ~tracer.occluded(X[ask], np.ascontiguousarray(to_sun))
    _add(S, first, free, load, images)
    return Settled(rays + len(ask), R.beam[hidden], met[hidden], R.way[hidden])


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
