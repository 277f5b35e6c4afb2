"""Whole fields: what must not change an answer, shadows, ledgers, and the ray count beside it."""

import math

import numpy as np
import pytest
from scenes import (
    balance,
    cylinder_mirror,
    grid_triangles,
    lit_scene,
    plane_chart,
    quadric_mirror,
)

from causticload.errors import InputError
from causticload.light.count import count_spot
from causticload.light.field import solve_field
from causticload.light.points import solve_points

SUN = 4.6505e-3
UP = [0.0, 0.0, 1.0]


def sun(azimuth, elevation):
    a, e = math.radians(azimuth), math.radians(elevation)
    return np.array([math.sin(a) * math.cos(e), math.cos(a) * math.cos(e), math.sin(e)])


def wall(cells=16):
    """A concave wall facing south: the cylinder turned about the vertical."""
    T, N = cylinder_mirror(30.0, half_angle=0.4, bottom=2.0, top=22.0, cells=cells)
    turn = np.array([[0.0, -1.0, 0.0], [1.0, 0.0, 0.0], [0.0, 0.0, 1.0]])  # +x to +y
    return T @ turn.T - [0.0, 10.0, 0.0], N @ turn.T


def plaza(half=32.0, spacing=0.5):
    return plane_chart([0.0, 0.0, 0.0], UP, half=half, spacing=spacing, u=[1.0, 0.0, 0.0])


def boxes(seed, count):
    rng = np.random.default_rng(seed)
    unit_box = np.array([[x, y, z] for x in (0, 1) for y in (0, 1) for z in (0, 1)], float)
    sides = [(0, 1, 3, 2), (4, 6, 7, 5), (0, 4, 5, 1), (2, 3, 7, 6), (0, 2, 6, 4), (1, 5, 7, 3)]
    parts = []
    for _ in range(count):
        size = [3.0, 3.0, rng.uniform(4.0, 14.0)]
        corner = unit_box * size + [rng.uniform(-20, 20), rng.uniform(-25, 10), 0.0]
        parts += [corner[[[q[0], q[1], q[2]], [q[0], q[2], q[3]]]] for q in sides]
    return np.concatenate(parts)


def solve(lit, s, **options):
    return solve_field(lit, sun_direction=s, sun_radius=SUN, **options)


@pytest.mark.parametrize(("azimuth", "elevation"), [(180, 50), (205, 28), (150, 12), (120, 5)])
def test_ledger_closes_among_shadows(azimuth, elevation):
    lit = lit_scene(*wall(), receiver=plaza(), obstacles=boxes(3, 10), R=0.4)
    field = solve(lit, sun(azimuth, elevation))
    assert field.ledger["intercepted"] > 100.0
    assert abs(balance(field)) < 0.005  # half a per cent: what a screening may lose
    assert field.ledger["absorbed"] >= 0.6 * field.ledger["intercepted"] - 1e-9


def test_threads_do_not_change_the_answer():
    lit = lit_scene(*wall(), receiver=plaza(), obstacles=boxes(4, 6))
    one, two = solve(lit, sun(190, 40)), solve(lit, sun(190, 40), threads=2)
    assert two.load == pytest.approx(one.load, abs=1e-9)
    assert (two.images == one.images).all()


def test_order_of_faces_does_not_change_the_answer():
    T, N = wall()
    order = np.random.default_rng(1).permutation(len(T))
    a = solve(lit_scene(T, N, receiver=plaza(), obstacles=boxes(5, 6)), sun(200, 35))
    b = solve(lit_scene(T[order], N[order], receiver=plaza(), obstacles=boxes(5, 6)), sun(200, 35))
    assert b.load == pytest.approx(a.load, abs=1e-8)


def test_turning_north_turns_nothing():
    # The whole scene and the sun turned together by 37 degrees about the vertical.
    c, q = math.cos(math.radians(37.0)), math.sin(math.radians(37.0))
    turn = np.array([[c, -q, 0.0], [q, c, 0.0], [0.0, 0.0, 1.0]])
    T, N = wall()
    s = sun(195, 42)
    a = solve(lit_scene(T, N, receiver=plaza()), s)
    chart = plane_chart([0, 0, 0], UP, half=32.0, spacing=0.5, u=turn @ [1.0, 0.0, 0.0])
    b = solve(lit_scene(T @ turn.T, N @ turn.T, receiver=chart), turn @ s)
    assert b.load == pytest.approx(a.load, abs=2e-3 * a.load.max())


def test_splitting_every_triangle_in_four_changes_little():
    T, N = wall(cells=48)

    def quarter(v):
        a, b, c = v[:, 0], v[:, 1], v[:, 2]
        ab, bc, ca = (a + b) / 2, (b + c) / 2, (c + a) / 2
        rows = ((a, ab, ca), (ab, b, bc), (ca, bc, c), (ab, bc, ca))
        return np.concatenate([np.stack(r, axis=1) for r in rows])

    finer = quarter(N)
    finer /= np.linalg.norm(finer, axis=2, keepdims=True)
    s = sun(180, 45)
    a = solve(lit_scene(T, N, receiver=plaza(spacing=0.25)), s)
    b = solve(lit_scene(quarter(T), finer, receiver=plaza(spacing=0.25)), s)
    hot = a.load > 0.2
    rms = np.sqrt(np.mean((b.load[hot] / a.load[hot] - 1.0) ** 2))
    assert rms < 0.03  # 3 % over the lit cells: what an instant is held to
    assert b.load.sum() == pytest.approx(a.load.sum(), rel=2e-3)


def test_thin_boxes_reflect_as_single_sheets_do():
    pane = np.stack([*np.meshgrid([-1.0, 1.0], [0.0, 0.0], indexing="ij"), np.zeros((2, 2))], -1)
    pane = np.array([[[-1, 0, 2], [-1, 0, 4]], [[1, 0, 2], [1, 0, 4]]], float)
    front = grid_triangles(pane)
    back = front + [0.0, 0.03, 0.0]
    lids = [
        np.array([[[-1, 0, z], [1, 0, z], [1, 0.03, z]], [[-1, 0, z], [1, 0.03, z], [-1, 0.03, z]]])
        for z in (2.0, 4.0)
    ]
    sides = [
        np.array([[[x, 0, 2], [x, 0, 4], [x, 0.03, 4]], [[x, 0, 2], [x, 0.03, 4], [x, 0.03, 2]]])
        for x in (-1.0, 1.0)
    ]
    s = sun(180, 40)
    one = solve(lit_scene(front, receiver=plaza(8.0, 0.25), smooth=False), s)
    box = np.concatenate([front, back, *lids, *sides])
    two = solve(lit_scene(box, receiver=plaza(8.0, 0.25), smooth=False), s)
    assert one.load.max() > 0.5
    # the lid sends a strip 30 mm wide elsewhere, to the sky: nothing of it reaches the plaza
    assert two.load == pytest.approx(one.load, abs=0.01)


def test_a_shadow_falls_where_geometry_says():
    # A flat mirror, and a half-plane that keeps the sun off its left half.
    pane = grid_triangles(np.array([[[-2, 0, 1], [-2, 0, 3]], [[2, 0, 1], [2, 0, 3]]], float))
    s = sun(180, 45)
    cover = np.array(
        [
            [[-9, -0.05, -9], [0, -0.05, -9], [0, -0.05, 9]],
            [[-9, -0.05, -9], [0, -0.05, 9], [-9, -0.05, 9]],
        ],
        float,
    )
    lit = lit_scene(pane, receiver=plaza(6.0, 0.1), obstacles=cover, smooth=False)
    field = solve(lit, s)
    x, y = lit.points[:, 0], lit.points[:, 1]
    row = (y < -1.5) & (y > -2.5)
    assert field.load[row & (x < -0.15)].max() == 0.0
    inside = row & (x > 0.15) & (x < 1.8)
    assert field.load[inside] == pytest.approx(math.sin(math.radians(45.0)), abs=0.02)


def test_receiver_seen_from_behind_gets_nothing():
    chart = plane_chart([0.0, -12.0, 6.0], [0.0, -1.0, 0.0], half=5.0, spacing=0.25)
    away = solve(lit_scene(*wall(), receiver=chart), sun(180, 20))
    chart = plane_chart([0.0, -12.0, 6.0], [0.0, 1.0, 0.0], half=5.0, spacing=0.25)
    facing = solve(lit_scene(*wall(), receiver=chart), sun(180, 20))
    assert away.load.max() == 0.0
    assert facing.load.max() > 0.5


def test_mirror_turned_inside_out_reflects_the_same():
    T, N = wall()
    a = solve(lit_scene(T, N, receiver=plaza()), sun(180, 45))
    b = solve(lit_scene(T[:, ::-1], -N[:, ::-1], receiver=plaza()), sun(180, 45))
    # another corner comes first, so ties between edges to halve fall otherwise
    assert b.load == pytest.approx(a.load, abs=0.02 * a.load.max())
    assert b.load.sum() == pytest.approx(a.load.sum(), rel=1e-3)


@pytest.mark.parametrize("spacing", [0.25, 0.5])
def test_a_receiver_takes_the_same_load_when_it_mirrors_too(spacing):
    # What falls on a wall does not depend on what the wall then does with it. The wall faces
    # north, away from the sun, and what it sends back meets the first mirror only: unfollowed.
    chart = plane_chart([0.0, -12.0, 6.0], [0.0, 1.0, 0.0], half=5.0, spacing=spacing)
    cover = boxes(6, 4)
    for azimuth, elevation in ((180, 25), (200, 12)):
        s = sun(azimuth, elevation)
        dull = solve(lit_scene(*wall(), receiver=chart, obstacles=cover), s)
        bright = solve(
            lit_scene(*wall(), receiver=chart, obstacles=cover, receiver_mirrors=True), s
        )
        assert dull.load.max() > 0.5
        # edges are settled in other pieces: a few per cent of single cells, nothing of the whole
        assert bright.load.sum() == pytest.approx(dull.load.sum(), rel=0.01)
        hot = dull.load > 0.5 * dull.load.max()
        assert np.median(np.abs(bright.load[hot] / dull.load[hot] - 1.0)) < 0.02
        assert abs(balance(bright)) < 0.005
        assert bright.ledger["receivers"] == 0.0  # the mirror enters what it takes in


def test_a_mirror_that_receives_shows_its_load_after_a_second_reflection():
    # A periscope whose light ends on a wall that mirrors too.
    lower = np.array(
        [[[-1, -1, -1], [1, -1, 1], [1, 1, 1]], [[-1, -1, -1], [1, 1, 1], [-1, 1, -1]]], float
    )
    upper = lower + np.array([0.0, 0.0, 10.0])
    lit = lit_scene(
        np.concatenate([lower, upper]),
        receiver=plane_chart([8.0, 0.0, 10.0], [-1.0, 0.0, 0.0], half=3.0, spacing=0.1),
        R=0.5,
        smooth=False,
        mirror_units=np.array([0, 0, 1, 1]),
        receiver_mirrors=True,
        obstacles=plane_chart([4.0, 0.0, 4.0], [-1.0, 0.0, 0.0], half=3.0, spacing=1.0)[1],
    )
    field = solve(lit, np.array([-1.0, 0.0, 0.0]))
    middle = np.linalg.norm(lit.points - [8.0, 0.0, 10.0], axis=1) < 0.5
    assert field.load[middle] == pytest.approx(0.25, rel=0.02)


def test_focus_narrower_than_the_grid_keeps_its_light():
    # A dish whose focal spot (19 mm across at 2 m) falls between 0.25 m points.
    lit = lit_scene(
        *quadric_mirror(0.25, 0.0, 0.25, half=0.5, cells=16),
        receiver=plane_chart([0.06, 0.03, 2.0], [0.0, 0.0, -1.0], half=1.0, spacing=0.25),
    )
    # the receiver would shade the dish under a sun overhead: light from the side, 25° off
    s = np.array([math.sin(0.44), 0.0, math.cos(0.44)])
    lit = lit_scene(
        *quadric_mirror(0.25, 0.0, 0.25, half=0.5, cells=16),
        receiver=plane_chart([-0.9, 0.03, 1.8], [0.4, 0.0, -0.9], half=0.75, spacing=0.25),
    )
    field = solve(lit, s)
    assert field.ledger["receivers"] > 0.9 * field.ledger["intercepted"]
    assert abs(balance(field)) < 0.005


@pytest.mark.parametrize(("azimuth", "elevation"), [(180, 48), (215, 30)])
def test_ray_count_agrees_with_tubes_at_the_peak(azimuth, elevation):
    lit = lit_scene(*wall(cells=40), receiver=plaza(), obstacles=boxes(8, 8), R=0.7)
    s = sun(azimuth, elevation)
    field = solve(lit, s)
    peak = lit.points[field.load.argmax()]
    k = np.arange(150) + 0.5
    for radius in (0.15, 0.6):
        r, turn = radius * np.sqrt(k / 150), k * 2.39996
        disc = peak + np.stack([r * np.cos(turn), r * np.sin(turn), 0 * r], axis=1)
        light = solve_points(
            lit,
            sun_direction=s,
            sun_radius=SUN,
            points=disc,
            normals=np.tile(UP, (150, 1)),
            bounced=field.bounced,
        )
        count = count_spot(
            lit,
            sun_direction=s,
            sun_radius=SUN,
            centre=peak,
            normal=np.array(UP),
            radius_m=radius,
            rays=300_000,
            seed=7,
        )
        assert count.hits > 300
        assert abs(light.load.mean() - count.mean) < 3.5 * count.standard_error


def test_ray_count_error_is_honest():
    # Twelve counts with other seeds: their scatter is what each says of itself, to a factor 1.6
    # (chi-square with 11 degrees of freedom, 99 % band).
    lit = lit_scene(*wall(), receiver=plaza())
    counts = [
        count_spot(
            lit,
            sun_direction=sun(180, 45),
            sun_radius=SUN,
            centre=np.array([0.0, 6.0, 0.0]),
            normal=np.array(UP),
            radius_m=0.5,
            rays=20_000,
            seed=seed,
            second=False,
        )
        for seed in range(12)
    ]
    scatter = np.std([c.mean for c in counts], ddof=1)
    said = np.mean([c.standard_error for c in counts])
    assert said > 0.0
    assert 1 / 1.7 < scatter / said < 1.7


@pytest.mark.parametrize(("radius", "rays"), [(0.0, 5000), (-1.0, 5000), (0.2, 10)])
def test_ray_count_refuses_bad_arguments(radius, rays):
    lit = lit_scene(*wall(), receiver=plaza())
    with pytest.raises(InputError):
        count_spot(
            lit,
            sun_direction=sun(180, 45),
            sun_radius=SUN,
            centre=np.zeros(3),
            normal=np.array(UP),
            radius_m=radius,
            rays=rays,
            seed=1,
        )


def test_contributions_of_panels_add_up_to_solving_one_at_a_time():
    T, N = wall()
    lit = lit_scene(T, N, receiver=plaza())
    s = sun(180, 45)
    peak = lit.points[solve(lit, s).load.argmax()][None]
    normal = np.array([UP])
    whole = solve_points(lit, sun_direction=s, sun_radius=SUN, points=peak, normals=normal)
    by_panel = np.bincount(whole.parts.panel, weights=whole.parts.load, minlength=len(T))
    assert by_panel.sum() == pytest.approx(whole.load[0], rel=1e-12)
    for panel in np.argsort(-by_panel)[:3]:
        alone = lit_scene(T[[panel]], N[[panel]], receiver=plaza())
        light = solve_points(alone, sun_direction=s, sun_radius=SUN, points=peak, normals=normal)
        assert light.load[0] == pytest.approx(by_panel[panel], rel=1e-6)
