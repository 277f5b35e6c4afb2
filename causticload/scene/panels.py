"""Panes and sheets: which triangles of the reflectors belong to one panel."""

from __future__ import annotations

import numpy as np

from causticload.errors import InputError
from causticload.scene.model import Bools, Floats, Ints, Panels
from causticload.scene.topology import (
    EdgePairs,
    Indices,
    components,
    coordinate_step,
    coplanar_groups,
    face_normals,
    folds,
    in_order,
    require_triangles,
    shared_edges,
    weld,
)

PLANE_ANGLE_RAD = 0.5e-3  # two faces of one flat pane differ by less
_PLANE_STEPS = 1.5  # coordinate steps that a flat pane's corner may lie off its plane
_PLANE_GAP_M = 2e-3  # but never more than this
QUAD_FOLD_RAD = np.radians(10.0)  # the halves of one curved pane fold by less
_SQUARE_RAD = np.radians((61.0, 119.0))  # corner angles of an upright pane
_LONGER = 1.001  # a diagonal is longer than the sides by more than rounding
_LEVEL = 1e-3  # a pane tilted from level by less (as a sine) has no horizontal of its own
_SAME_NORMAL = 1e-9  # corner normals of a flat pane differ by less


def find_panels(
    triangles: Floats, surface: Ints, smooth: Bools, corner_normals: Floats | None = None
) -> tuple[Ints, Panels]:
    """Gather triangles into panels.

    On a *flat* surface the connected faces of one plane are a panel: normals within 0.5 mrad, or
    free corners within 0.1 mm of the plane (1.5 steps of the last stored digit, at most 2 mm, if
    the coordinates are rounded more coarsely). The six faces of a thin box are six panels;
    two sheets back to back are two panels.

    On a *smooth* surface a panel is a quadrilateral that was cut along its diagonal, else a single
    triangle. Two neighbours form one if they fold by less than 10 degrees into a convex
    quadrilateral, and either

    1. the shared edge is clearly the longest of both, and all four corner angles lie between 61
       and 119 degrees; or
    2. they stand one after the other in the file, and neither found a partner by rule 1. In an
       unbroken run of such triangles the first goes with the second, the third with the fourth.

    Parameters
    ----------
    triangles : (k, 3, 3) float
        Corners of the reflectors' triangles. [m]
    surface : (k,) int
        Number of the surface. No panel reaches across surfaces.
    smooth : (k,) bool
        Form of the surface: True for smooth, False for flat.
    corner_normals : (k, 3, 3) float, optional
        Unit normals at the corners, to tell which smooth panels are flat all the same.

    Returns
    -------
    panel : (k,) int32
        Panel of each triangle, 0, 1, 2 ... in the order of the file.
    panels : Panels
        One row for each panel. Normals follow the winding of the panel's largest triangle.

    Raises
    ------
    InputError
        Arrays do not fit together, or a coordinate is not finite.
    """
    require_triangles(triangles)
    k = len(triangles)
    if surface.shape != (k,) or smooth.shape != (k,):
        raise InputError(
            f"surface and smooth must have shape ({k},), got {surface.shape} and {smooth.shape}"
        )
    vertex = weld(triangles.reshape(-1, 3)).reshape(-1, 3)
    pairs = shared_edges(vertex)
    a, b = pairs.face.T
    pairs = pairs.pick((surface[a] == surface[b]) & (smooth[a] == smooth[b]))
    pairs = pairs.pick(~(pairs.opposed & _crowded(vertex, pairs)))
    is_smooth = smooth[pairs.face[:, 0]]

    step = coordinate_step(triangles.reshape(-1, 3))
    flat_pane = coplanar_groups(
        triangles,
        pairs.pick(~is_smooth),
        angle_rad=PLANE_ANGLE_RAD,
        gap_m=np.inf,
        sliver_gap_m=min(max(1e-4, _PLANE_STEPS * step), _PLANE_GAP_M),
    )
    curved_pane = components(k, _quads(triangles, pairs.pick(is_smooth)))
    panel = in_order(np.where(smooth, k + curved_pane, flat_pane))
    return panel.astype(np.int32), _measure(triangles, surface, smooth, corner_normals, panel)


def _crowded(vertex: Indices, pairs: EdgePairs) -> Bools:
    """Pairs (e,) whose edge has three faces or more.

    There a face wound the other way may belong to a second sheet on the back of the first.
    """
    face, edge = pairs.face[:, 0], pairs.edge[:, 0]
    ends = np.sort(np.stack([vertex[face, edge], vertex[face, (edge + 1) % 3]], axis=1), axis=1)
    _, number, count = np.unique(ends, axis=0, return_inverse=True, return_counts=True)
    return count[number.ravel()] > 1


def _quads(triangles: Floats, pairs: EdgePairs) -> Indices:
    """Pairs of faces (q, 2) that are the halves of one quadrilateral; no face twice."""
    if len(pairs) == 0:
        return pairs.face
    normals, _ = face_normals(triangles)
    corners = _corner_angles(triangles)
    length = np.linalg.norm(np.roll(triangles, -1, axis=1) - triangles, axis=2)
    fa, fb = pairs.face.T
    # corner angles of the quadrilateral: two whole ones, two sums at the ends of the diagonal
    b_start = np.where(pairs.opposed, pairs.corner(1, 0), pairs.corner(1, 1))
    b_end = np.where(pairs.opposed, pairs.corner(1, 1), pairs.corner(1, 0))
    angle = np.stack(
        [
            corners[fa, pairs.corner(0, 2)],
            corners[fb, pairs.corner(1, 2)],
            corners[fa, pairs.corner(0, 0)] + corners[fb, b_start],
            corners[fa, pairs.corner(0, 1)] + corners[fb, b_end],
        ],
        axis=1,
    )
    convex = (folds(normals, pairs) < QUAD_FOLD_RAD) & (angle < np.pi - 1e-6).all(axis=1)

    shared = length[fa, pairs.edge[:, 0]]
    sides = [length[f, (pairs.edge[:, s] + t) % 3] for s, f in ((0, fa), (1, fb)) for t in (1, 2)]
    longest = shared > _LONGER * np.max(sides, axis=0)
    square = ((angle > _SQUARE_RAD[0]) & (angle < _SQUARE_RAD[1])).all(axis=1)
    # a face has one longest edge, but an edge of three faces can offer it two partners
    first = convex & longest & square
    first[first] = _first_use(pairs.face[first], len(triangles))

    free = np.ones(len(triangles), bool)
    free[pairs.face[first]] = False
    follow = convex & (fb == fa + 1) & free[fa] & free[fb]
    starts = np.unique(fa[follow])
    run = np.cumsum(np.diff(starts, prepend=-2) != 1)
    place = np.arange(len(starts)) - np.searchsorted(run, run)
    second = np.stack([starts, starts + 1], axis=1)[place % 2 == 0]
    return np.concatenate([pairs.face[first], second])


def _first_use(faces: Indices, k: int) -> Bools:
    """Which rows use no face that an earlier row used. (q,)"""
    row = np.arange(len(faces))
    earliest = np.full(k, len(faces))
    np.minimum.at(earliest, faces.ravel(), np.repeat(row, 2))
    return (earliest[faces] == row[:, None]).all(axis=1)


def _corner_angles(triangles: Floats) -> Floats:
    """Inner angles. (k, 3) rad"""
    ahead = np.roll(triangles, -1, axis=1) - triangles
    back = np.roll(triangles, 1, axis=1) - triangles
    across = np.linalg.norm(np.cross(ahead, back), axis=2)
    return np.arctan2(across, np.einsum("kci,kci->kc", ahead, back))


def _measure(
    triangles: Floats,
    surface: Ints,
    smooth: Bools,
    corner_normals: Floats | None,
    panel: Indices,
) -> Panels:
    """Area, middle, axes and size of each panel."""
    count = int(panel.max(initial=-1)) + 1
    normals, areas = face_normals(triangles)
    largest = np.zeros(count, np.int64)
    order = np.argsort(areas, kind="stable")
    largest[panel[order]] = order  # the last written is the largest
    turn = np.where(np.einsum("ki,ki->k", normals, normals[largest][panel]) < 0.0, -1.0, 1.0)

    def total(values: Floats) -> Floats:
        return np.stack([np.bincount(panel, v, minlength=count) for v in values.T], axis=1)

    area = np.bincount(panel, areas, minlength=count)
    weight = np.maximum(area, 1e-300)[:, None]
    centroid = total(triangles.mean(axis=1) * areas[:, None]) / weight
    normal = total(normals * (turn * areas)[:, None])
    normal /= np.maximum(np.linalg.norm(normal, axis=1), 1e-300)[:, None]

    flat = np.ones(count, bool)
    flat[panel[smooth]] = False
    if corner_normals is not None:
        sided = corner_normals * turn[:, None, None]
        spread = np.abs(sided - sided[largest, 0][panel][:, None]).max(axis=(1, 2))
        equal = np.bincount(panel, spread > _SAME_NORMAL, minlength=count) == 0
        flat |= equal

    width = _width_axis(triangles, panel, normal)
    axes = np.stack([width, np.cross(normal, width)], axis=1)
    along = np.einsum("kci,kai->kca", triangles - centroid[panel][:, None], axes[panel])
    low, high = np.full((count, 2), np.inf), np.full((count, 2), -np.inf)
    np.minimum.at(low, panel, along.min(axis=1))
    np.maximum.at(high, panel, along.max(axis=1))
    return Panels(
        surface=surface[largest].astype(np.int32),
        area=np.asarray(area, float),
        centroid=centroid,
        normal=normal,
        flat=flat,
        width_axis=width,
        size=high - low,
    )


def _width_axis(triangles: Floats, panel: Indices, normal: Floats) -> Floats:
    """Horizontal axis in each panel's plane; on a level panel, along its longest side. (p, 3)"""
    axis = np.cross((0.0, 0.0, 1.0), normal)
    for p in np.flatnonzero(np.hypot(normal[:, 0], normal[:, 1]) < _LEVEL):
        axis[p] = _longest_side(triangles[panel == p])
        axis[p] -= (axis[p] @ normal[p]) * normal[p]
    return axis / np.maximum(np.linalg.norm(axis, axis=1), 1e-300)[:, None]


def _longest_side(triangles: Floats) -> Floats:
    """Longest edge of one triangle only, not of a diagonal between two. (3,)"""
    vertex = weld(triangles.reshape(-1, 3)).reshape(-1, 3)
    ends = np.sort(np.stack([vertex, np.roll(vertex, -1, axis=1)], axis=2).reshape(-1, 2), axis=1)
    _, number, count = np.unique(ends, axis=0, return_inverse=True, return_counts=True)
    edges = (np.roll(triangles, -1, axis=1) - triangles).reshape(-1, 3)
    length = np.linalg.norm(edges, axis=1)
    length[count[number.ravel()] > 1] = -1.0
    return np.asarray(edges[np.argmax(length)])
