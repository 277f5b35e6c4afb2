"""Clear-sky irradiance, against published formulas, a second model and Spencer's series."""

import numpy as np
import pytest

from causticload.errors import InputError
from causticload.sky.beam import clear_beam, extraterrestrial_beam, table_turbidity
from causticload.sky.position import SunPosition, solar_position

SEA = {"latitude_deg": 51.0, "longitude_deg": 0.0, "elevation_m": 0.0}


def sun_at_zenith_angle(zenith_deg, distance_au=1.0):
    z = np.radians(np.atleast_1d(np.asarray(zenith_deg, dtype=float)))
    return SunPosition(
        azimuth_rad=np.zeros_like(z),
        elevation_rad=np.pi / 2.0 - z,
        distance_au=np.full_like(z, distance_au),
        radius_rad=np.full_like(z, 4.65e-3),
    )


def kasten_young(zenith_deg):
    """Kasten & Young, Applied Optics 28(22) (1989)."""
    z = np.asarray(zenith_deg, dtype=float)
    return 1.0 / (np.cos(np.radians(z)) + 0.50572 * (96.07995 - z) ** -1.6364)


def test_air_mass_of_kasten_and_young():
    # values printed with the formula, z 60, 75, 80, 85
    np.testing.assert_allclose(
        kasten_young([60, 75, 80, 85]), [1.9943, 3.8129, 5.5860, 10.3058], atol=5e-5
    )
    # and the beam falls with it: DNI = b I0 exp(-0.09 m (TL - 1)), Ineichen & Perez (2002), where
    # no cap is reached
    beam, _, _ = clear_beam(sun_at_zenith_angle([60, 75]), None, turbidity=3.0, **SEA)
    want = 0.827 * 1361.0 * np.exp(-0.09 * kasten_young([60, 75]) * 2.0)
    np.testing.assert_allclose(beam, want, rtol=1e-5)  # digits of the constants


def test_ineichen_perez_values():
    """Linke turbidity 3 at sea level under 1361 W/m²: Ineichen & Perez, Solar Energy 73 (2002)."""
    beam, diffuse, total = clear_beam(
        sun_at_zenith_angle([20, 50, 75, 85]), None, turbidity=3.0, **SEA
    )
    np.testing.assert_allclose(beam, [929.4, 851.0, 566.6, 176.1], atol=0.05)
    np.testing.assert_allclose(total, [981.1, 634.0, 196.4, 31.1], atol=0.05)
    cos_zenith = np.cos(np.radians([20, 50, 75, 85]))
    np.testing.assert_allclose(beam * cos_zenith + diffuse, total, rtol=1e-12)


def test_agrees_with_another_model():
    """Bird & Hulstrom (1981): AOD 0.1 at 380 and 500 nm, 1.5 cm water, 0.3 cm ozone.

    A clear day like that has a Linke turbidity of about 2.9. Two models of clear sky differ by
    some 10 % with the sun above 15 degrees; they must not differ by more.
    """
    beam, _, _ = clear_beam(sun_at_zenith_angle([20, 50, 75]), None, turbidity=2.9, **SEA)
    np.testing.assert_allclose(beam, [951.0, 870.7, 618.6], rtol=0.1)


@pytest.mark.parametrize(("date", "factor_day"), [("2003-10-17", 290), ("2003-01-03", 3)])
def test_distance_follows_spencer(date, factor_day):
    """Spencer, Search 2(5) (1971), for the square of 1 AU over the distance.

    The series peaks at 1.0350 where 1/(1 - e)² with the Earth's e = 0.0167 is 1.0342: 0.1 %.
    """
    b = 2.0 * np.pi * (factor_day - 1) / 365.0
    spencer = (
        1.00011
        + 0.034221 * np.cos(b)
        + 0.00128 * np.sin(b)
        + 0.000719 * np.cos(2 * b)
        + 0.000077 * np.sin(2 * b)
    )
    p = solar_position(np.datetime64(f"{date}T12:00"), **SEA)
    assert extraterrestrial_beam(p.distance_au)[0] == pytest.approx(1361.0 * spencer, rel=1e-3)


def test_beam_above_the_air():
    # NREL/TP-560-34302: r = 0.996542 AU on 2003-10-17 -> 1370.46 W/m²
    assert extraterrestrial_beam(0.996542) == pytest.approx(1370.46, abs=0.01)
    # closed form, computed independently: aphelion and perihelion
    np.testing.assert_allclose(
        extraterrestrial_beam([1.01671, 0.98329]), [1316.6, 1407.7], atol=0.1
    )


def test_there_is_none_when_the_sun_is_down():
    for values in clear_beam(sun_at_zenith_angle([90.0, 90.1, 95.0, 180.0]), None, turbidity=3.0,
                             **SEA):  # fmt: skip
        assert np.all(values == 0.0)


def test_mountains_get_more_and_haze_less():
    def beam(elevation_m, turbidity):
        place = {"latitude_deg": 45.0, "longitude_deg": 7.0, "elevation_m": elevation_m}
        return clear_beam(sun_at_zenith_angle(40.0), None, turbidity=turbidity, **place)[0][0]

    assert beam(2500.0, 3.0) > beam(0.0, 3.0) > beam(0.0, 5.0) > 0.0


def test_turbidity_table_is_read_and_goes_round_the_year():
    days = np.arange("2023-12-25", "2025-01-10", dtype="datetime64[D]")
    t = table_turbidity(days, latitude_deg=51.07, longitude_deg=-1.32)
    # Linke turbidity over land in middle latitudes: 2 to 6, common practice
    assert 2.0 < t.min() < t.max() < 6.0
    # a month's change is below 1; nothing jumps from day to day, nor at new year or a leap day
    assert np.abs(np.diff(t)).max() < 1.0 / 15.0


def test_table_matches_pvlib_in_the_middle_of_months():
    import pandas as pd
    from pvlib import clearsky

    middle = pd.DatetimeIndex(["2025-01-16", "2025-06-16", "2025-10-16"], tz="UTC")
    want = clearsky.lookup_linke_turbidity(middle, -33.9, 151.2, interp_turbidity=False)
    got = table_turbidity(middle, latitude_deg=-33.9, longitude_deg=151.2)
    np.testing.assert_allclose(got, want, atol=0.02)  # half a day from the middle


def test_table_is_used_when_no_turbidity_is_given():
    times = np.array(["2025-06-21T12:00"], dtype="datetime64[m]")
    p = solar_position(times, **SEA)
    t = table_turbidity(times, latitude_deg=51.0, longitude_deg=0.0)[0]
    np.testing.assert_allclose(
        clear_beam(p, times, **SEA), clear_beam(p, times, turbidity=t, **SEA), rtol=1e-12
    )


@pytest.mark.parametrize("turbidity", [0.9, 15.1, np.nan, -1.0])
def test_refuses_impossible_turbidity(turbidity):
    with pytest.raises(InputError, match="turbidity"):
        clear_beam(sun_at_zenith_angle(30.0), None, turbidity=turbidity, **SEA)


@pytest.mark.parametrize("distance", [0.0, -1.0, np.nan])
def test_refuses_no_distance(distance):
    with pytest.raises(InputError, match="distance"):
        extraterrestrial_beam(distance)
