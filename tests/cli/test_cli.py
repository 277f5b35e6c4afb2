"""The command line by what it prints and how it leaves."""

import json
import subprocess
import sys
from pathlib import Path

import pytest

from causticload.cli import DONE, EXCEEDED, WRONG_INPUT, main

SAMPLES = Path(__file__).parents[2] / "sample_meshes"

STUDY = """
title = "Two panes"
[site]
latitude = 50.0
longitude = 0.0
[model]
files = ["panes.obj"]
[[surface]]
match = "pane*"
role = "reflector"
finish = "perfect mirror"
[[surface]]
match = "ground"
role = "receiver"
spacing = 0.5
kind = "walkway"
[year]
step_minutes = 60
day_stride = 30
"""
PANES = """\
o pane one
v -2 0 1
v 0 -0.3 1
v 0 -0.3 4
v -2 0 4
f 1 2 3 4
o pane two
v 0.1 -0.3 1
v 2.1 0 1
v 2.1 0 4
v 0.1 -0.3 4
f 5 6 7 8
o ground
v -8 -9 0
v 8 -9 0
v 8 1 0
v -8 1 0
f 9 10 11 12
"""


@pytest.fixture
def study(tmp_path):
    (tmp_path / "panes.obj").write_text(PANES)
    path = tmp_path / "panes.toml"
    path.write_text(STUDY)
    return path


def test_inspect_prints_roles(study, capsys):
    assert main(["inspect", str(study)]) == DONE
    out = capsys.readouterr().out
    assert "pane one" in out
    assert "reflector" in out


def test_instant_as_json(study, capsys):
    assert main(["instant", str(study), "--sun", "180,40", "--beam", "800", "--json"]) == DONE
    record = json.loads(capsys.readouterr().out)
    ground = record["receivers"][0]
    # two perfect panes that do not overlap: no more than the beam on level ground, by sin 40
    assert 0.5 * 800 < ground["peak_reflected_W_m2"] < 2.05 * 800
    assert record["sun"]["azimuth"] == 180.0


def test_instant_writes_meshes(study, tmp_path, capsys):
    args = ["instant", str(study), "--sun", "180,40", "--out", str(tmp_path / "out"), "--quiet"]
    assert main(args) == DONE
    assert capsys.readouterr().out == ""
    names = {p.name for p in (tmp_path / "out").iterdir()}
    assert names == {"receivers.vtp", "receivers.ply", "scale.png", "view.png", "instant.json"}


def test_year_and_fail_over(study, tmp_path, capsys):
    out = tmp_path / "year"
    limit = '\n[[criterion]]\nname = "low"\napplies_to = ["ground"]\n'
    limit += 'quantity = "reflected irradiance"\nlimit = 300.0\n'
    study.write_text(STUDY + limit)
    assert (
        main(["year", str(study), "--out", str(out), "--fail-over", "--workers", "1"]) == EXCEEDED
    )
    text = capsys.readouterr().out
    assert 'criterion "low"' in text
    assert "Cautions" in text
    assert (out / "summary.json").is_file()


WRONG = [
    (["instant", "{study}"], "either a time or a sun"),
    (["instant", "{study}", "--sun", "north"], "two numbers"),
    (["instant", "{study}", "--sun", "180,-5"], "elevation"),
    (["instant", "{study}", "--sun", "180,40", "--beam", "-1"], "beam"),
    (["instant", "{study}", "--at", "2026-01-01T00:00"], "the sun is down"),
    (["instant", "{study}", "--at", "yesterday"], "yesterday"),
    (["inspect", "nothing.toml"], "no such file"),
    (["year", "{study}", "--workers", "0"], "--workers"),
]


@pytest.mark.parametrize(("args", "says"), WRONG, ids=[w[1] for w in WRONG])
def test_wrong_input_leaves_with_two_and_one_paragraph(study, args, says, capsys):
    assert main([a.format(study=study) for a in args]) == WRONG_INPUT
    captured = capsys.readouterr()
    assert captured.out == ""
    assert says in captured.err
    assert "Traceback" not in captured.err
    assert captured.err.count("\n") == 1


@pytest.mark.parametrize(
    ("old", "new", "says"),
    [
        ('"perfect mirror"', '"perfct mirror"', "perfect mirror"),
        ('match = "pane*"', 'match = "wall*"', "reflect"),
        ("spacing = 0.5", 'spacing = 0.5\nfigure = "bent"', "figure"),
    ],
)
def test_wrong_studies_say_what_to_do(study, old, new, says, capsys):
    study.write_text(STUDY.replace(old, new, 1))
    assert main(["inspect", str(study)]) == WRONG_INPUT
    assert says in capsys.readouterr().err


def test_error_as_json(study, capsys):
    study.write_text(STUDY.replace("latitude = 50.0", "latitude = 500.0"))
    assert main(["inspect", str(study), "--json"]) == WRONG_INPUT
    error = json.loads(capsys.readouterr().out)["error"]
    assert "line 4" in error["where"]


def test_broken_meshes(study, capsys):
    for text, says in (("", "panes.obj"), ("v 0 0 0\n", "panes.obj"), ("f 1 2 9\n", "panes.obj")):
        (study.parent / "panes.obj").write_text(text)
        assert main(["inspect", str(study)]) == WRONG_INPUT
        assert says in capsys.readouterr().err


def test_finishes(capsys, tmp_path):
    assert main(["finishes", "--plot", str(tmp_path / "f.png")]) == DONE
    assert "double clear glass" in capsys.readouterr().out
    assert (tmp_path / "f.png").stat().st_size > 10_000


def test_install_addon_copies_it(tmp_path, capsys):
    assert main(["install-addon", "blender", "--into", str(tmp_path)]) == DONE
    assert str(tmp_path) in capsys.readouterr().out
    assert (tmp_path / "causticload_addon" / "__init__.py").is_file()


def test_worker_answers_and_ends_with_its_input():
    hello = {"jsonrpc": "2.0", "id": 1, "method": "hello", "params": {}}
    result = subprocess.run(
        [sys.executable, "-m", "causticload.cli", "worker"],
        input=json.dumps(hello) + "\n",
        capture_output=True,
        text=True,
        check=True,
        timeout=60,
    )
    answer = json.loads(result.stdout.splitlines()[0])
    assert answer["id"] == 1
    assert "version" in answer["result"]


def test_help_names_an_example():
    result = subprocess.run(
        [sys.executable, "-m", "causticload.cli", "year", "--help"],
        capture_output=True,
        text=True,
        check=True,
    )
    assert "example" in result.stdout


@pytest.mark.parametrize("name", ["tower", "pavilion", "crescent"])
def test_samples_inspect_without_faults(name, capsys):
    assert main(["inspect", str(SAMPLES / f"{name}.toml"), "--json"]) == DONE
    report = json.loads(capsys.readouterr().out)
    assert report["faults"] == []
