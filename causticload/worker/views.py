"""Results as a host draws them: geometry, values and the engine's own colours, as arrays."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from causticload.hazard.exceed import CriterionMap
from causticload.light.field import Field
from causticload.light.prepare import LitScene
from causticload.light.tally import Moment, StepLight
from causticload.output import meshes
from causticload.output.colours import CHANGE_MAP, LOAD_MAP, REFLECTOR, map_colours, round_end
from causticload.output.results import Instant, InstantSun, ReceiverYear
from causticload.run import Project
from causticload.scene.model import Bools, Floats, Scene

# What can be shown of an instant and of a year: its words and its unit.
INSTANT_QUANTITIES = {
    "reflected": ("Reflected load", "W/m²"),
    "total": ("Total load", "W/m²"),
    "images": ("Images of the sun", ""),
}
YEAR_QUANTITIES = {
    "peak": ("Peak reflected load", "W/m²"),
    "hours": ("Time over the limit", "h/year"),
    "images": ("Most images of the sun", ""),
}
SCALE_STEPS = 64
RAYS_SHOWN = 400
SUN_RAY_M = 12.0  # how much of a ray is drawn before it meets its panel


def receiver_geometry(scene: Scene) -> tuple[list[dict[str, Any]], dict[str, Any]]:
    """Cells of each receiver, in the order of its points, a little off its surface.

    Parameters
    ----------
    scene : Scene
        The scene.

    Returns
    -------
    records : list of dict
        One a receiver: its name, its number of points, the prefix of its arrays.
    arrays : dict of str to array
        ``vertices`` (k, 3) in metres, model coordinates; ``quads`` (n, 4).
    """
    records: list[dict[str, Any]] = []
    arrays: dict[str, Any] = {}
    for number, surface in enumerate(scene.surfaces):
        charts = [c for c in scene.charts if c.surface == number]
        if not charts:
            continue
        cells = meshes.cells_of(scene, charts)
        lift = np.zeros_like(cells.vertices)
        lift[cells.quads] = meshes.RAISE_M * cells.normals[:, None]
        prefix = f"r{len(records)}"
        arrays[f"{prefix}/vertices"] = cells.vertices + lift
        arrays[f"{prefix}/quads"] = cells.quads.astype(np.uint32)
        records.append(
            {
                "name": surface.name,
                "kind": surface.kind,
                "points": len(cells.quads),
                "spacing_m": surface.spacing,
                "prefix": prefix,
            }
        )
    return records, arrays


def facade_geometry(scene: Scene) -> dict[str, Any]:
    """Triangles of the reflectors.

    Parameters
    ----------
    scene : Scene
        The scene.

    Returns
    -------
    arrays : dict of str to array
        ``triangles`` (k, 3, 3) in metres, model coordinates; ``panel`` (k,); ``surface`` (k,);
        ``source`` (k,) row of the triangle in its object as it was sent.
    """
    r = scene.reflectors
    lift = meshes.RAISE_M * scene.corner_normals[r].mean(axis=1, keepdims=True)
    source = scene.source_triangle[r] if len(scene.source_triangle) else np.full(len(r), -1)
    return {
        "facade/triangles": scene.triangles[r] + scene.origin + lift,
        "facade/panel": scene.panel[r].astype(np.int32),
        "facade/surface": scene.surface[r].astype(np.int32),
        "facade/source": source.astype(np.int32),
    }


def make_scale(
    values: Sequence[Floats], *, label: str, unit: str, marks: Sequence[Mapping[str, Any]] = ()
) -> dict[str, Any]:
    """Choose a scale for values: its ends, its colours, the limits that lie on it.

    Parameters
    ----------
    values : sequence of (n,) float
        What is to be shown.
    label, unit : str
        Words beside it.
    marks : sequence of mapping
        Limits, with ``value`` and ``name``.

    Returns
    -------
    scale : dict
        Ready for JSON.
    """
    top = max((float(np.nanmax(v, initial=0.0)) for v in values), default=0.0)
    high = float(max(np.ceil(top), 1.0)) if unit == "" else round_end(top)
    colours = map_colours(np.linspace(0.0, high, SCALE_STEPS), low=0.0, high=high, name=LOAD_MAP)
    return {
        "label": label,
        "unit": unit,
        "low": 0.0,
        "high": high,
        "colours": colours[:, :3].tolist(),
        "marks": [m for m in marks if 0.0 < m["value"] <= high],
    }


def limit_marks(criteria: CriterionMap) -> list[dict[str, Any]]:
    """Limits that can be drawn on a scale of loads.

    Parameters
    ----------
    criteria : CriterionMap
        Which hold.

    Returns
    -------
    marks : list of dict
        Value, name and bounded quantity.
    """
    return [{"value": c.limit, "name": c.name, "quantity": c.quantity} for c in criteria.criteria]


def moment_of(lit: LitScene, instant: Instant) -> Moment:
    """An instant as the criteria see it.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.
    instant : Instant
        The instant.

    Returns
    -------
    moment : Moment
        Its load, sun and sky.
    """
    load = np.zeros(len(lit.point_areas))
    images = np.zeros(len(load), np.int32)
    for r in instant.receivers.values():
        mine = lit.point_surface == lit.point_surface[r.first]
        load[mine], images[mine] = r.reflected / instant.sun.beam, r.images
    return Moment(
        StepLight(lit, Field(load, images, {}), instant.sun.direction),
        time=np.datetime64("NaT") if instant.sun.time is None else instant.sun.time,
        beam=instant.sun.beam,
        diffuse=instant.sun.diffuse,
        temperature_c=np.nan,
        wind_ms=np.nan,
        minutes=0.0,
    )


def points_over(moment: Moment, criteria: CriterionMap) -> Bools:
    """Points that are over any criterion that holds for them.

    Parameters
    ----------
    moment : Moment
        From :func:`moment_of`.
    criteria : CriterionMap
        Which hold where.

    Returns
    -------
    over : (n,) bool
        One value a point of the scene.
    """
    lit = moment.light.lit
    over = np.zeros(len(lit.point_areas), bool)
    for c, holds in zip(criteria.criteria, criteria.holds, strict=True):
        index, _ = moment.points_over(c.limit, total=c.quantity == "total irradiance")
        over[index[holds[lit.point_surface[index]]]] = True
    return over


def instant_arrays(
    project: Project, instant: Instant, quantity: str
) -> tuple[dict[str, Any], dict[str, Any]]:
    """Values and colours of an instant.

    Parameters
    ----------
    project : Project
        What it was solved for.
    instant : Instant
        The instant.
    quantity : str
        Of ``INSTANT_QUANTITIES``: what the colours show.

    Returns
    -------
    arrays : dict of str to array
        Per receiver, in the order of :func:`receiver_geometry`: ``reflected`` (n,), ``images``
        (n,), ``over`` (n,), ``colours`` (n, 4) uint8 and, if it is shown, ``total`` (n,).
    scale : dict
        From :func:`make_scale`.
    """
    lit = project.lit
    criteria = CriterionMap(lit, project.study.criteria)
    moment = moment_of(lit, instant)
    over = points_over(moment, criteria)
    arrays: dict[str, Any] = {}
    shown: list[Floats] = []
    for k, r in enumerate(sorted(instant.receivers.values(), key=lambda r: r.first)):
        index = np.flatnonzero(lit.point_surface == lit.point_surface[r.first])
        arrays[f"r{k}/reflected"] = r.reflected
        arrays[f"r{k}/images"] = r.images.astype(np.int32)
        arrays[f"r{k}/over"] = over[index]
        if quantity == "total":
            arrays[f"r{k}/total"] = moment.total(index)
        shown.append(np.asarray(arrays[f"r{k}/{quantity}"], float))
    label, unit = INSTANT_QUANTITIES[quantity]
    scale = make_scale(shown, label=label, unit=unit, marks=limit_marks(criteria) if unit else ())
    _colour(arrays, shown, scale)
    return arrays, scale


def year_arrays(
    receivers: Mapping[str, ReceiverYear], quantity: str, criterion: str, criteria: CriterionMap
) -> tuple[dict[str, Any], dict[str, Any]]:
    """Values and colours of a year.

    Parameters
    ----------
    receivers : mapping of str to ReceiverYear
        Of the year.
    quantity : str
        Of ``YEAR_QUANTITIES``: what the colours show.
    criterion : str
        Whose hours are meant; empty for any, the longest.
    criteria : CriterionMap
        Which hold.

    Returns
    -------
    arrays : dict of str to array
        Per receiver: ``peak``, ``hours``, ``images``, ``over``, ``colours``.
    scale : dict
        From :func:`make_scale`.
    """
    arrays: dict[str, Any] = {}
    shown: list[Floats] = []
    for k, r in enumerate(sorted(receivers.values(), key=lambda r: r.first)):
        nothing = np.zeros(len(r.areas))
        names = [n for n in r.minutes_over if criterion in ("", n)]
        arrays[f"r{k}/peak"] = r.peak_reflected
        arrays[f"r{k}/hours"] = (
            np.max([nothing, *(r.minutes_over[n] for n in names)], axis=0) / 60.0
        )
        arrays[f"r{k}/images"] = r.images.astype(np.int32)
        over = np.zeros(len(r.areas), bool)
        for n in names:
            over |= r.days_over[n] > 0.0
        arrays[f"r{k}/over"] = over
        shown.append(np.asarray(arrays[f"r{k}/{quantity}"], float))
    label, unit = YEAR_QUANTITIES[quantity]
    if quantity == "hours":
        label += f": {criterion}" if criterion else ", the longest of all limits"
    marks = limit_marks(criteria) if unit == "W/m²" else ()
    scale = make_scale(shown, label=label, unit=unit, marks=marks)
    _colour(arrays, shown, scale)
    return arrays, scale


def _colour(arrays: dict[str, Any], shown: Sequence[Floats], scale: Mapping[str, Any]) -> None:
    for k, values in enumerate(shown):
        arrays[f"r{k}/colours"] = map_colours(values, low=scale["low"], high=scale["high"])


def mark_quads(scene: Scene, over: Bools) -> Floats:
    """Ribbons and hatching on what is over a limit, so that colour is not alone.

    Parameters
    ----------
    scene : Scene
        The scene.
    over : (n,) bool
        One value a point of the scene.

    Returns
    -------
    quads : (q, 4, 3) float
        Model coordinates. [m]
    """
    return meshes.flag_marks(meshes.cells_of(scene), over)


def facade_arrays(
    scene: Scene, panel_load: Any, label: str
) -> tuple[dict[str, Any], dict[str, Any]]:
    """Contributions and colours of the facade.

    Parameters
    ----------
    scene : Scene
        The scene.
    panel_load : (p,) array
        What each panel adds. [W/m²]
    label : str
        Words beside the scale.

    Returns
    -------
    arrays : dict of str to array
        ``facade/contribution`` (k,) and ``facade/colours`` (k, 4), one row a triangle.
    scale : dict
        From :func:`make_scale`.
    """
    values = np.asarray(panel_load, float)[scene.panel[scene.reflectors]]
    scale = make_scale([values], label=label, unit="W/m²")
    colours = map_colours(values, low=0.0, high=scale["high"])
    colours[values <= 0.0] = REFLECTOR
    return {"facade/contribution": values, "facade/colours": colours}, scale


def change_colours(values: Floats) -> tuple[Any, dict[str, Any]]:
    """Colours of a difference, and its scale: the same reach both ways.

    Parameters
    ----------
    values : (n,) float
        Later less earlier.

    Returns
    -------
    colours : (n, 4) uint8
        As shown on a display.
    scale : dict
        Ready for JSON.
    """
    reach = round_end(float(np.nanmax(np.abs(values), initial=0.0)))
    steps = np.linspace(-reach, reach, SCALE_STEPS)
    bar = map_colours(steps, low=-reach, high=reach, name=CHANGE_MAP)
    scale = {
        "label": "Change",
        "unit": "W/m²",
        "low": -reach,
        "high": reach,
        "colours": bar[:, :3].tolist(),
        "marks": [],
    }
    return map_colours(values, low=-reach, high=reach, name=CHANGE_MAP), scale


def ray_lines(
    project: Project, sun: InstantSun, place: Floats, starts: Floats, loads: Floats
) -> Floats:
    """Rays from the sun by way of the facade to a spot, the strongest ones.

    Parameters
    ----------
    project : Project
        The scene.
    sun : InstantSun
        Where they come from.
    place : (3,) float
        The spot, scene frame. [m]
    starts : (q, 3) float
        Where on the facade they turn, scene frame. [m]
    loads : (q,) float
        What each brings.

    Returns
    -------
    lines : (r, 3, 3) float
        Towards the sun, at the panel, at the spot; model coordinates. [m]
    """
    order = np.argsort(-loads)
    if len(order) > RAYS_SHOWN:  # an even choice: the strongest alone would be one bundle
        order = order[np.linspace(0, len(order) - 1, RAYS_SHOWN).astype(int)]
    turn = starts[order]
    lines = np.stack(
        [turn + SUN_RAY_M * sun.direction, turn, np.broadcast_to(place, turn.shape)], axis=1
    )
    moved: Floats = lines + project.scene.origin
    return moved
