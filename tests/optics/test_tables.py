"""Tables for kernels: against the finish they are made from, and as plain Python."""

import numpy as np
import pytest

from causticload.errors import InputError
from causticload.optics import BUILT_IN, Lobe
from causticload.optics.tables import ANGLES, ReflectanceTables, lookup

DOUBLE, COPPER = BUILT_IN["double clear glass"], BUILT_IN["polished copper"]
COATED, BRUSHED = BUILT_IN["solar-control double glass"], BUILT_IN["brushed stainless steel"]


def test_layout():
    tables = ReflectanceTables.build([DOUBLE, COPPER, COATED], [True, False, False])
    assert tables.R.shape == (4, 2, 2, ANGLES)
    assert tables.finish_of.tolist() == [0, 0, 1, 2]
    assert tables.first_sheet.tolist() == [0, 2, 3]
    assert tables.sheet_count.tolist() == [2, 1, 1]
    assert tables.pane.tolist() == [0, 1, 0, 0]
    assert tables.enters.tolist() == [1.0, 0.0, 1.0, 1.0]
    for array in (tables.R, tables.R_low, tables.R_high, tables.low_factor, tables.high_factor):
        assert array.flags["C_CONTIGUOUS"]
        assert array.dtype == np.float64


def test_panes_apart_reflect_as_much_as_together():
    apart = ReflectanceTables.build([DOUBLE], [True])
    together = ReflectanceTables.build([DOUBLE], [False])
    assert apart.R.sum(axis=0) == pytest.approx(together.R[0], abs=1e-14)
    assert pytest.approx(apart.R) == ReflectanceTables.build([DOUBLE]).R


@pytest.mark.parametrize(
    ("angle", "within"),
    # A chord of a quarter degree misses Fresnel's curves by less than 1e-4, but by more in the
    # last degrees, where they turn up steeply.
    [
        (0.0, 1e-4),
        (33.3, 1e-4),
        (56.7, 1e-4),
        (71.7, 1e-4),
        (84.9, 1e-4),
        (89.4, 5e-4),
        (89.9, 2e-3),
    ],
)
def test_lookup_interpolates(angle, within):
    tables = ReflectanceTables.build([DOUBLE.combined()])
    exact = DOUBLE.combined().reflectance(np.radians([angle]).clip(0, np.pi / 2))[0, :, :, 0]
    for band in range(2):
        for pol in range(2):
            got = lookup(tables.R[0, band, pol], np.cos(np.radians(angle)))
            assert got == pytest.approx(exact[band, pol], abs=within)


def test_lookup_is_exact_at_its_nodes_and_holds_at_the_ends():
    row = np.random.default_rng(3).random(ANGLES)
    for k in (1, 40, 200, 359):
        assert lookup(row, np.cos(np.radians(k / 4))) == pytest.approx(row[k], abs=1e-9)
        # as Python too
        assert lookup.py_func(row, np.cos(np.radians(k / 4))) == pytest.approx(row[k], abs=1e-9)
    assert lookup(row, 1.0 + 1e-12) == row[0]
    assert lookup(row, -1e-12) == pytest.approx(row[-1], abs=1e-12)


def test_factors_carry_the_range():
    tables = ReflectanceTables.build([COATED, DOUBLE], [False, False])
    at = 75 * 4
    nominal, low, high = (t[0, 0, :, at].mean() for t in (tables.R, tables.R_low, tables.R_high))
    assert low < nominal < high
    assert tables.low_factor[0, 0, at] * nominal == pytest.approx(low)
    assert tables.high_factor[0, 0, at] * nominal == pytest.approx(high)
    assert (tables.low_factor[1] == 1.0).all()  # clear glass leaves nothing open
    assert (tables.high_factor[1] == 1.0).all()


def test_roughness_of_a_brushed_sheet():
    tables = ReflectanceTables.build([BRUSHED, DOUBLE])
    assert tables.slope_errors[0].tolist() == [0.015, 0.09]
    assert tables.slope_error[0] == pytest.approx(np.sqrt((0.015**2 + 0.09**2) / 2))
    assert tables.brush_along_height.tolist() == [False, False, False]
    assert tables.diffuse_fraction.tolist() == [0.15, 0.0, 0.0]
    assert Lobe(name="sheet").brush_along == "width"


def test_bad_builds():
    with pytest.raises(InputError, match="at least one finish"):
        ReflectanceTables.build([])
    with pytest.raises(InputError, match="one entry a finish"):
        ReflectanceTables.build([DOUBLE], [True, False])
