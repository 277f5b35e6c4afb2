"""Which limits hold for which receiver, each with its source and how sure it is."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from difflib import get_close_matches
from fnmatch import fnmatchcase

import numpy as np

from causticload.errors import StudyError
from causticload.hazard.cautions import Confidence, Protects
from causticload.hazard.material_table import material
from causticload.hazard.materials import Surroundings, irradiance_to_hold
from causticload.study.model import CriterionSpec

__all__ = ["BUILT_IN", "KINDS", "QUANTITIES", "Criterion", "criteria_for", "describe"]

QUANTITIES: dict[str, str] = {
    # what a limit can bound -> unit
    "total irradiance": "W/m²",  # direct and reflected together
    "reflected irradiance": "W/m²",
}

KINDS: tuple[str, ...] = (
    "walkway",
    "roadway",
    "facade",
    "roof",
    "planting",
    "terrace",
    "playground",
    "parking",
    "ground",
    "water",
)
_WHERE_PEOPLE_ARE = ("walkway", "roadway", "roof", "planting", "terrace", "playground", "parking")
_WHERE_LITTER_LIES = ("walkway", "roof", "planting", "terrace", "playground", "parking")


@dataclass(frozen=True, kw_only=True)
class Criterion:
    """One limit on the load of a receiver."""

    name: str
    protects: Protects
    quantity: str  # one of QUANTITIES
    limit: float
    unit: str
    minutes: float  # tolerated time per day above the limit
    formula: str
    validity: str
    source: str
    confidence: Confidence
    caution: str
    applies_to_kinds: tuple[str, ...]
    default: bool  # used without being asked for


_CLADDING = material("vinyl cladding")
_SOFTENING = _CLADDING.limit("softening")
_VINYL_HOLDS = int(
    np.floor(
        irradiance_to_hold(
            _SOFTENING.low,
            absorptance=_CLADDING.absorptance,
            emissivity=_CLADDING.emissivity,
            surroundings=Surroundings(),
        )
    )
)

BUILT_IN: tuple[Criterion, ...] = (
    Criterion(
        name="skin, prolonged",
        protects="people: skin",
        quantity="total irradiance",
        limit=1500.0,
        unit="W/m²",
        minutes=0.0,
        formula="direct + reflected > 1500 W/m²",
        validity="long exposure in ordinary clothes; all light taken as absorbed",
        source="API 521: 1.58 kW/m² for continuous exposure of clothed people; IFV 2016 / Ind. "
        "Health 55 (2017) 529: ordinary work clothes do not suffice above 1.5 kW/m². Rounded down "
        "to 1.5",
        confidence="published, read",
        caution="Bare skin in the full sun already takes up to 1.1 kW/m².",
        applies_to_kinds=(*_WHERE_PEOPLE_ARE, "ground"),
        default=True,
    ),
    Criterion(
        name="skin pain",
        protects="people: skin",
        quantity="total irradiance",
        limit=2500.0,
        unit="W/m²",
        minutes=0.0,
        formula="direct + reflected > 2500 W/m²; above it pain comes after about 4.2 q^-1.9 min, "
        "q in kW/m²",
        validity="bare skin; all light taken as absorbed",
        source="ISO 13571:2012: tenability limit 2.5 kW/m² (the time law is from memory)",
        confidence="published, read",
        caution="At the limit pain can come within a minute (44 s by the law). At 5 kW/m² it comes "
        "in some 12 s.",
        applies_to_kinds=(*_WHERE_PEOPLE_ARE, "ground"),
        default=True,
    ),
    Criterion(
        name="vinyl softening",
        protects="things",
        quantity="total irradiance",
        limit=float(_VINYL_HOLDS),
        unit="W/m²",
        minutes=0.0,
        formula=f"irradiance that holds dark vinyl (absorptance {_CLADDING.absorptance:g}) at "
        f"{_SOFTENING.low:g} °C, by the steady balance of its surface",
        validity="wall, air at 30 °C, wind 1 m/s (McAdams), clear sky, back insulated; light "
        "vinyl bears more than twice as much",
        source=f"{_SOFTENING.source}, {_SOFTENING.low:g} to {_SOFTENING.high:g} °C (read); "
        "absorptance of dark vinyl from memory",
        confidence="from memory, medium",
        caution="Strong sun alone can reach this limit on a hot, still day. Look at what the "
        "reflection adds. Distortion was reported from 61 °C.",
        applies_to_kinds=("facade",),
        default=True,
    ),
    Criterion(
        name="timber, long term",
        protects="things",
        quantity="total irradiance",
        limit=4300.0,
        unit="W/m²",
        minutes=0.0,
        formula="direct + reflected > 4300 W/m²",
        validity="least flux that ignited wood (glowing) in a long test",
        source="Babrauskas 2001",
        confidence="published, read",
        caution="Wood held at 77 °C or more for a long time can ignite by self-heating at much "
        "lower loads (Babrauskas 2007).",
        applies_to_kinds=("facade", "roof", "terrace", "playground"),
        default=True,
    ),
    Criterion(
        name="combustible litter",
        protects="things",
        quantity="total irradiance",
        limit=7000.0,
        unit="W/m²",
        minutes=0.0,
        formula="direct + reflected > 7000 W/m²",
        validity="piloted ignition of dry fabric, paper and leaves, 7 to 10 kW/m²; the lower end",
        source="fire engineering handbooks",
        confidence="from memory, medium",
        caution="A burning ember counts as a pilot. Dark, dry and fine matter ignites first.",
        applies_to_kinds=(*_WHERE_LITTER_LIES, "ground"),
        default=True,
    ),
)


def _near(word: str, known: Sequence[str]) -> str:
    close = get_close_matches(word, known, n=1)
    guess = f"Did you mean {close[0]!r}? " if close else ""
    return f"{guess}Known: {', '.join(known)}."


def _from_spec(spec: CriterionSpec) -> Criterion:
    """An own limit of the study file, checked."""
    where = f"criterion {spec.name!r}"
    if spec.quantity not in QUANTITIES:
        raise StudyError(
            f"unknown quantity {spec.quantity!r}",
            where=where,
            hint=_near(spec.quantity, tuple(QUANTITIES)),
        )
    if not 0.0 < spec.limit < np.inf:
        raise StudyError(f"limit must be > 0, got {spec.limit!r}", where=where)
    if not 0.0 <= spec.minutes <= 1440.0:
        raise StudyError(f"minutes must be in [0, 1440], got {spec.minutes!r}", where=where)
    built_in = {c.name: c for c in BUILT_IN}.get(spec.name)
    unit = QUANTITIES[spec.quantity]
    return Criterion(
        name=spec.name,
        protects=built_in.protects if built_in else "things",
        quantity=spec.quantity,
        limit=spec.limit,
        unit=unit,
        minutes=spec.minutes,
        formula=f"{spec.quantity} > {spec.limit:g} {unit}",
        validity="as the study says",
        source="study file",
        confidence="study file",
        caution="Set by the user; the program does not check its basis.",
        applies_to_kinds=(),
        default=False,
    )


def criteria_for(
    kind: str, own: Sequence[CriterionSpec], receiver_name: str
) -> tuple[Criterion, ...]:
    """Limits that hold for one receiver: the defaults of its kind, then the study's own.

    An own limit with the name of a built-in one takes its place, and what it protects. Other own
    limits count as limits for things.

    Parameters
    ----------
    kind : str
        One of ``KINDS``; empty if the study does not say: then all defaults hold.
    own : sequence of CriterionSpec
        The study's own limits. All are checked, whether they apply here or not.
    receiver_name : str
        Matched with the globs of the own limits, without regard to case.

    Returns
    -------
    criteria : tuple of Criterion
        Names are unique.

    Raises
    ------
    StudyError
        If the kind or a quantity is unknown, a limit is out of range, or two own limits of one
        name apply here.
    """
    if kind and kind not in KINDS:
        raise StudyError(
            f"unknown kind {kind!r}", where=f"receiver {receiver_name!r}", hint=_near(kind, KINDS)
        )
    chosen = {c.name: c for c in BUILT_IN if c.default and (not kind or kind in c.applies_to_kinds)}
    seen: set[str] = set()
    for spec in own:
        criterion = _from_spec(spec)
        globs = (glob.casefold() for glob in spec.applies_to)
        if not any(fnmatchcase(receiver_name.casefold(), glob) for glob in globs):
            continue
        if spec.name in seen:
            raise StudyError(
                f"two criteria named {spec.name!r} apply to receiver {receiver_name!r}",
                where=f"criterion {spec.name!r}",
                hint="Give each its own name, or let them apply to different receivers.",
            )
        seen.add(spec.name)
        chosen[spec.name] = criterion
    return tuple(chosen.values())


def describe(criteria: Sequence[Criterion]) -> tuple[dict[str, str], ...]:
    """Rows for printing, one for each criterion, all values as text.

    Parameters
    ----------
    criteria : sequence of Criterion
        Any number.

    Returns
    -------
    rows : tuple of dict
        Keys in a fixed order: name, protects, limit, tolerated, formula, validity, source,
        confidence, caution.
    """
    return tuple(
        {
            "name": c.name,
            "protects": c.protects,
            "limit": f"{c.quantity} {c.limit:g} {c.unit}",
            "tolerated": f"{c.minutes:g} min a day" if c.minutes else "no time",
            "formula": c.formula,
            "validity": c.validity,
            "source": c.source,
            "confidence": c.confidence,
            "caution": c.caution,
        }
        for c in criteria
    )
