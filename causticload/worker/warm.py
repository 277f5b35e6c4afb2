"""Keeps what is warm: only what depends on shapes and roles is made anew when they change."""

from __future__ import annotations

from dataclasses import replace
from math import radians

import numpy as np

from causticload.run import Project
from causticload.scene.build import LARGE_POINTS
from causticload.scene.model import Scene
from causticload.scene.topology import face_normals
from causticload.sky.source import Sky
from causticload.study.model import Study


def relit(project: Project, study: Study) -> Project | None:
    """Put another sky over a scene that stands.

    Parameters
    ----------
    project : Project
        What is warm.
    study : Study
        The same shapes, roles, finishes and figures; any site, sky, year, observers, criteria.

    Returns
    -------
    project : Project or None
        None where the sun's track has a hand in the scene, so that it must be made anew.
    """
    old = project.study
    track = (study.site, study.year.year) != (old.site, old.year.year)
    if study.observers != old.observers or (track and _cut_by_reach(project.scene)):
        return None
    # Altitude since sealing bows panes.
    if project.scene.figures is not None and study.site.elevation != old.site.elevation:
        return None
    sky = Sky.from_study(study)
    scene = replace(project.scene, north_rad=radians(study.site.model_north))
    lit = project.lit.under(scene, sky.disc)
    assumed = dict.fromkeys(
        [*sky.assumed, *(a for a in project.assumed if a not in project.sky.assumed)]
    )
    return Project(study, scene, lit, sky, tuple(assumed))


def _cut_by_reach(scene: Scene) -> bool:
    """Whether a receiver is so large that it may be sampled only where light can reach."""
    _, area = face_normals(scene.triangles)
    of = np.bincount(scene.surface, weights=area, minlength=len(scene.surfaces))
    return any(
        "receiver" in s.roles and s.spacing > 0.0 and of[i] / s.spacing**2 > LARGE_POINTS
        for i, s in enumerate(scene.surfaces)
    )
