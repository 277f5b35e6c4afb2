"""Runs inside Blender (the ``bpy`` package, or ``blender -b --python``): one check by its name.

python inside.py CHECK RESULT: writes {"ok": ..., "text": ...} to RESULT and leaves without
clean-up, because some builds of ``bpy`` crash or hang at exit.
"""

import json
import os
import sys
import tempfile
import time
import traceback
from pathlib import Path

import bpy
import numpy as np

HERE = Path(__file__).resolve().parent
ADDON = HERE.parents[1] / "addon"
sys.path.insert(0, str(ADDON))
sys.path.insert(0, str(HERE.parent / "worker"))
import addon_utils  # noqa: E402

PYTHON = os.environ["CAUSTICLOAD_PYTHON"]


def begin():
    bpy.ops.wm.read_factory_settings(use_empty=True)
    addon_utils.enable("causticload_addon", default_set=True)
    bpy.context.preferences.addons["causticload_addon"].preferences.interpreter = PYTHON
    s = bpy.context.scene.causticload
    s.latitude, s.longitude, s.timezone = 51.5, -1.0, "Europe/London"
    s.month, s.day, s.hour, s.year = 3, 5, 13.5, 2025
    s.step_minutes, s.day_stride = 30, 30


def mesh_object(name, vertices, triangles, roles, **settings):
    mesh = bpy.data.meshes.new(name)
    mesh.from_pydata(np.asarray(vertices).tolist(), [], np.asarray(triangles).tolist())
    ob = bpy.data.objects.new(name, mesh)
    bpy.context.scene.collection.objects.link(ob)
    ob.causticload.roles = set(roles)
    for key, value in settings.items():
        setattr(ob.causticload, key, value)
    return ob


def bow():
    from client import square, trough

    glass = mesh_object(
        "Glass", *trough(), ["reflector"], form="smooth", finish="polished stainless steel"
    )
    yard = mesh_object("Yard", *square(25.0), ["receiver"], spacing=0.5, kind="walkway")
    return glass, yard


def read():
    from causticload_addon import reading

    graph = bpy.context.evaluated_depsgraph_get()
    return {n: (v, t, c, r) for n, v, t, c, r in reading.read_scene(bpy.context.scene, graph)}


def area_vector(v, t):
    a = v[t]
    return 0.5 * np.cross(a[:, 1] - a[:, 0], a[:, 2] - a[:, 0])


def result(what="receiver:Yard"):
    from causticload_addon import results

    return results.find(bpy.context.scene, what)


def values(ob, name):
    attribute = ob.data.attributes[name]
    out = np.empty(len(ob.data.polygons), np.int32 if attribute.data_type == "INT" else np.float32)
    attribute.data.foreach_get("value", out)
    return out


def colours(ob):
    out = np.empty(4 * len(ob.data.loops), np.float32)
    ob.data.color_attributes["load colour"].data.foreach_get("color", out)
    return out.reshape(-1, 4, 4)


def check_geometry():
    cube = [(x, y, z) for x in (0, 1) for y in (0, 1) for z in (0, 1)]
    faces = [(0, 1, 3, 2), (4, 6, 7, 5), (0, 4, 5, 1), (2, 3, 7, 6), (0, 2, 6, 4), (1, 5, 7, 3)]
    bpy.context.scene.unit_settings.scale_length = 0.5
    plain = mesh_object("plain", cube, faces, ["obstruction"])
    plain.scale = (2.0, 3.0, 4.0)
    mirrored = mesh_object("mirrored", cube, faces, ["obstruction"])
    mirrored.scale = (-1.0, 1.0, 1.0)
    mirrored.location = (10.0, 0.0, 0.0)
    arrayed = mesh_object("arrayed", cube, faces, ["obstruction"])
    modifier = arrayed.modifiers.new("a", "ARRAY")
    modifier.count = 3
    hidden = mesh_object("hidden", cube, faces, ["obstruction"])
    hidden.hide_set(True)
    group = bpy.data.collections.new("group")
    pane = mesh_object("pane", cube, faces, ["reflector"])
    bpy.context.scene.collection.objects.unlink(pane)
    group.objects.link(pane)
    for k in range(4):
        instancer = bpy.data.objects.new(f"i{k}", None)
        instancer.instance_type, instancer.instance_collection = "COLLECTION", group
        instancer.location = (0.0, 20.0 * k, 0.0)
        bpy.context.scene.collection.objects.link(instancer)
    bpy.context.view_layer.update()
    found = read()
    assert set(found) == {"plain", "mirrored", "arrayed", "pane"}, set(found)
    volume = {}
    for name, (v, t, _, _) in found.items():
        a = v[t]
        volume[name] = np.einsum("ij,ij->i", a[:, 0], np.cross(a[:, 1], a[:, 2])).sum() / 6.0
    # Outward faces enclose positive volume; half-metre units make an eighth of a cubic unit.
    sign = np.sign(volume["plain"])
    assert np.isclose(abs(volume["plain"]), 24.0 / 8.0, atol=1e-5), volume
    assert np.isclose(volume["mirrored"], sign / 8.0, atol=1e-6), volume
    assert np.isclose(volume["arrayed"], sign * 3.0 / 8.0, atol=1e-6), volume
    assert np.isclose(volume["pane"], sign * 4.0 / 8.0, atol=1e-6), volume
    assert found["pane"][3]["role"] == ["reflector"]
    assert np.isclose(found["pane"][0][:, 1].max(), 0.5 * 61.0, atol=1e-5)


def check_instant():
    bow()
    before = sorted((o.name, len(o.data.vertices)) for o in bpy.context.scene.objects)
    assert bpy.ops.causticload.instant(wait=True) == {"FINISHED"}
    ob = result()
    load = values(ob, "irradiance")
    assert load.max() > 200.0, load.max()
    import matplotlib

    scale = json.loads(bpy.context.scene.causticload.scale)
    shown = matplotlib.colormaps["cividis"](load.astype(float) / scale["high"])[:, :3]
    linear = np.where(shown <= 0.04045, shown / 12.92, ((shown + 0.055) / 1.055) ** 2.4)
    got = colours(ob)[:, 0, :3]
    assert np.abs(got - linear).max() < 0.012, np.abs(got - linear).max()
    assert "screening aid" in bpy.context.scene.causticload.cautions
    after = [
        (o.name, len(o.data.vertices))
        for o in bpy.context.scene.objects
        if not o.get("causticload_result")
    ]
    assert sorted(after) == before
    # The command line repeats the figures from the saved study.
    folder = Path(tempfile.mkdtemp())
    path = folder / "bow.toml"
    assert bpy.ops.causticload.save_study(filepath=str(path), wait=True) == {"FINISHED"}
    import subprocess

    said = subprocess.run(
        [
            PYTHON,
            "-m",
            "causticload.cli",
            "instant",
            str(path),
            "--at",
            "2025-03-05T13:30",
            "--json",
        ],
        capture_output=True,
        text=True,
        check=True,
        cwd=folder,
    )
    peak = json.loads(said.stdout)["receivers"][0]["peak_reflected_W_m2"]
    assert abs(peak - load.max()) < 1e-4 * peak, (peak, load.max())
    # The slider, as it is dragged: one question more, the same object.
    bpy.context.scene.causticload.hour = 14.0
    until = time.monotonic() + 20.0
    from causticload_addon import handlers, session

    while time.monotonic() < until and np.array_equal(values(result(), "irradiance"), load):
        handlers.pending()
        session.drain(0.02)
    assert not np.array_equal(values(result(), "irradiance"), load)
    assert result().name == ob.name


def check_panels():
    bow()
    bpy.context.scene.causticload.rays = True
    bpy.ops.causticload.instant(wait=True)
    facade = result("facade")
    contribution = values(facade, "contribution")
    assert contribution.max() > 0.0
    assert result("rays") is not None
    bpy.ops.causticload.select_panels(share=0.5)
    chosen = np.empty(len(facade.data.polygons), bool)
    facade.data.polygons.foreach_get("select", chosen)
    assert np.array_equal(chosen, contribution >= 0.5 * contribution.max())


def check_year():
    bow()
    bpy.ops.causticload.year(wait=True)
    s = bpy.context.scene.causticload
    assert len(s.rows) > 0, s.message
    assert values(result(), "hours").max() > 0.0
    assert bpy.ops.causticload.pick_episode(wait=True) == {"FINISHED"}
    assert result("facade") is not None


def check_cancel_and_kill():
    from causticload_addon import session

    bow()
    s = bpy.context.scene.causticload
    s.step_minutes, s.day_stride = 1, 1
    bpy.ops.causticload.year()
    until = time.monotonic() + 60.0
    while not (session.running("year") and session.jobs()[session.running("year")].message):
        session.drain(0.05)
        assert time.monotonic() < until
    assert bpy.ops.causticload.cancel() == {"FINISHED"}
    while session.jobs():
        session.drain(0.05)
    assert s.message == ""
    # Killed in mid-run: said, and the next question starts another.
    bpy.ops.causticload.year()
    while not (session.running("year") and session.jobs()[session.running("year")].message):
        session.drain(0.05)
    worker = session._state["client"]
    folder = Path(worker.folder)
    worker.process.kill()
    while session._state["client"] is not None:
        session.drain(0.05)
    assert "ended" in s.message
    assert not folder.exists()
    s.message = ""
    assert bpy.ops.causticload.instant(wait=True) == {"FINISHED"}
    process = session._state["client"].process
    for _ in range(3):
        addon_utils.disable("causticload_addon")
        assert process.poll() is not None
        addon_utils.enable("causticload_addon")
    assert bpy.context.scene.objects["Yard"].causticload.spacing == 0.5


def check_variants_and_files():
    glass, _ = bow()
    bpy.ops.causticload.instant(wait=True)
    assert bpy.ops.causticload.keep_variant(name="first") == {"FINISHED"}
    load = values(result(), "irradiance").copy()
    glass.location.z = 1.0
    bpy.context.view_layer.update()
    bpy.ops.causticload.instant(wait=True)
    now = values(result(), "irradiance")
    assert not np.array_equal(now, load)
    assert bpy.ops.causticload.compare_variants(name="first", wait=True) == {"FINISHED"}
    assert np.allclose(values(result(), "change"), now - load, atol=1e-3)
    path = Path(tempfile.mkdtemp()) / "scene.blend"
    bpy.ops.wm.save_as_mainfile(filepath=str(path))
    bpy.ops.wm.open_mainfile(filepath=str(path))
    assert np.array_equal(values(result(), "irradiance"), now)
    assert bpy.ops.causticload.clear() == {"FINISHED"}
    assert result() is None
    assert {"Glass", "Yard"} <= set(bpy.data.objects.keys())


def check_two_scenes():
    bow()
    bpy.ops.causticload.instant()
    from causticload_addon import session

    bpy.ops.wm.read_homefile(use_empty=True, use_factory_startup=True)
    while session.jobs():
        session.drain(0.05)
    # The answer belonged to what is no longer open.
    assert not [o for o in bpy.data.objects if o.get("causticload_result")]


def main():
    name, target = sys.argv[-2:]
    try:
        begin()
        globals()[f"check_{name}"]()
        said = {"ok": True, "text": bpy.app.version_string}
    except BaseException:
        said = {"ok": False, "text": traceback.format_exc()}
    Path(target).write_text(json.dumps(said))
    from causticload_addon import session

    session.stop()
    os._exit(0 if said["ok"] else 1)


main()
