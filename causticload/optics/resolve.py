"""From a name in a study to a finish: an own one first, then the built-in ones."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from difflib import get_close_matches

import numpy as np

from causticload.errors import CausticloadError, StudyError
from causticload.optics import angular
from causticload.optics.builtin import BUILT_IN
from causticload.optics.finish import Finish, Law, Lobe
from causticload.study.model import FinishSpec

# Keys of an own finish beyond the plain ones that this version makes use of.
EXTRA = ("base", "diffuse_fraction", "index", "pane_count")


def resolve_finish(name: str, finishes: Mapping[str, FinishSpec]) -> Finish:
    """Find a finish by its name.

    Parameters
    ----------
    name : str
        As in the study.
    finishes : mapping of str to FinishSpec
        The study's own finishes.

    Returns
    -------
    finish : Finish
        With what was assumed where the study is silent.

    Raises
    ------
    StudyError
        If there is no such finish, or its figures cannot be met.
    """
    if name in finishes:
        try:
            return _own(finishes[name])
        except StudyError:
            raise
        except CausticloadError as error:
            raise StudyError(error.message, where=f'finish."{name}"', hint=error.hint) from error
    if name in BUILT_IN:
        return BUILT_IN[name]
    known = [*finishes, *BUILT_IN]
    near = get_close_matches(name, known, n=2)
    raise StudyError(
        f"unknown finish {name!r}",
        where="surface.finish",
        hint=(f"Did you mean {' or '.join(map(repr, near))}? " if near else "")
        + "`causticload finishes` lists the built-in ones.",
    )


def _own(spec: FinishSpec) -> Finish:
    where = f'finish."{spec.name}"'
    unused = sorted(set(spec.extra) - set(EXTRA))
    if unused:
        raise StudyError(
            f"{unused[0]!r} is not made use of by this version",
            where=where,
            hint=f"Leave it out. Keys beyond the plain ones: {', '.join(EXTRA)}.",
        )
    assumed: list[str] = []
    base = spec.extra.get("base")
    if base is not None:
        if base not in BUILT_IN:
            raise StudyError(f"unknown base {base!r}", where=where)
        start = BUILT_IN[str(base)]
        if spec.solar_reflectance is None and spec.table is None and "index" not in spec.extra:
            return _surface(start, spec)
    law, band = _law(spec, where, assumed)
    R0 = float(law(np.array([1.0]))[0, 0, 0])
    finish = Finish(
        name=spec.name,
        lobes=(Lobe("sheet", law),),
        source="study file",
        solar_range=(R0, R0),
        band=band,
        assumed=tuple(assumed),
    )
    return _surface(finish, spec)


def _surface(finish: Finish, spec: FinishSpec) -> Finish:
    """A finish with the study's own roughness."""
    diffuse = spec.extra.get("diffuse_fraction")
    return replace(
        finish,
        name=spec.name,
        slope_error_rad=1e-3 * spec.slope_error_mrad or finish.slope_error_rad,
        diffuse_fraction=float(str(diffuse)) if diffuse is not None else finish.diffuse_fraction,
    )


def _law(spec: FinishSpec, where: str, assumed: list[str]) -> tuple[Law, Law | None]:
    """Angular law of an own finish, and the band that it leaves open."""
    index = spec.extra.get("index")
    if isinstance(index, (list, tuple)):
        return angular.complex_index(float(index[0]), float(index[1])), None
    if spec.table is not None:
        return angular.table(np.array(spec.table)), None
    solar, visible = spec.solar_reflectance, spec.visible_reflectance
    law = spec.angular
    if law is None:
        law = "coated glass"
        assumed.append(f"{where}: no angular law is given; coated glass is assumed.")
    if solar is None and visible is None and law != "clear glass":
        raise StudyError(
            "a finish needs solar_reflectance (and better visible_reflectance too)", where=where
        )
    if law == "clear glass":
        panes = int(str(spec.extra.get("pane_count", 2)))
        if "pane_count" not in spec.extra:
            assumed.append(f"{where}: a unit of two clear panes is assumed.")
        return angular.clear_glass(panes, solar, visible), None
    if solar is None or visible is None:
        known, missing = ("visible", "solar") if solar is None else ("solar", "visible")
        assumed.append(f"{where}: {missing} reflectance is not given; the {known} one stands in.")
        solar = visible = solar if visible is None else visible
    if solar is None or visible is None:  # both were None: refused above
        raise StudyError("a finish needs reflectances", where=where)
    if law == "coated glass":
        assumed.append(
            f"{where}: reflectance at slanting angles follows an engineering closure for coated "
            "glass; at 60° to 85° it is open by 0.07 to 0.17."
        )
        return angular.coated_glass(solar, visible), angular.coated_band
    if law == "metal":
        return angular.metal(solar, visible), None
    return angular.constant(solar, visible), None
