"""Glazing units against the published kind of table, closed forms and tmm's incoherent stacks."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from causticload.errors import InputError
from causticload.optics.angular import SheetCoating
from causticload.optics.spectral import FilmCoating, FilmStack
from causticload.optics.stack import Glazing, Pane

# Fresnel's equations at n = 1.52, incoherent reflections, computed independently:
# angle; lossless pane; pane with kd = 0.12, R and T; two lossless panes; two with kd = 0.12, R, T.
TABLE = [
    (0, 0.08168, 0.0733, 0.8142, 0.15103, 0.1222, 0.6664),
    (20, 0.08210, 0.0735, 0.8112, 0.15146, 0.1220, 0.6618),
    (30, 0.08404, 0.0751, 0.8063, 0.15351, 0.1230, 0.6549),
    (40, 0.09054, 0.0807, 0.7961, 0.16050, 0.1282, 0.6419),
    (50, 0.10884, 0.0970, 0.7744, 0.18113, 0.1451, 0.6162),
    (60, 0.15653, 0.1399, 0.7263, 0.23969, 0.1933, 0.5603),
    (65, 0.20293, 0.1817, 0.6824, 0.29992, 0.2426, 0.5090),
    (70, 0.27529, 0.2472, 0.6158, 0.39397, 0.3197, 0.4325),
    (75, 0.38519, 0.3476, 0.5162, 0.52721, 0.4315, 0.3262),
    (80, 0.54396, 0.4957, 0.3725, 0.69008, 0.5764, 0.1969),
    (85, 0.75435, 0.7016, 0.1822, 0.85665, 0.7460, 0.0692),
    (88, 0.89950, 0.8578, 0.0570, 0.94663, 0.8687, 0.0132),
]


def clear(panes, kd=0.0):
    return Glazing(panes=(Pane(thickness=0.006, extinction=(kd / 0.006, kd / 0.006)),) * panes)


@pytest.mark.parametrize("row", TABLE, ids=lambda r: f"{r[0]} deg")
def test_table(row):
    theta = np.radians([row[0]])
    got = (
        clear(1).unit_reflectance(theta),
        clear(1, 0.12).unit_reflectance(theta),
        clear(1, 0.12).unit_transmittance(theta),
        clear(2).unit_reflectance(theta),
        clear(2, 0.12).unit_reflectance(theta),
        clear(2, 0.12).unit_transmittance(theta),
    )
    assert [g[0].mean() for g in got] == pytest.approx(row[1:], abs=1e-4)  # one last digit
    assert got[0].mean() == pytest.approx(row[1], abs=6e-6)
    assert got[3].mean() == pytest.approx(row[4], abs=6e-6)


@pytest.mark.parametrize("panes", [1, 2, 3, 4])
def test_lossless_panes_at_normal_incidence(panes):
    # N lossless panes reflect 2 N r / (1 + (2 N - 1) r): closed form of the geometric sums.
    r = (0.52 / 2.52) ** 2
    expected = 2 * panes * r / (1 + (2 * panes - 1) * r)
    R = clear(panes).unit_reflectance(np.zeros(1))
    assert pytest.approx(np.full(R.shape, expected), abs=1e-14) == R


def test_second_pane_by_hand():
    # T1² R2 / (1 - R1' R2), by the formula for two panes.
    theta = np.radians([37.0])
    outer, inner = (
        Glazing(panes=(Pane(thickness=0.008, extinction=(30.0, 12.0)),)),
        Glazing(panes=(Pane(thickness=0.004, extinction=(9.0, 3.0)),)),
    )
    both = Glazing(panes=outer.panes + inner.panes).pane_reflectances(theta)
    R1, T1, R2 = (
        outer.unit_reflectance(theta),
        outer.unit_transmittance(theta),
        inner.unit_reflectance(theta),
    )
    assert both[0] == pytest.approx(R1, abs=1e-15)
    assert both[1] == pytest.approx(T1**2 * R2 / (1 - R1 * R2), abs=1e-15)


@pytest.mark.parametrize("angle", [0.0, 30.0, 56.66, 70.0, 85.0])
@pytest.mark.parametrize("kd", [0.0, 0.12, 0.6])
@pytest.mark.parametrize("panes", [1, 2, 3])
def test_against_tmm(angle, kd, panes):
    pytest.importorskip("tmm")
    from thin_films import unit

    R, T = unit(None, 0, panes, angle, kd)
    glazing = clear(panes, kd)
    # tmm also refracts by the imaginary part of the index (1e-6), which this stack leaves out.
    assert glazing.unit_reflectance(np.radians([angle]))[0, :, 0] == pytest.approx(R, abs=1e-9)
    assert glazing.unit_transmittance(np.radians([angle]))[1, :, 0] == pytest.approx(T, abs=1e-9)


@pytest.mark.parametrize("surface", [1, 2, 3, 4])
@pytest.mark.parametrize("name", ["one silver layer, visible", "chromium between oxides"])
def test_solved_films_against_tmm(name, surface):
    pytest.importorskip("tmm")
    from thin_films import FILMS, unit

    index, d, wave = FILMS[name]
    film = FilmStack(
        names=tuple(map(str, index)),
        thickness_nm=np.array(d, dtype=float),
        wavelength_nm=np.array([wave]),
        index=np.array([index], dtype=complex),
    )
    # tmm lets the film's light feel the glass's own absorption (index 1.52 + 1e-6 i).
    for kd, within in ((0.0, 1e-9), (0.12, 1e-6)):
        pane = Pane(thickness=0.006, extinction=(kd / 0.006, kd / 0.006))
        glazing = Glazing(panes=(pane, pane), coatings={surface: FilmCoating(film)})
        for angle in (0.0, 48.0, 77.0):
            R, T = unit(name, surface, 2, angle, kd)
            theta = np.radians([angle])
            got = glazing.unit_reflectance(theta)[0, 0, :, 0]
            assert got == pytest.approx(R, abs=within)
            assert glazing.unit_transmittance(theta)[0, 0, :, 0] == pytest.approx(T, abs=within)
            parts = glazing.pane_reflectances(theta).sum(axis=0)[0, 0, :, 0]
            assert parts == pytest.approx(got, abs=1e-14)


share = st.floats(0.0, 1.0)


@given(
    st.integers(1, 4),
    st.floats(0.0, np.pi / 2),
    st.floats(0.0, 400.0),
    share,
    share,
    share,
    st.integers(1, 8),
)
def test_energy_and_shares(panes, theta, extinction, air, glass, left, surface):
    # What is reflected, transmitted and absorbed adds up to 1; panes add up to the unit.
    T = left * (1.0 - max(air, glass))
    film = SheetCoating(air=(air,) * 2, glass=(glass,) * 2, transmittance=(T,) * 2)
    glazing = Glazing(
        panes=(Pane(extinction=(extinction, 0.0)),) * panes,
        coatings={surface: film} if surface <= 2 * panes else {},
    )
    at = np.array([theta])
    R, through = glazing.unit_reflectance(at), glazing.unit_transmittance(at)
    parts = glazing.pane_reflectances(at)
    assert (parts >= 0.0).all()
    assert (R + through <= 1.0 + 1e-12).all()
    assert parts.sum(axis=0) == pytest.approx(R, abs=1e-14)
    if surface > 2 * panes:
        assert R[1] + through[1] == pytest.approx(1.0, abs=1e-9)  # no absorption in that band


@given(st.floats(0.0, np.pi / 2), share, share)
def test_transmittance_is_reciprocal(theta, air, glass):
    # The same unit turned round transmits as much.
    T = 0.7 * (1.0 - max(air, glass))
    film = SheetCoating(air=(air,) * 2, glass=(glass,) * 2, transmittance=(T,) * 2)
    panes = (Pane(thickness=0.01), Pane(thickness=0.004))
    there = Glazing(panes=panes, coatings={2: film})
    back = Glazing(panes=panes[::-1], coatings={3: film})
    at = np.array([theta])
    assert there.unit_transmittance(at) == pytest.approx(back.unit_transmittance(at), abs=1e-13)


def test_grazing_incidence_reflects_all():
    R = clear(2, 0.12).pane_reflectances(np.array([np.pi / 2]))
    assert R[0] == pytest.approx(np.ones((2, 2, 1)), abs=1e-5)  # held 1e-6 off grazing
    assert R[1] == pytest.approx(np.zeros((2, 2, 1)), abs=1e-5)


@pytest.mark.parametrize(
    "bad",
    [
        {"thickness": 0.0},
        {"thickness": np.nan},
        {"extinction": (-1.0, 0.0)},
        {"extinction": (0.0, np.nan)},
        {"index": 0.9},
    ],
)
def test_bad_panes(bad):
    with pytest.raises(InputError, match="a pane must have"):
        Pane(**bad)


def test_bad_units():
    film = SheetCoating(air=(0.1, 0.1), glass=(0.1, 0.1), transmittance=(0.9, 0.9))
    with pytest.raises(InputError, match="1 to 4 panes"):
        Glazing(panes=())
    with pytest.raises(InputError, match="surfaces 1 to 4"):
        Glazing(panes=(Pane(), Pane()), coatings={5: film})
    with pytest.raises(InputError, match="gap"):
        Glazing(panes=(Pane(), Pane()), gaps=(0.016, 0.016))
    with pytest.raises(InputError, match="wider than 0"):
        Glazing(panes=(Pane(), Pane()), gaps=(0.0,))


def test_a_coating_cannot_make_light():
    with pytest.raises(InputError, match="more than 1"):
        SheetCoating(air=(0.6, 0.1), glass=(0.1, 0.1), transmittance=(0.5, 0.5))
