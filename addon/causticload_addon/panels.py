# ruff: noqa: N801, RUF012 - Blender wants names and attributes of this form
"""The tab in the 3D view's sidebar."""

import textwrap

import bpy

from . import classes, root, session


def wrapped(layout, text):
    """Text over as many lines as the sidebar's width asks for: nothing may be cut short."""
    scaling = bpy.context.preferences.system.ui_scale or 1.0
    region = bpy.context.region
    width = max(18, int((region.width / scaling - 44.0) / 6.6)) if region else 40
    column = layout.column(align=True)
    for paragraph in text.split("\n"):
        for line in textwrap.wrap(paragraph, width):
            column.label(text=line)


class Base:
    bl_space_type = "VIEW_3D"
    bl_region_type = "UI"
    bl_category = root.TAB


class CAUSTICLOAD_PT_now(Base, bpy.types.Panel):
    bl_label = "Sun and loads"

    def draw(self, context):
        s, layout = context.scene.causticload, self.layout
        column = layout.column(align=True)
        row = column.row(align=True)
        row.prop(s, "month")
        row.prop(s, "day")
        column.prop(s, "hour", slider=True)
        layout.prop(s, "shown")
        row = layout.row()
        row.prop(s, "live")
        row.prop(s, "rays")
        row = layout.row(align=True)
        row.operator("causticload.instant")
        row.operator("causticload.view_results")
        if s.message:
            box = layout.box()
            box.alert = True
            wrapped(box, s.message)
        if s.headline:
            wrapped(layout.box(), s.headline)
        row = layout.row(align=True)
        row.operator("causticload.show_panels")
        row.operator("causticload.select_panels")
        if s.cautions:
            wrapped(layout.box(), s.cautions.split("\n")[0])


class CAUSTICLOAD_UL_rows(bpy.types.UIList):
    def draw_item(self, context, layout, data, item, icon, active, prop, index=0, flag=0):
        layout.label(text=item.text)


class CAUSTICLOAD_PT_year(Base, bpy.types.Panel):
    bl_label = "Year"

    def draw(self, context):
        s, layout = context.scene.causticload, self.layout
        number = session.running("year")
        if number is not None:
            layout.label(text=session.jobs()[number].message or "Working")
            layout.operator("causticload.cancel")
        else:
            row = layout.row(align=True)
            row.prop(s, "step_minutes")
            row.prop(s, "day_stride")
            layout.operator("causticload.year")
        if s.rows:
            layout.template_list("CAUSTICLOAD_UL_rows", "", s, "rows", s, "row", rows=5)
            if 0 <= s.row < len(s.rows):
                row = s.rows[s.row]
                wrapped(layout.box(), f"{row.text}\n{row.found}")
            layout.operator("causticload.pick_episode")
            layout.prop(s, "shown_year")
            layout.operator("causticload.show_year")
        layout.operator("causticload.memo")


class CAUSTICLOAD_PT_cautions(Base, bpy.types.Panel):
    bl_label = "Cautions"

    @classmethod
    def poll(cls, context):
        return bool(context.scene.causticload.cautions)

    def draw(self, context):
        wrapped(self.layout, context.scene.causticload.cautions)


class CAUSTICLOAD_PT_roles(Base, bpy.types.Panel):
    bl_label = "Roles and finishes"

    def draw(self, context):
        layout = self.layout
        layout.operator("causticload.guess_roles")
        for holder in (context.object, context.collection):
            if holder is None or holder.get(root.TAG):
                continue
            group, box = holder.causticload, layout.box()
            box.label(text=holder.name)
            box.row().prop(group, "roles")
            if "reflector" in group.roles:
                box.prop(group, "form")
                box.prop(group, "finish")
            if "receiver" in group.roles:
                box.prop(group, "spacing")
                box.prop(group, "kind")


class CAUSTICLOAD_PT_site(Base, bpy.types.Panel):
    bl_label = "Site and limits"

    def draw(self, context):
        s, layout = context.scene.causticload, self.layout
        for name in (
            "latitude",
            "longitude",
            "elevation",
            "timezone",
            "north",
            "year",
            "lay_ground",
        ):
            layout.prop(s, name)
        for limit in s.limits:
            box = layout.box()
            for name in ("name", "applies_to", "quantity", "limit", "minutes"):
                box.prop(limit, name)


class CAUSTICLOAD_PT_keep(Base, bpy.types.Panel):
    bl_label = "Variants and files"
    bl_options = {"DEFAULT_CLOSED"}

    def draw(self, context):
        s, layout = context.scene.causticload, self.layout
        layout.operator("causticload.keep_variant")
        layout.operator("causticload.compare_variants")
        layout.operator("causticload.save_study")
        layout.operator("causticload.clear")
        layout.label(text=session.state_text())
        if s.assumed:
            wrapped(layout.box(), s.assumed)


CLASSES = (
    CAUSTICLOAD_UL_rows,
    CAUSTICLOAD_PT_now,
    CAUSTICLOAD_PT_year,
    CAUSTICLOAD_PT_cautions,
    CAUSTICLOAD_PT_roles,
    CAUSTICLOAD_PT_site,
    CAUSTICLOAD_PT_keep,
)


def register():
    classes.register(CLASSES)


def unregister():
    classes.unregister(CLASSES)
