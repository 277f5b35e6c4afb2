"""A small wall, solved once as two designs, for the tests of memos and comparisons."""

from datetime import UTC, datetime
from types import SimpleNamespace

import numpy as np
import pytest

import causticload as cl
from causticload.output.folder import save_year
from causticload.output.memo import write_memo
from causticload.run import solve_year

NOW = datetime(2026, 12, 1, 12, 30, tzinfo=UTC)

STUDY = """
title = "Curved wall <one> & only"
[site]
latitude = 50.0
longitude = 0.0
timezone = "Europe/London"
model_north = 20.0
[model]
files = ["wall.obj"]
[[surface]]
match = "mirror"
role = "reflector"
form = "smooth"
finish = "FINISH"
[[surface]]
match = "ground"
role = "receiver"
spacing = 0.5
kind = "walkway"
[[surface]]
match = "house"
role = "receiver"
spacing = 0.5
kind = "facade"
[year]
step_minutes = 60
day_stride = 30
[[observer]]
name = "gate"
path = [[0.0, -12.0, 1.6], [4.0, -12.0, 1.6]]
"""


def write_small_wall(folder, finish):
    """A mirror of 6 m by 4 m on a cylinder of 12 m radius, a ground, and a house across it."""
    phi, z = np.meshgrid(np.linspace(-0.25, 0.25, 7), np.linspace(1, 5, 3), indexing="ij")
    p = np.stack([12 * np.sin(phi), 12 * np.cos(phi) - 12, z], -1).reshape(-1, 3)
    n = np.stack([-np.sin(phi), -np.cos(phi), 0 * phi], -1).reshape(-1, 3)
    lines = ["o mirror"]
    lines += ["v {:.6f} {:.6f} {:.6f}".format(*x) for x in p]
    lines += ["vn {:.8f} {:.8f} {:.8f}".format(*x) for x in n]
    for i in range(6):
        for j in range(2):
            a, b, c, d = (k + 1 for k in (i * 3 + j, i * 3 + 3 + j, i * 3 + 4 + j, i * 3 + 1 + j))
            lines.append(f"f {a}//{a} {b}//{b} {c}//{c} {d}//{d}")
    lines += ["o ground", "v -9 -13 0", "v 9 -13 0", "v 9 2 0", "v -9 2 0", "f 22 23 24 25"]
    lines += ["o house", "v 5 -9 0", "v -5 -9 0", "v -5 -9 6", "v 5 -9 6", "f 26 27 28 29"]
    folder.mkdir()
    (folder / "wall.obj").write_text("\n".join(lines) + "\n")
    (folder / "wall.toml").write_text(STUDY.replace("FINISH", finish))
    return folder / "wall.toml"


@pytest.fixture(scope="session")
def steel_year(tmp_path_factory):
    """The result folder of the wall in steel: it exceeds limits."""
    place = tmp_path_factory.mktemp("steel")
    study = cl.read_study(write_small_wall(place / "in", "polished stainless steel"))
    return save_year(solve_year(study, checks=1), place / "steel-year")


@pytest.fixture(scope="session")
def glass_year(tmp_path_factory):
    """The result folder of the wall in glass: it exceeds nothing for people's skin."""
    place = tmp_path_factory.mktemp("glass")
    study = cl.read_study(write_small_wall(place / "in", "single clear glass"))
    return save_year(solve_year(study, checks=0), place / "glass-year")


@pytest.fixture(scope="session")
def memo_files(steel_year):
    """The memo of the wall in steel in all formats."""
    docx, pdf, html = write_memo(steel_year, now=NOW)
    return SimpleNamespace(docx=docx, pdf=pdf, html=html, folder=steel_year)
