"""Every word of a memo, in one place, so that a translation can follow.

Texts with braces are filled with ``str.format``. Sentences of the study, of the criteria and of
the engine (what was assumed, cautions) come from where the figures come from.
"""

from __future__ import annotations

from datetime import date, datetime

from causticload.output.words import MONTHS

# --- labels -------------------------------------------------------------------------------------
FIGURE, TABLE, SECTION = "Figure {n}", "Table {n}", "Section {n}"
CAPTION = "{label}. {text}"
TITLE = "Sunlight gathered by the facade"
SUBTITLE = "Memo of a screening study: {title}"
FOOTER = "{title}. Screening aid: local codes and licensed practice decide."
PAGE = "Page {n} of {of}"
TO_FILL = "[to be filled in]"
UNKNOWN = "not known"
NOT_ASSESSED = "Not assessed in this run."
CONTENTS = "Contents"
AT_A_GLANCE = "At a glance"

# --- title block --------------------------------------------------------------------------------
PROJECT, CLIENT, SITE, YEAR = "Project", "Client", "Site", "Year studied"
REFERENCE, AUTHOR, CHECKER = "Reference and revision", "Author", "Checker"
ANALYSED, WRITTEN, PROGRAM = "Date of analysis", "Memo written", "Program"
SITE_FACTS = "latitude {lat}, longitude {lon}, {h:g} m above sea level, time zone {zone}"
NORTH_FACTS = "The model's y axis points to the bearing {north:g}° (clockwise from true north)."

# --- section titles -----------------------------------------------------------------------------
PURPOSE = "Purpose and scope"
GEOMETRY = "Site and geometry"
SOURCES = "Sources and assumptions"
GLASS, WEATHER, CRITERIA, ASSUMED = "Reflecting finishes", "Sun and sky", "Criteria", "Assumed"
METHOD = "Method and its checks"
YEAR_SECTION = "The year as a whole"
FINDINGS = "Findings"
FINDING = "Finding {n}: {receiver}, {whom}"
OBSERVERS = "Eyes of observers"
NONE_OVER = "Where no exceedance was found"
MITIGATION = "What would bring the findings down"
LIMITS = "Limits of the study"
CAUTIONS = "Cautions"
APPENDIX = "Appendix: how to repeat this study"
INPUTS, VERSIONS, SETTINGS = "Inputs", "Versions", "Settings, word for word"
COUNTS = "Ray counts"
CHANGES = "What the change of design did"

# --- purpose ------------------------------------------------------------------------------------
PURPOSE_TEXT = (
    "A facade that is glazed or polished and not flat gathers sunlight. This memo tells where "
    "around {title} the gathered light exceeds stated limits, on which days and at what hours, how "
    "strong it is and how long it lasts, who or what is exposed, and which panels send it. It is "
    "a screening study: it covers the year {year} in steps of {step} minutes on {days} "
    "representative days, {suns:,} positions of the sun, each day with its mirror day on the other "
    "side of the solstice."
)
SCOPE_TEXT = (
    "In scope are loads by mirror-like reflection from the surfaces named as reflectors in "
    "{roles}, on the surfaces named as receivers. Heat gain inside the building, daylight, and "
    "light from lamps are not in scope."
)
DECIDES = (
    "This memo is a screening aid. Local codes and licensed practice decide; where they are "
    "stricter than the limits used here, they rule."
)

# --- at a glance --------------------------------------------------------------------------------
GLANCE_NONE = (
    "This holds for the model, the finishes and the sky described in {sources}, and for the limits "
    "in {criteria}. It does not show that nobody can be hurt and nothing can be damaged."
)
GLANCE_SOME = (
    "{n} found over a limit, people before things. The strongest reflected load that was "
    "looked at closely is {load}, on {receiver}, {when}."
)
GLANCE_UNCHECKED = (
    "{n} found over a limit, people before things. None of the peaks was looked at closely "
    "in this run."
)
PLACES = {1: "1 place was"}
PLACES_MANY = "{n} places were"
OVERVIEW_CAPTION = (
    "Findings, worst first. Days and hours are those with light over the lowest limit."
)
OVERVIEW_COLUMNS = ("No.", "Where", "Who or what", "Days", "Local clock", "Strongest", "Confidence")

# --- who is exposed -----------------------------------------------------------------------------
WHO = {
    "people: skin": "people's skin",
    "people: eyes": "people's eyes",
    "things": "things",
}
EXPOSED = {
    ("people: skin", "walkway"): "People who walk, stand or sit there, children among them.",
    ("people: skin", "roadway"): "People who cross, cycle or ride in open vehicles there.",
    ("people: skin", "roof"): "People who work or rest on it.",
    ("people: skin", "terrace"): "People who sit there, often for a long time.",
    ("people: skin", "playground"): "Children at play and those who look after them.",
    ("people: skin", "parking"): "People who get in and out of vehicles there.",
    ("people: skin", "planting"): "People who walk, sit or work among the plants.",
    ("things", "facade"): "Cladding, window frames, sealants, blinds and awnings of that wall.",
    ("things", "roof"): "Roofing, membranes, roof lights and what stands on the roof.",
    ("things", "walkway"): "Litter, furniture, stalls, and what people put down there.",
    ("things", "planting"): "Plants, dry leaves and mulch.",
    ("things", "parking"): "Vehicles, their trims and what lies in them.",
}
EXPOSED_ELSE = {
    "people: skin": "People who are or may be there.",
    "people: eyes": "People who look towards the facade from there.",
    "things": "Whatever stands or is put there.",
}

# --- geometry -----------------------------------------------------------------------------------
GEOMETRY_TEXT = (
    "The model has {triangles:,} triangles; {panels:,} panels with {area:,.0f} m² reflect. "
    "Loads were found at {points:,} places on the receivers. Coordinates are those of the model in "
    "metres. {north}"
)
SITE_VIEW = (
    "The site from above, with the year's peak reflected load. Receivers that get less than "
    "{least:.0f} W/m² are grey."
)
SITE_PLAN = (
    "Plan of the site. Black: reflectors. Shaded: receivers as seen from above. Thin lines: other "
    "surfaces. Dashed: paths of observers."
)
ROLES_CAPTION = "Surfaces of the model and their roles."
ROLES_COLUMNS = ("Surface", "Role", "Form or use", "Finish", "Triangles")
PANELS_CAPTION = "Panels of the reflectors."
PANELS_COLUMNS = ("Surface", "Panels", "Flat", "Area (m²)", "Width (m)", "Height (m)")
MIDDLE_RANGE = "{low:.2f} to {high:.2f}"
FOCAL_STRAIGHT = (
    "Distance at which each place of the facade gathers light that falls straight on it: half its "
    "least concave radius of curvature. White: flat, convex or beyond {far:.0f} m. Slanting light "
    "gathers nearer in one direction and farther off in the other."
)
FOCAL_SLANTING = (
    "Distance along the reflected ray at which each place of the facade gathers the light of the "
    "sun of the worst peak ({sun}): the shorter of its two focal distances. White: none nearer "
    "than {far:.0f} m, or turned away from that sun."
)
FOCAL_TEXT = (
    "Half of the gathering area has a focal distance between {low:.0f} m and {high:.0f} m "
    "({map}). Places about that far from the facade deserve the closest look."
)
FOCAL_NONE = "No part of the facade gathers light by its own curvature nearer than {far:.0f} m."
UNROLLED = "The facade is unrolled along its plan curve and seen from outside or inside alike."

# --- sources ------------------------------------------------------------------------------------
GLASS_CAPTION = "Reflecting finishes. Reflectances at normal incidence and at 60°, outdoor side."
GLASS_COLUMNS = ("Finish", "Solar 0°", "Solar 60°", "Visible 0°", "Angular law", "Source")
GLASS_RANGE = "{value:.2f} ({low:.2f} to {high:.2f})"
GLASS_MISSING = "The finish {name} cannot be worked out from the result folder: {why}"
GLASS_TEXT = (
    "A range in brackets is what the data leave open at that angle. A finish that is named as a "
    "stand-in or from memory must be replaced by the maker's data before the study is relied on."
)
SKY_CLEAR = (
    "Beam and diffuse irradiance are those of a cloudless sky (Ineichen and Perez) with "
    "{turbidity}. Clouds are not counted: durations are those of a year in which the sun always "
    "shines."
)
TURBIDITY_MONTHLY = "the Linke turbidity of each month from a worldwide table"
TURBIDITY_GIVEN = "a Linke turbidity of {value:g}"
SKY_FILE = (
    "Beam and diffuse irradiance are those of the weather file {name}, hour by hour. It is one "
    "typical year; a clearer one will come."
)
SUN_DISC = {
    "limb-darkened": "The sun is a disc of its true size that is darker at its edge.",
    "uniform": "The sun is a disc of its true size and of even brightness.",
}
CRITERIA_CAPTION = "Limits used, whom they protect, and how sure they are."
CRITERIA_COLUMNS = ("Limit", "Protects", "Value", "Tolerated", "Source", "Confidence")
TOLERATED = "{minutes:g} min a day"
NO_TIME = "no time"
MEMORY_TEXT = (
    "How sure a limit or a property is, is said in fixed words. {memory} means that the value was "
    "recalled and not read in its source when the program was written: look it up there before "
    "you rely on it."
)
FROM_MEMORY = "From memory"
VALID_FOR = "{name}: {validity}. {caution}"

# --- method -------------------------------------------------------------------------------------
METHOD_TEXT = (
    "Light travels in ray tubes: small triangles of reflecting surface with a normal at each "
    "corner. The three corner rays of a tube meet a receiver in an image triangle. The sun is a "
    "disc, so each point of the image is a disc as well, and the load at a place is the tube's "
    "power times the share of the triangle that such a disc covers, computed exactly. A tube is "
    "halved until three corners describe its image, and where its rays disagree on what they meet. "
    "Reflectance follows Fresnel's equations or the law named for the finish, for both "
    "polarisations; a second reflection off another mirror is followed. A load is the mean over "
    "a cell of the receiver's grid.",
    "A hot spot is a connected region over a limit at one moment. Hot spots are followed through "
    "the day into episodes, and episodes that come back on neighbouring days are put together. "
    "The strongest moment of the worst ones is solved again on finer grids and to the minute, "
    "and traced back to its panels.",
)
CHECKS_INTRO = "Three checks were made:"
CHECK_LEDGER = (
    "Energy. {taken:,.0f} kWh fell on the reflectors in the year; {absorbed:.1f} % was absorbed or "
    "let through, {receivers:.1f} % fell on receivers, {obstructions:.1f} % on other surfaces and "
    "{sky:.1f} % went to the sky. The ledger closes to {gap:.2f} %."
)
CHECK_COUNT = (
    "Ray counts. {made} peaks were measured again by random points on the reflectors and random "
    "points of the sun's face, which share nothing with the tubes; {agree} agree within three "
    "standard errors ({table})."
)
CHECK_NO_COUNT = "Ray counts. No peak was counted in this run."
CHECK_MESH = "Shape. The tessellation of {surface} {sentence}"
CHECK_MESH_NONE = "Shape. No smooth surface needed its tessellation checked."

# --- the year -----------------------------------------------------------------------------------
LOAD_PLAN = (
    "Peak reflected load of the year on surfaces that lie; where one lies above another, the "
    "larger load is shown. Colours are even in the square root of the load. Lines: reflected load "
    "alone equals a limit (median over about a metre)."
)
HOURS_PLAN = 'Hours of the year over the limit "{criterion}" ({limit}); white: never.'
IMAGE_PLAN = (
    "Most reflected images of the sun in view at once in the year. Where the number jumps, a "
    "caustic passed."
)
YEAR_CHART = (
    "Worst reflected load on any receiver by day and local clock. Outlined and hatched: some limit "
    "is exceeded somewhere. Grey: the sun is up and no receiver is lit. Days between those that "
    "were solved show the nearest one."
)
SUN_PATH = (
    "Where the sun stands while some limit is exceeded. Grey dots: positions of the sun without "
    "exceedance. Lines: three days of the year with local clock hours."
)
CONTRIBUTION_MAP = (
    "What each panel adds to the strongest peak that was traced (episode {episode}, {receiver}). "
    "White: nothing. {unrolled}"
)

# --- findings -----------------------------------------------------------------------------------
LIMIT_COLUMNS = (
    "Limit",
    "Days a year",
    "When in the year",
    "Local clock",
    "Longest on a day (min)",
    "At one place, most (min a day; h a year)",
    "Area ever over (m²)",
)
LIMIT_CAPTION = "{receiver}: how often and how long each limit is exceeded."
PEAK_CHECKED = (
    "Strongest looked at closely: {load} ({quantity}; {reflected} of it by reflection) at {place} "
    "on {when}, with the sun at azimuth {azimuth:.0f}° and elevation {elevation:.0f}°. {images} "
    "of the sun {are} in view there at once; the region over half the peak is {width:.2f} m "
    "across."
)
IMAGES = {1: "1 reflected image"}
IMAGES_MANY = "{n} reflected images"
PEAK_RANGE = (
    "With the reflectances that the data of the finish leave open, the reflected part lies between "
    "{low} and {high}."
)
PEAK_GRID = (
    "Strongest by the grid: {load} ({quantity}; {reflected} of it by reflection), mean over a "
    "cell, at {place} on {when}. This peak was not looked at closely and not counted; it can be "
    "higher."
)
GRID_HIGHER = (
    "By the grid another moment is stronger: {load} at {place} on {when} (episode {episode}), "
    "which was not looked at closely. Treat it as possible and not as shown."
)
GRID_DIFFERS = (
    "The grid gave {grid} for the same episode, the close look {close}. The two should be near "
    "each other: have this peak looked into before it is used."
)
COUNT_AGREES = (
    "Over a disc of {radius:.0f} mm radius the tubes give {tubes:,.0f} W/m² and {rays:,} random "
    "rays {count:,.0f} ± {error:,.0f} W/m², which agree."
)
COUNT_DISAGREES = (
    "Over a disc of {radius:.0f} mm radius the tubes give {tubes:,.0f} W/m² and {rays:,} random "
    "rays {count:,.0f} ± {error:,.0f} W/m², which DISAGREE by more than three standard errors. Do "
    "not rely on this peak."
)
WHO_LINE = "Who or what: {text}"
PANELS_LINE = (
    "Panels: {n} send light there, from {distance:.0f} m away on average; the strongest {half} "
    "bring half of it ({table})."
)
NO_PANELS = "Panels: not traced for this finding in this run."
CONTRIBUTORS_CAPTION = "{receiver}: the strongest panels behind the peak."
CONTRIBUTOR_COLUMNS = (
    "Panel",
    "Surface",
    "Middle x, y, z (m)",
    "Load (W/m²)",
    "Share",
    "Running share",
)
CONFIDENCE_LINE = "Confidence: {level}. {reasons}"
FINDING_FIGURE = (
    "{receiver}. a: reflected load around the spot (ring); lines: limits. b: the facade as an eye "
    "at the spot sees it at the peak; colours: panels that send light, star: the sun itself. c: "
    "worst reflected load by local clock; outlined and hatched: over a limit. d: load on that day."
)
FINDING_FIGURE_PLAIN = (
    "{receiver}. a: reflected load around the spot (ring); lines: limits. b: the facade as an eye "
    "at the spot sees it; the panels were not traced. c: worst reflected load by local clock; "
    "outlined and hatched: over a limit. d: load on that day."
)
MORE_SPANS = " and {n} more"
FIRM, FAIR, WEAK = "firm", "fair", "weak"
LEAST_PANELS = "Fewest panels: {text}"
SKIN_LINE = "Skin: {text}"
SURFACE_LINE = "Surface: {text}"
TEMPERATURE_FIGURE = (
    "{receiver}: temperature of the surface on the day of the peak, with the facade and without it."
)
WITH_FACADE, WITHOUT_FACADE = "with the facade", "without it"
WHY_COUNTED = "The peak was confirmed by a ray count."
WHY_NOT_COUNTED = "The peak was not counted with random rays."
WHY_DISAGREES = "The ray count and the tubes disagree."
WHY_GRID = "The grid and the close look differ."
WHY_GLASS = "The reflectance of {names} is not from a data sheet or leaves a wide range open."
WHY_LIMIT = "The limit {name} is {confidence}."
WHY_MESH = "The mesh may be too coarse: see the check of its shape."

# --- eyes ---------------------------------------------------------------------------------------
EYES_NONE_GIVEN = "The study names no observers. Eyes were not assessed in this run."
EYES_NOT_ASSESSED = (
    "The study names observers ({names}). Glare and harm to their eyes were not assessed in this "
    "run."
)
EYES_TEXT = (
    "An after-image is a bright spot that stays in view for seconds and hides what is behind it. "
    "Glare for drivers, pilots and signals is decided by the authority for that road, airfield or "
    "railway."
)
EYES_CAPTION = "Observers: how often reflected sunlight troubles their eyes."
EYES_COLUMNS = (
    "Observer",
    "Days with after-image",
    "When in the year",
    "Local clock",
    "After-image (min a year; most on a day)",
    "Veil over the limit (min a year)",
    "Retinal burn possible (min a year)",
)
EYES_WORST = (
    "{name}, worst moment: {when}, at {place}; {images} image(s) of the sun {off:.0f}° from the "
    "line of sight. {cls}. Illuminance at the eye {lux:,.0f} lx, veil {veil:,.0f} cd/m², "
    "{contrast:.0f} % of contrast left; retinal irradiance {retinal:,.0f} W/m² against "
    "{limit:,.0f} W/m² for an after-image."
)
EYES_NOTHING = "{name}: no after-image found under these assumptions."
EYES_SOURCES = (
    "After-image and burn: Ho, Ghanbari and Diver, J. Solar Energy Eng. 133 (2011) 031021, for one "
    "look of about 0.15 s with a pupil of 2 mm; from memory, high confidence. Check it there.",
    "Veil: the general equation of CIE 146:2002 with age (read), at 100 lm/W. Contrast "
    "is told against a sunlit street of 5,000 cd/m² (common practice).",
    "500 cd/m²: 10 E/theta² at a driver's eye, Hassall (1991); from memory, medium confidence.",
    "First reflections only, within 100° of the line of sight; areas closer than half a sun count "
    "as one.",
)

# --- none over ----------------------------------------------------------------------------------
NONE_OVER_TEXT = (
    "For these receivers and limits: no exceedance found under these assumptions. The largest "
    "reflected load is a mean over a cell."
)
NONE_OVER_NOTHING = "Each limit is exceeded on each receiver that it holds for."
NONE_OVER_CAPTION = "Receivers and limits without exceedance."
NONE_OVER_COLUMNS = ("Receiver", "Use", "Limit", "Value", "Largest reflected load", "When")

# --- mitigation ---------------------------------------------------------------------------------
MITIGATION_TEXT = (
    "{table} tells for each finding what would bring its strongest peak down to the highest limit "
    "that it exceeds, and to the lowest one. It is arithmetic at that one moment: another moment "
    "may take its place, so each measure must be solved as a new year and compared with this one "
    "(causticload compare)."
)
MITIGATION_CAPTION = "What each set of panels would need, at the peak that was looked at closely."
MITIGATION_COLUMNS = (
    "No.",
    "Limit",
    "Reflected now",
    "May stay",
    "Reflectance times",
    "Or without the strongest",
    "Or turned by",
)
OF_PANELS = "{n} of {of} panels"
TURNED = "{mrad:.1f} mrad"
CANNOT = "no change of the facade alone"
NOT_TRACED = "not traced"
MITIGATION_OPTIONS = (
    "Less reflectance. The column tells by what the reflectance of all panels behind the peak "
    "would have to be multiplied. Reflectance rises at slanting light: compare data sheets at the "
    "angles of this peak.",
    "Fewer panels in step. A dull finish, a frit or a screen on the strongest panels takes their "
    "light away; the column tells how many, if these sent nothing at all.",
    "Panels turned. A turn by the angle in the table moves a panel's light by the width of the hot "
    "spot. Panels turned by different angles spread it.",
    "Less curvature. Flat panels, or a larger radius, move the focus away; see {focal}.",
    "Something between. Fins, canopies or trees that stand in the light; they must stand there on "
    "each of the days and hours of the finding.",
    "The place itself. Other materials, another use, or closing the place at the hours of the "
    "finding. This removes the exposure and not the light.",
)
MITIGATION_NONE = (
    "No exceedance was found under these assumptions, so no measure follows from this study."
)

# --- limits -------------------------------------------------------------------------------------
LIMITS_ITEMS = (
    "The glass. A data sheet says little about slanting light. The range left open is in {glass}.",
    "How flat the panes are. Bow, roller wave and fixing tolerance can double a load at a spot and "
    "move it.",
    "The mesh. An error of 1 mrad in a normal moves light by 60 mm at 30 m.",
    "Between the days that were solved ({stride} days apart) and between steps ({step} minutes) "
    "thin foci can be missed; durations are whole steps.",
    "More than two reflections, edges of shadows before the first reflection, trees and people are "
    "not followed.",
    "Loads add direct light, diffuse light and reflected light; heat from warm surfaces and moving "
    "air are not part of a load.",
)
FAULTS_INTRO = "Found in the model when it was read:"

# --- appendix -----------------------------------------------------------------------------------
REPEAT = (
    "Put the input files beside the study file, install the versions below and run the two lines. "
    "The seeds are fixed; the figures come out alike to the digits shown here.",
    "causticload year {study} --out {folder}\ncausticload memo {folder}",
)
INPUTS_CAPTION = "Input files and their fingerprints."
INPUTS_COLUMNS = ("File", "SHA-256")
VERSIONS_CAPTION = "Program and libraries."
VERSIONS_COLUMNS = ("Part", "Version")
TRACER, PYTHON_NAME = "ray tracer", "Python"
COUNTS_CAPTION = (
    "Peaks looked at closely. Tubes and random rays over the same disc; a difference of more than "
    "three standard errors is a disagreement."
)
COUNTS_COLUMNS = (
    "Episode",
    "Receiver",
    "Peak (W/m²)",
    "Local time",
    "Disc (mm)",
    "Tubes (W/m²)",
    "Random rays (W/m²)",
    "Agree",
)
RECEIVERS_CAPTION = "Largest reflected load on each receiver, mean over a cell."
RECEIVERS_COLUMNS = ("Receiver", "Use", "Area (m²)", "Peak (W/m²)", "When", "Images", "Energy (MJ)")
SETTINGS_TEXT = "The study file as the run read it (study.toml in the result folder):"
DURATION = "The run took {seconds:,.0f} s."
YES, NO = "yes", "no"

# --- page that turns ----------------------------------------------------------------------------
VIEW_3D = "The model, to be turned"
VIEW_3D_HELP = (
    "Drag to turn, drag with Shift or the right button to move, wheel to come nearer. Arrow keys "
    "turn; plus and minus come nearer. Colours: peak reflected load in the year, as in the scale."
)
VIEW_3D_MISSING = (
    "This browser shows no 3D graphics. The figures and tables are complete without it."
)
SORT_HINT = "Press a column's title to sort by it."

# --- comparison ---------------------------------------------------------------------------------
COMPARE_TITLE = "Comparison of two designs"
COMPARE_SUBTITLE = "{before} and {after}"
BEFORE, AFTER = "Before", "After"
FATES = {
    "gone": "gone",
    "new": "new",
    "better": "better",
    "worse": "worse",
    "same": "as before",
}
COMPARE_TEXT = (
    "{gone} of {all} findings are gone, {better} better, {same} as before, {worse} worse, and "
    "{new} new. A finding counts as better or worse if its hours over the limit at the place that "
    "is hit longest, or its grid peak, change by more than {part:.0f} %; if one falls and the "
    "other rises, it counts as worse."
)
COMPARE_NONE = "Neither design exceeds a limit: no exceedance found under these assumptions."
COMPARE_CAPTION = "Findings before and after, the changes for the worse first."
COMPARE_COLUMNS = (
    "Receiver",
    "Limit",
    "Change",
    "Grid peak before (W/m²)",
    "after",
    "Days before",
    "after",
    "Most at one place before (h a year)",
    "after",
)
COMPARE_FIGURE = (
    "Change of the year's peak reflected load, after less before, on surfaces that lie. Purple: "
    "less; orange: more. White: no change, or nothing to compare."
)
COMPARE_LABEL = "change of peak reflected load (W/m²)"
COMPARE_DIFFERS = "What is not the same in the two runs: {what}."
COMPARE_NO_MESH = "The receivers of the two runs share no grid, so no map of the change was drawn."
COMPARE_PART = "Receivers whose grids differ are left out of the map: {names}."


def long_date(d: date) -> str:
    """Write a date so that nobody takes the day for the month: ``21 March 2026``.

    Parameters
    ----------
    d : date
        The date.

    Returns
    -------
    text : str
        Day, month in words, year.
    """
    return f"{d.day} {MONTHS[d.month - 1]} {d.year}"


def long_time(t: datetime) -> str:
    """Write a local time with its offset: ``21 March 2026, 13:30 (UTC+01:00)``.

    Parameters
    ----------
    t : datetime
        With its offset.

    Returns
    -------
    text : str
        To the minute.
    """
    offset = t.strftime("%z") or "+0000"
    return f"{long_date(t.date())}, {t:%H:%M} (UTC{offset[:3]}:{offset[3:5]})"


def angle(value: float, positive: str, negative: str) -> str:
    """Write a latitude or longitude: ``51.62° N``.

    Parameters
    ----------
    value : float
        With its sign. [degrees]
    positive, negative : str
        Letters of the two hemispheres.

    Returns
    -------
    text : str
        Without a sign.
    """
    return f"{abs(value):.4g}° {positive if value >= 0.0 else negative}"


def place(point: tuple[float, float, float]) -> str:
    """Write a place in the model: ``x 10.1, y -5.2, z 0.0 m``.

    Parameters
    ----------
    point : (float, float, float)
        Model coordinates. [m]

    Returns
    -------
    text : str
        To a decimetre.
    """
    x, y, z = (round(v, 1) + 0.0 for v in point)
    return f"x {x:.1f}, y {y:.1f}, z {z:.1f} m"
