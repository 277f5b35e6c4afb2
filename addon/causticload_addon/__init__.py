"""Concentrated sunlight in the model: a thin client of the causticload worker.

This package reads the scene, asks the engine in a process of its own, and draws the answer. It
holds no physics and no limits.
"""

bl_info = {
    "name": "causticload",
    "author": "The causticload founders",
    "version": (0, 1, 0),
    "blender": (3, 4, 0),
    "location": "3D View > Sidebar > Sunlight",
    "description": "Find where curved glass and metal gather sunlight",
    "category": "Lighting",
}

from . import register_all  # noqa: E402 - bl_info is read without running the rest


def register():
    register_all.register()


def unregister():
    register_all.unregister()
