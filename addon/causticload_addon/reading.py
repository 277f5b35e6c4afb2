"""Reads the evaluated scene: every visible mesh and instance, in metres, with its role."""

from pathlib import Path

import numpy as np

from . import root, units

ROLE_ORDER = ("reflector", "receiver", "obstruction", "ignore")


def rule_of(original, parent):
    """The study rule of an object: its own, its collections', its instancer's, or none."""
    holders = [original, *original.users_collection]
    if parent is not None:
        holders += [parent, *parent.users_collection]
    for holder in holders:
        group = holder.causticload
        if group.roles:
            return _rule(group), holder.name
    return {"role": "obstruction"}, ""


def _rule(group):
    rule = {"role": [r for r in ROLE_ORDER if r in group.roles]}
    if "reflector" in group.roles:
        rule["form"] = group.form
        if group.finish:
            rule["finish"] = group.finish
    if "receiver" in group.roles:
        if group.spacing > 0.0:
            rule["spacing"] = round(group.spacing, 6)  # stored as a short float
        if group.kind:
            rule["kind"] = group.kind
    return rule


def mesh_arrays(mesh):
    """Vertices (v, 3), triangles (t, 3) and, if the mesh has its own, normals (t, 3, 3)."""
    mesh.calc_loop_triangles()
    count = len(mesh.loop_triangles)
    co = np.empty(3 * len(mesh.vertices), np.float32)
    mesh.vertices.foreach_get("co", co)
    triangles = np.empty(3 * count, np.uint32)
    mesh.loop_triangles.foreach_get("vertices", triangles)
    normals = None
    # Normals that Blender averages itself are worse than those that the engine fits.
    if mesh.has_custom_normals:
        if hasattr(mesh, "calc_normals_split"):
            mesh.calc_normals_split()
            raw = np.empty(3 * len(mesh.loops), np.float32)
            mesh.loops.foreach_get("normal", raw)
        else:
            raw = np.empty(3 * len(mesh.loops), np.float32)
            mesh.corner_normals.foreach_get("vector", raw)
        loops = np.empty(3 * count, np.uint32)
        mesh.loop_triangles.foreach_get("loops", loops)
        normals = raw.reshape(-1, 3)[loops].reshape(-1, 3, 3)
    return co.reshape(-1, 3), triangles.reshape(-1, 3), normals


def placed(arrays, matrix, metres):
    """Arrays of a mesh after its transform, in metres; a mirror turns the winding back."""
    co, triangles, normals = arrays
    linear = matrix[:3, :3]
    vertices = (co.astype(np.float64) @ linear.T + matrix[:3, 3]) * metres
    mirrored = np.linalg.det(linear) < 0.0
    if normals is not None:
        normals = normals.astype(np.float64) @ np.linalg.pinv(linear)
        length = np.linalg.norm(normals, axis=-1, keepdims=True)
        normals = normals / np.where(length > 0.0, length, 1.0)
    if mirrored:
        triangles = triangles[:, ::-1]
        normals = None if normals is None else normals[:, ::-1]
    return vertices, triangles, normals


def read_scene(scene, depsgraph):
    """Objects of a scene as ``(name, vertices, triangles, normals, rule)``, instances merged."""
    metres = units.metres_per_unit(scene)
    meshes, parts, order = {}, {}, []
    for instance in depsgraph.object_instances:
        ob = instance.object
        original = ob.original
        if ob.type != "MESH" or original.get(root.TAG) or original.hide_render:
            continue
        parent = instance.parent.original if instance.is_instance and instance.parent else None
        rule, source = rule_of(original, parent)
        pointer = ob.data.as_pointer()
        if pointer not in meshes:
            meshes[pointer] = mesh_arrays(ob.to_mesh())
            ob.to_mesh_clear()
        if not len(meshes[pointer][1]):
            continue
        key = (original.name, source)
        if key not in parts:
            parts[key] = (rule, [])
            order.append(key)
        matrix = np.array(instance.matrix_world, dtype=np.float64)
        parts[key][1].append(placed(meshes[pointer], matrix, metres))
    return [(key[0], *_merged(parts[key][1]), parts[key][0]) for key in order]


def _merged(pieces):
    if len(pieces) == 1:
        return pieces[0]
    starts = np.cumsum([0, *(len(v) for v, _, _ in pieces[:-1])])
    triangles = [t + np.uint32(s) for (_, t, _), s in zip(pieces, starts, strict=True)]
    normals = None
    if all(n is not None for _, _, n in pieces):
        normals = np.concatenate([n for _, _, n in pieces])
    return np.concatenate([v for v, _, _ in pieces]), np.concatenate(triangles), normals


def study_tables(scene):
    """Tables of a study file from the scene's settings. Short floats lose their tails."""
    s = scene.causticload
    return {
        "title": scene.name,
        "site": {
            "latitude": round(s.latitude, 5),
            "longitude": round(s.longitude, 5),
            "elevation": round(s.elevation, 2),
            "timezone": s.timezone,
            "model_north": round(s.north, 3),
        },
        "year": {"year": s.year, "step_minutes": s.step_minutes, "day_stride": s.day_stride},
        "criterion": [
            {
                "name": limit.name,
                "applies_to": limit.applies_to.split(),
                "quantity": limit.quantity,
                "limit": round(limit.limit, 3),
                "minutes": round(limit.minutes, 3),
            }
            for limit in s.limits
        ],
    }


def export(scene, depsgraph, folder):
    """What the worker's ``load`` takes as its scene; arrays go into the worker's folder."""
    arrays, objects = {}, []
    for k, (name, vertices, triangles, normals, rule) in enumerate(read_scene(scene, depsgraph)):
        record = {"name": name, "vertices": f"v{k}", "triangles": f"t{k}", "rule": rule}
        arrays[f"v{k}"], arrays[f"t{k}"] = vertices, triangles
        if normals is not None:
            arrays[f"n{k}"], record["normals"] = normals, f"n{k}"
        objects.append(record)
    path = str(Path(folder) / "from-host.npz")
    np.savez(path, **arrays)
    return {"arrays": path, "objects": objects, "study": study_tables(scene)}


def local_time(scene):
    """The instant's local clock time as the worker takes it."""
    s = scene.causticload
    minutes = min(round(s.hour * 60.0), 24 * 60 - 1)
    return f"{s.year:04d}-{s.month:02d}-{s.day:02d}T{minutes // 60:02d}:{minutes % 60:02d}"
