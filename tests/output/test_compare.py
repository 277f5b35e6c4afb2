"""Two designs side by side: fates, difference meshes, and the page."""

import csv
import json
import shutil
from dataclasses import replace

import numpy as np
import pytest
import pyvista as pv
import trimesh
from docx import Document
from pypdf import PdfReader

from causticload.cli import DONE, WRONG_INPUT, main
from causticload.errors import ResultError
from causticload.output.compare import (
    Side,
    _fate,
    compare_years,
    comparison_record,
    save_comparison,
)
from causticload.output.text import summarise_comparison


@pytest.fixture(scope="module")
def steel_to_glass(steel_year, glass_year):
    return compare_years(steel_year, glass_year)


@pytest.fixture(scope="module")
def saved(steel_to_glass, tmp_path_factory):
    return save_comparison(steel_to_glass, tmp_path_factory.mktemp("compare") / "out")


def test_glass_cures_what_steel_did(steel_to_glass, glass_year):
    left = {(e.receiver, e.criterion) for e in steel_to_glass.after.year.episodes}
    for change in steel_to_glass.changes:
        key = (change.receiver, change.criterion)
        assert (change.fate == "gone") == (key not in left)
    assert any(c.fate == "gone" for c in steel_to_glass.changes)
    back = compare_years(steel_to_glass.after.folder, steel_to_glass.before.folder)
    swapped = {"gone": "new", "better": "worse", "same": "same"}
    a = {(c.receiver, c.criterion): swapped[c.fate] for c in steel_to_glass.changes}
    assert a == {(c.receiver, c.criterion): c.fate for c in back.changes}
    assert back.changes[0].fate in ("new", "worse")


def test_a_year_against_itself_changes_nothing(steel_year):
    same = compare_years(steel_year, steel_year)
    assert {c.fate for c in same.changes} == {"same"}
    assert same.settings == ()
    assert same.unlike == ()
    assert all((change == 0.0).all() for change in same.loads.values())


def test_fates():
    base = Side(1000.0, 10.0, 60.0)
    assert _fate(None, base) == "new"
    assert _fate(base, None) == "gone"
    assert _fate(base, replace(base, peak=1010.0)) == "same"
    assert _fate(base, replace(base, peak=1200.0)) == "worse"
    assert _fate(base, replace(base, place_minutes=30.0)) == "better"
    assert _fate(base, replace(base, peak=800.0, place_minutes=90.0)) == "worse"


def test_difference_meshes_hold_the_difference(steel_to_glass, saved):
    mesh = pv.read(saved / "change.vtp")
    peak = "peak reflected [W/m2]"
    before = np.concatenate(
        [r.peak_reflected for r in steel_to_glass.before.year.receivers.values()]
    )
    assert mesh.cell_data[f"{peak} before"] == pytest.approx(before)
    change = np.asarray(mesh.cell_data["change of peak reflected [W/m2]"])
    assert change == pytest.approx(
        mesh.cell_data[f"{peak} after"] - mesh.cell_data[f"{peak} before"]
    )
    # steel sends back about ten times as much as clear glass at each place
    assert (change <= 0.0).all()
    assert change.min() < -500.0
    assert "screening aid" in str(mesh.field_data["cautions"][0])
    coloured = trimesh.load(saved / "change.ply", process=False)
    assert len(coloured.vertices) == 4 * (change != 0.0).sum()
    strongest = np.asarray(coloured.visual.vertex_colors)[4 * np.argmin(change[change != 0.0])]
    assert strongest[2] > strongest[1]  # purple: less


def test_table_and_page_tell_the_changes(steel_to_glass, saved):
    with (saved / "changes.csv").open() as file:
        rows = list(csv.DictReader(file))
    assert [r["change"] for r in rows] == [c.fate for c in steel_to_glass.changes]
    assert all(r["caution"] for r in rows)
    record = json.loads((saved / "comparison.json").read_text())
    assert sum(record["counts"].values()) == len(rows)
    word = Document(saved / "comparison.docx")
    table = next(t for t in word.tables if len(t.columns) == 9)
    assert [r.cells[2].text for r in table.rows[1:]] == [r["change"] for r in rows]
    reader = PdfReader(saved / "comparison.pdf")
    assert len(reader.pages) == 1
    text = " ".join(reader.pages[0].extract_text().split())
    assert f"{record['counts']['gone']} of {len(rows)} findings are gone" in text
    assert "licensed practice decide" in text
    assert "<canvas" not in (saved / "comparison.html").read_text()
    assert "findings are gone" in summarise_comparison(steel_to_glass)


def test_other_grids_and_settings_are_said(steel_to_glass, steel_year, tmp_path):
    other = replace(steel_to_glass)
    ground = other.after.year.receivers["ground"]
    moved = {"ground": replace(ground, points=ground.points + 0.2)}
    copy = shutil.copytree(steel_year, tmp_path / "copy")
    data = json.loads((copy / "summary.json").read_text())
    data["year"]["step_minutes"] = 30
    (copy / "summary.json").write_text(json.dumps(data))
    assert compare_years(steel_year, copy).settings == ("year",)
    mesh = pv.read(copy / "receivers.vtp")
    mesh.points += np.array([0.2, 0.0, 0.0])
    mesh.save(copy / "receivers.vtp")
    shifted = compare_years(steel_year, copy)
    assert shifted.loads == {}
    assert set(shifted.unlike) == set(shifted.before.year.receivers)
    out = save_comparison(shifted, tmp_path / "out")
    assert not (out / "change.vtp").exists()
    assert "share no grid" in (out / "comparison.html").read_text()
    assert moved["ground"].points[0, 0] != ground.points[0, 0]


def test_command(steel_year, glass_year, tmp_path, capsys):
    args = ["compare", str(steel_year), str(glass_year)]
    assert main([*args, "--json"]) == DONE
    assert json.loads(capsys.readouterr().out) == json.loads(
        json.dumps(comparison_record(compare_years(steel_year, glass_year)))
    )
    assert main([*args, "--out", str(tmp_path / "out")]) == DONE
    text = capsys.readouterr().out
    assert "gone" in text
    assert "licensed practice decide" in text
    assert (tmp_path / "out" / "change.vtp").is_file()
    assert main(["compare", str(steel_year), str(tmp_path / "none")]) == WRONG_INPUT
    assert "no such folder" in capsys.readouterr().err


def test_a_partial_year_is_refused(steel_year, tmp_path):
    copy = shutil.copytree(steel_year, tmp_path / "copy")
    (copy / "summary.json").unlink()
    with pytest.raises(ResultError, match="not finished"):
        compare_years(steel_year, copy)
