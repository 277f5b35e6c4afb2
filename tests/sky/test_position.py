"""Sun positions, against the printed SPA example, astropy and almanac figures."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from causticload.errors import InputError
from causticload.sky.position import (
    angular_radius,
    geocentric_sun,
    solar_position,
    sun_angles,
    sun_direction,
    sun_position,
)

GOLDEN = {"latitude_deg": 39.742476, "longitude_deg": -105.1786, "elevation_m": 1830.14}


def refraction_deg(true_elevation_deg, *, mbar, celsius):
    """Bennett's formula as SPA prints it (Reda & Andreas, NREL/TP-560-34302, eq. 42)."""
    e = true_elevation_deg
    arc_minutes = 1.02 / math.tan(math.radians(e + 10.3 / (e + 5.11)))
    return mbar / 1010.0 * 283.0 / (273.0 + celsius) * arc_minutes / 60.0


def test_printed_example_of_spa():
    """Reda & Andreas, NREL/TP-560-34302 (2008), Table A5.1: 2003-10-17 12:30:30 UTC-7.

    The report takes TT - UT 67 s, 820 mbar and 11 °C. Here TT - UT follows from the year (64.5 s),
    the pressure from the height and the air is at 12 °C: the first moves the sun 3e-5 degrees
    along the ecliptic, the others change the refraction as the report's own formula says.
    """
    p = solar_position(np.datetime64("2003-10-17T19:30:30"), **GOLDEN)
    assert np.degrees(p.azimuth_rad[0]) == pytest.approx(194.340241, abs=1e-4)
    assert p.distance_au[0] == pytest.approx(0.996542, abs=1e-6)  # six digits printed
    true = 39.872046  # printed e0
    # standard atmosphere, ISO 2533: 1013.25 (1 - 2.25577e-5 h)^5.25588 mbar
    mbar = 1013.25 * (1.0 - 2.25577e-5 * 1830.14) ** 5.25588
    want = true + refraction_deg(true, mbar=mbar, celsius=12.0)
    assert np.degrees(p.elevation_rad[0]) == pytest.approx(want, abs=1e-4)
    # and the printed zenith, which differs by the refraction of 8 mbar and 1 K only
    assert 90.0 - np.degrees(p.elevation_rad[0]) == pytest.approx(50.111622, abs=3e-4)


@pytest.fixture(scope="module")
def astropy_sun():
    from astropy import units as u
    from astropy.coordinates import TETE, AltAz, EarthLocation, get_sun
    from astropy.time import Time
    from astropy.utils import iers

    def look(times, latitude, longitude, elevation):
        with iers.conf.set_temp("auto_download", False), iers.conf.set_temp(
            "iers_degraded_accuracy", "ignore"
        ):  # fmt: skip
            place = EarthLocation(
                lat=latitude * u.deg, lon=longitude * u.deg, height=elevation * u.m
            )
            when = Time(times)
            sun = get_sun(when)
            seen = sun.transform_to(AltAz(obstime=when, location=place, pressure=0 * u.hPa))
            of_date = sun.transform_to(TETE(obstime=when))
            return seen.az.rad, seen.alt.rad, sun.distance.to_value(u.au), of_date.dec.rad

    return look


@pytest.mark.parametrize(
    ("latitude", "longitude"),
    [(51.07, -1.32), (-33.87, 151.21), (0.0, -78.5), (78.2, 15.6), (-89.9, 0.0), (40.0, 179.9)],
)
def test_agrees_with_astropy(astropy_sun, latitude, longitude):
    """Without refraction, to 0.01 degrees: a fiftieth of the sun's width."""
    times = np.datetime64("2019-01-03T02:00") + np.arange(60) * np.timedelta64(149 * 60 + 7, "m")
    azimuth, elevation, distance, _ = astropy_sun(times, latitude, longitude, 40.0)
    p = solar_position(times, latitude_deg=latitude, longitude_deg=longitude, elevation_m=40.0)
    up = elevation > np.radians(-0.5)
    lifted = np.degrees(elevation) + np.where(
        up, [refraction_deg(e, mbar=1008.5, celsius=12.0) for e in np.degrees(elevation)], 0.0
    )
    deep = elevation < np.radians(-1.5)
    assert up.sum() > 10
    assert deep.sum() > 10
    here = up | deep  # between them lies the place where the algorithm drops refraction
    got = sun_direction(p.azimuth_rad, p.elevation_rad, north_rad=0.0)[here]
    want = sun_direction(azimuth, np.radians(lifted), north_rad=0.0)[here]
    apart = np.degrees(np.linalg.norm(got - want, axis=1))
    assert apart.max() < 0.01
    np.testing.assert_allclose(p.distance_au, distance, atol=2e-5)


def test_declination_agrees_with_astropy(astropy_sun):
    times = np.datetime64("2024-01-01T12:00") + np.arange(0, 366, 5) * np.timedelta64(1, "D")
    *_, declination = astropy_sun(times, 0.0, 0.0, 0.0)
    got, _ = geocentric_sun(times, longitude_deg=0.0)
    # both of the true equator of date; SPA claims 0.0003 degrees
    assert np.degrees(np.abs(got - declination)).max() < 5e-4


def test_hour_angle_is_the_equation_of_time():
    """Extremes of the equation of time, from almanacs: -14.2 min 11 Feb, +16.4 min 3 Nov."""
    noon = np.array(["2025-02-11T12:00", "2025-11-03T12:00"], dtype="datetime64[m]")
    _, hour_angle = geocentric_sun(noon, longitude_deg=0.0)
    np.testing.assert_allclose(np.degrees(hour_angle) * 4.0, [-14.2, 16.4], atol=0.1)


def test_refraction_at_the_horizon_is_34_minutes_of_arc():
    """Standard refraction at the horizon: 34 arc minutes at 1010 mbar, 10 °C (almanacs).

    Where the centre stands on the horizon to the eye it lies about that far below.
    """
    times = np.datetime64("2025-03-20T05:50") + np.arange(1200) * np.timedelta64(1, "s")
    p = solar_position(times, latitude_deg=0.0, longitude_deg=0.0, elevation_m=0.0)
    # On the equator at the equinox the sun climbs 15.04 degrees an hour, straight up. Half a day
    # after solar midnight plus six hours its centre is on the true horizon.
    _, hour_angle = geocentric_sun(times, longitude_deg=0.0)
    true = 90.0 - np.abs(np.degrees(hour_angle))
    on = np.argmin(np.abs(true + 0.54))  # below 0.5667 + 0.26667, where SPA drops refraction
    lift = np.degrees(p.elevation_rad[on]) - true[on]
    assert lift == pytest.approx(34.0 / 60.0, abs=0.05)


@pytest.mark.parametrize(
    ("distance", "diameter_deg"),
    # closed form, computed independently: mean, perihelion and aphelion distances
    [(1.0, 0.53291), (1.0 - 0.016710, 0.54196), (1.0 + 0.016710, 0.52415)],
)
def test_angular_diameter(distance, diameter_deg):
    # the Earth's eccentricity is 0.0167: four digits of the diameter
    assert 2 * np.degrees(angular_radius(distance)) == pytest.approx(diameter_deg, abs=2e-5)


def test_extreme_distances_of_a_year():
    """The sun is nearest on about 3 January (0.9833 AU), farthest on about 4 July (1.0167)."""
    days = np.arange("2025-01-01", "2026-01-01", dtype="datetime64[D]")
    p = solar_position(days, latitude_deg=0.0, longitude_deg=0.0, elevation_m=0.0)
    assert str(days[p.distance_au.argmin()]) in {"2025-01-04", "2025-01-05"}  # 4 Jan 13 h UTC
    assert str(days[p.distance_au.argmax()]) in {"2025-07-03", "2025-07-04"}  # 3 Jul 20 h UTC
    assert p.distance_au.min() == pytest.approx(0.98333, abs=1e-5)
    assert p.distance_au.max() == pytest.approx(1.01664, abs=1e-5)
    assert p.radius_rad.max() == pytest.approx(np.radians(0.54196) / 2, rel=1e-4)


def test_direction_in_the_model():
    def direction(azimuth, elevation, north):
        return sun_direction(*np.radians([azimuth, elevation]), north_rad=np.radians(north))[0]

    np.testing.assert_allclose(direction(0, 0, 0), [0, 1, 0], atol=1e-15)
    np.testing.assert_allclose(direction(90, 0, 0), [1, 0, 0], atol=1e-15)
    np.testing.assert_allclose(direction(12, 0, 12), [0, 1, 0], atol=1e-15)  # +Y bears 12
    np.testing.assert_allclose(direction(0, 0, 90), [-1, 0, 0], atol=1e-15)  # +Y east, -X north
    np.testing.assert_allclose(direction(123, 90, 45), [0, 0, 1], atol=1e-15)


@given(st.floats(0.0, 6.28), st.floats(-1.5, 1.5), st.floats(-7.0, 7.0))
def test_direction_and_angles_are_inverse(azimuth, elevation, north):
    d = sun_direction(azimuth, elevation, north_rad=north)
    assert np.linalg.norm(d) == pytest.approx(1.0, abs=1e-14)
    back, height = sun_angles(3.0 * d, north_rad=north)
    # rounding, divided by the cosine of the elevation
    turn = (back[0] - azimuth + np.pi) % (2 * np.pi) - np.pi
    assert turn == pytest.approx(0.0, abs=1e-12)
    assert height[0] == pytest.approx(elevation, abs=1e-12)


@pytest.mark.parametrize("d", [[[0.0, 0.0, 0.0]], [1.0, 0.0, 0.0], [[math.nan, 0.0, 1.0]]])
def test_angles_refuse_no_direction(d):
    with pytest.raises(InputError):
        sun_angles(d, north_rad=0.0)


def test_edge_function_is_in_degrees_and_keeps_the_shape():
    one = sun_position(39.742476, -105.1786, 1830.14, "2003-10-17T12:30:30-07:00")
    assert one.azimuth.shape == ()
    assert one.azimuth == pytest.approx(194.340241, abs=1e-4)
    grid = np.full((2, 3), np.datetime64("2003-10-17T19:30:30"))
    many = sun_position(39.742476, -105.1786, 1830.14, grid)
    assert many.elevation.shape == (2, 3)
    assert many.elevation[1, 2] == one.elevation
    assert one.radius == pytest.approx(math.asin(695_700 / (0.996542 * 149_597_870.7)), rel=1e-6)


@pytest.mark.parametrize(
    ("latitude", "longitude", "elevation"),
    [(91.0, 0.0, 0.0), (0.0, 181.0, 0.0), (0.0, 0.0, 9001.0), (math.nan, 0.0, 0.0)],
)
def test_refuses_a_place_off_the_earth(latitude, longitude, elevation):
    with pytest.raises(InputError, match="must be from"):
        sun_position(latitude, longitude, elevation, np.datetime64("2025-01-01"))


def test_no_times_give_no_positions():
    none = solar_position(np.array([], dtype="datetime64[s]"), **GOLDEN)
    assert none.azimuth_rad.shape == none.radius_rad.shape == (0,)
