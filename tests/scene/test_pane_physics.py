"""Plates, cavities and outlines against published tables and closed solutions."""

import numpy as np
import pytest
from numpy.polynomial import polynomial

from causticload.errors import InputError
from causticload.scene.cavity import isochore_pressure, share_load
from causticload.scene.outline import convex_outline, end_edges
from causticload.scene.plate import POISSON, YOUNG_PA, solve_plate, stiffness


def rectangle(a, b):
    half = np.array([a, b]) / 2
    return half * np.array([[-1, -1], [1, -1], [1, 1], [-1, 1]]), half


def second(plate, half, dx, dy):
    c = polynomial.polyder(polynomial.polyder(plate.shape, dx, axis=0), dy, axis=1)
    return polynomial.polyval2d(*plate.top, c) / (half[0] ** dx * half[1] ** dy)


def navier(a, b, x, y, terms=60):
    """w D / q of a simply supported rectangle, corner at the origin: Navier's double series."""
    m = np.arange(1, 2 * terms, 2)
    sx, sy = np.sin(np.pi * np.outer(m, x) / a), np.sin(np.pi * np.outer(m, y) / b)
    k = np.pi**2 * ((m[:, None] / a) ** 2 + (m[None, :] / b) ** 2)
    weight = 16.0 / (np.pi**2 * np.outer(m, m)) / k**2
    return np.einsum("mn,mp,np->p", weight, sx, sy)


# Roark, Formulas for Stress and Strain, table 11.4 case 1a: w = alpha q a^4 / (E t^3), nu = 0.3.
@pytest.mark.parametrize(
    ("aspect", "alpha"),
    [(1.0, 0.0444), (1.2, 0.0616), (1.4, 0.0770), (1.6, 0.0906), (2.0, 0.1110), (3.0, 0.1335)],
)
def test_deflection_of_rectangles_is_roarks(aspect, alpha):
    outline, half = rectangle(1.0, aspect)
    w = solve_plate(outline, half).largest * half[0] ** 4  # D / q
    assert w * 12 * (1 - 0.3**2) == pytest.approx(alpha, rel=6e-3)  # the table's 1.4 is 0.5 % low


# Volume under a pane, DIN 18008-2 (values B_V from memory, nu = 0.23), by a / b.
@pytest.mark.parametrize(
    ("ratio", "volume"),
    [(1.0, 0.0193), (0.9, 0.0236), (0.8, 0.0288), (0.7, 0.0349), (0.6, 0.0421), (0.5, 0.0501),
     (0.4, 0.0587), (0.3, 0.0676), (0.2, 0.0766)],
)  # fmt: skip
def test_volume_under_a_pane_is_that_of_the_standard(ratio, volume):
    outline, half = rectangle(1.0, 1.0 / ratio)
    plate = solve_plate(outline, half)
    got = plate.largest * half[0] ** 4 * plate.mean * 12 * (1 - POISSON**2)
    assert got == pytest.approx(volume, abs=2e-4)


# Curvature at the middle over w_c / a^2: from the same series, computed apart.
@pytest.mark.parametrize(
    ("aspect", "short", "long"),
    [(1.0, 9.068, 9.068), (1.2, 9.268, 6.083), (1.5, 9.419, 3.627), (2.0, 9.523, 1.719)],
)
def test_curvature_at_the_middle(aspect, short, long):
    outline, half = rectangle(1.0, aspect)
    plate = solve_plate(outline, half)
    assert -second(plate, half, 2, 0) == pytest.approx(short, rel=2e-3)
    assert -second(plate, half, 0, 2) == pytest.approx(long, rel=4e-3)


@pytest.mark.parametrize("aspect", [1.0, 0.4, 2.5])
def test_shape_of_a_rectangle_is_naviers(aspect):
    a, b = 1.2, 1.2 * aspect
    outline, half = rectangle(a, b)
    plate = solve_plate(outline, half)
    xy = np.random.default_rng(1).uniform(-0.95, 0.95, (60, 2)) * half
    exact = navier(a, b, xy[:, 0] + a / 2, xy[:, 1] + b / 2)
    got = plate.largest * half[0] ** 4 * polynomial.polyval2d(*(xy / half).T, plate.shape)
    assert got == pytest.approx(exact, abs=3e-3 * exact.max())


def test_equilateral_triangle_is_timoshenkos():
    # Timoshenko and Woinowsky-Krieger, art. 68: w at the middle = q a^4 / (972 D), a the height.
    height, side = 1.8, 1.8 * 2 / np.sqrt(3)
    half = np.array([side, height]) / 2
    plate = solve_plate(half * np.array([[-1.0, -1.0], [1.0, -1.0], [0.0, 1.0]]), half)
    assert plate.largest * half[0] ** 4 == pytest.approx(height**4 / 972, rel=3e-3)
    assert plate.top == pytest.approx((0.0, -1 / 3), abs=2e-3)


def test_trapezoid_is_still_at_its_edges_and_between_its_rectangles():
    outline = np.array([[-1.0, -1.0], [1.0, -1.0], [0.6, 1.0], [-0.6, 1.0]])
    plate = solve_plate(outline, np.ones(2))
    along = np.linspace(0, 1, 9)[:, None]
    for k in range(4):
        edge = outline[k] + along * (outline[(k + 1) % 4] - outline[k])
        # Corners are rounded to a thousandth before they are solved.
        assert polynomial.polyval2d(*edge.T, plate.shape) == pytest.approx(0.0, abs=5e-3)
    inner, outer = (solve_plate(*rectangle(w, 2.0)).largest * (w / 2) ** 4 for w in (1.2, 2.0))
    assert inner < plate.largest < outer


def test_a_plate_wants_three_to_six_corners():
    with pytest.raises(InputError, match="corners"):
        solve_plate(np.zeros((2, 2)), np.ones(2))
    with pytest.raises(InputError, match="thickness"):
        stiffness(0.0)


def test_design_pressures_of_the_standard():
    # Summer and winter of EN 16612 and DIN 18008-2 (from memory): about 16 kPa either way.
    summer = isochore_pressure(warmer_k=20, barometer_rise_pa=-2e3, higher_m=600)
    winter = isochore_pressure(warmer_k=-25, barometer_rise_pa=4e3, higher_m=-300)
    assert summer == pytest.approx(16.0e3, rel=0.01)
    assert winter == pytest.approx(-16.1e3, rel=0.01)


def unit(a, b, thickness, gap, pressure):
    """Deflection and the two focal lengths of the outer pane of a unit of equal panes."""
    outline, half = rectangle(a, b)
    plate = solve_plate(outline, half)
    give = plate.largest * half[0] ** 4 / stiffness(thickness)
    load = share_load(pressure, gaps_m=[gap], compliance=[give * plate.mean] * 2)
    assert load[0] == pytest.approx(-load[1])
    w = give * load[0]
    return w, *(1 / (2 * abs(w * second(plate, half, *d))) for d in ((2, 0), (0, 2)))


# Equal panes, nu 0.23, E 70 GPa, 100 kPa; computed apart from this program by the series.
@pytest.mark.parametrize(
    ("size", "thick", "gap", "low", "high"),
    [
        ((1.0, 1.0), 6, 16, (0.72, 77, 77), (2.88, 19.2, 19.2)),
        ((1.0, 1.5), 6, 16, (0.73, 73, 189), (2.92, 18.2, 47)),
        ((1.5, 2.5), 8, 16, (0.74, 161, 544), (2.96, 40, 136)),
        ((0.6, 1.2), 4, 16, (0.70, 27, 150), (2.79, 6.8, 37)),
        ((0.6, 0.9), 3, 12, (0.55, 34, 90), (2.21, 8.6, 22)),
    ],
)
def test_bow_and_focal_lengths_of_equal_panes(size, thick, gap, low, high):
    for pressure, (w, f_short, f_long) in ((4e3, low), (16e3, high)):
        got = unit(*size, 1e-3 * thick, 1e-3 * gap, pressure)
        assert got == pytest.approx((1e-3 * w, f_short, f_long), rel=0.023)  # 22 is 21.5 to 22.5


def test_load_sharing_is_the_standards_characteristic_length():
    # a* = 28.9 [s d1^3 d2^3 / ((d1^3 + d2^3) B_V)]^(1/4) mm and phi = 1 / (1 + (a / a*)^4).
    a, s, d1, d2 = 700.0, 16.0, 6.0, 4.0
    outline, half = rectangle(1e-3 * a, 1e-3 * a)
    plate = solve_plate(outline, half)
    give = [plate.largest * plate.mean * half[0] ** 4 / stiffness(1e-3 * d) for d in (d1, d2)]
    load = share_load(10e3, gaps_m=[1e-3 * s], compliance=give)
    star = 28.9 * (s * d1**3 * d2**3 / ((d1**3 + d2**3) * 0.0193)) ** 0.25
    assert load[0] / 10e3 == pytest.approx(1 / (1 + (a / star) ** 4), rel=0.01)
    square = 28.9 * (16 * 6**3 / (2 * 0.0193)) ** 0.25  # 6/16/6
    assert square == pytest.approx(499, abs=1)


def test_large_panes_follow_the_gas():
    # The asymptote: each of two soft panes moves by half the gap times p0 over the atmosphere.
    give = 1e-3
    load = share_load(16e3, gaps_m=[0.016], compliance=[give, give])
    assert load[0] * give == pytest.approx(0.008 * 0.16, rel=0.02)


def test_middle_pane_of_equal_cavities_stays():
    load = share_load(-12e3, gaps_m=[0.012, 0.012], compliance=[2e-6, 2e-6, 2e-6])
    assert load[1] == pytest.approx(0.0, abs=1e-6)
    assert load[0] < 0.0 < load[2]


def test_cavities_want_one_gap_fewer_than_panes():
    with pytest.raises(InputError, match="gap"):
        share_load(1e3, gaps_m=[0.01], compliance=[1e-6])
    with pytest.raises(InputError, match="> 0"):
        share_load(1e3, gaps_m=[0.0], compliance=[1e-6, 1e-6])


def test_outline_of_a_pane_in_many_triangles():
    points = np.array([[0, 0], [1, 0], [2, 0], [2, 1], [2, 3.0], [0, 3], [1, 1.5], [0, 1]], float)
    outline = convex_outline(points)
    assert len(outline) == 4
    ends = end_edges(outline, np.array([0.0, 1.0]))
    assert len(ends) == 2
    assert sorted(ends @ [1.0, 1.0, 1.0]) == pytest.approx([1.0, 2.0])
    assert YOUNG_PA == 70e9
