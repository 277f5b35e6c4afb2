"""The panels behind a spot, and the rays from them to it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from causticload.hazard.findings import Episode
from causticload.light.field import solve_field
from causticload.light.points import solve_points
from causticload.output.results import Instant, InstantSun
from causticload.run import Project
from causticload.scene.model import Floats
from causticload.sky.position import sun_direction
from causticload.worker import views
from causticload.worker.listing import peak_of

MOST_ROWS = 400


@dataclass(frozen=True)
class Spot:
    """A point of a receiver under a sun."""

    place: Floats  # (3,) m, scene frame
    normal: Floats  # (3,) unit
    sun: InstantSun


def spot_of_instant(project: Project, instant: Instant) -> Spot:
    """The hottest point of an instant.

    Parameters
    ----------
    project : Project
        What it was solved for.
    instant : Instant
        The instant.

    Returns
    -------
    spot : Spot
        The point.
    """
    top = max(instant.receivers.values(), key=lambda r: r.reflected.max(initial=-1.0))
    index = int(top.reflected.argmax())
    return Spot(top.points[index] - project.scene.origin, top.normals[index], instant.sun)


def spot_of_episode(project: Project, episode: Episode) -> Spot:
    """The peak of an episode.

    Parameters
    ----------
    project : Project
        What the year was solved for.
    episode : Episode
        The episode.

    Returns
    -------
    spot : Spot
        The refined peak where there is one, else the grid's.
    """
    time, place = peak_of(episode)
    local = np.asarray(place) - project.scene.origin
    top = max(episode.path, key=lambda s: s.peak)
    states = project.sky.at(np.array([time]).astype("datetime64[s]"))
    direction = sun_direction(
        states.azimuth_rad, states.elevation_rad, north_rad=project.scene.north_rad
    )[0]
    sun = InstantSun(
        azimuth=float(np.degrees(states.azimuth_rad[0])),
        elevation=float(np.degrees(states.elevation_rad[0])),
        direction=direction,
        beam=float(states.beam[0]),
        diffuse=float(states.diffuse[0]),
        radius=float(states.radius_rad[0]),
        time=time,
    )
    return Spot(local, project.lit.point_normals[top.point], sun)


def contributors(
    project: Project, spot: Spot
) -> tuple[list[dict[str, Any]], dict[str, Any], dict[str, Any]]:
    """Panels behind a spot.

    Parameters
    ----------
    project : Project
        The scene.
    spot : Spot
        Where and when.

    Returns
    -------
    rows : list of dict
        The strongest panels first.
    arrays : dict of str to array
        ``facade/contribution``, ``facade/colours``, and ``rays`` (r, 3, 3).
    scale : dict
        Of the facade's colours.
    """
    lit, scene, sun = project.lit, project.scene, spot.sun
    field = solve_field(lit, sun_direction=sun.direction, sun_radius=sun.radius)
    light = solve_points(
        lit,
        sun_direction=sun.direction,
        sun_radius=sun.radius,
        points=spot.place[None],
        normals=spot.normal[None],
        bounced=field.bounced,
    )
    parts = light.parts
    load = np.bincount(parts.panel, weights=parts.load, minlength=len(scene.panels)) * sun.beam
    arrays, scale = views.facade_arrays(scene, load, "Contribution to the spot")
    first = ~parts.second  # a second reflection does not come straight from its panel
    starts = spot.place + parts.direction[first] * parts.distance[first, None]
    arrays["rays"] = views.ray_lines(project, sun, spot.place, starts, parts.load[first])
    total = float(load.sum())
    rows = [
        {
            "panel": int(i),
            "surface": scene.surfaces[scene.panels.surface[i]].name,
            "load": float(load[i]),
            "share": float(load[i] / total),
            "place_m": scene.panels.centroid[i] + scene.origin,
        }
        for i in np.argsort(-load)[:MOST_ROWS]
        if load[i] > 0.0
    ]
    return rows, arrays, scale
