"""The year: representative days, each a unit of work of its own."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import FIRST_COMPLETED, Future, ThreadPoolExecutor, wait
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from causticload.light.field import LEDGER, solve_field
from causticload.light.prepare import LitScene
from causticload.light.tally import Accumulator, LoadTally, Moment, StepLight
from causticload.sky.plan import DayPlan
from causticload.sky.position import sun_direction

# Below this elevation the sun is behind something in any town, and its beam is faint.
LEAST_ELEVATION_RAD = np.radians(1.0)


@dataclass
class DayResult:
    """What one representative day came to."""

    index: int
    kept: dict[str, dict[str, Any]]  # accumulator name -> its result
    worst: NDArray[
        np.float32
    ]  # (dates, steps, surfaces) W/m², largest reflected load on each surface
    ledger: dict[str, float]  # J in the mean over the day's dates, per kind
    steps: int


MakeAccumulators = Callable[[LitScene, DayPlan], Sequence[Accumulator]]


def run_day(
    lit: LitScene,
    day: DayPlan,
    make_accumulators: MakeAccumulators,
    stopped: Callable[[], bool] = lambda: False,
) -> DayResult | None:
    """Work off one representative day.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.
    day : DayPlan
        The day's steps and dates.
    make_accumulators : callable
        Gives the accumulators for a day.
    stopped : callable
        Asked at every step; once it says True the day is given up.

    Returns
    -------
    result : DayResult or None
        None if it was given up.
    """
    loads = LoadTally(lit.scene.point_count, tuple(float(w) for w in day.weights))
    accumulators = [loads, *make_accumulators(lit, day)]
    dates, steps = day.beam.shape
    surfaces = len(lit.scene.surfaces)
    worst = np.zeros((dates, steps, surfaces), np.float32)
    ledger = dict.fromkeys(LEDGER, 0.0)
    direction = sun_direction(day.azimuth_rad, day.elevation_rad, north_rad=lit.scene.north_rad)
    for k in range(steps):
        if stopped():
            return None
        if day.elevation_rad[k] < LEAST_ELEVATION_RAD or not day.beam[:, k].max() > 0.0:
            continue
        field = solve_field(
            lit, sun_direction=direction[k], sun_radius=float(day.radius_rad[:, k].mean())
        )
        light = StepLight(lit, field, direction[k])
        top = np.zeros(surfaces)
        np.maximum.at(top, lit.point_surface, field.load)
        for d in range(dates):
            moment = Moment(
                light,
                time=day.times[d, k],
                beam=float(day.beam[d, k]),
                diffuse=float(day.diffuse[d, k]),
                temperature_c=float(day.temperature_c[d, k]),
                wind_ms=float(day.wind_ms[d, k]),
                minutes=day.step_s / 60.0,
            )
            for accumulator in accumulators:
                accumulator.add(moment, date=d)
            worst[d, k] = top * moment.beam
        for key, value in field.ledger.items():
            ledger[key] += value * float(day.beam[:, k].mean()) * day.step_s
    return DayResult(
        index=day.index,
        kept={a.name: a.result() for a in accumulators},
        worst=worst,
        ledger=ledger,
        steps=steps,
    )


def run_days(
    days: Sequence[DayPlan], work: Callable[[DayPlan], DayResult | None], *, threads: int
) -> Iterator[DayResult]:
    """Work off days on threads; yield each as it is done.

    Parameters
    ----------
    days : sequence of DayPlan
        The days to do.
    work : callable
        Does a day; None means that it was given up.
    threads : int
        How many at once, >= 1.

    Yields
    ------
    result : DayResult
        In the order in which they are done.
    """
    # The longest days first, so that no thread is left with one at the end.
    order = sorted(days, key=lambda d: -d.beam.shape[1])
    with ThreadPoolExecutor(threads) as pool:
        left: set[Future[DayResult | None]] = {pool.submit(work, day) for day in order}
        try:
            while left:
                done, left = wait(left, return_when=FIRST_COMPLETED)
                for future in done:
                    result = future.result()
                    if result is not None:
                        yield result
        finally:
            for future in left:
                future.cancel()
