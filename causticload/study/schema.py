"""The keys of a study file: one table that reads, checks and documents them."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from math import isfinite
from typing import Any

Check = Callable[[Any], str | None]  # what is wrong with a value, or None


@dataclass(frozen=True)
class Key:
    """One key: what it may hold and what it means."""

    kind: str  # number | whole number | text | yes or no | list | table
    meaning: str
    check: Check | None = None
    required: bool = False


def between(low: float, high: float, *, open_low: bool = False) -> Check:
    """Make a check of a range.

    Parameters
    ----------
    low, high : float
        Its ends.
    open_low : bool
        Whether the lower end itself is out.

    Returns
    -------
    check : callable
        Says what is wrong, or None.
    """

    def check(value: Any) -> str | None:
        if isfinite(value) and (low < value if open_low else low <= value) and value <= high:
            return None
        sign = "above" if open_low else "from"
        return f"must be {sign} {low:g} to {high:g}, got {value!r}"

    return check


def one_of(*choices: str) -> Check:
    """Make a check of a choice.

    Parameters
    ----------
    *choices : str
        What may stand.

    Returns
    -------
    check : callable
        Says what is wrong, or None.
    """

    def check(value: Any) -> str | None:
        return None if value in choices else f"must be one of {', '.join(choices)}, got {value!r}"

    return check


def _not_empty(value: Any) -> str | None:
    return None if value else "must not be empty"


def _divides_hour(value: Any) -> str | None:
    return (
        None if 1 <= value <= 60 and 60 % value == 0 else f"must divide 60 minutes, got {value!r}"
    )


NUMBER, WHOLE, TEXT, FLAG, LIST, TABLE = (
    "number",
    "whole number",
    "text",
    "yes or no",
    "list",
    "table",
)
ROLES = ("reflector", "receiver", "obstruction", "ignore")
QUANTITIES = ("total irradiance", "reflected irradiance")
LAWS = ("clear glass", "coated glass", "metal", "constant", "table")
_POSITIVE = between(0.0, 1e9, open_low=True)
_SHARE = between(0.0, 1.0)

TOP = {
    "title": Key(TEXT, "title of the study"),
    "site": Key(TABLE, "where the model stands", required=True),
    "model": Key(TABLE, "mesh files", required=True),
    "surface": Key(LIST, "what surfaces are; the first rule that fits a name wins"),
    "finish": Key(TABLE, "own finishes by name"),
    "figure": Key(TABLE, "surface figures by name"),
    "sky": Key(TABLE, "what shines"),
    "year": Key(TABLE, "how the year is sampled"),
    "observer": Key(LIST, "eyes"),
    "criterion": Key(LIST, "own limits"),
}
SITE = {
    "latitude": Key(NUMBER, "degrees, north positive", between(-90, 90), required=True),
    "longitude": Key(NUMBER, "degrees, east positive", between(-180, 180), required=True),
    "elevation": Key(NUMBER, "metres above sea level", between(-500, 9000)),
    "timezone": Key(TEXT, "IANA name of the time zone"),
    "model_north": Key(NUMBER, "bearing of the model's +Y axis, degrees", between(-360, 360)),
}
MODEL = {
    "files": Key(LIST, "mesh files, relative to the study file", _not_empty, required=True),
    "unit": Key(TEXT, "unit of the files", one_of("m", "cm", "mm", "ft", "in")),
    "up": Key(TEXT, "up axis of the files", one_of("Z", "Y")),
}
SURFACE = {
    "match": Key(
        TEXT, "glob over object, group, layer or material name", _not_empty, required=True
    ),
    "role": Key("text or list", f"of {', '.join(ROLES)}", required=True),
    "form": Key(TEXT, "smooth or flat panes", one_of("smooth", "flat")),
    "finish": Key(TEXT, "name of a finish", _not_empty),
    "figure": Key(TEXT, "name of a surface figure", _not_empty),
    "spacing": Key(NUMBER, "sample distance, metres", between(0, 1000, open_low=True)),
    "kind": Key(TEXT, "what it is, for its default criteria", _not_empty),
    "material": Key(TEXT, "what a receiver is made of, for its temperature", _not_empty),
}
FINISH = {
    "solar_reflectance": Key(NUMBER, "at normal incidence, outdoor side", _SHARE),
    "visible_reflectance": Key(NUMBER, "at normal incidence, outdoor side", _SHARE),
    "angular": Key(TEXT, "angular law", one_of(*LAWS)),
    "slope_error_mrad": Key(NUMBER, "rms slope error of the surface", between(0, 200)),
    "table": Key(LIST, "rows of angle, solar[, visible]", _not_empty),
    "index": Key(LIST, "refractive index [n, k] of a metal"),
    "diffuse_fraction": Key(NUMBER, "share of reflected light that is scattered", _SHARE),
    "pane_count": Key(WHOLE, "panes of a unit, 6 mm clear", between(1, 4)),
    "panes": Key(LIST, "panes from outdoors: thickness_mm, extinction_per_m, index", _not_empty),
    "coatings": Key(
        LIST, "surface (1 = outdoors) and, if known, figures of the coated pane", _not_empty
    ),
    "gap_mm": Key("number or list", "between panes"),
    "slope_error_across_mrad": Key(NUMBER, "across the lines of a brushed finish", between(0, 200)),
    "brush_along": Key(TEXT, "direction of the lines", one_of("width", "height")),
    "spectral_file": Key(TEXT, "layer file of the coating (CSV)", _not_empty),
    "base": Key(TEXT, "a built-in finish to start from", _not_empty),
}
FIGURE = {
    "bow_mm": Key(NUMBER, "largest deflection of a pane, outward positive", between(-100, 100)),
    "inner_bow_mm": Key(
        NUMBER, "the same of the inner panes; that of the outer if not given", between(-100, 100)
    ),
    "cavity_pressure_kpa": Key(
        NUMBER, "isochore over-pressure in a unit's cavities; negative in winter", between(-60, 60)
    ),
    "sealed_temperature_c": Key(NUMBER, "of the gas when the unit was sealed", between(-60, 100)),
    "temperature_c": Key(NUMBER, "of the gas in the cavity now", between(-60, 150)),
    "sealed_pressure_kpa": Key(
        NUMBER, "barometer at sealing, reduced to sea level; 101.3", between(87, 109)
    ),
    "pressure_kpa": Key(NUMBER, "barometer now, reduced to sea level; 101.3", between(87, 109)),
    "sealed_altitude_m": Key(
        NUMBER, "altitude of the factory; that of the site if not given", between(-500, 9000)
    ),
    "panes_mm": Key(LIST, "thickness of each pane from outdoors; [6, 6]", _not_empty),
    "gap_mm": Key("number or list", "width of the cavities; 16"),
    "roller_wave_mm": Key(NUMBER, "peak to valley", between(0, 5)),
    "roller_pitch_mm": Key(NUMBER, "wavelength", between(1, 5000)),
    "roller_along": Key(
        TEXT, "direction the wave runs in, and edge kinks end", one_of("width", "height")
    ),
    "roller_as": Key(
        TEXT,
        "waves followed one by one, or their mean over phases; chosen by cost if not given",
        one_of("waves", "mean"),
    ),
    "edge_kink_mm": Key(NUMBER, "lift of the ends' rims, outward positive", between(-5, 5)),
    "edge_kink_width_mm": Key(NUMBER, "how far in from the rim", between(1, 500)),
    "tilt_mrad": Key(NUMBER, "rms tilt of panes about each axis, by fixing", between(0, 50)),
    "seed": Key(WHOLE, "of the random phases and tilts; 1", between(0, 2**31 - 1)),
    "cold_bent": Key(FLAG, "quadrilaterals out of plane are bent glass, not two flat panes"),
}
SKY = {
    "source": Key(TEXT, "clear sky or weather file", one_of("clear", "weather")),
    "file": Key(TEXT, "EPW or TMY3 file, with source = weather", _not_empty),
    "disc": Key(TEXT, "the sun's face", one_of("limb-darkened", "uniform")),
    "turbidity": Key(NUMBER, "Linke turbidity; a table's if not given", between(1, 10)),
}
YEAR = {
    "year": Key(WHOLE, "calendar year", between(1950, 2049)),
    "step_minutes": Key(WHOLE, "step", _divides_hour),
    "day_stride": Key(WHOLE, "days from one representative day to the next", between(1, 30)),
}
OBSERVER = {
    "name": Key(TEXT, "name", _not_empty, required=True),
    "path": Key(LIST, "a point or a polyline, metres", _not_empty, required=True),
    "look": Key("text or list", "along, or a direction"),
    "age": Key(NUMBER, "years", between(10, 100)),
    "spacing": Key(NUMBER, "metres between eye points", between(0.1, 1000)),
}
CRITERION = {
    "name": Key(TEXT, "name", _not_empty, required=True),
    "applies_to": Key(LIST, "globs over receiver names", _not_empty, required=True),
    "quantity": Key(TEXT, "what is bounded", one_of(*QUANTITIES), required=True),
    "limit": Key(NUMBER, "W/m²", _POSITIVE, required=True),
    "minutes": Key(NUMBER, "tolerated time per day above it", between(0, 1440)),
}

TABLES = {
    "site": SITE,
    "model": MODEL,
    "surface": SURFACE,
    "finish.NAME": FINISH,
    "figure.NAME": FIGURE,
    "sky": SKY,
    "year": YEAR,
    "observer": OBSERVER,
    "criterion": CRITERION,
}


def describe_keys() -> str:
    """Write all keys as a Markdown table.

    Returns
    -------
    text : str
        One row a key.
    """
    rows = ["| table | key | holds | meaning |", "|---|---|---|---|"]
    for table, keys in TABLES.items():
        rows += [
            f"| {table} | `{name}`{' (required)' if k.required else ''} | {k.kind} | {k.meaning} |"
            for name, k in keys.items()
        ]
    return "\n".join(rows)
