"""The reflecting surface at any of its points: position, normal, and the mirror law.

A facet is one triangle of a reflector. Its shape is flat, its *normal* is not: it runs between
the corner normals, so that a smooth facade made of plane triangles reflects as the smooth facade
does. Everything a kernel must know is in one tuple of arrays, :class:`Facets`.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numba import njit

from causticload.scene.model import Floats, Ints, Scene


class Facets(NamedTuple):
    """Triangles of the scene as the light kernels read them. ``m`` triangles, ``k`` sheets."""

    corner: Floats  # (m, 3, 3) m, local
    face_normal: Floats  # (m, 3) unit, by winding
    corner_normal: Floats  # (m, 3, 3) unit
    area: Floats  # (m,) m²
    panel: Ints  # (m,) -1 off reflectors


def make_facets(scene: Scene) -> Facets:
    """Lay the scene's triangles out for the kernels.

    Parameters
    ----------
    scene : Scene
        What stands there.

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
    return Facets(
        corner=T,
        face_normal=face_normal,
        corner_normal=np.where(below[:, :, None], -corner_normal, corner_normal),
        area=0.5 * twice,
        panel=np.ascontiguousarray(scene.panel, dtype=np.int32),
    )


@njit(cache=True, nogil=True, error_model="numpy")
def position_at(F, t, u, v, w, out):
    """Point of facet ``t`` at barycentric (u, v, w), into ``out`` (3,)."""
    for i in range(3):
        out[i] = u * F.corner[t, 0, i] + v * F.corner[t, 1, i] + w * F.corner[t, 2, i]


@njit(cache=True, nogil=True, error_model="numpy")
def normal_at(F, t, u, v, w, out):
    """Unit normal of facet ``t`` at barycentric (u, v, w), into ``out`` (3,)."""
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
def reflect(d, n, out):
    """Direction of travel ``d`` mirrored at a surface of normal ``n``: d - 2 (d.n) n."""
    twice = 2.0 * (d[0] * n[0] + d[1] * n[1] + d[2] * n[2])
    for i in range(3):
        out[i] = d[i] - twice * n[i]
