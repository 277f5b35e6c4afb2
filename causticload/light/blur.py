"""The sun's disc as a kernel that blurs images: its light within a polygon, by table.

The light of a radially symmetric disc about the origin that falls within a polygon is, in polar
coordinates about the disc's middle, a sum over the polygon's edges (Green's theorem). Let ``W(r)``
be the share of the light within ``r``, all lengths over the disc's radius. An edge at signed
distance ``h`` inwards that runs from ``s1`` to ``s2`` along its line gives

    1/(2 pi) integral_s1^s2 W(r) h / r² ds,    r² = h² + s².

Outside the disc W = 1 and the integral is the angle that the edge fills. Inside, W = r² k(r) with a
smooth ``k`` that runs between the radiance at the middle and 1, so the integral is

    h (V(h, s2) - V(h, s1)),    V(h, s) = integral_0^s k ds.

``V / s``, a mean of ``k``, is kept in a table, and so one lookup does for all concentric discs that
make up the sun. For one uniform disc (k = 1) the sum is the plain overlap of
:mod:`causticload.light.overlap`.
"""

from __future__ import annotations

import math
from functools import lru_cache
from typing import NamedTuple

import numpy as np
from numba import njit

from causticload.scene.model import Floats

CELLS = 64  # of the table along each axis: bilinear between them errs by less than 1e-5
EDGE_CELLS = 512  # of the table for a straight edge
STEPS = 40  # of the integral within each cell


class Blur(NamedTuple):
    """The sun as each sheet blurs it. ``s`` sheets, ``r`` discs each."""

    radii: Floats  # (s, r) tangents of the discs' angular radii, growing along a row
    weights: Floats  # (s, r) their shares of the light; a row adds up to 1
    reach: Floats  # (s,) tangent of the largest radius
    variance: Floats  # (s,) of the light along an axis, over the largest radius squared
    edge: Floats  # (s, EDGE_CELLS + 1) light inwards of a line at distance -1 to 1
    mean: Floats  # (s, CELLS + 1, CELLS + 1) mean of k along an edge: distance h, end s


def make_blur(radii: Floats, weights: Floats) -> Blur:
    """Lay out the tables of some suns.

    Parameters
    ----------
    radii : (s, r) float
        Tangents of the angular radii of concentric uniform discs, growing along a row, > 0.
    weights : (s, r) float
        Shares of the light; each row adds up to 1.

    Returns
    -------
    blur : Blur
        What the kernels read.
    """
    radii = np.ascontiguousarray(radii, dtype=np.float64)
    weights = np.ascontiguousarray(weights, dtype=np.float64)
    # The Earth's distance scales all radii alike: the tables hold for the whole year.
    shapes = [
        (tuple(np.round(r / r[-1], 6)), tuple(np.round(w, 9)))
        for r, w in zip(radii, weights, strict=True)
    ]
    tables = [_tables(*shape) for shape in shapes]
    return Blur(
        radii=radii,
        weights=weights,
        reach=radii[:, -1].copy(),
        variance=(weights * (radii / radii[:, -1:]) ** 2).sum(axis=1) / 4.0,
        edge=np.stack([edge for edge, _ in tables]),
        mean=np.stack([mean for _, mean in tables]),
    )


@lru_cache(maxsize=256)
def _tables(radii: tuple[float, ...], weights: tuple[float, ...]) -> tuple[Floats, Floats]:
    """Tables of a disc of radius 1: light inwards of a line, and the mean of k."""
    r, w = np.array(radii), np.array(weights)
    x = np.linspace(-1.0, 1.0, EDGE_CELLS + 1)
    edge = np.zeros_like(x)
    for radius, share in zip(r, w, strict=True):
        e = np.clip(x / radius, -1.0, 1.0)
        edge += share * (1.0 - (np.arccos(e) - e * np.sqrt(1.0 - e * e)) / np.pi)
    h = np.linspace(0.0, 1.0, CELLS + 1)
    s = (np.arange(CELLS * STEPS) + 0.5) / (CELLS * STEPS)
    r2 = h[:, None] ** 2 + s**2
    k = (w * 1.0 / np.maximum(r**2, r2[..., None])).sum(axis=-1)
    ends = np.arange(1, CELLS + 1) / CELLS
    mean = np.empty((CELLS + 1, CELLS + 1))
    mean[:, 1:] = np.cumsum(k, axis=1)[:, STEPS - 1 :: STEPS] / (CELLS * STEPS) / ends
    mean[:, 0] = (w * 1.0 / np.maximum(r, h[:, None]) ** 2).sum(axis=1)
    return edge, mean


@njit(cache=True, nogil=True, error_model="numpy")
def light_inside_line(edge, e):
    """Share of the light inwards of a line at distance ``e`` inwards, |e| <= 1."""
    x = (e + 1.0) * (0.5 * EDGE_CELLS)
    i = min(int(x), EDGE_CELLS - 1)
    f = x - i
    return (1.0 - f) * edge[i] + f * edge[i + 1]


@njit(cache=True, nogil=True, error_model="numpy")
def _mean_at(mean, h, s):
    """Bilinear between the entries of the table, 0 <= h, s <= 1."""
    y, x = h * CELLS, s * CELLS
    j, i = min(int(y), CELLS - 1), min(int(x), CELLS - 1)
    g, f = y - j, x - i
    return (1.0 - g) * ((1.0 - f) * mean[j, i] + f * mean[j, i + 1]) + g * (
        (1.0 - f) * mean[j + 1, i] + f * mean[j + 1, i + 1]
    )


@njit(cache=True, nogil=True, error_model="numpy")
def light_inside_triangle(Q, L, mean, x, y, rho):
    """Share of the light of a disc of radius ``rho`` about (x, y) that falls within ``Q``.

    ``L`` holds the lines along the edges of ``Q``: a x + b y + c is the distance inwards. ``Q`` is
    no speck: its area is a hundredth of the disc's at least. The angles of the edges' parts outside
    the disc are added as one complex product, whose argument is their sum but for a whole turn.
    """
    inner, re, im = 0.0, 1.0, 0.0
    nearest = math.inf
    for j in range(3):
        k = (j + 1) % 3
        a, b = L[j, 0], L[j, 1]
        h = (a * x + b * y + L[j, 2]) / rho
        nearest = min(nearest, h)
        # Along the edge, the inner side on the left.
        s1 = (b * (Q[j, 0] - x) - a * (Q[j, 1] - y)) / rho
        s2 = (b * (Q[k, 0] - x) - a * (Q[k, 1] - y)) / rho
        if s1 > s2:
            s1, s2 = s2, s1
        c2 = 1.0 - h * h
        c = math.sqrt(c2) if c2 > 0.0 else 0.0
        low, high = max(s1, -c), min(s2, c)
        if low >= high:  # wholly outside the disc
            p, q = h * h + s1 * s2, h * (s2 - s1)
            re, im = re * p - im * q, re * q + im * p
            continue
        if s1 < low:
            p, q = h * h + s1 * low, h * (low - s1)
            re, im = re * p - im * q, re * q + im * p
        if s2 > high:
            p, q = h * h + high * s2, h * (s2 - high)
            re, im = re * p - im * q, re * q + im * p
        d = abs(h)
        inner += h * (high * _mean_at(mean, d, abs(high)) - low * _mean_at(mean, d, abs(low)))
    light = (math.atan2(im, re) + inner) / (2.0 * math.pi)
    # The whole turn: all light is inside only if no edge comes near, none only if one does.
    if light < -1e-3 or (nearest > 0.5 and light < 0.5):
        light += 1.0
    return min(1.0, max(0.0, light))
