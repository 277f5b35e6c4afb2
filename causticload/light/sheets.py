"""What reflects at a point of a facet: one sheet, or several with normals of their own.

A unit whose panes stay parallel is one sheet. Panes that bow apart are a sheet each. What no round
blur can stand for is laid out as several sheets that share the light: a brushed finish, which
tilts more across its lines than along them, and a roller wave of which only the mean over its
random phases is wanted. The tilts of such *nodes* are those of a Gauss rule, so that the first
2 n - 1 moments of the slopes' distribution are exact with n of them.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np

from causticload.optics.finish import Finish
from causticload.optics.tables import ReflectanceTables
from causticload.scene.model import Bools, Floats, Ints, PaneFigures, Scene

MOST_NODES = 7  # of a roller wave's mean
MOST_BRUSH_NODES = 17
BRUSH_REACH = 2.4  # standard deviations that the nodes of a brush span to either side
NODE_STEP = 2.0  # standard deviations of the blur by which neighbouring nodes turn light apart
SUN_RADIUS = 4.65e-3  # rad
SUN_RMS = SUN_RADIUS / 2.0  # of an even disc along one axis [rad]


class _Node(NamedTuple):
    """A share of a lobe's light and how far its surface tilts along the panel's axes."""

    share: float
    tilt: tuple[float, float]


@dataclass(frozen=True, kw_only=True)
class Sheets:
    """All sheets of a scene: ``k`` rows, ``s`` surfaces, each with some rows in sequence.

    Light that comes from the sun meets ``count`` sheets of a surface from ``first`` on; light
    that comes from another mirror meets ``again_count`` from ``again`` on, which are whole lobes.
    """

    R: Floats  # (k, 2, 2, angles) band, polarisation, angle [1]
    low: Floats  # (k, 2, angles) band: what an unknown angular law leaves open, over R [1]
    high: Floats  # (k, 2, angles)
    slope_error: Floats  # (k,) rad rms, alike in all directions
    slopes: Floats  # (k, 2) rad rms along the panel's width and height; for the ray count
    scatter: Floats  # (k,) share that leaves the mirror direction
    enters: Floats  # (k,) 1 for the sheet that enters what its facet takes in, else 0
    shows: Bools  # (k,) it counts as an image of the sun
    pane: Ints  # (k,) pane of the panel's figure
    tilt: Floats  # (k, 2) slope along width and height
    rank: Ints  # (k,) place among the rows of its surface
    first: Ints  # (s,)
    count: Ints  # (s,)
    again: Ints  # (s,)
    again_count: Ints  # (s,)
    rows: Ints  # (s,) all rows of the surface
    waves: Bools  # (s,) roller waves are followed one by one


def lay_sheets(
    scene: Scene, finishes: Sequence[Finish], *, waves: Bools, nodes: bool = True
) -> Sheets:
    """Lay out the sheets of a scene.

    Parameters
    ----------
    scene : Scene
        What stands there.
    finishes : sequence of Finish
        Finish of each surface; those of surfaces that do not reflect are not used.
    waves : (s,) bool
        Surfaces whose roller waves are followed one by one; of the others the mean over phases
        is taken.
    nodes : bool
        Whether brushed finishes are laid out as nodes. Otherwise ``slopes`` tells of them.

    Returns
    -------
    sheets : Sheets
        Contiguous arrays.
    """
    apart = [bow_apart(scene, i, follow_waves=bool(w)) for i, w in enumerate(waves)]
    tables = ReflectanceTables.build(finishes, apart)
    rows: list[dict[str, Any]] = []
    spans = np.zeros((len(finishes), 5), np.int32)
    for i in range(len(finishes)):
        lobes = tables.first_sheet[i] + np.arange(tables.sheet_count[i])
        start = len(rows)
        wave = _mean_wave(scene, i) if nodes and not waves[i] else [_Node(1.0, (0.0, 0.0))]
        split = False
        for lobe in lobes:
            brush, rest = _brush(tables, lobe) if nodes else ([_Node(1.0, (0.0, 0.0))], None)
            both = [
                _Node(a.share * b.share, (a.tilt[0] + b.tilt[0], a.tilt[1] + b.tilt[1]))
                for a in brush
                for b in wave
            ]
            split |= len(both) > 1
            rows += [
                _row(tables, lobe, node, rest, rank=len(rows) - start + j, shows=j == 0)
                for j, node in enumerate(both)
            ]
        met = len(rows) - start
        again = start
        if split:  # the middles of lobes, with their mean roughness, for a second reflection
            again = len(rows)
            for lobe in lobes:
                rest = float(np.hypot(tables.slope_error[lobe], _rms(wave)))
                node = _Node(1.0, (0.0, 0.0))
                rows.append(_row(tables, lobe, node, rest, rank=len(rows) - start, shows=True))
        spans[i] = start, met, again, len(lobes), len(rows) - start
    seen = np.zeros(len(rows))
    seen[spans[:, 0]] = 1.0

    def column(key: str) -> Any:
        return np.ascontiguousarray(np.array([r[key] for r in rows]))

    return Sheets(
        R=column("R"),
        low=column("low"),
        high=column("high"),
        slope_error=column("slope_error"),
        slopes=column("slopes"),
        scatter=column("scatter"),
        enters=seen,
        shows=column("shows"),
        pane=column("pane"),
        tilt=column("tilt"),
        rank=column("rank").astype(np.int32),
        first=spans[:, 0].copy(),
        count=spans[:, 1].copy(),
        again=spans[:, 2].copy(),
        again_count=spans[:, 3].copy(),
        rows=spans[:, 4].copy(),
        waves=np.asarray(waves, bool),
    )


def _row(
    tables: ReflectanceTables,
    lobe: int,
    node: _Node,
    rest: float | None,
    *,
    rank: int,
    shows: bool,
) -> dict[str, Any]:
    """One sheet: a share of a lobe."""
    along, across = tables.slope_errors[lobe]
    by_axis = (across, along) if tables.brush_along_height[lobe] else (along, across)
    return {
        "R": node.share * tables.R[lobe],
        "low": tables.low_factor[lobe],
        "high": tables.high_factor[lobe],
        "slope_error": tables.slope_error[lobe] if rest is None else rest,
        "slopes": by_axis,
        "scatter": tables.diffuse_fraction[lobe],
        "shows": shows,
        "pane": tables.pane[lobe],
        "tilt": node.tilt,
        "rank": rank,
    }


def panes_of(figures: PaneFigures | None, scene: Scene, surface: int) -> Ints:
    """Rows of a surface's figured panes.

    Parameters
    ----------
    figures : PaneFigures or None
        Figures of the scene.
    scene : Scene
        What stands there.
    surface : int
        Number of the surface.

    Returns
    -------
    rows : (n,) int
        None if it has no figure.
    """
    if figures is None:
        return np.zeros(0, np.int64)
    return np.flatnonzero(scene.panels.surface[figures.panel] == surface)


def bow_apart(scene: Scene, surface: int, *, follow_waves: bool) -> bool:
    """Tell whether the panes of a surface's units part company.

    Parameters
    ----------
    scene : Scene
        What stands there.
    surface : int
        Number of the surface.
    follow_waves : bool
        Whether its roller waves are followed: each pane has its own.

    Returns
    -------
    apart : bool
        Whether they do.
    """
    g = scene.figures
    rows = panes_of(g, scene, surface)
    if g is None or not len(rows):
        return False
    outer = g.first[g.panel[rows]]
    if follow_waves and (g.wave[rows] > 0.0).any():
        return bool((g.count[g.panel[rows]] > 1).any())
    return bool((g.bow[rows] != g.bow[outer]).any())


def _mean_wave(scene: Scene, surface: int) -> list[_Node]:
    """Nodes of a surface's roller wave: its slope at a random place is an arcsine law's.

    A pane's phase is as likely as any other, so this is the exact mean over phases; only the
    rule's finite number of nodes is an approximation (Gauss and Chebyshev).
    """
    g = scene.figures
    rows = panes_of(g, scene, surface)
    if g is None or not len(rows) or g.wave[rows[0]] == 0.0:
        return [_Node(1.0, (0.0, 0.0))]
    steepest = g.wave[rows[0]] * g.wave_number[rows[0]]
    reach = 2.0 * float(np.linalg.norm(steepest))
    n = int(np.clip(np.ceil(np.pi * reach / (NODE_STEP * SUN_RMS)), 2, MOST_NODES))
    at = np.cos(np.pi * (2 * np.arange(n) + 1) / (2 * n))
    # The middle first: it stands for the image of the sun.
    return [
        _Node(1.0 / n, (float(x * steepest[0]), float(x * steepest[1])))
        for x in at[np.argsort(np.abs(at))]
    ]


def _rms(nodes: Sequence[_Node]) -> float:
    """Slope error, alike in all directions, that spreads light as much as nodes do."""
    return float(np.sqrt(sum(n.share * (n.tilt[0] ** 2 + n.tilt[1] ** 2) for n in nodes) / 2.0))


def _brush(tables: ReflectanceTables, lobe: int) -> tuple[list[_Node], float | None]:
    """Nodes of a brushed lobe and the slope error, alike in all directions, that is left to each.

    The tilt across the lines is Gaussian, taken at even steps: what is left to each node, blurred
    by the sun besides, joins them without a ripple of more than two per cent as long as a step is
    no longer than two standard deviations of that. Where the most nodes do not reach as far, what
    is left to each is made larger than the tilt along the lines, and so the spot too wide along
    them and too faint: by less than 10 % where the tilt across is below 15 mrad.
    """
    along, across = (float(x) for x in tables.slope_errors[lobe])
    if across <= along:
        return [_Node(1.0, (0.0, 0.0))], None
    rest = along
    while True:
        spread = float(np.sqrt(across**2 - rest**2))
        step = NODE_STEP * float(np.hypot(SUN_RMS, 2.0 * rest)) / 2.0
        reach = int(np.ceil(BRUSH_REACH * spread / step))
        if 2 * reach + 1 <= MOST_BRUSH_NODES:
            break
        rest = min(across, rest + 0.02 * across)
    x = step * np.arange(-reach, reach + 1) if spread > 0.0 else np.zeros(1)
    w = np.exp(-0.5 * (x / max(spread, 1e-12)) ** 2)
    # Cut off at the reach, the steps' own variance falls short: stretch it to the true one.
    x *= spread / max(float(np.sqrt(w @ x**2 / w.sum())), 1e-12)
    axis = np.array([1.0, 0.0] if tables.brush_along_height[lobe] else [0.0, 1.0])
    order = np.argsort(np.abs(x), kind="stable")
    return [
        _Node(float(w[i] / w.sum()), (float(x[i] * axis[0]), float(x[i] * axis[1]))) for i in order
    ], rest
