"""The sky of a study: what it takes from where, and what it says it assumed."""

from pathlib import Path

import numpy as np
import pytest

from causticload.errors import InputError, StudyError
from causticload.sky.source import Sky
from causticload.study.model import Model, Site, SkySpec, Study

KESTREL = Site(
    latitude=51.07, longitude=-1.32, elevation=40.0, timezone="Europe/London", model_north=12.0
)
NOON = np.array(["2026-06-21T12:00", "2026-12-21T12:00", "2026-06-21T00:00"], "datetime64[m]")


def study(**sky):
    return Study(title="t", path=None, site=KESTREL, model=Model(files=()), sky=SkySpec(**sky))


def test_a_clear_sky():
    sky = Sky.from_study(study())
    s = sky.at(NOON)
    # highest sun: 90 - latitude +- obliquity, 20 minutes of clock from solar noon at the most
    np.testing.assert_allclose(
        np.degrees(s.elevation_rad[:2]), [90 - 51.07 + 23.44, 90 - 51.07 - 23.44], atol=0.3
    )
    assert 700.0 < s.beam[0] < 950.0  # clear midsummer noon in England, common practice
    assert s.beam[0] > s.beam[1] > 300.0
    assert s.beam[2] == 0.0  # midnight
    assert s.elevation_rad[2] < 0.0
    assert s.temperature_c.tolist() == [25.0] * 3
    assert s.wind_ms.tolist() == [1.0] * 3
    text = " ".join(sky.assumed)
    assert "turbidity" in text
    assert "25 °C" in text


def test_a_given_turbidity_is_used_and_not_called_assumed():
    hazy, clean = (Sky.from_study(study(turbidity=t)) for t in (6.0, 2.0))
    assert hazy.at(NOON).beam[0] < clean.at(NOON).beam[0]
    assert "turbidity" not in " ".join(hazy.assumed)


def test_the_disc_is_that_of_the_study():
    assert Sky.from_study(study()).disc.kind == "limb-darkened"
    assert Sky.from_study(study(disc="uniform")).disc.kind == "uniform"


def test_a_weather_file(write_epw):
    path = write_epw(dni=321.0, dhi=123.0, temperature=7.0, wind=3.0, lat=53.0, elev=900.0)
    sky = Sky.from_study(study(source="weather", file=path))
    s = sky.at(NOON[:1] + np.arange(60) * np.timedelta64(1, "m"))
    assert s.beam.mean() == pytest.approx(321.0, rel=2e-3)  # five-minute samples of the hour
    assert s.diffuse[0] == 123.0
    assert (s.temperature_c[0], s.wind_ms[0]) == (7.0, 3.0)
    text = " ".join(sky.assumed)
    assert "215 km" in text  # 1.93 degrees of latitude of 111.2 km
    assert "860 m above" in text
    assert "28 February" in text


def test_a_weather_file_that_is_not_named():
    with pytest.raises(StudyError, match=r"sky\.file is missing"):
        Sky.from_study(study(source="weather"))


def test_a_weather_file_that_is_not_there():
    with pytest.raises(Exception, match="cannot be read"):
        Sky.from_study(study(source="weather", file=Path("absent.epw")))


def test_the_sun_at_given_angles():
    sky = Sky.from_study(study(turbidity=3.0))
    s = sky.at_angles(np.radians([180.0, -10.0]), np.radians([40.0, -1.0]))
    assert np.degrees(s.azimuth_rad[1]) == pytest.approx(350.0)
    assert 2.0 * np.degrees(s.radius_rad[0]) == pytest.approx(0.53291, abs=1e-5)  # at 1 AU
    assert 700.0 < s.beam[0] < 950.0
    assert s.beam[1] == 0.0
    assert np.isnat(s.times).all()
    assert sky.at_angles(3.0, 0.7, beam=812.0).beam.tolist() == [812.0]
    assert sky.at_angles(3.0, -0.1, beam=812.0).beam.tolist() == [0.0]
    assert Sky.from_study(study()).at_angles(3.0, 0.7).beam[0] > 0.0


@pytest.mark.parametrize(
    ("azimuth", "elevation", "beam"),
    [(np.nan, 0.5, None), (1.0, 2.0, None), (1.0, np.nan, None), (1.0, 0.5, -1.0)],
)
def test_refuses_impossible_angles_and_beams(azimuth, elevation, beam):
    with pytest.raises(InputError):
        Sky.from_study(study(turbidity=3.0)).at_angles(azimuth, elevation, beam=beam)
