"""What a memo is written from: a year's result folder, and nothing beside it."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

import numpy as np
import trimesh

from causticload.errors import CausticloadError, ResultError
from causticload.light.bvh import Tracer, build_tracer
from causticload.optics import resolve_finish
from causticload.optics.finish import Finish
from causticload.output.folder import read_mesh, read_year
from causticload.output.results import Year
from causticload.scene.model import Bools, Floats, Ints

NEEDED = ("panels.npz", "model.glb")
SHARP_DEG = 20.0  # edges between faces that meet at a larger angle are drawn in plans
MOST_EDGES = 60_000  # of the surroundings; the longest are kept


@dataclass(frozen=True)
class Panels:
    """Panels as ``panels.npz`` keeps them. ``p`` panels."""

    surface: Ints  # (p,)
    area: Floats  # (p,) m²
    centroid: Floats  # (p, 3) m, model coordinates
    normal: Floats  # (p, 3)
    flat: Bools  # (p,)
    size: Floats  # (p, 2) m


class Evidence:
    """A result folder, opened once; shapes are read when a figure first asks for them.

    Parameters
    ----------
    folder : Path
        Result folder of a year.

    Raises
    ------
    ResultError
        If the folder is missing, partial, or of another schema.
    """

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self.year: Year = read_year(folder)
        for name in NEEDED:
            if not (folder / name).is_file():
                raise ResultError(
                    f"{name} is missing", where=str(folder), hint="Run the year again."
                )
        self.summary: dict[str, Any] = self.year.summary
        self.zone = self.year.study.site.timezone
        try:
            self._read_shapes()
        except (OSError, KeyError, ValueError, TypeError, AttributeError) as error:
            raise ResultError(
                f"a file is missing or broken: {error}",
                where=str(folder),
                hint="Run the year again.",
            ) from error

    def _read_shapes(self) -> None:
        facade = read_mesh(self.folder / "facade.vtp")
        corners = np.asarray(facade.points, float)
        self.facade: Floats = corners[facade.faces.reshape(-1, 4)[:, 1:]]
        self.facade_data = {k: np.asarray(v) for k, v in facade.cell_data.items()}
        self.facade_notes = {k: str(v[0]) for k, v in facade.field_data.items()}
        with np.load(self.folder / "panels.npz") as file:
            self.panels = Panels(
                **{k: file[k] for k in ("surface", "area", "centroid", "normal", "flat", "size")}
            )
        receivers = read_mesh(self.folder / "receivers.vtp")
        points = np.asarray(receivers.points, float)
        self.cells: Floats = points[receivers.faces.reshape(-1, 5)[:, 1:]]
        self.cell_data = {k: np.asarray(v) for k, v in receivers.cell_data.items()}
        # Triangles of everything that does not reflect, (k, 3, 3), model coordinates. [m]
        self.surroundings: Floats = _part(self.folder / "model.glb", "surroundings")

    @property
    def origin(self) -> Floats:
        """Middle of the model, (3,). [m]"""
        return np.asarray(self.summary["scene"]["origin_m"], float)

    @property
    def panel_of(self) -> Ints:
        """Panel of each triangle of the facade, (k,)."""
        return self.facade_data["panel [number]"].astype(int)

    @cached_property
    def tracer(self) -> Tracer:
        """Finds what an eye sees: the facade's triangles first, then the surroundings."""
        T = np.concatenate([self.facade, self.surroundings]) - self.origin
        return build_tracer(T)

    @cached_property
    def outlines(self) -> Floats:
        """Edges of the surroundings worth drawing in a plan, (n, 2, 3). [m]"""
        T = self.surroundings
        if not len(T):
            return np.zeros((0, 2, 3))
        # Corners within a millimetre are one, so that faces know their neighbours.
        _, index = np.unique(
            np.round((T - self.origin).reshape(-1, 3), 3), axis=0, return_inverse=True
        )
        mesh = trimesh.Trimesh(
            _first_of(T.reshape(-1, 3), index.ravel()), index.reshape(-1, 3), process=False
        )
        sharp = mesh.face_adjacency_angles > np.radians(SHARP_DEG)
        single = trimesh.grouping.group_rows(mesh.edges_sorted, require_count=1)
        pairs = np.concatenate([mesh.face_adjacency_edges[sharp], mesh.edges_sorted[single]])
        edges = np.asarray(mesh.vertices)[pairs]
        if len(edges) > MOST_EDGES:
            long = np.linalg.norm(edges[:, 1] - edges[:, 0], axis=1)
            edges = edges[np.argsort(-long, kind="stable")[:MOST_EDGES]]
        return edges

    @cached_property
    def panel_edges(self) -> Floats:
        """Edges of panels, (n, 2, 3): those that two triangles of one panel do not share. [m]"""
        T, panel = self.facade, self.panel_of
        _, index = np.unique(
            np.round((T - self.origin).reshape(-1, 3), 4), axis=0, return_inverse=True
        )
        corner = index.reshape(-1, 3)
        ends = np.sort(np.stack([corner, np.roll(corner, -1, axis=1)], axis=2), axis=2)
        key = np.column_stack([ends.reshape(-1, 2), np.repeat(panel, 3)])
        _, first, count = np.unique(key, axis=0, return_index=True, return_counts=True)
        edges = np.stack([T, np.roll(T, -1, axis=1)], axis=2).reshape(-1, 2, 3)
        return edges[first[count == 1]]

    @cached_property
    def finishes(self) -> dict[str, Finish | str]:
        """Finishes of the reflectors by name; a sentence where one cannot be worked out again."""
        found: dict[str, Finish | str] = {}
        for surface in self.summary["scene"]["surfaces"]:
            name = surface["finish"]
            if name and name not in found:
                try:
                    found[name] = resolve_finish(name, self.year.study.finishes)
                except CausticloadError as error:  # its data sheet is not in the folder
                    found[name] = str(error)
        return found


def _part(path: Path, name: str) -> Floats:
    """Triangles (k, 3, 3) of a named part of a GLB file, turned to Z up; maybe none."""
    glb = trimesh.load_scene(path)
    parts = [np.zeros((0, 3, 3))]
    for node in glb.graph.nodes_geometry:
        transform, geometry = glb.graph[node]
        if geometry == name:
            mesh = glb.geometry[geometry]
            x, y, z = trimesh.transform_points(mesh.vertices, transform).T
            parts.append(np.stack([x, -z, y], axis=1)[np.asarray(mesh.faces)])
    return np.concatenate(parts)


def _first_of(points: Floats, index: Ints) -> Floats:
    """Row of ``points`` for each number in ``index``."""
    rows = np.empty((int(index.max()) + 1, 3))
    rows[index[::-1]] = points[::-1]
    return rows
