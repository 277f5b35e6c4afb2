"""Weather files of invented stations: format, stamps, energy kept, faults said."""

import numpy as np
import pytest

from causticload.errors import InputError, WeatherError
from causticload.sky.beam import clear_beam
from causticload.sky.position import solar_position
from causticload.sky.weather import read_weather

SITE = {"latitude_deg": 51.07, "longitude_deg": -1.32, "elevation_m": 40.0}


def minutes(begin, end):
    """Middles of the minutes between two times, UTC."""
    return np.arange(np.datetime64(begin), np.datetime64(end), np.timedelta64(1, "m")) + (
        np.timedelta64(30, "s")
    )


def beam_at(weather, times, **place):
    place = {**SITE, **place}
    return weather.beam_at(times, solar_position(times, **place), **place)


def test_reads_an_epw_file(write_epw):
    w = read_weather(write_epw(dni=lambda m, d, h: 100.0 * m + d, dhi=50.0, name="Vörå"))
    assert (w.latitude_deg, w.longitude_deg, w.elevation_m, w.utc_offset_h) == (51.07, -1.32, 40, 0)
    assert w.beam.shape == (8760,)
    assert w.beam[0] == 101.0  # 1 January
    assert w.beam[-1] == 1231.0  # 31 December
    assert w.beam[(31 + 28) * 24] == 301.0  # 1 March, no 29 February
    assert w.notes == ()


def test_reads_a_tmy3_file(write_tmy3):
    w = read_weather(write_tmy3(dni=lambda m, d, h: 10.0 * m + h, temperature=lambda m, d, h: h))
    assert w.name == "MADE UP MESA"
    assert w.utc_offset_h == -7.0
    assert w.beam[0] == 11.0  # 01:00 on 1 January
    # 24:00 on 28 February of a leap year belongs to that day, though the next is the 29th
    assert w.beam[(31 + 28) * 24 - 1] == 44.0
    assert w.temperature_c[-1] == 24.0


@pytest.mark.parametrize("tz", [0.0, 5.5, -7.0])
def test_a_stamp_closes_its_hour(write_epw, tz):
    """EPW: hour 13 of the clock runs from 12:00 to 13:00 local standard time."""
    path = write_epw(dhi=lambda m, d, h: 300.0 if (m, d, h) == (6, 21, 13) else 0.0, tz=tz)
    w = read_weather(path)
    begin = np.datetime64("2026-06-21T12:00") - np.timedelta64(round(tz * 60), "m")
    around = begin + np.array([-1, 0, 59, 60]) * np.timedelta64(1, "m")
    assert beam_at(w, around).diffuse.tolist() == [0.0, 300.0, 300.0, 0.0]


@pytest.mark.parametrize(
    ("begin", "mean"),
    [("2026-06-21T11:00", 600.0), ("2026-06-21T16:00", 400.0), ("2026-12-21T09:00", 150.0)],
)
def test_the_mean_of_an_hour_is_kept(write_epw, begin, mean):
    w = read_weather(write_epw(dni=mean))
    hour = minutes(begin, np.datetime64(begin) + np.timedelta64(1, "h"))
    got = beam_at(w, hour)
    assert got.capped_hours == 0
    # both sides integrate the same smooth curve, one with minutes, one with steps of 5
    assert got.beam.mean() == pytest.approx(mean, rel=1e-3)
    # brighter towards noon: the shape is that of a clear sky
    clear, *_ = clear_beam(solar_position(hour, **SITE), hour, turbidity=2.0, **SITE)
    np.testing.assert_allclose(got.beam / clear, got.beam[0] / clear[0], rtol=1e-9)


def test_the_energy_of_a_sunrise_hour_falls_after_sunrise(write_epw):
    # Sunrise at the site on 21 September is near 05:50 UTC.
    w = read_weather(write_epw(dni=5.0))
    hour = minutes("2026-09-21T05:00", "2026-09-21T06:00")
    up = solar_position(hour, **SITE).elevation_rad > 0.0
    assert 0 < up.sum() < 30
    got = beam_at(w, hour)
    assert np.all(got.beam[~up] == 0.0)
    assert np.all(got.beam[up] > 0.0)
    # the sun comes up within a sample of the hour's mean: a twelfth of an hour of a weak beam
    assert got.beam.mean() == pytest.approx(5.0, rel=0.25)


def test_no_beam_beyond_what_a_clear_sky_lets_through(write_epw):
    w = read_weather(write_epw(dni=1400.0))
    day = minutes("2026-06-21T00:00", "2026-06-22T00:00")
    got = beam_at(w, day)
    clear, *_ = clear_beam(solar_position(day, **SITE), day, turbidity=2.0, **SITE)
    np.testing.assert_allclose(got.beam, 1.1 * clear, rtol=1e-12)
    touched = {str(t)[:13] for t, c in zip(day, clear, strict=True) if c > 0.0}
    assert got.capped_hours == len(touched) > 15
    assert np.all(got.capped[clear > 0.0])


def test_a_leap_day_is_the_day_before(write_epw):
    w = read_weather(write_epw(dhi=lambda m, d, h: 1.0 * d if m == 2 else 0.0))
    days = np.array(["2024-02-28T12:00", "2024-02-29T12:00", "2024-03-01T12:00"], "datetime64[m]")
    assert beam_at(w, days).diffuse.tolist() == [28.0, 28.0, 0.0]


def test_a_file_with_a_leap_day_loses_it_and_says_so(write_epw):
    w = read_weather(write_epw(dhi=lambda m, d, h: float(d), year=2012))
    assert w.diffuse[(31 + 27) * 24] == 28.0
    assert w.diffuse[(31 + 28) * 24] == 1.0
    assert any("29 February" in note for note in w.notes)


def test_air_is_straight_between_stamps(write_epw):
    path = write_epw(temperature=lambda m, d, h: h, wind=lambda m, d, h: 0.5 * h)
    temperature, wind = read_weather(path).air_at(
        np.array(["2026-06-21T13:00", "2026-06-21T13:15", "2026-01-01T00:30"], "datetime64[m]")
    )
    # 13:00 is the stamp of hour 13; half past midnight at new year lies between 24 and 1
    np.testing.assert_allclose(temperature, [13.0, 13.25, 12.5], rtol=1e-12)
    np.testing.assert_allclose(wind, [6.5, 6.625, 6.25], rtol=1e-12)


def test_gaps_of_the_air_are_filled_and_said(write_epw):
    path = write_epw(
        temperature=lambda m, d, h: 99.9 if (d, h) == (5, 12) else h,
        wind=lambda m, d, h: 999.0 if (m, d, h) == (5, 1, 12) else 3.0,
    )
    w = read_weather(path)
    assert w.temperature_c[4 * 24 + 11] == pytest.approx(12.0)  # straight between 11 and 13
    assert any("12 hours of temperature" in note for note in w.notes)
    assert any("1 hours of wind" in note for note in w.notes)


def test_a_gap_in_the_beam_is_an_error_that_says_where(write_epw):
    path = write_epw(dni=lambda m, d, h: 9999.0 if (m, d, h) == (3, 2, 11) else 0.0)
    with pytest.raises(
        WeatherError, match=r"beam is missing in 1 hours, first 3/2 11:00"
    ) as caught:
        read_weather(path)
    assert caught.value.where == "invented.epw"


def test_a_gap_marked_the_tmy3_way(write_tmy3):
    with pytest.raises(WeatherError, match="diffuse is missing"):
        read_weather(write_tmy3(dhi=lambda m, d, h: -9900.0 if (m, d, h) == (1, 1, 1) else 0.0))


@pytest.mark.parametrize(
    ("columns", "text"),
    [
        ({"dni": -1.0}, "beam is -1"),
        ({"dni": 1600.0}, "beam is 1600"),
        ({"temperature": -95.0}, "temperature is -95"),
        ({"wind": -1.0}, "wind is -1"),
        ({"lat": 95.0}, "latitude"),
        ({"tz": 20.0}, "TZ"),
    ],
)
def test_impossible_values_are_errors(write_epw, columns, text):
    with pytest.raises(WeatherError, match=text):
        read_weather(write_epw(**columns))


@pytest.mark.parametrize(
    ("edit", "text"),
    [
        (lambda lines: lines[:-1], "8759 of the 8760"),
        (lambda lines: [*lines, lines[0]], "8761 rows"),
        (lambda lines: lines[:100], "100 rows"),
        (lambda lines: [lines[0].replace("2009,1,1,1,", "2009,13,1,1,"), *lines[1:]], "format"),
        (
            lambda lines: [lines[0].replace("2009,1,1,1,", "2009,1,1,0,"), *lines[1:]],
            "stamped|form",
        ),
    ],
)
def test_a_year_that_is_not_whole_is_an_error(write_epw, edit, text):
    with pytest.raises(WeatherError, match=text):
        read_weather(write_epw(edit=edit))


def test_other_files_are_errors(tmp_path):
    with pytest.raises(WeatherError, match="cannot be read"):
        read_weather(tmp_path / "absent.epw")
    with pytest.raises(WeatherError, match="cannot be read"):
        read_weather(tmp_path)
    other = tmp_path / "other.csv"
    for text in ("", "time,beam\n1,2\n", "LOCATION,too,short\n"):
        other.write_text(text)
        with pytest.raises(WeatherError, match=r"neither|format"):
            read_weather(other)


def test_a_station_elsewhere_is_said(write_epw):
    w = read_weather(write_epw())
    assert w.station_warnings(**SITE) == ()
    # one degree of latitude is 111.2 km
    said = w.station_warnings(latitude_deg=52.07, longitude_deg=-1.32, elevation_m=40.0)
    assert len(said) == 1
    assert "111 km" in said[0]
    assert "Oxbow Airfield" in said[0]
    said = w.station_warnings(latitude_deg=51.07, longitude_deg=-1.32, elevation_m=1040.0)
    assert len(said) == 1
    assert "1000 m below" in said[0]


def test_times_and_positions_must_match(write_epw):
    w = read_weather(write_epw())
    one = np.array(["2026-06-21T12:00"], "datetime64[m]")
    with pytest.raises(InputError, match="1 times, but 2 positions"):
        w.beam_at(one, solar_position(np.repeat(one, 2), **SITE), **SITE)
