"""Registering classes so that a second add-on of the same name cannot make leaving fail."""

import contextlib

import bpy


def register(classes):
    for cls in classes:
        bpy.utils.register_class(cls)


def unregister(classes):
    for cls in reversed(classes):
        with contextlib.suppress(RuntimeError):  # taken out already, by a twin of this add-on
            bpy.utils.unregister_class(cls)
