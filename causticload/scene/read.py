"""Mesh files to named parts in the model frame: metres, Z up, double precision.

OBJ is read by :mod:`causticload.scene.wavefront` and IFC by :mod:`causticload.scene.ifc`; every
other format by trimesh, told to leave vertices and faces as they stand in the file.
"""

from __future__ import annotations

import warnings
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
import trimesh

from causticload.errors import MeshError
from causticload.scene.ifc import read_ifc
from causticload.scene.model import Fault, Floats
from causticload.scene.read_notes import (
    ifc_note,
    mesh_notes,
    partly_normal_note,
    unit_note,
    unread_notes,
    up_note,
)
from causticload.scene.wavefront import read_obj
from causticload.study.model import Model

FORMATS = (".obj", ".ply", ".stl", ".off", ".glb", ".gltf", ".3mf", ".ifc")
ARCHIVES = {"zip", "bz2", "tar.bz2", "tar.gz"}  # unpack them first: names and units get lost
METRES = {"m": 1.0, "cm": 0.01, "mm": 0.001, "ft": 0.3048, "in": 0.0254}
UNIT_LENGTH_TOLERANCE = 1e-3  # normals written with three decimals pass, with two they do not


@dataclass(frozen=True, kw_only=True)
class Part:
    """Faces that share their object, group and material. ``k`` triangles in the model frame."""

    name: str  # the most telling of the names below
    object_name: str
    group: str  # group or layer; nested ones are joined with "/"
    material: str
    file: str
    triangles: Floats  # (k, 3, 3) m, in the order of the file
    corner_normals: Floats | None  # (k, 3, 3) unit; nan where the file's was not; None: no normals
    notes: tuple[Fault, ...] = ()  # what the reader found

    @property
    def names(self) -> tuple[str, ...]:
        """Names that a rule of the study may match: object, group (whole, pieces), material."""
        names = (self.object_name, self.group, *self.group.split("/"), self.material)
        return tuple(dict.fromkeys(name for name in names if name))


def read_parts(model: Model) -> list[Part]:
    """Read the mesh files of a study.

    Parameters
    ----------
    model : Model
        Files, unit and up axis.

    Returns
    -------
    parts : list of Part
        In the order of the files and, within a file, of its objects. Faces keep the order of the
        file, each larger one replaced by its triangles; in PLY and OFF, trimesh puts triangles
        before larger faces.

    Raises
    ------
    MeshError
        If a file is missing, empty, not readable or of an unknown format.
    """
    return [part for path in model.files for part in _read_file(Path(path), model)]


def bounds(parts: Sequence[Part]) -> tuple[Floats, Floats]:
    """Bounding box of the triangles that are finite.

    Parameters
    ----------
    parts : sequence of Part
        Parts of mesh files, at least one.

    Returns
    -------
    low, high : (3,) float
        Its corners. [m]

    Raises
    ------
    MeshError
        If no triangle is finite.
    """
    triangles = np.concatenate([part.triangles for part in parts])
    points = triangles[np.isfinite(triangles).all(axis=(1, 2))].reshape(-1, 3)
    if not len(points):
        raise MeshError(
            "every triangle has a corner that is not a number (nan or infinite).",
            where=parts[0].file,
            hint="Repair the mesh and export it again.",
        )
    return points.min(axis=0), points.max(axis=0)


def _read_file(path: Path, model: Model) -> list[Part]:
    _check_path(path)
    suffix = path.suffix.lower()
    if suffix == ".obj":
        parts = _obj_parts(path)
    elif suffix == ".ifc":
        parts = _ifc_parts(path)
    else:
        parts = list(_trimesh_parts(path, model))
    parts = [part for part in parts if len(part.triangles)]
    if not parts:
        raise MeshError(
            "the file holds no faces.",
            where=path.name,
            hint="Export meshes, not curves, points or free-form surfaces. "
            "A file that was cut off can read like this too.",
        )
    if suffix == ".ifc":  # ifcopenshell has brought it to metres and Z up
        return [replace(parts[0], notes=ifc_note(path, model)), *parts[1:]]
    if suffix in {".glb", ".gltf"}:
        parts[0] = replace(parts[0], notes=(*up_note(path, model), *parts[0].notes))
    return [_to_model_frame(part, model) for part in parts]


def _check_path(path: Path) -> None:
    formats = "Formats that are read everywhere: " + ", ".join(s[1:].upper() for s in FORMATS) + "."
    if not path.is_file():
        raise MeshError(
            f"there is no file {path}.", where=path.name, hint="Check model.files in the study."
        )
    suffix = path.suffix.lower()
    if suffix not in FORMATS and suffix[1:] not in trimesh.available_formats() - ARCHIVES:
        raise MeshError(
            f"{path.suffix or 'a file without an ending'} is not a mesh format that can be read.",
            where=path.name,
            hint=formats,
        )
    if path.stat().st_size == 0:
        raise MeshError("the file is empty.", where=path.name, hint="Export it again.")


def _to_model_frame(part: Part, model: Model) -> Part:
    """Bring file units to metres and the up axis to Z."""
    triangles = part.triangles * METRES[model.unit]
    normals = part.corner_normals
    if model.up == "Y":
        triangles = _y_up_to_z_up(triangles)
        normals = None if normals is None else _y_up_to_z_up(normals)
    return replace(part, triangles=triangles, corner_normals=normals)


def _y_up_to_z_up(vectors: Floats) -> Floats:
    """A quarter turn about X: (x, y, z) -> (x, -z, y)."""
    return np.stack([vectors[..., 0], -vectors[..., 2], vectors[..., 1]], axis=-1)


def _unit_normals(normals: Floats) -> Floats:
    """Make normals exactly unit; nan where the file's are not unit to begin with."""
    length = np.linalg.norm(normals, axis=-1, keepdims=True)
    good = np.abs(length - 1.0) <= UNIT_LENGTH_TOLERANCE
    return np.where(good, normals / np.where(good, length, 1.0), np.nan)


# --- OBJ and IFC -------------------------------------------------------------------------------


def _obj_parts(path: Path) -> list[Part]:
    raw = path.read_bytes()
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError:
        text = raw.decode("latin-1")  # names from older programs
    obj = read_obj(text, where=path.name)
    parts = [
        Part(
            name=p.object_name or p.group or p.material or path.stem,
            object_name=p.object_name or ("" if p.group or p.material else path.stem),
            group=p.group,
            material=p.material,
            file=path.name,
            triangles=p.triangles,
            corner_normals=None if p.corner_normals is None else _unit_normals(p.corner_normals),
            notes=partly_normal_note(path, p.object_name or p.group) if p.partly_normal else (),
        )
        for p in obj.pieces
    ]
    notes = unread_notes(path, short_faces=obj.short_faces, free_form=obj.free_form)
    if parts:
        parts[0] = replace(parts[0], notes=(*parts[0].notes, *notes))
    return parts


def _ifc_parts(path: Path) -> list[Part]:
    return [
        Part(
            name=p.object_name,
            object_name=p.object_name,
            group=p.group,
            material=p.material,
            file=path.name,
            triangles=p.triangles,
            corner_normals=None,
        )
        for p in read_ifc(path)
    ]


# --- everything else: trimesh ------------------------------------------------------------------


def _trimesh_parts(path: Path, model: Model) -> Iterator[Part]:
    scene = _load(path)
    notes = unit_note(path, scene, model)
    noted: set[str] = set()  # a mesh may stand in many places
    order = {name: i for i, name in enumerate(scene.geometry)}
    nodes = sorted(scene.graph.nodes_geometry, key=lambda node: order[scene.graph[node][1]])
    for node in nodes:
        matrix, geometry_name = scene.graph[node]
        mesh = scene.geometry[geometry_name]
        if not isinstance(mesh, trimesh.Trimesh):
            continue  # points and lines reflect nothing
        object_name, group = _node_names(scene, node, mesh)
        object_name = path.stem if object_name == path.name else object_name
        if geometry_name not in noted:
            notes += mesh_notes(path, mesh, object_name, METRES[model.unit])
            noted.add(geometry_name)
        triangles, normals = _placed(mesh, np.asarray(matrix, dtype=np.float64))
        yield Part(
            name=object_name,
            object_name=object_name,
            group=group,
            material=_material_name(mesh),
            file=path.name,
            triangles=triangles,
            corner_normals=normals,
            notes=notes,
        )
        notes = ()


def _load(path: Path) -> Any:
    suffix = path.suffix.lower()
    # A texture coordinate per face must not split PLY vertices from their normals.
    options = {"fix_texture": False, "skip_materials": True} if suffix == ".ply" else {}
    try:
        with warnings.catch_warnings():
            # numpy only warns when a text file breaks off in the middle of its numbers
            warnings.filterwarnings("error", message="string or file could not be read")
            return trimesh.load(str(path), force="scene", process=False, **options)
    except Exception as error:  # loaders raise whatever their parsers do
        reason = str(error) or type(error).__name__
        raise MeshError(
            f"cannot be read as {suffix[1:].upper()}: {reason}.",
            where=path.name,
            hint="Check that the ending fits the content, and export the file again.",
        ) from error


def _node_names(scene: Any, node: str, mesh: trimesh.Trimesh) -> tuple[str, str]:
    """Object name and group path of a node."""
    parents = scene.graph.transforms.parents
    parent = parents.get(node)
    if mesh.metadata.get("from_gltf_primitive") and parent and node.startswith(f"{parent}_"):
        # trimesh hangs each primitive of a glTF mesh below its node, under a random name
        node, parent = parent, parents.get(parent)
    above: list[str] = []
    while parent is not None and parent != scene.graph.base_frame:
        above.insert(0, str(parent))
        parent = parents.get(parent)
    return str(node), "/".join(above)


def _material_name(mesh: trimesh.Trimesh) -> str:
    material = getattr(mesh.visual, "material", None)
    return str(getattr(material, "name", None) or "")


def _placed(mesh: trimesh.Trimesh, matrix: Floats) -> tuple[Floats, Floats | None]:
    """Triangles and corner normals of a mesh after its transform.

    A mirror turns every face inside out, so the winding is turned back. Normals go with the
    inverse transpose, which keeps an outward normal outward under a mirror too.
    """
    faces = np.asarray(mesh.faces)
    linear = matrix[:3, :3]
    triangles = np.asarray(mesh.vertices, dtype=np.float64)[faces] @ linear.T + matrix[:3, 3]
    # trimesh makes up normals when asked; those of the file are in its cache from the start
    normals = None
    determinant = np.linalg.det(linear)
    if "vertex_normals" in mesh._cache.cache and determinant != 0.0:
        normals = _unit_normals(np.asarray(mesh._cache.cache["vertex_normals"])[faces])
        normals = normals @ np.linalg.inv(linear)
        normals /= np.linalg.norm(normals, axis=-1, keepdims=True)
    if determinant < 0.0:
        triangles = triangles[:, ::-1]
        normals = None if normals is None else normals[:, ::-1]
    return triangles, normals
