"""Ray tubes against the laws of optics: closed forms, computed independently of the program.

Coddington's equations and the exact local law; the caustic of a circle; images near a focus; the
Laplacian law of shallow relief; the theorem of constant brightness; conservation of energy.
"""

import math

import numpy as np
import pytest
from scenes import (
    balance,
    cylinder_mirror,
    face_normals,
    grid_triangles,
    lit_scene,
    plane_chart,
    quadric_mirror,
    unit,
)

from causticload.light.field import solve_field
from causticload.light.points import solve_points

SUN = 4.6505e-3  # rad, mean angular radius
POINT_SUN = 2e-6  # rad: blur far below the images of these tests


def sun_at(theta):
    """Direction to a sun in the x-z plane, ``theta`` from the z axis."""
    return np.array([math.sin(theta), 0.0, math.cos(theta)])


def mirrored(s):
    """Direction of the chief ray off a mirror that faces +z."""
    return np.array([-s[0], -s[1], s[2]])


# (k_tt, k_ts, k_ss, theta in degrees, distance) -> E / (rho DNI), by
# E = 1 / |det(I - 2 D M)|, M = [[k_tt / cos, k_ts], [k_ts, k_ss cos]]: the exact local law of a
# mirror (its diagonal case are Coddington's equations).
LOCAL_LAW = [
    ((0.02, 0.0, 0.02, 0.0, 10.0), 2.77778),
    ((0.02, 0.0, 0.02, 60.0, 10.0), 6.25000),
    ((0.02, 0.0, 0.0, 45.0, 20.0), 7.61204),
    ((0.015, 0.004, -0.006, 50.0, 12.0), 2.12114),
    ((0.001, 0.002, 0.003, 70.0, 30.0), 1.31682),
    ((-0.02, 0.0, -0.02, 30.0, 10.0), 0.508055),
]


@pytest.mark.parametrize(("case", "expected"), LOCAL_LAW)
def test_local_law_of_a_curved_mirror(case, expected):
    k_tt, k_ts, k_ss, degrees, D = case
    # The x axis lies in the plane of incidence; the twist's sign follows the mirrored axis.
    lit = lit_scene(*quadric_mirror(k_tt, k_ts, k_ss, half=0.02, cells=8))
    s = sun_at(math.radians(degrees))
    r = mirrored(s)
    off_the_seams = [2.1e-4, 0.9e-4, 0.0]  # the origin is a corner of the mesh
    light = solve_points(
        lit,
        sun_direction=s,
        sun_radius=POINT_SUN,
        points=(D * r + off_the_seams)[None],
        normals=-r[None],
    )
    # tubes of 5 mm on curvatures that change by 1e-4 of themselves over that length
    assert light.load[0] == pytest.approx(expected, rel=2e-3)
    assert light.images[0] == 1


@pytest.mark.parametrize("p", [0.3, 0.5, 0.8, 1.1])
def test_images_jump_across_the_caustic_of_a_circle(p):
    # Envelope of rays along +x mirrored by a circle: x = R (3 cos p - cos 3p) / 4,
    # y = R (3 sin p - sin 3p) / 4, its cusp at R / 2 (a nephroid).
    R, elevation = 10.0, math.radians(30.0)
    x = R * (3.0 * math.cos(p) - math.cos(3.0 * p)) / 4.0
    y = R * (3.0 * math.sin(p) - math.sin(3.0 * p)) / 4.0
    # The ray of parameter p leaves the wall at (R cos p, R sin p) in the direction 2 p - pi: it
    # touches the envelope there; across it lies its normal.
    across = np.array([-math.sin(2.0 * p), math.cos(2.0 * p)])
    lit = lit_scene(*cylinder_mirror(R, half_angle=1.5, bottom=0.0, top=20.0, cells=120))
    s = np.array([-math.cos(elevation), 0.0, math.sin(elevation)])
    height = 2.0
    step = 0.04
    points = np.array(
        [[*(np.array([x, y]) + sign * step * across), height] for sign in (-1.0, 1.0)]
    )
    light = solve_points(
        lit, sun_direction=s, sun_radius=1e-4, points=points, normals=np.tile([0, 0, 1.0], (2, 1))
    )
    low, high = sorted(light.images)
    assert high - low == 2, light.images


def test_known_points_of_the_envelope():
    # The two printed points of the same curve at R = 1.
    for p, place in ((0.5, (0.640503, 0.110195)), (1.3, (0.382107, 0.894610))):
        x = (3.0 * math.cos(p) - math.cos(3.0 * p)) / 4.0
        y = (3.0 * math.sin(p) - math.sin(3.0 * p)) / 4.0
        assert (x, y) == pytest.approx(place, abs=5e-7)


def test_line_focus_of_a_cylinder():
    # Width a = 1 m, focal length 25 m, even sun: the line of light has the mean a / (2 f tan)
    # and 4 / pi of it along its middle. Sun on the axis of the strip.
    f, a = 25.0, 1.0
    line = np.linspace(-a / 2, a / 2, 41)
    length = np.linspace(-4.0, 4.0, 17)
    x, y = np.meshgrid(line, length, indexing="ij")
    k = 1.0 / (2.0 * f)
    z = 0.5 * k * x**2
    slope = unit(np.stack([-k * x, np.zeros_like(x), np.ones_like(x)], axis=-1))
    lit = lit_scene(grid_triangles(np.stack([x, y, z], -1)), grid_triangles(slope))
    up = np.array([0.0, 0.0, 1.0])
    across = np.linspace(-0.2, 0.2, 401)
    points = np.stack([across, np.zeros_like(across), np.full_like(across, f)], axis=1)
    light = solve_points(
        lit, sun_direction=up, sun_radius=SUN, points=points, normals=np.tile(-up, (401, 1))
    )
    width = 2.0 * f * math.tan(SUN)
    assert width == pytest.approx(f * 9.301e-3, rel=1e-3)
    assert light.load.sum() * (across[1] - across[0]) == pytest.approx(a, rel=3e-3)
    assert light.load.max() == pytest.approx(5.48, rel=0.01)  # printed to three digits
    assert a / width == pytest.approx(4.30, abs=0.005)


def test_point_focus_of_a_dish():
    # 1 m² at its focal length 25 m: mean over the sun's image A / (pi (f tan a)²) = 23.55.
    f = 25.0
    lit = lit_scene(*quadric_mirror(0.5 / f, 0.0, 0.5 / f, half=0.5, cells=24))
    up = np.array([0.0, 0.0, 1.0])
    rho = f * math.tan(SUN)
    count = np.arange(600) + 0.5
    r, turn = 0.97 * rho * np.sqrt(count / 600), count * 2.39996
    points = np.stack([r * np.cos(turn), r * np.sin(turn), np.full(600, f)], axis=1)
    light = solve_points(
        lit, sun_direction=up, sun_radius=SUN, points=points, normals=np.tile(-up, (600, 1))
    )
    # A parabola's rim lies 5 mm deeper and its corner is 0.7 m off axis: 0.3 % of spread
    assert light.load.mean() == pytest.approx(23.55, rel=0.01)


def test_laplacian_law_of_shallow_relief():
    # E / E0 = 1 + 2 D lap h for a relief h towards the light, far inside the focus. With
    # h = 1e-5 cos(2 pi x / 0.2), D = 1 m: 0.98064 at x = 0 by ray tracing, 0.98026 by the law.
    length, depth, D = 0.2, 1e-5, 1.0
    line = np.linspace(-0.3, 0.3, 481)
    x, y = np.meshgrid(line, np.array([-0.3, 0.3]), indexing="ij")
    wave = 2.0 * math.pi / length
    z = depth * np.cos(wave * x)
    slope = unit(
        np.stack([depth * wave * np.sin(wave * x), np.zeros_like(x), np.ones_like(x)], axis=-1)
    )
    lit = lit_scene(grid_triangles(np.stack([x, y, z], -1)), grid_triangles(slope))
    up = np.array([0.0, 0.0, 1.0])
    points = np.array([[0.0, 0.0, D], [length / 2, 0.0, D]])
    light = solve_points(
        lit, sun_direction=up, sun_radius=1e-5, points=points, normals=np.tile(-up, (2, 1))
    )
    assert light.load[0] == pytest.approx(0.98064, abs=2e-4)
    lap = -depth * wave**2
    assert light.load[1] == pytest.approx(1.0 - 2.0 * D * lap, abs=6e-4)  # second order 4e-4


def backward_integral(pane, P, normal, s, radius):
    """Irradiance of a flat pane at a point: the share of the sun's disc seen in the mirror.

    Looks back from the point along the mirrored directions of 200,000 even points of the disc.
    """
    n = face_normals(pane)[0]
    k = np.arange(200_000) + 0.5
    r, turn = math.tan(radius) * np.sqrt(k / len(k)), k * math.pi * (3.0 - math.sqrt(5.0))
    e1 = unit(np.cross(s, [0.3, 0.5, 0.8]))
    e2 = np.cross(s, e1)
    sun = s + (r * np.cos(turn))[:, None] * e1 + (r * np.sin(turn))[:, None] * e2
    to_sun = unit(sun)
    back = to_sun - 2.0 * (to_sun @ n)[:, None] * n  # from the point to its mirror image
    back = np.where((back @ n)[:, None] < 0, back, -back)
    t = ((pane[0, 0] - P) @ n) / (back @ n)
    hit = P + t[:, None] * back
    inside = np.zeros(len(hit), bool)
    for tri in pane:
        edges = [np.cross(tri[(i + 1) % 3] - tri[i], hit - tri[i]) @ n for i in range(3)]
        inside |= np.all(np.array(edges) >= 0.0, axis=0) | np.all(np.array(edges) <= 0.0, axis=0)
    return float(np.mean(inside & (t > 0)) * abs(back.mean(axis=0) @ normal))


@pytest.mark.parametrize("distance", [5.0, 40.0, 150.0])
@pytest.mark.parametrize("degrees", [10.0, 55.0])
def test_flat_pane_against_a_backward_integral(distance, degrees):
    pane = grid_triangles(
        np.stack([*np.meshgrid([-0.4, 0.4], [-0.6, 0.6], indexing="ij"), np.zeros((2, 2))], -1)
    )
    lit = lit_scene(pane, smooth=False)
    s = sun_at(math.radians(degrees))
    r = mirrored(s)
    e1 = unit(np.cross(r, [0.0, 1.0, 0.0]))
    # A receiver tilted by 30 degrees out of the beam.
    normal = unit(-math.cos(0.5) * r + math.sin(0.5) * e1)
    side = np.cross(normal, e1)
    u = unit(np.cross(side, normal))
    offsets = [(0.0, 0.0), (0.35, 0.1), (0.5, 0.6), (0.2, -0.75), (1.2, 0.0)]
    P = np.array([distance * r + a * u + b * unit(side) for a, b in offsets])
    light = solve_points(
        lit, sun_direction=s, sun_radius=SUN, points=P, normals=np.tile(normal, (len(P), 1))
    )
    expected = [backward_integral(pane, p, normal, s, SUN) for p in P]
    # a tube takes one path length where the pane is up to 0.7 m deep: 2 % of the blur at 40 m
    slack = 0.004 + 0.35 / distance * 0.15
    assert light.load == pytest.approx(expected, abs=slack)
    assert light.load.max() <= 1.0 + 1e-9  # a flat pane never concentrates


def test_grid_keeps_energy_and_agrees_with_points():
    T, N = cylinder_mirror(40.0, half_angle=0.5, bottom=3.0, top=33.0, cells=24)
    chart = plane_chart([20.0, 0.0, 0.0], [0.0, 0.0, 1.0], half=30.0, spacing=0.25)
    lit = lit_scene(T, N, receiver=chart)
    elevation = math.radians(40.0)
    s = np.array([-math.cos(elevation), 0.0, math.sin(elevation)])
    field = solve_field(lit, sun_direction=s, sun_radius=SUN)
    assert abs(balance(field)) < 0.002
    assert field.ledger["receivers"] > 0.9 * field.ledger["intercepted"]
    hot = np.argsort(field.load)[-400:][::40]
    h = lit.grids.spacing[0]
    shift = (np.indices((7, 7)).reshape(2, -1).T - 3) / 7.0 * h
    for i in hot:
        around = lit.points[i] + np.pad(shift, ((0, 0), (0, 1)))
        light = solve_points(
            lit,
            sun_direction=s,
            sun_radius=SUN,
            points=around,
            normals=np.tile([0.0, 0.0, 1.0], (len(around), 1)),
        )
        assert field.load[i] == pytest.approx(light.load.mean(), rel=0.04)


def test_no_point_is_brighter_than_the_sun_in_the_mirror():
    # E <= Omega_mirror / Omega_sun for an even sun: the mirror seen from the point, all of it
    # full of sun (the theorem of constant brightness).
    f = 8.0
    lit = lit_scene(*quadric_mirror(0.5 / f, 0.0, 0.5 / f, half=0.5, cells=24))
    up = np.array([0.0, 0.0, 1.0])
    points = np.stack([np.linspace(-0.1, 0.1, 41), np.zeros(41), np.full(41, f)], axis=1)
    light = solve_points(
        lit, sun_direction=up, sun_radius=SUN, points=points, normals=np.tile(-up, (41, 1))
    )
    omega_sun = math.pi * math.sin(SUN) ** 2
    omega_mirror = 1.0 / f**2  # 1 m² seen from f; the true figure is a little less
    assert light.load.max() <= omega_mirror / omega_sun
    assert light.load.max() >= 0.97 * omega_mirror / omega_sun


def test_two_mirrors_lay_light_down_once_for_each_reflectance():
    # A periscope: 45° mirror at the origin, another above it, then a wall. Reflectance 0.5 twice.
    lower = np.array(
        [[[-1, -1, -1], [1, -1, 1], [1, 1, 1]], [[-1, -1, -1], [1, 1, 1], [-1, 1, -1]]], float
    )
    upper = lower + np.array([0.0, 0.0, 10.0])
    chart = plane_chart([8.0, 0.0, 10.0], [-1.0, 0.0, 0.0], half=3.0, spacing=0.1)
    lit = lit_scene(
        np.concatenate([lower, upper]),
        receiver=chart,
        R=0.5,
        smooth=False,
        mirror_units=np.array([0, 0, 1, 1]),
    )
    s = np.array([-1.0, 0.0, 0.0])
    field = solve_field(lit, sun_direction=s, sun_radius=SUN)
    middle = np.linalg.norm(lit.points - [8.0, 0.0, 10.0], axis=1) < 0.5
    # direct light falls on the upper mirror too and goes down: only the double bounce reaches
    # the wall, and the blur over 18 m is 84 mm
    assert field.load[middle] == pytest.approx(0.25, rel=2e-3)
    assert abs(balance(field)) < 0.003


def test_crossed_planes_of_incidence_at_brewsters_angle_pass_nothing():
    # Light reflected at Brewster's angle is all s; a second plate whose plane of incidence is at
    # right angles to the first sees it as p and sends none on (Malus, 1809).
    n = 1.5
    brewster = math.atan(n)
    theta = np.radians(np.linspace(0.0, 90.0, 361))
    refracted = np.arcsin(np.sin(theta) / n)
    with np.errstate(invalid="ignore"):
        R_s = (np.sin(theta - refracted) / np.sin(theta + refracted)) ** 2
        R_p = (np.tan(theta - refracted) / np.tan(theta + refracted)) ** 2
    R_s[0] = R_p[0] = ((n - 1) / (n + 1)) ** 2

    def plate(centre, incoming, outgoing):
        normal = unit(outgoing - incoming)
        u = unit(np.cross(normal, [0.1, 0.2, 0.97]))
        v = np.cross(normal, u)
        c = np.array([centre - u - v, centre + u - v, centre + u + v, centre - u + v])
        return c[[[0, 1, 2], [0, 2, 3]]]

    turn = math.pi - 2.0 * brewster
    d0 = np.array([1.0, 0.0, 0.0])
    d1 = np.array([math.cos(turn), math.sin(turn), 0.0])
    first = plate(np.zeros(3), d0, d1)
    loads = {}
    for name, side in (("crossed", [0.0, 0.0, 1.0]), ("parallel", np.cross([0, 0, 1.0], d1))):
        d2 = math.cos(turn) * d1 + math.sin(turn) * unit(np.asarray(side, float))
        second = plate(6.0 * d1, d1, d2)
        chart = plane_chart(6.0 * d1 + 5.0 * d2, -d2, half=1.0, spacing=0.1)
        lit = lit_scene(
            np.concatenate([first, second]),
            receiver=chart,
            R=np.stack([R_s, R_p]),
            smooth=False,
            mirror_units=np.array([0, 0, 1, 1]),
        )
        field = solve_field(lit, sun_direction=-d0, sun_radius=SUN)
        middle = np.linalg.norm(lit.points - chart[0].points.mean(axis=0), axis=1) < 0.3
        loads[name] = np.median(field.load[middle])
    expected = 0.5 * np.interp(brewster, theta, R_s) ** 2
    assert loads["parallel"] == pytest.approx(expected, rel=0.01)
    assert loads["crossed"] < 1e-3 * loads["parallel"]
