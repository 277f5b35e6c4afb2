"""Keys of a surface figure: what goes together and what does not."""

import pytest

from causticload.errors import StudyError
from causticload.study import read_study, write_study

STUDY = """\
[site]
latitude = 50.0
longitude = 0.0

[model]
files = ["wall.obj"]

[[surface]]
match = "*"
role = "reflector"
figure = "pane"

[figure.pane]
"""


@pytest.fixture
def read(tmp_path):
    (tmp_path / "wall.obj").write_text("v 0 0 0\n")

    def read_keys(keys):
        file = tmp_path / "study.toml"
        file.write_text(STUDY + keys)
        return read_study(file)

    return read_keys


@pytest.mark.parametrize(
    "keys",
    [
        "bow_mm = -1.2",
        "bow_mm = -1.2\ninner_bow_mm = 1.0\npanes_mm = [8, 6]",
        "cavity_pressure_kpa = -16",
        "cavity_pressure_kpa = -16\npanes_mm = [6, 4, 6]\ngap_mm = [16, 14]",
        "sealed_temperature_c = 20\ntemperature_c = -5\nsealed_pressure_kpa = 99\n"
        "pressure_kpa = 103\nsealed_altitude_m = 300\ngap_mm = 12",
        'roller_wave_mm = 0.08\nroller_pitch_mm = 300\nroller_along = "height"\nseed = 4',
        "edge_kink_mm = 0.3\nedge_kink_width_mm = 50",
        "tilt_mrad = 0.5\nseed = 2",
        "cold_bent = true",
    ],
)
def test_keys_that_go_together_come_back_from_a_file(read, keys, tmp_path):
    study = read(keys)
    again = read_study(write_study(study, tmp_path / "again.toml"))
    assert again.figures == study.figures
    assert set(study.figures["pane"].settings) == {
        line.split(" = ")[0] for line in keys.splitlines()
    }


@pytest.mark.parametrize(
    ("keys", "key"),
    [
        ("bow_mm = -1\ncavity_pressure_kpa = -4", "cavity_pressure_kpa"),
        ("bow_mm = -1\nsealed_temperature_c = 20\ntemperature_c = 0", "sealed_temperature_c"),
        ("cavity_pressure_kpa = 4\ntemperature_c = 0", "temperature_c"),
        ("temperature_c = 0", "temperature_c"),
        ("pressure_kpa = 100\ntilt_mrad = 1", "pressure_kpa"),
        ("inner_bow_mm = 1", "inner_bow_mm"),
        ("panes_mm = [6, 6]\ntilt_mrad = 1", "panes_mm"),
        ("cavity_pressure_kpa = 4\npanes_mm = [6]", "panes_mm"),
        ("cavity_pressure_kpa = 4\npanes_mm = [6, 0]", "panes_mm"),
        ("cavity_pressure_kpa = 4\ngap_mm = [16, 16]", "gap_mm"),
        ("cavity_pressure_kpa = 4\ngap_mm = 0", "gap_mm"),
        ("bow_mm = 1\ngap_mm = 16", "gap_mm"),
        ("roller_wave_mm = 0.08", "roller_wave_mm"),
        ("roller_pitch_mm = 300", "roller_pitch_mm"),
        ('bow_mm = 1\nroller_along = "width"', "roller_along"),
        ('bow_mm = 1\nroller_as = "mean"', "roller_as"),
        ("edge_kink_mm = 0.3", "edge_kink_mm"),
        ("bow_mm = 1\nseed = 3", "seed"),
        ("seed = 3", "seed"),
        ("cold_bent = false", "cold_bent"),
        ("bow = 1", "bow"),
    ],
)
def test_contradictions_name_the_key(read, keys, key):
    with pytest.raises(StudyError) as caught:
        read(keys)
    assert f"figure.pane.{key}" in caught.value.where or f"figure.pane.{key}" in str(caught.value)


def test_empty_figure_is_said_to_say_nothing(read):
    with pytest.raises(StudyError, match="says nothing"):
        read("")
