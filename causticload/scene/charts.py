"""Receivers as charts: planar pieces with a regular grid of cells each."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from math import radians
from typing import Any

import numpy as np
import shapely
from scipy.ndimage import binary_dilation

from causticload.errors import InputError
from causticload.scene.model import Bools, Chart, Floats, Ints
from causticload.scene.topology import coplanar_groups, face_normals, shared_edges, weld

# Faces of one chart lie in one plane to within what a receiver cell cannot tell.
SAME_PLANE_RAD = radians(0.5)
SAME_PLANE_M = 0.01
LEAST_CELL_M2 = 1e-9
# A turned grid is taken where it saves this share of the cells.
TURN_SAVES = 0.2


def make_charts(
    triangles: Floats, *, surface: int, spacing_m: float, region: Floats | None = None
) -> tuple[tuple[Chart, ...], Ints]:
    """Lay grids over the planes of a receiver.

    Parameters
    ----------
    triangles : (k, 3, 3) float
        The receiver's triangles. [m]
    surface : int
        Number of the surface.
    spacing_m : float
        Size of the cells, > 0. [m]
    region : (2, 3) float, optional
        Lower and upper bounds outside of which nothing is sampled. [m]

    Returns
    -------
    charts : tuple of Chart
        ``first`` is 0 in each; see :func:`number_charts`.
    chart_of_triangle : (k,) int
        Number of each triangle's chart, -1 where it lies outside the region.

    Raises
    ------
    InputError
        If the spacing is not positive.
    """
    if not 0.0 < spacing_m < np.inf:
        raise InputError(f"spacing must be > 0, got {spacing_m!r}")
    pairs = shared_edges(weld(triangles.reshape(-1, 3)).reshape(-1, 3))
    group = coplanar_groups(triangles, pairs, angle_rad=SAME_PLANE_RAD, gap_m=SAME_PLANE_M)
    normals, areas = face_normals(triangles)
    of_triangle = np.full(len(triangles), -1, np.int32)
    charts: list[Chart] = []
    order = np.argsort(group, kind="stable")
    for rows in np.split(order, np.flatnonzero(np.diff(group[order])) + 1):
        chart = _chart(triangles[rows], normals[rows], areas[rows], surface, spacing_m, region)
        if chart is not None:
            of_triangle[rows] = len(charts)
            charts.append(chart)
    return tuple(charts), of_triangle


def number_charts(charts: Sequence[Chart]) -> tuple[Chart, ...]:
    """Number the points of charts through.

    Parameters
    ----------
    charts : sequence of Chart
        In order.

    Returns
    -------
    charts : tuple of Chart
        With ``first`` set.
    """
    numbered, first = [], 0
    for chart in charts:
        numbered.append(replace(chart, first=first))
        first += len(chart.areas)
    return tuple(numbered)


def _chart(
    T: Floats, normals: Floats, areas: Floats, surface: int, h: float, region: Floats | None
) -> Chart | None:
    """One plane's chart; None where nothing of it is in the region."""
    largest = normals[areas.argmax()]
    turned = normals * np.where(normals @ largest < 0.0, -1.0, 1.0)[:, None]
    n = (turned * areas[:, None]).sum(axis=0)
    n /= np.linalg.norm(n)
    u = _horizontal(n)
    o = T[areas.argmax(), 0]
    flat = np.stack([(T - o) @ u, (T - o) @ np.cross(n, u)], axis=-1)
    polygon = shapely.union_all(shapely.polygons(flat))
    if region is not None:
        polygon = _clip(polygon, o, u, n, region)
    if polygon.area <= LEAST_CELL_M2:
        return None
    angle = _better_turn(polygon, h)
    if angle:
        u = np.cos(angle) * u + np.sin(angle) * np.cross(n, u)
        polygon = shapely.affinity.rotate(polygon, -angle, origin=(0, 0), use_radians=True)
    cell, middle, area = _grid(polygon, h)
    v = np.cross(n, u)
    corner = np.floor(np.array(polygon.bounds[:2]) / h) * h
    return Chart(
        surface=surface,
        origin=o + corner[0] * u + corner[1] * v,
        u=u,
        v=v,
        normal=n,
        spacing=h,
        cell=cell,
        points=o + middle[:, :1] * u + middle[:, 1:] * v,
        # planes are merged to a centimetre: keep the mesh's own area, not its shadow's
        areas=area * (areas.sum() / polygon.area if region is None else 1.0),
    )


def _horizontal(n: Floats) -> Floats:
    """A horizontal unit vector in the plane; along +x where every one is horizontal."""
    side = np.cross([0.0, 0.0, 1.0], n)
    length = float(np.linalg.norm(side))
    if length > 0.1:
        return side / length
    along = np.array([1.0, 0.0, 0.0]) - n[0] * n
    return along / np.linalg.norm(along)


def _clip(polygon: Any, o: Floats, u: Floats, n: Floats, region: Floats) -> Any:
    """Part of a polygon whose points lie within bounds: one half-plane after another."""
    v = np.cross(n, u)
    for axis in range(3):
        for sign, bound in ((1.0, region[1][axis]), (-1.0, -region[0][axis])):
            a, b = sign * u[axis], sign * v[axis]
            c = bound - sign * o[axis]  # keeps a x + b y <= c
            slope = np.hypot(a, b)
            if slope < 1e-9:
                if c < 0.0:
                    return shapely.Polygon()
                continue
            if polygon.is_empty:
                return polygon
            far = 4.0 * (np.abs(polygon.bounds).max() + abs(c) / slope + 1.0)
            d, e = np.array([a, b]) / slope, np.array([-b, a]) / slope
            edge = d * (c / slope)
            half = shapely.Polygon(
                [edge - far * e, edge + far * e, edge + far * e - far * d, edge - far * e - far * d]
            )
            polygon = polygon.intersection(half)
    return polygon


def _better_turn(polygon: Any, h: float) -> float:
    """Angle of the smallest rectangle about the polygon if it saves many cells, else 0."""
    low_u, low_v, high_u, high_v = polygon.bounds
    box = (high_u - low_u) * (high_v - low_v)
    if box < 100.0 * h * h:
        return 0.0
    turned = shapely.minimum_rotated_rectangle(polygon)
    if turned.area > (1.0 - TURN_SAVES) * box:
        return 0.0
    (ax, ay), (bx, by) = turned.exterior.coords[:2]
    return float(np.arctan2(by - ay, bx - ax))


def _grid(polygon: Any, h: float) -> tuple[Ints, Floats, Floats]:
    """Cells of a polygon: point numbers (nu, nv), middles (n, 2) and areas (n,)."""
    low = np.floor(np.array(polygon.bounds[:2]) / h) * h
    shape = np.maximum(1, np.ceil((np.array(polygon.bounds[2:]) - low) / h - 1e-9)).astype(int)
    edge = _edge_cells(polygon, low, h, tuple(shape))
    i, j = np.nonzero(~edge)
    shapely.prepare(polygon)
    inside = shapely.contains_xy(polygon, low[0] + (i + 0.5) * h, low[1] + (j + 0.5) * h)
    whole = np.zeros(tuple(shape), bool)
    whole[i[inside], j[inside]] = True
    area = np.where(whole, h * h, 0.0)
    x = low[0] + (np.arange(shape[0])[:, None] + 0.5) * h + np.zeros(tuple(shape))
    y = low[1] + (np.arange(shape[1])[None, :] + 0.5) * h + np.zeros(tuple(shape))
    i, j = np.nonzero(edge)
    left, bottom = low[0] + i * h, low[1] + j * h
    pieces = shapely.intersection(polygon, shapely.box(left, bottom, left + h, bottom + h))
    area[i, j] = shapely.area(pieces)
    middles = shapely.centroid(pieces)
    held = area[i, j] > LEAST_CELL_M2
    x[i[held], j[held]] = shapely.get_x(middles[held])
    y[i[held], j[held]] = shapely.get_y(middles[held])
    used = area > LEAST_CELL_M2
    cell = np.full(tuple(shape), -1, np.int32)
    cell[used] = np.arange(int(used.sum()), dtype=np.int32)
    return cell, np.stack([x[used], y[used]], axis=1), area[used]


def _edge_cells(polygon: Any, low: Floats, h: float, shape: tuple[int, ...]) -> Bools:
    """Cells that the polygon's edge may cut: those it passes and the ones beside them."""
    line = shapely.segmentize(polygon.boundary, h / 2.0)
    place = shapely.get_coordinates(line)
    index = np.clip(((place - low) / h).astype(int), 0, np.array(shape) - 1)
    touched = np.zeros(shape, bool)
    touched[tuple(index.T)] = True
    return np.asarray(binary_dilation(touched, structure=np.ones((3, 3), bool)))
