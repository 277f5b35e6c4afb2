"""Hot spots: connected regions of a receiver over a limit; episodes: hot spots through a day."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy import ndimage, sparse
from scipy.sparse.csgraph import connected_components
from scipy.spatial import cKDTree

from causticload.hazard.findings import HotSpot
from causticload.scene.model import Chart, Floats, Ints

# Cells touch when they are neighbours in the grid, also over a corner: 1.5 cells apart.
TOUCH = 1.5
# A spot in the next step is the same one if it is not further off than the two spots' sizes and
# this. At 150 m a spot moves 0.65 m/min: 3 m in the longest usual step.
TRAVEL_M = 3.0


@dataclass(frozen=True)
class Region:
    """A connected set of receiver points. ``q`` points."""

    points: Ints  # (q,) numbers of the points
    value: Floats  # (q,) W/m²


def regions(
    index: Ints, value: Floats, *, charts: Sequence[Chart], chart_of: Ints, places: Floats
) -> list[Region]:
    """Split points over a limit into connected regions.

    Parameters
    ----------
    index : (q,) int
        Numbers of points of one receiver, ascending.
    value : (q,) float
        Their irradiance. [W/m²]
    charts : sequence of Chart
        All charts of the scene.
    chart_of : (n,) int
        Chart of each point of the scene.
    places : (n, 3) float
        All points of the scene. [m]

    Returns
    -------
    regions : list of Region
        The region with the largest value first.
    """
    if not len(index):
        return []
    chart = chart_of[index]
    if chart[0] == chart[-1]:
        label = _grid_labels(index, charts[chart[0]])
    else:
        label = _near_labels(places[index], TOUCH * max(charts[c].spacing for c in set(chart)))
    found = [Region(index[label == k], value[label == k]) for k in range(int(label.max()) + 1)]
    return sorted(found, key=lambda r: -float(r.value.max()))


def _grid_labels(index: Ints, chart: Chart) -> Ints:
    """Connected regions within the grid of one chart, numbered from 0."""
    row, column = _cells(chart)
    local = index - chart.first
    i, j = row[local], column[local]
    mask = np.zeros((np.ptp(i) + 1, np.ptp(j) + 1), bool)
    mask[i - i.min(), j - j.min()] = True
    label, _ = ndimage.label(mask, structure=np.ones((3, 3)))
    return label[i - i.min(), j - j.min()] - 1


_CELLS: dict[int, tuple[Chart, Ints, Ints]] = {}


def _cells(chart: Chart) -> tuple[Ints, Ints]:
    """Grid row and column of each point of a chart; kept, since every step asks for them."""
    kept = _CELLS.get(id(chart))
    if kept is None or kept[0] is not chart:
        i, j = np.nonzero(chart.cell >= 0)
        order = np.argsort(chart.cell[i, j])
        if len(_CELLS) > 10_000:
            _CELLS.clear()
        kept = _CELLS[id(chart)] = (chart, i[order], j[order])
    return kept[1], kept[2]


def _near_labels(places: Floats, reach: float) -> Ints:
    """Connected regions by distance, over the seams of charts, numbered from 0."""
    pairs = cKDTree(places).query_pairs(reach, output_type="ndarray")
    n = len(places)
    graph = sparse.coo_matrix((np.ones(len(pairs)), (pairs[:, 0], pairs[:, 1])), shape=(n, n))
    return connected_components(graph, directed=False)[1]


def follow(steps: Sequence[Sequence[HotSpot]]) -> list[list[list[HotSpot]]]:
    """Follow hot spots of one receiver and criterion through the steps of a day.

    Spots of neighbouring steps belong together when they are near enough; an episode is a
    connected set of them, so that spots that part and join again stay one episode.

    Parameters
    ----------
    steps : sequence of sequence of HotSpot
        The spots of each step, empty where there are none.

    Returns
    -------
    episodes : list of list of list of HotSpot
        For each episode the spots of each of its steps, the strongest first.
    """
    spots = [(k, spot) for k, step in enumerate(steps) for spot in step]
    if not spots:
        return []
    step = np.array([k for k, _ in spots])
    centre = np.array([s.centre for _, s in spots])
    size = np.sqrt(np.array([s.area for _, s in spots]) / np.pi)
    heads: list[int] = []
    tails: list[int] = []
    for k in range(int(step.min()), int(step.max())):
        now, then = np.flatnonzero(step == k), np.flatnonzero(step == k + 1)
        if len(now) and len(then):
            gap = np.linalg.norm(centre[now, None] - centre[None, then], axis=2)
            a, b = np.nonzero(gap <= size[now, None] + size[None, then] + TRAVEL_M)
            heads += list(now[a])
            tails += list(then[b])
    n = len(spots)
    graph = sparse.coo_matrix(
        (np.ones(len(heads)), (np.array(heads, int), np.array(tails, int))), shape=(n, n)
    )
    label = connected_components(graph, directed=False)[1]
    episodes: list[list[list[HotSpot]]] = []
    for e in range(int(label.max()) + 1):
        mine = np.flatnonzero(label == e)
        by_step = [
            sorted((spots[i][1] for i in mine if step[i] == k), key=lambda s: -s.peak)
            for k in np.unique(step[mine])
        ]
        episodes.append(by_step)
    return episodes
