"""Names give roles: first match wins, nothing is dropped or guessed without a word."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from causticload.scene.read import Part
from causticload.scene.roles import Roles, assign_roles, lay_ground
from causticload.study.model import Model, Site, Study, SurfaceRule

TRIANGLE = np.array([[[0.0, 0.0, 0.0], [1.0, 0.0, 0.0], [0.0, 0.0, 1.0]]])


def part(
    object_name: str = "",
    group: str = "",
    material: str = "",
    *,
    triangles: np.ndarray = TRIANGLE,
    normals: np.ndarray | None = None,
) -> Part:
    return Part(
        name=object_name or group or material,
        object_name=object_name,
        group=group,
        material=material,
        file="kestrel.obj",
        triangles=triangles,
        corner_normals=normals,
    )


def rule(match: str, *roles: str, **settings: object) -> SurfaceRule:
    return SurfaceRule(match=match, roles=roles, **settings)


def assign(parts: list[Part], *rules: SurfaceRule) -> Roles:
    study = Study(
        title="Kestrel Quay",
        path=Path("kestrel.toml").absolute(),
        site=Site(latitude=51.07, longitude=-1.32),
        model=Model(files=()),
        surfaces=rules,
    )
    return assign_roles(parts, study.surfaces, study)


def kinds(roles: Roles) -> list[str]:
    return [fault.kind for fault in roles.faults]


# --- rules -------------------------------------------------------------------------------------


def test_the_first_rule_that_fits_wins() -> None:
    parts = [part("glazing east"), part("glazing west"), part("core")]
    found = assign(
        parts,
        rule("glazing east", "receiver", spacing=0.5, kind="facade"),
        rule("glazing*", "reflector", finish="atrium glass", form="smooth", figure="heat-treated"),
        rule("*", "obstruction"),
    )
    assert [s.roles for s in found.surfaces] == [{"receiver"}, {"reflector"}, {"obstruction"}]
    assert [(s.spacing, s.kind, s.finish) for s in found.surfaces] == [
        (0.5, "facade", ""),
        (0.0, "", "atrium glass"),
        (0.0, "", ""),
    ]
    assert (found.surfaces[1].form, found.surfaces[1].figure) == ("smooth", "heat-treated")
    assert found.rule_of_part == (0, 1, 2)
    assert found.faults == ()
    assert found.assumed == ()


@pytest.mark.parametrize(
    "one",
    [
        part("GLAZING-01"),
        part("a", group="Glazing-01"),
        part("a", group="level 1/glazing-02"),
        part("a", group="b", material="glazing-03"),
    ],
)
def test_a_glob_is_tried_on_object_group_layer_and_material(one: Part) -> None:
    found = assign([one], rule("gLazing-0?", "reflector", finish="x"))
    assert found.surfaces[0].roles == {"reflector"}
    assert found.faults == ()


def test_a_bracket_in_a_glob_is_a_choice_of_letters() -> None:
    found = assign([part("bay A"), part("bay C")], rule("bay [AB]", "ignore"))
    assert found.surface_of_part == (-1, 0)


def test_ignored_parts_are_dropped() -> None:
    found = assign(
        [part("tree"), part("glass")], rule("tree", "ignore"), rule("glass", "reflector")
    )
    assert [s.name for s in found.surfaces] == ["glass"]
    assert found.surface_of_part == (-1, 0)


def test_a_rule_that_fits_nothing_is_a_fault_with_the_names_there_are() -> None:
    found = assign(
        [part("Tower", material="Glas")], rule("glass*", "reflector"), rule("*", "ignore")
    )
    (fault,) = found.faults
    assert fault.kind == "unmatched_rule"
    assert fault.surface == "glass*"
    assert 'surface[0]: match = "glass*"' in fault.message
    assert "Tower, Glas" in fault.hint


def test_a_rule_behind_a_wider_one_is_a_fault_but_a_closing_star_is_not() -> None:
    found = assign(
        [part("glass 1")],
        rule("glass*", "receiver"),
        rule("glass 1", "reflector"),
        rule("*", "ignore"),
    )
    assert kinds(found) == ["shadowed_rule"]


def test_a_part_without_a_rule_obstructs_and_is_reported() -> None:
    found = assign([part("glass"), part("shed"), part("crane")], rule("glass", "reflector"))
    (fault,) = found.faults
    assert (fault.kind, fault.count) == ("no_role", 2)
    assert "shed, crane" in fault.message
    assert found.surfaces[1].roles == {"obstruction"}


def test_a_reflector_without_a_finish_gets_the_default_and_says_so() -> None:
    parts = [part(f"bay {i}") for i in range(5)]
    found = assign(parts, rule("bay*", "reflector", "receiver"))
    assert {s.finish for s in found.surfaces} == {"double clear glass"}
    (sentence,) = found.assumed
    assert "bay 0, bay 1, bay 2 and 2 more" in sentence
    assert '"double clear glass"' in sentence
    assert found.surfaces[0].assumed


def test_surfaces_are_called_by_the_name_the_study_knows() -> None:
    parts = [part("Kestrel", material="plaza"), part("Kestrel", material="brick")]
    found = assign(parts, rule("plaza", "receiver"), rule("*", "obstruction"))
    assert [s.name for s in found.surfaces] == ["plaza", "Kestrel"]


def test_equal_names_are_told_apart() -> None:
    parts = [
        part("east", material="glass"),
        part("west", material="glass"),
        part("west", group="upper", material="glass"),
        part("west", group="upper", material="glass"),
    ]
    names = [s.name for s in assign(parts, rule("glass", "reflector")).surfaces]
    assert len(set(names)) == 4
    assert names[0] == "glass (east)"
    assert all(name.startswith("glass (west)") for name in names[1:])


# --- no rules ----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("name", "finish"),
    [
        ("Glass_01", "double clear glass"),
        ("east glazing", "double clear glass"),
        ("CurtainWall.003", "double clear glass"),
        ("curtain-wall", "double clear glass"),
        ("WINDOWS", "double clear glass"),
        ("frontglass", "double clear glass"),
        ("Mirror panel", "polished stainless steel"),
        ("Metal fins", "polished stainless steel"),
        ("cladding polished", "polished stainless steel"),
        ("metal edge of glass", "double clear glass"),
    ],
)
def test_names_that_reflect(name: str, finish: str) -> None:
    found = assign([part(name)])
    assert found.surfaces[0].roles == {"reflector"}
    assert found.surfaces[0].finish == finish
    assert any(name in sentence and finish in sentence for sentence in found.assumed)


@pytest.mark.parametrize(
    "name", ["brick", "window frame", "WindowSill", "fibreglass lagging", "cladding", "bimetal"]
)
def test_names_that_do_not_reflect(name: str) -> None:
    found = assign([part(name)])
    assert found.surfaces[0].roles == {"obstruction"}
    assert any("obstruction" in sentence and name in sentence for sentence in found.assumed)


def test_a_material_name_counts_too() -> None:
    assert assign([part("Cube", material="Glass blue")]).surfaces[0].roles == {"reflector"}


@pytest.mark.parametrize(
    ("name", "kind"),
    [
        ("Ground", "walkway"),
        ("plaza_2", "walkway"),
        ("High Street", "roadway"),
        ("pavement", "walkway"),
        ("Roads", "roadway"),
        ("Terrain.001", "walkway"),
    ],
)
def test_named_ground_receives_and_none_is_laid(name: str, kind: str) -> None:
    found = assign([part("glass"), part(name)])
    assert len(found.parts) == 2
    assert found.surfaces[1].roles == {"receiver"}
    assert found.surfaces[1].kind == kind


def test_words_inside_words_are_no_ground() -> None:
    found = assign([part("glass"), part("broadcast mast")])
    assert found.surfaces[1].roles == {"obstruction"}


def test_a_ground_is_laid_below_a_model_without_one() -> None:
    tower = np.array(
        [[[0, 0, 5], [10, 0, 5], [10, 20, 45]], [[0, 0, 5], [np.nan, 0, 0], [1, 1, 1]]]
    )
    found = assign([part("glass", triangles=tower)])
    ground = found.surfaces[-1]
    assert (ground.roles, ground.kind, ground.spacing) == ({"receiver"}, "walkway", 0.5)
    triangles = found.parts[-1].triangles
    # 40 m high: 80 m further on each side, at the lowest finite point
    assert triangles.reshape(-1, 3).min(axis=0).tolist() == [-80, -80, 5]
    assert triangles.reshape(-1, 3).max(axis=0).tolist() == [90, 100, 5]
    up = np.cross(triangles[:, 1] - triangles[:, 0], triangles[:, 2] - triangles[:, 0])
    assert up[:, 2].sum() / 2.0 == pytest.approx(170.0 * 180.0)
    assert (up[:, 2] > 0.0).all()
    assert any("170 m by 180 m" in sentence for sentence in found.assumed)


def test_a_laid_ground_lies_at_the_lowest_point() -> None:
    ground = lay_ground([part("a", triangles=TRIANGLE - 3.0), part("b")])
    assert (ground.triangles[..., 2] == -3.0).all()


@pytest.mark.parametrize(
    ("normals", "form"),
    [
        (None, "flat"),
        (np.array([[[0.0, -1, 0]] * 3]), "flat"),
        (np.array([[[0.0, -1, 0], [0.1, -0.99498744, 0], [0, -1, 0]]]), "smooth"),
        (np.full((1, 3, 3), np.nan), "flat"),
    ],
)
def test_form_follows_the_normals_of_the_file(normals: np.ndarray | None, form: str) -> None:
    found = assign([part("glass", normals=normals)])
    assert found.surfaces[0].form == form
    assert f"a {form} reflector" in " ".join(found.assumed)
