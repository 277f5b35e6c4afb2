"""From a study to a scene: read, give roles, clean, move home, find panels, lay out receivers."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from math import radians
from typing import Any

import numpy as np

from causticload.errors import MeshError, StudyError
from causticload.scene.charts import make_charts, number_charts
from causticload.scene.faults import check_extent, check_sheets, clean
from causticload.scene.figure import shape_reflectors
from causticload.scene.model import Bools, Chart, Fault, Floats, Ints, Scene, Surface
from causticload.scene.pane_figure import figure_panes
from causticload.scene.reach import reach_bounds
from causticload.scene.read import Part, bounds, read_parts
from causticload.scene.roles import Roles, assign_roles, list_names
from causticload.scene.stack import Stack, stack_parts
from causticload.scene.topology import face_normals
from causticload.study.model import Study

SUN_RADIUS = 4.65e-3  # rad, at the mean distance of the Earth
NEAR_M = 60.0  # up to here the default spacing holds
DEFAULT_SPACING_M = 0.25
SPACING_STEP_M = 0.05
LARGE_POINTS = 400_000  # from here on a level receiver is cut to what light can reach
REACH_M = 400.0  # at 400 m the image of the sun is 3.7 m wide
LEVEL = 0.98  # cosine of the slope
MAX_POINTS = 20_000_000  # of one receiver; some gigabytes in a year's tally


def build_scene(study: Study, *, sun_directions: Floats | None = None) -> Scene:
    """Make the scene of a study.

    Parameters
    ----------
    study : Study
        The study.
    sun_directions : (d, 3) float or None
        Unit vectors to the sun through the year, in the axes of the model: a large level receiver
        is sampled only where their reflections can fall. Without them it is sampled whole.

    Returns
    -------
    scene : Scene
        Triangles in the order of the files, objects and faces.

    Raises
    ------
    MeshError
        If a mesh file cannot be read, or none of its triangles can be used.
    StudyError
        If nothing reflects, or a receiver would need more points than memory can be expected to
        hold.
    """
    parts = read_parts(study.model)
    roles = assign_roles(parts, study.surfaces, study)
    _require_reflector(roles, parts, study)
    stack = stack_parts(roles)
    cleaned = clean(stack.triangles, surface=stack.surface, surfaces=roles.surfaces)
    kept = stack.take(cleaned.keep)
    reflects = _has_role(roles.surfaces, "reflector")[kept.surface]
    if not reflects.any():
        raise MeshError(
            "no triangle of any reflector can be used: all are without area or not finite.",
            where=", ".join(path.name for path in study.model.files),
            hint="Repair the mesh and export it again.",
        )
    origin = _home(kept.triangles[reflects])
    local = replace(kept, triangles=kept.triangles - origin)
    figure = shape_reflectors(local, reflects, roles, cold_bent=_cold_bent(roles.surfaces, study))
    figured = figure_panes(
        triangles=local.triangles[reflects],
        panel=figure.panel[reflects],
        panels=figure.panels,
        surfaces=roles.surfaces,
        figures=study.figures,
        site_elevation_m=study.site.elevation,
    )
    charts, chart, spaced, spacing_said = _lay_out(local, reflects, roles.surfaces, sun_directions)
    low, high = _extent(roles)
    return Scene(
        origin=origin,
        north_rad=radians(study.site.model_north),
        triangles=local.triangles,
        surface=local.surface,
        panel=figure.panel,
        chart=chart,
        corner_normals=figure.corner_normals,
        curvature=figure.curvature,
        surfaces=spaced,
        panels=figure.panels,
        charts=charts,
        faults=(
            *(note for part in parts for note in part.notes),
            *roles.faults,
            *check_extent(low, high, unit=study.model.unit, origin=origin),
            *cleaned.faults,
            *check_sheets(
                local.triangles[reflects],
                surface=local.surface[reflects],
                surfaces=roles.surfaces,
            ),
            *figure.faults,
            *_no_receiver(roles),
        ),
        assumed=(*roles.assumed, *figure.assumed, *figured.assumed, *spacing_said),
        source_triangle=local.source,
        figures=figured.figures,
    )


def _cold_bent(surfaces: Sequence[Surface], study: Study) -> Bools:
    """Which surfaces are of panes bent to their corners, (s,)."""
    bent = np.zeros(len(surfaces), np.bool_)
    for i, surface in enumerate(surfaces):
        settings = study.figures[surface.figure].settings if surface.figure else {}
        bent[i] = bool(settings.get("cold_bent", False))
        if bent[i] and surface.form == "smooth":
            raise StudyError(
                f"{surface.name!r} is smooth: its normals run on from pane to pane, those of "
                "cold-bent panes do not",
                where=f"surface {surface.name!r}: figure",
                hint='Give its rule form = "flat", or the figure no cold_bent.',
            )
    return bent


def _has_role(surfaces: Sequence[Surface], role: str) -> Bools:
    return np.array([role in surface.roles for surface in surfaces], dtype=np.bool_)


def _require_reflector(roles: Roles, parts: Sequence[Part], study: Study) -> None:
    if _has_role(roles.surfaces, "reflector").any():
        return
    raise StudyError(
        "nothing reflects: no surface has the role reflector.",
        where=study.path.name if study.path else "",
        hint='Give one a [[surface]] rule with role = "reflector". ' + list_names(parts),
    )


def _no_receiver(roles: Roles) -> tuple[Fault, ...]:
    if _has_role(roles.surfaces, "receiver").any():
        return ()
    message = "No surface has the role receiver: there is nowhere to show where the light lands."
    hint = 'Give the ground, or what else is to be judged, a rule with role = "receiver".'
    return (Fault(kind="no_receiver", count=1, surface="", message=message, hint=hint),)


def _home(reflectors: Floats) -> Floats:
    """Middle of the reflectors' bounding box, to whole metres."""
    corners = reflectors.reshape(-1, 3)
    middle: Floats = np.round((corners.min(axis=0) + corners.max(axis=0)) / 2.0)
    return middle + 0.0  # no minus zero


def _extent(roles: Roles) -> tuple[Floats, Floats]:
    """Bounding box of what the files hold, without what is ignored and a laid ground."""
    used = zip(roles.parts, roles.surface_of_part, strict=True)
    return bounds([part for part, number in used if part.file and number >= 0])


# --- receivers ---------------------------------------------------------------------------------


def _lay_out(
    stack: Stack, reflects: Bools, surfaces: Sequence[Surface], sun_directions: Floats | None
) -> tuple[tuple[Chart, ...], Ints, tuple[Surface, ...], list[str]]:
    """Charts, chart of each triangle, surfaces with their spacing, and what was assumed."""
    corners = stack.triangles[reflects].reshape(-1, 3)
    box = corners.min(axis=0), corners.max(axis=0)
    chart = np.full(len(stack.surface), -1, dtype=np.int32)
    charts: list[Chart] = []
    spaced = list(surfaces)
    chosen: dict[float, list[str]] = {}
    said_reach: list[str] = []
    for number, surface in enumerate(surfaces):
        rows = stack.rows(number)
        if "receiver" not in surface.roles or not len(rows):
            continue
        spacing = surface.spacing
        if not spacing:
            spacing = _spacing(stack.triangles[rows], *box)
            chosen.setdefault(spacing, []).append(surface.name)
            spaced[number] = replace(surface, spacing=spacing)
        region = None
        if _points(stack.triangles[rows], spacing) > LARGE_POINTS and sun_directions is not None:
            region = _reach(stack.triangles[rows], stack.triangles[reflects], sun_directions)
        if region is None:
            _require_countable(surface.name, stack.triangles[rows], spacing)
        else:
            said_reach.append(
                f"{surface.name} is sampled only where light reflected once can fall within "
                f"{REACH_M:g} m of path."
            )
        found, own = make_charts(
            stack.triangles[rows], surface=number, spacing_m=spacing, region=region
        )
        chart[rows] = np.where(own >= 0, own + len(charts), -1)
        charts += found
    said = [
        f"Sample distance {spacing:g} m is chosen for {', '.join(names[:3])}"
        + (f" and {len(names) - 3} more." if names[3:] else ".")
        for spacing, names in chosen.items()
    ] + said_reach
    return number_charts(charts), chart, tuple(spaced), said


def _points(receiver: Floats, spacing: float) -> float:
    return float(face_normals(receiver)[1].sum()) / spacing**2


def _reach(receiver: Floats, reflectors: Floats, sun_directions: Floats) -> Floats | None:
    """Bounds of what reflected light can reach on a receiver that is level; None for others."""
    normals, _ = face_normals(receiver)
    if np.abs(normals[:, 2]).min() < LEVEL:
        return None
    # The lowest and the highest plane bound what lies between them.
    found = [
        reach_bounds(
            reflectors.mean(axis=1),
            face_normals(reflectors)[0],
            sun_directions,
            plane_point=np.array([0.0, 0.0, height]),
            plane_normal=np.array([0.0, 0.0, 1.0]),
            limit_m=REACH_M,
        )
        for height in (receiver[:, :, 2].min(), receiver[:, :, 2].max())
    ]
    bounds = [b for b in found if b is not None]
    if not bounds:
        return None
    low = np.min([b[0] for b in bounds], axis=0)
    high = np.max([b[1] for b in bounds], axis=0)
    return np.stack([low, high])


def _require_countable(name: str, receiver: Floats, spacing: float) -> None:
    _, areas = face_normals(receiver)
    area = float(areas.sum())
    points = area / spacing**2
    if points > MAX_POINTS:
        wide_enough = float(np.ceil(20.0 * np.sqrt(area / MAX_POINTS)) / 20.0)
        raise StudyError(
            f"receiver {name!r} of {area:.3g} m² sampled every {spacing:g} m would have "
            f"{points / 1e6:.0f} million points; {MAX_POINTS / 1e6:.0f} million are the limit.",
            hint=f"Give its rule spacing = {wide_enough:g} or more, or cut the part that matters "
            "out of it.",
        )


def _spacing(receiver: Floats, low: Floats, high: Floats) -> float:
    """Sample distance: the radius of the sun's image at the nearest reflector, but not finer. [m]

    Distance is that of the bounding boxes, so it is never too long.
    """
    corners = receiver.reshape(-1, 3)
    gap = np.maximum(0.0, np.maximum(low - corners.max(axis=0), corners.min(axis=0) - high))
    distance = float(np.linalg.norm(gap))
    if distance <= NEAR_M:
        return DEFAULT_SPACING_M
    steps = round(SUN_RADIUS * distance / SPACING_STEP_M)
    return round(steps * SPACING_STEP_M, 2)


# --- summary -----------------------------------------------------------------------------------


def inspect_scene(scene: Scene) -> dict[str, Any]:
    """Sum up a scene for people and machines.

    Parameters
    ----------
    scene : Scene
        The scene.

    Returns
    -------
    summary : dict
        Surfaces, faults, extent and counts as plain numbers, strings, lists and dicts. Lengths
        in metres, areas in m², coordinates in the model frame.
    """
    _, area = face_normals(scene.triangles)
    corners = scene.triangles.reshape(-1, 3)
    counts = np.bincount(scene.surface, minlength=len(scene.surfaces))
    areas = np.bincount(scene.surface, weights=area, minlength=len(scene.surfaces))
    panels = np.bincount(scene.panels.surface, minlength=len(scene.surfaces))
    points = np.zeros(len(scene.surfaces), dtype=np.int64)
    for chart in scene.charts:
        points[chart.surface] += len(chart.areas)
    return {
        "surfaces": [
            {
                "name": surface.name,
                "file": surface.file,
                "roles": sorted(surface.roles),
                "form": surface.form if "reflector" in surface.roles else None,
                "finish": surface.finish or None,
                "figure": surface.figure,
                "kind": surface.kind or None,
                "spacing_m": surface.spacing or None,
                "triangles": int(counts[i]),
                "triangles_in_file": surface.triangles,
                "area_m2": float(areas[i]),
                "panels": int(panels[i]),
                "points": int(points[i]),
                "assumed": list(surface.assumed),
            }
            for i, surface in enumerate(scene.surfaces)
        ],
        "triangles": len(scene.triangles),
        "panels": len(scene.panels),
        "flat_panels": int(np.count_nonzero(scene.panels.flat)),
        "charts": len(scene.charts),
        "points": scene.point_count,
        "origin_m": [float(x) for x in scene.origin],
        "low_m": [float(x) for x in corners.min(axis=0) + scene.origin],
        "high_m": [float(x) for x in corners.max(axis=0) + scene.origin],
        "largest_curvature_per_m": float(np.abs(scene.curvature).max()),
        "faults": [
            {
                "kind": fault.kind,
                "count": fault.count,
                "surface": fault.surface,
                "message": fault.message,
                "hint": fault.hint,
            }
            for fault in scene.faults
        ],
        "assumed": list(scene.assumed),
    }
