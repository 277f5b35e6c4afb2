"""Time from a moved time slider to the coloured mesh, on sample (a), without a window.

    python tests/benchmarks/bench_slider.py

Counts everything but the redraw: request, light, colours, arrays by file, attributes set.
Needs the ``bpy`` package. Must be under 0.5 s; 0.2 s is reached for.
"""

import os
import statistics
import sys
import time
from pathlib import Path

import bpy

ROOT = Path(__file__).resolve().parents[2]
sys.path.insert(0, str(ROOT / "addon"))
import addon_utils  # noqa: E402

KINDS = {"Plaza": ("walkway", 0.25), "Street": ("roadway", 0.5), "Canopy": ("roof", 0.25)}


def main():
    bpy.ops.wm.read_factory_settings(use_empty=True)
    bpy.ops.wm.obj_import(
        filepath=str(ROOT / "sample_meshes" / "tower.obj"), forward_axis="Y", up_axis="Z"
    )
    addon_utils.enable("causticload_addon", default_set=True)
    bpy.context.preferences.addons["causticload_addon"].preferences.interpreter = sys.executable
    from causticload_addon import handlers, session

    for ob in bpy.data.objects:
        g = ob.causticload
        if ob.name.startswith("Glazing"):
            g.roles, g.form, g.finish = {"reflector"}, "smooth", "solar-control double glass"
        elif ob.name in KINDS or ob.name in {f"Neighbour 0{k}" for k in range(3, 9)}:
            g.roles = {"receiver"}
            g.kind, g.spacing = KINDS.get(ob.name, ("facade", 0.5))
    s = bpy.context.scene.causticload
    s.latitude, s.longitude, s.timezone = 51.62, -1.94, "Europe/London"
    s.month, s.day, s.hour = 3, 21, 11.0
    bpy.ops.causticload.instant(wait=True)
    seconds = []
    for k in range(20):
        old, begun = s.headline, time.perf_counter()
        s.hour = 11.0 + 0.1 * (k + 1)
        while s.headline == old:
            handlers.pending()
            session.drain(0.005)
        seconds.append(time.perf_counter() - begun)
    points = sum(r["points"] for r in handlers.loaded[bpy.context.scene.name][0]["receivers"])
    print(
        f"bpy {bpy.app.version_string}, {points:,} receiver points, 20 moves: "
        f"median {statistics.median(seconds):.3f} s, worst {max(seconds):.3f} s, "
        f"first {seconds[0]:.3f} s"
    )
    session.stop()
    sys.stdout.flush()
    os._exit(0)  # some builds of bpy crash or hang at exit


main()
