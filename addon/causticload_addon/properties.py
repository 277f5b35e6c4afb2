"""What the user sets: on the scene, on objects, on collections."""

import bpy

from . import classes, session

# Numbers are stored in files: never change one.
ROLES = [
    ("reflector", "Reflector", "Glass or metal that sends sunlight back", 1),
    ("receiver", "Receiver", "Ground, wall or roof where loads are wanted", 2),
    ("obstruction", "Obstruction", "Stands in the way of light", 4),
    ("ignore", "Ignore", "Is left out", 8),
]
FORMS = [
    ("flat", "Flat panes", "Every coplanar piece is one flat pane", 0),
    ("smooth", "Smooth", "The surface is curved and the mesh only follows it", 1),
]
SHOWN = [
    ("reflected", "Reflected load", "What arrives by reflection", 0),
    ("total", "Total load", "Reflected, direct and diffuse sunlight together", 1),
    ("images", "Images of the sun", "How many suns an eye there would see", 2),
]
SHOWN_YEAR = [
    ("peak", "Peak load", "Largest reflected load of the year", 0),
    ("hours", "Time over the limit", "Hours of the year over the chosen limit", 1),
    ("images", "Most images", "Most images of the sun at once", 2),
]


def _names(key):
    """Search the engine's words while a text is typed."""

    def search(self, context, edit_text):
        words = session.vocabulary() or {}
        found = [w["name"] if isinstance(w, dict) else w for w in words.get(key, [])]
        return [w for w in found if edit_text.casefold() in w.casefold()]

    return search


def _moved(self, context):
    from . import handlers

    handlers.want("instant", self.id_data)


def _changed(self, context):
    from . import handlers

    handlers.want("load", context.scene)


class CausticloadRole(bpy.types.PropertyGroup):
    """On an object or a collection."""

    roles: bpy.props.EnumProperty(
        name="Role",
        description="What it is to sunlight; several at once with Shift",
        items=ROLES,
        options={"ENUM_FLAG"},
        update=_changed,
    )
    form: bpy.props.EnumProperty(
        name="Form", description="Flat panes or a curved sheet", items=FORMS, update=_changed
    )
    finish: bpy.props.StringProperty(
        name="Finish",
        description="Name of a glass or metal of the engine",
        search=_names("finishes"),
        update=_changed,
    )
    spacing: bpy.props.FloatProperty(
        name="Spacing",
        description="Distance of sample points in metres; 0 lets the engine choose",
        min=0.0,
        soft_max=5.0,
        update=_changed,
    )
    kind: bpy.props.StringProperty(
        name="Kind",
        description="What a receiver is, for the limits that hold there",
        search=_names("kinds"),
        update=_changed,
    )


class CausticloadLimit(bpy.types.PropertyGroup):
    """A limit of the user's own."""

    name: bpy.props.StringProperty(name="Name", description="Name of the limit", default="limit")
    applies_to: bpy.props.StringProperty(
        name="Receivers", description="Receivers it holds for, with * for any", default="*"
    )
    quantity: bpy.props.EnumProperty(
        name="Quantity",
        description="What is bounded",
        items=[
            ("total irradiance", "Total load", "Reflected, direct and diffuse together", 0),
            ("reflected irradiance", "Reflected load", "Reflected light alone", 1),
        ],
    )
    limit: bpy.props.FloatProperty(
        name="Limit", description="Largest load in W/m²", min=1.0, default=1500.0
    )
    minutes: bpy.props.FloatProperty(
        name="Minutes", description="Tolerated minutes a day above it", min=0.0, max=1440.0
    )


class CausticloadRow(bpy.types.PropertyGroup):
    """A line of the list of findings."""

    text: bpy.props.StringProperty()
    found: bpy.props.StringProperty()
    episode: bpy.props.IntProperty()


class CausticloadScene(bpy.types.PropertyGroup):
    """On the scene."""

    latitude: bpy.props.FloatProperty(
        name="Latitude",
        description="Degrees, north positive",
        min=-90,
        max=90,
        default=51.5,
        precision=4,
        update=_changed,
    )
    longitude: bpy.props.FloatProperty(
        name="Longitude",
        description="Degrees, east positive",
        min=-180,
        max=180,
        precision=4,
        update=_changed,
    )
    elevation: bpy.props.FloatProperty(
        name="Elevation",
        description="Metres above sea level",
        min=-500,
        max=9000,
        update=_changed,
    )
    timezone: bpy.props.StringProperty(
        name="Time zone",
        description="Name such as Europe/London",
        default="UTC",
        update=_changed,
    )
    north: bpy.props.FloatProperty(
        name="North",
        description="Bearing of the model's Y axis, degrees from true north",
        min=-360,
        max=360,
        update=_changed,
    )
    year: bpy.props.IntProperty(
        name="Year", description="Calendar year", min=1950, max=2049, default=2025, update=_changed
    )
    month: bpy.props.IntProperty(
        name="Month", description="Month of the instant", min=1, max=12, default=6, update=_moved
    )
    day: bpy.props.IntProperty(
        name="Day", description="Day of the instant", min=1, max=31, default=21, update=_moved
    )
    hour: bpy.props.FloatProperty(
        name="Time",
        description="Local clock time in hours",
        min=0.0,
        max=23.99,
        default=12.0,
        precision=2,
        step=5,
        update=_moved,
    )
    step_minutes: bpy.props.IntProperty(
        name="Step",
        description="Minutes from one position of the sun to the next",
        min=1,
        max=60,
        default=5,
        update=_changed,
    )
    day_stride: bpy.props.IntProperty(
        name="Days apart",
        description="Days from one representative day to the next",
        min=1,
        max=30,
        default=4,
        update=_changed,
    )
    lay_ground: bpy.props.BoolProperty(
        name="Lay a ground",
        description="Lay a level ground where nothing receives light",
        default=True,
        update=_changed,
    )
    live: bpy.props.BoolProperty(
        name="Follow", description="Solve again when the time or the glass changes", default=True
    )
    shown: bpy.props.EnumProperty(
        name="Show", description="What the colours show", items=SHOWN, update=_moved
    )
    shown_year: bpy.props.EnumProperty(
        name="Show", description="What the colours show", items=SHOWN_YEAR
    )
    rays: bpy.props.BoolProperty(
        name="Rays",
        description="Draw the sun's rays from the panels to the hottest spot",
        update=_moved,
    )
    limits: bpy.props.CollectionProperty(type=CausticloadLimit)
    rows: bpy.props.CollectionProperty(type=CausticloadRow)
    row: bpy.props.IntProperty(name="Finding")
    # What the last answer said, for the panel.
    headline: bpy.props.StringProperty()
    message: bpy.props.StringProperty()
    cautions: bpy.props.StringProperty()
    assumed: bpy.props.StringProperty()
    scale: bpy.props.StringProperty()  # JSON, read by the legend
    folder: bpy.props.StringProperty()  # result folder of the last year


CLASSES = (CausticloadRole, CausticloadLimit, CausticloadRow, CausticloadScene)
HOLDERS = (
    (bpy.types.Scene, CausticloadScene),
    (bpy.types.Object, CausticloadRole),
    (bpy.types.Collection, CausticloadRole),
)


def register():
    classes.register(CLASSES)
    for holder, group in HOLDERS:
        holder.causticload = bpy.props.PointerProperty(type=group)


def unregister():
    for holder, _ in HOLDERS:
        if hasattr(holder, "causticload"):
            del holder.causticload
    classes.unregister(CLASSES)
