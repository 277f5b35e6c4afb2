"""A host's scene comes through whole, stays warm, and the command line repeats its figures."""

from pathlib import Path

import numpy as np
import pytest
import trimesh
from client import SITE, Client, scene, square, trough, write_arrays

import causticload as cl
from causticload.worker.scenes import HostObject, file_stems, write_mesh

AT = "2025-03-21T12:30"


def loads(answer: dict) -> dict[str, np.ndarray]:
    with np.load(answer["arrays"]) as file:
        return {key: file[key] for key in file.files}


def test_geometry_covers_the_yard(worker: Client, tmp_path: Path) -> None:
    loaded = worker.call("load", scene=scene(tmp_path / "a.npz"))
    (yard,) = loaded["receivers"]
    assert (yard["name"], yard["object"], yard["points"]) == ("Yard", "Yard", 100 * 100)
    assert set(loaded["surfaces"]) == {"Glass [bow]", "Yard"}
    arrays = loads(loaded)
    corners = arrays["r0/vertices"][arrays["r0/quads"]]
    across = np.cross(corners[:, 1] - corners[:, 0], corners[:, 3] - corners[:, 0])
    # Cells of half a metre, facing up, together the yard's 50 m by 50 m, 5 mm above it.
    assert across[:, 2] == pytest.approx(0.25, rel=1e-9)
    assert across[:, 2].sum() == pytest.approx(2500.0, rel=1e-9)
    assert corners[:, :, 2] == pytest.approx(0.005, abs=1e-9)
    facade = arrays["facade/triangles"]
    across = np.cross(facade[:, 1] - facade[:, 0], facade[:, 2] - facade[:, 0])
    # 24 chords of a third of a circle of 30 m radius, 6 m high.
    chord = 2.0 * 30.0 * np.sin(np.radians(2.5))
    assert 0.5 * np.linalg.norm(across, axis=1).sum() == pytest.approx(24 * chord * 6.0, rel=1e-3)
    assert np.array_equal(np.sort(arrays["facade/source"]), np.arange(48))


def test_saved_study_gives_the_same_figures(worker: Client, tmp_path: Path) -> None:
    worker.call("load", scene=scene(tmp_path / "a.npz"))
    instant = worker.call("instant", at=AT)
    saved = Path(worker.call("save_study", path=str(tmp_path / "out" / "bow.toml"))["path"])
    again = cl.solve_instant(cl.read_study(saved), at=AT)
    arrays = loads(instant)
    reflected = again.receivers["Yard"].reflected
    # Threads add the same numbers in another order.
    assert arrays["r0/reflected"] == pytest.approx(reflected, rel=1e-9, abs=1e-9)
    assert reflected.max() > 100.0
    assert np.array_equal(arrays["r0/images"], again.receivers["Yard"].images)


def test_a_file_is_not_replaced_unasked(worker: Client, tmp_path: Path) -> None:
    worker.call("load", scene=scene(tmp_path / "a.npz"))
    mine = tmp_path / "mine.toml"
    mine.write_text("precious")
    assert "exists" in worker.fail("save_study", path=str(mine))["data"]["message"]
    assert mine.read_text() == "precious"
    worker.call("save_study", path=str(mine), overwrite=True)
    assert cl.read_study(mine).title == "Bow"


def test_names_that_differ_only_in_case_keep_their_roles(worker: Client, tmp_path: Path) -> None:
    shapes = {"glass": trough(), "Glass": square(30.0), "gl*ss?": square(1.0, 20.0)}
    rules = [
        {"role": "reflector", "form": "smooth", "finish": "double clear glass"},
        {"role": "receiver", "spacing": 1.0, "kind": "walkway"},
        {"role": "obstruction"},
    ]
    loaded = worker.call(
        "load",
        scene={
            "arrays": write_arrays(tmp_path / "a.npz", shapes),
            "objects": [
                {"name": n, "vertices": f"v{k}", "triangles": f"t{k}", "rule": rules[k]}
                for k, n in enumerate(shapes)
            ],
            "study": {"site": SITE},
        },
    )
    assert loaded["surfaces"] == list(shapes)
    assert [r["object"] for r in loaded["receivers"]] == ["Glass"]
    roles = [s["roles"] for s in worker.call("inspect")["surfaces"]]
    assert roles == [["reflector"], ["receiver"], ["obstruction"]]


def test_only_shapes_and_roles_make_the_scene_anew(
    worker: Client, fresh: Client, tmp_path: Path
) -> None:
    worker.call("load", scene=scene(tmp_path / "a.npz"))
    other = scene(tmp_path / "a.npz", sky={"turbidity": 3.0, "disc": "uniform"})
    other["study"]["site"] = {**SITE, "latitude": 40.0, "model_north": 30.0}
    assert not worker.call("load", scene=other)["rebuilt"]
    warm = worker.call("instant", at=AT)
    assert fresh.call("load", scene=other)["rebuilt"]
    cold = fresh.call("instant", at=AT)
    assert warm["sun"] == cold["sun"]
    assert loads(warm)["r0/reflected"] == pytest.approx(
        loads(cold)["r0/reflected"], rel=1e-9, abs=1e-9
    )
    finer = scene(tmp_path / "b.npz", spacing=1.0)
    assert worker.call("load", scene=finer)["rebuilt"]
    finer["objects"][0]["rule"]["finish"] = "double clear glass"
    assert worker.call("load", scene=finer)["rebuilt"]
    shapes = {"Glass [bow]": trough(radius=31.0), "Yard": square(25.0)}
    write_arrays(tmp_path / "b.npz", shapes)
    assert worker.call("load", scene=finer)["rebuilt"]
    assert not worker.call("load", scene=finer)["rebuilt"]


def test_ground_is_laid_where_nothing_receives(worker: Client, tmp_path: Path) -> None:
    bare = scene(tmp_path / "a.npz")
    bare["objects"][1]["rule"] = {"role": "obstruction"}
    loaded = worker.call("load", scene=bare)
    assert [r["name"] for r in loaded["receivers"]] == ["ground"]
    assert "level ground" in loaded["assumed"][0]
    assert not worker.call("load", scene=bare, ground=False)["receivers"]


@pytest.mark.parametrize(
    ("change", "where"),
    [
        (lambda s: s.update(arays=1), "params.scene"),
        (lambda s: s["objects"][0].update(vertices="no"), "params.scene.objects[0].vertices"),
        (lambda s: s["objects"][1].update(rule=[]), "params.scene.objects[1].rule"),
        (lambda s: s["objects"][1].update(triangles="t0"), "params.scene.objects[1].triangles"),
        (lambda s: s["objects"][1].update(triangles="v0"), "params.scene.objects[1].triangles"),
        (lambda s: s.update(arrays="nowhere.npz"), "params.scene.arrays"),
        (lambda s: s["study"].update(model={}), "params.scene.study.model"),
        (lambda s: s["study"]["site"].update(latitude=95), "study.toml, line 4: site.latitude"),
        (
            lambda s: s["objects"][1]["rule"].update(rolle=1),
            "study.toml, line 22: surface[2].rolle",
        ),
    ],
)
def test_wrong_scenes(worker: Client, tmp_path: Path, change: object, where: str) -> None:
    wrong = scene(tmp_path / "a.npz")
    wrong["study"]["site"] = dict(SITE)
    change(wrong)  # type: ignore[operator]
    assert worker.fail("load", scene=wrong)["data"]["where"] == where


def test_mesh_file_is_exact(tmp_path: Path) -> None:
    rng = np.random.default_rng(3)
    vertices, triangles = rng.normal(size=(9, 3)) + 1e6, rng.integers(0, 9, (12, 3))
    normals = rng.normal(size=(12, 3, 3))
    normals /= np.linalg.norm(normals, axis=-1, keepdims=True)
    write_mesh(HostObject("a", "a", vertices, triangles, normals, {}), tmp_path / "a.ply")
    read = trimesh.load(tmp_path / "a.ply", process=False)
    assert np.array_equal(np.asarray(read.vertices)[read.faces], vertices[triangles])
    assert np.asarray(read.vertex_normals)[read.faces] == pytest.approx(normals, abs=1e-15)


def test_file_stems() -> None:
    stems = file_stems(["a/b", "A:B", "..", "con\n", "x" * 300, "x" * 301, ""])
    assert stems[:4] == ["a-b", "A-B 2", "object", "con-"]
    assert len({s.casefold() for s in stems}) == 7
    assert max(map(len, stems)) <= 82
