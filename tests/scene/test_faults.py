"""What is wrong with a mesh is found, counted and said; what would falsify the light is removed."""

from __future__ import annotations

import numpy as np
import pytest
import trimesh
from hypothesis import given, settings
from hypothesis import strategies as st

from causticload.scene.faults import check_extent, check_sheets, clean
from causticload.scene.model import Fault, Surface

GLASS = Surface(name="glass", file="", roles=frozenset({"reflector"}))
PLAZA = Surface(name="plaza", file="", roles=frozenset({"receiver"}))
CORE = Surface(name="core", file="", roles=frozenset({"obstruction"}))

T = np.array([[0.0, 0.0, 0.0], [2.0, 0.0, 0.0], [0.0, 1.0, 0.0]])


def run(
    triangles: list[np.ndarray], surfaces: list[Surface] | None = None
) -> tuple[list[bool], dict[str, Fault]]:
    surfaces = surfaces or [GLASS]
    owner = np.arange(len(triangles), dtype=np.int32) % len(surfaces)
    cleaned = clean(np.array(triangles), surface=owner, surfaces=surfaces)
    return cleaned.keep.tolist(), {fault.kind: fault for fault in cleaned.faults}


def test_a_good_mesh_has_no_faults() -> None:
    box = trimesh.creation.icosphere(subdivisions=3, radius=10.0).triangles
    keep, faults = run(list(box))
    assert all(keep)
    assert faults == {}


@pytest.mark.parametrize("bad", [np.nan, np.inf, -np.inf])
def test_corners_that_are_not_numbers_are_removed(bad: float) -> None:
    broken = T.copy()
    broken[1, 2] = bad
    keep, faults = run([T, broken])
    assert keep == [True, False]
    assert (faults["not_finite"].count, faults["not_finite"].surface) == (1, "glass")


def test_triangles_without_area_are_removed() -> None:
    point = np.repeat(T[:1], 3, axis=0)
    line = np.array([[0.0, 0.0, 0.0], [1.0, 1.0, 1.0], [3.0, 3.0, 3.0]])
    needle = np.array([[0.0, 0.0, 9.0], [60.0, 0.0, 9.0], [30.0, 1e-3, 9.0]])  # thin but real
    keep, faults = run([T, point, line, needle])
    assert keep == [True, False, False, True]
    assert faults["zero_area"].count == 2


@pytest.mark.parametrize(
    "order", [[0, 1, 2], [1, 2, 0], [2, 0, 1], [0, 2, 1], [2, 1, 0], [1, 0, 2]]
)
def test_copies_are_found_in_any_order_and_winding(order: list[int]) -> None:
    keep, faults = run([T, T[order] + 0.00004])  # 0.07 mm apart
    assert keep == [True, False]
    assert faults["duplicate"].count == 1


def test_three_copies_leave_one() -> None:
    keep, faults = run([T, T[::-1], T])
    assert keep == [True, False, False]
    assert faults["duplicate"].count == 2


def test_neighbours_with_the_same_middle_are_no_copies() -> None:
    turned = T.mean(axis=0) - (T - T.mean(axis=0))
    keep, faults = run([T, turned])
    assert keep == [True, True]
    assert faults == {}


@pytest.mark.parametrize(
    ("surfaces", "kept"),
    [
        ([CORE, GLASS], [False, True]),
        ([GLASS, CORE], [True, False]),
        ([PLAZA, GLASS], [False, True]),
        ([CORE, PLAZA], [False, True]),
        ([CORE, CORE], [True, False]),
    ],
)
def test_of_copies_across_parts_the_reflector_stays(
    surfaces: list[Surface], kept: list[bool]
) -> None:
    keep, faults = run([T, T], surfaces)
    assert keep == kept
    assert faults["duplicate"].surface == surfaces[kept.index(False)].name


@pytest.mark.parametrize(("gap_mm", "kind"), [(0.05, "duplicate"), (0.5, "near_duplicate")])
def test_sheets_that_nearly_coincide_are_reported_only(gap_mm: float, kind: str) -> None:
    keep, faults = run([T, T + np.array([0.0, 0.0, gap_mm / 1000.0])])
    assert list(faults) == [kind]
    assert keep == [True, kind == "near_duplicate"]


def test_the_two_panes_of_a_thin_box_are_left_alone() -> None:
    keep, faults = run(list(trimesh.creation.box((1.5, 0.006, 3.0)).triangles))
    assert all(keep)
    assert faults == {}


def test_small_faces_within_a_millimetre_are_left_alone() -> None:
    keep, faults = run(list(trimesh.creation.icosphere(subdivisions=3, radius=0.003).triangles))
    assert all(keep)
    assert faults == {}


@settings(max_examples=30, deadline=None)
@given(seed=st.integers(0, 2**32 - 1), far=st.sampled_from([0.0, 500e3]))
def test_order_of_faces_does_not_change_what_is_counted(seed: int, far: float) -> None:
    rng = np.random.default_rng(seed)
    sphere = trimesh.creation.icosphere(subdivisions=2, radius=20.0).triangles + far
    copies = rng.integers(0, len(sphere), 7)
    mesh = np.concatenate([sphere, sphere[copies][:, ::-1]])
    shuffled = mesh[rng.permutation(len(mesh))]
    for triangles in (mesh, shuffled):
        keep, faults = run(list(triangles))
        assert sum(keep) == len(sphere)
        assert faults["duplicate"].count == 7


# --- sheets ------------------------------------------------------------------------------------


def strip(n: int) -> np.ndarray:
    """n panes of 1 m side by side in the XZ plane, two triangles each, fronts to -Y."""
    a = np.array([[[0.0, 0, 0], [1, 0, 0], [1, 0, 1]], [[0.0, 0, 0], [1, 0, 1], [0, 0, 1]]])
    return np.concatenate([a + np.array([i, 0, 0]) for i in range(n)])


def sheets(triangles: np.ndarray, owner: np.ndarray | None = None) -> dict[str, Fault]:
    if owner is None:
        owner = np.zeros(len(triangles), dtype=np.int32)
    faults = check_sheets(triangles, surface=owner, surfaces=[GLASS, GLASS])
    return {fault.kind: fault for fault in faults}


def test_an_open_sheet_and_a_box_are_in_order() -> None:
    assert sheets(strip(5)) == {}
    assert sheets(trimesh.creation.box().triangles) == {}
    assert sheets(np.zeros((0, 3, 3))) == {}


def test_turned_faces_are_counted_by_their_edges() -> None:
    triangles = strip(5)
    triangles[4:6] = triangles[4:6, ::-1]  # the middle pane: an edge to each neighbour
    assert sheets(triangles)["winding"].count == 2


def test_winding_is_judged_within_a_surface() -> None:
    triangles = strip(2)
    triangles[2:] = triangles[2:, ::-1]
    assert sheets(triangles, np.array([0, 0, 1, 1], dtype=np.int32)) == {}
    assert sheets(triangles)["winding"].count == 1


def test_a_sheet_joined_to_a_fin_has_no_right_winding() -> None:
    fin = np.array([[[1.0, 0, 0], [1, 1, 0], [1, 0, 1]]])
    assert sheets(np.concatenate([strip(2), fin])) == {}


def test_a_copy_cut_along_the_other_diagonal_is_found() -> None:
    pane = strip(1)
    other = np.array([[[0.0, 0, 0], [1, 0, 0], [0, 0, 1]], [[1.0, 0, 0], [1, 0, 1], [0, 0, 1]]])
    found = sheets(np.concatenate([pane, other]))
    assert list(found) == ["overlap"]
    assert found["overlap"].count == 4  # the four sides; the diagonals cross


# --- size and place ----------------------------------------------------------------------------


def extent(size: float, *, unit: str = "m", away: float = 0.0) -> list[Fault]:
    low = np.array([away, 0.0, 0.0])
    return check_extent(low, low + size, unit=unit, origin=np.round(low))


@pytest.mark.parametrize("size", [2.5, 100.0, 10e3, 19e3])
def test_usual_sizes_pass(size: float) -> None:
    assert extent(size) == []


@pytest.mark.parametrize(
    ("size", "unit", "kind", "cure"),
    [
        (80e3, "m", "too_large", '"mm" would make it 80 m'),
        (0.08, "mm", "too_small", '"m" would make it 80 m'),
        (0.5, "m", "too_small", "Check unit"),
    ],
)
def test_sizes_that_suggest_another_unit_say_which(
    size: float, unit: str, kind: str, cure: str
) -> None:
    (fault,) = extent(size, unit=unit)
    assert fault.kind == kind
    assert cure in fault.hint


def test_a_model_far_away_says_what_was_done() -> None:
    assert extent(100.0, away=99e3) == []
    (fault,) = extent(100.0, away=500e3)
    assert fault.kind == "far_away"
    assert "500 km" in fault.message
    assert "(500000, 0, 0)" in fault.message
