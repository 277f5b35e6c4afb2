# ruff: noqa: RUF012 - Blender reads these class attributes
"""Everything the user can do, each with its Python path ``bpy.ops.causticload.*``."""

import time
from pathlib import Path

import bpy

from . import asking, classes, client, handlers, results, root, session, units, variants


class Asks:
    """Shared: start what is asked, wait for it if a script wants that, report what goes wrong."""

    wait: bpy.props.BoolProperty(
        name="Wait", description="Return only when the answer is drawn", options={"SKIP_SAVE"}
    )

    def execute(self, context):
        try:
            self.begin(context)
            if self.wait:
                self.finish(context.scene)
        except client.WorkerLostError as error:
            self.report({"ERROR"}, str(error))
            return {"CANCELLED"}
        return {"FINISHED"}

    def finish(self, scene):
        until = time.monotonic() + 3600.0
        while session.jobs() and time.monotonic() < until:
            session.drain(0.05)
            handlers.pending()
        message = scene.causticload.message
        if message:
            raise client.WorkerLostError(message)


class Test(Asks, bpy.types.Operator):
    """Start the engine and say which version answers"""

    bl_idname = "causticload.test_engine"
    bl_label = "Test the engine"

    def begin(self, context):
        session.start()
        session.folder()
        self.report({"INFO"}, session.state_text())


class Guess(Asks, bpy.types.Operator):
    """Give roles to visible objects that have none, by their names"""

    bl_idname = "causticload.guess_roles"
    bl_label = "Guess roles"
    bl_options = {"REGISTER", "UNDO"}

    def begin(self, context):
        session.start()
        targets = [
            ob
            for ob in context.visible_objects
            if ob.type == "MESH"
            and not ob.get(root.TAG)
            and not ob.causticload.roles
            and not any(c.causticload.roles for c in ob.users_collection)
        ]
        names = [ob.name for ob in targets]

        def done(job, answer):
            for name, rule in zip(names, answer["rules"], strict=True):
                ob = bpy.data.objects.get(name)
                if ob is None:
                    continue
                group = ob.causticload
                group.roles = set(rule["role"])
                group.finish, group.kind = rule.get("finish", ""), rule.get("kind", "")
                if "reflector" in rule["role"] and any(p.use_smooth for p in ob.data.polygons):
                    group.form = "smooth"
            results.push("Sunlight: guess roles")

        session.ask("guess", context.scene, done, names=names)


class Instant(Asks, bpy.types.Operator):
    """Colour the receivers for the time that is set"""

    bl_idname = "causticload.instant"
    bl_label = "Instant"

    def begin(self, context):
        scene = context.scene
        scene.causticload.message = ""
        asking.load(scene, asking.instant)


class Year(Asks, bpy.types.Operator):
    """Screen the whole year in the background"""

    bl_idname = "causticload.year"
    bl_label = "Year"

    folder: bpy.props.StringProperty(
        name="Folder",
        description="Folder for the results, which the memo needs",
        subtype="DIR_PATH",
    )

    def begin(self, context):
        if session.running("year") is not None:
            raise client.WorkerLostError("a year is being screened already")
        scene = context.scene
        scene.causticload.message = ""
        folder = bpy.path.abspath(self.folder) if self.folder else ""
        asking.load(scene, lambda now: asking.year(now, folder))


class Cancel(bpy.types.Operator):
    """Stop the year that is being screened"""

    bl_idname = "causticload.cancel"
    bl_label = "Cancel"

    @classmethod
    def poll(cls, context):
        return session.running("year") is not None

    def execute(self, context):
        session.cancel(session.running("year"))
        return {"FINISHED"}


class PickEpisode(Asks, bpy.types.Operator):
    """Go to the moment of a finding and show the panels behind it"""

    bl_idname = "causticload.pick_episode"
    bl_label = "Go to the moment"

    episode: bpy.props.IntProperty(
        name="Episode", description="Number of the episode; 0 takes the line that is chosen"
    )

    def begin(self, context):
        s = context.scene.causticload
        number = self.episode
        if not number:
            if not 0 <= s.row < len(s.rows):
                raise client.WorkerLostError("no finding is chosen")
            number = s.rows[s.row].episode
        asking.moment(context.scene, number)


class ShowYear(Asks, bpy.types.Operator):
    """Colour the receivers by the year again"""

    bl_idname = "causticload.show_year"
    bl_label = "Show the year"

    criterion: bpy.props.StringProperty(name="Limit", description="Whose hours; all if empty")

    def begin(self, context):
        s = context.scene.causticload
        session.ask(
            "paint", context.scene, asking.show_painted, show=s.shown_year, criterion=self.criterion
        )


class ShowPanels(Asks, bpy.types.Operator):
    """Colour the facade by what each panel adds to the hottest spot"""

    bl_idname = "causticload.show_panels"
    bl_label = "Show panels"

    def begin(self, context):
        session.ask("contributors", context.scene, asking.show_contributors)


class SelectPanels(bpy.types.Operator):
    """Select the faces of the result facade that add at least a share of the strongest"""

    bl_idname = "causticload.select_panels"
    bl_label = "Select panels"
    bl_options = {"REGISTER", "UNDO"}

    share: bpy.props.FloatProperty(
        name="Share",
        description="Least contribution over the strongest",
        default=0.1,
        min=0.0,
        max=1.0,
    )

    def execute(self, context):
        import numpy as np

        ob = results.find(context.scene, "facade")
        if ob is None:
            self.report({"ERROR"}, "show the panels first")
            return {"CANCELLED"}
        values = np.empty(len(ob.data.polygons), np.float32)
        ob.data.attributes["contribution"].data.foreach_get("value", values)
        chosen = (values > 0.0) & (values >= self.share * values.max(initial=0.0))
        ob.data.polygons.foreach_set("select", chosen)
        ob.data.update()
        for other in context.selected_objects:
            other.select_set(False)
        ob.select_set(True)
        context.view_layer.objects.active = ob
        self.report({"INFO"}, f"{int(chosen.sum())} faces are selected")
        return {"FINISHED"}


class Memo(Asks, bpy.types.Operator):
    """Write the memo of the last year and open it"""

    bl_idname = "causticload.memo"
    bl_label = "Memo"

    def begin(self, context):
        def done(job, answer):
            if answer["files"] and not bpy.app.background:
                bpy.ops.wm.path_open(filepath=answer["files"][0])

        folder = context.scene.causticload.folder
        session.ask("memo", context.scene, done, **({"folder": folder} if folder else {}))


class SaveStudy(Asks, bpy.types.Operator):
    """Write a study file with its meshes for the command line"""

    bl_idname = "causticload.save_study"
    bl_label = "Save as a study"

    filepath: bpy.props.StringProperty(subtype="FILE_PATH")
    check_existing: bpy.props.BoolProperty(default=True, options={"HIDDEN"})
    overwrite: bpy.props.BoolProperty(
        name="Replace", description="Replace a study that is there", default=False
    )

    def invoke(self, context, event):
        self.filepath = self.filepath or "study.toml"
        context.window_manager.fileselect_add(self)
        return {"RUNNING_MODAL"}

    def begin(self, context):
        scene = context.scene
        path = str(Path(bpy.path.abspath(self.filepath)).with_suffix(".toml"))
        overwrite = self.overwrite

        def then(now):
            session.ask("save_study", now, lambda job, answer: None, path=path, overwrite=overwrite)

        scene.causticload.message = ""
        asking.load(scene, then)


class KeepVariant(bpy.types.Operator):
    """Keep a copy of the results beside the next ones"""

    bl_idname = "causticload.keep_variant"
    bl_label = "Keep as a variant"
    bl_options = {"REGISTER", "UNDO"}

    name: bpy.props.StringProperty(
        name="Name", description="Name of the variant", default="Variant"
    )

    def execute(self, context):
        count = variants.keep(context.scene, self.name)
        if not count:
            self.report({"ERROR"}, "there are no results to keep")
            return {"CANCELLED"}
        return {"FINISHED"}


class CompareVariants(Asks, bpy.types.Operator):
    """Colour what the results now have more or less than a variant"""

    bl_idname = "causticload.compare_variants"
    bl_label = "Compare with a variant"

    name: bpy.props.StringProperty(
        name="Name", description="Name of the variant", default="Variant"
    )

    def begin(self, context):
        session.start()
        variants.compare(context.scene, self.name, session.folder())


class ViewResults(bpy.types.Operator):
    """Set this 3D view to flat result colours, and its near clip so that they do not flicker"""

    bl_idname = "causticload.view_results"
    bl_label = "View results"

    def execute(self, context):
        metres = units.metres_per_unit(context.scene)
        for area in context.screen.areas:
            if area.type == "VIEW_3D":
                space = area.spaces.active
                space.shading.type, space.shading.light = "SOLID", "FLAT"
                space.shading.color_type = "VERTEX"
                # Results lie 5 mm off their surface: a nearer clip cannot tell the two apart.
                space.clip_start = max(space.clip_start, 1.0 / metres)
        return {"FINISHED"}


class Clear(bpy.types.Operator):
    """Take the results away; variants stay"""

    bl_idname = "causticload.clear"
    bl_label = "Clear results"
    bl_options = {"REGISTER", "UNDO"}

    def execute(self, context):
        results.remove(context.scene)
        s = context.scene.causticload
        s.headline = s.message = s.cautions = s.scale = ""
        s.rows.clear()
        return {"FINISHED"}


CLASSES = (
    Test,
    Guess,
    Instant,
    Year,
    Cancel,
    PickEpisode,
    ShowYear,
    ShowPanels,
    SelectPanels,
    Memo,
    SaveStudy,
    KeepVariant,
    CompareVariants,
    ViewResults,
    Clear,
)


def register():
    classes.register(CLASSES)


def unregister():
    classes.unregister(CLASSES)
