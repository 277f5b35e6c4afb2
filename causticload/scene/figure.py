"""How reflectors stand and bend: corner normals, curvature and panels."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from causticload.scene.model import Bools, Fault, Floats, Ints, Panels
from causticload.scene.normals import CREASE_RAD, curvature_from_normals, fit_corner_normals
from causticload.scene.panels import find_panels
from causticload.scene.roles import Roles, has_curved_normals
from causticload.scene.stack import Stack
from causticload.scene.topology import face_normals


@dataclass(frozen=True, kw_only=True)
class Figure:
    """How the surfaces stand and bend."""

    panel: Ints
    panels: Panels
    corner_normals: Floats
    curvature: Floats
    faults: tuple[Fault, ...]
    assumed: tuple[str, ...]


def shape_reflectors(stack: Stack, reflects: Bools, roles: Roles) -> Figure:
    """Find normals, curvature and panels of the reflectors.

    A smooth surface takes the corner normals of its file where it has good ones, else normals
    fitted to the mesh. A flat pane has one normal at all its corners.

    Parameters
    ----------
    stack : Stack
        Triangles of the scene, cleaned.
    reflects : (m,) bool
        Which of them reflect.
    roles : Roles
        Surfaces and rules.

    Returns
    -------
    figure : Figure
        Arrays over all triangles; off the reflectors the face normal, no curvature, no panel.
    """
    face, _ = face_normals(stack.triangles)
    corner_normals = np.repeat(face[:, None], 3, axis=1)
    curvature = np.zeros((len(face), 3, 2))
    form_smooth = np.array([s.form == "smooth" for s in roles.surfaces], dtype=np.bool_)
    smooth = reflects & form_smooth[stack.surface]

    from_file, faults, assumed = _trusted_normals(stack, smooth, face, roles)
    for rule in np.unique(stack.rule[smooth & ~from_file]):
        # all sheets of a rule together: a facade is often exported as one object per bay
        rows = np.flatnonzero(smooth & (stack.rule == rule))
        fitted, bend = fit_corner_normals(stack.triangles[rows], crease_angle_rad=CREASE_RAD)
        wanted = ~from_file[rows]
        corner_normals[rows[wanted]] = fitted[wanted]
        curvature[rows[wanted]] = bend[wanted]
    if from_file.any():
        given = stack.file_normals[from_file]
        behind = np.einsum("kci,ki->kc", given, face[from_file]) < 0.0
        given = np.where(behind[..., None], -given, given)
        corner_normals[from_file] = given
        curvature[from_file] = curvature_from_normals(stack.triangles[from_file], given)

    rows = np.flatnonzero(reflects)
    panel = np.full(len(face), -1, dtype=np.int32)
    panel[rows], panels = find_panels(
        stack.triangles[rows], stack.surface[rows], smooth[rows], corner_normals[rows]
    )
    plane = rows[panels.flat[panel[rows]]]
    normal = panels.normal[panel[plane]]
    side = np.sign(np.einsum("ki,ki->k", normal, face[plane]))
    corner_normals[plane] = (side[:, None] * normal)[:, None]
    curvature[plane] = 0.0
    return Figure(
        panel=panel,
        panels=panels,
        corner_normals=corner_normals,
        curvature=curvature,
        faults=faults,
        assumed=assumed,
    )


def _trusted_normals(
    stack: Stack, smooth: Bools, face: Floats, roles: Roles
) -> tuple[Bools, tuple[Fault, ...], tuple[str, ...]]:
    """Triangles (m,) whose normals are taken from the file, and what is to be said about it."""
    trusted = np.zeros(len(face), dtype=np.bool_)
    faults: list[Fault] = []
    faceted = []
    for part, number in zip(roles.parts, roles.surface_of_part, strict=True):
        rows = stack.rows(number)  # none if it is ignored: -1
        if part.corner_normals is None or not smooth[rows].any():
            continue
        surface = roles.surfaces[number]
        given = stack.file_normals[rows]
        cosine = np.einsum("kci,ki->kc", given, face[rows])
        not_unit = int(np.isnan(cosine).any(axis=1).sum())
        steep = int((np.abs(cosine) < np.cos(CREASE_RAD)).any(axis=1).sum())
        if not_unit or steep:
            faults.append(_bad_normals(surface.name, not_unit, steep, len(rows)))
        elif not has_curved_normals(part):
            faceted.append(surface.name)
        else:
            trusted[rows] = True
            if against := int((cosine < 0.0).any(axis=1).sum()):
                faults.append(_turned_normals(surface.name, against))
    assumed: tuple[str, ...] = ()
    if faceted:
        shown = ", ".join(faceted[:3]) + (f" and {len(faceted) - 3} more" if faceted[3:] else "")
        assumed = (
            f"The normals in the file are those of flat faces though {shown} is said to be "
            "smooth: its normals are fitted to the mesh.",
        )
    return trusted, tuple(faults), assumed


def _bad_normals(name: str, not_unit: int, steep: int, total: int) -> Fault:
    why = f"{not_unit} of {total} triangles have normals that are not of unit length"
    if not not_unit:
        angle = round(np.degrees(CREASE_RAD))
        why = f"{steep} of {total} triangles have normals more than {angle} degrees off their face"
    return Fault(
        kind="normals_not_used",
        count=not_unit or steep,
        surface=name,
        message=f"{name}: {why}; the file's normals are not used, they are fitted to the mesh.",
        hint="Export normals with at least four decimals, and with sharp edges kept sharp.",
    )


def _turned_normals(name: str, count: int) -> Fault:
    return Fault(
        kind="normals_against_winding",
        count=count,
        surface=name,
        message=f"{name}: {count} triangles have normals on the back of their face; "
        "these were turned to the front.",
        hint="Recalculate the face directions so that all fronts point outdoors.",
    )
