"""The year as representative days, against spherical astronomy and the calendar."""

import calendar
from datetime import date, timedelta

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from causticload.errors import InputError
from causticload.sky.calendar import format_local
from causticload.sky.plan import plan_year
from causticload.sky.position import geocentric_sun, solar_position
from causticload.sky.source import Sky
from causticload.sky.weather import read_weather
from causticload.study.model import Site, YearSpec

LONDON = Site(latitude=51.5, longitude=-0.1, elevation=20.0, timezone="Europe/London")
SYDNEY = Site(latitude=-33.87, longitude=151.21, timezone="Australia/Sydney")
NORTH = Site(latitude=78.2, longitude=15.6, timezone="Arctic/Longyearbyen")
POLE = Site(latitude=-90.0, longitude=0.0, timezone="UTC")
QUITO = Site(latitude=0.0, longitude=-78.5, timezone="America/Guayaquil")
KIRITIMATI = Site(latitude=1.87, longitude=-157.4, timezone="Pacific/Kiritimati")  # UTC+14
SITES = [LONDON, SYDNEY, NORTH, POLE, QUITO, KIRITIMATI]


def plan(site, **spec):
    spec = {"year": 2025, "step_minutes": 15, "day_stride": 4, **spec}
    return plan_year(site, YearSpec(**spec), Sky(site=site, turbidity=3.0))


@pytest.mark.parametrize("site", SITES, ids=lambda s: s.timezone)
@pytest.mark.parametrize(("year", "stride"), [(2024, 4), (2025, 1), (2025, 7)])
def test_every_day_of_the_year_counts_once(site, year, stride):
    days = plan(site, year=year, day_stride=stride, step_minutes=120)
    assert sum(d.weights.sum() for d in days) == (366 if calendar.isleap(year) else 365)
    dates = [x for d in days for x in d.dates]
    assert len(set(dates)) == len(dates)
    assert all(x.year == year for x in dates)
    assert [d.index for d in days] == list(range(len(days)))
    half = -(-183 // stride)
    assert abs(len(days) - half) <= 2
    for d in days:
        n = len(d.elevation_rad)
        assert np.all(d.weights >= 1.0)
        assert d.azimuth_rad.shape == (n,)
        for array in (
            d.radius_rad,
            d.times,
            d.beam,
            d.diffuse,
            d.temperature_c,
            d.wind_ms,
            d.capped,
        ):
            assert array.shape == (len(d.dates), n)


def test_all_dates_appear_or_are_stood_for_with_stride_one():
    days = plan(LONDON, day_stride=1, step_minutes=240)
    dates = {x for d in days for x in d.dates}
    # each half is about 182 days; some falling dates are the nearest of no rising one
    assert len(dates) >= 355
    assert max(d.weights.max() for d in days) <= 3


@pytest.mark.parametrize("stride", [1, 4, 10])
def test_the_pair_of_dates_shares_its_declination(stride):
    """The declination moves at most 0.4 degrees a day; the nearest date is within half of it."""
    days = plan(LONDON, day_stride=stride, step_minutes=240)
    for d in days:
        noon = np.array([f"{x}T12:00" for x in d.dates], dtype="datetime64[m]")
        declination, _ = geocentric_sun(noon, longitude_deg=0.0)
        # Cooper (1969): 23.45 sin(360 (284 + n) / 365), good to 1.5 degrees
        cooper = [
            23.45 * np.sin(np.radians(360 * (284 + x.timetuple().tm_yday) / 365)) for x in d.dates
        ]
        np.testing.assert_allclose(d.declination_deg, cooper, atol=1.6)
        np.testing.assert_allclose(d.declination_deg, np.degrees(declination), atol=0.01)
        assert abs(d.declination_mismatch_deg) <= 0.21
        assert len(d.dates) == 1 or d.declination_mismatch_deg == pytest.approx(
            d.declination_deg[1] - d.declination_deg[0]
        )
    # the first date rises, the second falls
    solstices = date(2025, 6, 21), date(2025, 12, 21)
    for d in days:
        assert not solstices[0] < d.dates[0] < solstices[1]
        assert all(solstices[0] <= x <= solstices[1] for x in d.dates[1:])


def test_the_track_is_where_the_sun_is_on_the_first_date():
    place = {"latitude_deg": 51.5, "longitude_deg": -0.1, "elevation_m": 20.0}
    for d in plan(LONDON)[::7]:
        p = solar_position(d.times[0], **place)
        np.testing.assert_allclose(d.azimuth_rad, p.azimuth_rad, atol=1e-12)
        np.testing.assert_allclose(d.elevation_rad, p.elevation_rad, atol=1e-12)
        assert np.all(d.elevation_rad > 0.0)


@pytest.mark.parametrize("site", [LONDON, SYDNEY, QUITO, KIRITIMATI], ids=lambda s: s.timezone)
def test_the_mirror_date_has_nearly_the_same_track(site):
    """Same hour angle, and a declination that differs by what the record says."""
    place = {
        "latitude_deg": site.latitude,
        "longitude_deg": site.longitude,
        "elevation_m": site.elevation,
    }
    for d in plan(site)[::5]:
        _, hour_angle = geocentric_sun(d.times.ravel(), longitude_deg=site.longitude)
        apart = np.diff(hour_angle.reshape(d.times.shape), axis=0)
        # times are whole seconds: half of one each, 15 seconds of arc a second
        assert np.abs(np.degrees(apart)).max() < 1.1 * 15.0 / 3600.0
        p = solar_position(d.times[1], **place)
        # declination changes along the day too, the other way on the two dates: 0.2 degrees each
        high = d.elevation_rad > np.radians(3.0)  # refraction amplifies lower down
        off = np.degrees(np.abs(p.elevation_rad - d.elevation_rad))[high]
        assert off.max() < abs(d.declination_mismatch_deg) + 0.41


@pytest.mark.parametrize("site", SITES, ids=lambda s: s.timezone)
def test_steps_tile_the_day(site):
    step = 15
    for d in plan(site, step_minutes=step)[::4]:
        assert d.step_s == step * 60.0
        if len(d.elevation_rad) < 2:
            continue
        _, hour_angle = geocentric_sun(d.times[0], longitude_deg=site.longitude)
        # middles at odd multiples of half a step from solar noon, to half a second of time
        halves = np.degrees(hour_angle) * 4.0 / (step / 2.0)
        np.testing.assert_allclose(halves % 2.0, 1.0, atol=0.01 / 7.5 + 1e-6)
        gaps = np.diff(d.times[0]).astype(float)
        # no hole in a day: steps follow each other to the drift of the equation of time
        np.testing.assert_allclose(gaps, step * 60.0, atol=2.0)


def test_hours_of_sun_agree_with_the_sunrise_equation():
    """cos H0 = (sin(-0.57°) - sin lat sin dec) / (cos lat cos dec), centre lifted by refraction."""
    for d in plan(LONDON, step_minutes=1, day_stride=30):
        lat, dec = np.radians(51.5), np.radians(d.declination_deg[0])
        cos_h = (np.sin(np.radians(-0.5667)) - np.sin(lat) * np.sin(dec)) / (
            np.cos(lat) * np.cos(dec)
        )
        hours = 2.0 * np.degrees(np.arccos(cos_h)) / 15.0
        # a minute's step at both ends, and half a degree less or more of refraction
        assert len(d.elevation_rad) / 60.0 == pytest.approx(hours, abs=0.08)


@pytest.mark.parametrize("site", [NORTH, POLE], ids=["north", "pole"])
def test_polar_day_and_night(site):
    days = plan(site, step_minutes=30)
    counts = [len(d.elevation_rad) for d in days]
    assert min(counts) == 0
    assert max(counts) == 48
    dark = counts.index(0)
    assert days[dark].times.shape == (len(days[dark].dates), 0)
    midsummer = days[-1] if site is NORTH else days[0]
    assert len(midsummer.elevation_rad) == 48
    if site is POLE:  # the sun circles level, at the height of its declination
        assert np.degrees(np.ptp(midsummer.elevation_rad)) < 0.05
        lifted = -midsummer.declination_deg[0] + 0.04  # refraction 23 degrees up: 2 arc minutes
        assert np.degrees(midsummer.elevation_rad.mean()) == pytest.approx(lifted, abs=0.02)


def test_seasons_of_the_southern_hemisphere():
    days = plan(SYDNEY)
    highest = [np.degrees(d.elevation_rad.max()) for d in days]
    # by rising declination: midsummer is first; noon heights 90 - 33.87 +- 23.44, within a step
    assert highest[0] == pytest.approx(90 - 33.87 + 23.44, abs=1.0)
    assert highest[-1] == pytest.approx(90 - 33.87 - 23.44, abs=1.0)


def test_the_sun_is_overhead_at_the_equator_at_the_equinox():
    days = plan(QUITO, day_stride=2, step_minutes=1)
    best = max(days, key=lambda d: d.elevation_rad.max())
    assert np.degrees(best.elevation_rad.max()) > 89.5  # half a step and two days of declination
    assert {best.dates[0].month, best.dates[-1].month} == {3, 9}


def test_dates_are_those_of_the_local_clock():
    for site in (LONDON, SYDNEY, QUITO, KIRITIMATI):
        for d in plan(site)[::6]:
            for row, day in enumerate(d.dates):
                noon = d.times[row, len(d.elevation_rad) // 2]
                text = format_local(noon, site.timezone)
                assert text.startswith(str(day))
                assert 10 <= int(text[11:13]) <= 14


def test_the_day_the_clocks_change_has_all_its_steps():
    """30 March 2025, 01:00 UTC: British clocks go forward. Sun time does not."""
    days = plan(LONDON, day_stride=1, step_minutes=5)
    found = [(d, r) for d in days for r, x in enumerate(d.dates) if x == date(2025, 3, 30)]
    d, row = found[0]
    gaps = np.diff(d.times[row]).astype(int)
    assert gaps.min() >= 299
    assert gaps.max() <= 301
    # sunrise was 05:42 and sunset 18:29 UTC, one hour later on the clock
    assert format_local(d.times[row, 0], "Europe/London")[11:] in {
        f"06:{m} +01:00" for m in range(40, 52)
    }


def test_distance_and_beam_are_each_dates_own():
    d = plan(LONDON)[8]
    first, second = d.dates
    assert first.month in (1, 2)
    assert second.month in (10, 11)
    # nearer to the perihelion of 4 January, so a larger sun
    assert d.radius_rad[0].mean() > d.radius_rad[1].mean()
    sky = Sky(site=LONDON, turbidity=3.0)
    for row in (0, 1):
        np.testing.assert_array_equal(d.beam[row], sky.at(d.times[row]).beam)


def test_the_plan_says_where_a_weather_file_was_cut(write_epw):
    # noon hours of June are impossibly bright, the rest of the year has no beam
    path = write_epw(dni=lambda m, d, h: 1400.0 if (m, h) == (6, 13) else 0.0)
    sky = Sky(site=LONDON, weather=read_weather(path))
    days = plan_year(LONDON, YearSpec(year=2025, step_minutes=15, day_stride=6), sky)
    june = sum(x.month == 6 for d in days for x in d.dates)
    cut = sum(int(d.capped[r].sum()) for d in days for r, x in enumerate(d.dates) if x.month == 6)
    assert cut == june * 4  # quarter hours from 12:00 to 13:00
    assert cut == sum(int(d.capped.sum()) for d in days)


def test_weights_are_the_days_nearest_in_declination():
    """Counted again from the dates: each date goes to the representative of its own half."""
    days = plan(LONDON, day_stride=5, step_minutes=240)
    count = dict.fromkeys((x for d in days for x in d.dates), 0)
    day = date(2025, 1, 1)
    rising = [d.dates[0] for d in days]
    falling = [d.dates[1] for d in days if len(d.dates) == 2]

    def declination(x):
        noon = np.datetime64(f"{x}T12:00")
        return geocentric_sun(noon, longitude_deg=0.0)[0][0]

    known = {x: declination(x) for x in count}
    while day.year == 2025:
        half = falling if date(2025, 6, 21) <= day < date(2025, 12, 21) else rising
        here = declination(day)
        count[min(half, key=lambda x: abs(known[x] - here))] += 1
        day += timedelta(days=1)
    planned = {x: w for d in days for x, w in zip(d.dates, d.weights, strict=True)}
    assert sum(abs(planned[x] - count[x]) for x in count) <= 4  # ties and the solstices' own dates


@settings(max_examples=15, deadline=None)
@given(
    st.floats(-90.0, 90.0), st.floats(-180.0, 180.0), st.integers(1990, 2060), st.integers(1, 30)
)
def test_any_place_and_year_gives_a_whole_year(latitude, longitude, year, stride):
    site = Site(latitude=latitude, longitude=longitude)
    days = plan(site, year=year, day_stride=stride, step_minutes=180)
    assert sum(d.weights.sum() for d in days) == (366 if calendar.isleap(year) else 365)
    assert all(np.all(d.elevation_rad > 0.0) for d in days)


@pytest.mark.parametrize(
    ("spec", "text"),
    [
        ({"step_minutes": 7}, "step_minutes"),
        ({"step_minutes": 0}, "step_minutes"),
        ({"day_stride": 0}, "day_stride"),
        ({"day_stride": 61}, "day_stride"),
        ({"year": 1800}, "year"),
    ],
)
def test_refuses_what_is_out_of_range(spec, text):
    with pytest.raises(InputError, match=text):
        plan(LONDON, **spec)


def test_refuses_the_sky_of_another_site():
    with pytest.raises(InputError, match="another site"):
        plan_year(LONDON, YearSpec(), Sky(site=SYDNEY))
