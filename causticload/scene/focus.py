"""Where a facade focuses: per pane by its figure, and over the facade for one position of the sun.

Coddington's equations in their general form: a plane wave that meets a mirror of curvature
tensor k at incidence theta gathers at distance D where det(I - 2 D M) = 0,
M = [[k_tt / cos theta, k_ts], [k_ts, k_ss cos theta]], t in the plane of incidence. Without twist
these are f_t = R cos(theta) / 2 and f_s = R / (2 cos(theta)).
"""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np

from causticload.scene.figure_slopes import curvature_at_top
from causticload.scene.model import Floats, Scene

FAR_M = 1e5  # a focus beyond this is none


class Focus(NamedTuple):
    """Focal distances of the reflectors' triangles under one sun. ``k`` triangles."""

    tangential: Floats  # (k,) m along the reflected ray; negative: virtual; nan: none or in shade
    sagittal: Floats  # (k,) m, likewise
    direction: Floats  # (k, 3) unit, of the reflected ray; nan where turned away
    matrix: Floats  # (k, 2, 2) M [1/m]


def focal_distances(scene: Scene, sun_direction: Floats) -> Focus:
    """Find the two focal distances of every reflecting triangle.

    Mesh curvature and, where panes have a figure, that of the outermost pane where it bows most.
    Roller waves, kinks and tilts are left out. Shadows are not looked at.

    Parameters
    ----------
    scene : Scene
        What stands there.
    sun_direction : (3,) float
        Unit vector to the sun, scene frame.

    Returns
    -------
    focus : Focus
        In the order of ``scene.reflectors``.
    """
    rows = scene.reflectors
    s = np.asarray(sun_direction, dtype=np.float64)
    normal = scene.corner_normals[rows].mean(axis=1)
    normal /= np.linalg.norm(normal, axis=1, keepdims=True)
    K = _curvature_tensors(scene)
    cos = normal @ s
    side = np.sign(cos)
    # From behind a hollow surface is a round one.
    K = K * side[:, None, None]
    cos = np.abs(cos)
    t = s - (normal @ s)[:, None] * normal
    length = np.linalg.norm(t, axis=1, keepdims=True)
    # At right incidence any axis is in the plane of incidence: take the one across the eye.
    other = np.cross(normal, np.where(np.abs(normal[:, 2:]) < 0.9, [0.0, 0.0, 1.0], [1.0, 0, 0]))
    t = np.where(length > 1e-6, t / np.maximum(length, 1e-12), other)
    t /= np.linalg.norm(t, axis=1, keepdims=True)
    u = np.cross(normal, t)
    tt, ts, ss = (np.einsum("ki,kij,kj->k", a, K, b) for a, b in ((t, t), (t, u), (u, u)))
    with np.errstate(divide="ignore", invalid="ignore"):
        M = np.stack([np.stack([tt / cos, ts], 1), np.stack([ts, ss * cos], 1)], axis=1)
        M[~(cos > 1e-6)] = 0.0
        value, vector = np.linalg.eigh(M)
        f = 1.0 / (2.0 * value)
    f[~(np.abs(f) <= FAR_M)] = np.nan
    first = np.abs(vector[:, 0, 0]) > np.abs(vector[:, 0, 1])
    direction = 2.0 * (normal @ s)[:, None] * normal - s
    return Focus(np.where(first, f[:, 0], f[:, 1]), np.where(first, f[:, 1], f[:, 0]), direction, M)


def _curvature_tensors(scene: Scene) -> Floats:
    """Curvature of each reflecting triangle as a form on space, (k, 3, 3); hollow is positive."""
    rows = scene.reflectors
    T, N = scene.triangles[rows], scene.corner_normals[rows]
    e = np.stack([T[:, 1] - T[:, 0], T[:, 2] - T[:, 0]], axis=2)
    dn = np.stack([N[:, 1] - N[:, 0], N[:, 2] - N[:, 0]], axis=2)
    K = -dn @ np.linalg.pinv(e)
    K = 0.5 * (K + K.transpose(0, 2, 1))
    g, panel = scene.figures, scene.panel[rows]
    if g is None:
        return np.asarray(K)
    on = np.flatnonzero(g.first[panel] >= 0)
    p = panel[on]
    xx, xy, yy = curvature_at_top(g)[g.first[p]].T
    w, h = scene.panels.width_axis[p], g.height_axis[p]
    outer = np.einsum
    bend = (
        xx[:, None, None] * outer("ki,kj->kij", w, w)
        + xy[:, None, None] * (outer("ki,kj->kij", w, h) + outer("ki,kj->kij", h, w))
        + yy[:, None, None] * outer("ki,kj->kij", h, h)
    )
    # Heights run along the panel's normal; a face may be wound the other way.
    turn = np.sign(np.einsum("ki,ki->k", N[on].mean(axis=1), scene.panels.normal[p]))
    K[on] += turn[:, None, None] * bend
    return np.asarray(K)


def figure_focus(scene: Scene) -> list[dict[str, Any]]:
    """Focal lengths at right incidence that figures give to their panes.

    Parameters
    ----------
    scene : Scene
        What stands there.

    Returns
    -------
    rows : list of dict
        One for each surface and pane with a figure: name, figure, pane (1 = outermost), panels,
        least and largest bow [mm], and the shortest, middle and longest of the shorter and of the
        longer focal length [m], positive where the pane focuses, None where it does not bend; the
        focal length of the roller wave's hollows [m].
    """
    g = scene.figures
    if g is None:
        return []
    bend = curvature_at_top(g)
    matrix = np.stack([bend[:, [0, 1]], bend[:, [1, 2]]], axis=1)
    value = np.linalg.eigvalsh(matrix)
    order = np.argsort(-np.abs(value), axis=1)
    value = np.take_along_axis(value, order, axis=1)
    pane = np.arange(len(g.panel)) - g.first[g.panel]
    wave = g.wave * (g.wave_number**2).sum(axis=1)
    surface = scene.panels.surface[g.panel]
    rows = []
    for i in np.unique(surface):
        for k in np.unique(pane[surface == i]):
            mine = (surface == i) & (pane == k)
            rows.append(
                {
                    "surface": scene.surfaces[i].name,
                    "figure": scene.surfaces[i].figure,
                    "pane": int(k) + 1,
                    "panels": int(mine.sum()),
                    "bow_mm": [1e3 * float(g.bow[mine].min()), 1e3 * float(g.bow[mine].max())],
                    "short_focal_m": _focal_range(value[mine, 0]),
                    "long_focal_m": _focal_range(value[mine, 1]),
                    "wave_focal_m": _focal_range(wave[mine]),
                }
            )
    return rows


def _focal_range(curvature: Floats) -> list[float] | None:
    """Shortest, middle and longest focal length; None where hardly anything bends."""
    bent = curvature[np.abs(curvature) > 1.0 / (2.0 * FAR_M)]
    if not len(bent):
        return None
    f = 1.0 / (2.0 * bent)
    f = f[np.argsort(np.abs(f))]
    return [float(f[0]), float(f[len(f) // 2]), float(f[-1])]
