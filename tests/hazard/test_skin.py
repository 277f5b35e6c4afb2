"""Skin laws against published tables, closed forms and scipy quadrature."""

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad, trapezoid

from causticload.errors import InputError
from causticload.hazard import contact, skin
from causticload.hazard.skin import (
    DESR_BURN,
    EPA_BURN,
    EPA_PAIN,
    ISO_13571_BURN,
    ISO_13571_PAIN,
    SFPE_PAIN,
    SKIN_LAWS,
    STOLL_BURN,
    dose,
    time_to_effect,
)

# Values of the published laws, computed independently to the digits shown.
LAW_TIMES = [
    # kW/m², ISO 13571 pain, ISO 13571 burn, SFPE pain, Stoll burn, DESR 6055 burn (s)
    (2.5, 44.2, 99.1, 33.4, 68.8, 52.5),
    (4.0, 18.1, 47.6, 17.9, 35.4, 26.4),
    (6.3, 7.6, 23.4, 9.8, 18.7, 13.6),
    (9.5, 3.5, 12.4, 5.7, 10.4, 7.5),
    (12.5, 2.1, 8.1, 3.9, 7.1, 5.0),
]

# FEMA/DOT/EPA, Handbook of Chemical Hazard Analysis Procedures (1989), Table 4.2:
# kW/m², time to pain, time to second-degree burn (s).
EPA_TABLE = np.array(
    [
        (1, 115, 663),
        (2, 45, 187),
        (3, 27, 92),
        (4, 18, 57),
        (5, 13, 40),
        (6, 11, 30),
        (8, 7, 20),
        (10, 5, 14),
        (12, 4, 11),
    ],
    dtype=float,
)

# Stoll & Chianta (1969): seconds, kW/m² for a second-degree burn.
STOLL_TABLE = np.array(
    [
        (1, 50),
        (2, 31),
        (3, 23),
        (4, 19),
        (5, 16),
        (6, 14),
        (7, 13),
        (8, 11.5),
        (9, 10.6),
        (10, 9.8),
        (15, 7.4),
        (20, 6.0),
        (25, 5.1),
        (30, 4.5),
    ]
)

# Buettner, as in API 521: kW/m², time to pain (s). From memory.
BUETTNER_TABLE = np.array(
    [(1.74, 60), (2.33, 40), (2.90, 30), (4.73, 16), (6.94, 9), (9.46, 6), (11.67, 5), (19.87, 2)]
)


@pytest.mark.parametrize(
    ("column", "law"),
    [
        (1, ISO_13571_PAIN),
        (2, ISO_13571_BURN),
        (3, SFPE_PAIN),
        (4, STOLL_BURN),
        (5, DESR_BURN),
    ],
)
def test_laws_give_their_published_times(column, law):
    rows = np.array(LAW_TIMES)
    times = time_to_effect(rows[:, 0] * 1000.0, law=law, extrapolate=True)
    # one printed digit; 0.06 because one entry (Stoll, 9.5) was cut, not rounded: 10.45
    np.testing.assert_allclose(times.value, rows[:, column], atol=0.06)


def test_epa_fits_stay_close_to_the_printed_table():
    q = EPA_TABLE[:, 0] * 1000.0
    np.testing.assert_allclose(time_to_effect(q, law=EPA_PAIN).value, EPA_TABLE[:, 1], rtol=0.07)
    np.testing.assert_allclose(time_to_effect(q, law=EPA_BURN).value, EPA_TABLE[:, 2], rtol=0.11)


def test_sfpe_pain_agrees_with_the_epa_table():
    """Two independent sources of pain times; 6 % is about the rounding of the table."""
    rows = EPA_TABLE[EPA_TABLE[:, 0] > 1.7]
    times = time_to_effect(rows[:, 0] * 1000.0, law=SFPE_PAIN).value
    np.testing.assert_allclose(times, rows[:, 1], rtol=0.06)


def test_sfpe_pain_agrees_with_buettner():
    """Whole seconds and other subjects: 15 % is the spread of the two sources."""
    times = time_to_effect(BUETTNER_TABLE[:, 0] * 1000.0, law=SFPE_PAIN).value
    np.testing.assert_allclose(times, BUETTNER_TABLE[:, 1], rtol=0.15)


def test_stoll_fit_reproduces_the_table():
    times = time_to_effect(STOLL_TABLE[:, 1] * 1000.0, law=STOLL_BURN)
    assert times.in_range.all()
    # 3 % in flux, as of ASTM F1939's fit, is 3 % * 1.411 in time
    np.testing.assert_allclose(times.value, STOLL_TABLE[:, 0], rtol=0.03 * 1.411)


def test_nothing_is_extrapolated_silently():
    stoll = time_to_effect([4000.0, 10000.0, 60000.0], law=STOLL_BURN)
    assert stoll.in_range.tolist() == [False, True, False]
    assert np.isnan(stoll.value[[0, 2]]).all()
    iso = time_to_effect([0.0, 2500.0, 2501.0], law=ISO_13571_PAIN)  # no dose at or below 2.5
    assert iso.in_range.all()
    assert np.isinf(iso.value[:2]).all()
    assert np.isfinite(iso.value[2])


def test_iso_13571_dose_of_a_constant_flux():
    """4 kW/m² for 20 s: closed form of ISO 13571, computed independently."""
    pain = dose([0.0, 20.0], [4000.0, 4000.0], law=ISO_13571_PAIN)
    burn = dose([0.0, 20.0], [4000.0, 4000.0], law=ISO_13571_BURN)
    assert pain.value == pytest.approx(1.105, abs=5e-4)
    assert burn.value == pytest.approx(0.420, abs=5e-4)
    assert pain.in_range
    assert dose([0.0, 3600.0], [2500.0, 2500.0], law=ISO_13571_PAIN).value == 0.0


@pytest.mark.parametrize("law", list(SKIN_LAWS.values()), ids=list(SKIN_LAWS))
def test_dose_of_a_moving_flux_is_its_integral(law):
    times = np.array([0.0, 7.0, 8.0, 20.0, 21.0, 30.0])
    flux = np.array([0.0, 9000.0, 9000.0001, 1200.0, 4000.0, 0.0])

    def rate(t):
        q = np.interp(t, times, flux) / 1000.0
        if law.harmless_below and q * 1000.0 <= law.flux_min:
            return 0.0
        return q**law.exponent / law.coefficient

    # break at the corners and where the flux crosses a floor, so that quad sees smooth pieces
    cuts = []
    for a, b, fa, fb in zip(times[:-1], times[1:], flux[:-1], flux[1:], strict=True):
        cuts.append(a)
        if (fa - law.flux_min) * (fb - law.flux_min) < 0.0:
            cuts.append(a + (law.flux_min - fa) / (fb - fa) * (b - a))
    cuts.append(times[-1])
    expected = sum(quad(rate, a, b, epsabs=1e-12)[0] for a, b in pairwise(cuts))
    assert dose(times, flux, law=law).value == pytest.approx(expected, rel=1e-6)


def test_dose_is_vectorised_over_points_and_flags_each():
    flux = np.array([[3000.0, 60000.0, 0.0], [5000.0, 60000.0, 0.0]])
    both = dose([0.0, 10.0], flux, law=SFPE_PAIN)
    assert both.in_range.tolist() == [True, False, True]
    one = dose([0.0, 10.0], flux[:, 0], law=SFPE_PAIN)
    assert both.value[0] == pytest.approx(float(one.value), rel=1e-12)
    assert both.value[2] == 0.0


def test_vanishing_flux_gives_no_dose_and_no_warning():
    for law in SKIN_LAWS.values():
        faint = dose([0.0, 1.0, 2.0], [0.0, 5e-324, 1e-300], law=law)
        assert faint.value == 0.0
    assert contact.henriques_damage([0.0, 1.0], [0.0, 5e-324]) == 0.0


def test_thermal_dose_units():
    """Closed forms: constant 8 kW/m² for 10 s is 160; a ramp 0 to 8 gives 3/7 of it."""
    units = skin.thermal_dose_units([0.0, 10.0], [[8000.0, 0.0], [8000.0, 8000.0]])
    np.testing.assert_allclose(units, [160.0, 160.0 * 3.0 / 7.0], rtol=1e-12)


@given(
    flux=st.lists(st.floats(0.0, 30000.0), min_size=2, max_size=8),
    more=st.floats(0.0, 5000.0),
    law=st.sampled_from(list(SKIN_LAWS.values())),
)
def test_more_flux_never_means_less_dose(flux, more, law):
    times = np.arange(len(flux)) * 3.0
    low = dose(times, flux, law=law).value
    high = dose(times, np.asarray(flux) + more, law=law).value
    assert high >= low * (1.0 - 1e-9) - 1e-15


@given(
    flux=st.lists(st.floats(0.0, 30000.0), min_size=3, max_size=8),
    law=st.sampled_from(list(SKIN_LAWS.values())),
)
def test_dose_adds_up_over_time(flux, law):
    times = np.arange(len(flux)) ** 1.5
    whole = dose(times, flux, law=law).value
    parts = dose(times[:2], flux[:2], law=law).value + dose(times[1:], flux[1:], law=law).value
    assert parts == pytest.approx(float(whole), rel=1e-9, abs=1e-15)


@given(st.floats(1.0, 49999.0), st.floats(1.001, 1.5), st.sampled_from(list(SKIN_LAWS.values())))
def test_stronger_flux_acts_sooner(q, factor, law):
    slow = time_to_effect(q, law=law, extrapolate=True).value
    fast = time_to_effect(q * factor, law=law, extrapolate=True).value
    assert fast < slow


def test_walking_through_a_spot_is_the_dose_of_the_profile():
    path = np.linspace(0.0, 4.0, 401)
    profile = 1000.0 + 7000.0 * np.exp(-(((path - 2.0) / 0.4) ** 2))
    walked = skin.crossing_dose(path, profile, law=ISO_13571_PAIN, speed=0.8)
    q = profile / 1000.0
    expected = trapezoid(np.where(q > 2.5, q**1.9, 0.0), path) / 0.8 / 252.0
    # the trapezoid counts whole the two 10 mm steps that cross the floor: 0.5 % of the width
    assert walked.value == pytest.approx(expected, rel=0.005)
    slower = skin.crossing_dose(path, profile, law=ISO_13571_PAIN, speed=0.4)
    assert slower.value == pytest.approx(2.0 * float(walked.value), rel=1e-12)


def test_crossing_a_round_spot_takes_the_chord():
    """A 0.6 m spot of 4 kW/m², line 0.18 m off the middle: chord 0.48 m; ISO pain 18.1 s."""
    crossed = skin.spot_crossing_dose(
        flux=4000.0, diameter_m=0.6, offset_m=0.18, speed=0.5, law=ISO_13571_PAIN
    )
    assert crossed.value == pytest.approx(0.48 / 0.5 / 18.1, rel=0.003)  # 18.1 has three digits
    missed = skin.spot_crossing_dose(flux=4000.0, diameter_m=0.6, offset_m=0.3, law=ISO_13571_PAIN)
    assert missed.value == 0.0
    mild = skin.spot_crossing_dose(flux=2500.0, diameter_m=0.6, law=ISO_13571_PAIN)
    assert mild.value == 0.0
    assert mild.in_range


def test_a_fixed_mirror_moves_its_image_with_the_sun():
    """Closed form: 0.5329 degrees at 15 degrees an hour is 128 s; 50 m gives 0.218 m/min."""
    assert skin.image_dwell_s(np.deg2rad(0.53291)) == pytest.approx(128.0, abs=0.2)
    assert skin.spot_speed(50.0) * 60.0 == pytest.approx(0.218, abs=5e-4)
    tilted = skin.spot_speed(50.0, declination=np.deg2rad(60.0))
    assert tilted == pytest.approx(float(skin.spot_speed(50.0)) / 2.0)


def test_icnirp_skin_limit():
    """ICNIRP / 2006/25/EC, 20 000 t^-0.75 W/m² (number from memory)."""
    limit = skin.icnirp_skin_limit([1.0, 3.0, 10.0, 10.1])
    np.testing.assert_allclose(limit.value[:3], [20000.0, 8774.0, 3557.0], atol=0.5)
    assert limit.in_range.tolist() == [True, True, True, False]
    assert np.isnan(limit.value[3])


def test_absorbed_flux_counts_every_part():
    taken = skin.absorbed_flux(direct=800.0, reflected=[700.0, 0.0], diffuse=100.0, absorptance=0.7)
    np.testing.assert_allclose(taken, [1120.0, 630.0])
    assert skin.absorbed_flux(direct=800.0, reflected=700.0) == 1500.0


@pytest.mark.parametrize(
    "call",
    [
        lambda: time_to_effect(-1.0, law=SFPE_PAIN),
        lambda: time_to_effect(np.nan, law=SFPE_PAIN),
        lambda: dose([0.0, 0.0], [1.0, 1.0], law=SFPE_PAIN),
        lambda: dose([0.0, 1.0], [1.0, 1.0, 1.0], law=SFPE_PAIN),
        lambda: dose([0.0, 1.0], [1.0, np.nan], law=SFPE_PAIN),
        lambda: skin.absorbed_flux(direct=1.0, reflected=1.0, absorptance=1.2),
        lambda: skin.crossing_dose([0.0, 1.0], [1.0, 1.0], law=SFPE_PAIN, speed=0.0),
        lambda: contact.contact_burn_threshold_c(1.0, group="velvet"),
        lambda: contact.interface_temperature_c(80.0, effusivity=0.0),
    ],
)
def test_bad_input_is_refused(call):
    with pytest.raises(InputError):
        call()


def test_contact_burn_rows_and_between():
    """ISO 13732-1:2006, rows from memory; half way in log time between 1 and 10 min."""
    metal = contact.contact_burn_threshold_c(
        [0.5, 10.0, 60.0, 600.0, 28800.0, 90000.0], group="bare metal"
    )
    assert metal.in_range.tolist() == [False, True, True, True, True, True]
    np.testing.assert_allclose(metal.value[1:], [55.0, 51.0, 48.0, 43.0, 43.0])
    between = contact.contact_burn_threshold_c(60.0 * np.sqrt(10.0), group="wood")
    assert between.value == pytest.approx(54.0)


@given(st.floats(1.0, 1e5), st.floats(1.0, 10.0))
def test_longer_contact_burns_at_lower_temperature(t, factor):
    rows = [
        contact.contact_burn_threshold_c([t, t * factor], group=group).value
        for group in ("bare metal", "ceramic, glass, stone", "plastic", "wood")
    ]
    assert all(late <= early for early, late in rows)
    early = [row[0] for row in rows]
    assert early == sorted(early)  # metal burns first, wood last


def test_interface_temperature():
    """Carslaw & Jaeger, body at 80 °C and skin at 33 °C; PVC, softwood, steel by ISO 10456."""
    for effusivity, expected in ((461.0, 46.1), (322.0, 43.0), (13248.0, 76.1)):
        touched = contact.interface_temperature_c(80.0, effusivity=effusivity)
        assert touched == pytest.approx(expected, abs=0.06)  # one printed digit


def test_henriques_integral_matches_quadrature():
    """Rate 3.1e98 exp(-75000/T), Henriques 1947 (from memory); 40 to 58 °C and back."""
    times = np.linspace(0.0, 20.0, 81)
    skin_c = 40.0 + 18.0 * (1.0 - np.abs(times - 10.0) / 10.0)

    def rate(t):
        temperature = 40.0 + 18.0 * (1.0 - abs(t - 10.0) / 10.0)
        return 3.1e98 * np.exp(-75000.0 / (temperature + 273.15)) if temperature > 44.0 else 0.0

    cross = 10.0 * 4.0 / 18.0
    expected = 2.0 * quad(rate, cross, 10.0)[0]
    # an exponential rate within steps of 0.45 K: second order, far below 0.1 %
    assert contact.henriques_damage(times, skin_c) == pytest.approx(expected, rel=1e-3)
    assert contact.henriques_damage([0.0, 1e5], [44.0, 44.0]) == 0.0


def test_henriques_agrees_with_the_burn_centres_at_49_c():
    """US burn centres: skin at 49 °C takes more than 5 minutes to a burn."""
    assert contact.henriques_damage([0.0, 300.0], [49.0, 49.0]) < 1.0
    assert contact.henriques_damage([0.0, 600.0], [49.0, 49.0]) > 1.0
