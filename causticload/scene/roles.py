"""Who reflects, who receives, who stands in the way: parts of a mesh to surfaces of a scene."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from causticload.scene.model import Fault, Surface
from causticload.scene.names import ground_kind, matching_name, substance, told_apart
from causticload.scene.read import Part, bounds
from causticload.study.model import Study, SurfaceRule

DEFAULT_FINISH = "double clear glass"
DEFAULT_METAL = "polished stainless steel"
GROUND_NAME = "ground"
GROUND_SPACING_M = 0.5
SMOOTH_ANGLE = 1e-3  # rad: corner normals that turn by more than this within a face are curved
NAMES_IN_HINT = 12


@dataclass(frozen=True, kw_only=True)
class Roles:
    """Parts with their surfaces, and what was found or assumed on the way."""

    parts: tuple[Part, ...]  # a laid ground is the last
    surfaces: tuple[Surface, ...]
    surface_of_part: tuple[int, ...]  # -1: ignored
    rule_of_part: tuple[int, ...]  # number of the rule; -1: none
    faults: tuple[Fault, ...]
    assumed: tuple[str, ...]


def assign_roles(parts: Sequence[Part], rules: Sequence[SurfaceRule], study: Study) -> Roles:
    """Give each part the roles of the first rule that fits one of its names.

    Parameters
    ----------
    parts : sequence of Part
        Parts of the mesh files.
    rules : sequence of SurfaceRule
        Rules of the study, in order. Without any, names decide and a ground may be laid.
    study : Study
        The study, for places in messages.

    Returns
    -------
    roles : Roles
        One surface per part that is not ignored, in the order of the parts.
    """
    if rules:
        return _by_rules(parts, rules, study)
    return _by_names(parts)


def list_names(parts: Sequence[Part]) -> str:
    """Write the names that a rule could match into a hint.

    Parameters
    ----------
    parts : sequence of Part
        Parts of the mesh files.

    Returns
    -------
    hint : str
        A sentence.
    """
    names = list(dict.fromkeys(name for part in parts for name in part.names))
    more = f" and {len(names) - NAMES_IN_HINT} more" if len(names) > NAMES_IN_HINT else ""
    return "Names in the model: " + ", ".join(names[:NAMES_IN_HINT]) + more + "."


# --- with rules --------------------------------------------------------------------------------


def _by_rules(parts: Sequence[Part], rules: Sequence[SurfaceRule], study: Study) -> Roles:
    rule_of_part = []
    wished = []
    for part in parts:
        fits = ((i, matching_name(rule.match, part)) for i, rule in enumerate(rules))
        rule, name = next(((i, name) for i, name in fits if name is not None), (-1, part.name))
        rule_of_part.append(rule)
        # a part is called by the name that the study knows it by
        wished.append(name if rule >= 0 and rules[rule].match != "*" else part.name)
    names = told_apart(wished, parts)

    surfaces: list[Surface] = []
    surface_of_part = []
    unfinished: dict[int, list[str]] = defaultdict(list)
    for part, name, i in zip(parts, names, rule_of_part, strict=True):
        roles = frozenset(rules[i].roles if i >= 0 else ("obstruction",))
        if "ignore" in roles:
            surface_of_part.append(-1)
            continue
        surface_of_part.append(len(surfaces))
        surface = Surface(name=name, file=part.file, roles=roles, triangles=len(part.triangles))
        if i >= 0:
            surface = _with_rule(surface, rules[i])
        if "reflector" in roles and rules[i].finish is None:
            unfinished[i].append(name)
        surfaces.append(surface)
    return Roles(
        parts=tuple(parts),
        surfaces=tuple(surfaces),
        surface_of_part=tuple(surface_of_part),
        rule_of_part=tuple(rule_of_part),
        faults=(*_idle_rules(parts, rules, rule_of_part, study), *_no_role(parts, rule_of_part)),
        assumed=tuple(
            f'The finish of {_joined(found)} is not given (rule "{rules[i].match}"): '
            f'"{DEFAULT_FINISH}" is taken.'
            for i, found in unfinished.items()
        ),
    )


def _with_rule(surface: Surface, rule: SurfaceRule) -> Surface:
    """Add what the rule says to a surface that has its roles."""
    if "reflector" in surface.roles:
        surface = replace(
            surface, form=rule.form, finish=rule.finish or DEFAULT_FINISH, figure=rule.figure
        )
        if rule.finish is None:
            surface = replace(surface, assumed=(f'Its finish is taken as "{DEFAULT_FINISH}".',))
    if "receiver" in surface.roles:
        surface = replace(
            surface, spacing=rule.spacing or 0.0, kind=rule.kind or "", material=rule.material or ""
        )
    return surface


def _idle_rules(
    parts: Sequence[Part], rules: Sequence[SurfaceRule], rule_of_part: Sequence[int], study: Study
) -> list[Fault]:
    faults = []
    where = study.path.name if study.path else "study"
    for i, rule in enumerate(rules):
        if i in rule_of_part or rule.match == "*":
            continue
        if any(matching_name(rule.match, part) is not None for part in parts):
            kind, what = "shadowed_rule", "all that it fits is taken by earlier rules"
            hint = "Move it further up; the first match wins."
        else:
            kind, what = "unmatched_rule", "no object, group, layer or material has such a name"
            hint = list_names(parts)
        message = f'{where}, surface[{i}]: match = "{rule.match}" fits nothing: {what}.'
        faults.append(Fault(kind=kind, count=1, surface=rule.match, message=message, hint=hint))
    return faults


def _no_role(parts: Sequence[Part], rule_of_part: Sequence[int]) -> list[Fault]:
    found = [part.name for part, i in zip(parts, rule_of_part, strict=True) if i < 0]
    if not found:
        return []
    message = (
        f"{len(found)} surface(s) without a role: no rule fits {_joined(found)}; "
        "treated as obstruction."
    )
    hint = 'Add a rule for them; match = "*" with role = "obstruction" as the last says the same.'
    return [Fault(kind="no_role", count=len(found), surface="", message=message, hint=hint)]


def _joined(names: Sequence[str]) -> str:
    shown = ", ".join(names[:3])
    return shown if len(names) <= 3 else f"{shown} and {len(names) - 3} more"


# --- without rules -----------------------------------------------------------------------------


def _by_names(parts: Sequence[Part]) -> Roles:
    names = told_apart([part.name for part in parts], parts)
    surfaces = [_guess(part, name) for part, name in zip(parts, names, strict=True)]
    assumed = [
        "No [[surface]] is given: names decide what reflects and what receives light.",
        *(f"{surface.name}: {text}" for surface in surfaces for text in surface.assumed),
    ]
    others = [surface.name for surface in surfaces if surface.roles == {"obstruction"}]
    if others:
        assumed.append(f"Taken as obstruction: {_joined(others)}.")
    placed = list(parts)
    if not any("receiver" in surface.roles for surface in surfaces):
        ground = lay_ground(parts)
        name = told_apart([*names, GROUND_NAME], [*parts, ground])[-1]
        corner = ground.triangles.reshape(-1, 3)
        size = np.ptp(corner, axis=0)
        text = (
            f"A level ground of {size[0]:.0f} m by {size[1]:.0f} m is laid at the lowest point "
            f'of the model (z = {corner[0, 2]:.2f} m) as a receiver of kind "walkway", '
            f"sampled every {GROUND_SPACING_M} m."
        )
        assumed.append(text)
        placed.append(ground)
        surfaces.append(
            Surface(
                name=name,
                file="",
                roles=frozenset({"receiver"}),
                spacing=GROUND_SPACING_M,
                kind="walkway",
                triangles=2,
                assumed=(text,),
            )
        )
    return Roles(
        parts=tuple(placed),
        surfaces=tuple(surfaces),
        surface_of_part=tuple(range(len(placed))),
        rule_of_part=(-1,) * len(placed),
        faults=(),
        assumed=tuple(assumed),
    )


def _guess(part: Part, name: str) -> Surface:
    """Give a part the roles that its names speak of."""
    kind = ground_kind(part)
    stuff = substance(part)
    roles = set()
    assumed = []
    form, finish = "flat", ""
    if stuff:
        roles.add("reflector")
        form = "smooth" if has_curved_normals(part) else "flat"
        finish = DEFAULT_FINISH if stuff == "glass" else DEFAULT_METAL
        assumed.append(f'its name speaks of {stuff}: a {form} reflector of "{finish}".')
    if kind:
        roles.add("receiver")
        assumed.append(f'its name speaks of ground: a receiver of kind "{kind}".')
    return Surface(
        name=name,
        file=part.file,
        roles=frozenset(roles or {"obstruction"}),
        form=form,
        finish=finish,
        kind=kind,
        triangles=len(part.triangles),
        assumed=tuple(assumed),
    )


def has_curved_normals(part: Part) -> bool:
    """Say whether the normals of the file turn within a face, as on a curved sheet.

    Parameters
    ----------
    part : Part
        The part.

    Returns
    -------
    curved : bool
        False if the file has no normals, or gives each face one normal for all its corners.
    """
    if part.corner_normals is None:
        return False
    turn = part.corner_normals - np.roll(part.corner_normals, 1, axis=1)
    return bool((np.linalg.norm(turn, axis=2) > SMOOTH_ANGLE).any())  # nan compares as False


def lay_ground(parts: Sequence[Part]) -> Part:
    """Make a level rectangle at the lowest point of the model.

    Parameters
    ----------
    parts : sequence of Part
        The model.

    Returns
    -------
    ground : Part
        Two triangles facing up, reaching twice the model's height beyond it on every side.
    """
    low, high = bounds(parts)
    reach = 2.0 * (high[2] - low[2])
    x0, y0 = low[:2] - reach
    x1, y1 = high[:2] + reach
    a, b, c, d = ([x, y, low[2]] for x, y in ((x0, y0), (x1, y0), (x1, y1), (x0, y1)))
    return Part(
        name=GROUND_NAME,
        object_name=GROUND_NAME,
        group="",
        material="",
        file="",
        triangles=np.array([[a, b, c], [a, c, d]]),
        corner_normals=None,
    )
