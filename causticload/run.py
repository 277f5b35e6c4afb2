"""From a study to results: the calls of the Python API."""

from __future__ import annotations

import os
import threading
import time as clock
from collections.abc import Sequence
from dataclasses import asdict, dataclass, replace
from datetime import datetime
from typing import Any, Protocol

import numpy as np

from causticload.errors import InputError
from causticload.hazard.exceed import CriterionMap, Exceedance, merge_exceedance
from causticload.hazard.findings import Episode, Finding, Season
from causticload.hazard.further import SurfaceHistory, look_further
from causticload.hazard.observers import EyePoints, EyeWatch, merge_eyes, place_eyes
from causticload.hazard.peaks import SunState, look_closely
from causticload.hazard.seasons import make_seasons, worth_a_close_look
from causticload.light.bvh import Engine
from causticload.light.count import RayCount, count_spot
from causticload.light.field import solve_field
from causticload.light.focus import focus_share
from causticload.light.limits import load_limits
from causticload.light.prepare import LitScene, prepare
from causticload.light.tally import Accumulator, direct_factor, merge_loads
from causticload.light.year import DayResult, run_day, run_days
from causticload.optics.resolve import resolve_finish
from causticload.output.assemble import day_rows, points_by_surface, receiver_years, summarise
from causticload.output.results import (
    Instant,
    InstantSun,
    ReceiverInstant,
    Year,
)
from causticload.scene.build import build_scene
from causticload.scene.model import Floats, Scene
from causticload.scene.tessellation import check_tessellation
from causticload.sky.calendar import parse_local
from causticload.sky.plan import DayPlan, plan_year
from causticload.sky.position import sun_direction
from causticload.sky.source import Sky
from causticload.study.model import Study

# Mean angular radius of the sun, used for a sun that is given by its angles and not by a date.
MEAN_RADIUS = 4.6505e-3
# Beam where neither date nor beam is given: a round figure near the top of clear-sky beams.
ROUND_BEAM = 1000.0


@dataclass
class Project:
    """A study with its scene read and made ready for light; what a worker keeps warm."""

    study: Study
    scene: Scene
    lit: LitScene
    sky: Sky
    assumed: tuple[str, ...]


def open_project(study: Study, *, engine: Engine = "auto") -> Project:
    """Read a study's meshes and make them ready for light.

    Parameters
    ----------
    study : Study
        The study.
    engine : {"auto", "embree", "own"}
        What traces rays.

    Returns
    -------
    project : Project
        Hand it to the solvers in place of the study to spare the reading.

    Raises
    ------
    CausticloadError
        If the study, a mesh or a weather file is wrong.
    """
    sky = Sky.from_study(study)
    scene = build_scene(study, sun_directions=_sun_directions(study, sky))
    finishes = [resolve_finish(s.finish, study.finishes) for s in _reflecting(scene)]
    by_name = {s.name: f for s, f in zip(_reflecting(scene), finishes, strict=True)}
    fallback = finishes[0]
    lit = prepare(
        scene,
        finishes=[by_name.get(s.name, fallback) for s in scene.surfaces],
        disc=sky.disc,
        engine=engine,
    )
    said = [*scene.assumed, *lit.assumed, *sky.assumed]
    for surface, finish in zip(_reflecting(scene), finishes, strict=True):
        said += [f"{surface.name}: {text}" for text in finish.assumed]
    return Project(study, scene, lit, sky, tuple(dict.fromkeys(said)))


def _reflecting(scene: Scene) -> list[Any]:
    return [s for s in scene.surfaces if "reflector" in s.roles]


def _sun_directions(study: Study, sky: Sky) -> Floats:
    """Directions of the sun through the year, a coarse net: where reflected light can reach."""
    year = study.year.year
    days = np.arange(f"{year}-01-01", f"{year + 1}-01-01", 10, dtype="datetime64[D]")
    hours = np.arange(0, 24 * 60, 40).astype("timedelta64[m]")
    times = (days[:, None].astype("datetime64[s]") + hours).ravel()
    suns = sky.at(times)
    up = suns.elevation_rad > np.radians(3.0)
    return sun_direction(
        suns.azimuth_rad[up], suns.elevation_rad[up], north_rad=np.radians(study.site.model_north)
    )


def _as_project(study: Study | Project) -> Project:
    return study if isinstance(study, Project) else open_project(study)


def _sun_at(project: Project, time: np.datetime64) -> SunState:
    """The sun of a study's sky at a time (UTC)."""
    suns = project.sky.at(np.array([time], dtype="datetime64[s]"))
    direction = sun_direction(
        suns.azimuth_rad, suns.elevation_rad, north_rad=project.scene.north_rad
    )
    return SunState(
        direction=direction[0],
        azimuth_rad=float(suns.azimuth_rad[0]),
        elevation_rad=float(suns.elevation_rad[0]),
        radius_rad=float(suns.radius_rad[0]),
        beam=float(suns.beam[0]),
        diffuse=float(suns.diffuse[0]),
    )


def _choose_sun(
    project: Project,
    at: str | datetime | np.datetime64 | None,
    sun: tuple[float, float] | None,
    beam: float | None,
) -> InstantSun:
    if (at is None) == (sun is None):
        raise InputError(
            "give either a time or a sun, and not both",
            where="at, sun",
            hint="For example at='2026-06-21T13:30', or sun=(azimuth, elevation) in degrees.",
        )
    if at is not None:
        if beam is not None:
            raise InputError(
                "a beam goes with a sun given by its angles; at a time the sky gives it",
                where="beam",
            )
        time = _utc(project, at)
        state = _sun_at(project, time)
        if state.elevation_rad <= 0.0:
            raise InputError(
                f"the sun is down at {at} (elevation {np.degrees(state.elevation_rad):.1f}°)",
                where="at",
                hint="Choose a time between sunrise and sunset at the site.",
            )
        return InstantSun(
            azimuth=float(np.degrees(state.azimuth_rad)),
            elevation=float(np.degrees(state.elevation_rad)),
            direction=state.direction,
            beam=state.beam,
            diffuse=state.diffuse,
            radius=state.radius_rad,
            time=time,
        )
    azimuth, elevation = (float(v) for v in sun or ())
    if not (np.isfinite(azimuth) and 0.0 < elevation <= 90.0):
        raise InputError(
            f"sun must be (azimuth, elevation) with 0 < elevation <= 90 degrees, got {sun!r}",
            where="sun",
        )
    if beam is not None and not (np.isfinite(beam) and beam > 0.0):
        raise InputError(f"beam must be > 0 W/m², got {beam!r}", where="beam")
    direction = sun_direction(
        np.radians([azimuth]), np.radians([elevation]), north_rad=project.scene.north_rad
    )
    return InstantSun(
        azimuth=azimuth % 360.0,
        elevation=elevation,
        direction=direction[0],
        beam=ROUND_BEAM if beam is None else float(beam),
        diffuse=0.0,
        radius=MEAN_RADIUS,
    )


def _utc(project: Project, at: str | datetime | np.datetime64) -> np.datetime64:
    if isinstance(at, np.datetime64):
        return at.astype("datetime64[s]")
    text = at if isinstance(at, str) else at.isoformat()
    return parse_local(text, project.study.site.timezone)


def solve_instant(
    study: Study | Project,
    *,
    at: str | datetime | np.datetime64 | None = None,
    sun: tuple[float, float] | None = None,
    beam: float | None = None,
    threads: int | None = None,
) -> Instant:
    """Find the loads for one position of the sun.

    Parameters
    ----------
    study : Study or Project
        The study, or one that is open already.
    at : str, datetime or datetime64, optional
        Local clock time of the site, such as ``2026-06-21T13:30``; with an offset if need be. A
        ``datetime64`` is UTC.
    sun : (float, float), optional
        Azimuth clockwise from true north and elevation, instead of a time. [degrees]
    beam : float, optional
        Direct normal irradiance, with ``sun`` only; 1,000 if it is not given. [W/m²]
    threads : int, optional
        Threads to use; all cores if it is not given.

    Returns
    -------
    instant : Instant
        Loads per receiver, sun, ledger.

    Raises
    ------
    CausticloadError
        If the input is wrong.
    """
    project = _as_project(study)
    state = _choose_sun(project, at, sun, beam)
    lit, scene = project.lit, project.scene
    started = clock.perf_counter()
    field = solve_field(
        lit,
        sun_direction=state.direction,
        sun_radius=state.radius,
        threads=threads or os.cpu_count() or 1,
    )
    seconds = clock.perf_counter() - started
    receivers = {}
    for number, index in points_by_surface(lit).items():
        surface = scene.surfaces[number]

        def direct(index: Any = index) -> Floats:
            return state.beam * direct_factor(lit, state.direction, index)

        def limits(index: Any = index, spacing: float = surface.spacing) -> tuple[float, float]:
            return load_limits(
                lit,
                sun_direction=state.direction,
                sun_radius=state.radius,
                point=int(index[field.load[index].argmax()]),
                spacing_m=spacing,
                bounced=field.bounced,
            )

        receivers[surface.name] = ReceiverInstant(
            name=surface.name,
            kind=surface.kind,
            points=lit.points[index] + scene.origin,
            normals=lit.point_normals[index],
            areas=lit.point_areas[index],
            reflected=field.load[index] * state.beam,
            images=field.images[index],
            first=int(index[0]),
            _direct=direct,
            _limits=limits,
        )
    return Instant(
        study=project.study,
        scene=scene,
        sun=state,
        receivers=receivers,
        ledger={key: value * state.beam for key, value in field.ledger.items()},
        tracer=lit.tracer.name,
        tubes=field.tubes,
        rays=field.rays,
        seconds=seconds,
        assumed=project.assumed,
    )


def count_rays(
    study: Study | Project,
    *,
    receiver: str,
    centre: Sequence[float],
    radius: float,
    sun: tuple[float, float] | None = None,
    at: str | datetime | np.datetime64 | None = None,
    beam: float | None = None,
    rays: int = 2_000_000,
    seed: int = 1,
) -> RayCount:
    """Measure the reflected load on a small disc of a receiver with random rays.

    Parameters
    ----------
    study : Study or Project
        The study, or one that is open already.
    receiver : str
        Name of the receiver that the disc lies on.
    centre : (3,) float
        Middle of the disc, model coordinates; the nearest point of the receiver is taken for its
        plane. [m]
    radius : float
        Radius of the disc, > 0. [m]
    sun : (float, float), optional
        Azimuth and elevation. [degrees]
    at : str, datetime or datetime64, optional
        Local clock time instead of ``sun``.
    beam : float, optional
        Direct normal irradiance, with ``sun`` only; 1,000 if it is not given. [W/m²]
    rays : int
        Number of rays.
    seed : int
        Seed of the random numbers.

    Returns
    -------
    count : RayCount
        ``mean`` and ``standard_error`` over the disc. [W/m²]

    Raises
    ------
    CausticloadError
        If the input is wrong.
    """
    project = _as_project(study)
    state = _choose_sun(project, at, sun, beam)
    lit = project.lit
    names = {s.name: i for i, s in enumerate(project.scene.surfaces) if "receiver" in s.roles}
    if receiver not in names:
        raise InputError(
            f"there is no receiver {receiver!r}",
            where="receiver",
            hint=f"Receivers: {', '.join(sorted(names)) or 'none'}.",
        )
    index = np.flatnonzero(lit.point_surface == names[receiver])
    place = np.asarray(centre, dtype=float) - project.scene.origin
    nearest = index[np.argmin(((lit.points[index] - place) ** 2).sum(axis=1))]
    normal = lit.point_normals[nearest]
    on_plane = place + ((lit.points[nearest] - place) @ normal) * normal
    count = count_spot(
        lit,
        sun_direction=state.direction,
        sun_radius=state.radius,
        centre=on_plane,
        normal=normal,
        radius_m=radius,
        rays=rays,
        seed=seed,
    )
    return replace(
        count, mean=count.mean * state.beam, standard_error=count.standard_error * state.beam
    )


class Progress(Protocol):
    """Hears how far a year is."""

    def __call__(self, stage: str, done: int, total: int) -> None:
        """Hear that ``done`` of ``total`` units of a stage are done."""


class DayStore(Protocol):
    """Keeps finished days, so that an interrupted year can go on."""

    def load(self, index: int) -> DayResult | None:
        """Return a kept day, or None."""

    def save(self, day: DayResult) -> None:
        """Keep a day."""


class Stopped(Exception):  # noqa: N818 - not an error: the user asked for it
    """A year was stopped before its end; finished days are kept in its store."""


def solve_year(
    study: Study | Project,
    *,
    progress: Progress | None = None,
    client: Any = None,
    threads: int | None = None,
    store: DayStore | None = None,
    stop: threading.Event | None = None,
    checks: int = 24,
) -> Year:
    """Screen a whole year.

    Parameters
    ----------
    study : Study or Project
        The study, or one that is open already.
    progress : callable, optional
        Called as ``progress(stage, done, total)``.
    client : dask.distributed.Client, optional
        Sends the days to a cluster instead of to threads.
    threads : int, optional
        Days worked off at once; the number of cores if it is not given.
    store : DayStore, optional
        Where finished days are kept and looked for.
    stop : threading.Event, optional
        Set it to stop.
    checks : int
        Number of seasons whose worst peak is looked at closely and counted.

    Returns
    -------
    year : Year
        Loads, episodes, seasons, summary.

    Raises
    ------
    CausticloadError
        If the input is wrong.
    Stopped
        If ``stop`` was set.
    """
    started = clock.perf_counter()
    project = _as_project(study)
    study, lit = project.study, project.lit
    stop = stop or threading.Event()
    report = progress or (lambda stage, done, total: None)
    plan = plan_year(study.site, study.year, project.sky)
    criteria = CriterionMap(lit, study.criteria)
    eyes = place_eyes(study.observers, origin=project.scene.origin)
    days = _run_plan(project, plan, criteria, eyes, report, client, threads, store, stop)
    loads = merge_loads([d.kept["load"] for d in days])
    over = merge_exceedance([d.kept["exceedance"] for d in days], points=len(lit.point_areas))
    episodes, seasons = make_seasons(
        over["episodes"], zone=study.site.timezone, day_stride=study.year.day_stride
    )
    reported = [s.worst for s in worth_a_close_look(seasons, checks)]
    episodes = _check_peaks(project, episodes, reported, report, threads, stop)
    findings, histories = _look_further(project, plan, episodes, seasons, report, threads, stop)
    contribution = np.zeros(len(project.scene.panels))
    for c in next((e.contributors for e in episodes if e.contributors), ()):
        contribution[c.panel] = c.load
    year = Year(
        study=study,
        receivers=receiver_years(lit, loads, over, criteria),
        episodes=episodes,
        seasons=seasons,
        summary={},
        contribution=contribution,
        scene=project.scene,
        days=day_rows(project.scene, plan, days),
        findings=findings,
        histories=histories,
        observers=merge_eyes(
            [d.kept["eyes"] for d in days],
            plan,
            study.observers,
            points=np.bincount(eyes.observer, minlength=len(study.observers)).tolist(),
            zone=study.site.timezone,
            day_stride=study.year.day_stride,
        ),
    )
    seconds = clock.perf_counter() - started
    year.summary = summarise(
        year, lit, criteria, plan, days, assumed=project.assumed, seconds=seconds
    )
    return year


def _run_plan(
    project: Project,
    plan: Sequence[DayPlan],
    criteria: CriterionMap,
    eyes: EyePoints,
    report: Progress,
    client: Any,
    threads: int | None,
    store: DayStore | None,
    stop: threading.Event,
) -> list[DayResult]:
    """Work off the days of the plan that are not kept already, in the order of the plan."""
    lit = project.lit
    results: dict[int, DayResult] = {}
    for day in plan:
        kept = store.load(day.index) if store else None
        if kept is not None:
            results[day.index] = kept
    report("days", len(results), len(plan))
    left = [d for d in plan if d.index not in results]

    def work(day: DayPlan) -> DayResult | None:
        return run_day(lit, day, lambda lit, day: _watch(lit, day, criteria, eyes), stop.is_set)

    if client is not None:
        done = _on_cluster(client, project.study, left)
    else:
        done = run_days(left, work, threads=threads or os.cpu_count() or 1)
    for result in done:
        results[result.index] = result
        if store:
            store.save(result)
        report("days", len(results), len(plan))
    if stop.is_set():
        raise Stopped
    return [results[d.index] for d in plan]


def _watch(
    lit: LitScene, day: DayPlan, criteria: CriterionMap, eyes: EyePoints
) -> list[Accumulator]:
    """What is kept of a day beside its loads."""
    return [Exceedance(lit, day, criteria), EyeWatch(lit, day, eyes)]


def _on_cluster(client: Any, study: Study, days: Sequence[DayPlan]) -> Any:
    """Send days to a cluster; each of its processes opens the study once."""
    from distributed import as_completed

    futures = client.map(_cluster_day, [study] * len(days), days, pure=False)
    for future in as_completed(futures):
        yield future.result()


_OPEN: dict[str, tuple[Project, CriterionMap]] = {}
_OPEN_LOCK = threading.Lock()


def _cluster_day(study: Study, day: DayPlan) -> DayResult | None:
    """Work off one day in a process of a cluster."""
    with _OPEN_LOCK:
        key = repr(study)
        if key not in _OPEN:
            _OPEN.clear()
            project = open_project(study)
            _OPEN[key] = (project, CriterionMap(project.lit, study.criteria))
        project, criteria = _OPEN[key]
    eyes = place_eyes(study.observers, origin=project.scene.origin)
    return run_day(project.lit, day, lambda lit, day: _watch(lit, day, criteria, eyes))


def _check_peaks(
    project: Project,
    episodes: list[Episode],
    numbers: Sequence[int],
    report: Progress,
    threads: int | None,
    stop: threading.Event,
) -> list[Episode]:
    """Look closely at the peaks of some episodes."""
    from concurrent.futures import ThreadPoolExecutor

    chosen = [e for e in episodes if e.number in set(numbers)]
    report("peaks", 0, len(chosen))

    def work(episode: Episode) -> Episode:
        if stop.is_set():
            return episode
        return look_closely(
            project.lit,
            episode,
            sun_at=lambda t: _sun_at(project, t),
            step_minutes=project.study.year.step_minutes,
            seed=episode.number,
        )

    by_number = {e.number: e for e in episodes}
    with ThreadPoolExecutor(threads or os.cpu_count() or 1) as pool:
        for done, checked in enumerate(pool.map(work, chosen), start=1):
            by_number[checked.number] = checked
            report("peaks", done, len(chosen))
    if stop.is_set():
        raise Stopped
    return [by_number[e.number] for e in episodes]


def _look_further(
    project: Project,
    plan: Sequence[DayPlan],
    episodes: Sequence[Episode],
    seasons: Sequence[Season],
    report: Progress,
    threads: int | None,
    stop: threading.Event,
) -> tuple[dict[int, Finding], dict[int, SurfaceHistory]]:
    """Say what each counted peak does, what would cure it, and how sure that is."""
    from concurrent.futures import ThreadPoolExecutor

    by_number = {e.number: e for e in episodes}
    sunlit = {
        d: (day.times[i][0], day.times[i][-1]) for day in plan for i, d in enumerate(day.dates)
    }
    share = max((c.share for c in check_tessellation(project.scene)), default=0.0)
    chosen = [s for s in seasons if by_number[s.worst].check is not None]
    report("effects", 0, len(chosen))

    def work(season: Season) -> tuple[int, Finding, SurfaceHistory] | None:
        if stop.is_set():
            return None
        episode = by_number[season.worst]
        finding, history = look_further(
            project.lit,
            season,
            episode,
            daylight=sunlit[episode.day],
            sun_at=lambda t: _sun_at(project, t),
            air_at=lambda times: _air_at(project, times),
            tessellation_share=share,
            weather=project.study.sky.source == "weather",
        )
        return season.number, finding, history

    findings: dict[int, Finding] = {}
    histories: dict[int, SurfaceHistory] = {}
    with ThreadPoolExecutor(threads or os.cpu_count() or 1) as pool:
        for done, found in enumerate(pool.map(work, chosen), start=1):
            if found is not None:
                number, finding, history = found
                findings[number], histories[number] = finding, history
            report("effects", done, len(chosen))
    if stop.is_set():
        raise Stopped
    return findings, histories


def _air_at(project: Project, times: Any) -> tuple[Floats, Floats]:
    """Air temperature and wind of a study's sky at times (UTC)."""
    states = project.sky.at(times)
    return states.temperature_c, states.wind_ms


def inspect(
    study: Study | Project,
    *,
    at: str | datetime | np.datetime64 | None = None,
    sun: tuple[float, float] | None = None,
) -> dict[str, Any]:
    """Say what a study's model is: roles, panels, curvature, faults, tessellation check, focus.

    Parameters
    ----------
    study : Study or Project
        The study, or one that is open already.
    at : str or datetime, optional
        Local clock time of a sun: also tell how much of the facade focuses where its light lands.
    sun : (float, float), optional
        Azimuth and elevation in degrees, instead of ``at``.

    Returns
    -------
    report : dict
        Ready for JSON.

    Raises
    ------
    CausticloadError
        If the input is wrong.
    """
    from causticload.scene.build import inspect_scene
    from causticload.scene.focus import figure_focus

    project = _as_project(study)
    report = inspect_scene(project.scene)
    report["assumed"] = list(project.assumed)
    report["tracer"] = project.lit.tracer.name
    report["tessellation"] = [asdict(c) for c in check_tessellation(project.scene)]
    report["figures"] = figure_focus(project.scene)
    if at is not None or sun is not None:
        state = _choose_sun(project, at, sun, None)
        share = focus_share(project.lit, state.direction)
        report["focus"] = {
            "sun_azimuth": state.azimuth,
            "sun_elevation": state.elevation,
            "lit_m2": share.lit,
            "landing_m2": share.landing,
            "focused_m2": share.focused,
            "share": share.share,
        }
    return report


def save_focus(
    study: Study | Project,
    path: str | os.PathLike[str],
    *,
    at: str | datetime | np.datetime64 | None = None,
    sun: tuple[float, float] | None = None,
) -> None:
    """Write the facade with its focal distances under one sun, as VTK's PolyData.

    Parameters
    ----------
    study : Study or Project
        The study, or one that is open already.
    path : path
        The file, ending in .vtp.
    at : str or datetime, optional
        Local clock time of the sun.
    sun : (float, float), optional
        Azimuth and elevation in degrees, instead of ``at``.

    Raises
    ------
    CausticloadError
        If the input is wrong, or the file cannot be written.
    """
    from pathlib import Path

    from causticload.output.files import write_whole
    from causticload.output.meshes import facade_grid, focus_arrays

    project = _as_project(study)
    state = _choose_sun(project, at, sun, None)
    arrays = {"panel [number]": project.scene.panel[project.scene.reflectors]}
    grid = facade_grid(
        project.scene,
        {**arrays, **focus_arrays(project.scene, state.direction)},
        {
            "title": project.study.title,
            "sun": f"azimuth {state.azimuth:.2f}, elevation {state.elevation:.2f} degrees",
        },
    )
    write_whole(Path(path), grid.save)
