"""Finishes by name: the built-in ones against their published ranges, own ones from a study."""

import numpy as np
import pytest

from causticload.errors import InputError, StudyError
from causticload.optics import BUILT_IN, list_finishes, reflectance, resolve_finish
from causticload.optics.finish import Finish, Lobe, Reflection
from causticload.study.model import FinishSpec

THETA = np.radians(np.linspace(0.0, 90.0, 91))
NORMAL = np.zeros(1)

# Usual solar and visible reflectance near normal incidence, outdoor side. Glass: data sheets by
# EN 410 and ISO 9050, read for clear glass, else from memory. Metals: 1 - solar absorptance of
# handbook tables, read; titanium from memory.
USUAL = {
    "single clear glass": ((0.07, 0.08), (0.07, 0.09)),
    "double clear glass": ((0.11, 0.125), (0.135, 0.155)),
    "low-emissivity double glass": ((0.20, 0.30), (0.11, 0.13)),
    "solar-control double glass": ((0.28, 0.38), (0.09, 0.13)),
    "reflective solar-control glass": ((0.20, 0.45), (0.20, 0.40)),
    "tinted glass": ((0.05, 0.06), (0.05, 0.07)),
    "polished stainless steel": ((0.60, 0.68), (0.0, 1.0)),
    "polished aluminium": ((0.85, 0.90), (0.0, 1.0)),
    "anodised aluminium": ((0.86, 0.86), (0.0, 1.0)),
    "polished copper": ((0.82, 0.82), (0.0, 1.0)),
    "weathered copper": ((0.36, 0.36), (0.0, 1.0)),
    "galvanised steel": ((0.36, 0.36), (0.0, 1.0)),
    "titanium sheet": ((0.40, 0.50), (0.0, 1.0)),
    "perfect mirror": ((1.0, 1.0), (1.0, 1.0)),
}


def at_normal(finish):
    return finish.reflectance(NORMAL).sum(axis=0).mean(axis=1)[:, 0]


@pytest.mark.parametrize("name", USUAL)
def test_built_in_figures(name):
    for got, (low, high) in zip(at_normal(BUILT_IN[name]), USUAL[name], strict=True):
        assert low - 1e-3 <= got <= high + 1e-3


@pytest.mark.parametrize("name", BUILT_IN)
def test_every_built_in_finish(name):
    f = BUILT_IN[name]
    low, mid, high = f.low(THETA), f.reflectance(THETA), f.high(THETA)
    assert mid.shape == (len(f.lobes), 2, 2, 91)
    assert (low >= 0.0).all()
    assert (low <= mid + 1e-12).all()
    assert (mid <= high + 1e-12).all()
    assert (high.sum(axis=0) <= 1.0 + 1e-9).all()
    assert f.solar_range[0] - 1e-3 <= at_normal(f)[0] <= f.solar_range[1] + 1e-3
    merged = f.combined()
    assert len(merged.lobes) == 1
    for whole, parts in ((merged.reflectance, mid), (merged.low, low), (merged.high, high)):
        assert whole(THETA)[0] == pytest.approx(parts.sum(axis=0), abs=1e-14)
    assert any(tag in f.source for tag in ("memory", "read", "definition", "common practice"))
    # Every widened beam must be one that the sun's disc can be widened by (0.1 rad).
    assert all(lobe.mean_slope_error_rad <= 0.1 for lobe in f.lobes)


def test_panes_of_double_glass():
    two = BUILT_IN["double clear glass"]
    assert [(lobe.name, lobe.pane) for lobe in two.lobes] == [("outer pane", 0), ("inner pane", 1)]
    # one 6 mm pane of kd = 0.12 reflects 0.0733, two 0.1222: Fresnel, computed independently
    R = two.reflectance(NORMAL)[:, 0, 0, 0]
    assert pytest.approx([0.0733, 0.1222 - 0.0733], abs=1e-4) == R
    # a coating on 3 makes the inner pane the brighter one, on 2 the outer
    R = BUILT_IN["low-emissivity double glass"].reflectance(NORMAL)[:, 0, 0, 0]
    assert R[1] > R[0]
    R = BUILT_IN["solar-control double glass"].reflectance(NORMAL)[:, 0, 0, 0]
    assert R[0] > R[1]


def test_brushed_steel_has_a_direction():
    (lobe,) = BUILT_IN["brushed stainless steel"].lobes
    assert lobe.slope_error_rad[1] > 3 * lobe.slope_error_rad[0]
    expected = np.sqrt((lobe.slope_error_rad[0] ** 2 + lobe.slope_error_rad[1] ** 2) / 2)
    assert lobe.mean_slope_error_rad == pytest.approx(expected)


def test_list():
    rows = list_finishes()
    assert [row["name"] for row in rows] == list(BUILT_IN)
    assert all(row["source"] for row in rows)
    assert {"name", "source", "solar_at_0", "visible_at_0", "open_at_75"} <= set(rows[0])
    assert list_finishes([BUILT_IN["perfect mirror"]])[0]["solar_at_75"] == 1.0


def test_reflectance_of_a_name():
    R = reflectance("double clear glass", [0.0, 60.0, 85.0])
    assert R.solar == pytest.approx([0.1222, 0.1933, 0.7460], abs=1e-4)  # Fresnel table
    with pytest.raises(InputError):
        reflectance("double clear glass", [91.0])
    with pytest.raises(InputError):
        reflectance("double clear glass", [np.nan])


def test_combined_roughness_is_weighted_by_light():
    def law(theta):
        R = np.array([0.3, 0.1])[:, None, None, None]
        return np.broadcast_to(R, (2, 2, 2, np.size(theta)))

    f = Finish(
        name="two",
        lobes=(
            Lobe(name="a", slope_error_rad=(0.0, 0.0), diffuse_fraction=0.0),
            Lobe(name="b", slope_error_rad=(0.02, 0.04), diffuse_fraction=0.4),
        ),
        reflection=Reflection(law),
        angular="constant",
        source="test",
        solar_range=(0.4, 0.4),
    )
    (lobe,) = f.combined().lobes
    assert lobe.slope_error_rad == pytest.approx((0.01, 0.02))  # a quarter of the variance
    assert lobe.diffuse_fraction == pytest.approx(0.1)


# --- own finishes --------------------------------------------------------------------------


def own(extra=None, **spec):
    return resolve_finish("x", {"x": FinishSpec(name="x", extra=extra or {}, **spec)})


def says(finish, *words):
    text = " ".join(finish.assumed)
    return all(word in text for word in words)


def test_two_figures_are_enough():
    f = own(solar_reflectance=0.31, visible_reflectance=0.27)
    assert at_normal(f) == pytest.approx([0.31, 0.27])
    assert says(f, "coated glass is assumed", "all panes reflect as one", "at 75°")
    t = np.radians([75.0])
    assert (f.high(t).mean() - f.low(t).mean()) > 0.2


@pytest.mark.parametrize("law", ["coated glass", "metal", "constant"])
def test_one_figure_stands_in_for_the_other(law):
    f = own(visible_reflectance=0.2, angular=law)
    assert at_normal(f) == pytest.approx([0.2, 0.2])
    assert says(f, "solar reflectance is not given; the visible one stands in")
    assert says(own(solar_reflectance=0.2, angular=law), "the solar one stands in")


def test_own_finish_comes_before_a_built_in_one():
    spec = FinishSpec(name="perfect mirror", solar_reflectance=0.5, angular="constant")
    assert at_normal(resolve_finish("perfect mirror", {"perfect mirror": spec}))[0] == 0.5


def test_clear_glass_of_a_sheet():
    f = own(
        {"pane_count": 2}, solar_reflectance=0.12, visible_reflectance=0.14, angular="clear glass"
    )
    assert at_normal(f) == pytest.approx([0.12, 0.14], abs=1e-9)
    assert [lobe.name for lobe in f.lobes] == ["outer pane", "inner pane"]
    assert f.low(THETA) == pytest.approx(f.reflectance(THETA))


def test_panes_with_their_own_glass():
    panes = [
        {"thickness_mm": 6, "extinction_per_m": 20},
        {"thickness_mm": 6, "extinction_per_m": [20, 0.0]},
    ]
    f = own({"panes": panes, "gap_mm": 14})
    R = f.reflectance(np.radians([0.0, 75.0])).sum(axis=0)[0].mean(axis=0)
    assert pytest.approx([0.1222, 0.4315], abs=1e-4) == R  # Fresnel table, kd = 0.12
    assert f.glazing.gaps == (0.014,)
    assert says(f, "taken as clear glass")
    assert not says(f, "no stated extinction")
    assert says(own({"panes": [panes[0], {"thickness_mm": 4}]}), "no stated extinction")


def test_unit_figures_with_the_surface_of_the_coating():
    for surface, brighter in ((2, 0), (3, 1)):
        f = own(
            {"pane_count": 2, "coatings": [{"surface": surface}]},
            solar_reflectance=0.30,
            visible_reflectance=0.15,
        )
        assert at_normal(f) == pytest.approx([0.30, 0.15], abs=1e-9)
        R = f.reflectance(NORMAL)[:, 0, 0, 0]
        assert R.argmax() == brighter
        assert says(f, "reflects alike from both sides and absorbs nothing")


def test_figures_of_a_coated_pane():
    coating = {
        "surface": 2,
        "solar_reflectance": 0.28,
        "visible_reflectance": 0.10,
        "solar_reflectance_back": 0.36,
        "solar_transmittance": 0.40,
    }
    f = own({"pane_count": 2, "coatings": [coating]})
    # the outer pane on its own is the coated pane of the sheet
    assert f.reflectance(NORMAL)[0, :, 0, 0] == pytest.approx([0.28, 0.10], abs=1e-9)
    # the inner pane is clear and adds T² R2 / (1 - R1' R2) of the sheet's own figures
    R2 = 0.0733
    inner = 0.40**2 * R2 / (1 - 0.36 * R2)
    assert f.reflectance(NORMAL)[1, 0, 0, 0] == pytest.approx(inner, abs=1e-4)
    assert says(f, "surface 2 absorbs nothing", "alike from both sides")


def test_index_table_and_roughness():
    f = own({"index": [0.958, 6.69], "diffuse_fraction": 0.1})
    assert at_normal(f)[0] == pytest.approx(0.921, abs=6e-4)  # aluminium, complex Fresnel
    assert f.lobes[0].diffuse_fraction == 0.1
    f = own(table=((8.0, 0.3), (60.0, 0.35)), slope_error_mrad=4.0)
    assert at_normal(f) == pytest.approx([0.3, 0.3])
    assert f.lobes[0].slope_error_rad == pytest.approx((0.004, 0.004))
    assert says(
        f, "no visible column", "holds down to normal", "runs on to 1", "s and p are taken alike"
    )


def test_a_brushed_finish_of_ones_own():
    f = own(
        {"slope_error_across_mrad": 80.0, "brush_along": "height"},
        solar_reflectance=0.5,
        visible_reflectance=0.5,
        angular="metal",
        slope_error_mrad=10.0,
    )
    assert f.lobes[0].slope_error_rad == pytest.approx((0.01, 0.08))
    assert f.lobes[0].brush_along == "height"
    f = own({"slope_error_across_mrad": 80.0}, solar_reflectance=0.5, angular="metal")
    assert says(f, "run along the width")


def test_base():
    f = own(
        {"base": "solar-control double glass"}, solar_reflectance=0.41, visible_reflectance=0.14
    )
    assert at_normal(f) == pytest.approx([0.41, 0.14], abs=1e-9)
    assert len(f.lobes) == 2
    assert says(f, "on surface 2, as in solar-control double glass")
    f = own({"base": "brushed stainless steel", "diffuse_fraction": 0.3})
    start = BUILT_IN["brushed stainless steel"]
    assert f.lobes[0].slope_error_rad == start.lobes[0].slope_error_rad
    assert f.lobes[0].diffuse_fraction == 0.3
    assert f.name == "x"
    assert set(start.assumed) <= set(f.assumed)
    f = own({"base": "satin stainless steel"}, solar_reflectance=0.44)
    assert at_normal(f)[0] == pytest.approx(0.44)
    assert f.lobes[0].slope_error_rad == (0.06, 0.06)
    f = own({"base": "double clear glass"}, solar_reflectance=0.11, visible_reflectance=0.13)
    assert at_normal(f) == pytest.approx([0.11, 0.13], abs=1e-9)


def test_layer_file(tmp_path):
    pytest.importorskip("tmm")
    # one layer of glass index on glass is no coating at all: two clear panes of the Fresnel table
    path = tmp_path / "none.csv"
    path.write_text(
        "layer,glass,glass\nthickness_nm,50,50\nwavelength_nm,n,k\n300,1.52,0\n2500,1.52,0\n"
    )
    f = own({"spectral_file": path, "panes": [{"extinction_per_m": 20}] * 2})
    R = f.reflectance(np.radians([0.0, 60.0, 75.0, 85.0])).sum(axis=0).mean(axis=1)
    for band in R:
        assert band == pytest.approx([0.1222, 0.1933, 0.4315, 0.7460], abs=1e-4)
    assert [lobe.name for lobe in f.lobes] == ["outer pane", "inner pane"]
    assert says(f, "on surface 2")
    assert f.reflection.limits is None


FIGURES = {"solar_reflectance": 0.3, "visible_reflectance": 0.2}


@pytest.mark.parametrize(
    ("spec", "message"),
    [
        ({}, "needs solar_reflectance"),
        ({"angular": "table"}, "wants a table"),
        ({"solar_reflectance": 0.5, "angular": "clear glass"}, "at most"),
        ({"solar_reflectance": 1.5}, r"\[0, 1\]"),
        ({"table": ((0.0, 0.5),)}, "two rows"),
        ({"table": ((0.0, 0.5), (50.0, 0.5, 0.5))}, "alike"),
        ({"table": ((0.0, 0.5), (0.0, 0.6))}, "rise"),
        ({"table": ((0.0, 0.5), (50.0, 0.6)), "solar_reflectance": 0.5}, "same thing"),
        ({"extra": {"base": "moon dust"}}, "unknown finish"),
        ({"extra": {"glitter": 1}, **FIGURES}, "unknown key 'glitter'"),
        ({"extra": {"index": [1.0]}}, "two numbers"),
        ({"extra": {"index": [1.0, 5.0]}, **FIGURES}, "same thing"),
        ({"extra": {"index": [1.0, 5.0], "pane_count": 2}}, "do not go with index"),
        ({"extra": {"index": [1.0, 5.0]}, "angular": "clear glass"}, "does not go with index"),
        ({"extra": {"pane_count": 9}}, "1 to 4"),
        ({"extra": {"pane_count": 2, "panes": [{}]}}, "same thing"),
        ({"extra": {"panes": [{"thikness_mm": 6}]}}, "unknown key"),
        ({"extra": {"panes": [{"thickness_mm": -6}]}}, "must be from"),
        ({"extra": {"panes": "two"}}, "list of tables"),
        (
            {
                "extra": {"panes": [{"extinction_per_m": 3}]},
                "solar_reflectance": 0.07,
                "angular": "clear glass",
            },
            "give one of them",
        ),
        (
            {"extra": {"pane_count": 2}, **FIGURES, "angular": "coated glass"},
            "surface of the coating",
        ),
        ({"extra": {"pane_count": 2}, **FIGURES, "angular": "metal"}, "do not go with"),
        ({"extra": {"gap_mm": 16}, **FIGURES}, "goes with panes"),
        ({"extra": {"pane_count": 3, "gap_mm": [16]}}, "2 gap"),
        ({"extra": {"coatings": [{"surface": "two"}]}, **FIGURES}, "number of its surface"),
        ({"extra": {"pane_count": 2, "coatings": [{"surface": 7}]}, **FIGURES}, "surfaces 1 to 4"),
        ({"extra": {"coatings": [{"surface": 1}, {"surface": 2}]}, **FIGURES}, "one coating"),
        ({"extra": {"coatings": [{"surface": 2}, {"surface": 3}]}, **FIGURES}, "two coatings"),
        (
            {"extra": {"coatings": [{"surface": 2, "solar_reflectance": 0.3}]}, **FIGURES},
            "same thing",
        ),
        ({"extra": {"coatings": [{"surface": 2, "solar_transmittance": 0.3}]}}, "from outdoors"),
        ({"extra": {"diffuse_fraction": 1.5}, **FIGURES}, "must be from"),
        ({"extra": {"diffuse_fraction": True}, **FIGURES}, "must be a number"),
        ({"extra": {"brush_along": "up"}, **FIGURES}, "'width' or 'height'"),
        ({"extra": {"brush_along": "width"}, **FIGURES}, "slope_error_across_mrad"),
        ({"extra": {"slope_error_across_mrad": 900}, **FIGURES}, "must be from"),
        ({"extra": {"spectral_file": "nowhere.csv"}}, "cannot be read"),
        ({"extra": {"spectral_file": 3}}, "must be a file"),
    ],
)
def test_bad_own_finishes(spec, message):
    with pytest.raises(StudyError, match=message) as error:
        own(**spec)
    assert error.value.where.startswith('finish."x"')


def test_unknown_finish_names_its_neighbour():
    with pytest.raises(StudyError, match="unknown finish") as error:
        resolve_finish("double cleer glass", {})
    assert "'double clear glass'" in error.value.hint
