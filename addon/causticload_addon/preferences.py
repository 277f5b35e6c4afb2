"""Where the engine is, and whether it answers."""

import json
from pathlib import Path

import bpy

from . import classes, root, session


def interpreter():
    """Python of the engine: the preference, else what the installer wrote beside this file."""
    prefs = get()
    if prefs is not None and prefs.interpreter:
        return bpy.path.abspath(prefs.interpreter)
    try:
        path = Path(__file__).with_name("engine.json")
        return str(json.loads(path.read_text(encoding="utf-8"))["python"])
    except (OSError, ValueError, KeyError, TypeError):
        return ""


def get():
    """These preferences; None where the add-on was enabled without being saved."""
    addon = bpy.context.preferences.addons.get(root.PACKAGE)
    return addon.preferences if addon else None


class CausticloadPreferences(bpy.types.AddonPreferences):
    bl_idname = root.PACKAGE

    interpreter: bpy.props.StringProperty(
        name="Engine's Python",
        description="Python program in whose environment causticload is installed",
        subtype="FILE_PATH",
    )

    def draw(self, context):
        column = self.layout.column()
        column.prop(self, "interpreter")
        row = column.row()
        row.operator("causticload.test_engine")
        row.label(text=session.state_text())


CLASSES = (CausticloadPreferences,)


def register():
    classes.register(CLASSES)


def unregister():
    classes.unregister(CLASSES)
