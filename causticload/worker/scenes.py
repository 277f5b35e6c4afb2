"""A host's scene as a study with mesh files, so that the engine's own reader reads it."""

from __future__ import annotations

import hashlib
import re
import shutil
import zipfile
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
import tomlkit

from causticload.errors import CausticloadError
from causticload.scene.model import Floats, Ints
from causticload.scene.read import Part
from causticload.scene.roles import GROUND_NAME, GROUND_SPACING_M, lay_ground
from causticload.study import read_study, write_study
from causticload.study.model import Study
from causticload.study.schema import LIST, TABLE, TEXT, Key
from causticload.worker.protocol import INVALID_PARAMS, RequestError, check_params

LONGEST_NAME = 80
OBJECT_KEYS = {
    "name": Key(TEXT, "name of the object", required=True),
    "vertices": Key(TEXT, "key of its (v, 3) array", required=True),
    "triangles": Key(TEXT, "key of its (t, 3) array of vertex numbers", required=True),
    "normals": Key(TEXT, "key of its (t, 3, 3) array of unit corner normals"),
    "rule": Key(TABLE, "role, form, finish, figure, spacing, kind as in a study file"),
}
SCENE_KEYS = {
    "arrays": Key(TEXT, "path of an .npz file", required=True),
    "objects": Key(LIST, "what stands there", required=True),
    "study": Key(TABLE, "tables of a study file but model and surface", required=True),
}


@dataclass(frozen=True)
class HostObject:
    """One object of a host: metres, Z up."""

    name: str
    stem: str  # what its mesh file and its surface are called
    vertices: Floats  # (v, 3)
    triangles: Ints  # (t, 3)
    normals: Floats | None  # (t, 3, 3)
    rule: dict[str, Any]


def read_objects(scene: Mapping[str, Any]) -> list[HostObject]:
    """Check a host's scene and read its arrays.

    Parameters
    ----------
    scene : mapping
        Keys as in ``SCENE_KEYS``.

    Returns
    -------
    objects : list of HostObject
        In the order of the host; empty ones are left out.

    Raises
    ------
    RequestError
        If a key, a shape or a vertex number is wrong.
    """
    check_params(scene, SCENE_KEYS, where="params.scene")
    for k, record in enumerate(scene["objects"]):
        where = f"params.scene.objects[{k}]"
        if not isinstance(record, dict):
            raise _wrong("must be an object", where)
        check_params(record, OBJECT_KEYS, where=where)
    arrays = _read_arrays(scene["arrays"])
    stems = file_stems([record["name"] for record in scene["objects"]])
    found = []
    for k, (record, stem) in enumerate(zip(scene["objects"], stems, strict=True)):
        where = f"params.scene.objects[{k}]"
        vertices = _array(arrays, record["vertices"], (3,), f"{where}.vertices")
        triangles = _array(arrays, record["triangles"], (3,), f"{where}.triangles")
        if not len(triangles):
            continue
        if triangles.dtype.kind not in "iu":
            raise _wrong("must hold whole numbers", f"{where}.triangles")
        if triangles.min() < 0 or triangles.max() >= len(vertices):
            raise _wrong(
                f"vertex numbers must be from 0 to {len(vertices) - 1}, got "
                f"{triangles.min()} to {triangles.max()}",
                f"{where}.triangles",
            )
        normals = None
        if "normals" in record:
            normals = _array(arrays, record["normals"], (3, 3), f"{where}.normals")
            if len(normals) != len(triangles):
                raise _wrong("wants one row a triangle", f"{where}.normals")
        found.append(
            HostObject(
                record["name"],
                stem,
                vertices.astype(np.float64),
                triangles.astype(np.int32),
                normals,
                dict(record.get("rule", {})),
            )
        )
    if not found:
        raise _wrong(
            "there is no object with faces", "params.scene.objects", "Show or add some meshes."
        )
    return found


def _wrong(message: str, where: str, hint: str = "") -> RequestError:
    return RequestError(message, code=INVALID_PARAMS, where=where, hint=hint)


def _read_arrays(path: str) -> dict[str, Any]:
    try:
        with np.load(path, allow_pickle=False) as file:
            return {key: file[key] for key in file.files}
    except (OSError, ValueError, zipfile.BadZipFile, AttributeError) as error:
        raise _wrong(f"no .npz file can be read there: {error}", "params.scene.arrays") from error


def _array(arrays: Mapping[str, Any], key: str, tail: tuple[int, ...], where: str) -> Any:
    if key not in arrays:
        raise _wrong(f"there is no array {key!r}", where)
    array = arrays[key]
    if array.ndim != len(tail) + 1 or array.shape[1:] != tail or array.dtype.kind not in "fiu":
        shape = ", ".join(["n", *map(str, tail)])
        raise _wrong(f"must be numbers of shape ({shape}), got {array.dtype} {array.shape}", where)
    return array


def file_stems(names: Sequence[str]) -> list[str]:
    """File names without ending for objects: usable everywhere, and all different.

    Parameters
    ----------
    names : sequence of str
        Names of objects.

    Returns
    -------
    stems : list of str
        Different also where upper and lower case are the same.
    """
    taken: set[str] = set()
    stems = []
    for name in names:
        plain = re.sub(r'[\x00-\x1f<>:"/\\|?*]', "-", name)[:LONGEST_NAME].strip(" .") or "object"
        stem, number = plain, 2
        while stem.casefold() in taken:
            stem, number = f"{plain} {number}", number + 1
        taken.add(stem.casefold())
        stems.append(stem)
    return stems


def scene_key(objects: Sequence[HostObject], study: Mapping[str, Any]) -> str:
    """Hash of all that the prepared scene depends on: shapes, roles, finishes, figures.

    Parameters
    ----------
    objects : sequence of HostObject
        The host's objects.
    study : mapping
        Tables of the study.

    Returns
    -------
    key : str
        Hexadecimal SHA-256.
    """
    total = hashlib.sha256()
    for o in objects:
        total.update(repr((o.name, o.stem, sorted(o.rule.items()))).encode())
        for array in (o.vertices, o.triangles, o.normals):
            if array is not None:
                total.update(repr((array.dtype.str, array.shape)).encode())
                total.update(np.ascontiguousarray(array).data)
    total.update(repr([study.get(k) for k in ("finish", "figure")]).encode())
    return total.hexdigest()


def file_key(study: Study) -> str:
    """Do the same for a study file.

    Parameters
    ----------
    study : Study
        The study.

    Returns
    -------
    key : str
        Hexadecimal SHA-256.
    """
    total = hashlib.sha256(
        repr(
            (study.surfaces, study.finishes, study.figures, study.model.unit, study.model.up)
        ).encode()
    )
    for file in study.model.files:
        total.update(file.name.encode() + hashlib.sha256(file.read_bytes()).digest())
    return total.hexdigest()


def write_scene(objects: Sequence[HostObject], study: Mapping[str, Any], folder: Path) -> Study:
    """Write a host's scene as a study file with one mesh file an object, and read it back.

    Parameters
    ----------
    objects : sequence of HostObject
        The host's objects.
    study : mapping
        Tables of a study file but model and surface.
    folder : Path
        Where to.

    Returns
    -------
    study : Study
        As the engine reads it.

    Raises
    ------
    CausticloadError
        If a table is wrong.
    """
    folder.mkdir(parents=True, exist_ok=True)
    for o in objects:
        write_mesh(o, folder / f"{o.stem}.ply")
    write_tables(objects, study, folder)
    return read_study(folder / "study.toml")


def write_tables(objects: Sequence[HostObject], study: Mapping[str, Any], folder: Path) -> None:
    """Write the study file of a host's scene.

    Parameters
    ----------
    objects : sequence of HostObject
        The host's objects.
    study : mapping
        Tables of a study file but model and surface.
    folder : Path
        Where the mesh files are.

    Raises
    ------
    RequestError
        If a table is one that the worker writes itself, or holds what a file cannot.
    """
    for key in ("model", "surface"):
        if key in study:
            raise _wrong("the worker writes this table itself", f"params.scene.study.{key}")
    rules = [{"match": _exactly(o.stem), **(o.rule or {"role": "obstruction"})} for o in objects]
    tables = {
        **study,
        "model": {"files": [f"{o.stem}.ply" for o in objects]},
        "surface": rules,
    }
    try:
        text = tomlkit.dumps(tables)
    except (ValueError, TypeError) as error:
        raise _wrong(f"cannot be written as a study: {error}", "params.scene.study") from error
    (folder / "study.toml").write_text(text, encoding="utf-8")


def _exactly(name: str) -> str:
    """A glob that fits one name only."""
    return re.sub(r"([\[*?])", r"[\1]", name)


def write_mesh(o: HostObject, path: Path) -> None:
    """Write an object as binary PLY in double precision.

    Parameters
    ----------
    o : HostObject
        The object.
    path : Path
        Where to.
    """
    columns = ["x", "y", "z"]
    rows, faces = o.vertices, o.triangles
    if o.normals is not None:
        # A vertex carries one normal there, so corners that differ get vertices of their own.
        columns += ["nx", "ny", "nz"]
        corners = np.concatenate(
            [o.vertices[o.triangles].reshape(-1, 3), o.normals.reshape(-1, 3)], axis=1
        )
        rows, inverse = np.unique(corners, axis=0, return_inverse=True)
        faces = inverse.reshape(-1, 3).astype(np.int32)
    table = np.empty(len(faces), dtype=[("count", "u1"), ("corner", "<i4", 3)])
    table["count"], table["corner"] = 3, faces
    header = "\n".join(
        [
            "ply",
            "format binary_little_endian 1.0",
            f"element vertex {len(rows)}",
            *(f"property double {c}" for c in columns),
            f"element face {len(faces)}",
            "property list uchar int vertex_indices",
            "end_header\n",
        ]
    )
    path.write_bytes(header.encode() + rows.astype("<f8").tobytes() + table.tobytes())


def with_ground(objects: Sequence[HostObject]) -> tuple[list[HostObject], str]:
    """Lay a ground under a host's scene in which nothing receives light.

    Parameters
    ----------
    objects : sequence of HostObject
        The host's objects.

    Returns
    -------
    objects : list of HostObject
        With the ground, if it was wanting.
    said : str
        What was assumed; empty if nothing was.
    """
    roles = [o.rule.get("role", ()) for o in objects]
    if any("receiver" in ([r] if isinstance(r, str) else r) for r in roles):
        return list(objects), ""
    parts = [
        Part(
            name=o.name,
            object_name=o.name,
            group="",
            material="",
            file=o.name,
            triangles=o.vertices[o.triangles],
            corner_normals=None,
        )
        for o in objects
    ]
    corners = lay_ground(parts).triangles.reshape(-1, 3)
    stem = file_stems([*(o.stem for o in objects), GROUND_NAME])[-1]
    rule = {"role": "receiver", "spacing": GROUND_SPACING_M, "kind": "walkway"}
    ground = HostObject(stem, stem, corners, np.arange(6, dtype=np.int32).reshape(2, 3), None, rule)
    size = np.ptp(corners, axis=0)
    said = (
        f"No object receives light: a level ground of {size[0]:.0f} m by {size[1]:.0f} m is laid "
        f"at the lowest point of the model (z = {corners[0, 2]:.2f} m)."
    )
    return [*objects, ground], said


def save_study(study: Study, path: Path, *, overwrite: bool) -> Path:
    """Write a study beside copies of its meshes, so that the command line repeats its figures.

    Parameters
    ----------
    study : Study
        The study.
    path : Path
        The study file; meshes go into a folder beside it, named after it.
    overwrite : bool
        Whether a file that is there may be replaced.

    Returns
    -------
    path : Path
        The study file.

    Raises
    ------
    RequestError
        If something is there already.
    CausticloadError
        If it cannot be written.
    """
    names = [f.name.casefold() for f in study.model.files]
    twice = next((n for n in names if names.count(n) > 1), None)
    if twice:
        raise _wrong(f"two mesh files are called {twice!r}", "model.files", "Rename one of them.")
    meshes = path.with_name(f"{path.stem}-meshes")
    for there in (path, meshes):
        if there.exists() and not overwrite:
            raise _wrong(
                f"{there} exists",
                "params.path",
                "Choose another name, or say that it may be overwritten.",
            )
    try:
        meshes.mkdir(parents=True, exist_ok=True)
        files = [_copy(f, meshes) for f in study.model.files]
        sky = study.sky
        if sky.file is not None:
            sky = replace(sky, file=_copy(sky.file, meshes))
    except OSError as error:
        raise CausticloadError(
            f"cannot be written: {error.strerror or error}", where=str(path)
        ) from error
    copied = replace(study, model=replace(study.model, files=tuple(files)), sky=sky)
    return write_study(copied, path)


def _copy(file: Path, folder: Path) -> Path:
    """Copy a file under its own name, which is the name of its surface."""
    return Path(shutil.copyfile(file, folder / file.name))
