"""Time to a field with 3 % rms error: ray tubes against forward counting on Embree.

    python tests/benchmarks/bench_noise.py [--rays MILLIONS]

Scene: a concave cylinder of 7,500 m² before 331,776 cells of 0.25 m; both ways on the same cores.
Error: over cells that get more than 20 % of the direct sun, the root mean square of the error in
parts of the load. Two independent counts A and B give both errors without a third reference: that
of a count is the rms of (A - B) / sqrt(2), and that of the tubes the root of the mean of
(tubes - A)(tubes - B), since the errors of A and B average out in the product. The time that
counting would take to 3 % is extrapolated by 1 / sqrt(rays).
"""

from __future__ import annotations

import argparse
import math
import os
import tempfile
import time
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import numpy as np
from big_scenes import Objects, row
from numba import njit

from causticload.light.field import solve_field
from causticload.run import MEAN_RADIUS, Project, open_project
from causticload.sky.position import sun_direction
from causticload.study.read import read_study

WANTED = 0.03
BRIGHT = 0.2  # suns
BATCH = 500_000
THREADS = os.cpu_count() or 1


def write_scene(folder: Path) -> Path:
    """A cylinder facade of unit reflectance, 100 m by 75 m, and its ground of 144 m by 144 m."""
    objects = Objects()
    objects.facade(radius=100.0, half_angle=0.5, bottom=2.0, top=77.0, across=40, up=30)
    objects.ground(x0=-72.0, x1=72.0, y0=-144.0, y1=0.0)
    return objects.write(folder)


@njit(nogil=True, error_model="numpy")
def emit(corner, normal, running, s, e1, e2, tan_radius, rng, start, direction):
    """Random points of the reflector, evenly over the beam; random points of an even sun."""
    for k in range(len(start)):
        m = np.searchsorted(running, rng.random() * running[-1])
        root, split = math.sqrt(rng.random()), rng.random()
        a, b, c = 1.0 - root, root * (1.0 - split), root * split
        r, turn = tan_radius * math.sqrt(rng.random()), 2.0 * math.pi * rng.random()
        p, q = r * math.cos(turn), r * math.sin(turn)
        # scalars, not small arrays: those would make counting look slower than it is
        n2 = n_sun = 0.0
        for i in range(3):
            n = a * normal[m, 0, i] + b * normal[m, 1, i] + c * normal[m, 2, i]
            n_sun += n * (s[i] + p * e1[i] + q * e2[i])
            n2 += n * n
        scale = 1.0 / math.sqrt(1.0 + p * p + q * q)
        for i in range(3):
            n = a * normal[m, 0, i] + b * normal[m, 1, i] + c * normal[m, 2, i]
            sun = s[i] + p * e1[i] + q * e2[i]
            direction[k, i] = (2.0 * n_sun / n2 * n - sun) * scale
            start[k, i] = a * corner[m, 0, i] + b * corner[m, 1, i] + c * corner[m, 2, i]
            start[k, i] += 1e-3 * direction[k, i]


@njit(nogil=True, error_model="numpy")
def collect(start, direction, triangle, distance, ground, low, spacing, hits):
    """Count the rays that meet the ground by the cell they land in."""
    for k in range(len(triangle)):
        if triangle[k] >= 0 and ground[triangle[k]]:
            i = int((start[k, 0] + distance[k] * direction[k, 0] - low[0]) / spacing)
            j = int((start[k, 1] + distance[k] * direction[k, 1] - low[1]) / spacing)
            if 0 <= i < hits.shape[0] and 0 <= j < hits.shape[1]:
                hits[i, j] += 1


class ForwardCount:
    """Rays from random points of the sun by random points of the reflector to the ground."""

    def __init__(self, project: Project, s: np.ndarray) -> None:
        scene, self.lit, self.s = project.scene, project.lit, s
        facet = scene.reflectors
        self.corner = np.ascontiguousarray(scene.triangles[facet])
        self.normal = np.ascontiguousarray(scene.corner_normals[facet])
        edge = self.corner[:, 1:] - self.corner[:, :1]
        self.running = np.cumsum(0.5 * np.abs(np.cross(edge[:, 0], edge[:, 1]) @ s))
        self.e1 = np.cross(s, [1.0, 0.0, 0.0])
        self.e1 /= np.linalg.norm(self.e1)
        self.e2 = np.cross(s, self.e1)
        self.ground = np.array([x.name == "Ground" for x in scene.surfaces])[scene.surface]
        points = self.lit.points
        self.spacing = math.sqrt(np.median(self.lit.point_areas))
        self.low = points[:, :2].min(axis=0) - self.spacing / 2
        self.cell = np.floor((points[:, :2] - self.low) / self.spacing).astype(int)

    def batch(self, seed: int) -> np.ndarray:
        """Hits by cell of one batch."""
        start, direction = np.empty((BATCH, 3)), np.empty((BATCH, 3))
        emit(
            self.corner,
            self.normal,
            self.running,
            self.s,
            self.e1,
            self.e2,
            math.tan(MEAN_RADIUS),
            np.random.default_rng(seed),
            start,
            direction,
        )
        triangle, distance = self.lit.tracer.first_hit(start, direction)
        hits = np.zeros(self.cell.max(axis=0) + 1)
        collect(start, direction, triangle, distance, self.ground, self.low, self.spacing, hits)
        return hits

    def load(self, rays: int, seed: int) -> np.ndarray:
        """Load of each receiver point. [suns]"""
        batches = rays // BATCH
        with ThreadPoolExecutor(THREADS) as pool:
            hits = sum(pool.map(self.batch, range(seed, seed + batches)))
        mean = hits[self.cell[:, 0], self.cell[:, 1]] * self.running[-1] / (batches * BATCH)
        return mean / self.lit.point_areas


def main() -> None:
    """Print the row."""
    parser = argparse.ArgumentParser()
    parser.add_argument("--rays", type=int, default=20, metavar="MILLIONS")
    rays = 1_000_000 * parser.parse_args().rays
    with tempfile.TemporaryDirectory() as folder:
        project = open_project(read_study(write_scene(Path(folder))), engine="embree")
    s = sun_direction(np.radians([180.0]), np.radians([40.0]), north_rad=0.0)[0]

    def solve():
        return solve_field(project.lit, sun_direction=s, sun_radius=MEAN_RADIUS, threads=THREADS)

    solve()
    times = []
    for _ in range(5):
        started = time.perf_counter()
        field = solve()
        times.append(time.perf_counter() - started)
    tubes = field.load
    count = ForwardCount(project, s)
    count.load(BATCH * THREADS, 10**6)
    started = time.perf_counter()
    a = count.load(rays, 1)
    counting = time.perf_counter() - started
    b = count.load(rays, 10**5)
    bright = tubes > BRIGHT
    a, b, t = a[bright], b[bright], tubes[bright]
    noise = math.sqrt(np.mean(((a - b) / t) ** 2) / 2)
    square = np.mean((t - a) * (t - b) / t**2)
    error = math.copysign(math.sqrt(abs(square)), square)
    needed = counting * (noise / WANTED) ** 2
    print(f"{len(tubes):,} cells, {bright.sum():,} of them bright, {THREADS} threads")
    print(f"tubes: {field.tubes:,}, {1e3 * min(times):.0f} ms, {100 * error:.2f} % rms")
    print(f"mean bright load: tubes {t.mean():.4f}, counts {a.mean():.4f} and {b.mean():.4f} suns")
    print(
        f"counting: {rays:,} rays, {counting:.1f} s, {100 * noise:.1f} % rms; extrapolated by "
        f"1 / sqrt(rays) to {100 * WANTED:.0f} %: {needed:.0f} s"
    )
    held = f"tubes at {100 * error:.1f} % rms" if error <= WANTED else "TUBES DO NOT REACH 3 %"
    row(
        "time to 3 % rms against forward counting on Embree, same cores (extrapolated)",
        "1,000 x",
        "5,000 x",
        f"{needed / min(times):,.0f} x ({held})",
    )


if __name__ == "__main__":
    main()
