"""Keys of a surface figure that go together, and keys that say the same thing twice."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, NamedTuple

CONDITIONS = (
    "sealed_temperature_c",
    "temperature_c",
    "sealed_pressure_kpa",
    "pressure_kpa",
    "sealed_altitude_m",
)
MOST_PANES = 4
DEFAULT_PANES = 2  # of a unit whose cavities press


class Contradiction(NamedTuple):
    """A key that cannot stand beside the others, or not alone."""

    key: str
    message: str
    hint: str


def check_figure(table: Mapping[str, Any]) -> Contradiction | None:
    """Tell what is wrong with the keys of a figure taken together.

    Parameters
    ----------
    table : mapping
        Keys of ``[figure.NAME]``, each in range by itself.

    Returns
    -------
    wrong : Contradiction or None
        The first that was found.
    """
    return _check_bow(table) or _check_panes(table) or _check_waves(table)


def _check_bow(t: Mapping[str, Any]) -> Contradiction | None:
    conditions = [k for k in CONDITIONS if k in t]
    sources = [k for k in ("bow_mm", "cavity_pressure_kpa", *conditions[:1]) if k in t]
    if len(sources) > 1:
        return Contradiction(
            sources[1],
            f"{sources[0]!r} says already how far panes bow",
            "Give the deflection, or the cavity's pressure, or what it follows from.",
        )
    if conditions and not {"sealed_temperature_c", "temperature_c"} <= set(t):
        return Contradiction(
            conditions[0],
            "sealed_temperature_c and temperature_c are both wanted",
            "Pressure in a cavity follows first of all from both temperatures.",
        )
    if "inner_bow_mm" in t and "bow_mm" not in t:
        return Contradiction(
            "inner_bow_mm", "it goes with bow_mm", "Give the outer pane's bow too, if only as 0."
        )
    if not set(t) - {"seed", "cold_bent"} and not t.get("cold_bent"):
        key = next(iter(t), "")
        return Contradiction(key, "it says nothing about the glass", "Give a bow, a wave or so.")
    return None


def _check_panes(t: Mapping[str, Any]) -> Contradiction | None:
    pressed = "cavity_pressure_kpa" in t or "temperature_c" in t
    panes, gap = t.get("panes_mm"), t.get("gap_mm")
    if panes is not None:
        if not (pressed or "roller_wave_mm" in t or "inner_bow_mm" in t):
            return Contradiction(
                "panes_mm",
                "nothing here depends on the panes",
                "They matter to a cavity's pressure, a roller wave and inner_bow_mm.",
            )
        if not all(_number(x) and 0.5 <= x <= 100.0 for x in panes):
            return Contradiction(
                "panes_mm", f"thicknesses of 0.5 to 100 mm are wanted, got {panes!r}", ""
            )
        least = 2 if pressed or "inner_bow_mm" in t else 1
        if not least <= len(panes) <= MOST_PANES:
            return Contradiction(
                "panes_mm",
                f"{least} to {MOST_PANES} panes are wanted, got {len(panes)}",
                "A cavity lies between two panes.",
            )
    if gap is None:
        return None
    if not pressed:
        return Contradiction("gap_mm", "it goes with a cavity's pressure", "Drop it or add that.")
    gaps = gap if isinstance(gap, list) else [gap]
    if not all(_number(x) and 1.0 <= x <= 100.0 for x in gaps):
        return Contradiction("gap_mm", f"widths of 1 to 100 mm are wanted, got {gap!r}", "")
    wanted = (len(panes) if panes is not None else DEFAULT_PANES) - 1
    if isinstance(gap, list) and len(gap) != wanted:
        return Contradiction("gap_mm", f"{wanted + 1} panes have {wanted} gap(s)", "")
    return None


def _check_waves(t: Mapping[str, Any]) -> Contradiction | None:
    if ("roller_wave_mm" in t) != ("roller_pitch_mm" in t):
        key = "roller_wave_mm" if "roller_wave_mm" in t else "roller_pitch_mm"
        return Contradiction(
            key,
            "roller_wave_mm and roller_pitch_mm go together",
            "Usual: 0.02 to 0.1 mm over 200 to 320 mm (from memory).",
        )
    if "roller_as" in t and "roller_wave_mm" not in t:
        return Contradiction("roller_as", "it goes with roller_wave_mm", "Drop it.")
    if "roller_along" in t and not {"roller_wave_mm", "edge_kink_mm"} & set(t):
        return Contradiction("roller_along", "it goes with a roller wave or an edge kink", "")
    if ("edge_kink_mm" in t) != ("edge_kink_width_mm" in t):
        key = "edge_kink_mm" if "edge_kink_mm" in t else "edge_kink_width_mm"
        return Contradiction(
            key,
            "edge_kink_mm and edge_kink_width_mm go together",
            "A kink of 0.5 mm over 50 mm is at the limit of EN 12150-1 (from memory).",
        )
    if "seed" in t and not {"roller_wave_mm", "tilt_mrad"} & set(t):
        return Contradiction("seed", "nothing here is random", "Drop it.")
    return None


def _number(value: Any) -> bool:
    return isinstance(value, (int, float)) and not isinstance(value, bool)
