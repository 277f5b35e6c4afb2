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


def shape_reflectors(
    stack: Stack, reflects: Bools, roles: Roles, *, cold_bent: Bools | None = None
) -> Figure:
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
    cold_bent : (s,) bool, optional
        Flat surfaces whose quadrilaterals are glass bent to their four corners.

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
    bent = np.zeros(len(face), np.bool_)
    if cold_bent is not None:
        bent = reflects & ~smooth & cold_bent[stack.surface]

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
        stack.triangles[rows], stack.surface[rows], (smooth | bent)[rows], corner_normals[rows]
    )
    if bent.any():
        own = np.flatnonzero(bent & ~panels.flat[panel])
        corner_normals[own] = bilinear_normals(stack.triangles[own], panel[own])
        curvature[own] = curvature_from_normals(stack.triangles[own], corner_normals[own])
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


def bilinear_normals(triangles: Floats, panel: Ints) -> Floats:
    """Corner normals of quadrilaterals bent to four corners that are not in one plane.

    Glass bent that way follows the bilinear patch, which straight lines rule both ways: its
    normal at a corner is across the two edges that meet there. On a parallelogram the patch's
    slope is linear in the plane, so that normals interpolated over the two triangles are those
    of the patch at every point; the triangles themselves lie off it by at most a quarter of the
    fourth corner's distance from the plane of the other three.

    Parameters
    ----------
    triangles : (k, 3, 3) float
        Corners. [m]
    panel : (k,) int
        Their panels: each of two triangles, or of one, which keeps its plane.

    Returns
    -------
    normals : (k, 3, 3) float
        Unit normals on the side of each face's own.
    """
    face, _ = face_normals(triangles)
    normals = np.repeat(face[:, None], 3, axis=1)
    order = np.argsort(panel, kind="stable")
    same = panel[order[:-1]] == panel[order[1:]]
    a, b = order[:-1][same], order[1:][same]
    size = np.linalg.norm(triangles[a, 1] - triangles[a, 0], axis=1)
    gap = np.linalg.norm(triangles[a][:, :, None] - triangles[b][:, None], axis=3)
    joined = gap < 1e-3 * size[:, None, None]
    for own, other, shared in ((a, b, joined.any(axis=2)), (b, a, joined.any(axis=1))):
        partner = joined if own is a else joined.transpose(0, 2, 1)
        row = np.arange(len(own))
        tip = triangles[own][row, (~shared).argmax(axis=1)]
        far = triangles[other][row, (~partner.any(axis=1)).argmax(axis=1)]
        n = np.cross(tip[:, None] - triangles[own], far[:, None] - triangles[own])
        length = np.linalg.norm(n, axis=2, keepdims=True)
        n = np.divide(n, length, out=np.zeros_like(n), where=length > 0.0)
        n *= np.sign(np.einsum("kci,ki->kc", n, face[own]))[:, :, None]
        normals[own] = np.where(shared[:, :, None], n, normals[own])
    return normals


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
