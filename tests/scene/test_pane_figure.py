"""Surface figures laid on the panes of a mesh."""

import numpy as np
import pytest

from causticload.errors import StudyError
from causticload.scene.build import build_scene
from causticload.scene.figure import bilinear_normals
from causticload.scene.figure_slopes import curvature_at_top, slopes_at
from causticload.study.model import FigureSpec, Model, Site, Study, SurfaceRule

OUTWARD = np.array([0.0, -1.0, 0.0])


def wall(tmp_path, faces, *, form="flat", role=("reflector",), **settings):
    """Scene of polygons that face -Y: corners (x, z) on the plane y = 0, or (x, y, z)."""
    lines, count = [], 0
    for k, corners in enumerate(faces):
        lines.append(f"o pane{k}")
        for c in corners:
            x, y, z = c if len(c) == 3 else (c[0], 0.0, c[1])
            lines.append(f"v {x!r} {y!r} {z!r}")
        lines.append("f " + " ".join(str(count + i + 1) for i in range(len(corners))))
        count += len(corners)
    (tmp_path / "wall.obj").write_text("\n".join(lines) + "\n")
    return build_scene(
        Study(
            title="",
            path=None,
            site=Site(latitude=50.0, longitude=0.0, elevation=100.0),
            model=Model(files=(tmp_path / "wall.obj",)),
            surfaces=(SurfaceRule(match="*", roles=role, form=form, figure="f"),),
            figures={"f": FigureSpec(name="f", settings=settings)},
        )
    )


def box(x, z, w, h):
    return [(x, z), (x + w, z), (x + w, z + h), (x, z + h)]


def test_winter_pulls_the_outer_pane_in_and_the_inner_out(tmp_path):
    scene = wall(tmp_path, [box(0, 0, 1, 1.5)], cavity_pressure_kpa=-16)
    g = scene.figures
    assert scene.panels.normal[0] == pytest.approx(OUTWARD)
    assert g.count[0] == 2
    assert g.bow == pytest.approx([-2.92e-3, 2.92e-3], rel=0.01)  # as in the table of equal panes
    focal = 1.0 / (2.0 * curvature_at_top(g))
    assert focal[0, [0, 2]] == pytest.approx([18.2, 47.0], rel=0.01)  # hollow: focuses
    assert focal[1, [0, 2]] == pytest.approx([-18.2, -47.0], rel=0.01)


def test_conditions_since_sealing_give_the_pressure(tmp_path):
    given = wall(tmp_path, [box(0, 0, 1, 1)], cavity_pressure_kpa=-16.1).figures.bow
    found = wall(
        tmp_path,
        [box(0, 0, 1, 1)],
        sealed_temperature_c=20.0,
        temperature_c=-5.0,
        sealed_pressure_kpa=99.3,
        pressure_kpa=103.3,
        sealed_altitude_m=400.0,  # the site is at 100 m
    ).figures.bow
    assert found == pytest.approx(given, rel=1e-9)


@pytest.mark.parametrize(
    "corners",
    [
        box(2, 1, 1.2, 2.0),
        [(0, 0), (2, 0), (1.4, 1.5), (0.3, 1.5)],
        [(0, 0), (1.8, 0), (0.6, 1.6)],
        [(0, 0), (1.5, 0), (2.0, 1.0), (1.0, 1.8), (-0.4, 1.0)],
    ],
)
def test_slopes_are_those_of_a_pane_held_at_its_edges(tmp_path, corners):
    scene = wall(tmp_path, [corners], bow_mm=-2.0)
    g = scene.figures
    frame = np.stack([scene.panels.width_axis[0], g.height_axis[0]])
    corner = np.array([[x, 0.0, z] for x, z in corners]) - scene.origin - g.middle[0]
    flat = corner @ frame.T

    def rise(a, b):
        """Height gained from a to b, by adding up slopes."""
        node, weight = np.polynomial.legendre.leggauss(24)
        points = a + 0.5 * (node[:, None] + 1.0) * (b - a)
        slope = slopes_at(g, np.zeros(24, int), points)
        return 0.5 * float(weight @ (slope @ (b - a)))

    top = g.tops[g.shape[0]] * g.half[0]
    for k in range(len(flat)):
        # Two microns of two millimetres: corners are rounded to a thousandth of the size.
        assert rise(flat[k], flat[(k + 1) % len(flat)]) == pytest.approx(0.0, abs=2e-5)
        assert rise(flat[k], top) == pytest.approx(-2e-3, abs=2e-5)


def test_wave_has_the_published_power_and_a_phase_of_its_own_on_each_pane(tmp_path):
    faces = [box(1.6 * k, 0, 1.5, 2) for k in range(5)]
    settings = {"roller_wave_mm": 0.08, "roller_pitch_mm": 250.0, "roller_along": "height"}
    scene = wall(tmp_path, faces, seed=3, **settings)
    g = scene.figures
    # Reflected power 4 pi^2 W / L^2 (ASTM C1651, from memory): 50.5 mD, +-2 pi W / L = 2.01 mrad.
    assert 2e3 * curvature_at_top(g, waves=True)[0, 2] == pytest.approx(50.5, rel=2e-3)
    y = np.linspace(-0.9, 0.9, 4001)
    slope = slopes_at(g, np.zeros(len(y), int), np.stack([0 * y, y], axis=1))
    assert 2.0 * np.abs(slope[:, 1]).max() == pytest.approx(2.01e-3, rel=2e-3)
    assert slope[:, 0] == pytest.approx(0.0)
    assert len(np.unique(g.phase)) == 5
    again = wall(tmp_path, faces, seed=3, **settings).figures
    other = wall(tmp_path, faces, seed=4, **settings).figures
    assert (again.phase == g.phase).all()
    assert (other.phase != g.phase).all()


def test_kink_is_at_the_ends_of_the_pane_only(tmp_path):
    scene = wall(
        tmp_path,
        [box(0, 0, 1, 2)],
        edge_kink_mm=0.5,
        edge_kink_width_mm=50.0,
        roller_along="height",
    )
    g = scene.figures
    xy = np.array([[0.49, 0.0], [0.0, 0.94], [0.0, 0.975], [0.0, -1.0]])
    slope = slopes_at(g, np.zeros(4, int), xy)
    assert slope[:2] == pytest.approx(np.zeros((2, 2)), abs=1e-12)
    # Curvature 2 d / w^2 = 0.4 /m: half way into the kink the slope is 0.4 x 25 mm.
    assert slope[2:] == pytest.approx(np.array([[0, 0.01], [0, -0.02]]), abs=1e-9)


def test_tilts_have_the_spread_asked_for(tmp_path):
    scene = wall(tmp_path, [box(1.1 * k, 0, 1, 1) for k in range(400)], tilt_mrad=2.0)
    tilt = scene.figures.tilt
    # 800 numbers: the standard error of their spread is 2.5 %.
    assert np.sqrt((tilt**2).mean()) == pytest.approx(2e-3, rel=0.08)
    assert abs(tilt.mean()) < 3e-4


def test_cold_bent_pane_is_one_panel_with_the_normals_of_its_patch(tmp_path):
    d = 0.02
    faces = [[(0, 0, 0), (1, 0, 0), (1, -d, 2), (0, 0, 2)]]
    scene = wall(tmp_path, faces, cold_bent=True)
    assert len(scene.panels) == 1
    assert not scene.panels.flat[0]
    # Patch y = -d x z / 2 on 1 m by 2 m: slope -d z / 2 along x, -d x / 2 along z.
    corner = scene.triangles + scene.origin
    slope = -scene.corner_normals / scene.corner_normals[..., 1:2]  # of y over x and z
    assert slope[..., 0] == pytest.approx(-d * corner[..., 2] / 2, abs=1e-5)
    assert slope[..., 2] == pytest.approx(-d * corner[..., 0] / 2, abs=1e-5)
    # A patch bends as much one way as the other: 1/m, the twist d / 2 over 1 m by 2 m.
    assert np.sort(scene.curvature[0, 0]) == pytest.approx([-d / 2, d / 2], rel=0.02)
    flat = wall(tmp_path, faces, tilt_mrad=0.0)
    assert len(flat.panels) == 2


def test_patch_normals_do_not_depend_on_the_order_of_corners():
    a, b, c, d = np.array([[0, 0, 0], [1, 0, 0.1], [1, 1, 0], [0, 1, 0.1]], float)
    one = bilinear_normals(np.array([[a, b, c], [a, c, d]]), np.array([0, 0]))
    two = bilinear_normals(np.array([[b, c, a], [d, a, c]]), np.array([0, 0]))
    assert two[0, [2, 0, 1]] == pytest.approx(one[0])
    assert two[1, [1, 2, 0]] == pytest.approx(one[1])


def test_figure_wants_panes_it_can_tell(tmp_path):
    triangles = [[(0, 0), (1, 0), (0.5, 1)], [(3, 0), (4, 0), (3.5, 1)]]
    with pytest.raises(StudyError, match="cannot be told"):
        wall(tmp_path, triangles, form="smooth", bow_mm=1.0)
    with pytest.raises(StudyError, match="smooth"):
        wall(tmp_path, [box(0, 0, 1, 1)], form="smooth", cold_bent=True)


def test_thin_pane_under_great_pressure_is_said_to_be_beyond_the_theory(tmp_path):
    scene = wall(
        tmp_path, [box(0, 0, 0.9, 0.9)], cavity_pressure_kpa=-16, panes_mm=[3, 3], gap_mm=12
    )
    assert any("half its thickness" in text for text in scene.assumed)
    scene = wall(tmp_path, [box(0, 0, 1, 1)], cavity_pressure_kpa=-4)
    assert not any("half its thickness" in text for text in scene.assumed)
    assert any("taken as 6/6 mm" in text for text in scene.assumed)
