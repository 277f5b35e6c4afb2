"""Peaks looked at closely: finer in space and time, counted with random rays, and traced back
to the panels behind them.

A grid maximum is not the peak: the sun's image 30 m away is about one cell wide, and in five
minutes it moves by more than that.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from causticload.hazard.findings import Contributor, Episode, PeakCheck
from causticload.light.count import count_spot
from causticload.light.field import Bounced, solve_field
from causticload.light.points import PointLight, solve_points
from causticload.light.prepare import LitScene
from causticload.light.tally import diffuse_on
from causticload.scene.model import Bools, Chart, Floats

# The field is solved again on a grid this many times finer than the sun's radius there...
FIRST_GRID, LAST_GRID = 3, 12
# ...until the peak moves by less than this.
SETTLED = 0.02
# Half the side of the square searched about the grid's maximum, in cells and at least in metres.
SEARCH_CELLS, SEARCH_M = 3.0, 1.2
AGREE_SIGMA = 3.0
RAYS = 400_000
MOST_CONTRIBUTORS = 4000


@dataclass(frozen=True)
class SunState:
    """The sun at one minute, as a peak is looked at."""

    direction: Floats  # (3,) unit, scene frame
    azimuth_rad: float
    elevation_rad: float
    radius_rad: float
    beam: float  # W/m²
    diffuse: float  # W/m²


SunAt = Callable[[np.datetime64], SunState]


class _Spot:
    """The neighbourhood of a peak on its chart."""

    def __init__(self, lit: LitScene, point: int) -> None:
        self.lit = lit
        self.chart = _chart_of(lit, point)
        self.middle = lit.points[point]

    def grid(self, middle: Floats, half: float, step: float) -> Floats:
        """Points of a square grid on the chart about ``middle``, (p, 3)."""
        n = max(1, int(np.ceil(half / step)))
        line = np.arange(-n, n + 1) * step
        a, b = (v.ravel() for v in np.meshgrid(line, line, indexing="ij"))
        points = middle + a[:, None] * self.chart.u + b[:, None] * self.chart.v
        return points[self.on_chart(points)]

    def disc(self, middle: Floats, radius: float, count: int = 192) -> Floats:
        """Points spread evenly over a disc on the chart, (count, 3): a sunflower's pattern."""
        k = np.arange(count) + 0.5
        r, turn = radius * np.sqrt(k / count), k * np.pi * (3.0 - np.sqrt(5.0))
        return (
            middle
            + (r * np.cos(turn))[:, None] * self.chart.u
            + (r * np.sin(turn))[:, None] * self.chart.v
        )

    def on_chart(self, points: Floats) -> Bools:
        """Which points lie on a cell of the chart, (p,)."""
        c = self.chart
        i = np.floor((points - c.origin) @ c.u / c.spacing).astype(int)
        j = np.floor((points - c.origin) @ c.v / c.spacing).astype(int)
        nu, nv = c.cell.shape
        inside = (i >= 0) & (i < nu) & (j >= 0) & (j < nv)
        return inside & (c.cell[np.clip(i, 0, nu - 1), np.clip(j, 0, nv - 1)] >= 0)

    def light(
        self, points: Floats, sun: SunState, bounced: list[Bounced], *, follow_waves: bool = True
    ) -> PointLight:
        """Reflected light at points on the chart."""
        return solve_points(
            self.lit,
            sun_direction=sun.direction,
            sun_radius=sun.radius_rad,
            points=points,
            normals=np.broadcast_to(self.chart.normal, points.shape),
            bounced=bounced,
            follow_waves=follow_waves,
        )

    def second(self, sun: SunState) -> list[Bounced]:
        """Beams after a second reflection under this sun."""
        return solve_field(self.lit, sun_direction=sun.direction, sun_radius=sun.radius_rad).bounced


def _chart_of(lit: LitScene, point: int) -> Chart:
    firsts = np.array([c.first for c in lit.scene.charts])
    return lit.scene.charts[int(np.searchsorted(firsts, point, side="right")) - 1]


def look_closely(
    lit: LitScene, episode: Episode, *, sun_at: SunAt, step_minutes: float, seed: int
) -> Episode:
    """Refine an episode's peak, count it, and name the panels behind it.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.
    episode : Episode
        As it was found on the grid.
    sun_at : callable
        Gives the sun at a time.
    step_minutes : float
        Step of the year: the peak is sought within it, to the minute. [min]
    seed : int
        Seed of the ray count.

    Returns
    -------
    episode : Episode
        With ``check`` and ``contributors``; its peak is the refined one.
    """
    top = max(episode.path, key=lambda s: s.peak)
    spot = _Spot(lit, top.point)
    time, sun, place, light = _search(spot, top.time, sun_at, step_minutes)
    bounced = spot.second(sun)
    place, light, width = _sharpen(spot, sun, place, bounced, light)
    reflected = float(light.load.max()) * sun.beam
    low, high = light.limits(int(light.load.argmax()))
    check = _count(spot, sun, place, bounced, seed)
    direct, diffuse = _plain_sun(spot, sun, place)
    scene = lit.scene
    check = replace(
        check,
        time=time,
        place=_tuple(place + scene.origin),
        reflected=reflected,
        reflected_low=low * sun.beam,
        reflected_high=high * sun.beam,
        total=reflected + direct + diffuse,
        images=int(light.images[light.load.argmax()]),
        width=width,
    )
    return replace(episode, check=check, contributors=_contributors(lit, light, sun.beam))


def _search(
    spot: _Spot, start: np.datetime64, sun_at: SunAt, step_minutes: float
) -> tuple[np.datetime64, SunState, Floats, PointLight]:
    """Find the minute and the place of the largest load about the grid's maximum."""
    half = max(SEARCH_M, SEARCH_CELLS * spot.chart.spacing)
    minutes = np.arange(-int(step_minutes // 2), int(step_minutes // 2) + 1)
    best: tuple[np.datetime64, SunState, Floats, PointLight] | None = None
    highest = -1.0
    for minute in minutes:
        time = start + np.timedelta64(int(minute) * 60, "s")
        sun = sun_at(time)
        if sun.beam <= 0.0:
            continue
        points = spot.grid(spot.middle, half, half / 8.0)
        # Which minute it is, the mean over a wave's phases tells as well and sooner.
        light = spot.light(points, sun, [], follow_waves=False)
        load = light.load.max() * sun.beam
        if load > highest:
            highest = load
            best = (time, sun, points[light.load.argmax()], light)
    if best is None:  # the sun sets within the step: stay with the grid's own moment
        sun = sun_at(start)
        points = spot.grid(spot.middle, half, half / 8.0)
        best = (start, sun, spot.middle, spot.light(points, sun, []))
    return best


def _image_radius(light: PointLight, radius_rad: float) -> float:
    """Radius of the sun's image at the point of the largest load. [m]"""
    mine = light.parts.point == light.load.argmax()
    if not mine.any():
        return 0.1
    far = np.average(light.parts.distance[mine], weights=light.parts.load[mine])
    return max(0.005, float(far) * np.tan(radius_rad))


def _sharpen(
    spot: _Spot, sun: SunState, place: Floats, bounced: list[Bounced], light: PointLight
) -> tuple[Floats, PointLight, float]:
    """Solve on finer grids about the peak until it stays; also its width at half height."""
    rho = _image_radius(light, sun.radius_rad)
    half = max(spot.chart.spacing, 2.0 * rho)
    last = -1.0
    n = FIRST_GRID
    width = 0.0
    while True:
        points = spot.grid(place, half, min(rho / n, half / 2.0))
        light = spot.light(points, sun, bounced)
        peak = float(light.load.max(initial=0.0))
        place = points[light.load.argmax()]
        step = min(rho / n, half / 2.0)
        width = 2.0 * float(np.sqrt((light.load > 0.5 * peak).sum() * step**2 / np.pi))
        if abs(peak - last) <= SETTLED * peak or n >= LAST_GRID:
            return place, light, width
        last, n = peak, 2 * n
        half = max(rho, half / 2.0)


def _count(
    spot: _Spot, sun: SunState, place: Floats, bounced: list[Bounced], seed: int
) -> PeakCheck:
    """Set tubes and random rays side by side on a small disc about the peak."""
    lit = spot.lit
    rho = _image_radius(spot.light(place[None], sun, bounced), sun.radius_rad)
    radius = max(0.01, 0.5 * rho)
    disc = spot.light(spot.disc(place, radius), sun, bounced)
    mean = float(disc.load.mean()) * sun.beam
    count = count_spot(
        lit,
        sun_direction=sun.direction,
        sun_radius=sun.radius_rad,
        centre=place,
        normal=spot.chart.normal,
        radius_m=radius,
        rays=RAYS,
        seed=seed,
        second=bool(bounced),
    )
    error = count.standard_error * sun.beam
    return PeakCheck(
        time=np.datetime64("NaT"),
        place=(0.0, 0.0, 0.0),
        normal=_tuple(spot.chart.normal),
        sun_azimuth=float(np.degrees(sun.azimuth_rad)),
        sun_elevation=float(np.degrees(sun.elevation_rad)),
        beam=sun.beam,
        reflected=0.0,
        total=0.0,
        images=0,
        width=0.0,
        disc_radius=radius,
        disc_mean=mean,
        count_mean=count.mean * sun.beam,
        count_error=error,
        rays=count.rays,
        agrees=abs(mean - count.mean * sun.beam) <= AGREE_SIGMA * error,
    )


def _plain_sun(spot: _Spot, sun: SunState, place: Floats) -> tuple[float, float]:
    """Direct and diffuse irradiance at a point of the chart. [W/m²]"""
    lit, n = spot.lit, spot.chart.normal
    cos = max(0.0, float(n @ sun.direction))
    start = (place + lit.clearance_m * n)[None]
    if cos > 0.0 and lit.tracer.occluded(start, np.ascontiguousarray(sun.direction)[None])[0]:
        cos = 0.0
    diffuse = diffuse_on(n[2:], beam=sun.beam, diffuse=sun.diffuse, sun_up=float(sun.direction[2]))
    return sun.beam * cos, float(diffuse[0])


def _contributors(lit: LitScene, light: PointLight, beam: float) -> tuple[Contributor, ...]:
    """Panels behind the largest load, the strongest first; their loads sum to it."""
    parts = light.parts
    mine = parts.point == light.load.argmax()
    panels, inverse = np.unique(parts.panel[mine], return_inverse=True)
    load = np.bincount(inverse, weights=parts.load[mine]) * beam
    total = load.sum()
    scene = lit.scene
    return tuple(
        Contributor(
            panel=int(panels[i]),
            surface=scene.surfaces[scene.panels.surface[panels[i]]].name,
            load=float(load[i]),
            share=float(load[i] / total),
            place=_tuple(scene.panels.centroid[panels[i]] + scene.origin),
        )
        for i in np.argsort(-load)[:MOST_CONTRIBUTORS]
    )


def _tuple(x: Floats) -> tuple[float, float, float]:
    return (float(x[0]), float(x[1]), float(x[2]))
