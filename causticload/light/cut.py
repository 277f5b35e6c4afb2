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
# Strips this wide show a wave's ripple at 95 % of its depth; a grid's own measure of how straight a
# tube's image is would let wider ones pass.
STRIP_PART = 0.125
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
    across = _across_wave(F, tubes.take(on))
    span[on] = np.abs(np.roll(across, -1, axis=1) - across)
    return span


def slice_waves(F: Facets, tubes: Tubes, *, part: float) -> Tubes:
    """Cut tubes along the crests of their roller waves, as long strips.

    Parameters
    ----------
    F : Facets
        The scene's triangles.
    tubes : Tubes
        Any number of tubes.
    part : float
        Widest strip that may remain. [wavelengths]

    Returns
    -------
    tubes : Tubes
        As many as it takes, in no particular order.
    """
    wide = wave_spans(F, tubes).max(axis=1) > part * (1.0 + 1e-9)
    if not wide.any():
        return tubes
    cut = tubes.take(wide)
    across = _across_wave(F, cut)
    n = np.arange(len(across))
    low, middle, high = np.argsort(across, axis=1).T
    span = across[n, high] - across[n, low]
    # The crest through the middle corner parts the triangle in two, each with a side along a crest.
    share = ((across[n, middle] - across[n, low]) / span)[:, None]
    opposite = cut.bary[n, low] + share * (cut.bary[n, high] - cut.bary[n, low])
    done = [tubes.take(~wide)]
    for tip, size in ((low, share[:, 0] * span), (high, (1.0 - share[:, 0]) * span)):
        done += _strips(F, cut, cut.bary[n, tip], cut.bary[n, middle], opposite, size / part)
    return _join(done)


def _strips(
    F: Facets, tubes: Tubes, tip: Floats, left: Floats, right: Floats, widths: Floats
) -> list[Tubes]:
    """Triangles cut parallel to the side from ``left`` to ``right``, into strips of two triangles.

    ``widths`` (n,) is how many strips a triangle is high; all corners are barycentric, (n, 3).
    """
    count = np.ceil(widths - 1e-6).astype(np.int64)
    owner = np.repeat(np.arange(len(count)), count)
    place = np.arange(len(owner)) - np.repeat(np.cumsum(count) - count, count)
    near, far = place / count[owner], (place + 1) / count[owner]
    a, b = tip[owner], left[owner] - tip[owner]
    c = right[owner] - tip[owner]
    corners = [a + near[:, None] * b, a + far[:, None] * b, a + far[:, None] * c]
    last = a + near[:, None] * c
    source = tubes.take(owner)
    pieces = []
    for three in (corners, [corners[0], corners[2], last]):
        bary = np.stack(three, axis=1)
        size = np.abs(np.linalg.det(bary))
        area = F.area[source.facet] * size
        pieces.append(Tubes(source.facet, source.sheet, bary, area).take(size > _TOUCH**2))
    return pieces


def _across_wave(F: Facets, tubes: Tubes) -> Floats:
    """Where the corners of tubes on roller waves lie across them, (n, 3). [wavelengths]"""
    row = figure_row(F, tubes)
    k = np.einsum("na,nai->ni", F.wave_number[row], F.frame[row, 1:]) / (2.0 * np.pi)
    corner = np.einsum("nij,njk->nik", tubes.bary, F.corner[tubes.facet])
    return np.asarray(np.einsum("nci,ni->nc", corner - F.frame[row, 0][:, None], k))


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
    """Cut tubes at the edges of kinks and along waves, and halve what is too long.

    Parameters
    ----------
    F : Facets
        The scene's triangles.
    tubes : Tubes
        Any number of tubes.
    waves : bool
        Whether to cut them into strips along roller waves.

    Returns
    -------
    tubes : Tubes
        As many as it takes, in no particular order.
    """
    tubes = _cut_at_kinks(F, tubes)
    if waves:
        tubes = slice_waves(F, tubes, part=STRIP_PART)
    done: list[Tubes] = []
    while len(tubes.facet):
        row = figure_row(F, tubes)
        most = np.full(len(row), LONGEST_EDGE_M)
        bent = np.flatnonzero((row >= 0) & (F.bend[row] >= 0)) if len(F.bend) else row[:0]
        most[bent] = np.minimum(LONGEST_EDGE_M, BOW_PART * 2.0 * F.half[row[bent]].min(axis=1))
        corner = np.einsum("nij,njk->nik", tubes.bary, F.corner[tubes.facet])
        excess = np.linalg.norm(np.roll(corner, -1, axis=1) - corner, axis=2) / most[:, None]
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
