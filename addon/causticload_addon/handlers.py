"""Follows the user: a moved time asks for an instant, an edited model for a new scene.

What the user drags is never queued: one question is in flight, and the newest waits for it.
"""

import time

import bpy
from bpy.app.handlers import persistent

from . import root, session

REST_S = 0.3  # an edit of the model is taken up once the model rests this long

_want = {"kind": None, "scene": "", "time": 0.0}
loaded = {}  # scene name -> (answer of load, its arrays)


def want(kind, scene):
    """Note that a scene has changed, if its results are shown and followed."""
    if scene is None or scene.name not in loaded or not scene.causticload.live:
        return
    if not (_want["kind"] == "load" and kind == "instant"):
        _want["kind"] = kind
    _want.update(scene=scene.name, time=time.monotonic())


def pending():
    """Ask what is wanted, when its time has come."""
    kind, scene = _want["kind"], bpy.data.scenes.get(_want["scene"])
    if kind is None:
        return
    if scene is None:
        _want["kind"] = None
        return
    if session.running("instant") or session.running("load"):
        return
    if kind == "load" and time.monotonic() - _want["time"] < REST_S:
        return
    if bpy.context.scene != scene:
        return
    _want["kind"] = None
    from . import asking

    if kind == "load":
        asking.load(scene, asking.instant)
    else:
        asking.instant(scene)


def forget():
    """Results of another file are not this one's."""
    loaded.clear()
    _want["kind"] = None


@persistent
def on_load(*args):
    session.another_file()
    forget()
    number = session.running("year")
    if number is not None:
        session.cancel(number)


@persistent
def on_frame(*args):
    scene = args[0] if args and args[0] is not None else bpy.context.scene
    animation = scene.animation_data
    if animation is not None and animation.action is not None:
        want("instant", scene)


@persistent
def on_change(*args):
    if not loaded:
        return
    scene = args[0] if args and args[0] is not None else bpy.context.scene
    graph = args[1] if len(args) > 1 and args[1] is not None else None
    for update in graph.updates if graph is not None else ():
        ob = update.id
        if not isinstance(ob, bpy.types.Object) or ob.type != "MESH":
            continue
        if (update.is_updated_geometry or update.is_updated_transform) and not ob.get(root.TAG):
            want("load", scene)
            return


LISTS = (
    ("load_post", on_load),
    ("frame_change_post", on_frame),
    ("depsgraph_update_post", on_change),
)


def register():
    for name, function in LISTS:
        handlers = getattr(bpy.app.handlers, name)
        if function not in handlers:
            handlers.append(function)


def unregister():
    for name, function in LISTS:
        handlers = getattr(bpy.app.handlers, name)
        if function in handlers:
            handlers.remove(function)
    forget()
