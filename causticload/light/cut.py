"""Tubes before any light: cut so short that their few rays cannot step over what matters."""

from __future__ import annotations

import numpy as np

from causticload.light.facets import Facets
from causticload.light.tubes import Tubes, halve
from causticload.scene.model import Floats, Ints

# Longest edge of a tube before any light: its rays must not step over a pier or a tree trunk.
LONGEST_EDGE_M = 4.0
# A bowed pane turns its slope once from rim to rim: no edge is longer than this share of it.
BOW_PART = 0.5
# Between rays this share of a wavelength apart a wave cannot hide.
WAVE_PART = 0.25
# A line nearer to a corner than this share of the tube's size does not cut it.
_TOUCH = 1e-6


def figure_row(F: Facets, tubes: Tubes) -> Ints:
    """Row of each tube's figure.

    Parameters
    ----------
    F : Facets
        The scene's triangles.
    tubes : Tubes
        ``n`` tubes.

    Returns
    -------
    row : (n,) int
        -1 where the mesh's own normals hold.
    """
    first = F.row[tubes.facet]
    return np.where(first >= 0, first + F.rank[tubes.sheet], -1)


def wave_spans(F: Facets, tubes: Tubes) -> Floats:
    """How far each edge of a tube reaches across the roller wave it is on.

    Parameters
    ----------
    F : Facets
        The scene's triangles.
    tubes : Tubes
        ``n`` tubes.

    Returns
    -------
    span : (n, 3) float
        In wavelengths; edge ``e`` runs from corner e to corner e + 1. [1]
    """
    span = np.zeros((len(tubes.facet), 3))
    if not F.wave.any():
        return span
    row = figure_row(F, tubes)
    on = np.flatnonzero(row >= 0)
    on = on[F.wave[row[on]] != 0.0]
    if len(on):
        r = row[on]
        k = np.einsum("na,nai->ni", F.wave_number[r], F.frame[r, 1:]) / (2.0 * np.pi)
        corner = np.einsum("nij,njk->nik", tubes.bary[on], F.corner[tubes.facet[on]])
        span[on] = np.abs(np.einsum("nei,ni->ne", np.roll(corner, -1, axis=1) - corner, k))
    return span


def wave_sway(F: Facets, tubes: Tubes) -> Floats:
    """Angle by which a tube's wave may turn light away from where its own rays say it goes.

    Parameters
    ----------
    F : Facets
        The scene's triangles.
    tubes : Tubes
        ``n`` tubes.

    Returns
    -------
    sway : (n,) float
        0 where edges are short against the wave. [rad]
    """
    sway = np.zeros(len(tubes.facet))
    if not F.wave.any():
        return sway
    coarse = np.flatnonzero(wave_spans(F, tubes).max(axis=1) > WAVE_PART)
    row = figure_row(F, tubes)[coarse]
    # A slope runs from minus to plus its steepest, and light turns by twice as much.
    sway[coarse] = 4.0 * F.wave[row] * np.linalg.norm(F.wave_number[row], axis=1)
    return sway


def cut_to_figure(F: Facets, tubes: Tubes, *, waves: bool = True) -> Tubes:
    """Cut tubes at the edges of kinks, and halve them until no edge is too long.

    Parameters
    ----------
    F : Facets
        The scene's triangles.
    tubes : Tubes
        Any number of tubes.
    waves : bool
        Whether to go down to a share of each roller wave's length.

    Returns
    -------
    tubes : Tubes
        As many as it takes, in no particular order.
    """
    tubes = _cut_at_kinks(F, tubes)
    done: list[Tubes] = []
    while len(tubes.facet):
        row = figure_row(F, tubes)
        most = np.full(len(row), LONGEST_EDGE_M)
        bent = np.flatnonzero((row >= 0) & (F.bend[row] >= 0)) if len(F.bend) else row[:0]
        most[bent] = np.minimum(LONGEST_EDGE_M, BOW_PART * 2.0 * F.half[row[bent]].min(axis=1))
        corner = np.einsum("nij,njk->nik", tubes.bary, F.corner[tubes.facet])
        excess = np.linalg.norm(np.roll(corner, -1, axis=1) - corner, axis=2) / most[:, None]
        if waves:
            excess = np.maximum(excess, wave_spans(F, tubes) / WAVE_PART)
        edge = np.argmax(excess, axis=1)
        long = excess[np.arange(len(edge)), edge] > 1.0 + 1e-9
        done.append(tubes.take(~long))
        tubes = halve(tubes.take(long), edge[long])
    return _join(done) if done else tubes


def _join(parts: list[Tubes]) -> Tubes:
    return Tubes(*(np.concatenate(a) for a in zip(*parts, strict=True)))


def _cut_at_kinks(F: Facets, tubes: Tubes) -> Tubes:
    """Cut along the lines where kinks begin: on either side the slope is linear."""
    if not F.kink.any():
        return tubes
    for e in range(F.kinked.shape[1]):
        row = figure_row(F, tubes)
        corner = np.einsum("nij,njk->nik", tubes.bary, F.corner[tubes.facet])
        r = np.maximum(row, 0)
        offset = corner - F.frame[r, 0][:, None]
        xy = np.einsum("nci,nai->nca", offset, F.frame[r, 1:])
        line = F.kinked[r, e]
        inwards = np.einsum("nca,na->nc", xy, line[:, :2]) + (line[:, 2] - F.kink_width[r])[:, None]
        size = np.ptp(np.where(np.isfinite(inwards), inwards, 0.0), axis=1)
        low, high = inwards.min(axis=1), inwards.max(axis=1)
        cut = (row >= 0) & (F.kink[r] != 0.0) & (low < -_TOUCH * size) & (high > _TOUCH * size)
        tubes = _join([tubes.take(~cut), *_cut_by_line(F, tubes.take(cut), inwards[cut])])
    return tubes


def _cut_by_line(F: Facets, tubes: Tubes, distance: Floats) -> list[Tubes]:
    """Cut triangles by a line given as signed distances of their corners, (n, 3)."""
    n = np.arange(len(distance))
    alone = np.argmax(
        np.sign(distance) == -np.sign(np.sign(distance).sum(axis=1, keepdims=True)), axis=1
    )
    on_line = np.abs(distance) <= 0.0
    # With a corner on the line and one on each side the "lone" one may be either.
    alone = np.where(on_line.any(axis=1), np.argmax(distance, axis=1), alone)
    ahead, behind = (alone + 1) % 3, (alone + 2) % 3
    a, b, c = (tubes.bary[n, i] for i in (alone, ahead, behind))
    da, db, dc = (distance[n, i] for i in (alone, ahead, behind))
    p = a + (da / (da - db))[:, None] * (b - a)
    q = a + (da / (da - dc))[:, None] * (c - a)
    pieces = []
    for corners in ((a, p, q), (p, b, c), (p, c, q)):
        bary = np.stack(corners, axis=1)
        size = np.abs(np.linalg.det(bary))
        kept = size > _TOUCH**2
        area = F.area[tubes.facet] * size
        pieces.append(Tubes(tubes.facet, tubes.sheet, bary, area).take(kept))
    return pieces
