"""The year at scale: four thousand panels, 400,000 receiver points, a hundred neighbours.

    python tests/benchmarks/bench_year.py [--quick] [--form flat]

Steps of 5 minutes, every fourth day, and the worst peaks looked at closely, on all cores; the time
counts from the mesh file to the finished year. ``--quick`` takes every 28th day in steps of 20
minutes instead and estimates the whole: the days' time in proportion to the suns in the plan, all
else as it was.
"""

from __future__ import annotations

import argparse
import os
import tempfile
import time
from dataclasses import replace
from pathlib import Path

import numpy as np
from big_scenes import Objects, row

from causticload.run import open_project, solve_year
from causticload.sky.plan import plan_year
from causticload.study.read import read_study

STRIDE, QUICK_STRIDE, QUICK_STEP = 4, 28, 20


def write_scene(folder: Path, form: str) -> Path:
    """A concave facade of 80 by 50 panels, its plaza, and rows of neighbours around it."""
    objects = Objects()
    objects.facade(radius=130.0, half_angle=0.45, bottom=4.0, top=74.0, across=80, up=50)
    objects.ground(x0=-100.0, x1=100.0, y0=-125.0, y1=0.0)
    rng = np.random.default_rng(7)
    # two rows behind, one on either side, and one beyond the plaza
    places = [
        *((20.0 * k, 15.0) for k in range(-10, 10)),
        *((20.0 * k, 45.0) for k in range(-10, 10)),
        *((20.0 * k, -145.0) for k in range(-10, 10)),
        *((-120.0, -6.0 * k) for k in range(20)),
        *((104.0, -6.0 * k) for k in range(20)),
    ]
    wide = np.array([[14.0, 14.0]] * 60 + [[16.0, 5.0]] * 40)
    for k, (x, y) in enumerate(places):
        low = [x, y, 0.0]
        high = [x + wide[k, 0], y + wide[k, 1], rng.uniform(9.0, 25.0)]
        objects.boxes(f"Neighbour {k + 1}", [low], [high])
    return objects.write(folder, form=form, reflectance=0.3, disc="limb-darkened", stride=STRIDE)


class Stages:
    """Hears the progress of a year and notes when the stage of the peaks began."""

    peaks: float = 0.0

    def __call__(self, stage: str, done: int, total: int) -> None:
        """Note the time."""
        if stage == "peaks" and done == 0:
            self.peaks = time.perf_counter()


def suns(project) -> int:
    """Positions of the sun in the plan of a project's year."""
    study = project.study
    return sum(len(day.azimuth_rad) for day in plan_year(study.site, study.year, project.sky))


def main() -> None:
    """Print the row."""
    parser = argparse.ArgumentParser()
    parser.add_argument("--quick", action="store_true")
    parser.add_argument("--form", choices=("smooth", "flat"), default="smooth")
    options = parser.parse_args()
    started = time.perf_counter()
    with tempfile.TemporaryDirectory() as folder:
        project = open_project(read_study(write_scene(Path(folder), options.form)))
    whole = suns(project)
    if options.quick:
        study = project.study
        project.study = replace(
            study,
            year=replace(study.year, day_stride=QUICK_STRIDE, step_minutes=QUICK_STEP),
        )
    taken = suns(project)
    opened = time.perf_counter()
    stages = Stages()
    solve_year(project, progress=stages)
    ended = time.perf_counter()
    days, peaks = stages.peaks - opened, ended - stages.peaks
    total = opened - started + days * whole / taken + peaks
    points = len(project.lit.points)
    print(
        f"{len(project.scene.panels):,} panels ({options.form}), {points:,} points, "
        f"{len(project.scene.triangles):,} triangles, {os.cpu_count()} cores"
    )
    print(
        f"opened in {opened - started:.1f} s; {taken:,} of {whole:,} suns in {days:.1f} s; "
        f"peaks in {peaks:.1f} s"
    )
    minutes = f"{total / 60:.1f} min"
    if options.quick:
        minutes += f", estimated from {taken:,} of {whole:,} suns"
    row("year at scale, 5-min steps, stride 4 days", "4 min", "1.5 min", minutes)


if __name__ == "__main__":
    main()
