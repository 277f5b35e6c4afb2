"""Reflectances against Fresnel's equations in closed form, the tmm package and data sheets."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from causticload.errors import CausticloadError, InputError, StudyError
from causticload.optics import list_finishes, reflectance, resolve_finish
from causticload.optics.angular import clear_glass, coated_glass, complex_index, metal, table
from causticload.optics.builtin import BUILT_IN
from causticload.optics.fresnel import interface_reflectance, metal_reflectance
from causticload.optics.stack import Pane, pane_reflectances, unit_transmittance
from causticload.optics.tables import ReflectanceTables, lookup
from causticload.study.model import FinishSpec

# Fresnel's equations at n = 1.52, incoherent reflections, computed independently:
# angle; one surface; lossless pane; pane with kd = 0.12, R and T; two such lossless panes; two
# with kd = 0.12, R and T.
FRESNEL_TABLE = [
    (0, 0.04258, 0.08168, 0.0733, 0.8142, 0.15103, 0.1222, 0.6664),
    (20, 0.04285, 0.08210, 0.0735, 0.8112, 0.15146, 0.1220, 0.6618),
    (30, 0.04414, 0.08404, 0.0751, 0.8063, 0.15351, 0.1230, 0.6549),
    (40, 0.04845, 0.09054, 0.0807, 0.7961, 0.16050, 0.1282, 0.6419),
    (50, 0.06059, 0.10884, 0.0970, 0.7744, 0.18113, 0.1451, 0.6162),
    (60, 0.09248, 0.15653, 0.1399, 0.7263, 0.23969, 0.1933, 0.5603),
    (65, 0.12402, 0.20293, 0.1817, 0.6824, 0.29992, 0.2426, 0.5090),
    (70, 0.17471, 0.27529, 0.2472, 0.6158, 0.39397, 0.3197, 0.4325),
    (75, 0.25672, 0.38519, 0.3476, 0.5162, 0.52721, 0.4315, 0.3262),
    (80, 0.39095, 0.54396, 0.4957, 0.3725, 0.69008, 0.5764, 0.1969),
    (85, 0.61492, 0.75435, 0.7016, 0.1822, 0.85665, 0.7460, 0.0692),
    (88, 0.81971, 0.89950, 0.8578, 0.0570, 0.94663, 0.8687, 0.0132),
]
LOSSLESS = Pane(thickness=0.006, extinction=0.0)
LOSSY = Pane(thickness=0.006, extinction=20.0)


@pytest.mark.parametrize("row", FRESNEL_TABLE, ids=lambda r: f"{r[0]} deg")
def test_fresnel_table(row):
    angle, surface, slab, slab_R, slab_T, double, double_R, double_T = row
    cos = np.array([np.cos(np.radians(angle))])
    assert interface_reflectance(cos, eta=1.52).mean() == pytest.approx(surface, abs=1e-5)
    assert pane_reflectances([LOSSLESS], cos).mean() == pytest.approx(slab, abs=1e-5)
    assert pane_reflectances([LOSSY], cos).mean() == pytest.approx(slab_R, abs=1e-4)
    assert unit_transmittance([LOSSY], cos).mean() == pytest.approx(slab_T, abs=1e-4)
    two = pane_reflectances([LOSSLESS] * 2, cos).sum(axis=0)
    assert two.mean() == pytest.approx(double, abs=1e-5)
    two = pane_reflectances([LOSSY] * 2, cos).sum(axis=0)
    assert two.mean() == pytest.approx(double_R, abs=1e-4)
    assert unit_transmittance([LOSSY] * 2, cos).mean() == pytest.approx(double_T, abs=1e-4)


@pytest.mark.parametrize("angle", [0.0, 30.0, 56.66, 70.0, 85.0])
@pytest.mark.parametrize("kd", [0.0, 0.12])
def test_against_the_tmm_package(angle, kd):
    # S. Byrnes, tmm: incoherent layers at 550 nm; k = kd lambda / (4 pi d)
    tmm = pytest.importorskip("tmm")
    wave, d = 550.0, 6e6
    n = 1.52 + 1j * kd * wave / (4 * np.pi * d)
    cos = np.array([np.cos(np.radians(angle))])
    pane = Pane(thickness=0.006, extinction=kd / 0.006)
    for panes in (1, 2):
        indices = [1.0] + [n, 1.0] * panes
        widths = [np.inf] + [d, 12e6] * panes
        widths[-1] = np.inf
        for row, pol in enumerate("sp"):
            result = tmm.inc_tmm(pol, indices, widths, ["i"] * len(widths), np.radians(angle), wave)
            ours = pane_reflectances([pane] * panes, cos).sum(axis=0)[row, 0]
            assert ours == pytest.approx(result["R"], abs=1e-7)
            assert unit_transmittance([pane] * panes, cos)[row, 0] == pytest.approx(
                result["T"], abs=1e-7
            )


def test_brewster_and_total_reflection():
    brewster = np.arctan(1.52)
    assert np.degrees(brewster) == pytest.approx(56.66, abs=5e-3)
    R = interface_reflectance(np.cos([brewster]), eta=1.52)
    assert R[1, 0] == pytest.approx(0.0, abs=1e-12)
    assert R.mean() == pytest.approx(0.07835, abs=1e-5)
    inside = interface_reflectance(np.cos(np.radians([45.0])), eta=1 / 1.52)
    assert (inside == 1.0).all()


@given(st.floats(0.0, 89.9), st.floats(1.01, 4.0))
def test_reciprocity(angle, eta):
    # The same reflectance from the other side at the refracted angle.
    theta = np.radians(angle)
    refracted = np.arcsin(np.sin(theta) / eta)
    there = interface_reflectance(np.cos([theta]), eta=eta)
    back = interface_reflectance(np.cos([refracted]), eta=1.0 / eta)
    assert back == pytest.approx(there, abs=1e-9)


# Complex Fresnel reflectance at 0, 60, 75 and 85 degrees (indices from memory).
METALS = [
    (0.958, 6.69, (0.921, 0.907, 0.878, 0.885)),
    (1.86, 2.56, (0.495, 0.496, 0.541, 0.731)),
    (2.9, 3.1, (0.533, 0.516, 0.514, 0.660)),
]


@pytest.mark.parametrize(("n", "k", "expected"), METALS)
def test_metals(n, k, expected):
    R = metal_reflectance(np.cos(np.radians([0, 60, 75, 85])), n=n, k=k).mean(axis=0)
    assert pytest.approx(expected, abs=6e-4) == R


@settings(max_examples=60, deadline=None)
@given(st.floats(0.03, 0.98), st.floats(0.03, 0.98), st.floats(0.0, 90.0))
def test_laws_stay_in_range_and_meet_the_sheet(solar, visible, angle):
    cos = np.array([1.0, max(0.0, np.cos(np.radians(angle)))])
    for law in (coated_glass(max(solar, 0.09), max(visible, 0.09)), metal(solar, visible)):
        R = law(cos)
        assert ((R >= 0.0) & (R <= 1.0)).all()
        assert (R[:, 0] >= R[:, 1] - 1e-12).all()  # s is never below p
    assert metal(solar, visible)(cos)[:, :, 0].mean(axis=1) == pytest.approx([solar, visible])


@pytest.mark.parametrize(("panes", "r0"), [(1, 0.075), (2, 0.12), (2, 0.15), (3, 0.18)])
def test_clear_glass_meets_its_sheet(panes, r0):
    law = clear_glass(panes, r0, r0)
    assert law(np.array([1.0]))[0, 0, 0] == pytest.approx(r0, abs=5e-4)


def test_clear_glass_cannot_reflect_as_a_coating_does():
    with pytest.raises(InputError, match="coated glass"):
        clear_glass(2, 0.35, 0.3)


def test_finishes_of_the_list():
    rows = list_finishes()
    assert {"double clear glass", "polished stainless steel"} <= {str(r["name"]) for r in rows}
    for f in BUILT_IN.values():
        cos = np.cos(np.radians(np.linspace(0, 90, 91))).clip(0, 1)
        low, mid, high = f.low(cos), f.reflectance(cos), f.high(cos)
        assert (low <= mid).all()
        assert (mid <= high).all()
        assert f.solar_range[0] - 0.01 <= mid[0, :, 0].mean() <= f.solar_range[1] + 0.01
        assert f.combined().reflectance(cos) == pytest.approx(mid)
        assert f.source
    two = BUILT_IN["double clear glass"]
    assert [lobe.name for lobe in two.lobes] == ["outer pane", "inner pane"]


def test_double_clear_glass_is_the_table_s():
    R = reflectance("double clear glass", [0.0, 60.0, 85.0])
    assert R.solar == pytest.approx([0.1222, 0.1933, 0.7460], abs=1e-4)


def test_own_finishes():
    spec = FinishSpec(
        name="atrium", solar_reflectance=0.31, visible_reflectance=0.27, angular="coated glass"
    )
    f = resolve_finish("atrium", {"atrium": spec})
    assert f.reflectance(np.array([1.0])).mean(axis=1)[:, 0] == pytest.approx([0.31, 0.27])
    assert f.assumed
    assert (f.high(np.array([0.26])) > f.low(np.array([0.26])) + 0.2).all()
    one = FinishSpec(name="x", visible_reflectance=0.2, angular="constant")
    assert "stands in" in resolve_finish("x", {"x": one}).assumed[0]
    index = FinishSpec(name="m", extra={"index": [0.958, 6.69], "diffuse_fraction": 0.1})
    f = resolve_finish("m", {"m": index})
    assert f.diffuse_fraction == 0.1
    assert f.reflectance(np.array([1.0]))[0].mean() == pytest.approx(0.921, abs=6e-4)


@pytest.mark.parametrize(
    "spec",
    [
        FinishSpec(name="x"),
        FinishSpec(name="x", solar_reflectance=0.5, angular="clear glass"),
        FinishSpec(name="x", extra={"base": "moon dust"}),
        FinishSpec(name="x", solar_reflectance=0.5, extra={"glitter": 1}),
        FinishSpec(name="x", table=((0.0, 0.5),)),
        FinishSpec(name="x", table=((0.0, 0.5), (0.0, 0.6))),
    ],
)
def test_bad_own_finishes(spec):
    with pytest.raises(StudyError) as error:
        resolve_finish("x", {"x": spec})
    assert 'finish."x"' in error.value.where


def test_unknown_finish_names_its_neighbour():
    with pytest.raises(StudyError, match="double clear glass"):
        resolve_finish("double cleer glass", {})


@pytest.mark.parametrize("angle", [-1.0, 91.0, np.nan])
def test_angles_out_of_range(angle):
    with pytest.raises(CausticloadError):
        reflectance("double clear glass", [angle])


def test_tables_interpolate_to_a_ten_thousandth():
    tables = ReflectanceTables.build([BUILT_IN["double clear glass"], BUILT_IN["polished copper"]])
    assert list(tables.first_sheet) == [0, 2]
    assert list(tables.enters) == [1.0, 0.0, 1.0]
    for angle in (0.0, 33.3, 71.7, 87.9):
        cos = np.cos(np.radians(angle))
        exact = BUILT_IN["polished copper"].reflectance(np.array([cos]))
        for band in range(2):
            for pol in range(2):
                got = lookup(tables.R[2, band, pol], cos)
                assert got == pytest.approx(exact[band, pol, 0], abs=1e-4)


def test_a_measured_table_runs_through_its_points():
    law = table(np.array([[0.0, 0.1, 0.08], [45.0, 0.12, 0.1], [75.0, 0.4, 0.35]]))
    R = law(np.cos(np.radians([0.0, 45.0, 75.0, 90.0])).clip(0, 1))
    assert R[0, 0] == pytest.approx([0.1, 0.12, 0.4, 1.0], abs=1e-9)
    assert R[1, 1] == pytest.approx([0.08, 0.1, 0.35, 1.0], abs=1e-9)


@pytest.mark.parametrize(("n", "k"), [(0.0, 1.0), (1.0, -1.0), (np.nan, 1.0)])
def test_bad_index(n, k):
    with pytest.raises(InputError):
        complex_index(n, k)
