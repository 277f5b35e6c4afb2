"""OBJ files, read for what a facade study needs from them.

trimesh reads OBJ too, but (tried with 5.2) it joins object, group and material into one name and
forgets the material when no MTL file defines it, hands the pieces back in another order, sorts
triangles before larger faces, and cuts concave faces as fans. Names give surfaces their roles, and
colours go back to the faces in the file's order, so this module reads them itself.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from causticload.errors import MeshError
from causticload.scene.model import Floats
from causticload.scene.polygons import triangulate

FREE_FORM = frozenset({"curv", "curv2", "surf"})


@dataclass(frozen=True, kw_only=True)
class ObjPiece:
    """Faces of one object, group and material, in the order of the file."""

    object_name: str
    group: str  # several group names are joined with "/"
    material: str
    triangles: Floats  # (k, 3, 3), file units
    corner_normals: Floats | None  # (k, 3, 3) as written; None unless every corner has one
    partly_normal: bool  # some corners had a normal, others none


@dataclass(frozen=True, kw_only=True)
class ObjFile:
    """What an OBJ file holds, and how much of it could not be used."""

    pieces: tuple[ObjPiece, ...]
    short_faces: int  # faces of fewer than three corners
    free_form: int  # curves and surfaces that are not meshes


@dataclass
class _Faces:
    """Corners of the faces of one piece, while the file is being read."""

    counts: list[int] = field(default_factory=list)
    vertex: list[int] = field(default_factory=list)
    normal: list[int] = field(default_factory=list)  # -1: none


def read_obj(text: str, *, where: str) -> ObjFile:
    """Read the text of an OBJ file.

    Parameters
    ----------
    text : str
        The file.
    where : str
        Its name, for messages.

    Returns
    -------
    file : ObjFile
        Pieces in the order in which they first appear. Texture coordinates, lines, points and
        smoothing groups are left out.

    Raises
    ------
    MeshError
        If a line cannot be read; the message says which.
    """
    vertices: list[tuple[float, ...]] = []
    normals: list[tuple[float, ...]] = []
    pieces: dict[tuple[str, str, str], _Faces] = {}
    object_name = group = material = ""
    current: _Faces | None = None
    short = free_form = 0
    lines = text.replace("\\\r\n", " ").replace("\\\n", " ").splitlines()
    for number, line in enumerate(lines, start=1):
        key, _, rest = line.strip().replace("\t", " ").partition(" ")
        try:
            if key == "v":
                vertices.append(_three(rest))
            elif key == "vn":
                normals.append(_three(rest))
            elif key == "f":
                if current is None:
                    current = pieces.setdefault((object_name, group, material), _Faces())
                corners = rest.partition("#")[0].split()
                if len(corners) < 3:
                    short += 1
                else:
                    _add_face(current, corners, len(vertices), len(normals))
            elif key == "o":
                object_name, current = rest.strip(), None
            elif key == "g":
                group, current = "/".join(rest.split()), None
            elif key == "usemtl":
                material, current = rest.strip(), None
            elif key in FREE_FORM:
                free_form += 1
        except ValueError as error:
            raise MeshError(
                f"cannot read {line.strip()[:60]!r}: {error}.",
                where=f"{where}, line {number}",
                hint="Export the file again, or repair the line.",
            ) from error
    xyz = np.array(vertices, dtype=np.float64).reshape(-1, 3)
    nxyz = np.array(normals, dtype=np.float64).reshape(-1, 3)
    return ObjFile(
        pieces=tuple(_piece(names, f, xyz, nxyz) for names, f in pieces.items() if f.counts),
        short_faces=short,
        free_form=free_form,
    )


def _three(rest: str) -> tuple[float, ...]:
    values = rest.split()[:3]  # a weight or a colour may follow
    if len(values) < 3:
        raise ValueError("three numbers are needed")
    return float(values[0]), float(values[1]), float(values[2])


def _add_face(faces: _Faces, corners: list[str], vertices: int, normals: int) -> None:
    """Append one face; ``corners`` are ``v``, ``v/vt``, ``v//vn`` or ``v/vt/vn``."""
    vertex = []
    normal = []
    for corner in corners:
        fields = corner.split("/")
        vertex.append(_index(fields[0], vertices))
        normal.append(_index(fields[2], normals) if len(fields) > 2 and fields[2] else -1)
    faces.counts.append(len(corners))
    faces.vertex += vertex
    faces.normal += normal


def _index(text: str, count: int) -> int:
    """Zero-based index; OBJ counts from 1, and backwards from -1."""
    value = int(text)
    index = value - 1 if value > 0 else count + value
    if value == 0 or not 0 <= index < count:
        raise ValueError(f"index {value} is not among the {count} defined so far")
    return index


def _piece(names: tuple[str, str, str], faces: _Faces, xyz: Floats, nxyz: Floats) -> ObjPiece:
    corners = xyz[np.array(faces.vertex)]
    cut = triangulate(corners, np.array(faces.counts, dtype=np.int32))
    normal = np.array(faces.normal)
    complete = bool((normal >= 0).all())
    return ObjPiece(
        object_name=names[0],
        group=names[1],
        material=names[2],
        triangles=corners[cut],
        corner_normals=nxyz[normal][cut] if complete else None,
        partly_normal=not complete and bool((normal >= 0).any()),
    )
