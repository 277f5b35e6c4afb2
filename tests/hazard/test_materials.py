"""Surface temperatures against handbook figures, closed forms and scipy's method of lines."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

from causticload.errors import InputError
from causticload.hazard import materials
from causticload.hazard.material_table import MATERIALS, material
from causticload.hazard.materials import Surroundings, irradiance_to_hold, steady_temperature_c
from causticload.hazard.transient import surface_history

SIGMA = 5.670374419e-8
SOFTWOOD = material("softwood")


def test_swinbank_sky():
    """Swinbank 1963: 0.0552 T^1.5."""
    found = materials.sky_temperature_c([10.0, 20.0, 30.0, 40.0])
    np.testing.assert_allclose(found, [-10.15, 3.91, 18.21, 32.74], atol=0.006)


def test_convection_laws():
    """McAdams 20.9 and ISO 6946 20 at 4 m/s; Watmuff 5.8 and McAdams 9.5 at 1 m/s."""
    assert materials.convection(4.0) == pytest.approx(20.9)
    assert materials.convection(4.0, law="ISO 6946") == pytest.approx(20.0)
    assert materials.convection(1.0, law="Watmuff") == pytest.approx(5.8)
    assert materials.convection(1.0) == pytest.approx(9.5)


def test_iso_6946_outside_resistance():
    """ISO 6946: 4 m/s, emissivity 0.9, 10 °C gives R_se = 0.0406, tabled as 0.04 m²K/W."""
    radiative = 4.0 * 0.9 * SIGMA * 283.15**3
    assert radiative == pytest.approx(4.634, abs=5e-4)
    total = float(materials.convection(4.0, law="ISO 6946")) + radiative
    assert 1.0 / total == pytest.approx(0.0406, abs=5e-5)


@pytest.mark.parametrize(
    ("irradiance", "absorptance", "surface"),
    [(1080.0, 1.0, 91.13), (800.0, 0.85, 69.5), (1800.0, 0.35, 66.7), (1800.0, 0.85, 113.3)],
)
def test_steady_vectors(irradiance, absorptance, surface):
    """Wall, 30 °C, 1 m/s, emissivity 0.9, back insulated: computed independently."""
    found = steady_temperature_c(irradiance, absorptance=absorptance, emissivity=0.9)
    assert found == pytest.approx(surface, abs=0.06)


def test_irradiance_to_hold_vectors():
    """Same wall; absorptance 0.35, 0.6, 0.85: computed independently."""
    for surface, expected in (
        (71.0, [2017.0, 1177.0, 831.0]),
        (80.0, [2484.0, 1449.0, 1023.0]),
        (250.0, [15752.0, 9189.0, 6486.0]),
    ):
        found = irradiance_to_hold(surface, absorptance=[0.35, 0.6, 0.85], emissivity=0.9)
        np.testing.assert_allclose(found, expected, atol=0.6)


def test_steady_balance_against_brentq():
    around = Surroundings(
        air_c=12.0, wind=2.0, sky_view=1.0, convection="Watmuff", back_conductance=3.0, back_c=21.0
    )
    irradiance = np.array([0.0, 300.0, 2000.0, 60000.0])
    found = steady_temperature_c(irradiance, absorptance=0.6, emissivity=0.3, surroundings=around)
    sky = 0.0552 * 285.15**1.5
    for load, surface in zip(irradiance, found, strict=True):

        def balance(T, load=load):
            radiated = 0.3 * SIGMA * (T**4 - sky**4)
            return 8.8 * (T - 285.15) + radiated + 3.0 * (T - 294.15) - 0.6 * load

        assert surface + 273.15 == pytest.approx(brentq(balance, 100.0, 5000.0), abs=1e-6)


@given(
    load=st.floats(0.0, 50000.0),
    more=st.floats(1.0, 5000.0),
    absorptance=st.floats(0.05, 1.0),
    emissivity=st.floats(0.0, 1.0),
)
def test_steady_rises_with_load_and_comes_back(load, more, absorptance, emissivity):
    low, high = steady_temperature_c(
        [load, load + more], absorptance=absorptance, emissivity=emissivity
    )
    assert high > low
    back = irradiance_to_hold(low, absorptance=absorptance, emissivity=emissivity)
    assert back == pytest.approx(load, abs=1e-4)


def test_semi_infinite_vectors():
    """Carslaw & Jaeger, q 1500, h 15, e 322.5: with and without loss, computed independently."""
    times = [10.0, 60.0, 300.0, 1800.0]
    kept = materials.semi_infinite_rise(times, absorbed=1500.0, effusivity=322.5)
    lost = materials.semi_infinite_rise(times, absorbed=1500.0, effusivity=322.5, loss=15.0)
    np.testing.assert_allclose(kept, [16.60, 40.65, 90.9, 222.7], rtol=4e-4)
    np.testing.assert_allclose(lost, [14.65, 30.50, 51.28, 74.17], atol=0.006)
    faint = materials.semi_infinite_rise(times, absorbed=1500.0, effusivity=322.5, loss=1e-8)
    np.testing.assert_allclose(faint, kept, rtol=1e-6)


def test_thin_sheet_vectors():
    """Vinyl 1.1 mm, 1390 kg/m³, 900 J/kgK, h 15: 91.7 s."""
    tau = materials.thin_sheet_time_constant_s(
        density=1390.0, heat_capacity=900.0, thickness_m=0.0011, loss=15.0
    )
    assert tau == pytest.approx(91.7, abs=0.05)
    risen = materials.thin_sheet_rise(
        [0.0, float(tau), 1e6], absorbed=900.0, loss=15.0, time_constant_s=tau
    )
    np.testing.assert_allclose(risen, [0.0, 60.0 * (1.0 - np.exp(-1.0)), 60.0])


def test_ignition_time_of_thick_softwood():
    found = materials.ignition_time_s(12500.0, effusivity=SOFTWOOD.effusivity, rise_k=330.0)
    assert found == pytest.approx(56.9, abs=0.05)


def test_sky_view():
    np.testing.assert_allclose(materials.sky_view([1.0, 0.0, -1.0]), [1.0, 0.5, 0.0])


# Carslaw & Jaeger's surface with loss: no radiation, and wind that makes McAdams' h = 15.
LINEAR = Surroundings(air_c=20.0, wind=(15.0 - 5.7) / 3.8)


def test_history_of_a_step_on_a_thick_body():
    """Carslaw & Jaeger vectors for softwood (e = 322.5), started at the temperature of the air."""
    black_free = replace(SOFTWOOD, emissivity=0.0, absorptance=1.0)
    times = np.array([0.0, 10.0, 60.0, 300.0, 1800.0])
    found = surface_history(
        times, np.full(5, 1500.0), material=black_free, surroundings=LINEAR, start_c=20.0
    )
    np.testing.assert_allclose(found - 20.0, [0.0, 14.65, 30.50, 51.28, 74.17], atol=0.06)


def test_history_gets_finer_with_the_step():
    black_free = replace(SOFTWOOD, emissivity=0.0, absorptance=1.0)
    times = np.array([0.0, 10.0, 60.0, 300.0])
    exact = materials.semi_infinite_rise(
        times, absorbed=1500.0, effusivity=SOFTWOOD.effusivity, loss=15.0
    )
    errors = [
        np.abs(
            surface_history(
                times,
                np.full(4, 1500.0),
                material=black_free,
                surroundings=LINEAR,
                start_c=20.0,
                max_step_s=step,
            )
            - 20.0
            - exact
        ).max()
        for step in (120.0, 5.0)
    ]
    assert errors[0] < 1.0  # K, two-minute steps
    assert errors[1] < 0.05
    assert errors[1] < errors[0] / 5.0


def test_history_of_a_thin_sheet():
    """A 1.1 mm sheet with its back insulated follows (q/h)[1 - exp(-t/tau)]; Biot number 0.1."""
    sheet = replace(material("vinyl cladding"), emissivity=0.0, absorptance=1.0)
    times = np.arange(0.0, 601.0, 60.0)
    found = surface_history(
        times, np.full(len(times), 900.0), material=sheet, surroundings=LINEAR, start_c=20.0
    )
    lumped = 60.0 * -np.expm1(-times / 91.74)
    # a Biot number of 0.097 leaves a few percent of 60 K between surface and mean
    np.testing.assert_allclose(found - 20.0, lumped, atol=2.0)
    assert found[-1] - 20.0 == pytest.approx(60.0, abs=0.15)


def _method_of_lines(times, flux, thing, depth, cells, around, start):
    """Uniform cells and scipy's stiff solver; a sheet insulated at ``depth``."""
    dx = depth / cells
    sky = 0.0552 * (around.air_c + 273.15) ** 1.5
    air = around.air_c + 273.15
    cold = around.sky_view * sky**4 + (1.0 - around.sky_view) * air**4
    h = 5.7 + 3.8 * around.wind
    k, store = thing.conductivity, thing.density * thing.heat_capacity * dx

    def slope(t, T):
        # half a cell lies between the surface and the middle of the first cell
        top = T[0]
        for _ in range(6):
            net = np.interp(t, times, flux) - h * (top - air)
            net -= thing.emissivity * SIGMA * (top**4 - cold)
            bridge = 2.0 * k / dx
            rate = -bridge - h - 4.0 * thing.emissivity * SIGMA * top**3
            top -= (net - bridge * (top - T[0])) / rate
        into = 2.0 * k / dx * (top - T[0])
        across = k / dx * np.diff(T)
        gained = np.concatenate([[into], -across]) + np.concatenate([across, [0.0]])
        slope.top = top
        return gained / store

    out = solve_ivp(
        slope,
        (times[0], times[-1]),
        np.full(cells, start),
        method="LSODA",
        t_eval=times,
        rtol=1e-6,
        atol=1e-4,
        lband=1,
        uband=1,
        max_step=10.0,
    )
    tops = []
    for t, T in zip(out.t, out.y.T, strict=True):
        slope(t, T)
        tops.append(slope.top)
    return np.array(tops) - 273.15


@pytest.mark.parametrize(
    ("name", "depth", "cells"),
    [("softwood", 0.06, 240), ("vinyl cladding", 0.0011, 20), ("annealed glass", 0.006, 20)],
)
def test_history_against_the_method_of_lines(name, depth, cells):
    """A passing hot spot, 0.2 to 6 kW/m² and back, uneven times; radiation and sky included."""
    times = np.array([0.0, 60.0, 90.0, 150.0, 180.0, 300.0, 320.0, 480.0, 900.0, 1200.0])
    load = np.array([200.0, 300.0, 900.0, 4000.0, 6000.0, 5500.0, 2500.0, 400.0, 300.0, 300.0])
    thing = material(name)
    around = Surroundings(air_c=26.0, wind=1.5, sky_view=0.7)
    found = surface_history(
        times, load, material=thing, surroundings=around, start_c=30.0, max_step_s=5.0
    )
    expected = _method_of_lines(
        times, thing.absorptance * load, thing, depth, cells, around, 303.15
    )
    # 0.3 K on a rise of up to 200 K: the grids differ
    np.testing.assert_allclose(found, expected, atol=0.3)
    coarse = surface_history(times, load, material=thing, surroundings=around, start_c=30.0)
    np.testing.assert_allclose(coarse, expected, atol=1.5)  # default step of 30 s


def test_history_stays_in_balance():
    """Constant load, thick and with a warm room behind: nothing moves; closed form in series."""
    times = [0.0, 100.0, 4000.0]
    around = Surroundings(back_conductance=8.0, back_c=22.0)
    pane = material("concrete")
    slab = replace(pane, thickness_m=0.2)
    for thing in (pane, slab):
        found = surface_history(times, np.full(3, 700.0), material=thing, surroundings=around)
        np.testing.assert_allclose(found, found[0], atol=1e-6)
    through = 1.0 / (1.0 / 8.0 + 0.2 / 1.4)
    expected = steady_temperature_c(
        700.0,
        absorptance=0.65,
        emissivity=0.9,
        surroundings=replace(around, back_conductance=through),
    )
    assert found[0] == pytest.approx(float(expected), abs=1e-6)


def test_history_reaches_the_balance_through_the_back():
    around = Surroundings(back_conductance=8.0, back_c=22.0)
    pane = material("annealed glass")
    found = surface_history(
        [0.0, 40000.0],
        [700.0, 700.0],
        material=pane,
        surroundings=around,
        start_c=5.0,
        max_step_s=100.0,
    )
    through = 1.0 / (1.0 / 8.0 + 0.006 / 1.0)
    expected = steady_temperature_c(
        700.0,
        absorptance=pane.absorptance,
        emissivity=pane.emissivity,
        surroundings=replace(around, back_conductance=through),
    )
    assert found[-1] == pytest.approx(float(expected), abs=0.01)


def test_history_is_vectorised_and_follows_the_air():
    times = np.arange(0.0, 3601.0, 300.0)
    rng = np.random.default_rng(4)
    load = rng.uniform(0.0, 3000.0, (len(times), 3))
    together = surface_history(times, load, material=SOFTWOOD)
    apart = [surface_history(times, column, material=SOFTWOOD) for column in load.T]
    np.testing.assert_allclose(together, np.stack(apart, axis=1), atol=1e-8)
    warm = surface_history(
        times, load, material=SOFTWOOD, air_c=np.linspace(30.0, 38.0, len(times))
    )
    assert warm[0] == pytest.approx(together[0])
    assert (warm[1:] > together[1:]).all()


@settings(max_examples=25, deadline=None)
@given(st.lists(st.floats(0.0, 5000.0), min_size=3, max_size=6), st.floats(10.0, 2000.0))
def test_more_load_is_never_cooler(load, more):
    times = np.arange(len(load)) * 120.0
    both = np.stack([load, np.asarray(load) + more], axis=1)
    found = surface_history(times, both, material=SOFTWOOD, start_c=30.0)
    assert (found[1:, 1] > found[1:, 0]).all()


def test_effusivities_of_the_table():
    """k, rho, c of ISO 10456 and CIBSE Guide A give these effusivities, W s^0.5 m^-2 K^-1."""
    for name, expected in {
        "rigid PVC": 461.0,
        "softwood": 322.0,
        "hardwood": 449.0,
        "PMMA": 564.0,
        "polycarbonate": 537.0,
        "annealed glass": 1369.0,
        "stainless steel": 7860.0,
        "galvanised steel": 13248.0,
        "aluminium": 19855.0,
        "asphalt": 922.0,
        "rubber": 612.0,
        "roofing felt": 391.0,
        "concrete": 1571.0,
        "brick": 970.0,
    }.items():
        assert material(name).effusivity == pytest.approx(expected, abs=0.6)


def test_the_table_is_in_order():
    wanted = (
        "vinyl ABS polycarb PMMA HDPE polyprop PVC asphalt felt softwood hardwood plywood paint"
    )
    wanted += " polyurethane butyl silicone EPDM dashboard litter glass concrete brick rubber steel"
    wanted += " aluminium stainless"
    for word in wanted.split():
        assert any(word in name for name in MATERIALS), word
    for name, row in MATERIALS.items():
        low, high = row.absorptance_range
        assert 0.0 < low <= row.absorptance <= high <= 1.0, name
        assert 0.0 < row.emissivity <= 1.0, name
        assert row.diffusivity > 0.0, name
        assert row.properties_source, name
        assert all(x.low <= x.high and x.source for x in row.limits), name


def test_the_lowest_limit_is_given():
    assert SOFTWOOD.limit("ignition", "irradiance").low == 4300.0
    assert material("vinyl cladding").limit("softening").low == 71.0
    with pytest.raises(InputError, match="no fracture limit"):
        SOFTWOOD.limit("fracture")
    with pytest.raises(InputError, match="unknown material"):
        material("marzipan")


@pytest.mark.parametrize(
    "call",
    [
        lambda: materials.convection(6.0),
        lambda: materials.convection(1.0, law="Nobody"),
        lambda: materials.sky_temperature_c(90.0),
        lambda: steady_temperature_c(-1.0, absorptance=0.5, emissivity=0.9),
        lambda: steady_temperature_c(1.0, absorptance=1.5, emissivity=0.9),
        lambda: irradiance_to_hold(70.0, absorptance=0.0, emissivity=0.9),
        lambda: surface_history([0.0, 1.0], [1.0], material=SOFTWOOD),
        lambda: surface_history([0.0, 1.0], [1.0, np.nan], material=SOFTWOOD),
        lambda: surface_history([1.0, 0.0], [1.0, 1.0], material=SOFTWOOD),
        lambda: surface_history([0.0, 1.0], [1.0, 1.0], material=SOFTWOOD, air_c=[20.0]),
        lambda: surface_history([0.0, 1.0], [1.0, 1.0], material=SOFTWOOD, max_step_s=0.0),
        lambda: surface_history([0.0, 1.0], np.ones((2, 2, 2)), material=SOFTWOOD),
    ],
)
def test_bad_input_is_refused(call):
    with pytest.raises(InputError):
        call()
