"""Back from a data sheet to glass and films, and forth again."""

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from causticload.errors import InputError
from causticload.optics.angular import SheetCoating
from causticload.optics.datasheet import (
    clear_glazing,
    coating_of_pane,
    coating_of_unit,
    normal_reflectance,
)
from causticload.optics.stack import Glazing, Pane

NORMAL = np.zeros(1)


@pytest.mark.parametrize("panes", [1, 2, 3])
@pytest.mark.parametrize("place", [0.02, 0.5, 0.98])
def test_clear_glass_meets_its_sheet(panes, place):
    # between a black pane's front face and lossless panes 2 N r / (1 + (2 N - 1) r)
    r = (0.52 / 2.52) ** 2
    most = 2 * panes * r / (1 + (2 * panes - 1) * r)
    solar, visible = r + place * (most - r), r + (1 - place) * (most - r)
    unit = clear_glazing([Pane()] * panes, solar=solar, visible=visible)
    assert normal_reflectance(unit, 0) == pytest.approx(solar, abs=1e-9)
    assert normal_reflectance(unit, 1) == pytest.approx(visible, abs=1e-9)


def test_extinction_of_the_table_is_found_again():
    # 6 mm with kd = 0.12 reflects 0.0733 (one pane) and 0.1222 (two): Fresnel, computed
    # independently to 1e-4; kd follows to about 0.003 and 0.001.
    for panes, R0, within in ((1, 0.0733, 0.003), (2, 0.1222, 0.001)):
        unit = clear_glazing([Pane()] * panes, solar=R0, visible=None)
        assert unit.panes[0].extinction[0] * 0.006 == pytest.approx(0.12, abs=within)
        assert unit.panes[0].extinction[1] == Pane().extinction[1]


@pytest.mark.parametrize("R0", [0.03, 0.16, 0.4])
def test_what_clear_glass_cannot_do(R0):
    with pytest.raises(InputError, match=str(R0)) as error:
        clear_glazing([Pane()] * 2, solar=R0, visible=None)
    assert "coated glass" in error.value.hint


def test_a_rounded_sheet_is_accepted():
    # two lossless panes reflect 0.15103
    assert clear_glazing([Pane()] * 2, solar=0.1514, visible=None).panes[0].extinction[0] == 0.0


@settings(deadline=None, max_examples=40)
@given(st.integers(1, 4), st.floats(0.2, 0.6), st.floats(0.2, 0.6), st.floats(0.0, 0.1))
def test_unit_sheet_round_trip(surface, solar, visible, absorbed):
    panes = (Pane(), Pane())
    try:
        film = coating_of_unit(
            panes, surface, solar=solar, visible=visible, absorbed=(absorbed, absorbed)
        )
    except InputError:
        assume(False)
    R = Glazing(panes=panes, coatings={surface: film}).unit_reflectance(NORMAL)
    assert R[:, 0, 0] == pytest.approx([solar, visible], abs=6e-4)  # a sheet's third digit


def test_unit_sheet_beyond_reach():
    with pytest.raises(InputError, match="surface 4 gives this unit a solar reflectance"):
        coating_of_unit((Pane(), Pane()), 4, solar=0.8, visible=0.2)


film_figures = st.tuples(st.floats(0.02, 0.9), st.floats(0.02, 0.9), st.floats(0.05, 1.0))


@settings(deadline=None)
@given(film_figures, film_figures, st.booleans())
def test_pane_sheet_gives_the_film_back(solar, visible, indoor_face):
    # A film of known figures goes into a pane, the pane's three figures come out, and from them
    # the film must be found again.
    (a1, g1, l1), (a2, g2, l2) = solar, visible
    truth = SheetCoating(
        air=(a1, a2),
        glass=(g1, g2),
        transmittance=(l1 * (1 - max(a1, g1)), l2 * (1 - max(a2, g2))),
    )
    pane = Pane(thickness=0.008, extinction=(25.0, 5.0))
    coated = Glazing(panes=(pane,), coatings={2 if indoor_face else 1: truth})
    turned = Glazing(panes=(pane,), coatings={1 if indoor_face else 2: truth})
    found = coating_of_pane(
        pane,
        indoor_face=indoor_face,
        outdoor=tuple(coated.unit_reflectance(NORMAL)[:, 0, 0]),
        indoor=tuple(turned.unit_reflectance(NORMAL)[:, 0, 0]),
        transmittance=tuple(coated.unit_transmittance(NORMAL)[:, 0, 0]),
    )
    for name in ("air", "glass", "transmittance"):
        assert getattr(found, name) == pytest.approx(getattr(truth, name), abs=1e-7)


@pytest.mark.parametrize("indoor_face", [True, False])
@pytest.mark.parametrize("through", [None, 0.45])
@pytest.mark.parametrize("back", [None, 0.30])
def test_a_silent_sheet_is_still_met(indoor_face, through, back):
    pane = Pane()
    film = coating_of_pane(
        pane,
        indoor_face=indoor_face,
        outdoor=(0.35, 0.25),
        indoor=(back, back),
        transmittance=(through, through),
    )
    coated = Glazing(panes=(pane,), coatings={2 if indoor_face else 1: film})
    assert coated.unit_reflectance(NORMAL)[:, 0, 0] == pytest.approx([0.35, 0.25], abs=1e-9)
    if through is not None:
        T = coated.unit_transmittance(NORMAL)[:, 0, 0]
        assert pytest.approx([through] * 2, abs=1e-9) == T
    if back is not None:
        turned = Glazing(panes=(pane,), coatings={1 if indoor_face else 2: film})
        assert turned.unit_reflectance(NORMAL)[:, 0, 0] == pytest.approx([back] * 2, abs=1e-9)


@pytest.mark.parametrize(
    "sheet",
    [
        {"outdoor": (0.02, 0.02)},  # less than the bare face alone
        {"outdoor": (0.9, 0.9)},  # more than any film behind absorbing glass
        {"outdoor": (0.4, 0.4), "transmittance": (0.7, 0.7)},  # more than the whole
    ],
)
def test_figures_that_do_not_fit_together(sheet):
    with pytest.raises(InputError):
        coating_of_pane(Pane(extinction=(30.0, 30.0)), indoor_face=True, **sheet)
