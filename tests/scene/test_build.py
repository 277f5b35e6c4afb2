"""From files to a scene: frame, normals, panels, receivers and what is said about them.

The facade is a concave cylinder of radius 20 m: area, normal and curvature in closed form.
"""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from causticload.errors import MeshError, StudyError
from causticload.scene.build import build_scene, inspect_scene
from causticload.scene.model import Scene
from causticload.study.model import Model, Site, Study, SurfaceRule

RADIUS = 20.0
BAYS, HEIGHT = 24, 12.0  # 2.5 degrees or 0.87 m a bay
RULES = (
    SurfaceRule(match="glazing*", roles=("reflector",), form="smooth", finish="clear glass"),
    SurfaceRule(match="plaza", roles=("receiver",), spacing=1.0, kind="walkway"),
    SurfaceRule(match="*", roles=("obstruction",)),
)

# Face normals would be half a bay or 22 mrad off; how well a fit can do is tested beside it.
FITTED = 1e-3  # rad: 60 mm in the image at 30 m, less than half the sun's radius there

Faces = np.ndarray  # (k, 3, 3)


def facade(bays: int = BAYS) -> tuple[Faces, Faces]:
    """Triangles and exact corner normals of the cylinder, concave side and fronts to -Y."""
    angle = np.radians(60.0 + 60.0 * np.arange(bays + 1) / bays)
    out = np.stack([np.cos(angle), np.sin(angle), 0 * angle], axis=1)
    foot, head = RADIUS * out, RADIUS * out + [0.0, 0.0, HEIGHT]
    a, b, c, d = foot[:-1], foot[1:], head[1:], head[:-1]
    na, nb = -out[:-1], -out[1:]
    triangles = np.stack([a, b, c, a, c, d], axis=1).reshape(-1, 3, 3)
    normals = np.stack([na, nb, nb, na, nb, na], axis=1).reshape(-1, 3, 3)
    return triangles[:, ::-1], normals[:, ::-1]  # bays run from right to left


def plaza(z: float = 0.0) -> Faces:
    """20 m by 30 m, facing up."""
    a, b, c, d = (np.array([x, y, z]) for x, y in ((-10, -15), (10, -15), (10, 15), (-10, 15)))
    return np.array([[a, b, c], [a, c, d]])


def obj(*parts: tuple[str, Faces] | tuple[str, Faces, Faces]) -> str:
    """OBJ text with a line per corner and 17 digits."""
    lines = []
    count = normal_count = 0
    for name, triangles, *normals in parts:
        lines.append(f"o {name}")
        lines += [f"v {x!r} {y!r} {z!r}" for x, y, z in triangles.reshape(-1, 3).tolist()]
        for given_normals in normals:
            lines += [f"vn {x!r} {y!r} {z!r}" for x, y, z in given_normals.reshape(-1, 3).tolist()]
        for i in range(len(triangles)):
            v = [count + 3 * i + j for j in (1, 2, 3)]
            n = [normal_count + 3 * i + j for j in (1, 2, 3)]
            lines.append(
                "f "
                + " ".join(f"{p}//{q}" if normals else f"{p}" for p, q in zip(v, n, strict=True))
            )
        count += 3 * len(triangles)
        normal_count += 3 * len(triangles) if normals else 0
    return "\n".join(lines) + "\n"


def build(
    folder: Path, *texts: str, rules: Sequence[SurfaceRule] = RULES, **settings_of_model: str
) -> Scene:
    files = []
    for i, text in enumerate(texts):
        files.append(folder / f"kestrel{i}.obj")
        files[-1].write_text(text)
    study = Study(
        title="Kestrel Quay",
        path=folder / "kestrel.toml",
        site=Site(latitude=51.07, longitude=-1.32, model_north=90.0),
        model=Model(files=tuple(files), **settings_of_model),
        surfaces=tuple(rules),
    )
    return build_scene(study)


def kinds(scene: Scene) -> set[str]:
    return {fault.kind for fault in scene.faults}


def areas(scene: Scene) -> dict[str, float]:
    return {row["name"]: row["area_m2"] for row in inspect_scene(scene)["surfaces"]}


def face_normals(triangles: Faces) -> np.ndarray:
    normal = np.cross(triangles[:, 1] - triangles[:, 0], triangles[:, 2] - triangles[:, 0])
    return normal / np.linalg.norm(normal, axis=1, keepdims=True)


# --- the whole ---------------------------------------------------------------------------------


def test_a_scene_holds_every_triangle_in_order(tmp_path: Path) -> None:
    wall, ground = facade()[0], plaza()
    core = plaza(5.0)
    scene = build(tmp_path, obj(("core", core), ("glazing", wall)), obj(("plaza", ground)))
    assert [s.name for s in scene.surfaces] == ["core", "glazing", "plaza"]
    assert scene.surface.tolist() == [0] * 2 + [1] * 2 * BAYS + [2] * 2
    want = np.concatenate([core, wall, ground])
    assert scene.triangles + scene.origin == pytest.approx(want, abs=1e-12)
    assert scene.source_triangle.tolist() == [0, 1, *range(2 * BAYS), 0, 1]
    assert scene.reflectors.tolist() == list(range(2, 2 + 2 * BAYS))
    assert (scene.chart >= 0).tolist() == (scene.surface == 2).tolist()
    assert scene.north_rad == pytest.approx(np.pi / 2)
    assert scene.faults == ()
    assert scene.assumed == ()
    for array, kind in (
        (scene.triangles, np.float64),
        (scene.surface, np.int32),
        (scene.panel, np.int32),
        (scene.chart, np.int32),
        (scene.corner_normals, np.float64),
        (scene.source_triangle, np.int32),
    ):
        assert array.dtype == kind


def test_building_twice_gives_the_same_scene(tmp_path: Path) -> None:
    text = obj(("glazing", facade()[0]), ("plaza", plaza()))
    one, other = build(tmp_path, text), build(tmp_path, text)
    for name in ("triangles", "corner_normals", "curvature", "panel", "chart"):
        assert np.array_equal(getattr(one, name), getattr(other, name))


def test_the_origin_is_the_middle_of_the_reflectors_to_whole_metres(tmp_path: Path) -> None:
    shift = np.array([1000.3, -50.2, 7.0])
    scene = build(tmp_path, obj(("glazing", facade()[0] + shift), ("plaza", 50 * plaza())))
    # x: -10 to 10, y: 17.3 to 20 (sin 60 degrees), z: 0 to 12
    assert scene.origin.tolist() == [1000.0, -32.0, 13.0]


def test_500_km_from_home_the_scene_is_the_same(tmp_path: Path) -> None:
    shift = np.array([500e3, 4.2e6, 100.0])
    home = build(tmp_path, obj(("glazing", facade()[0]), ("plaza", plaza())))
    away = build(tmp_path, obj(("glazing", facade()[0] + shift), ("plaza", plaza() + shift)))
    assert away.origin - home.origin == pytest.approx(shift)
    assert away.triangles == pytest.approx(home.triangles, abs=1e-6)  # double precision: 1e-9
    # 1e-9 m over a bay of 0.9 m
    assert away.corner_normals == pytest.approx(home.corner_normals, abs=1e-8)
    assert np.array_equal(away.panel, home.panel)
    assert kinds(away) == {"far_away"}


def test_millimetres_and_y_up_give_the_same_scene(tmp_path: Path) -> None:
    text = obj(("glazing", facade()[0]), ("plaza", plaza()))
    home = build(tmp_path, text)
    turned = [1000.0 * t[..., [0, 2, 1]] * [1, 1, -1] for t in (facade()[0], plaza())]
    other = build(tmp_path, obj(("glazing", turned[0]), ("plaza", turned[1])), unit="mm", up="Y")
    assert other.triangles == pytest.approx(home.triangles, abs=1e-9)
    assert other.corner_normals == pytest.approx(home.corner_normals, abs=1e-8)


# --- normals and panels ------------------------------------------------------------------------


def test_a_smooth_facade_uses_the_normals_of_its_file(tmp_path: Path) -> None:
    wall, normals = facade()
    scene = build(tmp_path, obj(("glazing", wall, normals)))
    assert scene.corner_normals == pytest.approx(normals, abs=1e-9)
    assert kinds(scene) == {"unmatched_rule", "no_receiver"}
    # principal curvatures of a cylinder: 1/R and 0; the chord of a bay differs by 1 - a/sin a
    bend = np.sort(np.abs(scene.curvature), axis=2)
    assert bend[..., 1] == pytest.approx(1 / RADIUS, rel=2e-3)
    assert bend[..., 0] == pytest.approx(0.0, abs=1e-4)


def test_without_normals_they_are_fitted(tmp_path: Path) -> None:
    wall, normals = facade()
    scene = build(tmp_path, obj(("glazing", wall)))
    assert scene.corner_normals == pytest.approx(normals, abs=FITTED)
    assert np.abs(scene.curvature).max() == pytest.approx(1 / RADIUS, rel=0.02)


def test_one_object_per_bay_is_fitted_as_one_facade(tmp_path: Path) -> None:
    wall, normals = facade()
    bays = [(f"glazing {i}", wall[2 * i : 2 * i + 2]) for i in range(BAYS)]
    scene = build(tmp_path, obj(*bays))
    assert scene.corner_normals == pytest.approx(normals, abs=FITTED)
    assert len(scene.panels) == BAYS


def test_faceted_normals_of_a_smooth_facade_are_replaced_and_said(tmp_path: Path) -> None:
    wall, normals = facade()
    faceted = np.repeat(face_normals(wall)[:, None], 3, axis=1)
    scene = build(tmp_path, obj(("glazing", wall, faceted)))
    assert scene.corner_normals == pytest.approx(normals, abs=FITTED)
    assert any("flat faces though glazing" in sentence for sentence in scene.assumed)


def test_normals_on_the_back_are_turned_and_reported(tmp_path: Path) -> None:
    wall, normals = facade()
    scene = build(tmp_path, obj(("glazing", wall, -normals)))
    assert scene.corner_normals == pytest.approx(normals, abs=1e-9)
    fault = next(f for f in scene.faults if f.kind == "normals_against_winding")
    assert fault.count == 2 * BAYS


@pytest.mark.parametrize(("factor", "lean"), [(2.0, 0.0), (1.0, np.radians(40.0))])
def test_unusable_normals_are_replaced_and_reported(
    tmp_path: Path, factor: float, lean: float
) -> None:
    wall, normals = facade()
    given_normals = factor * (np.cos(lean) * normals + np.sin(lean) * np.array([0, 0, 1]))
    scene = build(tmp_path, obj(("glazing", wall, given_normals)))
    assert scene.corner_normals == pytest.approx(normals, abs=FITTED)
    assert "normals_not_used" in kinds(scene)


def test_flat_panes_have_one_normal_and_no_curvature(tmp_path: Path) -> None:
    wall, normals = facade()
    rules = [replace(RULES[0], form="flat"), *RULES[1:]]
    scene = build(tmp_path, obj(("glazing", wall, normals)), rules=rules)
    assert len(scene.panels) == BAYS
    assert scene.panels.flat.all()
    pane = scene.corner_normals.reshape(BAYS, 6, 3)
    assert (pane == pane[:, :1]).all()
    assert scene.corner_normals[:, 0] == pytest.approx(face_normals(wall), abs=1e-12)
    assert (scene.curvature == 0.0).all()


def test_a_pane_wound_both_ways_keeps_each_face_in_front(tmp_path: Path) -> None:
    wall = facade()[0]
    wall[1::2] = wall[1::2, ::-1]
    rules = [replace(RULES[0], form="flat")]
    scene = build(tmp_path, obj(("glazing", wall)), rules=rules)
    cosine = np.einsum("kci,ki->kc", scene.corner_normals, face_normals(wall))
    assert cosine == pytest.approx(1.0, abs=1e-12)
    assert "winding" in kinds(scene)


def test_off_the_reflectors_normals_are_those_of_the_faces(tmp_path: Path) -> None:
    normals = np.broadcast_to([0.0, 0.6, 0.8], (2, 3, 3))
    scene = build(tmp_path, obj(("glazing", *facade()), ("plaza", plaza(), normals)))
    assert (scene.corner_normals[-2:] == [0.0, 0.0, 1.0]).all()
    assert (scene.panel[-2:] == -1).all()


# --- receivers ---------------------------------------------------------------------------------


def test_charts_are_numbered_through_and_cover_their_receivers(tmp_path: Path) -> None:
    rules = [replace(RULES[1], match="p*"), *RULES]
    text = obj(("p1", plaza()), ("glazing", facade()[0]), ("p2", plaza(-4.0)))
    scene = build(tmp_path, text, rules=rules)
    assert [chart.surface for chart in scene.charts] == [0, 2]
    assert scene.chart[:2].tolist() == [0, 0]
    assert scene.chart[-2:].tolist() == [1, 1]
    assert [chart.first for chart in scene.charts] == [0, len(scene.charts[0].areas)]
    for chart in scene.charts:
        assert chart.areas.sum() == pytest.approx(600.0, rel=1e-9)
    assert [row["points"] for row in inspect_scene(scene)["surfaces"]] == [600, 0, 600]


def test_a_surface_may_reflect_and_receive(tmp_path: Path) -> None:
    rules = [replace(RULES[0], roles=("reflector", "receiver"), spacing=1.0, form="flat")]
    scene = build(tmp_path, obj(("glazing", facade(4)[0])), rules=rules)
    assert (scene.panel >= 0).all()
    assert (scene.chart >= 0).all()
    area = sum(chart.areas.sum() for chart in scene.charts)
    chord = 2 * RADIUS * np.sin(np.radians(7.5))
    assert area == pytest.approx(4 * chord * HEIGHT, rel=1e-9)


@pytest.mark.parametrize(
    ("distance", "spacing"),
    [(10.0, 0.25), (59.0, 0.25), (100.0, 0.45), (200.0, 0.95), (400.0, 1.85)],
)
def test_sample_distance_follows_the_image_of_the_sun(
    tmp_path: Path, distance: float, spacing: float
) -> None:
    # mean angular radius of the sun 4.65 mrad: 0.465 m at 100 m, and so on, to 0.05 m
    rules = [RULES[0], SurfaceRule(match="plaza", roles=("receiver",))]
    text = obj(("glazing", facade()[0]), ("plaza", plaza(-distance)))
    scene = build(tmp_path, text, rules=rules)
    assert scene.surfaces[1].spacing == pytest.approx(spacing)
    assert scene.charts[0].spacing == pytest.approx(spacing)
    assert any(f"{spacing:g} m is chosen for plaza" in sentence for sentence in scene.assumed)


def test_a_receiver_with_too_many_points_is_refused_with_a_cure(tmp_path: Path) -> None:
    # 10 km by 15 km at 0.25 m: 150e6 / 0.0625 = 2400 million points
    rules = [RULES[0], replace(RULES[1], spacing=0.25)]
    text = obj(("glazing", facade()[0]), ("plaza", 500.0 * plaza()))
    with pytest.raises(StudyError, match="2400 million") as caught:
        build(tmp_path, text, rules=rules)
    assert "spacing = 2.75" in caught.value.hint  # sqrt(150e6 / 20e6) = 2.739


# --- faults ------------------------------------------------------------------------------------


def test_flawed_triangles_are_left_out_and_the_others_keep_their_rows(tmp_path: Path) -> None:
    wall = facade()[0]
    nan = wall[:1].copy()
    nan[0, 0, 0] = np.nan
    flat = np.repeat(wall[:1, :1], 3, axis=1)
    mesh = np.concatenate([nan, wall[:4], flat, wall[2:3, ::-1], wall[4:]])
    scene = build(tmp_path, obj(("glazing", mesh), ("plaza", plaza())))
    assert scene.source_triangle[:-2].tolist() == [1, 2, 3, 4, *range(7, 3 + 2 * BAYS)]
    assert np.isfinite(scene.corner_normals).all()
    assert {(f.kind, f.count) for f in scene.faults} == {
        ("not_finite", 1),
        ("zero_area", 1),
        ("duplicate", 1),
    }
    row = inspect_scene(scene)["surfaces"][0]
    assert (row["triangles"], row["triangles_in_file"]) == (2 * BAYS, 2 * BAYS + 3)


def test_a_facade_modelled_twice_reflects_once(tmp_path: Path) -> None:
    wall = facade()[0]
    text = obj(("core", wall[::-1]), ("glazing a", wall), ("glazing b", wall[:, ::-1]))
    scene = build(tmp_path, text)
    assert len(scene.reflectors) == 2 * BAYS
    assert (scene.surface == 1).all()
    assert next(f.count for f in scene.faults if f.kind == "duplicate") == 4 * BAYS


def test_notes_of_the_reader_are_among_the_faults(tmp_path: Path) -> None:
    scene = build(tmp_path, obj(("glazing", facade()[0])) + "f 1 2\n")
    assert "short_face" in kinds(scene)


def test_a_model_in_the_wrong_unit_is_questioned(tmp_path: Path) -> None:
    scene = build(tmp_path, obj(("glazing", facade()[0])), unit="mm")
    fault = next(f for f in scene.faults if f.kind == "too_small")
    assert '"m" would make it 20 m' in fault.hint


def test_nothing_that_reflects_is_an_error_that_lists_the_names(tmp_path: Path) -> None:
    with pytest.raises(StudyError) as caught:
        build(tmp_path, obj(("Glas Ost", facade()[0]), ("plaza", plaza())))
    assert caught.value.where == "kestrel.toml"
    assert "Glas Ost, plaza" in caught.value.hint


def test_a_reflector_without_a_usable_triangle_is_an_error(tmp_path: Path) -> None:
    with pytest.raises(MeshError, match="reflector"):
        build(tmp_path, obj(("glazing", np.full((2, 3, 3), np.nan)), ("plaza", plaza())))
    with pytest.raises(MeshError, match="not a number"):
        build(tmp_path, obj(("glazing", np.full((2, 3, 3), np.nan))), rules=())


# --- a study without rules ---------------------------------------------------------------------


def test_a_study_without_rules_works_and_says_what_it_assumed(tmp_path: Path) -> None:
    text = obj(("Glass east", *facade()), ("brick core", plaza(6.0)))
    scene = build(tmp_path, text, rules=())
    assert [(s.name, sorted(s.roles)) for s in scene.surfaces] == [
        ("Glass east", ["reflector"]),
        ("brick core", ["obstruction"]),
        ("ground", ["receiver"]),
    ]
    assert scene.surfaces[0].form == "smooth"
    # model 20 m by 35 m by 12 m, and 24 m more on each side
    assert sum(c.areas.sum() for c in scene.charts) == pytest.approx(68.0 * 83.0, rel=1e-9)
    assert {chart.spacing for chart in scene.charts} == {0.5}
    ground = scene.triangles[scene.surface == 2] + scene.origin
    assert (ground[..., 2] == 0.0).all()
    said = " ".join(scene.assumed)
    for piece in (
        "No [[surface]]",
        "Glass east",
        "double clear glass",
        "brick core",
        "68 m by 83 m",
    ):
        assert piece in said


# --- invariance --------------------------------------------------------------------------------


@settings(
    max_examples=8, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
@given(seed=st.integers(0, 2**32 - 1))
def test_order_of_faces_and_parts_does_not_change_the_areas(tmp_path: Path, seed: int) -> None:
    rng = np.random.default_rng(seed)
    wall = facade(8)[0]
    parts = [
        ("glazing", np.concatenate([wall, wall[3:4, ::-1]])),
        ("plaza", plaza()),
        ("core", plaza(3.0)),
    ]
    shuffled = [
        (name, faces[rng.permutation(len(faces))])
        for name, faces in (parts[i] for i in rng.permutation(len(parts)))
    ]
    want = {
        "glazing": 8 * 2 * RADIUS * np.sin(np.radians(3.75)) * HEIGHT,
        "plaza": 600.0,
        "core": 600.0,
    }
    assert areas(build(tmp_path, obj(*shuffled))) == pytest.approx(want, rel=1e-12)


# --- summary -----------------------------------------------------------------------------------


def test_the_summary_survives_json(tmp_path: Path) -> None:
    scene = build(tmp_path, obj(("glazing", facade()[0]), ("plaza", plaza()), ("core", plaza(3.0))))
    summary = json.loads(json.dumps(inspect_scene(scene), allow_nan=False))
    assert summary == inspect_scene(scene)
    assert (summary["triangles"], summary["panels"], summary["charts"]) == (2 * BAYS + 4, BAYS, 1)
    assert summary["low_m"] == pytest.approx([-10.0, -15.0, 0.0], abs=1e-9)
    assert summary["high_m"] == pytest.approx([10.0, RADIUS, HEIGHT], abs=1e-9)
    glazing, ground, core = summary["surfaces"]
    assert glazing["finish"] == "clear glass"
    assert glazing["panels"] == BAYS
    assert (ground["kind"], ground["spacing_m"], ground["points"]) == ("walkway", 1.0, 600)
    assert (core["finish"], core["form"], core["kind"], core["points"]) == (None, None, None, 0)
    assert summary["largest_curvature_per_m"] == pytest.approx(1 / RADIUS, rel=0.02)
