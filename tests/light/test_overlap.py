"""The overlap of a triangle and a disc, against shapely polygons and closed forms."""

import math

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st

from causticload.errors import InputError
from causticload.light.overlap import flux_density, triangle_disc_fraction

# to a micrometre: shapely loses digits on numbers near the smallest double
coordinate = st.floats(-3.0, 3.0).map(lambda x: round(x, 6))
corner = st.tuples(coordinate, coordinate)


def polygon_fraction(triangle, centre, radius):
    """The same by polygon clipping: general-purpose, 4,096 chords for the disc."""
    angle = np.linspace(0.0, 2.0 * np.pi, 4096, endpoint=False)
    # radius of the polygon of equal area
    r = radius * math.sqrt(2 * np.pi / 4096 / math.sin(2 * np.pi / 4096))
    disc = shapely.Polygon(np.c_[np.cos(angle), np.sin(angle)] * r + centre)
    tri = shapely.Polygon(triangle)
    return tri.intersection(disc).area / tri.area


@settings(max_examples=200, deadline=None)
@given(corner, corner, corner, corner, st.floats(0.05, 3.0))
def test_agrees_with_polygon_clipping(a, b, c, centre, radius):
    triangle = np.array([a, b, c])
    area = shapely.Polygon(triangle).area
    if area < 1e-3:
        return
    got = triangle_disc_fraction(triangle, centre=np.array(centre), radius=radius)
    # a 4,096-gon strays from the circle by 1e-6 of its radius: along at most its own perimeter
    slack = 2e-6 * radius * 2 * math.pi * radius / area + 1e-9
    assert got == pytest.approx(polygon_fraction(triangle, centre, radius), abs=slack)


@settings(max_examples=100, deadline=None)
@given(corner, corner, corner, corner, st.floats(0.1, 2.0), st.floats(0.0, 6.3))
def test_does_not_change_when_turned_moved_or_reversed(a, b, c, centre, radius, angle):
    T, P = np.array([a, b, c]), np.array(centre)
    turn = np.array([[math.cos(angle), -math.sin(angle)], [math.sin(angle), math.cos(angle)]])
    area = 0.5 * abs(np.linalg.det(np.c_[T[1] - T[0], T[2] - T[0]]))
    if area < 1e-4:  # the next test holds the thin ones
        return
    first = triangle_disc_fraction(T, centre=P, radius=radius)
    turned = triangle_disc_fraction(T[::-1] @ turn.T + 7.0, centre=turn @ P + 7.0, radius=radius)
    assert turned == pytest.approx(first, abs=1e-9 / area)


@pytest.mark.parametrize("width", [1e-3, 1e-6, 1e-9, 1e-12, 1e-15, 0.0])
def test_thin_triangle_tends_to_its_line(width):
    # Base 2 long, apex above its middle: the ramp of width puts 3/4 of the area within 1/2.
    T = np.array([[-1.0, 0.0], [1.0, 0.0], [0.0, width]])
    got = triangle_disc_fraction(T, centre=np.zeros(2), radius=0.5)
    assert got == pytest.approx(0.75, abs=2 * width + 1e-7)


@pytest.mark.parametrize("size", [1e-2, 1e-5, 1e-8, 1e-11, 0.0])
def test_small_triangle_is_in_or_out(size):
    T = size * np.array([[0.0, 0.0], [1.0, 0.2], [0.3, 1.0]])
    inside = triangle_disc_fraction(T, centre=np.array([0.3, 0.0]), radius=0.5)
    outside = triangle_disc_fraction(T, centre=np.array([0.6, 0.0]), radius=0.5)
    assert inside == pytest.approx(1.0, abs=1e-7)  # the edge sum keeps 1e-15 / THIN
    assert outside == pytest.approx(0.0, abs=1e-7)


def test_closed_forms():
    big = np.array([[-10.0, 0.0], [10.0, 0.0], [0.0, 20.0]])
    half = triangle_disc_fraction(big, centre=np.zeros(2), radius=1.0)
    assert half * 200.0 == pytest.approx(math.pi / 2, rel=1e-12)  # half the disc
    corner_disc = triangle_disc_fraction(
        np.array([[0.0, 0.0], [5.0, 0.0], [0.0, 5.0]]), centre=np.zeros(2), radius=2.0
    )
    assert corner_disc * 12.5 == pytest.approx(math.pi, rel=1e-12)  # a quarter of it


def test_flux_density_integrates_to_one():
    # Every watt of the tube lands: the density over the plane adds up to 1.
    radii, weights = np.array([0.01, 0.006]), np.array([0.7, 0.3])
    D, h = 40.0, 0.01
    T = np.array([[0.1, 0.05], [0.9, 0.2], [0.3, 0.8]])
    x = np.arange(-1.0, 2.0, h) + h / 2
    total = sum(flux_density(*(T - (px, py)).ravel(), D, radii, weights) for px in x for py in x)
    assert total * h * h == pytest.approx(1.0, abs=1e-4)  # midpoint rule at h = rho/40


@pytest.mark.parametrize("radius", [0.0, -1.0, math.nan, math.inf])
def test_radius_must_be_positive_and_finite(radius):
    with pytest.raises(InputError, match="radius > 0"):
        triangle_disc_fraction(np.eye(3)[:, :2], centre=np.zeros(2), radius=radius)


def test_shapes_are_checked():
    with pytest.raises(InputError, match=r"\(3, 2\)"):
        triangle_disc_fraction(np.eye(3), centre=np.zeros(2), radius=1.0)
