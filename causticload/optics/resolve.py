"""From a name in a study to a finish: an own one first, then the built-in ones."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from difflib import get_close_matches

import numpy as np

from causticload.errors import CausticloadError, StudyError
from causticload.optics import angular
from causticload.optics.builtin import BUILT_IN, openness
from causticload.optics.datasheet import clear_glazing, coating_of_pane, coating_of_unit
from causticload.optics.entries import CoatingEntry, Entries, read_entries
from causticload.optics.finish import Finish, Lobe, Reflection, pane_lobes
from causticload.optics.spectral import read_layers, solved_glazing
from causticload.optics.stack import Coating, Glazing, Pane
from causticload.study.model import FinishSpec


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
            return _Own(finishes[name]).finish()
        except CausticloadError as error:
            where = error.where or f'finish."{name}"'
            raise StudyError(error.message, where=where, hint=error.hint) from error
    if name in BUILT_IN:
        return BUILT_IN[name]
    raise StudyError(
        f"unknown finish {name!r}",
        where="surface.finish",
        hint=_nearest(name, [*finishes, *BUILT_IN]),
    )


def _nearest(name: str, known: list[str]) -> str:
    near = get_close_matches(name, known, n=2)
    start = f"Did you mean {' or '.join(map(repr, near))}? " if near else ""
    return start + "`causticload finishes` lists the built-in ones."


class _Own:
    """An own finish in the making; gathers what is assumed on the way."""

    def __init__(self, spec: FinishSpec) -> None:
        self.spec = spec
        self.given: Entries = read_entries(spec)
        self.assumed: list[str] = []
        self.base: Finish | None = None
        if self.given.base is not None:
            if self.given.base not in BUILT_IN:
                raise StudyError(
                    f"unknown finish {self.given.base!r}",
                    where=f"{self.given.where}.base",
                    hint=_nearest(self.given.base, list(BUILT_IN)),
                )
            self.base = BUILT_IN[self.given.base]

    def assume(self, text: str) -> None:
        self.assumed.append(f"{self.given.where}: {text}")

    def finish(self) -> Finish:
        """Choose how the reflectance is known, then add the roughness."""
        self._one_way_only()
        if self.given.index is not None:
            n, k = self.given.index
            made = self._sheet(angular.complex_index(n=n, k=k), "metal")
        elif self.spec.table is not None:
            made = self._table()
        elif self.given.spectral_file is not None:
            made = self._film()
        elif self.given.coatings:
            made = self._coated_panes()
        else:
            made = self._by_figures()
        said = openness(made)
        if said and made is not self.base:
            self.assume(said)
        made = replace(made, name=self.spec.name, lobes=self._rough(made.lobes))
        return replace(made, assumed=(*made.assumed, *self.assumed))

    def _one_way_only(self) -> None:
        """Refuse two descriptions of one thing: nothing given may be dropped in silence."""
        spec, given = self.spec, self.given
        figures = spec.solar_reflectance is not None or spec.visible_reflectance is not None
        film = given.spectral_file is not None
        ways = {
            "index": given.index is not None,
            "table": spec.table is not None,
            "spectral_file": film,
            "solar_reflectance or visible_reflectance": figures,
            "figures of a coated pane": any(c.figures for c in given.coatings),
        }
        used = [way for way, there in ways.items() if there]
        if len(used) > 1:
            raise StudyError(
                f"{' and '.join(used)} say the same thing; give one", where=given.where
            )
        glass = given.panes is not None or bool(given.coatings)
        if glass and (ways["index"] or ways["table"]):
            raise StudyError(f"panes and coatings do not go with {used[0]}", where=given.where)
        suits = {
            "index": ("metal",),
            "table": ("table",),
            "spectral_file": ("coated glass",),
            "figures of a coated pane": ("coated glass",),
        }
        if used and used[0] in suits and spec.angular not in (None, *suits[used[0]]):
            raise StudyError(
                f"angular = {spec.angular!r} does not go with {used[0]}", where=given.where
            )

    def _sheet(self, reflection: Reflection, law: str) -> Finish:
        lobes = (Lobe(name="sheet"),)
        if self.base is not None and len(self.base.lobes) == 1:
            lobes = self.base.lobes
        R0 = float(reflection.law(np.zeros(1))[0, 0, 0, 0])
        return Finish(
            name=self.spec.name,
            lobes=lobes,
            reflection=reflection,
            angular=law,
            source="study file",
            solar_range=(R0, R0),
        )

    def _glass(self, glazing: Glazing, reflection: Reflection, law: str) -> Finish:
        R0 = float(reflection.law(np.zeros(1))[:, 0, 0, 0].sum())
        return Finish(
            name=self.spec.name,
            lobes=pane_lobes(len(glazing.panes)),
            reflection=reflection,
            angular=law,
            source="study file",
            solar_range=(R0, R0),
            glazing=glazing,
        )

    def _table(self) -> Finish:
        rows = np.array(self.spec.table, dtype=object)
        if rows.ndim != 2:
            raise StudyError("all rows must be alike", where=f"{self.given.where}.table")
        rows = rows.astype(float)
        reflection = angular.table(rows)
        if rows.shape[1] == 2:
            self.assume("the table has no visible column; the solar one stands in.")
        if rows[0, 0] > 0.0:
            self.assume(f"the value at {rows[0, 0]:g}° holds down to normal incidence.")
        if rows[-1, 0] < 90.0:
            self.assume(f"beyond {rows[-1, 0]:g}° the table runs on to 1 at 90°.")
        self.assume("the table is of unpolarised light; s and p are taken alike.")
        return self._sheet(reflection, "table")

    def _panes(self, least: int) -> tuple[Pane, ...]:
        """Panes as given, else of the base, else clear ones of 6 mm."""
        if self.given.panes is not None:
            if self.given.extinction_silent:
                self.assume("glass of no stated extinction takes that of clear float.")
            return self.given.panes
        if self.base is not None and self.base.glazing is not None:
            return self.base.glazing.panes
        count = max(2, least)
        self.assume(f"a unit of {count} clear panes of 6 mm is assumed.")
        return (Pane(),) * count

    def _film(self) -> Finish:
        file = self.given.spectral_file
        surfaces = [c.surface for c in self.given.coatings]
        if file is None or len(surfaces) > 1:
            raise StudyError("a layer file is of one coated surface", where=self.given.where)
        if not surfaces:
            self.assume("the coating of the layer file is on surface 2.")
            surfaces = [2]
        panes = self._panes(least=(surfaces[0] + 1) // 2)
        Glazing(panes=panes, coatings={surfaces[0]: _NOTHING})  # checks the number
        glazing, reflection = solved_glazing(
            panes, surfaces[0], read_layers(file), gaps=self.given.gaps
        )
        return self._glass(glazing, reflection, "coated glass")

    def _coated_panes(self) -> Finish:
        entries = self.given.coatings
        panes = self._panes(least=(max(c.surface for c in entries) + 1) // 2)
        Glazing(panes=panes, coatings={c.surface: _NOTHING for c in entries})  # checks the numbers
        if any(c.figures for c in entries):
            coatings = {c.surface: self._pane_film(panes, c) for c in entries}
        else:
            coatings = self._unit_film(panes, [c.surface for c in entries])
        glazing = Glazing(panes=panes, coatings=coatings, gaps=self.given.gaps)
        reflection = angular.glazing_reflection(glazing, angular.SURFACE_BAND)
        return self._glass(glazing, reflection, "coated glass")

    def _unit_film(self, panes: tuple[Pane, ...], surfaces: list[int]) -> dict[int, Coating]:
        if len(surfaces) > 1:
            raise StudyError(
                "a unit's figures cannot tell two coatings apart; give each pane's own",
                where=f"{self.given.where}.coatings",
            )
        if self.spec.angular not in (None, "coated glass"):
            raise StudyError(
                f"angular = {self.spec.angular!r} does not go with coatings", where=self.given.where
            )
        solar, visible = self._both(self.spec.solar_reflectance, self.spec.visible_reflectance)
        self.assume("the coating reflects alike from both sides and absorbs nothing.")
        return {surfaces[0]: coating_of_unit(panes, surfaces[0], solar=solar, visible=visible)}

    def _pane_film(self, panes: tuple[Pane, ...], entry: CoatingEntry) -> Coating:
        if not entry.figures:
            raise StudyError(
                f"figures are missing for the coating on surface {entry.surface}",
                where=f"{self.given.where}.coatings",
            )
        back, through = entry.pair("reflectance_back"), entry.pair("transmittance")
        if None in back:
            self.assume(
                f"the film on surface {entry.surface} reflects alike from both sides where the "
                "reflectance from indoors is not given."
            )
        if None in through:
            self.assume(
                f"the film on surface {entry.surface} absorbs nothing where the transmittance is "
                "not given: what lies behind it reflects as much as it can."
            )
        return coating_of_pane(
            panes[(entry.surface - 1) // 2],
            indoor_face=entry.surface % 2 == 0,
            outdoor=self._both(*entry.pair("reflectance")),
            indoor=back,
            transmittance=through,
        )

    def _both(self, solar: float | None, visible: float | None) -> tuple[float, float]:
        if solar is None and visible is None:
            raise StudyError(
                "a finish needs solar_reflectance (and better visible_reflectance too)",
                where=self.given.where,
                hint="Or give an index, a table, panes, a layer file or a base.",
            )
        if solar is not None and visible is not None:
            return solar, visible
        known, missing = ("solar", "visible") if visible is None else ("visible", "solar")
        self.assume(f"{missing} reflectance is not given; the {known} one stands in.")
        one = visible if solar is None else solar
        return float(one or 0.0), float(one or 0.0)

    def _by_figures(self) -> Finish:
        """From the unit's two figures and the name of an angular law."""
        spec, base = self.spec, self.base
        silent = spec.solar_reflectance is None and spec.visible_reflectance is None
        if base is not None and silent and spec.angular is None and self.given.panes is None:
            return base
        law: str | None = spec.angular
        if law is None and base is not None:
            law = base.angular
        elif law is None and silent and self.given.panes is not None:
            law = "clear glass"
            self.assume("panes without a reflectance are taken as clear glass.")
        elif law is None:
            law = "coated glass"
            self.assume("no angular law is given; coated glass is assumed.")
        if law == "clear glass":
            return self._clear()
        if law == "table":
            raise StudyError("angular = 'table' wants a table", where=self.given.where)
        solar, visible = self._both(spec.solar_reflectance, spec.visible_reflectance)
        if law == "coated glass":
            return self._coated_unit(solar, visible)
        if self.given.panes is not None:
            raise StudyError(f"panes do not go with angular = {law!r}", where=self.given.where)
        if law == "metal":
            return self._sheet(angular.metal(solar=solar, visible=visible), law)
        return self._sheet(angular.constant(solar=solar, visible=visible), law)

    def _coated_unit(self, solar: float, visible: float) -> Finish:
        """The closure over the whole unit, unless a base tells where the coating is."""
        at = self.base.glazing.coatings if self.base and self.base.glazing else {}
        if len(at) == 1:
            panes, surface = self._panes(least=1), next(iter(at))
            self.assume(f"the coating is on surface {surface}, as in {self.given.base}.")
            film = coating_of_unit(panes, surface, solar=solar, visible=visible)
            glazing = Glazing(panes=panes, coatings={surface: film}, gaps=self.given.gaps)
            reflection = angular.glazing_reflection(glazing, angular.SURFACE_BAND)
            return self._glass(glazing, reflection, "coated glass")
        if self.given.panes is not None and len(self.given.panes) > 1:
            raise StudyError(
                "panes of a coated unit need the surface of the coating",
                where=self.given.where,
                hint="Add coatings = [{ surface = 2 }], or leave the panes out.",
            )
        self.assume("all panes reflect as one: where the coating is was not given.")
        return self._sheet(angular.coated_glass(solar=solar, visible=visible), "coated glass")

    def _clear(self) -> Finish:
        solar, visible = self.spec.solar_reflectance, self.spec.visible_reflectance
        given = solar is not None or visible is not None
        if given and self.given.extinction_given:
            raise StudyError(
                "the reflectance of clear glass follows from its extinction; give one of them",
                where=self.given.where,
            )
        panes = self._panes(least=1)
        if given and (solar is None or visible is None):
            self.assume("the band that is not given takes the extinction of clear float.")
        glazing = clear_glazing(panes, solar=solar, visible=visible, gaps=self.given.gaps)
        return self._glass(glazing, angular.glazing_reflection(glazing), "clear glass")

    def _rough(self, lobes: tuple[Lobe, ...]) -> tuple[Lobe, ...]:
        """Put the study's own roughness on the lobes."""
        given, along = self.given, 1e-3 * self.spec.slope_error_mrad
        if given.slope_error_across is not None and given.brush_along is None:
            self.assume("the brush lines run along the width of a panel.")
        if given.brush_along is not None and given.slope_error_across is None and self.base is None:
            raise StudyError(
                "brush_along goes with slope_error_across_mrad", where=f"{given.where}.brush_along"
            )
        rough = []
        for lobe in lobes:
            slope = lobe.slope_error_rad
            if along > 0.0 or given.slope_error_across is not None:
                across = along if given.slope_error_across is None else given.slope_error_across
                slope = (along, across)
            rough.append(
                replace(
                    lobe,
                    slope_error_rad=slope,
                    brush_along=given.brush_along or lobe.brush_along,
                    diffuse_fraction=lobe.diffuse_fraction
                    if given.diffuse_fraction is None
                    else given.diffuse_fraction,
                )
            )
        return tuple(rough)


_NOTHING = angular.SheetCoating(air=(0.0, 0.0), glass=(0.0, 0.0), transmittance=(1.0, 1.0))
