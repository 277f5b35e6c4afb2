"""The sun's disc by table, against the exact overlap and closed forms."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from causticload.light.blur import light_inside_line, light_inside_triangle, make_blur
from causticload.light.overlap import flux_density
from causticload.light.splat import edge_lines
from causticload.sky.disc import SunDisc

SUN = 4.6505e-3
# Bilinear between 64 cells along an edge; six lookups a triangle. Share of the disc's light.
TABLE_ERROR = 3e-4
coordinate = st.floats(-2.5, 2.5).map(lambda x: round(x, 6))
corner = st.tuples(coordinate, coordinate)


def blur_of(kind="limb-darkened", slope=0.0):
    radii, weights = SunDisc(kind).rings(SUN, slope_error_rad=slope)
    return make_blur(np.tan(radii)[None], weights[None])


def inside(triangle, blur, x=0.0, y=0.0, rho=1.0):
    Q, lines = np.array(triangle, float), np.empty((3, 3))
    edge_lines(Q, lines)
    return light_inside_triangle(Q, lines, blur.mean[0], x, y, rho)


@settings(max_examples=200, deadline=None)
@given(corner, corner, corner, st.sampled_from([0.0, 2e-3, 2e-2]))
def test_agrees_with_the_exact_overlap_of_each_disc(a, b, c, slope):
    T = np.array([a, b, c])
    area = 0.5 * abs(np.linalg.det(np.c_[T[1] - T[0], T[2] - T[0]]))
    if area < 1e-3:
        return
    blur = blur_of(slope=slope)
    path = 1.0 / blur.reach[0]
    exact = area * flux_density(*T.ravel(), path, blur.radii[0], blur.weights[0])
    assert inside(T, blur) == pytest.approx(exact, abs=TABLE_ERROR)


@settings(max_examples=200, deadline=None)
@given(
    st.floats(-3.0, 3.0).map(lambda x: round(x, 3)),
    st.floats(0.0, 1.0),
    st.floats(1.0, 300.0),
    st.floats(0.0, 6.3),
)
def test_long_thin_triangles(height, place, length, turn):
    # A sliver that just passes for an image: its point, and its middle, past and over the disc.
    width = 0.2 / length
    T = np.array([[0.0, -width], [length, 0.0], [0.0, width]]) - [place * length, height * width]
    T = T @ np.array([[math.cos(turn), -math.sin(turn)], [math.sin(turn), math.cos(turn)]]).T
    blur = blur_of()
    path, area = 1.0 / blur.reach[0], width * length
    exact = area * flux_density(*T.ravel(), path, blur.radii[0], blur.weights[0])
    assert inside(T, blur) == pytest.approx(exact, abs=TABLE_ERROR)


@settings(max_examples=60, deadline=None)
@given(corner, st.floats(0.0, 6.3))
def test_a_fan_of_triangles_holds_the_whole_disc_once(apex, turn):
    # Four triangles about any point share out a square that holds the disc, seams included.
    rim = [(4.0 * math.cos(turn + q), 4.0 * math.sin(turn + q)) for q in np.arange(4) * math.pi / 2]
    blur = blur_of()
    parts = [inside([apex, rim[q], rim[(q + 1) % 4]], blur) for q in range(4)]
    assert sum(parts) == pytest.approx(1.0, abs=TABLE_ERROR)


def test_half_planes_of_a_uniform_disc():
    blur = blur_of("uniform")
    for e in np.linspace(-1.0, 1.0, 41):
        segment = (math.acos(e) - e * math.sqrt(1.0 - e * e)) / math.pi
        # linear between 512 cells of an arc that is steep at its ends
        assert light_inside_line(blur.edge[0], e) == pytest.approx(1.0 - segment, abs=2e-5)


@pytest.mark.parametrize("y", [0.0, 1e-13, -1e-13])
def test_a_point_on_an_edge_has_half_the_disc_inside(y):
    T = [[-9.0, 0.0], [9.0, 0.0], [0.0, 9.0]]
    assert inside(T, blur_of(), y=y) == pytest.approx(0.5, abs=TABLE_ERROR)


def test_tables_do_not_depend_on_the_distance_of_the_sun():
    near, far = (
        make_blur(np.tan(r)[None], w[None])
        for r, w in (SunDisc().rings(a) for a in (4.7e-3, 4.6e-3))
    )
    np.testing.assert_array_equal(near.mean, far.mean)
    assert near.reach[0] > far.reach[0]
