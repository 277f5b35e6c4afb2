"""Lay the light of ray tubes onto the grids of receivers.

A beam and a chart meet in an image triangle ``T``. Across the chief ray, ``T`` is a triangle
``Q`` and the sun blurs each of its points to a disc, so the footprint is ``Q`` grown by the
disc's radius. Rows of the grid are straight lines in that picture; each row is walked from
where it enters the footprint to where it leaves, and every sample takes

    E = power cos(g) flux_density(Q - P),    g: angle between the beam and the chart's normal.

A cell stores the mean over its samples: one sample where the footprint is wide against the cell,
more where it is narrow, so that a focus cannot fall between the points.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numba import njit

from causticload.light.blur import Blur, light_inside_line, light_inside_triangle
from causticload.light.overlap import flux_density
from causticload.light.tubes import Beams, image_on_plane
from causticload.scene.model import Bools, Chart, Floats, Ints

# Samples stand no further apart than this share of the footprint's half width.
SAMPLE_STEP = 0.8
MOST_SAMPLES = 40  # per cell and axis; a 1 m cell then resolves the sun's image at 3 m
# Below this share of rho² an image is laid down disc by disc, exactly: the tables err by 1e-4.
SMALL_IMAGE = 0.05


class Grids(NamedTuple):
    """Charts of a scene as the kernels read them. ``c`` charts, ``n`` points."""

    origin: Floats  # (c, 3) m, corner of cell (0, 0)
    u: Floats  # (c, 3) unit
    v: Floats  # (c, 3) unit
    normal: Floats  # (c, 3) unit
    spacing: Floats  # (c,) m
    shape: Ints  # (c, 2) cells along u and v
    offset: Ints  # (c,) where the chart's cells start in ``cell``
    cell: Ints  # (sum of nu nv,) number of the point among all points, or -1


def make_grids(charts: Sequence[Chart]) -> Grids:
    """Lay charts out for the kernels.

    Parameters
    ----------
    charts : sequence of Chart
        Numbered charts: ``first`` is the number of each chart's first point.

    Returns
    -------
    grids : Grids
        Contiguous arrays.
    """
    sizes = [c.cell.size for c in charts]
    cells = [np.where(c.cell >= 0, c.cell + c.first, -1).ravel() for c in charts]

    def rows(values: list[Floats]) -> Floats:
        return np.array(values, dtype=np.float64).reshape(-1, 3)

    return Grids(
        origin=rows([c.origin for c in charts]),
        u=rows([c.u for c in charts]),
        v=rows([c.v for c in charts]),
        normal=rows([c.normal for c in charts]),
        spacing=np.array([c.spacing for c in charts], dtype=np.float64),
        shape=np.array([c.cell.shape for c in charts], dtype=np.int32).reshape(-1, 2),
        offset=np.concatenate([[0], np.cumsum(sizes)[:-1]]).astype(np.int32)
        if sizes
        else np.zeros(0, np.int32),
        cell=np.concatenate(cells).astype(np.int32) if cells else np.zeros(0, np.int32),
    )


@njit(cache=True, nogil=True, error_model="numpy")
def _disc_interval(px, py, dx, dy, r2):
    """Where the line p + x d is within the disc of radius² r2 about 0; (inf, -inf) if nowhere."""
    A = dx * dx + dy * dy
    B = px * dx + py * dy
    C = px * px + py * py - r2
    disc = B * B - A * C
    if disc < 0.0:
        return math.inf, -math.inf
    root = math.sqrt(disc)
    return (-B - root) / A, (-B + root) / A


@njit(cache=True, nogil=True, error_model="numpy")
def _between(f0, df, low, high):
    """Where low <= f0 + x df <= high."""
    if df == 0.0:
        return (-math.inf, math.inf) if low <= f0 <= high else (math.inf, -math.inf)
    a, b = (low - f0) / df, (high - f0) / df
    return min(a, b), max(a, b)


@njit(cache=True, nogil=True, error_model="numpy")
def row_interval(Q, px, py, dx, dy, rho):
    """Where the line p + x d lies within ``rho`` of the triangle ``Q``: (first x, last x)."""
    first, last = math.inf, -math.inf
    for j in range(3):
        a, b = _disc_interval(px - Q[j, 0], py - Q[j, 1], dx, dy, rho * rho)
        first, last = min(first, a), max(last, b)
        k = (j + 1) % 3
        ex, ey = Q[k, 0] - Q[j, 0], Q[k, 1] - Q[j, 1]
        L = math.hypot(ex, ey)
        if L > 0.0:
            ex, ey = ex / L, ey / L
            fx, fy = px - Q[j, 0], py - Q[j, 1]
            a1, b1 = _between(fx * ex + fy * ey, dx * ex + dy * ey, 0.0, L)
            a2, b2 = _between(ex * fy - ey * fx, ex * dy - ey * dx, -rho, rho)
            a, b = max(a1, a2), min(b1, b2)
            if a <= b:
                first, last = min(first, a), max(last, b)
    return first, last


@njit(cache=True, nogil=True, error_model="numpy")
def half_width(Q, rho):
    """Half the width of the narrowest way across the footprint of ``Q`` and the sun."""
    longest = 0.0
    for j in range(3):
        k = (j + 1) % 3
        longest = max(longest, math.hypot(Q[k, 0] - Q[j, 0], Q[k, 1] - Q[j, 1]))
    twice = abs(
        (Q[1, 0] - Q[0, 0]) * (Q[2, 1] - Q[0, 1]) - (Q[1, 1] - Q[0, 1]) * (Q[2, 0] - Q[0, 0])
    )
    return rho + (0.5 * twice / longest if longest > 0.0 else 0.0)


@njit(cache=True, nogil=True, error_model="numpy")
def samples_per_axis(h, width):
    """Number of samples along a cell of size ``h`` for a footprint of this half width."""
    return min(math.ceil(h / (SAMPLE_STEP * width)), MOST_SAMPLES)


def sample_counts(
    direction: Floats, *, edge: Floats, rho: Floats, chart: Ints, grids: Grids
) -> Floats:
    """Tell how many samples beams take on charts, the charts thought without end.

    Parameters
    ----------
    direction : (k, 3) float
        Unit vectors along the beams.
    edge : (k, 3) float
        Lengths of the edges of their images across the beam. [m]
    rho : (k,) float
        Radii of the sun's images. [m]
    chart : (k,) int
        The charts.
    grids : Grids
        All charts.

    Returns
    -------
    count : (k,) float
        Samples in the footprints: Steiner's formula for a triangle grown by ``rho``.
    """
    round_about, longest = edge.sum(axis=1), edge.max(axis=1)
    half = 0.5 * round_about
    heron = half * np.prod(half[:, None] - edge, axis=1)
    area = np.sqrt(np.maximum(heron, 0.0))
    width = rho + np.divide(area, longest, out=np.zeros_like(area), where=longest > 0.0)
    h = grids.spacing[chart]
    step = h / np.minimum(np.ceil(h / (SAMPLE_STEP * np.maximum(width, 1e-9))), MOST_SAMPLES)
    cos_g = np.abs(np.einsum("ki,ki->k", direction, grids.normal[chart]))
    footprint_area = (area + round_about * rho + np.pi * rho**2) / np.maximum(cos_g, 1e-3)
    return footprint_area / step**2


@njit(cache=True, nogil=True, error_model="numpy")
def has_inside(Q, x, y):
    """Whether (x, y) lies in the triangle ``Q``."""
    w0 = (Q[0, 0] - x) * (Q[1, 1] - y) - (Q[0, 1] - y) * (Q[1, 0] - x)
    w1 = (Q[1, 0] - x) * (Q[2, 1] - y) - (Q[1, 1] - y) * (Q[2, 0] - x)
    w2 = (Q[2, 0] - x) * (Q[0, 1] - y) - (Q[2, 1] - y) * (Q[0, 0] - x)
    return (w0 > 0.0 and w1 >= 0.0 and w2 >= 0.0) or (w0 < 0.0 and w1 <= 0.0 and w2 <= 0.0)


@njit(cache=True, nogil=True, error_model="numpy")
def edge_lines(Q, lines):
    """Lines along the edges of ``Q``: a x + b y + c is the distance inwards, rows (a, b, c).

    Returns the area of ``Q``.
    """
    twice = (Q[1, 0] - Q[0, 0]) * (Q[2, 1] - Q[0, 1]) - (Q[1, 1] - Q[0, 1]) * (Q[2, 0] - Q[0, 0])
    turn = 1.0 if twice > 0.0 else -1.0
    for j in range(3):
        k = (j + 1) % 3
        ex, ey = Q[k, 0] - Q[j, 0], Q[k, 1] - Q[j, 1]
        L = math.sqrt(ex * ex + ey * ey)
        a, b = (-turn * ey / L, turn * ex / L) if L > 0.0 else (0.0, 0.0)
        lines[j, 0], lines[j, 1], lines[j, 2] = a, b, -(a * Q[j, 0] + b * Q[j, 1])
    return 0.5 * abs(twice)


@njit(cache=True, nogil=True, error_model="numpy")
def path_plane(B, k, Q, plane):
    """Lay a plane through what each corner ray's path is longer than its depth.

    A sample at (x, y) across the beam and depth z has the path z + a + b x + c y from where its
    light was first reflected, with a, b, c = ``plane[:3]``, within ``plane[3:]``. Without it two
    tubes of one tilted pane would blur the seam between them differently.
    """
    f = B.frame[k, 0]
    low, high, mean = math.inf, -math.inf, 0.0
    lag0 = lag1 = lag2 = 0.0
    for j in range(3):
        w = B.before[k, j]
        for i in range(3):
            w -= (B.start[k, j, i] - B.chief[k, i]) * f[i]
        low, high = min(low, w), max(high, w)
        mean += w / 3.0
        if j == 0:
            lag0 = w
        elif j == 1:
            lag1 = w
        else:
            lag2 = w
    x1, y1 = Q[1, 0] - Q[0, 0], Q[1, 1] - Q[0, 1]
    x2, y2 = Q[2, 0] - Q[0, 0], Q[2, 1] - Q[0, 1]
    det = x1 * y2 - y1 * x2
    plane[0], plane[1], plane[2], plane[3], plane[4] = mean, 0.0, 0.0, low, high
    if abs(det) > 1e-3 * max(x1 * x1 + y1 * y1, x2 * x2 + y2 * y2):
        b = ((lag1 - lag0) * y2 - (lag2 - lag0) * y1) / det
        c = ((lag2 - lag0) * x1 - (lag1 - lag0) * x2) / det
        plane[0], plane[1], plane[2] = lag0 - b * Q[0, 0] - c * Q[0, 1], b, c


@njit(cache=True, nogil=True, error_model="numpy")
def path_at(plane, x, y, z):
    """Path of a sample at (x, y) across the beam and depth ``z``."""
    lag = plane[0] + plane[1] * x + plane[2] * y
    return z + min(plane[4], max(plane[3], lag))


@njit(cache=True, nogil=True, error_model="numpy")
def footprint(B, k, G, c, reach, variance, Q, grid_to_beam, plane):
    """Meet beam ``k`` and chart ``c``.

    ``Q`` (3, 2) takes the image across the beam; ``grid_to_beam`` (3, 3) takes depth and the two
    cross coordinates of the grid's corner (column 0) and of a step of one metre along u and v
    (columns 1, 2); ``plane`` (5,) what :func:`path_plane` lays. ``reach`` is the tangent of the
    largest disc's angular radius, ``variance`` that of its light along an axis, over the radius².

    A sample stands for its square, so the sun's disc is widened by the square's own variance
    across the beam: that makes the sample its square's mean, to a few per cent of a step.

    Returns the largest radius of the widened image of the sun; the first and last grid row (in
    metres along v) that it can touch; the number of samples along a cell; and what widens, as an
    addition to the path squared. The radius is below 0 where beam and chart do not meet.
    """
    o, n = G.origin[c], G.normal[c]
    near, far = image_on_plane(B.start[k, :3], B.direction[k, :3], B.chief[k], B.frame[k], o, n, Q)
    if near < 0.0:
        return -1.0, 0.0, 0.0, 1, 0.0
    for a in range(3):
        f = B.frame[k, a]
        grid_to_beam[a, 0] = (
            (o[0] - B.chief[k, 0]) * f[0]
            + (o[1] - B.chief[k, 1]) * f[1]
            + (o[2] - B.chief[k, 2]) * f[2]
        )
        grid_to_beam[a, 1] = G.u[c, 0] * f[0] + G.u[c, 1] * f[1] + G.u[c, 2] * f[2]
        grid_to_beam[a, 2] = G.v[c, 0] * f[0] + G.v[c, 1] * f[1] + G.v[c, 2] * f[2]
    # Across the beam a metre of u is (a, c), a metre of v is (b, d): solve for v.
    a, b = grid_to_beam[1, 1], grid_to_beam[1, 2]
    cc, d = grid_to_beam[2, 1], grid_to_beam[2, 2]
    det = a * d - b * cc
    if abs(det) < 1e-9:  # the beam runs along the chart
        return -1.0, 0.0, 0.0, 1, 0.0
    depth_u, depth_v = grid_to_beam[0, 1], grid_to_beam[0, 2]
    # The depth over the footprint: that of the image and of its blur, which tilts with the chart.
    slope = math.hypot((depth_u * d - depth_v * cc) / det, (depth_v * a - depth_u * b) / det)
    path_plane(B, k, Q, plane)
    rho = reach * (far + plane[4])
    rho = rho / max(0.05, 1.0 - slope * reach)
    f = B.frame[k, 0]
    cos_g = f[0] * n[0] + f[1] * n[1] + f[2] * n[2]
    m = samples_per_axis(G.spacing[c], half_width(Q, rho))
    step = G.spacing[c] / m
    # A square of side ``step``, foreshortened one way; both ways together over two.
    widening = step * step * (1.0 + cos_g * cos_g) / (24.0 * variance)
    rho = math.sqrt(rho * rho + widening)
    low, high = math.inf, -math.inf
    for j in range(3):
        x, y = Q[j, 0] - grid_to_beam[1, 0], Q[j, 1] - grid_to_beam[2, 0]
        v = (a * y - cc * x) / det
        low, high = min(low, v), max(high, v)
    blur = rho * math.hypot(a, cc) / abs(det)
    return rho, low - blur, high + blur, m, widening / (reach * reach)


@njit(cache=True, nogil=True, error_model="numpy")
def sample_density(Q, L, area, a, b, D, reach, edge, mean, radii, shares):
    """Irradiance across the beam at (a, b) per watt, the plain cases first. [1/m²]

    ``L`` are the lines along the edges of ``Q``, ``D`` is the path length; the last five are the
    sun's row of a :class:`~causticload.light.blur.Blur`.
    """
    rho = D * reach
    e0 = L[0, 0] * a + L[0, 1] * b + L[0, 2]
    e1 = L[1, 0] * a + L[1, 1] * b + L[1, 2]
    e2 = L[2, 0] * a + L[2, 1] * b + L[2, 2]
    nearest = min(e0, e1, e2)
    if nearest <= -rho:
        return 0.0
    if area > SMALL_IMAGE * rho * rho:
        if nearest >= rho:  # deep inside: the whole disc is covered
            return 1.0 / area
        if e0 + e1 + e2 - nearest - max(e0, e1, e2) >= rho:  # one edge cuts the disc
            return light_inside_line(edge, nearest / rho) / area
        return light_inside_triangle(Q, L, mean, a, b, rho) / area
    return flux_density(
        Q[0, 0] - a,
        Q[0, 1] - b,
        Q[1, 0] - a,
        Q[1, 1] - b,
        Q[2, 0] - a,
        Q[2, 1] - b,
        D,
        radii,
        shares,
    )


class Samples(NamedTuple):
    """Receiver samples within the footprints of beams. ``q`` samples."""

    pair: Ints  # (q,) row of the pair of beam and chart
    point: Ints  # (q,) number of the receiver point
    place: Floats  # (q, 3) m, local
    across: Floats  # (q, 2) m, where the sample stands across the beam
    step: Floats  # (q,) m, distance between samples along a row and between rows
    load: Floats  # (q,) what the sample adds to its cell's mean if the way is free
    rho: Floats  # (q,) m, radius of the sun's image there
    image: Bools  # (q,) the sample stands for the middle of its cell, within the beam's image

    def first(self, n: int) -> Samples:
        """Return the first ``n`` samples."""
        return Samples(
            self.pair[:n],
            self.point[:n],
            self.place[:n],
            self.across[:n],
            self.step[:n],
            self.load[:n],
            self.rho[:n],
            self.image[:n],
        )


def room_for(q: int) -> Samples:
    """Make room for ``q`` samples.

    Parameters
    ----------
    q : int
        How many.

    Returns
    -------
    samples : Samples
        Uninitialised arrays.
    """
    return Samples(
        pair=np.empty(q, np.int32),
        point=np.empty(q, np.int32),
        place=np.empty((q, 3)),
        across=np.empty((q, 2)),
        step=np.empty(q),
        load=np.empty(q),
        rho=np.empty(q),
        image=np.empty(q, np.bool_),
    )


# What a walk does with the samples it meets.
ADD, COUNT, NOTE = 0, 1, 2


@njit(cache=True, nogil=True, error_model="numpy")
def walk(B, beam, chart, factor, blur, ring, G, task, E, images, S):
    """Walk the grid rows in the footprint of each pair of a beam and a chart.

    ``ADD`` adds loads to ``E`` and ``images``; ``COUNT`` returns how many samples the rows hold at
    most; ``NOTE`` writes the samples into ``S`` and returns how many.
    """
    Q, M, L, W = np.empty((3, 2)), np.empty((3, 3)), np.empty((3, 3)), np.empty(5)
    found = 0
    for pair in range(chart.size):
        k, c = beam[pair], chart[pair]
        # Rows of tables are picked out here: in the loops below it would cost more than the sums.
        reach, edge, mean = blur.reach[ring[k]], blur.edge[ring[k]], blur.mean[ring[k]]
        radii, shares = blur.radii[ring[k]], blur.weights[ring[k]]
        rho, low, high, m, widening = footprint(B, k, G, c, reach, blur.variance[ring[k]], Q, M, W)
        if rho < 0.0:
            continue
        n, r = G.normal[c], B.frame[k, 0]
        cos_g = -(n[0] * r[0] + n[1] * r[1] + n[2] * r[2])
        h, nu, nv = G.spacing[c], G.shape[c, 0], G.shape[c, 1]
        area = edge_lines(Q, L)
        step = h / m
        off_middle = (0.5 * m - m // 2 - 0.5) * step  # from the middle sample to the cell's middle
        strength = factor[k] * cos_g / (m * m)
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
            if task == COUNT:
                found += max(0, i_last - i_first + 1)
                continue
            # Sample i is number ``sub`` in cell ``column`` of the row.
            column, sub = i_first // m, i_first % m - 1
            row, middle_row = G.offset[c] + j // m, j % m == m // 2
            for i in range(i_first, i_last + 1):
                sub += 1
                if sub == m:
                    column, sub = column + 1, 0
                p = G.cell[row + column * nv]
                if p < 0:
                    continue
                x = (i + 0.5) * step
                a, b = px + x * M[1, 1], py + x * M[2, 1]
                D = path_at(W, a, b, M[0, 0] + x * M[0, 1] + y * M[0, 2])
                if D <= 0.0:
                    continue
                wide = math.sqrt(D * D + widening)
                density = sample_density(Q, L, area, a, b, wide, reach, edge, mean, radii, shares)
                if density <= 0.0:
                    continue
                seen = (
                    middle_row
                    and sub == m // 2
                    and has_inside(
                        Q,
                        a + off_middle * (M[1, 1] + M[1, 2]),
                        b + off_middle * (M[2, 1] + M[2, 2]),
                    )
                )
                if task == ADD:
                    E[p] += strength * density
                    if seen:
                        images[p] += 1
                    continue
                S.pair[found], S.point[found] = pair, p
                S.load[found], S.image[found] = strength * density, seen
                S.across[found, 0], S.across[found, 1], S.step[found] = a, b, step
                S.rho[found] = D * reach
                for q in range(3):
                    S.place[found, q] = G.origin[c, q] + x * G.u[c, q] + y * G.v[c, q]
                found += 1
    return found


def splat(
    beams: Beams,
    *,
    factor: Floats,
    blur: Blur,
    ring: Ints,
    chart: Ints,
    grids: Grids,
    load: Floats,
    images: Ints,
) -> None:
    """Add the light of beams to the charts that they land on.

    Parameters
    ----------
    beams : Beams
        ``k`` beams, each landing wholly on one chart.
    factor : (k,) float
        Power of each beam; loads are in its unit per m². [m² or W]
    blur : Blur
        The sun as ``s`` kinds of surface blur it.
    ring : (k,) int
        Row of ``blur`` for each beam.
    chart : (k,) int
        Number of the chart that each beam lands on.
    grids : Grids
        The charts.
    load : (n,) float
        Mean over each point's cell; added to. [factor's unit / m²]
    images : (n,) int
        Number of tubes whose image holds the middle of the cell; added to.
    """
    beam = np.arange(len(chart), dtype=np.int32)
    walk(beams, beam, chart, factor, blur, ring, grids, ADD, load, images, NO_SAMPLES)


NO_SAMPLES = room_for(0)
