"""What the mesh reader has to say about a file, as faults that travel with its first part."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import trimesh

from causticload.scene.model import Fault
from causticload.study.model import Model

UNIT_WORDS = {"m": "met", "cm": "centi", "mm": "milli", "ft": "f", "in": "inch"}
BINARY = frozenset({".ply", ".stl", ".glb", ".gltf"})  # may hold 4-byte numbers
ROUNDING_M = 1e-4  # a bay of 1 m turns by 0.1 mrad: 6 mm in the image at 30 m


def unread_notes(path: Path, *, short_faces: int, free_form: int) -> tuple[Fault, ...]:
    """Say what of an OBJ file could not be used.

    Parameters
    ----------
    path : pathlib.Path
        The file.
    short_faces : int
        Faces of fewer than three corners.
    free_form : int
        Curves and surfaces that are not meshes.

    Returns
    -------
    notes : tuple of Fault
        Empty if all was used.
    """
    found = (
        (short_faces, "short_face", "faces have fewer than three corners; they are left out"),
        (free_form, "free_form", "free-form curves or surfaces are not read"),
    )
    return tuple(
        Fault(
            kind=kind,
            count=count,
            surface="",
            message=f"{path.name}: {count} {text}.",
            hint="Turn them into meshes before the export.",
        )
        for count, kind, text in found
        if count
    )


def partly_normal_note(path: Path, name: str) -> tuple[Fault, ...]:
    """Say that normals of a part were not used because some are missing.

    Parameters
    ----------
    path : pathlib.Path
        The file.
    name : str
        Object or group.

    Returns
    -------
    notes : tuple of Fault
        One.
    """
    return (
        Fault(
            kind="normals_incomplete",
            count=1,
            surface=name,
            message=f"{path.name}: only some faces of {name!r} carry normals; none is used.",
            hint="Export normals for all faces, or for none.",
        ),
    )


def up_note(path: Path, model: Model) -> tuple[Fault, ...]:
    """Warn that a glTF file was read against its standard's up axis.

    Parameters
    ----------
    path : pathlib.Path
        The file.
    model : Model
        What the study says of its unit and up axis.

    Returns
    -------
    notes : tuple of Fault
        Empty if the study says that Y is up.
    """
    if model.up == "Y":
        return ()
    message = (
        f"{path.name}: glTF files have +Y up by their standard, but the study says (or leaves at "
        f'its default) up = "{model.up}"; the file was read with +Z up.'
    )
    hint = 'If the building lies on its side, write up = "Y" under [model].'
    return (Fault(kind="up_axis", count=1, surface="", message=message, hint=hint),)


def ifc_note(path: Path, model: Model) -> tuple[Fault, ...]:
    """Say that an IFC file's own unit and up axis were used.

    Parameters
    ----------
    path : pathlib.Path
        The file.
    model : Model
        What the study says of its unit and up axis.

    Returns
    -------
    notes : tuple of Fault
        Empty if the study says the same.
    """
    if model.unit == "m" and model.up == "Z":
        return ()
    message = (
        f"{path.name}: an IFC file states its own unit and has Z up; unit = "
        f'"{model.unit}" and up = "{model.up}" of the study were not applied to it.'
    )
    hint = "Nothing to do if the size of the model is right."
    return (Fault(kind="unit_not_applied", count=1, surface="", message=message, hint=hint),)


def unit_note(path: Path, scene: Any, model: Model) -> tuple[Fault, ...]:
    """Compare the unit that a file states, if any, with that of the study.

    Parameters
    ----------
    path : pathlib.Path
        The file.
    scene : trimesh.Scene
        The file as read.
    model : Model
        What the study says of its unit and up axis.

    Returns
    -------
    notes : tuple of Fault
        Empty if they agree or the file states none.
    """
    stated = str(scene.units or "")
    if not stated or stated.lower().startswith(UNIT_WORDS[model.unit]):
        return ()
    message = (
        f'{path.name}: the file states its unit as {stated}, the study as "{model.unit}"; '
        "the study was followed."
    )
    hint = "Check the size of the model; correct unit under [model] if it is wrong."
    return (Fault(kind="unit_differs", count=1, surface="", message=message, hint=hint),)


def mesh_notes(path: Path, mesh: trimesh.Trimesh, name: str, metres: float) -> tuple[Fault, ...]:
    """Say what reading cost one mesh: rounded points, faces cut as fans.

    Parameters
    ----------
    path : pathlib.Path
        The file.
    mesh : trimesh.Trimesh
        The mesh in the units of the file.
    name : str
        Its object.
    metres : float
        Length of the file's unit. [m]

    Returns
    -------
    notes : tuple of Fault
        Empty if nothing.
    """
    notes = []
    step = _rounding(path, mesh) * metres
    if step > ROUNDING_M:
        message = (
            f"{path.name}: {name!r} is stored in 4-byte numbers so far from the file's origin "
            f"that its points are rounded to {step * 1000:.2g} mm."
        )
        hint = "Move the model near the origin before the export, or export OBJ."
        notes.append(
            Fault(kind="rounded", count=len(mesh.faces), surface=name, message=message, hint=hint)
        )
    larger = len(mesh.faces) - _faces_in_file(path, mesh)
    if larger > 0:
        message = (
            f"{path.name}: faces of {name!r} with more than three corners were cut as fans "
            f"({larger} triangles more than faces); a concave face comes out wrong that way."
        )
        hint = "If there are concave faces, cut them into triangles before the export."
        notes.append(Fault(kind="fans", count=larger, surface=name, message=message, hint=hint))
    return tuple(notes)


def _rounding(path: Path, mesh: trimesh.Trimesh) -> float:
    """Step between neighbouring 4-byte numbers at the mesh, file units; 0 if longer."""
    finite = mesh.vertices[np.isfinite(mesh.vertices)]
    if path.suffix.lower() not in BINARY or not len(finite):
        return 0.0
    if (finite != finite.astype(np.float32)).any():
        return 0.0
    return float(np.spacing(np.float32(np.abs(finite).max())))


def _faces_in_file(path: Path, mesh: trimesh.Trimesh) -> int:
    """Number of faces before they were cut into triangles, where the format has larger ones."""
    if path.suffix.lower() == ".ply":
        return int(mesh.metadata["_ply_raw"]["face"]["length"])
    if path.suffix.lower() == ".off":
        lines = path.read_text(encoding="utf-8", errors="replace").splitlines()
        content = " ".join(line.partition("#")[0] for line in lines[:200])
        return int(content.split("OFF", 1)[1].split()[1])
    return len(mesh.faces)
