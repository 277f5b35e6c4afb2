"""Polygons to triangles, in the order of the polygons.

A convex polygon is cut as a fan from its first corner. A concave one would spill over its own
edge that way, so it is given to VTK's ear clipping.
"""

from __future__ import annotations

import numpy as np

from causticload.scene.model import Floats, Ints

CONVEX_TOLERANCE = 1e-9  # of the squared size: a corner this little turned back is straight


def triangulate(corners: Floats, counts: Ints) -> Ints:
    """Cut polygons into triangles.

    Parameters
    ----------
    corners : (c, 3) float
        Corners of all polygons, one polygon after the other. [m or any unit]
    counts : (q,) int
        Number of corners of each polygon, at least 3; they sum to c.

    Returns
    -------
    triangles : (t, 3) int
        Rows of ``corners``, wound as the polygon, in the order of the polygons.
    """
    first = np.cumsum(counts) - counts
    pieces = [np.zeros((0, 3), dtype=np.int32)]
    owners = [np.zeros(0, dtype=np.int64)]
    for size in np.unique(counts):
        rows = np.flatnonzero(counts == size)
        index = first[rows][:, None] + np.arange(size)
        convex = np.ones(len(rows), dtype=bool) if size == 3 else _is_convex(corners[index])
        fan = np.stack(
            [np.zeros(size - 2, dtype=int), np.arange(1, size - 1), np.arange(2, size)], axis=1
        )
        pieces.append(index[convex][:, fan].reshape(-1, 3))
        owners.append(np.repeat(rows[convex], size - 2))
        if not convex.all():
            cut, owner = _clip_ears(corners[index[~convex]])
            pieces.append(index[~convex][owner[:, None], cut])
            owners.append(rows[~convex][owner])
    order = np.argsort(np.concatenate(owners), kind="stable")
    return np.concatenate(pieces)[order].astype(np.int32)


def _is_convex(polygons: Floats) -> np.ndarray:
    """Say which of the polygons (q, n, 3) never turn back on themselves."""
    edges = np.roll(polygons, -1, axis=1) - polygons
    turn = np.cross(np.roll(edges, 1, axis=1), edges)
    local = polygons - polygons[:, :1]
    normal = np.cross(local, np.roll(local, -1, axis=1)).sum(axis=1)  # Newell: twice the area
    length = np.linalg.norm(normal, axis=1)
    unit = normal / np.where(length > 0.0, length, 1.0)[:, None]
    size2 = (edges**2).sum(axis=(1, 2))
    return (np.einsum("qni,qi->qn", turn, unit) >= -CONVEX_TOLERANCE * size2[:, None]).all(axis=1)


def _clip_ears(polygons: Floats) -> tuple[np.ndarray, np.ndarray]:
    """Cut polygons (q, n, 3) into triangles: corner numbers (t, 3) and polygon numbers (t,)."""
    import pyvista  # heavy to import, and needed for concave faces only

    q, n = polygons.shape[:2]
    local = polygons - polygons[:, :1]  # far from home VTK's tolerances would fail
    faces = np.column_stack([np.full(q, n), np.arange(q * n).reshape(q, n)])
    mesh = pyvista.PolyData(local.reshape(-1, 3), faces.ravel())
    cut = mesh.triangulate().faces.reshape(-1, 4)[:, 1:]
    return cut % n, cut[:, 0] // n
