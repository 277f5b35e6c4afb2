"""The load at one place through one day: what skin doses and temperatures are driven by.

A hot spot moves: a place that is bright at the peak is dark some minutes later. The field at the
place is solved anew for each time, coarsely through the day and to the minute while it is bright.
"""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from causticload.hazard.peaks import SunAt, SunState
from causticload.light.points import solve_points
from causticload.light.prepare import LitScene
from causticload.light.tally import diffuse_on
from causticload.scene.model import Floats

COARSE_MIN, FINE_MIN = 10, 1
# Intervals are refined where the reflected load at an end is over this share of the day's peak.
BRIGHT = 0.05

AirAt = Callable[[NDArray[np.datetime64]], tuple[Floats, Floats]]


class History(NamedTuple):
    """Loads at a place through a day. ``n`` times."""

    time: NDArray[np.datetime64]  # (n,) UTC, s
    reflected: Floats  # (n,) W/m², first reflections
    direct: Floats  # (n,) W/m²
    diffuse: Floats  # (n,) W/m²
    air_c: Floats  # (n,) °C
    wind: Floats  # (n,) m/s

    @property
    def plain(self) -> Floats:
        """Load of sun and sky without the facade, (n,). [W/m²]"""
        return self.direct + self.diffuse

    @property
    def total(self) -> Floats:
        """Whole load, (n,). [W/m²]"""
        return self.plain + self.reflected

    @property
    def seconds(self) -> Floats:
        """Seconds since the first time, (n,)."""
        return (self.time - self.time[0]) / np.timedelta64(1, "s")


def follow_place(
    lit: LitScene,
    *,
    place: Floats,
    normal: Floats,
    first: np.datetime64,
    last: np.datetime64,
    sun_at: SunAt,
    air_at: AirAt,
) -> History:
    """Find the loads at a place through a day.

    Second reflections are left out: they would need the whole field at every time.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.
    place, normal : (3,) float
        Point and unit normal of its lit side, scene frame. [m]
    first, last : datetime64
        Ends of the time looked at, UTC.
    sun_at : callable
        Gives the sun at a time.
    air_at : callable
        Gives air temperature [°C] and wind [m/s] at times (n,).

    Returns
    -------
    history : History
        Every ten minutes, and every minute while it is bright.
    """
    known: dict[int, tuple[float, float, float]] = {}
    start = first.astype("datetime64[m]")
    length = int((last.astype("datetime64[m]") - start) / np.timedelta64(1, "m"))

    def ask(minutes: set[int]) -> None:
        for minute in sorted(minutes - known.keys()):
            sun = sun_at((start + np.timedelta64(minute, "m")).astype("datetime64[s]"))
            known[minute] = _loads(lit, place, normal, sun)

    coarse = sorted({*range(0, length + 1, COARSE_MIN), length})
    ask(set(coarse))
    bright = BRIGHT * max(reflected for reflected, _, _ in known.values())
    for a, b in pairwise(coarse):
        if max(known[a][0], known[b][0]) > bright:
            ask(set(range(a, b, FINE_MIN)))
    minutes = np.array(sorted(known))
    loads = np.array([known[int(m)] for m in minutes])
    time = (start + minutes.astype("timedelta64[m]")).astype("datetime64[s]")
    air, wind = air_at(time)
    return History(time, loads[:, 0], loads[:, 1], loads[:, 2], air, wind)


def _loads(
    lit: LitScene, place: Floats, normal: Floats, sun: SunState
) -> tuple[float, float, float]:
    """Reflected, direct and diffuse irradiance at a place. [W/m²]"""
    if sun.beam <= 0.0 or sun.elevation_rad <= 0.0:
        return 0.0, 0.0, max(0.0, sun.diffuse) * 0.5 * (1.0 + float(normal[2]))
    light = solve_points(
        lit,
        sun_direction=sun.direction,
        sun_radius=sun.radius_rad,
        points=place[None],
        normals=normal[None],
        follow_waves=False,
    )
    cos = max(0.0, float(normal @ sun.direction))
    start = (place + lit.clearance_m * normal)[None]
    shaded = cos == 0.0 or bool(lit.tracer.occluded(start, sun.direction[None])[0])
    diffuse = diffuse_on(
        normal[2:], beam=sun.beam, diffuse=sun.diffuse, sun_up=float(sun.direction[2])
    )
    return (
        float(light.load[0]) * sun.beam,
        0.0 if shaded else cos * sun.beam,
        float(diffuse[0]),
    )
