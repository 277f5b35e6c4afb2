"""Angular laws: the closures against thin films solved by tmm, metals, tables."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from causticload.errors import InputError
from causticload.optics import angular
from causticload.optics.angular import SheetCoating
from causticload.optics.stack import Glazing, Pane

ANGLES = np.array([0.0, 20, 35, 45, 55, 60, 65, 70, 75, 80, 83, 85, 87.5, 89])
THETA = np.radians(ANGLES)


def unpolarised(R):
    """Solar band of all lobes."""
    return R.sum(axis=0)[0].mean(axis=0)


# Thin-film calculation of 6 mm glass with a coating on surface 2, computed independently:
# reflectance at 0, then exact and by the closure at 60, 75, 85 degrees.
CLOSURE = [
    ("one silver layer, 550 nm", 0.053, (0.177, 0.452, 0.786), (0.130, 0.366, 0.747)),
    ("one silver layer, 1000 nm", 0.481, (0.566, 0.692, 0.864), (0.523, 0.652, 0.861)),
    ("two silver layers, 1000 nm", 0.829, (0.857, 0.886, 0.929), (0.842, 0.885, 0.954)),
    ("absorbing chromium type", 0.349, (0.333, 0.406, 0.654), (0.402, 0.564, 0.826)),
]


@pytest.mark.parametrize(("name", "R0", "exact", "closure"), CLOSURE, ids=lambda x: str(x)[:24])
def test_unit_closure_and_its_band(name, R0, exact, closure):
    law, limits = angular.coated_glass(solar=R0, visible=R0)
    theta = np.radians([60.0, 75.0, 85.0])
    # Printed to 1e-3, and so is R0.
    assert unpolarised(law(theta)) == pytest.approx(closure, abs=2e-3)
    low, high = limits(theta)
    assert (unpolarised(low) <= exact).all()
    assert (unpolarised(high) >= exact).all()


PLACES = [(2, 1), (1, 1), (2, 2), (3, 2)]  # surface, panes


@pytest.mark.parametrize(("surface", "panes"), PLACES)
@pytest.mark.parametrize("kd", [0.0, 0.12])
def test_bands_enclose_solved_films(surface, panes, kd):
    pytest.importorskip("tmm")
    from thin_films import FILMS, film_alone, unit

    # tmm lets the film feel the absorption of the glass beside it (index 1.52 + 1e-6 i): 3e-6.
    glass = (Pane(thickness=0.006, extinction=(kd / 0.006,) * 2),) * panes
    for name in FILMS:
        exact = np.array([unit(name, surface, panes, a, kd)[0].mean() for a in ANGLES])
        low, high = angular.coated_glass(solar=exact[0], visible=exact[0]).limits(THETA)
        assert (unpolarised(low) <= exact + 3e-6).all(), name
        assert (unpolarised(high) >= exact - 3e-6).all(), name
        air, within, through = film_alone(name)
        film = SheetCoating(air=(air,) * 2, glass=(within,) * 2, transmittance=(through,) * 2)
        stack = Glazing(panes=glass, coatings={surface: film})
        law, limits = angular.glazing_reflection(stack, angular.SURFACE_BAND)
        assert unpolarised(law(THETA))[0] == pytest.approx(exact[0], abs=3e-6)
        low, high = limits(THETA)
        assert (unpolarised(low) <= exact + 3e-6).all(), name
        assert (unpolarised(high) >= exact - 3e-6).all(), name


def test_a_band_is_not_a_blank_cheque():
    # Neither "as at normal incidence" nor "as a mirror" may pass at 75 degrees.
    for R0 in (0.1, 0.2, 0.3):
        low, high = angular.coated_glass(solar=R0, visible=R0).limits(np.radians([75.0]))
        assert unpolarised(low)[0] > R0
        assert unpolarised(high)[0] < 0.85


def test_a_bare_surface_is_a_coating_that_changes_nothing():
    r0 = (0.52 / 2.52) ** 2
    film = SheetCoating(air=(r0,) * 2, glass=(r0,) * 2, transmittance=(1 - r0,) * 2)
    pane = (Pane(extinction=(20.0, 6.0)),)
    assert Glazing(panes=pane, coatings={2: film}).unit_reflectance(THETA) == pytest.approx(
        Glazing(panes=pane).unit_reflectance(THETA), abs=1e-13
    )


value = st.floats(0.0, 1.0)


@settings(deadline=None)
@given(value, value, st.floats(0.0, np.pi / 2))
def test_laws_stay_in_range_and_meet_the_sheet(solar, visible, theta):
    at = np.array([0.0, theta])
    laws = [angular.coated_glass, angular.constant]
    if max(solar, visible) < 0.999:
        laws.append(angular.metal)
    for make in laws:
        law, limits = make(solar=solar, visible=visible)
        R = law(at)
        assert R.shape == (1, 2, 2, 2)
        assert ((R >= 0.0) & (R <= 1.0 + 1e-12)).all()
        assert (R[:, :, 0] >= R[:, :, 1] - 1e-12).all()  # s is never below p
        assert R[0, :, :, 0].mean(axis=1) == pytest.approx([solar, visible], abs=1e-9)
        if limits is not None:
            low, high = limits(at)
            assert ((low >= 0.0) & (low <= R + 1e-12)).all()
            assert ((high >= R - 1e-12) & (high <= 1.0 + 1e-12)).all()
            assert low[..., 0] == pytest.approx(high[..., 0], abs=1e-9)  # the sheet is believed


# Complex Fresnel reflectance at 0, 60, 75 and 85 degrees (see test_fresnel): aluminium, titanium
# and iron type. From the first figure alone the metal law must enclose the others.
@pytest.mark.parametrize(
    "metal",
    [(0.921, 0.907, 0.878, 0.885), (0.495, 0.496, 0.541, 0.731), (0.533, 0.516, 0.514, 0.660)],
)
def test_metal_from_one_figure(metal):
    law, limits = angular.metal(solar=metal[0], visible=metal[0])
    theta = np.radians([60.0, 75.0, 85.0])
    low, high = limits(theta)
    assert (unpolarised(low) <= np.array(metal[1:]) + 6e-4).all()
    assert (unpolarised(high) >= np.array(metal[1:]) - 6e-4).all()
    assert unpolarised(law(theta))[0] == pytest.approx(metal[1], abs=0.03)  # "nearly flat to 60"


def test_metal_that_reflects_all():
    with pytest.raises(InputError, match="less than 1"):
        angular.metal(solar=1.0, visible=0.9)


def test_table_runs_through_its_points_and_keeps_rising():
    rows = np.array([[0.0, 0.1, 0.08], [45.0, 0.12, 0.1], [75.0, 0.4, 0.35]])
    law, limits = angular.table(rows)
    R = law(np.append(np.radians([0.0, 45.0, 75.0]), np.pi / 2))
    assert R[0, 0, 0] == pytest.approx([0.1, 0.12, 0.4, 1.0], abs=1e-12)
    assert R[0, 1, 1] == pytest.approx([0.08, 0.1, 0.35, 1.0], abs=1e-12)
    assert limits is None
    fine = law(np.linspace(0.0, np.pi / 2, 500))
    assert (np.diff(fine, axis=-1) >= -1e-15).all()


def test_table_to_ninety_is_not_closed_to_one_and_starts_flat():
    law, _ = angular.table(np.array([[8.0, 0.9], [60.0, 0.88], [90.0, 0.95]]))
    R = law(np.append(np.radians([0.0, 4.0, 8.0]), np.pi / 2))
    assert R[0, 0, 0] == pytest.approx([0.9, 0.9, 0.9, 0.95], abs=1e-12)
    assert R[0, 1] == pytest.approx(R[0, 0])


@pytest.mark.parametrize(
    "rows",
    [
        [[0.0, 0.5]],
        [[0.0], [50.0]],
        [[0.0, 0.5], [0.0, 0.6]],
        [[20.0, 0.5], [50.0, 0.6]],
        [[0.0, 0.5], [95.0, 0.6]],
        [[0.0, 0.5], [50.0, 1.6]],
        [[0.0, 0.5], [np.nan, 0.6]],
    ],
)
def test_bad_tables(rows):
    with pytest.raises(InputError, match="table"):
        angular.table(np.array(rows))


@pytest.mark.parametrize("bad", [-0.1, 1.1, np.nan])
@pytest.mark.parametrize("make", [angular.constant, angular.coated_glass, angular.metal])
def test_bad_figures(make, bad):
    with pytest.raises(InputError, match="visible reflectance"):
        make(solar=0.5, visible=bad)
