"""Sample (c) in winter: sealed units whose outer panes are pulled in and whose inner ones bulge."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
import pyvista as pv

import causticload as cl
from causticload.light.count import count_spot
from causticload.light.points import solve_points
from causticload.output.instant import instant_record
from causticload.output.text import summarise_inspect, summarise_instant
from causticload.run import inspect, save_focus
from causticload.scene.figure_slopes import curvature_at_top
from causticload.study.model import FigureSpec

SAMPLE = Path(__file__).parents[1] / "sample_meshes" / "crescent.toml"
SUN = (190.0, 30.0)


def opened(**settings):
    study = cl.read_study(SAMPLE)
    if settings:
        study = replace(
            study,
            figures={"f": FigureSpec(name="f", settings=settings)},
            surfaces=tuple(
                replace(r, figure="f") if "reflector" in r.roles else r for r in study.surfaces
            ),
        )
    return cl.open_project(study)


@pytest.fixture(scope="module")
def winter():
    return opened(cavity_pressure_kpa=-16.0, panes_mm=[6, 6], gap_mm=16)


def test_panes_focus_one_by_one(winter):
    g = winter.scene.figures
    # 1.5 m by 2 m, 6/16/6 at 16 kPa: by B_V and a* of DIN 18008-2 (from memory) w_c = 3.0 mm.
    assert g.bow[0::2] == pytest.approx(-3.0e-3, rel=0.02)
    assert g.bow[1::2] == pytest.approx(3.0e-3, rel=0.02)
    plain, bowed = cl.solve_instant(opened(), sun=SUN), cl.solve_instant(winter, sun=SUN)
    assert bowed.ledger["intercepted"] == pytest.approx(plain.ledger["intercepted"], rel=1e-3)
    assert bowed.ledger["absorbed"] == pytest.approx(plain.ledger["absorbed"], rel=2e-3)
    # A flat pane sends on at most its reflectance; a hollow one more.
    houses = "crescent-houses"
    assert bowed.receivers[houses].reflected.max() > 1.5 * plain.receivers[houses].reflected.max()


def test_one_panes_light_is_what_its_curvature_says(winter):
    lit, sun = winter.lit, cl.solve_instant(winter, sun=SUN).sun
    assert len(lit.sheets.R) > len(lit.exact.first)  # panes are sheets of their own
    scene = lit.scene
    s = sun.direction
    bend = curvature_at_top(scene.figures)
    checked = 0
    for p in range(0, len(scene.panels), 97):
        n, middle = scene.panels.normal[p], scene.panels.centroid[p]
        if n @ s < 0.2:
            continue
        r = 2.0 * (n @ s) * n - s
        # Far inside the focus the sun's blur hardly matters: law 3 with the figure's curvature.
        D = 6.0
        point = middle + D * r
        light = solve_points(
            lit, sun_direction=s, sun_radius=sun.radius, points=point[None], normals=-r[None]
        )
        mine = light.parts.panel == p
        if not mine.any():
            continue
        row = scene.figures.first[p]
        want = 0.0
        w, h = scene.panels.width_axis[p], scene.figures.height_axis[p]
        t = s - (s @ n) * n
        t /= np.linalg.norm(t)
        axes = np.array([[t @ w, t @ h], [-(t @ h), t @ w]])
        theta = np.arccos(n @ s)
        place = round(np.degrees(theta) * 4)
        sheet = lit.sheets.first[scene.panels.surface[p]]
        for k in range(2):
            xx, xy, yy = bend[row + k]
            K = axes @ np.array([[xx, xy], [xy, yy]]) @ axes.T
            c = np.cos(theta)
            M = np.array([[K[0, 0] / c, K[0, 1]], [K[1, 0], K[1, 1] * c]])
            R = lit.sheets.R[sheet + k, 0, :, place].mean()
            want += R / abs(np.linalg.det(np.eye(2) - 2.0 * D * M))
        # Curvature falls off from the pane's middle: the sun's disc sees 56 mm of 1.5 m.
        assert light.parts.load[mine].sum() == pytest.approx(want, rel=0.02)
        checked += 1
    assert checked >= 3


def test_hottest_spot_agrees_with_random_rays(winter):
    instant = cl.solve_instant(winter, sun=SUN)
    lit, s = winter.lit, instant.sun.direction
    name, top = max(
        ((r.name, int(r.reflected.argmax())) for r in instant.receivers.values()),
        key=lambda v: instant.receivers[v[0]].reflected[v[1]],
    )
    receiver = instant.receivers[name]
    place, normal = receiver.points[top] - winter.scene.origin, receiver.normals[top]
    k = np.arange(300) + 0.5
    r, turn = 0.15 * np.sqrt(k / 300), k * np.pi * (3.0 - np.sqrt(5.0))
    u = np.cross(normal, [0.0, 0.0, 1.0] if abs(normal[2]) < 0.9 else [1.0, 0.0, 0.0])
    u /= np.linalg.norm(u)
    disc = place + (r * np.cos(turn))[:, None] * u
    disc += (r * np.sin(turn))[:, None] * np.cross(normal, u)
    light = solve_points(
        lit, sun_direction=s, sun_radius=instant.sun.radius, points=disc,
        normals=np.broadcast_to(normal, disc.shape),
    )  # fmt: skip
    count = count_spot(
        lit, sun_direction=s, sun_radius=instant.sun.radius, centre=place, normal=normal,
        radius_m=0.15, rays=400_000, seed=3, second=False,
    )  # fmt: skip
    assert abs(light.load.mean() - count.mean) < 3.5 * count.standard_error + 0.01 * count.mean
    low, high = receiver.peak_limits
    assert low < receiver.reflected[top] < high  # two figures do not settle slanting angles
    record = next(r for r in instant_record(instant)["receivers"] if r["name"] == name)
    assert record["peak_reflected_low_W_m2"] == pytest.approx(low)
    assert record["peak_reflected_high_W_m2"] == pytest.approx(high)
    assert "leave open of reflectance" in summarise_instant(instant)


def test_focal_lengths_are_reported_and_written(winter, tmp_path):
    report = inspect(winter, sun=SUN)
    outer, inner = report["figures"]
    # The middle of a 1.5 m by 2 m pane: f = 1 / (2 k), k a^2 / w_c = 9.35 and 4.8 at b/a = 1.33.
    assert outer["short_focal_m"][1] == pytest.approx(1.5**2 / (2 * 9.35 * 3.01e-3), rel=0.02)
    assert inner["short_focal_m"][1] == pytest.approx(-outer["short_focal_m"][1])
    assert 0.0 < report["focus"]["share"] < 1.0
    assert "focal length" in summarise_inspect(report)
    save_focus(winter, tmp_path / "facade.vtp", sun=SUN)
    grid = pv.read(tmp_path / "facade.vtp")
    tangential, sagittal = (
        np.asarray(grid.cell_data[f"focal {way} [m]"]) for way in ("tangential", "sagittal")
    )
    assert len(tangential) == len(winter.scene.reflectors)
    assert (tangential[np.isfinite(tangential)] > 0.0).all()  # outer panes are hollow
    # Slanting light brings the tangential focus nearer than the sagittal one of the same bend.
    assert np.nanmedian(tangential) < np.nanmedian(sagittal)
