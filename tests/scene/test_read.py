"""Mesh files come in whole: every format, units, up axis, names, order, normals, transforms.

Expected values are shapes written by hand here, or by trimesh's own exporters.
"""

from __future__ import annotations

import json
import struct
import sys
from pathlib import Path

import numpy as np
import pytest
import trimesh

from causticload.errors import MeshError
from causticload.scene.read import Part, read_parts
from causticload.study.model import Model

EXACT = 1e-12  # m: the same arithmetic up to the last bits
SINGLE = 1e-6  # m: 4-byte numbers of a size of 10 m


def read(*files: Path, **settings: str) -> list[Part]:
    return read_parts(Model(files=files, **settings))


def write(folder: Path, name: str, text: str) -> Path:
    path = folder / name
    path.write_text(text)
    return path


def outward(part: Part) -> np.ndarray:
    """How much each face's front looks away from the middle of the part. (k,) m"""
    corner = part.triangles
    normal = np.cross(corner[:, 1] - corner[:, 0], corner[:, 2] - corner[:, 0])
    away = corner.mean(axis=1) - corner.mean(axis=(0, 1))
    return np.einsum("ki,ki->k", normal, away)


def box() -> trimesh.Trimesh:
    """2 x 3 x 5 m, one corner at the origin."""
    mesh = trimesh.creation.box((2.0, 3.0, 5.0))
    mesh.apply_translation((1.0, 1.5, 2.5))
    return mesh


def write_box(folder: Path, ending: str) -> Path:
    path = folder / f"kestrel.{ending}"
    if ending == "gltf":
        for name, data in trimesh.exchange.gltf.export_gltf(trimesh.Scene({"box": box()})).items():
            (folder / name).write_bytes(data)
        return folder / "model.gltf"
    whole = trimesh.Scene({"box": box()}) if ending in {"glb", "3mf"} else box()
    whole.export(str(path))
    return path


# --- formats -----------------------------------------------------------------------------------


@pytest.mark.parametrize("ending", ["obj", "ply", "stl", "off", "glb", "gltf", "3mf"])
def test_every_format_holds_the_same_box(tmp_path: Path, ending: str) -> None:
    (part,) = read(write_box(tmp_path, ending))
    want = box()
    assert part.triangles.dtype == np.float64
    assert part.triangles == pytest.approx(want.vertices[want.faces], abs=SINGLE)
    assert (outward(part) > 0.0).all()


@pytest.mark.parametrize("ending", ["obj", "ply", "stl", "off", "glb", "3mf"])
def test_capital_endings_are_the_same_formats(tmp_path: Path, ending: str) -> None:
    path = write_box(tmp_path, ending).rename(tmp_path / f"KESTREL.{ending.upper()}")
    assert len(read(path)[0].triangles) == 12


def test_ascii_stl_keeps_the_names_of_its_solids(tmp_path: Path) -> None:
    facet = (
        "facet normal 0 0 1\nouter loop\nvertex 0 0 {z}\nvertex 1 0 {z}\nvertex 0 1 {z}\n"
        "endloop\nendfacet\n"
    )
    text = "".join(
        f"solid {name}\n{facet.format(z=z)}endsolid {name}\n"
        for name, z in (("North Glass", 0), ("roof", 1))
    )
    parts = read(write(tmp_path, "a.stl", text))
    assert [part.name for part in parts] == ["North Glass", "roof"]
    assert [part.triangles[0, 0, 2] for part in parts] == [0.0, 1.0]


def test_a_file_without_names_is_called_by_its_own(tmp_path: Path) -> None:
    for ending in ("ply", "stl", "off", "obj"):
        (part,) = read(write_box(tmp_path, ending))
        assert (part.name, part.names, part.file) == (
            "kestrel",
            ("kestrel",),
            f"kestrel.{ending}",
        )


def test_files_are_read_in_the_order_of_the_study(tmp_path: Path) -> None:
    parts = read(write_box(tmp_path, "stl"), write_box(tmp_path, "obj"))
    assert [part.file for part in parts] == ["kestrel.stl", "kestrel.obj"]


# --- units and axes ----------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("unit", "metres"),
    [("m", 1.0), ("cm", 0.01), ("mm", 0.001), ("ft", 0.3048), ("in", 0.0254)],
)
def test_units_become_metres(tmp_path: Path, unit: str, metres: float) -> None:
    # international foot and inch: exactly 0.3048 m and 0.0254 m (agreement of 1 July 1959)
    (part,) = read(write_box(tmp_path, "obj"), unit=unit)
    size = np.ptp(part.triangles.reshape(-1, 3), axis=0)
    assert size == pytest.approx(np.array([2.0, 3.0, 5.0]) * metres, abs=EXACT)


def test_y_up_is_turned_not_mirrored(tmp_path: Path) -> None:
    path = write(tmp_path, "a.obj", "v 1 2 3\nv 2 2 3\nv 1 4 3\nvn 0 1 0\nf 1//1 2//1 3//1\n")
    (part,) = read(path, up="Y")
    assert part.triangles[0].tolist() == [[1, -3, 2], [2, -3, 2], [1, -3, 4]]
    assert part.corner_normals is not None
    assert part.corner_normals[0, 0].tolist() == [0, 0, 1]
    (part,) = read(write_box(tmp_path, "ply"), up="Y")
    assert (outward(part) > 0.0).all()


def test_glb_read_as_z_up_says_so(tmp_path: Path) -> None:
    path = write_box(tmp_path, "glb")
    (fault,) = read(path)[0].notes
    assert fault.kind == "up_axis"
    assert 'up = "Y"' in fault.hint
    assert read(path, up="Y")[0].notes == ()


def test_a_unit_that_the_file_contradicts_is_said(tmp_path: Path) -> None:
    path = write_box(tmp_path, "3mf")  # trimesh writes millimetres, the default of the standard
    (fault,) = read(path)[0].notes
    assert fault.kind == "unit_differs"
    assert "millimeter" in fault.message
    assert read(path, unit="mm")[0].notes == ()


def test_rounding_of_single_precision_far_from_home_is_said(tmp_path: Path) -> None:
    mesh = box()
    mesh.apply_translation((500e3, 0.0, 0.0))
    mesh.export(str(tmp_path / "far.stl"))
    (fault,) = read(tmp_path / "far.stl")[0].notes
    # IEEE 754 binary32: 24 significant bits, so the step between 2^18 and 2^19 is 2^-5
    assert fault.kind == "rounded"
    assert f"{1000 * 2**-5:.2g} mm" in fault.message


def test_far_text_coordinates_keep_the_shape(tmp_path: Path) -> None:
    x = 500e3
    path = write(tmp_path, "a.obj", f"v {x} {x} 0\nv {x + 1.5} {x} 0\nv {x} {x + 0.001} 3\nf 1 2 3")
    (part,) = read(path)
    edges = part.triangles[0, 1:] - part.triangles[0, 0]
    assert edges == pytest.approx(np.array([[1.5, 0, 0], [0, 0.001, 3]]), abs=1e-6)
    assert part.notes == ()


# --- OBJ ---------------------------------------------------------------------------------------


def test_obj_keeps_object_group_and_material_apart(tmp_path: Path) -> None:
    text = """
v 0 0 0
v 1 0 0
v 0 1 0
o Tower East
g level_1 facade
usemtl glazing clear
f 1 2 3
usemtl stone
f 1 2 3
o Plaza
f 1 2 3
o Tower East
g level_1 facade
usemtl glazing clear
f 3 2 1
"""
    parts = read(write(tmp_path, "a.obj", text))
    assert [(p.object_name, p.group, p.material, len(p.triangles)) for p in parts] == [
        ("Tower East", "level_1/facade", "glazing clear", 2),
        ("Tower East", "level_1/facade", "stone", 1),
        ("Plaza", "level_1/facade", "stone", 1),
    ]
    assert parts[0].names == (
        "Tower East",
        "level_1/facade",
        "level_1",
        "facade",
        "glazing clear",
    )


def test_obj_normals_survive_with_their_own_numbers(tmp_path: Path) -> None:
    # vertex and normal numbers differ, and the shared vertex 2 has another normal in each face
    text = """
v 0 0 0
v 1 0 0
v 1 1 0
v 2 0 0
vn 0 0 1
vn 0.6 0 0.8
vn 0 0.6 0.8
vt 0 0
f 1//3 2/1/1 3//2
f 2//2 4/1/3 3/1/1
"""
    (part,) = read(write(tmp_path, "a.obj", text))
    n = np.array([[0, 0, 1], [0.6, 0, 0.8], [0, 0.6, 0.8]])
    assert part.corner_normals == pytest.approx(n[[[2, 0, 1], [1, 2, 0]]], abs=EXACT)


def test_obj_counts_backwards_and_carries_on_after_a_backslash(tmp_path: Path) -> None:
    text = "v 0 0 0\nv 1 0 0\nv 0 1 0\nf -3 \\\n-2 -1\nv 5 5 5\nf -1 -4 -3 # last\n"
    (part,) = read(write(tmp_path, "a.obj", text))
    assert part.triangles[:, 0].tolist() == [[0, 0, 0], [5, 5, 5]]


def test_obj_polygons_are_cut_in_the_order_of_the_file(tmp_path: Path) -> None:
    text = """
v 0 0 0
v 2 0 0
v 2 2 0
v 0 2 0
v 9 0 0
v 9 1 0
vn 0 0 1
f 1//1 2//1 3//1 4//1
f 2//1 5//1 6//1
"""
    (part,) = read(write(tmp_path, "a.obj", text))
    assert len(part.triangles) == 3
    assert part.triangles[2].tolist() == [[2, 0, 0], [9, 0, 0], [9, 1, 0]]
    assert part.corner_normals is not None


@pytest.mark.parametrize("move", [0.0, 500e3])
def test_concave_faces_stay_inside_their_outline(tmp_path: Path, move: float) -> None:
    # an L of three unit squares, first corner at the tip of a leg: a fan would cover its notch
    outline = [(2, 1), (1, 1), (1, 2), (0, 2), (0, 0), (2, 0)]
    text = "".join(f"v {x + move} {y + move} 1\n" for x, y in outline) + "f 1 2 3 4 5 6\n"
    (part,) = read(write(tmp_path, "l.obj", text))
    normal = np.cross(
        part.triangles[:, 1] - part.triangles[:, 0], part.triangles[:, 2] - part.triangles[:, 0]
    )
    assert (normal[:, 2] > 0.0).all()  # wound as the outline
    assert normal[:, 2].sum() / 2.0 == pytest.approx(3.0, abs=1e-9)
    middle = part.triangles.mean(axis=1) - move
    assert not ((middle[:, 0] > 1.0) & (middle[:, 1] > 1.0)).any()


def test_obj_normals_that_are_not_unit_are_marked(tmp_path: Path) -> None:
    text = "v 0 0 0\nv 1 0 0\nv 0 1 0\nvn 0 0 1.0004\nvn 0.71 0 0.71\nvn 0 0 0\nf 1//1 2//2 3//3\n"
    (part,) = read(write(tmp_path, "a.obj", text))
    assert part.corner_normals is not None
    assert part.corner_normals[0, 0].tolist() == [0, 0, 1]
    assert np.isnan(part.corner_normals[0, 1:]).all()


def test_obj_with_normals_on_some_faces_says_so(tmp_path: Path) -> None:
    text = (
        "o a\nv 0 0 0\nv 1 0 0\nv 0 1 0\nvn 0 0 1\nf 1//1 2//1 3//1\nf 1 2 3\nf 1 2\ncurv 0 1 1 2\n"
    )
    (part,) = read(write(tmp_path, "a.obj", text))
    assert part.corner_normals is None
    assert {note.kind for note in part.notes} == {"normals_incomplete", "short_face", "free_form"}


@pytest.mark.parametrize(
    ("line", "rule"),
    [
        ("f 1 2 4", "index 4"),
        ("f 0 1 2", "index 0"),
        ("f 1//2 2//1 3//1", "index 2"),
        ("v 1 2", "three numbers"),
        ("v 1 2 x", "could not convert"),
    ],
)
def test_a_bad_obj_line_is_named(tmp_path: Path, line: str, rule: str) -> None:
    path = write(tmp_path, "a.obj", f"v 0 0 0\nv 1 0 0\nv 0 1 0\nvn 0 0 1\n{line}\n")
    with pytest.raises(MeshError, match=rule) as caught:
        read(path)
    assert caught.value.where == "a.obj, line 5"


# --- PLY and OFF -------------------------------------------------------------------------------

PLY = """ply
format ascii 1.0
element vertex 4
property double x
property double y
property double z
{normals}element face {count}
property list uchar int vertex_indices
end_header
{rows}"""
NORMAL_HEADER = "property float nx\nproperty float ny\nproperty float nz\n"


def test_ply_normals_come_only_from_the_file(tmp_path: Path) -> None:
    rows = "0 0 0{n}\n1 0 0{n}\n1 1 0{n}\n0 1 0{n}\n3 0 1 2\n"
    bare = PLY.format(normals="", count=1, rows=rows.format(n=""))
    full = PLY.format(normals=NORMAL_HEADER, count=1, rows=rows.format(n=" 0.6 0 0.8"))
    assert read(write(tmp_path, "bare.ply", bare))[0].corner_normals is None
    normals = read(write(tmp_path, "full.ply", full))[0].corner_normals
    assert normals == pytest.approx(np.tile([0.6, 0, 0.8], (1, 3, 1)), abs=SINGLE)


@pytest.mark.parametrize(
    ("ending", "text"),
    [
        ("ply", PLY.format(normals="", count=1, rows="0 0 0\n1 0 0\n1 1 0\n0 1 0\n4 0 1 2 3\n")),
        ("off", "OFF # quad\n4 1 0\n0 0 0\n1 0 0\n1 1 0\n0 1 0\n4 0 1 2 3\n"),
    ],
)
def test_larger_faces_of_ply_and_off_are_cut_and_said(
    tmp_path: Path, ending: str, text: str
) -> None:
    (part,) = read(write(tmp_path, f"quad.{ending}", text))
    edges = np.diff(part.triangles, axis=1)
    area = np.linalg.norm(np.cross(edges[:, 0], edges[:, 1]), axis=1) / 2.0
    assert area.sum() == pytest.approx(1.0, abs=EXACT)
    assert [note.kind for note in part.notes] == ["fans"]


# --- glTF --------------------------------------------------------------------------------------


def write_gltf(folder: Path, nodes: list[dict[str, object]], *, materials: int = 1) -> Path:
    """A unit box with outward normals, its faces dealt out among materials."""
    corners = trimesh.creation.box()
    xyz = corners.vertices[corners.faces].reshape(-1, 3)
    normals = np.repeat(corners.face_normals, 3, axis=0)
    data = xyz.astype("<f4").tobytes() + normals.astype("<f4").tobytes()
    (folder / "box.bin").write_bytes(data)
    half = len(data) // 2
    per = 36 // materials
    accessors: list[dict[str, object]] = []
    primitives = []
    for i in range(materials):
        for view in (0, 1):
            accessors.append(
                {
                    "bufferView": view,
                    "byteOffset": 12 * per * i,
                    "componentType": 5126,
                    "count": per,
                    "type": "VEC3",
                }
            )
        attributes = {"POSITION": 2 * i, "NORMAL": 2 * i + 1}
        primitives.append({"attributes": attributes, "material": i})
    text = {
        "asset": {"version": "2.0"},
        "scene": 0,
        "scenes": [{"nodes": [0]}],
        "nodes": nodes,
        "meshes": [{"name": "box mesh", "primitives": primitives}],
        "materials": [{"name": f"material {i}"} for i in range(materials)],
        "accessors": accessors,
        "bufferViews": [
            {"buffer": 0, "byteOffset": 0, "byteLength": half},
            {"buffer": 0, "byteOffset": half, "byteLength": half},
        ],
        "buffers": [{"uri": "box.bin", "byteLength": len(data)}],
    }
    path = folder / "box.gltf"
    path.write_text(json.dumps(text))
    return path


def test_mirrored_and_stretched_nodes_keep_fronts_and_normals_outside(tmp_path: Path) -> None:
    turn = [0.0, 0.0, np.sin(np.pi / 6), np.cos(np.pi / 6)]  # 60 degrees about Z
    node = {"name": "wing", "mesh": 0, "scale": [-2, 3, 0.5], "rotation": turn}
    (part,) = read(write_gltf(tmp_path, [{**node, "translation": [10, 0, 0]}]), up="Y")
    assert (outward(part) > 0.0).all()
    face = np.cross(
        part.triangles[:, 1] - part.triangles[:, 0], part.triangles[:, 2] - part.triangles[:, 0]
    )
    face /= np.linalg.norm(face, axis=1, keepdims=True)
    # the box is flat, so its normals must be those of its faces after any transform
    assert part.corner_normals == pytest.approx(np.repeat(face[:, None], 3, axis=1), abs=SINGLE)
    volume = np.einsum(
        "ki,ki->k", part.triangles[:, 0], np.cross(*part.triangles[:, 1:].swapaxes(0, 1))
    )
    assert volume.sum() / 6.0 == pytest.approx(2 * 3 * 0.5, abs=1e-5)


def test_gltf_names_are_node_parents_and_material(tmp_path: Path) -> None:
    nodes = [
        {"name": "Kestrel Quay", "children": [1]},
        {"name": "facade", "children": [2]},
        {"name": "east wing", "mesh": 0},
    ]
    parts = read(write_gltf(tmp_path, nodes, materials=2), up="Y")
    assert [(p.object_name, p.group, p.material) for p in parts] == [
        ("east wing", "Kestrel Quay/facade", "material 0"),
        ("east wing", "Kestrel Quay/facade", "material 1"),
    ]
    assert sum(len(p.triangles) for p in parts) == 12


def test_a_mesh_used_twice_stands_in_both_places(tmp_path: Path) -> None:
    nodes = [
        {"name": "all", "children": [1, 2]},
        {"name": "west", "mesh": 0},
        {"name": "east", "mesh": 0, "translation": [500000.25, 0, 0]},
    ]
    parts = {p.name: p for p in read(write_gltf(tmp_path, nodes), up="Y")}
    # the shape is stored near home, the place in the node in double precision
    moved = parts["east"].triangles - parts["west"].triangles
    assert moved == pytest.approx(np.tile([500000.25, 0, 0], (12, 3, 1)), abs=1e-6)
    assert parts["east"].notes == ()


# --- IFC ---------------------------------------------------------------------------------------


def write_ifc(path: Path) -> None:
    """A wall of 4 x 0.2 x 3 m at (10, 20, 5), in millimetres, on a storey and a layer."""
    import ifcopenshell.api.aggregate
    import ifcopenshell.api.context
    import ifcopenshell.api.geometry
    import ifcopenshell.api.project
    import ifcopenshell.api.root
    import ifcopenshell.api.spatial
    import ifcopenshell.api.unit

    api = ifcopenshell.api
    model = api.project.create_file()
    project = api.root.create_entity(model, ifc_class="IfcProject", name="Kestrel")
    length = api.unit.add_si_unit(model, unit_type="LENGTHUNIT", prefix="MILLI")
    api.unit.assign_unit(model, units=[length])
    top = api.context.add_context(model, context_type="Model")
    body = api.context.add_context(
        model,
        context_type="Model",
        context_identifier="Body",
        target_view="MODEL_VIEW",
        parent=top,
    )
    storey = api.root.create_entity(model, ifc_class="IfcBuildingStorey", name="Level 1")
    api.aggregate.assign_object(model, relating_object=project, products=[storey])
    wall = api.root.create_entity(model, ifc_class="IfcWall", name="glass wall")
    shape = api.geometry.add_wall_representation(
        model, context=body, length=4.0, height=3.0, thickness=0.2
    )
    api.geometry.assign_representation(model, product=wall, representation=shape)
    place = np.eye(4)
    place[:3, 3] = (10.0, 20.0, 5.0)
    api.geometry.edit_object_placement(model, product=wall, matrix=place, is_si=True)
    api.spatial.assign_container(model, products=[wall], relating_structure=storey)
    model.write(str(path))


def test_ifc_comes_in_metres_with_names(tmp_path: Path) -> None:
    pytest.importorskip("ifcopenshell")
    path = tmp_path / "wall.ifc"
    write_ifc(path)
    (part,) = read(path)
    points = part.triangles.reshape(-1, 3)
    assert points.min(axis=0) == pytest.approx([10.0, 20.0, 5.0], abs=1e-9)
    assert np.ptp(points, axis=0) == pytest.approx([4.0, 0.2, 3.0], abs=1e-9)
    assert (outward(part) > 0.0).all()
    assert {"glass wall", "IfcWall", "Level 1"} <= set(part.names)
    assert part.notes == ()
    (part,) = read(path, unit="mm")
    assert [note.kind for note in part.notes] == ["unit_not_applied"]
    assert np.ptp(part.triangles[..., 0]) == pytest.approx(4.0, abs=1e-9)


def test_ifc_without_its_extra_says_how_to_get_it(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setitem(sys.modules, "ifcopenshell", None)
    with pytest.raises(MeshError) as caught:
        read(write(tmp_path, "a.ifc", "ISO-10303-21;"))
    assert 'pip install "causticload[ifc]"' in caught.value.hint


# --- files that cannot be read -----------------------------------------------------------------


@pytest.mark.parametrize(
    ("name", "content", "rule"),
    [
        ("none.obj", None, "no file"),
        ("empty.stl", b"", "empty"),
        ("house.blend", b"x", "not a mesh format"),
        ("bundle.zip", b"x", "not a mesh format"),
        ("bare", b"x", "not a mesh format"),
        ("points.obj", b"v 0 0 0\nv 1 1 1\n", "no faces"),
        ("broken.glb", b"glTF but not really", "cannot be read as GLB"),
        ("broken.ply", b"ply\nformat ascii 1.0\nelement vertex 3\n", "cannot be read as PLY"),
        ("broken.3mf", b"PK", "cannot be read as 3MF"),
        ("broken.off", b"OFF\n3 1 0\n0 0 0\n1 0 0\n", "cannot be read as OFF"),
        ("cut.stl", b"\0" * 80 + struct.pack("<I", 7) + b"\0" * 50, "no faces"),
        ("broken.ifc", b"not a step file", "ifcopenshell"),
    ],
)
def test_unusable_files_are_named_with_a_hint(
    tmp_path: Path, name: str, content: bytes | None, rule: str
) -> None:
    path = tmp_path / name
    if content is not None:
        path.write_bytes(content)
    with pytest.raises(MeshError, match=rule) as caught:
        read(path)
    assert caught.value.where.startswith(name)
    assert caught.value.hint


def test_an_unknown_format_lists_the_known(tmp_path: Path) -> None:
    with pytest.raises(MeshError) as caught:
        read(write(tmp_path, "house.blend", "x"))
    for ending in ("OBJ", "PLY", "STL", "OFF", "GLB", "GLTF", "3MF", "IFC"):
        assert ending in caught.value.hint


def test_a_text_file_that_breaks_off_is_not_read_in_part(tmp_path: Path) -> None:
    facet = (
        "facet normal 0 0 1\nouter loop\nvertex 0 0 0\nvertex 1 0 0\nvertex 0 1 {z}\n"
        "endloop\nendfacet\n"
    )
    text = f"solid a\n{facet.format(z=0)}{facet.format(z='oops')}endsolid a\n"
    with pytest.raises(MeshError, match="STL"):
        read(write(tmp_path, "a.stl", text))
