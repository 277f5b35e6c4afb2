"""Large made-up scenes for the benchmarks, written as mesh and study and read like any other."""

from __future__ import annotations

from pathlib import Path

import numpy as np

BOX = np.array([[0, 3, 2, 1], [4, 5, 6, 7], [0, 1, 5, 4], [1, 2, 6, 5], [2, 3, 7, 6], [3, 0, 4, 7]])
STUDY = """title = "Benchmark"

[site]
latitude = 51.5
longitude = 0.0
timezone = "Europe/London"

[model]
files = ["scene.obj"]

[[surface]]
match = "Facade"
role = "reflector"
form = "{form}"
finish = "mirror"

[[surface]]
match = "Ground"
role = "receiver"
spacing = 0.25
kind = "walkway"

[[surface]]
match = "*"
role = "obstruction"

[finish.mirror]
solar_reflectance = {reflectance}
visible_reflectance = {reflectance}
angular = "constant"

[sky]
disc = "{disc}"

[year]
year = 2026
step_minutes = 5
day_stride = {stride}
"""


class Objects:
    """Objects of quads on their way into a Wavefront OBJ file."""

    def __init__(self) -> None:
        self._text: list[str] = []
        self._vertices = self._normals = 0
        self.triangles = 0

    def add(self, name: str, points, quads, normals=None) -> None:
        """Add an object; with normals, one for each point."""
        self._text.append(f"o {name}\n")
        self._text += [f"v {x:.5f} {y:.5f} {z:.5f}\n" for x, y, z in points]
        quads = np.asarray(quads) + 1
        if normals is None:
            self._text += ["f {} {} {} {}\n".format(*q) for q in quads + self._vertices]
        else:
            self._text += [f"vn {x:.7f} {y:.7f} {z:.7f}\n" for x, y, z in normals]
            corner = np.stack([quads + self._vertices, quads + self._normals], axis=2)
            line = "f {}//{} {}//{} {}//{} {}//{}\n"
            self._text += [line.format(*c) for c in corner.reshape(-1, 8)]
            self._normals += len(normals)
        self._vertices += len(points)
        self.triangles += 2 * len(quads)

    def facade(self, *, radius, half_angle, bottom, top, across, up) -> None:
        """A concave piece of an upright cylinder that opens to the south, its middle at (0, 0)."""
        phi, z = np.linspace(-half_angle, half_angle, across + 1), np.linspace(bottom, top, up + 1)
        a, h = (v.ravel() for v in np.meshgrid(phi, z, indexing="ij"))
        normal = np.stack([-np.sin(a), -np.cos(a), 0.0 * a], axis=1)
        points = np.stack([radius * np.sin(a), radius * (np.cos(a) - 1.0), h], axis=1)
        k = np.arange(len(a)).reshape(across + 1, up + 1)
        quads = np.stack([k[:-1, :-1], k[1:, :-1], k[1:, 1:], k[:-1, 1:]], axis=-1).reshape(-1, 4)
        self.add("Facade", points, quads, normal)

    def ground(self, *, x0, x1, y0, y1) -> None:
        """A level rectangle at height 0."""
        self.add("Ground", [[x0, y0, 0], [x1, y0, 0], [x1, y1, 0], [x0, y1, 0]], [[0, 1, 2, 3]])

    def boxes(self, name: str, low, high) -> None:
        """Many boxes as one object."""
        low, high = np.asarray(low, float), np.asarray(high, float)
        xy = np.array([[0, 0], [1, 0], [0, 1], [1, 1]])[[0, 1, 3, 2]]
        pick = np.array([[*c, z] for z in (0, 1) for c in xy])
        points = np.where(pick[None] == 0, low[:, None], high[:, None]).reshape(-1, 3)
        quads = (8 * np.arange(len(low))[:, None, None] + BOX).reshape(-1, 4)
        self.add(name, points, quads)

    def write(self, folder: Path, *, form="smooth", reflectance=1.0, disc="uniform", stride=4):
        """Write mesh and study into a folder; returns the study's path."""
        (folder / "scene.obj").write_text("".join(self._text), encoding="ascii")
        study = folder / "scene.toml"
        text = STUDY.format(form=form, reflectance=reflectance, disc=disc, stride=stride)
        study.write_text(text, encoding="utf-8")
        return study


def row(figure: str, must: str, reach: str, seen: str) -> None:
    """Print a table of one row."""
    print("| figure | must | reach for | seen |\n|---|---|---|---|")
    print(f"| {figure} | {must} | {reach} | {seen} |")
