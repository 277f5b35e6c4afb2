"""A season looked at closely: history at its worst peak, effects, cure and confidence."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from causticload.errors import InputError
from causticload.hazard.effects import (
    assess_skin,
    assess_surface,
    grade,
    least_panels,
    material_of,
)
from causticload.hazard.findings import Episode, Finding, PeakCheck, Season
from causticload.hazard.histories import AirAt, History, follow_place
from causticload.hazard.peaks import SunAt
from causticload.light.prepare import LitScene
from causticload.scene.model import Floats


class SurfaceHistory(NamedTuple):
    """Loads at a place through a day, and how hot it gets. ``n`` times."""

    loads: History
    surface_c: Floats  # (n,) °C
    without_c: Floats  # (n,) °C, without the facade


def look_further(
    lit: LitScene,
    season: Season,
    episode: Episode,
    *,
    daylight: tuple[np.datetime64, np.datetime64],
    sun_at: SunAt,
    air_at: AirAt,
    tessellation_share: float,
    weather: bool,
) -> tuple[Finding, SurfaceHistory]:
    """Say what a season's worst peak does to people and things, and what would cure it.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.
    season : Season
        The season.
    episode : Episode
        Its worst episode, looked at closely.
    daylight : (datetime64, datetime64)
        First and last step of the episode's day, UTC.
    sun_at, air_at : callable
        Give the sun, and air temperature and wind, at times.
    tessellation_share : float
        Shift of an image that the mesh leaves open, over the diameter of the sun's image. [1]
    weather : bool
        Whether a weather file was used.

    Returns
    -------
    finding : Finding
        What it is.
    history : SurfaceHistory
        Loads and temperatures at the peak's place through the day.

    Raises
    ------
    InputError
        If the episode was not looked at closely.
    """
    check = episode.check
    if check is None:
        raise InputError(f"episode {episode.number} was not looked at closely")
    place = np.asarray(check.place) - lit.scene.origin
    normal = np.asarray(check.normal)
    first, last = daylight
    loads = follow_place(
        lit, place=place, normal=normal, first=first, last=last, sun_at=sun_at, air_at=air_at
    )
    surface = next(s for s in lit.scene.surfaces if s.name == episode.receiver)
    thing = material_of(surface.kind, surface.material)
    heat, hot, plain = assess_surface(loads, thing=thing, normal_up=float(normal[2]))
    total = episode.peak > episode.reflected * (1.0 + 1e-9)
    finding = Finding(
        season=season.number,
        confidence=grade(
            episode,
            tessellation_share=tessellation_share,
            glass_range=_glass_range(check),
            weather=weather,
        ),
        least_panels=least_panels(
            episode.contributors,
            reflected=check.reflected,
            other=check.total - check.reflected if total else 0.0,
            limit=episode.limit,
        ),
        skin=assess_skin(loads, check) if episode.protects == "people: skin" else None,
        surface=heat,
    )
    return finding, SurfaceHistory(loads, hot, plain)


def _glass_range(check: PeakCheck) -> float:
    """Half of what an unknown angular law leaves open, over the reflected load."""
    if check.reflected <= 0.0 or check.reflected_low is None or check.reflected_high is None:
        return 0.0
    return 0.5 * (check.reflected_high - check.reflected_low) / check.reflected
