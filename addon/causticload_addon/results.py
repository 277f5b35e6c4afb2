"""Results as ordinary mesh objects in a collection of their own; the user's are never touched."""

import json

import bpy
import numpy as np

from . import root, units

COLOUR = "load colour"


def to_linear():
    """Linear values of the 256 display levels (IEC 61966-2-1)."""
    x = np.arange(256) / 255.0
    return np.where(x <= 0.04045, x / 12.92, ((x + 0.055) / 1.055) ** 2.4).astype(np.float32)


LINEAR = to_linear()


def read_arrays(path):
    with np.load(path, allow_pickle=False) as file:
        return {key: file[key] for key in file.files}


def collection(scene, name=root.COLLECTION):
    """The scene's own collection of results, made if it is wanting."""
    for child in scene.collection.children:
        if child.get(root.TAG) == name:
            return child
    made = bpy.data.collections.new(name)
    made[root.TAG] = name
    scene.collection.children.link(made)
    return made


def find(scene, what):
    """The result object of a sort in a scene, or None."""
    for child in scene.collection.children:
        if child.get(root.TAG) == root.COLLECTION:
            for ob in child.objects:
                if ob.get(root.TAG) == what:
                    return ob
    return None


def remove(scene, what=None):
    """Take result objects away: of one sort, or all; variants that were kept stay."""
    for child in list(scene.collection.children):
        if child.get(root.TAG) != root.COLLECTION:
            continue
        for ob in list(child.objects):
            tag = ob.get(root.TAG)
            if tag and (what is None or tag == what or tag.startswith(f"{what}:")):
                mesh = ob.data
                bpy.data.objects.remove(ob)
                if mesh is not None and mesh.users == 0:
                    bpy.data.meshes.remove(mesh)


def build(scene, what, name, vertices, corners, key):
    """A mesh object of polygons that all have the same number of corners; replaces its like."""
    remove(scene, what)
    n, size = corners.shape
    mesh = bpy.data.meshes.new(name)
    mesh.vertices.add(len(vertices))
    mesh.vertices.foreach_set(
        "co", (vertices / units.metres_per_unit(scene)).astype(np.float32).ravel()
    )
    mesh.loops.add(n * size)
    mesh.loops.foreach_set("vertex_index", corners.astype(np.uint32).ravel())
    mesh.polygons.add(n)
    mesh.polygons.foreach_set("loop_start", np.arange(0, n * size, size, dtype=np.uint32))
    mesh.polygons.foreach_set("loop_total", np.full(n, size, np.uint32))
    mesh.polygons.foreach_set("use_smooth", np.zeros(n, bool))
    mesh.update(calc_edges=True)
    ob = bpy.data.objects.new(name, mesh)
    ob[root.TAG], ob["causticload_key"] = what, key
    ob.hide_render = False
    collection(scene).objects.link(ob)
    return ob


def set_values(mesh, name, values, kind="FLOAT"):
    """A named attribute, one value a face."""
    attribute = mesh.attributes.get(name)
    if attribute is None:
        mesh.attributes.new(name, kind, "FACE")
        attribute = mesh.attributes[name]  # adding one can invalidate the reference
    dtype = np.float32 if kind == "FLOAT" else np.int32
    attribute.data.foreach_set("value", np.ascontiguousarray(values, dtype))


def set_colours(mesh, colours, size):
    """Display colours (n, 4) uint8, one a face, on all its corners."""
    if mesh.color_attributes.get(COLOUR) is None:
        mesh.color_attributes.new(name=COLOUR, type="FLOAT_COLOR", domain="CORNER")
    linear = LINEAR[colours]
    linear[:, 3] = colours[:, 3] / np.float32(255.0)
    layer = mesh.color_attributes[COLOUR]
    layer.data.foreach_set("color", np.repeat(linear, size, axis=0).ravel())
    mesh.color_attributes.active_color = layer
    mesh.color_attributes.render_color_index = mesh.color_attributes.find(COLOUR)
    mesh.update()


def material():
    """Shows the colour attribute in Material Preview and renders."""
    name = "causticload colour"
    found = bpy.data.materials.get(name)
    if found is not None:
        return found
    made = bpy.data.materials.new(name)
    if made.node_tree is None:
        made.use_nodes = True
    tree = made.node_tree
    tree.nodes.clear()
    colour = tree.nodes.new("ShaderNodeAttribute")
    colour.attribute_name = COLOUR
    light = tree.nodes.new("ShaderNodeEmission")
    out = tree.nodes.new("ShaderNodeOutputMaterial")
    tree.links.new(colour.outputs["Color"], light.inputs["Color"])
    tree.links.new(light.outputs[0], out.inputs["Surface"])
    return made


def receivers(scene, loaded, geometry, arrays, show, values):
    """Receivers coloured by an answer; geometry is built only when the scene is another one.

    ``values`` maps an attribute's name to the key of its array and its type.
    """
    for record in loaded["receivers"]:
        prefix, what = record["prefix"], f"receiver:{record['name']}"
        ob = find(scene, what)
        if (
            ob is None
            or ob.get("causticload_key") != loaded["key"]
            or len(ob.data.polygons) != record["points"]
        ):
            ob = build(
                scene,
                what,
                f"Load on {record['object']}",
                geometry[f"{prefix}/vertices"],
                geometry[f"{prefix}/quads"],
                loaded["key"],
            )
            ob.data.materials.append(material())
        for name, (key, kind) in values.items():
            if f"{prefix}/{key}" in arrays:
                set_values(ob.data, name, arrays[f"{prefix}/{key}"], kind)
        ob["causticload_shown"] = show
        set_colours(ob.data, arrays[f"{prefix}/colours"], 4)
    marks(scene, arrays["marks"], loaded["key"])


def marks(scene, quads, key):
    """Ribbons and hatching over what is above a limit."""
    if not len(quads):
        remove(scene, "marks")
        return
    corners = np.arange(4 * len(quads)).reshape(-1, 4)
    ob = build(scene, "marks", "Over a limit", quads.reshape(-1, 3), corners, key)
    set_colours(ob.data, np.tile(np.array([20, 20, 20, 255], np.uint8), (len(quads), 1)), 4)
    ob.data.materials.append(material())


def facade(scene, loaded, geometry, arrays):
    """The facade coloured by contribution."""
    triangles = geometry["facade/triangles"]
    ob = find(scene, "facade")
    if ob is None or ob.get("causticload_key") != loaded["key"]:
        corners = np.arange(3 * len(triangles)).reshape(-1, 3)
        ob = build(
            scene,
            "facade",
            "Contribution of panels",
            triangles.reshape(-1, 3),
            corners,
            loaded["key"],
        )
        ob.data.materials.append(material())
        set_values(ob.data, "panel", geometry["facade/panel"], "INT")
    set_values(ob.data, "contribution", arrays["facade/contribution"])
    set_colours(ob.data, arrays["facade/colours"], 3)


def rays(scene, lines, key):
    """The sun's rays by way of the panels to the spot, as edges."""
    remove(scene, "rays")
    if not len(lines):
        return
    mesh = bpy.data.meshes.new("Rays")
    mesh.vertices.add(3 * len(lines))
    mesh.vertices.foreach_set(
        "co", (lines / units.metres_per_unit(scene)).astype(np.float32).ravel()
    )
    first = 3 * np.arange(len(lines), dtype=np.uint32)[:, None]
    edges = np.concatenate([first + [0, 1], first + [1, 2]]).astype(np.uint32)
    mesh.edges.add(len(edges))
    mesh.edges.foreach_set("vertices", edges.ravel())
    mesh.update(calc_edges_loose=True)  # or 3.4 does not draw them
    ob = bpy.data.objects.new("Rays to the spot", mesh)
    ob.display_type, ob.show_in_front = "WIRE", True
    ob.color = (0.95, 0.75, 0.2, 1.0)
    ob[root.TAG], ob["causticload_key"] = "rays", key
    collection(scene).objects.link(ob)


def describe(scene, answer, headline):
    """What the panel and the legend show."""
    s = scene.causticload
    s.headline, s.message = headline, ""
    s.cautions = "\n".join(answer.get("cautions", ()))
    if "assumed" in answer:
        s.assumed = "\n".join(answer["assumed"])
    s.scale = json.dumps(answer["scale"])


def push(text):
    """One step of undo; without it, what a timer made goes with the user's next undo."""
    if not bpy.app.background:
        bpy.ops.ed.undo_push(message=text)
