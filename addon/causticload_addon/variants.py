"""Variants: copies of results that stay, and how the results now differ from them."""

from pathlib import Path

import bpy
import numpy as np

from . import client, results, root, session

PREFIX = "variant: "


def keep(scene, name):
    """Copy the receivers' results into a collection of their own; returns how many."""
    tag = PREFIX + name
    made = results.collection(scene, tag)
    for ob in list(made.objects):
        bpy.data.objects.remove(ob)
    count = 0
    for ob in results.collection(scene).objects:
        if str(ob.get(root.TAG, "")).startswith("receiver:"):
            copy = ob.copy()
            copy.data = ob.data.copy()
            copy.name = f"{name}: {ob.name}"
            copy.hide_set(False)
            made.objects.link(copy)
            count += 1
    return count


def _values(ob):
    name = "irradiance" if ob.data.attributes.get("irradiance") else "peak irradiance"
    values = np.empty(len(ob.data.polygons), np.float32)
    ob.data.attributes[name].data.foreach_get("value", values)
    return values


def compare(scene, name, folder):
    """Colour the results by their change against a variant; receivers must be the same cells."""
    kept = next((c for c in scene.collection.children if c.get(root.TAG) == PREFIX + name), None)
    if kept is None:
        raise client.WorkerLostError(f"there is no variant {name!r}")
    before = {ob[root.TAG]: ob for ob in kept.objects}
    pairs = []
    for ob in results.collection(scene).objects:
        old = before.get(ob.get(root.TAG))
        if old is not None:
            if len(old.data.polygons) != len(ob.data.polygons):
                raise client.WorkerLostError(f"{ob.name} has other cells than in {name!r}")
            pairs.append((ob, old))
    if not pairs:
        raise client.WorkerLostError("the variant and the results share no receiver")
    path = str(Path(folder) / "compare.npz")
    np.savez(
        path,
        before=np.concatenate([_values(old) for _, old in pairs]),
        after=np.concatenate([_values(ob) for ob, _ in pairs]),
    )
    names = [ob.name for ob, _ in pairs]

    def done(job, answer):
        now = job.scene_now()
        if now is None:
            return
        arrays, start = results.read_arrays(answer["arrays"]), 0
        for each in names:
            ob = bpy.data.objects.get(each)
            if ob is None:
                return
            part = slice(start, start + len(ob.data.polygons))
            start = part.stop
            results.set_values(ob.data, "change", arrays["change"][part])
            results.set_colours(ob.data, arrays["colours"][part], 4)
        results.describe(
            now,
            {**answer, "cautions": now.causticload.cautions.split("\n")},
            f"Change against {name}",
        )
        results.push("Sunlight: compare")

    session.ask("change", scene, done, arrays=path, before="before", after="after")
