"""A small study run whole: files, meshes, tables, pictures, resuming, and refusals."""

import csv
import errno
import json
import os
import shutil
import socket
from dataclasses import replace

import numpy as np
import pytest
import pyvista as pv
import trimesh
from matplotlib.image import imread

import causticload as cl
from causticload.errors import ResultError
from causticload.output import files, words
from causticload.output.colours import map_colours, round_end
from causticload.output.days import DayStore
from causticload.output.folder import flagged_points, read_year, save_year
from causticload.output.instant import save_instant
from causticload.output.text import summarise_inspect, summarise_instant, summarise_year
from causticload.run import open_project, solve_year

STUDY = """
title = "Test wall"
[site]
latitude = 50.0
longitude = 0.0
timezone = "Europe/London"
[model]
files = ["wall.obj"]
[[surface]]
match = "mirror"
role = "reflector"
form = "smooth"
finish = "polished stainless steel"
[[surface]]
match = "ground"
role = "receiver"
spacing = 0.5
kind = "walkway"
[year]
step_minutes = 30
day_stride = 30
"""


def write_wall(folder):
    """A wall of 6 m by 4 m on a cylinder of 12 m radius that faces south, and a ground."""
    phi, z = np.meshgrid(np.linspace(-0.25, 0.25, 9), np.linspace(1, 5, 4), indexing="ij")
    p = np.stack([12 * np.sin(phi), 12 * np.cos(phi) - 12, z], -1).reshape(-1, 3)
    n = np.stack([-np.sin(phi), -np.cos(phi), 0 * phi], -1).reshape(-1, 3)
    lines = ["o mirror"]
    lines += ["v {:.6f} {:.6f} {:.6f}".format(*x) for x in p]
    lines += ["vn {:.8f} {:.8f} {:.8f}".format(*x) for x in n]
    for i in range(8):
        for j in range(3):
            a, b, c, d = (k + 1 for k in (i * 4 + j, i * 4 + 4 + j, i * 4 + 5 + j, i * 4 + 1 + j))
            lines.append(f"f {a}//{a} {b}//{b} {c}//{c} {d}//{d}")
    lines += ["o ground", "v -12 -14 0", "v 12 -14 0", "v 12 2 0", "v -12 2 0", "f 37 38 39 40"]
    (folder / "wall.obj").write_text("\n".join(lines) + "\n")
    (folder / "wall.toml").write_text(STUDY)
    return folder / "wall.toml"


@pytest.fixture(scope="module")
def project(tmp_path_factory):
    return open_project(cl.read_study(write_wall(tmp_path_factory.mktemp("wall"))))


@pytest.fixture(scope="module")
def year(project):
    return solve_year(project, checks=2)


@pytest.fixture(scope="module")
def saved(year, tmp_path_factory):
    return save_year(year, tmp_path_factory.mktemp("year") / "out")


def test_folder_holds_what_it_should(saved):
    names = {p.name for p in saved.iterdir()}
    wanted = (
        "summary.json episodes.csv seasons.csv panels.csv receivers.vtp facade.vtp receivers.ply "
        "facade.ply model.glb scale.png figures study.toml"
    )
    assert set(wanted.split()) <= names
    assert not [n for n in names if n.startswith(".")]  # no temporary file is left


def test_read_back_it_is_the_same(year, saved):
    again = read_year(saved)
    assert again.episodes == year.episodes
    assert again.seasons == year.seasons
    a, b = again.receivers["ground"], year.receivers["ground"]
    assert a.peak_reflected == pytest.approx(b.peak_reflected)
    assert (a.peak_time == b.peak_time)[b.peak_reflected > 0].all()
    assert a.energy == pytest.approx(b.energy)
    for name in b.minutes_over:
        assert a.minutes_over[name] == pytest.approx(b.minutes_over[name])
    assert again.contribution == pytest.approx(year.contribution)
    assert [r["date"] for r in again.days] == [r["date"] for r in year.days]


def test_the_year_found_something_and_its_counts_agree(year):
    # 24 m² of steel on a 12 m cylinder: several suns on the ground in front
    ground = year.receivers["ground"]
    assert ground.peak_reflected.max() > 1500.0
    checked = [e for e in year.episodes if e.check]
    assert checked
    assert all(e.check.agrees for e in checked)
    for e in checked:
        assert sum(c.share for c in e.contributors) == pytest.approx(1.0)
        assert e.check.total >= e.check.reflected
    assert abs(year.summary["ledger_kWh"]["closure"]) < 0.005
    assert sum(r["stands_for_days"] for r in year.days) == pytest.approx(365)


def test_minutes_are_whole_steps(year):
    ground = year.receivers["ground"]
    for name, minutes in ground.minutes_over.items():
        assert (minutes >= ground.most_minutes[name]).all()
        assert (ground.most_minutes[name] % 30 == 0).all()


def test_vtp_is_in_model_coordinates(year, saved):
    mesh = pv.read(saved / "receivers.vtp")
    ground = year.receivers["ground"]
    assert mesh.n_cells == len(ground.areas)
    whole = np.isclose(ground.areas, 0.25)
    assert mesh.cell_centers().points[whole] == pytest.approx(ground.points[whole], abs=1e-5)
    assert "screening aid" in str(mesh.field_data["cautions"][0])


def test_ply_colours_are_the_colour_maps(year, saved):
    mesh = trimesh.load(saved / "receivers.ply", process=False)
    ground = year.receivers["ground"]
    lit = ground.peak_reflected > 0
    high = round_end(float(ground.peak_reflected.max()))
    expected = map_colours(ground.peak_reflected[lit], low=0.0, high=high)
    assert (np.asarray(mesh.visual.vertex_colors)[: 4 * lit.sum() : 4] == expected).all()
    # flagged cells are marked by dark faces of their own, not by colour alone
    assert len(mesh.vertices) > 4 * lit.sum()
    header = (saved / "receivers.ply").read_bytes()[:3000]
    assert b"comment scale" in header
    assert b"comment cautions" in header


def test_glb_stands_upright(saved):
    scene = trimesh.load(saved / "model.glb")
    assert scene.bounds[1][1] == pytest.approx(5.0, abs=0.01)  # Y is up there, the wall ends at 5 m
    assert "surroundings" in scene.geometry


def test_tables(year, saved):
    with (saved / "episodes.csv").open() as file:
        rows = list(csv.DictReader(file))
    assert len(rows) == len(year.episodes)
    assert rows[0]["episode"] == "1"
    assert all("+" in r["start_local"] for r in rows)
    assert all(r["caution"] for r in rows)
    with (saved / "panels.csv").open() as file:
        panels = list(csv.DictReader(file))
    numbers = {r["episode"] for r in panels}
    assert numbers == {str(e.number) for e in year.episodes if e.contributors}
    for number in numbers:
        shares = [float(r["share"]) for r in panels if r["episode"] == number]
        assert sum(shares) == pytest.approx(1.0, abs=1e-4)


def test_summary_names_its_inputs(saved):
    data = json.loads((saved / "summary.json").read_text())
    assert data["schema_version"] == 1
    assert set(data["inputs_sha256"]) == {"wall.toml", "wall.obj"}
    assert data["cautions"]
    assert data["libraries"]["numpy"] == np.__version__
    assert all(isinstance(v, int) for v in data["ray_counts"].values())


def test_summaries_read_as_they_should(project, year):
    instant = cl.solve_instant(project, at="2025-06-21T13:00")
    texts = [
        summarise_year(year),
        summarise_instant(instant),
        summarise_inspect(cl.inspect(project)),
    ]
    for text in texts:
        assert "safe" not in text.lower()
        assert max(len(line) for line in text.splitlines()) <= 120
    for word in ("skin", "local clock time", "random rays", "Cautions", "Assumed"):
        assert word in texts[0]


def test_a_year_without_exceedance_says_so(year):
    assert words.NO_EXCEEDANCE in summarise_year(replace(year, episodes=[], seasons=[]))


def test_pictures_are_not_blank(project, saved, tmp_path):
    instant = cl.solve_instant(project, at="2025-03-21T12:30")
    save_instant(instant, tmp_path / "moment")
    for path in (saved / "scale.png", saved / "figures" / "plan.png", tmp_path / "moment/view.png"):
        pixels = imread(path)[:, :, :3]
        assert pixels.std() > 0.05
        assert len(np.unique(np.round(pixels, 2).reshape(-1, 3), axis=0)) > 40


def test_a_year_resumes_from_its_days(project, year, tmp_path):
    store = DayStore(tmp_path, project.study, resume=False)
    first = solve_year(project, store=store, checks=0)
    kept = sorted((tmp_path / "days").glob("*.npz"))
    assert len(kept) == year.summary["year"]["representative_days"]
    kept[0].unlink()
    kept[1].write_bytes(b"cut short")
    done = []
    again = solve_year(
        project,
        store=DayStore(tmp_path, project.study, resume=True),
        checks=0,
        progress=lambda stage, k, n: done.append((stage, k)),
    )
    assert done[0] == ("days", len(kept) - 2)
    a, b = first.receivers["ground"], again.receivers["ground"]
    assert b.peak_reflected == pytest.approx(a.peak_reflected)
    assert again.episodes == first.episodes


def test_days_of_another_study_are_refused(project, tmp_path):
    DayStore(tmp_path, project.study, resume=False)
    with pytest.raises(ResultError, match="another study"):
        DayStore(tmp_path, replace(project.study, title="other"), resume=True)


def test_broken_folders_are_refused(saved, tmp_path):
    with pytest.raises(ResultError, match="no such folder"):
        read_year(tmp_path / "nothing")
    with pytest.raises(ResultError, match=r"summary\.json is missing"):
        read_year(tmp_path)
    copy = shutil.copytree(saved, tmp_path / "copy")
    (copy / "receivers.vtp").unlink()
    with pytest.raises(ResultError, match=r"receivers\.vtp is missing"):
        read_year(copy)
    (copy / "summary.json").write_text("{")
    with pytest.raises(ResultError, match="cannot be read"):
        read_year(copy)


def test_two_runs_cannot_write_one_folder(tmp_path):
    with (
        files.working_in(tmp_path),
        pytest.raises(ResultError, match="another run"),
        files.working_in(tmp_path),
    ):
        pass
    assert not (tmp_path / files.LOCK).exists()


def test_a_dead_runs_lock_is_taken_over(tmp_path):
    dead = {"pid": 2**22 + 12345, "host": socket.gethostname()}
    (tmp_path / files.LOCK).write_text(json.dumps(dead))
    with files.working_in(tmp_path):
        assert json.loads((tmp_path / files.LOCK).read_text())["pid"] == os.getpid()


def test_a_full_disk_leaves_the_old_file(tmp_path):
    path = tmp_path / "table.csv"
    path.write_text("old")

    def write(target):
        target.write_text("half")
        raise OSError(errno.ENOSPC, "No space left on device")

    with pytest.raises(ResultError, match="disk is full"):
        files.write_whole(path, write)
    assert path.read_text() == "old"
    assert [p.name for p in tmp_path.iterdir()] == ["table.csv"]


def test_flags_follow_the_order_of_points(year):
    flagged = flagged_points(year)
    assert len(flagged) == sum(len(r.areas) for r in year.receivers.values())
    assert flagged.any()


def test_scale_ends_are_round():
    ends = [round_end(v) for v in (0.0, 0.9, 1.0, 1234.0, 5001.0)]
    assert ends == [1.0, 1.0, 1.0, 1500.0, 6000.0]
