"""What is wrong with a mesh: found, counted, said, and removed where it would falsify the light."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree

from causticload.scene.model import Bools, Fault, Floats, Ints, Surface
from causticload.scene.read import METRES
from causticload.scene.topology import components, face_normals, folds, shared_edges, weld

MIN_HEIGHT_M = 1e-6  # a thinner triangle has no area worth a ray, and no normal
SAME_POINT_M = 1e-4  # coincident faces: corners within 0.1 mm
NEAR_POINT_M = 1e-3  # sheets that nearly coincide: corners within 1 mm
NEAR_HEIGHT_M = 1e-2  # smaller faces may lie within 1 mm of each other by right
SMALL_MODEL_M = 2.0
LARGE_MODEL_M = 20e3
FAR_M = 100e3
FOLD_ANGLE = 1e-3  # rad: faces on the same side of an edge this close together cover each other
USUAL_MODEL_M = (10.0, 2000.0)  # extent of a building with its surroundings
ORDERS = np.array([[0, 1, 2], [1, 2, 0], [2, 0, 1], [0, 2, 1], [2, 1, 0], [1, 0, 2]])


@dataclass(frozen=True, kw_only=True)
class Cleaned:
    """Which triangles to keep, and what was wrong with the others."""

    keep: Bools  # (m,)
    faults: tuple[Fault, ...]


def clean(triangles: Floats, *, surface: Ints, surfaces: Sequence[Surface]) -> Cleaned:
    """Find triangles that light must not meet: not finite, without area, or there twice.

    Parameters
    ----------
    triangles : (m, 3, 3) float
        All triangles of the scene. [m]
    surface : (m,) int
        Number of the surface of each.
    surfaces : sequence of Surface
        Surfaces, for names and roles.

    Returns
    -------
    cleaned : Cleaned
        Of coincident triangles the one on a reflector is kept, else the one on a receiver, else
        the first.
    """
    finite = np.isfinite(triangles).all(axis=(1, 2))
    height = np.zeros(len(triangles))
    height[finite] = _heights(triangles[finite])
    flawed = finite & (height < MIN_HEIGHT_M)
    good = np.flatnonzero(finite & ~flawed)

    rank = np.array([_rank(s) for s in surfaces], dtype=np.int64)
    order = good[np.argsort(rank[surface[good]], kind="stable")]
    copies, near = _coincident(triangles[order], height[order])
    doubled = order[copies]
    keep = finite & ~flawed
    keep[doubled] = False

    count = _Counter(surface=surface, surfaces=surfaces)
    faults = [
        count(
            "not_finite",
            np.flatnonzero(~finite),
            "triangles have corners that are not numbers (nan or infinite); they are left out",
            "Repair the mesh and export it again.",
        ),
        count(
            "zero_area",
            np.flatnonzero(flawed),
            "triangles have no area; they are left out",
            "Nothing to do unless a surface shows a hole.",
        ),
        count(
            "duplicate",
            doubled,
            "triangles coincide with another within 0.1 mm and would reflect the light twice; "
            "one of each is kept, on a reflector if there is one",
            "Delete the copies. To reflect and receive, a surface needs both roles.",
        ),
        count(
            "near_duplicate",
            order[near],
            "triangles lie within 1 mm of another of the same shape; both are kept",
            "If they are one sheet modelled twice, delete one.",
        ),
    ]
    return Cleaned(keep=keep, faults=tuple(fault for fault in faults if fault))


def _heights(triangles: Floats) -> Floats:
    """Smallest height of each triangle (k, 3, 3). [m]"""
    edges = np.roll(triangles, -1, axis=1) - triangles
    longest = np.sqrt((edges**2).sum(axis=2)).max(axis=1)
    area2 = np.linalg.norm(np.cross(edges[:, 0], edges[:, 1]), axis=1)
    return np.divide(area2, longest, out=np.zeros_like(area2), where=longest > 0.0)


def _rank(surface: Surface) -> int:
    """Order in which a surface keeps its face where faces coincide."""
    if "reflector" in surface.roles:
        return 0
    return 1 if "receiver" in surface.roles else 2


def _coincident(triangles: Floats, height: Floats) -> tuple[Ints, Ints]:
    """Rows that repeat an earlier row, and rows that nearly do."""
    centroid = triangles.mean(axis=1)
    pairs = cKDTree(centroid).query_pairs(NEAR_POINT_M, output_type="ndarray")
    first, second = triangles[pairs[:, 0]], triangles[pairs[:, 1]]
    apart = np.full(len(pairs), np.inf)  # largest distance of corners, in the best order
    for corners in ORDERS:
        distance = np.linalg.norm(first - second[:, corners], axis=2).max(axis=1)
        np.minimum(apart, distance, out=apart)
    same = apart <= SAME_POINT_M
    cluster = components(len(triangles), pairs[same])
    _, kept = np.unique(cluster, return_index=True)  # the first row of each cluster
    repeats = np.setdiff1d(np.arange(len(triangles)), kept)

    close = ~same & (apart <= NEAR_POINT_M) & (height[pairs].min(axis=1) > NEAR_HEIGHT_M)
    close &= ~np.isin(pairs, repeats).any(axis=1)
    return repeats.astype(np.int32), np.unique(pairs[close].max(axis=1)).astype(np.int32)


@dataclass(frozen=True)
class _Counter:
    """Puts what is wrong with some triangles into one fault."""

    surface: Ints
    surfaces: Sequence[Surface]

    def __call__(self, kind: str, rows: NDArray[np.integer], text: str, hint: str) -> Fault | None:
        if not len(rows):
            return None
        numbers, counts = np.unique(self.surface[rows], return_counts=True)
        worst = numbers[np.argsort(-counts, kind="stable")]
        names = ", ".join(self.surfaces[i].name for i in worst[:3])
        more = f" and {len(worst) - 3} more surfaces" if len(worst) > 3 else ""
        return Fault(
            kind=kind,
            count=len(rows),
            surface=self.surfaces[worst[0]].name,
            message=f"{len(rows)} {text} ({names}{more}).",
            hint=hint,
        )


def check_sheets(triangles: Floats, *, surface: Ints, surfaces: Sequence[Surface]) -> list[Fault]:
    """Find reflectors with faces that are wound both ways, or that lie on each other.

    Parameters
    ----------
    triangles : (k, 3, 3) float
        Triangles of reflectors. [m]
    surface : (k,) int
        Number of the surface of each.
    surfaces : sequence of Surface
        Surfaces, for names.

    Returns
    -------
    faults : list of Fault
        At most one of kind ``winding`` and one of kind ``overlap``. They count edges. Faces that
        overlap without sharing an edge are not found.
    """
    if not len(triangles):
        return []
    count = _Counter(surface=surface, surfaces=surfaces)
    pairs = shared_edges(weld(triangles.reshape(-1, 3), SAME_POINT_M).reshape(-1, 3))
    normals, _ = face_normals(triangles)
    one, other = pairs.face.T
    covers = folds(normals, pairs) > np.pi - FOLD_ANGLE
    # where three faces and more meet, no winding is the right one
    half_edge = 3 * pairs.face + pairs.edge
    alone = (np.bincount(half_edge.ravel())[half_edge] == 1).all(axis=1)
    turned = one[pairs.opposed & alone & ~covers & (surface[one] == surface[other])]
    folded = one[covers]
    faults = (
        count(
            "winding",
            turned,
            "edges of reflectors join faces of opposite winding: one shows its front, one its back",
            "Recalculate the face directions so that all fronts point outdoors.",
        ),
        count(
            "overlap",
            folded,
            "edges of reflectors join faces that lie on each other and would reflect twice",
            "Delete the copies; they are cut into other triangles, so none was removed here.",
        ),
    )
    return [fault for fault in faults if fault]


def check_extent(low: Floats, high: Floats, *, unit: str, origin: Floats) -> list[Fault]:
    """Ask whether the size of the model and its place can be meant.

    Parameters
    ----------
    low, high : (3,) float
        Corners of the model's bounding box, in the model frame. [m]
    unit : str
        Unit that the study states.
    origin : (3,) float
        Where the local frame is put, in the model frame. [m]

    Returns
    -------
    faults : list of Fault
        Kinds ``too_small``, ``too_large`` and ``far_away``.
    """
    faults = []
    extent = float((high - low).max())
    if not SMALL_MODEL_M <= extent <= LARGE_MODEL_M:
        fits = [
            f'"{other}" would make it {size:.3g} m'
            for other, metres in METRES.items()
            if USUAL_MODEL_M[0] <= (size := extent / METRES[unit] * metres) <= USUAL_MODEL_M[1]
        ]
        faults.append(
            Fault(
                kind="too_small" if extent < SMALL_MODEL_M else "too_large",
                count=1,
                surface="",
                message=f'The model is {extent:.3g} m across with unit = "{unit}".',
                hint="Check unit under [model]" + (": " + ", ".join(fits) if fits else "") + ".",
            )
        )
    away = float(np.abs([low, high]).max())
    if away > FAR_M:
        x, y, z = origin
        faults.append(
            Fault(
                kind="far_away",
                count=1,
                surface="",
                message=(
                    f"The model stands {away / 1000:.0f} km from the origin of its coordinates. "
                    f"It is computed about ({x:.0f}, {y:.0f}, {z:.0f}) in double precision; "
                    "results keep the model's coordinates."
                ),
                hint="Nothing to do if the file was written in double precision or as text.",
            )
        )
    return faults
