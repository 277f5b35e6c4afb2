"""The scale in the viewport: a pure layout, and a handler that draws it."""

import json

import bpy

_handle = []


def layout(width, height, scale):
    """Rectangles, texts and lines of the scale for a region of ``width`` by ``height`` pixels.

    Returns ``{"bars": [(x0, y0, x1, y1, rgb)], "texts": [(x, y, size, text)],
    "lines": [(x0, y0, x1, y1)]}``; nothing where there is no room.
    """
    empty = {"bars": [], "texts": [], "lines": []}
    if not scale or width < 160 or height < 180:
        return empty
    x0, y0, bar, top = 24.0, 40.0, 18.0, min(height - 60.0, 300.0)
    step = (top - y0) / len(scale["colours"])
    bars = [
        (x0, y0 + k * step, x0 + bar, y0 + (k + 1) * step, tuple(c / 255.0 for c in rgb))
        for k, rgb in enumerate(scale["colours"])
    ]
    title = scale["label"] + (f" [{scale['unit']}]" if scale["unit"] else "")
    texts = [(x0, top + 14.0, 13, title)]
    low, high = scale["low"], scale["high"]
    lines, taken = [], []
    for mark in scale.get("marks", ()):
        y = y0 + (top - y0) * (mark["value"] - low) / (high - low)
        lines.append((x0 - 6.0, y, x0 + bar + 60.0, y))
        what = " in total" if mark["quantity"].startswith("total") else ""
        words = f"limit: {mark['name']} {mark['value']:,.4g}{what}"
        texts.append((x0 + bar + 64.0, y - 4.0, 11, words))
        taken.append(y)
    for k in range(5):
        y = y0 + (top - y0) * k / 4.0
        if all(abs(y - other) > 9.0 for other in taken):  # a line would strike it through
            value = low + (high - low) * k / 4.0
            texts.append((x0 + bar + 8.0, y - 4.0, 11, f"{value:,.4g}"))
    # A dark ground first: the model behind may be as bright as the words.
    ground = (x0 - 12.0, y0 - 14.0, x0 + bar + 290.0, top + 34.0, (0.12, 0.12, 0.12))
    return {"bars": [ground, *bars], "texts": texts, "lines": lines}


def paint(plan, scaling=1.0):
    """Draw a layout into the current region."""
    import blf
    import gpu
    from gpu_extras.batch import batch_for_shader

    shader = gpu.shader.from_builtin("SMOOTH_COLOR")
    points, colours = [], []
    for x0, y0, x1, y1, rgb in plan["bars"]:
        quad = [(x0, y0), (x1, y0), (x1, y1), (x0, y0), (x1, y1), (x0, y1)]
        points += [(scaling * x, scaling * y, 0.0) for x, y in quad]
        colours += [(*rgb, 1.0)] * 6
    for x0, y0, x1, y1 in plan["lines"]:
        quad = [(x0, y0), (x1, y0), (x1, y1 + 1.5), (x0, y0), (x1, y1 + 1.5), (x0, y0 + 1.5)]
        points += [(scaling * x, scaling * y, 0.0) for x, y in quad]
        colours += [(1.0, 1.0, 1.0, 1.0)] * 6
    if points:
        batch_for_shader(shader, "TRIS", {"pos": points, "color": colours}).draw(shader)
    for x, y, size, text in plan["texts"]:
        blf.size(0, size * scaling)
        blf.color(0, 1.0, 1.0, 1.0, 1.0)
        blf.position(0, scaling * x, scaling * y, 0.0)
        blf.draw(0, text)


def draw():
    """Called by Blender after the view; only reads."""
    context = bpy.context
    scale = context.scene.causticload.scale
    space = context.space_data
    if not scale or space is None or not space.overlay.show_overlays:
        return
    scaling = context.preferences.system.ui_scale or 1.0
    inset = sum(r.width for r in context.area.regions if r.type == "TOOLS")
    try:
        plan = layout(
            context.region.width / scaling, context.region.height / scaling, json.loads(scale)
        )
    except (ValueError, KeyError):
        return
    shift = inset / scaling
    plan = {
        "bars": [(a + shift, b, c + shift, d, e) for a, b, c, d, e in plan["bars"]],
        "lines": [(a + shift, b, c + shift, d) for a, b, c, d in plan["lines"]],
        "texts": [(x + shift, y, s, t) for x, y, s, t in plan["texts"]],
    }
    paint(plan, scaling)


def register():
    if not bpy.app.background:
        _handle.append(bpy.types.SpaceView3D.draw_handler_add(draw, (), "WINDOW", "POST_PIXEL"))


def unregister():
    while _handle:
        bpy.types.SpaceView3D.draw_handler_remove(_handle.pop(), "WINDOW")
