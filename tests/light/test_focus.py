"""Focal distances over a facade: Coddington's equations, figures, and what is within reach."""

import math

import numpy as np
import pytest
from panes import figured, sheet
from scenes import cylinder_mirror, lit_scene, plane_chart, quadric_mirror

from causticload.light.focus import focus_share
from causticload.scene.focus import figure_focus, focal_distances

UP = np.array([0.0, 0.0, 1.0])


def test_sphere_at_sixty_degrees():
    # f_t = R cos(theta) / 2 and f_s = R / (2 cos(theta)): 2.5 and 10 m for R = 10 m.
    lit = lit_scene(*quadric_mirror(0.1, 0.0, 0.1, half=0.005))
    s = np.array([math.sin(math.radians(60)), 0.0, 0.5])
    focus = focal_distances(lit.scene, s)
    assert focus.tangential == pytest.approx(2.5, rel=2e-3)
    assert focus.sagittal == pytest.approx(10.0, rel=2e-3)


@pytest.mark.parametrize(
    ("k", "theta", "distance", "load"),
    [
        ((0.02, 0.0, 0.02), 60, 10, 6.25),
        ((0.015, 0.004, -0.006), 50, 12, 2.12114),
        ((0.001, 0.002, 0.003), 70, 30, 1.31682),
        ((-0.02, 0.0, -0.02), 30, 10, 0.508055),
    ],
)
def test_density_follows_from_the_matrix(k, theta, distance, load):
    # The exact local law, checked by finite differences to nine digits apart from this program.
    lit = lit_scene(*quadric_mirror(*k, half=0.002, cells=2))
    s = np.array([math.sin(math.radians(theta)), 0.0, math.cos(math.radians(theta))])
    M = focal_distances(lit.scene, s).matrix
    gain = 1.0 / np.abs(np.linalg.det(np.eye(2) - 2.0 * distance * M))
    assert gain == pytest.approx(load, rel=2e-3)


def test_flat_has_no_focus_and_round_a_virtual_one(tmp_path):
    flat = figured(tmp_path, [sheet(1, 1)], {"tilt_mrad": 0.0})
    assert np.isnan(focal_distances(flat.scene, UP).tangential).all()
    round_ = figured(tmp_path, [sheet(1, 1)], {"bow_mm": 2.88})
    focus = focal_distances(round_.scene, UP)
    assert focus.tangential == pytest.approx(-19.2, rel=0.01)
    below = focal_distances(round_.scene, -UP)
    assert below.tangential == pytest.approx(19.2, rel=0.01)  # from behind it is hollow


def test_pane_focal_lengths_are_those_of_the_table(tmp_path):
    lit = figured(
        tmp_path, [sheet(1.0, 1.5), sheet(1.0, 1.5, middle=(3, 0))], {"cavity_pressure_kpa": -16}
    )
    outer, inner, *others = figure_focus(lit.scene)
    assert (outer["pane"], inner["pane"], outer["panels"], len(others)) == (1, 2, 1, 2)
    assert outer["short_focal_m"] == pytest.approx([18.2] * 3, rel=0.01)
    assert outer["long_focal_m"] == pytest.approx([47.0] * 3, rel=0.01)
    assert inner["short_focal_m"][0] == pytest.approx(-18.2, rel=0.01)
    focus = focal_distances(lit.scene, UP)
    both = sorted((focus.tangential[0], focus.sagittal[0]))
    assert both == pytest.approx([18.2, 47.0], rel=0.01)


@pytest.mark.parametrize(("distance", "within"), [(3.0, False), (12.0, True), (60.0, False)])
def test_share_within_reach_of_a_receiver(distance, within):
    # A cylinder of 30 m about the vertical focuses at R / (2 cos 0.6) = 18.2 m: the density
    # doubles between 9.1 m and 27.3 m.
    T, N = cylinder_mirror(30.0, half_angle=0.1, bottom=3.0, top=4.0, cells=8)
    foot = [30.0 - distance * math.cos(0.6), 0.0, 3.5 - distance * math.sin(0.6)]
    lit = lit_scene(T, N, receiver=plane_chart(foot, UP, half=8.0, spacing=0.5))
    s = np.array([-math.cos(0.6), 0.0, math.sin(0.6)])
    share = focus_share(lit, s)
    assert share.lit == pytest.approx(6.0, rel=0.01)
    assert share.landing == pytest.approx(share.lit)
    assert share.share == pytest.approx(1.0 if within else 0.0)
