"""Figures of speed as ratios in one run: an instant and the package's own tracer.

    python tests/benchmarks/bench_light.py

Prints a Markdown table. Nothing here is asserted by a test.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np

import causticload as cl
from causticload.light.bvh import Tracer, build_tracer
from causticload.light.field import solve_field

SAMPLES = Path(__file__).parents[2] / "sample_meshes"
SUN = (200.0, 38.0)


def best(work, repeat: int = 5) -> float:
    """Shortest time of some runs, after one that does not count. [s]"""
    work()
    times = []
    for _ in range(repeat):
        started = time.perf_counter()
        work()
        times.append(time.perf_counter() - started)
    return min(times)


def quicker(one, other, repeat: int = 9) -> float:
    """How many times as quick ``one`` is as ``other``: the median of runs that take turns."""
    return float(np.median([best(other, 1) / best(one, 1) for _ in range(repeat)]))


def tracer_rates() -> tuple[float, float]:
    """Own tracer against Embree on the same incoherent rays, and its two threads against one."""
    from concurrent.futures import ThreadPoolExecutor

    rng = np.random.default_rng(1)
    middle = rng.uniform(-200, 200, (100_000, 1, 3)) * [1.0, 1.0, 0.1]
    triangles = middle + rng.normal(size=(100_000, 3, 3))
    o = rng.uniform(-200, 200, (200_000, 3)) * [1.0, 1.0, 0.1]
    d = rng.normal(size=o.shape)
    d /= np.linalg.norm(d, axis=1, keepdims=True)
    own = build_tracer(triangles, engine="own")
    embree = build_tracer(triangles, engine="embree")
    alone = best(lambda: own.first_hit(o, d))
    halves = np.split(np.arange(len(o)), 2)
    with ThreadPoolExecutor(2) as pool:
        both = best(lambda: list(pool.map(lambda k: own.first_hit(o[k], d[k]), halves)))
    ratio = quicker(lambda: own.first_hit(o, d), lambda: embree.first_hit(o, d))
    return ratio, alone / both


class RecordingTracer:
    """Passes questions on to a tracer and can ask them all again."""

    def __init__(self, tracer: Tracer) -> None:
        self.name, self._tracer = tracer.name, tracer
        self._asked: list[Callable[[], object]] = []

    def first_hit(self, origins, directions):
        """Pass on."""
        self._asked.append(lambda: self._tracer.first_hit(origins, directions))
        return self._tracer.first_hit(origins, directions)

    def occluded(self, origins, directions, *, limit=None):
        """Pass on."""
        self._asked.append(lambda: self._tracer.occluded(origins, directions, limit=limit))
        return self._tracer.occluded(origins, directions, limit=limit)

    def replay(self) -> None:
        """Ask everything again."""
        for ask in self._asked:
            ask()


def instant_rows() -> list[tuple[str, str, str]]:
    """An instant of the tower: total time against tracing its rays, and threads."""
    project = cl.open_project(cl.read_study(SAMPLES / "tower.toml"))
    lit = project.lit
    state = cl.solve_instant(project, sun=SUN).sun

    def solve(threads: int):
        return solve_field(
            lit, sun_direction=state.direction, sun_radius=state.radius, threads=threads
        )

    one, two = best(lambda: solve(1)), best(lambda: solve(2))
    field = solve(1)
    asked = RecordingTracer(lit.tracer)
    solve_field(replace(lit, tracer=asked), sun_direction=state.direction, sun_radius=state.radius)
    rays = best(asked.replay)
    return [
        ("instant, total against tracing just its own rays", "4", f"{one / rays:.1f}"),
        ("instant, two threads against one", "1.7", f"{one / two:.2f}"),
        ("instant, ms on one thread (tubes)", "-", f"{1e3 * one:.0f} ({field.tubes:,})"),
    ]


def main() -> None:
    """Print the table."""
    ratio, threads = tracer_rates()
    rows = [
        ("own tracer, rays/s against Embree, one thread", "0.4", f"{ratio:.2f}"),
        ("own tracer, two threads against one", "1.7", f"{threads:.2f}"),
        *instant_rows(),
    ]
    print("| figure | must | seen |\n|---|---|---|")
    for row in rows:
        print("| " + " | ".join(row) + " |")


if __name__ == "__main__":
    main()
