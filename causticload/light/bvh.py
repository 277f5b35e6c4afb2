"""What a ray meets: one small interface, and the three tracers behind it.

Embree is used where its binding is installed, else the package's own hierarchy; trimesh's R-tree
is the slow, independent third that tests hold the others against. All give the number of the
triangle that is met first and the distance to it, and say whether anything stands within a
distance. Hits nearer than ``NEAREST_M`` do not count; callers raise origins off the surfaces
that rays leave.
"""

from __future__ import annotations

from importlib.metadata import version
from typing import Any, Literal, Protocol

import numpy as np
from numba import njit

from causticload.errors import InputError
from causticload.light.bvh_build import build_hierarchy
from causticload.light.bvh_trace import first_hits, occlusions
from causticload.scene.model import Bools, Floats, Ints

NEAREST_M = 1e-6
Engine = Literal["auto", "embree", "own", "rtree"]


class Tracer(Protocol):
    """Finds what rays meet. Directions are unit vectors; distances are in metres."""

    name: str  # printed in every result

    def first_hit(self, origins: Floats, directions: Floats) -> tuple[Ints, Floats]:
        """Return the triangle met first, -1 for none, and its distance, inf for none."""

    def occluded(
        self, origins: Floats, directions: Floats, *, limit: Floats | None = None
    ) -> Bools:
        """Tell whether anything stands within the limit, or anywhere without one."""


def build_tracer(triangles: Floats, *, engine: Engine = "auto") -> Tracer:
    """Make a scene ready for rays.

    Parameters
    ----------
    triangles : (m, 3, 3) float
        Corners, near the origin. [m]
    engine : {"auto", "embree", "own", "rtree"}
        ``auto`` takes Embree where it is installed.

    Returns
    -------
    tracer : Tracer
        Ready for any number of threads.

    Raises
    ------
    InputError
        If the shape is wrong, a coordinate is not finite, the engine is not known, or Embree is
        asked for and is not installed.
    """
    T = np.ascontiguousarray(triangles, dtype=np.float64)
    if T.ndim != 3 or T.shape[1:] != (3, 3):
        raise InputError(f"triangles must be (m, 3, 3), got {T.shape}")
    if not np.isfinite(T).all():
        raise InputError("triangles must be finite")
    if engine == "auto":
        return EmbreeTracer(T) if _has_embree() and len(T) else OwnTracer(T)
    if engine == "embree":
        if not _has_embree():
            raise InputError(
                "Embree's binding is not installed",
                where="engine",
                hint="Install embreex where it has a wheel, or use engine='own'.",
            )
        return EmbreeTracer(T) if len(T) else OwnTracer(T)
    if engine == "own":
        return OwnTracer(T)
    if engine == "rtree":
        return RtreeTracer(T)
    raise InputError(f"engine must be auto, embree, own or rtree, got {engine!r}", where="engine")


def _has_embree() -> bool:
    try:
        import embreex.rtcore_scene  # noqa: F401 - the import is the test
    except ImportError:
        return False
    return True


@njit(cache=True, nogil=True, error_model="numpy")
def _distances(corner, normal, triangle, O, D, t):
    """Distance along each ray to the plane of the triangle it met, in double precision."""
    for k in range(triangle.size):
        m = triangle[k]
        if m < 0:
            t[k] = np.inf
            continue
        up = down = 0.0
        for i in range(3):
            up += (corner[m, 0, i] - O[k, i]) * normal[m, i]
            down += D[k, i] * normal[m, i]
        t[k] = up / down


class EmbreeTracer:
    """Embree, through embreex. It works in single precision; distances are made exact after.

    Parameters
    ----------
    triangles : (m, 3, 3) float
        Corners, m > 0. [m]
    """

    def __init__(self, triangles: Floats) -> None:
        from embreex.mesh_construction import TriangleMesh
        from embreex.rtcore_scene import EmbreeScene

        self.name = f"Embree through embreex {version('embreex')}"
        self._scene = EmbreeScene()
        TriangleMesh(self._scene, triangles.astype(np.float32))
        self._corner = triangles
        self._normal = np.cross(
            triangles[:, 1] - triangles[:, 0], triangles[:, 2] - triangles[:, 0]
        )
        if not self._scene.is_committed:  # the first query commits; do it before threads do
            nothing = np.zeros((1, 3), np.float32)
            self._scene.run(nothing, nothing + np.float32(1.0), query="OCCLUDED")

    def first_hit(self, origins: Floats, directions: Floats) -> tuple[Ints, Floats]:
        """Return the triangle met first, -1 for none, and its distance, inf for none."""
        distance = np.empty(len(origins))
        if not len(origins):
            return np.zeros(0, np.int32), distance
        o, d = _single(origins), _single(directions)
        triangle = np.asarray(self._scene.run(o, d, query="INTERSECT"), dtype=np.int32)
        _distances(
            self._corner,
            self._normal,
            triangle,
            np.ascontiguousarray(origins, dtype=float),
            np.ascontiguousarray(directions, dtype=float),
            distance,
        )
        return triangle, distance

    def occluded(
        self, origins: Floats, directions: Floats, *, limit: Floats | None = None
    ) -> Bools:
        """Tell whether anything stands within the limit, or anywhere without one."""
        if not len(origins):
            return np.zeros(0, bool)
        more: dict[str, Any] = {} if limit is None else {"dists": _single(limit)}
        met = self._scene.run(_single(origins), _single(directions), query="OCCLUDED", **more)
        return np.asarray(met) >= 0


def _single(values: Floats) -> Any:
    return np.ascontiguousarray(values, dtype=np.float32)


class OwnTracer:
    """The package's own bounding volume hierarchy.

    Parameters
    ----------
    triangles : (m, 3, 3) float
        Corners. [m]
    """

    name = "own bounding volume hierarchy (binned surface-area heuristic)"

    def __init__(self, triangles: Floats) -> None:
        self._tree = build_hierarchy(triangles) if len(triangles) else None

    def first_hit(self, origins: Floats, directions: Floats) -> tuple[Ints, Floats]:
        """Return the triangle met first, -1 for none, and its distance, inf for none."""
        n = len(origins)
        triangle, distance = np.full(n, -1, np.int32), np.full(n, np.inf)
        if self._tree is not None:
            first_hits(self._tree, *_double(origins, directions), NEAREST_M, triangle, distance)
        return triangle, distance

    def occluded(
        self, origins: Floats, directions: Floats, *, limit: Floats | None = None
    ) -> Bools:
        """Tell whether anything stands within the limit, or anywhere without one."""
        n = len(origins)
        within = np.full(n, np.inf) if limit is None else np.ascontiguousarray(limit, dtype=float)
        met = np.zeros(n, np.bool_)
        if self._tree is not None:
            occlusions(self._tree, *_double(origins, directions), NEAREST_M, within, met)
        return met


def _double(origins: Floats, directions: Floats) -> tuple[Floats, Floats]:
    return (
        np.ascontiguousarray(origins, dtype=np.float64),
        np.ascontiguousarray(directions, dtype=np.float64),
    )


class RtreeTracer:
    """trimesh's tracer over an R-tree: slow, and written by others. For checks.

    Parameters
    ----------
    triangles : (m, 3, 3) float
        Corners. [m]
    """

    name = "trimesh's R-tree tracer"

    def __init__(self, triangles: Floats) -> None:
        import trimesh
        from trimesh.ray.ray_triangle import RayMeshIntersector

        faces = np.arange(3 * len(triangles)).reshape(-1, 3)
        mesh = trimesh.Trimesh(triangles.reshape(-1, 3), faces, process=False)
        self._rays = RayMeshIntersector(mesh)

    def first_hit(self, origins: Floats, directions: Floats) -> tuple[Ints, Floats]:
        """Return the triangle met first, -1 for none, and its distance, inf for none."""
        n = len(origins)
        triangle, distance = np.full(n, -1, np.int32), np.full(n, np.inf)
        place, ray, met = self._rays.intersects_location(origins, directions, multiple_hits=True)
        away = np.linalg.norm(place - origins[ray], axis=1)
        order = np.argsort(-away)  # the nearest is written last
        order = order[away[order] > NEAREST_M]
        triangle[ray[order]], distance[ray[order]] = met[order], away[order]
        return triangle, distance

    def occluded(
        self, origins: Floats, directions: Floats, *, limit: Floats | None = None
    ) -> Bools:
        """Tell whether anything stands within the limit, or anywhere without one."""
        _, distance = self.first_hit(origins, directions)
        return distance < (np.inf if limit is None else limit)
