"""Panels against shapes whose panes are known by construction."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from causticload.errors import InputError
from causticload.scene.panels import find_panels


def grid(points):
    """Quads of a (n, m, 3) grid, two triangles each, in the usual order of an export."""
    a, b, c, d = points[:-1, :-1], points[1:, :-1], points[1:, 1:], points[:-1, 1:]
    halves = [np.stack([a, b, c], axis=-2), np.stack([a, c, d], axis=-2)]
    return np.stack(halves, axis=2).reshape(-1, 3, 3)


def cylinder(columns, rows, *, radius=40.0, width=1.5, height=3.5):
    u, v = np.meshgrid(np.arange(columns + 1) * width / radius, np.arange(rows + 1) * height)
    return grid(np.stack([radius * np.sin(u), radius * np.cos(u), v], axis=-1).swapaxes(0, 1))


def find(triangles, smooth, surface=None):
    k = len(triangles)
    surface = np.zeros(k, np.int32) if surface is None else surface
    return find_panels(triangles, surface, np.full(k, smooth))


def box(x, y, z):
    lo, hi = np.zeros(3), np.array([x, y, z])
    quads = []
    for axis in range(3):
        i, j = (axis + 1) % 3, (axis + 2) % 3
        for end in (lo, hi):
            q = np.tile(end, (4, 1))
            q[:, i], q[:, j] = hi[i] * np.array([0, 1, 1, 0]), hi[j] * np.array([0, 0, 1, 1])
            q[:, axis] = end[axis]
            quads += [q[[0, 1, 2]], q[[0, 2, 3]]]
    return np.array(quads)


def test_coplanar_faces_of_a_flat_surface_are_one_panel():
    panel, panels = find(cylinder(20, 15), smooth=False)
    assert len(panels) == 20  # the rows of one column lie in one plane
    # chord of a 1.5 m arc, closed form
    assert panels.size[:, 0] == pytest.approx(2 * 40.0 * np.sin(0.75 / 40.0), abs=1e-9)
    assert panels.size[:, 1] == pytest.approx(15 * 3.5, abs=1e-9)
    assert np.all(panels.width_axis[:, 2] == 0.0)
    assert panels.flat.all()
    assert len(panel) == 600


def test_quads_of_a_smooth_surface_are_one_panel_each():
    triangles = cylinder(20, 15)
    panel, panels = find(triangles, smooth=True)
    assert len(panels) == 300
    assert np.array_equal(panel[0::2], panel[1::2])
    assert not panels.flat.any()


def test_a_lost_triangle_does_not_shift_the_pairs_after_it():
    panel, panels = find(cylinder(20, 15)[1:], smooth=True)
    assert len(panels) == 300
    assert np.array_equal(panel[1::2], panel[2::2])


def test_each_face_of_a_thin_box_is_a_panel():
    _, panels = find(box(1.5, 0.006, 3.0), smooth=False)
    assert len(panels) == 6
    # surface of the box, closed form
    assert panels.area.sum() == pytest.approx(2 * (1.5 * 3.0 + 0.006 * (1.5 + 3.0)), rel=1e-12)


def test_reversed_winding_does_not_split_a_pane():
    triangles = box(1.5, 0.006, 3.0)
    triangles[1] = triangles[1, ::-1]
    assert len(find(triangles, smooth=False)[1]) == 6


def test_two_sheets_back_to_back_are_two_panels():
    sheet = cylinder(1, 1)
    assert len(find(np.concatenate([sheet, sheet[:, ::-1]]), smooth=False)[1]) == 2


def test_parallel_panes_a_millimetre_apart_are_two_panels():
    sheet = cylinder(1, 1)
    shifted = sheet + np.array([0.0, 0.001, 0.0])
    assert len(find(np.concatenate([sheet, shifted]), smooth=False)[1]) == 2


def test_no_panel_reaches_across_surfaces():
    triangles = cylinder(1, 4)
    surface = np.repeat(np.array([0, 1], np.int32), 4)
    assert len(find(triangles, smooth=False, surface=surface)[1]) == 2


def test_many_small_folds_do_not_add_up_to_one_plane():
    triangles = cylinder(1000, 1, width=0.01)  # 0.25 mrad each, 250 mrad together
    panel, panels = find(triangles, smooth=False)
    across = np.cross(triangles[:, 1] - triangles[:, 0], triangles[:, 2] - triangles[:, 0])
    across /= np.linalg.norm(across, axis=1)[:, None]
    off = np.linalg.norm(np.cross(across, panels.normal[panel]), axis=1)
    # within 0.1 mm either side of a plane an arc of 40 m turns by sqrt(2 x 0.2 mm / 40 m) each way
    assert off.max() < np.sqrt(2 * 2e-4 / 40.0)
    assert 100 < len(panels) * 2 < 1000


def test_panes_rounded_to_a_millimetre_stay_whole():
    triangles = np.round(cylinder(20, 1), 3)
    assert len(find(triangles, smooth=False)[1]) == 20


@settings(max_examples=20, deadline=None)
@given(
    angles=st.tuples(*[st.floats(-3.0, 3.0)] * 3),
    shift=st.tuples(*[st.floats(-1000.0, 1000.0)] * 3),
)
def test_panels_do_not_depend_on_the_frame(angles, shift):
    from scipy.spatial.transform import Rotation

    triangles = cylinder(6, 3)
    moved = triangles @ Rotation.from_euler("xyz", angles).as_matrix().T + np.array(shift)
    for smooth in (False, True):
        panel, panels = find(triangles, smooth)
        again, others = find(moved, smooth)
        assert np.array_equal(panel, again)
        assert others.area == pytest.approx(panels.area, rel=1e-9)


def test_wrong_shapes_and_nan_are_refused():
    triangles = cylinder(1, 1)
    with pytest.raises(InputError, match="must have shape"):
        find_panels(triangles, np.zeros(1, np.int32), np.zeros(2, bool))
    triangles[0, 0, 0] = np.nan
    with pytest.raises(InputError, match="finite"):
        find(triangles, smooth=False)
