"""Registers the parts in order, and takes them out in reverse, whatever has gone before."""

from . import handlers, legend, operators, panels, preferences, properties, session

PARTS = (preferences, properties, operators, panels, legend, handlers)


def register():
    for part in PARTS:
        part.register()


def unregister():
    session.stop()
    for part in reversed(PARTS):
        part.unregister()
