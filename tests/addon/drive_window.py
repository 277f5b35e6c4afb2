"""Walks through the add-on in a real window on sample (a), the tower, and keeps screenshots.

    CAUSTICLOAD_PYTHON=... SHOTS=folder xvfb-run -s "-screen 0 1400x900x24" \
        blender --factory-startup --python-exit-code 1 --python tests/addon/drive_window.py

Prints the time from a moved slider to the coloured mesh.
"""

import os
import subprocess
import sys
import time
import traceback
from pathlib import Path

import bpy

ROOT = Path(__file__).resolve().parents[2]
sys.path.insert(0, str(ROOT / "addon"))
import addon_utils  # noqa: E402

SHOTS = Path(os.environ["SHOTS"])
FINISH = "solar-control double glass"
KINDS = {"Plaza": ("walkway", 0.25), "Street": ("roadway", 0.5), "Canopy": ("roof", 0.25)}


def shot(name):
    subprocess.run(["import", "-window", "root", str(SHOTS / f"{name}.png")], check=True)


def waiting(method):
    from causticload_addon import session

    return session.running(method) is not None


def setting():
    bpy.ops.object.select_all(action="SELECT")
    bpy.ops.object.delete()
    bpy.ops.wm.obj_import(
        filepath=str(ROOT / "sample_meshes" / "tower.obj"), forward_axis="Y", up_axis="Z"
    )
    addon_utils.enable("causticload_addon", default_set=True)
    preferences = bpy.context.preferences.addons["causticload_addon"].preferences
    preferences.interpreter = os.environ["CAUSTICLOAD_PYTHON"]
    for ob in bpy.data.objects:
        g = ob.causticload
        if ob.name.startswith("Glazing"):
            g.roles, g.form, g.finish = {"reflector"}, "smooth", FINISH
        elif ob.name in KINDS:
            g.roles = {"receiver"}
            g.kind, g.spacing = KINDS[ob.name]
    s = bpy.context.scene.causticload
    s.latitude, s.longitude, s.elevation = 51.62, -1.94, 95.0
    s.timezone, s.month, s.day, s.hour = "Europe/London", 4, 4, 13.6
    s.step_minutes, s.day_stride = 30, 30
    space = next(a for a in bpy.context.screen.areas if a.type == "VIEW_3D").spaces.active
    space.show_region_ui = True
    bpy.ops.object.select_all(action="DESELECT")
    bpy.ops.causticload.view_results()
    view = space.region_3d
    view.view_perspective = "PERSP"
    view.view_location, view.view_distance = (0.0, -20.0, 10.0), 150.0


bpy.context.preferences.view.show_splash = False


def steps():
    yield 2.0
    setting()
    yield 2.0
    # 3.4 cannot choose a tab by script: click on it.
    subprocess.run(["xdotool", "mousemove", "1143", "250", "click", "1"], check=True)
    yield 1.0
    bpy.ops.causticload.instant()
    while waiting("load") or waiting("instant"):
        yield 0.1
    s = bpy.context.scene.causticload
    print("instant:", s.headline, s.message)
    yield 2.0
    shot("instant")
    times = []
    for k in range(8):
        begun, old = time.perf_counter(), s.headline
        s.hour = 13.6 + 0.1 * (k + 1)
        while s.headline == old:
            yield 0.005
        times.append(time.perf_counter() - begun)
        yield 0.5
    print("slider to coloured mesh, s:", " ".join(f"{t:.3f}" for t in times))
    s.rays = True
    while (
        waiting("instant")
        or waiting("contributors")
        or not any(o.name.startswith("Rays") for o in bpy.data.objects)
    ):
        yield 0.1
    yield 2.0
    shot("rays")
    print("rays:", len(bpy.data.objects["Rays to the spot"].data.edges))
    print("objects:", sorted(o.name for o in bpy.data.objects if o.get("causticload_result")))
    s.rays = False
    yield 2.0
    bpy.ops.causticload.year()
    while not (waiting("year")):
        yield 0.1
    yield 3.0
    shot("year_running")
    begun = time.perf_counter()
    while waiting("year"):
        yield 0.2
    print(f"year: {time.perf_counter() - begun:.0f} s, {s.headline} {s.message}")
    yield 2.0
    shot("year")
    if s.rows:
        bpy.ops.causticload.pick_episode()
        while waiting("moment") or waiting("contributors"):
            yield 0.1
        yield 2.0
        shot("moment")
        print("moment:", s.headline)
        bpy.ops.causticload.select_panels(share=0.5)
        yield 1.0
        shot("panels")
    users = sorted(o.name for o in bpy.data.objects if not o.get("causticload_result"))
    bpy.ops.ed.undo()
    yield 1.0
    kept = sorted(o.name for o in bpy.data.objects if not o.get("causticload_result"))
    print("the user's objects after undo are the same:", users == kept, len(kept))
    bpy.ops.wm.quit_blender()


WALK = steps()


def step():
    try:
        return next(WALK)
    except StopIteration:
        return None
    except BaseException:
        traceback.print_exc()
        os._exit(3)


bpy.app.timers.register(step, first_interval=1.0, persistent=True)
