"""Charts: areas, holes, cut cells, turned walls, regions."""

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st

from causticload.errors import InputError
from causticload.scene.charts import make_charts, number_charts
from causticload.scene.reach import reach_bounds


def area_of(triangles):
    cross = np.cross(triangles[:, 1] - triangles[:, 0], triangles[:, 2] - triangles[:, 0])
    return 0.5 * np.linalg.norm(cross, axis=1).sum()


def flat(polygon):
    """Triangles of a polygon in the plane z = 0, by shapely's Delaunay."""
    parts = [
        np.array(t.exterior.coords)[:3]
        for t in shapely.constrained_delaunay_triangles(polygon).geoms
    ]
    T = np.pad(np.array(parts), ((0, 0), (0, 0), (0, 1)))
    up = np.cross(T[:, 1] - T[:, 0], T[:, 2] - T[:, 0])[:, 2] > 0
    return np.where(up[:, None, None], T, T[:, ::-1])


L_WITH_HOLE = shapely.Polygon(
    [(0, 0), (20, 0), (20, 9.3), (8.1, 9.3), (8.1, 17), (0, 17)],
    [[(2, 2), (5, 2), (5, 5.5), (2, 5.5)]],
)


@pytest.mark.parametrize("spacing", [0.25, 0.4, 3.0])
def test_areas_sum_to_the_mesh(spacing):
    T = flat(L_WITH_HOLE)
    charts, of = make_charts(T, surface=3, spacing_m=spacing)
    assert len(charts) == 1
    assert (of == 0).all()
    c = charts[0]
    assert c.areas.sum() == pytest.approx(area_of(T), rel=1e-9)
    assert c.surface == 3
    assert c.normal == pytest.approx([0, 0, 1])
    # a cell that nothing cuts keeps its full area and its middle
    assert np.isclose(c.areas, spacing**2, rtol=1e-9).mean() > (0.8 if spacing < 1 else 0.1)
    assert shapely.contains_xy(L_WITH_HOLE.buffer(1e-6), c.points[:, :2]).all()


def test_cell_numbers_and_points_belong_together():
    (c,), _ = make_charts(flat(L_WITH_HOLE), surface=0, spacing_m=0.5)
    i, j = np.nonzero(c.cell >= 0)
    p = c.points[c.cell[i, j]]
    local = np.stack([(p - c.origin) @ c.u, (p - c.origin) @ c.v], axis=1) / 0.5
    assert (np.floor(local + 1e-9 * np.sign(0.5 - local % 1)) == np.stack([i, j], 1)).all()
    assert sorted(c.cell[i, j]) == list(range(len(c.areas)))


@settings(max_examples=25, deadline=None)
@given(st.floats(0, 6.28), st.floats(-1.5, 1.5), st.floats(-1000, 1000))
def test_turned_and_moved_walls_keep_their_area(turn, tilt, shift):
    T = flat(L_WITH_HOLE)
    a, b = np.cos(turn), np.sin(turn)
    c, d = np.cos(tilt), np.sin(tilt)
    turned = T @ np.array([[1, 0, 0], [0, c, -d], [0, d, c]]).T
    turned = turned @ np.array([[a, -b, 0], [b, a, 0], [0, 0, 1]]).T + [shift, 0, -shift]
    charts, _ = make_charts(turned, surface=0, spacing_m=0.5)
    assert sum(x.areas.sum() for x in charts) == pytest.approx(area_of(T), rel=1e-6)
    for chart in charts:
        off = (chart.points - chart.origin) @ chart.normal
        assert np.abs(off).max() < 1e-6  # points lie in their plane


def test_a_turned_plaza_gets_a_turned_grid():
    T = flat(shapely.affinity.rotate(shapely.box(0, 0, 60, 8), 40))
    (c,), _ = make_charts(T, surface=0, spacing_m=0.25)
    assert c.cell.size < 1.1 * 60 * 8 / 0.25**2


def test_a_box_has_six_charts_facing_outwards():
    import trimesh

    T = np.array(trimesh.creation.box((4, 3, 2)).triangles)
    charts, _ = make_charts(T, surface=0, spacing_m=0.5)
    assert len(charts) == 6
    for c in charts:
        assert c.points.mean(axis=0) @ c.normal > 0.9


def test_terrain_keeps_every_triangle():
    rng = np.random.default_rng(2)
    x, y = np.meshgrid(np.arange(0, 33.0), np.arange(0, 33.0), indexing="ij")
    z = 2.0 * np.sin(0.3 * x) + 1.5 * np.cos(0.2 * y) + 0.05 * rng.random(x.shape)
    g = np.stack([x, y, z], axis=-1)
    a, b, c, d = g[:-1, :-1], g[1:, :-1], g[1:, 1:], g[:-1, 1:]
    T = np.concatenate([np.stack(q, axis=2).reshape(-1, 3, 3) for q in ((a, b, c), (a, c, d))])
    charts, of = make_charts(T, surface=0, spacing_m=0.5)
    assert (of >= 0).all()
    assert sum(c.areas.sum() for c in charts) == pytest.approx(area_of(T), rel=1e-6)


def test_a_huge_ground_is_sampled_in_its_region_only():
    half = 5000.0
    T = np.array(
        [
            [[-half, -half, 0], [half, -half, 0], [half, half, 0]],
            [[-half, -half, 0], [half, half, 0], [-half, half, 0]],
        ]
    )
    region = np.array([[-30.0, -40.0, -1.0], [50.0, 10.0, 1.0]])
    (c,), of = make_charts(T, surface=0, spacing_m=0.25, region=region)
    assert c.areas.sum() == pytest.approx(80 * 50, rel=1e-9)
    assert (of == 0).all()
    nowhere = np.array([[0.0, 0.0, 5.0], [1.0, 1.0, 6.0]])
    charts, of = make_charts(T, surface=0, spacing_m=0.25, region=nowhere)
    assert charts == ()
    assert (of == -1).all()


def test_points_are_numbered_through():
    charts, _ = make_charts(flat(L_WITH_HOLE), surface=0, spacing_m=1.0)
    a, b = number_charts([charts[0], charts[0]])
    assert (a.first, b.first) == (0, len(a.areas))


@pytest.mark.parametrize("spacing", [0.0, -1.0, np.nan, np.inf])
def test_spacing_must_be_positive(spacing):
    with pytest.raises(InputError, match="spacing"):
        make_charts(flat(L_WITH_HOLE), surface=0, spacing_m=spacing)


def test_reach_of_one_mirror():
    # A vertical south-facing pane 10 m up under a sun at 45 degrees: light falls 10 m in front.
    s = np.array([[0.0, -np.sqrt(0.5), np.sqrt(0.5)]])
    args = (np.array([[0.0, 0.0, 10.0]]), np.array([[0.0, -1.0, 0.0]]), s)
    plane = {"plane_point": np.zeros(3), "plane_normal": np.array([0.0, 0.0, 1.0])}
    bounds = reach_bounds(*args, **plane, limit_m=100.0)
    assert bounds == pytest.approx(np.array([[-2.0, -12.0, -2.0], [2.0, -8.0, 2.0]]), abs=1e-9)
    assert reach_bounds(*args, **plane, limit_m=5.0) is None
