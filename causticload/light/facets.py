"""The reflecting surface at any of its points: position, normal, and the mirror law.

A facet is one triangle of a reflector. Its shape is flat, its *normal* is not: it runs between
the corner normals, so that a smooth facade made of plane triangles reflects as the smooth facade
does, and leans as the figure of its pane says: a bow of some millimetres turns light, but moves
no place that matters. Everything a kernel must know is in one tuple of arrays, :class:`Facets`.
"""

from __future__ import annotations

import math
from typing import Any, NamedTuple

import numpy as np
from numba import njit

from causticload.light.sheets import Sheets
from causticload.scene.model import Bools, Floats, Ints, Scene


class Facets(NamedTuple):
    """Triangles of the scene as the light kernels read them.

    ``m`` triangles, ``k`` sheets, ``q`` rows of a panel's sheet that is not as the mesh has it.
    """

    corner: Floats  # (m, 3, 3) m, local
    face_normal: Floats  # (m, 3) unit, by winding
    corner_normal: Floats  # (m, 3, 3) unit
    area: Floats  # (m,) m²
    panel: Ints  # (m,) -1 off reflectors
    row: Ints  # (m,) row of the panel's first sheet, -1: the mesh's own normals hold
    turn: Floats  # (m,) 1 if the face has the side of its panel's normal, else -1
    rank: Ints  # (k,) sheet's place after its panel's first row
    frame: Floats  # (q, 3, 3) middle [m, local], width axis, height axis
    half: Floats  # (q, 2) m
    bend: Ints  # (q,) row of shapes, -1: none
    bow: Floats  # (q,) m
    wave: Floats  # (q,) m, half of peak to valley; 0: no wave to follow
    wave_number: Floats  # (q, 2) rad/m
    phase: Floats  # (q,) rad
    tilt: Floats  # (q, 2) slope along width and height
    kink: Floats  # (q,) m
    kink_width: Floats  # (q,) m
    kinked: Floats  # (q, 4, 3) lines: the distance inwards [m]
    shapes: Floats  # (s, n, n) powers of x and y over the half sizes


def make_facets(scene: Scene, sheets: Sheets) -> Facets:
    """Lay the scene's triangles out for the kernels.

    Parameters
    ----------
    scene : Scene
        What stands there.
    sheets : Sheets
        What reflects at each facet.

    Returns
    -------
    facets : Facets
        Contiguous arrays.
    """
    T = np.ascontiguousarray(scene.triangles, dtype=np.float64)
    cross = np.cross(T[:, 1] - T[:, 0], T[:, 2] - T[:, 0])
    twice = np.linalg.norm(cross, axis=1)
    face_normal = np.ascontiguousarray(cross / twice[:, None])
    corner_normal = np.ascontiguousarray(scene.corner_normals, dtype=np.float64)
    # Which side is "up" is the winding's business; a normal that points below it is turned over.
    below = np.einsum("mji,mi->mj", corner_normal, face_normal) < 0.0
    panel = np.ascontiguousarray(scene.panel, dtype=np.int32)
    turn = np.ones(len(T))
    on = panel >= 0
    turn[on] = np.sign(np.einsum("mi,mi->m", face_normal[on], scene.panels.normal[panel[on]]))
    return Facets(
        corner=T,
        face_normal=face_normal,
        corner_normal=np.where(below[:, :, None], -corner_normal, corner_normal),
        area=0.5 * twice,
        panel=panel,
        turn=turn,
        **_figure_rows(scene, sheets, panel),
    )


def _figure_rows(scene: Scene, sheets: Sheets, panel: Ints) -> dict[str, Any]:
    """The rows of panels whose sheets tilt or bend away from the mesh's normals."""
    g, panels = scene.figures, scene.panels
    own = panels.surface
    tilted = np.zeros(len(sheets.rows), bool)
    for i in range(len(tilted)):
        tilted[i] = sheets.tilt[sheets.first[i] : sheets.first[i] + sheets.rows[i]].any()
    needs = tilted[own] if len(own) else np.zeros(0, bool)
    if g is not None:
        needs = needs | (g.first >= 0)
    size = np.where(needs, sheets.rows[own], 0) if len(own) else np.zeros(0, int)
    first = np.where(needs, np.cumsum(size) - size, -1).astype(np.int32)
    p = np.repeat(np.arange(len(own)), size)
    sheet = sheets.first[own[p]] + np.arange(len(p)) - first[p]
    height = np.cross(panels.normal, panels.width_axis)
    middle = panels.centroid if g is None else g.middle
    n = len(p)
    rows: dict[str, Any] = {
        "row": np.where(panel >= 0, first[panel], -1).astype(np.int32)
        if len(first)
        else np.full(len(panel), -1, np.int32),
        "rank": sheets.rank,
        "frame": np.ascontiguousarray(
            np.stack([middle[p], panels.width_axis[p], height[p]], axis=1)
        ),
        "half": np.ones((n, 2)),
        "bend": np.full(n, -1, np.int32),
        "bow": np.zeros(n),
        "wave": np.zeros(n),
        "wave_number": np.zeros((n, 2)),
        "phase": np.zeros(n),
        "tilt": np.ascontiguousarray(sheets.tilt[sheet]).reshape(n, 2),
        "kink": np.zeros(n),
        "kink_width": np.ones(n),
        "kinked": np.tile([0.0, 0.0, np.inf], (n, 4, 1)),
        "shapes": np.zeros((0, 1, 1)) if g is None else g.shapes,
    }
    if g is None:
        return rows
    k = np.flatnonzero(g.first[p] >= 0)
    pane = g.first[p[k]] + np.minimum(sheets.pane[sheet[k]], g.count[p[k]] - 1)
    rows["half"][k], rows["bend"][k], rows["bow"][k] = g.half[p[k]], g.shape[pane], g.bow[pane]
    rows["wave"][k] = np.where(sheets.waves[own[p[k]]], g.wave[pane], 0.0)
    rows["wave_number"][k], rows["phase"][k] = g.wave_number[pane], g.phase[pane]
    rows["tilt"][k] += g.tilt[pane]
    rows["kink"][k], rows["kink_width"][k] = g.kink[pane], g.kink_width[pane]
    rows["kinked"][k] = g.kinked[p[k]]
    return rows


def leaning_panels(F: Facets, scene: Scene, sheets: Sheets) -> Bools:
    """Tell which panels lean away from the mesh's normals where they mirror other mirrors' light.

    Parameters
    ----------
    F : Facets
        The scene's triangles.
    scene : Scene
        What stands there.
    sheets : Sheets
        What reflects at each facet.

    Returns
    -------
    leans : (p,) bool
        Whether any sheet of the panel does.
    """
    leans = np.zeros(len(scene.panels), bool)
    own = scene.panels.surface
    row = np.full(len(leans), -1, np.int64)
    on = F.panel >= 0
    row[F.panel[on]] = F.row[on]
    for p in np.flatnonzero(row >= 0):
        first = row[p] + sheets.rank[sheets.again[own[p]]]
        k = slice(first, first + sheets.again_count[own[p]])
        leans[p] = F.bow[k].any() or F.wave[k].any() or F.tilt[k].any() or F.kink[k].any()
    return leans


@njit(cache=True, nogil=True, error_model="numpy")
def position_at(F, t, u, v, w, out):
    """Point of facet ``t`` at barycentric (u, v, w), into ``out`` (3,)."""
    for i in range(3):
        out[i] = u * F.corner[t, 0, i] + v * F.corner[t, 1, i] + w * F.corner[t, 2, i]


@njit(cache=True, nogil=True, error_model="numpy")
def _bend_slope(c, x, y):
    """Both slopes of a polynomial in x and y: Horner's rule both ways."""
    n = c.shape[0]
    value, by_x, by_y = 0.0, 0.0, 0.0
    for i in range(n - 1, -1, -1):
        inner, inner_y = 0.0, 0.0
        for j in range(n - 1, -1, -1):
            inner_y = inner_y * y + inner
            inner = inner * y + c[i, j]
        by_x = by_x * x + value
        value = value * x + inner
        by_y = by_y * x + inner_y
    return by_x, by_y


@njit(cache=True, nogil=True, error_model="numpy")
def _lean(F, t, k, u, v, w, out):
    """Tilt the unit normal ``out`` of facet ``t`` by the figure of row ``k``."""
    x, y = 0.0, 0.0
    for i in range(3):
        offset = (u * F.corner[t, 0, i] + v * F.corner[t, 1, i] + w * F.corner[t, 2, i]) - F.frame[
            k, 0, i
        ]
        x += offset * F.frame[k, 1, i]
        y += offset * F.frame[k, 2, i]
    by_x, by_y = F.tilt[k, 0], F.tilt[k, 1]
    if F.bend[k] >= 0:
        bx, by = _bend_slope(F.shapes[F.bend[k]], x / F.half[k, 0], y / F.half[k, 1])
        by_x += bx * F.bow[k] / F.half[k, 0]
        by_y += by * F.bow[k] / F.half[k, 1]
    if F.wave[k] != 0.0:
        kx, ky = F.wave_number[k, 0], F.wave_number[k, 1]
        steep = -F.wave[k] * math.sin(kx * x + ky * y + F.phase[k])
        by_x += steep * kx
        by_y += steep * ky
    if F.kink[k] != 0.0:
        for e in range(F.kinked.shape[1]):
            a, b = F.kinked[k, e, 0], F.kinked[k, e, 1]
            left = 1.0 - (a * x + b * y + F.kinked[k, e, 2]) / F.kink_width[k]
            if left > 0.0:
                rise = -2.0 * F.kink[k] / F.kink_width[k] * left
                by_x += rise * a
                by_y += rise * b
    dx, dy = F.turn[t] * by_x, F.turn[t] * by_y
    for i in range(3):
        out[i] -= dx * F.frame[k, 1, i] + dy * F.frame[k, 2, i]
    length = math.sqrt(out[0] * out[0] + out[1] * out[1] + out[2] * out[2])
    for i in range(3):
        out[i] /= length


@njit(cache=True, nogil=True, error_model="numpy")
def mesh_normal_at(F, t, u, v, w, out):
    """Unit normal of facet ``t`` as the mesh has it, into ``out`` (3,)."""
    for i in range(3):
        out[i] = (
            u * F.corner_normal[t, 0, i]
            + v * F.corner_normal[t, 1, i]
            + w * F.corner_normal[t, 2, i]
        )
    length = math.sqrt(out[0] * out[0] + out[1] * out[1] + out[2] * out[2])
    for i in range(3):
        out[i] /= length


@njit(cache=True, nogil=True, error_model="numpy")
def lean_by_figure(F, t, sheet, u, v, w, out):
    """Tilt the mesh's normal ``out`` by the figure of a sheet of facet ``t``, if it has one."""
    if F.row[t] >= 0:
        _lean(F, t, F.row[t] + F.rank[sheet], u, v, w, out)


@njit(cache=True, nogil=True, error_model="numpy")
def normal_at(F, t, sheet, u, v, w, out):
    """Unit normal of a sheet of facet ``t`` at barycentric (u, v, w), into ``out`` (3,)."""
    mesh_normal_at(F, t, u, v, w, out)
    lean_by_figure(F, t, sheet, u, v, w, out)


@njit(cache=True, nogil=True, error_model="numpy")
def reflect(d, n, out):
    """Direction of travel ``d`` mirrored at a surface of normal ``n``: d - 2 (d.n) n."""
    twice = 2.0 * (d[0] * n[0] + d[1] * n[1] + d[2] * n[2])
    for i in range(3):
        out[i] = d[i] - twice * n[i]
