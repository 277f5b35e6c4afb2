"""The study file: what it takes, and one clear sentence for everything it does not."""

from dataclasses import replace

import pytest

from causticload.errors import StudyError
from causticload.study import describe_keys, input_hashes, read_study, study_digest, write_study
from causticload.study.lines import index_lines

FULL = """\
title = "Kestrel Quay, block C"

[site]
latitude = 51.07            # north positive
longitude = -1.32
elevation = 40.0
timezone = "Europe/London"
model_north = 12.0

[model]
files = ["kestrel.obj"]
unit = "m"
up = "Z"

[[surface]]
match = "glazing*"
role = "reflector"
form = "smooth"
finish = "solar-control double glass"
figure = "heat-treated"

[[surface]]
match = "plaza"
role = ["receiver", "obstruction"]
spacing = 0.25
kind = "walkway"

[[surface]]
match = "*"
role = "obstruction"

[finish."atrium glass"]
solar_reflectance = 0.31
visible_reflectance = 0.27
angular = "coated glass"
slope_error_mrad = 0.0

[figure."heat-treated"]
bow_mm = -1.2
roller_wave_mm = 0.08
roller_pitch_mm = 300
roller_along = "width"

[sky]
source = "clear"
disc = "limb-darkened"

[year]
step_minutes = 5
day_stride = 4

[[observer]]
name = "eastbound lane"
path = [
  [0.0, -40.0, 1.2],
  [80.0, -40.0, 1.2],
]
look = "along"

[[criterion]]
name = "market stall canopy"
applies_to = ["canopy*"]
quantity = "total irradiance"
limit = 1500.0
minutes = 10.0
"""


@pytest.fixture
def write(tmp_path):
    (tmp_path / "kestrel.obj").write_text("v 0 0 0\n")

    def make(text):
        path = tmp_path / "kestrel.toml"
        path.write_text(text, encoding="utf-8")
        return path

    return make


def test_the_full_example(write):
    study = read_study(write(FULL))
    assert study.title == "Kestrel Quay, block C"
    assert study.site.model_north == 12.0
    assert study.model.files[0].is_absolute()
    assert study.surfaces[1].roles == ("receiver", "obstruction")
    assert study.surfaces[0].form == "smooth"
    assert study.finishes["atrium glass"].solar_reflectance == 0.31
    assert study.figures["heat-treated"].settings["bow_mm"] == -1.2
    assert study.observers[0].path[1] == (80.0, -40.0, 1.2)
    assert study.criteria[0].applies_to == ("canopy*",)


def test_site_and_model_are_enough(write):
    study = read_study(
        write('[site]\nlatitude = 1\nlongitude = 2\n[model]\nfiles = ["kestrel.obj"]')
    )
    assert study.surfaces == ()
    assert study.year.step_minutes == 5


def test_written_and_read_again_it_is_the_same(write, tmp_path):
    study = read_study(write(FULL))
    other = tmp_path / "deeper" / "copy.toml"
    again = read_study(write_study(study, other))
    assert replace(again, path=None) == replace(study, path=None)
    assert study_digest(again) == study_digest(study)
    assert not [p for p in other.parent.iterdir() if p.name != "copy.toml"]


def test_digest_changes_with_settings_and_with_bytes(write):
    study = read_study(write(FULL))
    before = study_digest(study)
    assert study_digest(replace(study, title="Other")) != before
    study.model.files[0].write_text("v 0 0 1\n")
    assert study_digest(study) != before
    assert set(input_hashes(study)) == {"kestrel.toml", "kestrel.obj"}


# (what is replaced, by what, where the error says it is, what it says)
WRONG = [
    ("latitude = 51.07", "latitude = 95", "line 4: site.latitude", "from -90 to 90"),
    ("latitude = 51.07", "latitude = true", "line 4: site.latitude", "must be a number"),
    ("latitude = 51.07", "latitude = nan", "site.latitude", "from -90 to 90"),
    ("latitude = 51.07            # north positive\n", "", "line 3: site", "'latitude' is missing"),
    ('"Europe/London"', '"Europe/Londn"', "line 7: site.timezone", "unknown time zone"),
    ("elevation = 40.0", "elevaton = 40.0", "line 6: site.elevaton", "Did you mean 'elevation'"),
    ('["kestrel.obj"]', "[]", "model.files", "must not be empty"),
    ('["kestrel.obj"]', '["kestral.obj"]', "line 11: model.files", "there is no file"),
    ('["kestrel.obj"]', "[3]", "model.files", "list of file names"),
    ('unit = "m"', 'unit = "yard"', "model.unit", "one of m, cm, mm"),
    ('up = "Z"', 'up = "X"', "model.up", "one of Z, Y"),
    ('role = "reflector"', 'role = "reflecter"', "surface[1].role", "Did you mean 'reflector'"),
    ('role = "reflector"', "role = []", "surface[1].role", "must not be empty"),
    ('role = "reflector"', 'role = ["ignore", "receiver"]', "surface[1].role", "no other role"),
    ('match = "*"', 'match = ""', "surface[3].match", "must not be empty"),
    ('form = "smooth"', 'form = "wavy"', "surface[1].form", "one of smooth, flat"),
    ("spacing = 0.25", "spacing = 0", "line 25: surface[2].spacing", "above 0"),
    ('figure = "heat-treated"', 'figure = "bent"', "surface[1].figure", "Figures here"),
    ("solar_reflectance = 0.31", "solar_reflectance = 31", 'finish."atrium glass"', "from 0 to 1"),
    ('"coated glass"', '"shiny"', "angular", "one of clear glass"),
    ('"coated glass"', '"table"', "angular", "wants a table"),
    ("bow_mm = -1.2", "bow = -1.2", "figure.heat-treated.bow", "Did you mean 'bow_mm'"),
    ('source = "clear"', 'source = "weather"', "sky.source", "wants a file"),
    ('source = "clear"', 'source = "clear"\nfile = "a.epw"', "sky.file", "source = 'weather'"),
    ("step_minutes = 5", "step_minutes = 7", "year.step_minutes", "divide 60"),
    ("step_minutes = 5", "step_minutes = 5.5", "year.step_minutes", "whole number"),
    ("day_stride = 4", "day_stride = 0", "year.day_stride", "from 1 to 30"),
    ('look = "along"', 'look = "up"', "observer[1].look", "'along' or"),
    ('look = "along"', "look = [0, 0, 0]", "observer[1].look", "direction"),
    ("[80.0, -40.0, 1.2]", "[80.0, -40.0]", "observer[1].path", "points"),
    ("limit = 1500.0", "limit = -3", "criterion[1].limit", "above 0"),
    ('"total irradiance"', '"brightness"', "criterion[1].quantity", "one of total irradiance"),
    ('["canopy*"]', "[4]", "criterion[1].applies_to", "list of globs"),
    ("[sky]", "[skye]", "skye", "Did you mean 'sky'"),
    ("[site]", "[site", "kestrel.toml", "not valid TOML"),
]


@pytest.mark.parametrize(("old", "new", "where", "says"), WRONG, ids=[w[1][:30] for w in WRONG])
def test_wrong_values_say_where_and_what(write, old, new, where, says):
    assert old in FULL
    with pytest.raises(StudyError) as error:
        read_study(write(FULL.replace(old, new, 1)))
    assert where in error.value.where
    assert says in str(error.value)


def test_names_must_differ(write):
    twice = FULL + FULL[FULL.index("[[criterion]]") :]
    with pytest.raises(StudyError, match="stands twice"):
        read_study(write(twice))


def test_files_that_are_none(tmp_path):
    with pytest.raises(StudyError, match="no such file"):
        read_study(tmp_path / "nothing.toml")
    with pytest.raises(StudyError, match="folder"):
        read_study(tmp_path)
    binary = tmp_path / "binary.toml"
    binary.write_bytes(b"\xff\xfe\x00")
    with pytest.raises(StudyError, match="UTF-8"):
        read_study(binary)


def test_lines_are_not_fooled_by_strings_and_lists():
    text = (
        'a = """\n[b]\nc = 1\n"""\n'
        "[t]\nrows = [\n  [1, 2],  # x = 3\n  [3, 4],\n]\n"
        '"quoted key" = 1\nd.e = 2\n[[s]]\nx = 1\n[[s]]\nx = 2\n'
    )
    lines = index_lines(text)
    assert lines["t",] == 5
    assert lines["t", "rows"] == 6
    assert lines["t", "quoted key"] == 10
    assert lines["t", "d", "e"] == 11
    assert lines["s", 1, "x"] == 15
    assert ("b",) not in lines


def test_every_key_is_documented():
    text = describe_keys()
    for word in ("`latitude` (required)", "`day_stride`", "`applies_to`"):
        assert word in text
