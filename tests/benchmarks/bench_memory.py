"""Peak memory of an instant among a million triangles and a million receiver points.

    python tests/benchmarks/bench_memory.py [--engine own] [--where]

A child process reads the study and solves one instant; its peak resident set is printed.
``--where`` says after each stage how large the process has been so far.
"""

from __future__ import annotations

import argparse
import resource
import subprocess
import sys
import tempfile
from pathlib import Path

import numpy as np
from big_scenes import Objects, row

BOXES = 83_334  # of twelve triangles
PITCH_M = 8.0


def write_scene(folder: Path) -> Path:
    """A concave facade and its ground of 250 m by 250 m in a town of a million triangles."""
    objects = Objects()
    objects.facade(radius=100.0, half_angle=0.5, bottom=2.0, top=77.0, across=60, up=40)
    objects.ground(x0=-125.0, x1=125.0, y0=-250.0, y1=0.0)
    n = 330
    x, y = (PITCH_M * (v.ravel() - n / 2) for v in np.indices((n, n)))
    away = (np.abs(x) > 140.0) | (np.abs(y + 125.0) > 140.0)
    x, y = x[away][:BOXES], y[away][:BOXES]
    rng = np.random.default_rng(4)
    size = rng.uniform(3.0, 6.0, (2, len(x)))
    tall = rng.uniform(3.0, 25.0, len(x))
    low = np.stack([x, y, 0.0 * x], axis=1)
    objects.boxes("Town", low, low + np.stack([*size, tall], axis=1))
    return objects.write(folder)


def peak_gb() -> float:
    """Largest resident set of this process so far. [GB]"""
    unit = 1.0 if sys.platform == "darwin" else 1024.0
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * unit / 1e9


def child(study: str, engine: str, where: bool) -> None:
    """Open the study, solve an instant, print triangles, points and peak."""
    from causticload.run import open_project, solve_instant
    from causticload.study.read import read_study

    def say(stage: str) -> None:
        if where:
            print(f"{stage}: {peak_gb():.2f} GB", file=sys.stderr)

    say("imported")
    project = open_project(read_study(study), engine=engine)
    say("opened")
    instant = solve_instant(project, sun=(180.0, 40.0))
    say("solved")
    points = sum(len(r.areas) for r in instant.receivers.values())
    print(len(project.scene.triangles), points, peak_gb(), sep="\n")


def main() -> None:
    """Write the scene, run the child, print the row."""
    parser = argparse.ArgumentParser()
    parser.add_argument("--child", metavar="STUDY")
    parser.add_argument("--engine", default="auto")
    parser.add_argument("--where", action="store_true")
    options = parser.parse_args()
    if options.child:
        child(options.child, options.engine, options.where)
        return
    with tempfile.TemporaryDirectory() as folder:
        study = write_scene(Path(folder))
        command = [sys.executable, __file__, "--child", str(study), "--engine", options.engine]
        command += ["--where"] * options.where
        out = subprocess.run(command, stdout=subprocess.PIPE, text=True, check=True).stdout
    triangles, points, peak = out.split()
    figure = f"memory, {int(triangles):,} triangles and {int(points):,} points, one instant"
    row(figure, "3 GB", "1.5 GB", f"{float(peak):.2f} GB")


if __name__ == "__main__":
    main()
