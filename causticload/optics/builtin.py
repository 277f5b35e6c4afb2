"""Built-in finishes by generic trade names, each with its source and usual range.

Figures in the sources are marked: "read" in a published text or a secondary one that cites it,
"from memory" otherwise. A built-in finish is a stand-in until the data sheet is known.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import replace
from types import MappingProxyType

import numpy as np

from causticload.optics import angular
from causticload.optics.datasheet import clear_glazing, coating_of_unit
from causticload.optics.finish import Finish, Lobe, pane_lobes
from causticload.optics.stack import Glazing, Pane

_FRESNEL = (
    "Fresnel's equations, index 1.52 (common practice), extinction of clear float from memory"
)
_HANDBOOK = "1 - solar absorptance of handbook tables (read in secondary sources)"
_SHEETS = "typical of data sheets by EN 410 and ISO 9050, from memory"
_ROUGH = "; slope error and diffuse share from memory"
_GAP = 0.016  # m (common practice)

Range = tuple[float, float]


def openness(finish: Finish) -> str:
    """Say what an unknown angular law leaves open.

    Parameters
    ----------
    finish : Finish
        Any.

    Returns
    -------
    sentence : str
        With the range of solar reflectance at 60 and 75 degrees; empty if the law is known.
    """
    if finish.reflection.limits is None:
        return ""
    theta = np.radians([60.0, 75.0])
    low, high = (f(theta)[:, 0].sum(axis=0).mean(axis=0) for f in (finish.low, finish.high))
    return (
        f"figures at normal incidence do not settle those at slanting angles; by the law for "
        f"{finish.angular} the solar reflectance is {low[0]:.2f} to {high[0]:.2f} at 60° and "
        f"{low[1]:.2f} to {high[1]:.2f} at 75°."
    )


def _clear(name: str, panes: int, usual: Range) -> Finish:
    glazing = clear_glazing([Pane()] * panes, solar=None, visible=None, gaps=(_GAP,) * (panes - 1))
    return Finish(
        name=name,
        lobes=pane_lobes(panes),
        reflection=angular.glazing_reflection(glazing),
        angular="clear glass",
        source=_FRESNEL + "; usual range read for 4 and 6 mm panes, else from memory",
        solar_range=usual,
        glazing=glazing,
        assumed=(f"panes of {1e3 * glazing.panes[0].thickness:g} mm clear float.",),
    )


def _one_pane(
    name: str, pane: Pane, usual: Range, words: str, solar: float | None = None
) -> Finish:
    glazing = clear_glazing([pane], solar=solar, visible=None)
    return Finish(
        name=name,
        lobes=pane_lobes(1),
        reflection=angular.glazing_reflection(glazing),
        angular="clear glass",
        source=_FRESNEL + "; usual range from memory",
        solar_range=usual,
        glazing=glazing,
        assumed=(words,),
    )


def _coated_unit(
    name: str, surface: int, figures: tuple[float, float], absorbed: Range, usual: Range
) -> Finish:
    """Double glazing of 6 mm panes with one coating that meets the unit's figures."""
    solar, visible = figures
    panes = (Pane(), Pane())
    film = coating_of_unit(panes, surface, solar=solar, visible=visible, absorbed=absorbed)
    glazing = Glazing(panes=panes, coatings={surface: film}, gaps=(_GAP,))
    finish = Finish(
        name=name,
        lobes=pane_lobes(2),
        reflection=angular.glazing_reflection(glazing, angular.SURFACE_BAND),
        angular="coated glass",
        source=_SHEETS,
        solar_range=usual,
        glazing=glazing,
    )
    return replace(
        finish,
        assumed=(
            f"solar reflectance {solar:g} and visible {visible:g} at normal incidence are typical "
            f"figures, with a coating on surface {surface}; enter those of the data sheet.",
            openness(finish),
        ),
    )


def _coated_pane(name: str, solar: float, visible: float, usual: Range) -> Finish:
    finish = Finish(
        name=name,
        lobes=pane_lobes(1),
        reflection=angular.coated_glass(solar=solar, visible=visible),
        angular="coated glass",
        source=_SHEETS,
        solar_range=usual,
    )
    return replace(
        finish,
        assumed=(
            f"solar reflectance {solar:g} and visible {visible:g} at normal incidence are typical "
            "figures, all on the outer pane; enter those of the data sheet.",
            openness(finish),
        ),
    )


def _sheet(
    name: str,
    solar: float,
    usual: Range,
    *,
    visible: float | None = None,
    slope_mrad: tuple[float, float] = (0.0, 0.0),
    diffuse: float = 0.0,
    source: str = _HANDBOOK,
) -> Finish:
    seen = "" if visible is not None else "visible reflectance is taken equal to the solar one."
    rough = any(slope_mrad) or diffuse > 0.0
    lobe = Lobe(
        name="sheet",
        slope_error_rad=(1e-3 * slope_mrad[0], 1e-3 * slope_mrad[1]),
        diffuse_fraction=diffuse,
    )
    finish = Finish(
        name=name,
        lobes=(lobe,),
        reflection=angular.metal(solar=solar, visible=solar if visible is None else visible),
        angular="metal",
        source=source + (_ROUGH if rough else ""),
        solar_range=usual,
    )
    return replace(finish, assumed=tuple(text for text in (seen, openness(finish)) if text))


def _stone() -> Finish:
    """Polished stone mirrors at its polished face only; what its body sends back is scattered."""
    glazing = Glazing(panes=(Pane(thickness=0.03, extinction=(2000.0, 2000.0), index=1.55),))
    return Finish(
        name="polished stone",
        lobes=(Lobe(name="sheet", slope_error_rad=(2e-3, 2e-3)),),
        reflection=angular.glazing_reflection(glazing),
        angular="clear glass",
        source="Fresnel's equations, index 1.55 of quartz and feldspar, from memory" + _ROUGH,
        solar_range=(0.04, 0.06),
        assumed=("only the polished face is counted; light from within the stone is scattered.",),
    )


def _mirror() -> Finish:
    return Finish(
        name="perfect mirror",
        lobes=(Lobe(name="sheet"),),
        reflection=angular.constant(solar=1.0, visible=1.0),
        angular="constant",
        source="by definition; for checks and upper bounds",
        solar_range=(1.0, 1.0),
    )


_ALL = (
    _clear("single clear glass", 1, (0.07, 0.08)),
    _clear("double clear glass", 2, (0.11, 0.13)),
    _clear("triple clear glass", 3, (0.13, 0.18)),
    _coated_unit("low-emissivity double glass", 3, (0.25, 0.12), (0.08, 0.05), (0.20, 0.30)),
    _coated_unit("solar-control double glass", 2, (0.33, 0.12), (0.25, 0.10), (0.28, 0.50)),
    _coated_pane("reflective solar-control glass", 0.35, 0.32, (0.20, 0.45)),
    _one_pane(
        "tinted glass",
        Pane(extinction=(20.0, 75.0)),
        (0.05, 0.06),
        "one 6 mm pane tinted in the body.",
        solar=0.055,
    ),
    _one_pane(
        "laminated clear glass",
        Pane(thickness=0.0128, extinction=(20.0, 6.0)),
        (0.06, 0.08),
        "two 6 mm panes and their interlayer count as one pane of glass of 12.8 mm.",
    ),
    _sheet(
        "polished stainless steel",
        0.67,
        (0.60, 0.68),
        visible=0.62,
        source=_HANDBOOK + "; visible from memory",
    ),
    _sheet("satin stainless steel", 0.48, (0.40, 0.55), slope_mrad=(60.0, 60.0), diffuse=0.2),
    _sheet(
        "brushed stainless steel",
        0.55,
        (0.45, 0.60),
        slope_mrad=(15.0, 90.0),
        diffuse=0.15,
        source="between polished and pickled of handbook tables, from memory",
    ),
    _sheet("polished aluminium", 0.87, (0.85, 0.90)),
    _sheet("anodised aluminium", 0.86, (0.80, 0.86), slope_mrad=(30.0, 30.0), diffuse=0.3),
    _sheet(
        "polished copper",
        0.82,
        (0.75, 0.82),
        visible=0.63,
        source=_HANDBOOK + "; visible from memory",
    ),
    _sheet("weathered copper", 0.36, (0.20, 0.40), slope_mrad=(80.0, 80.0), diffuse=0.6),
    _sheet("titanium sheet", 0.45, (0.40, 0.50), slope_mrad=(20.0, 20.0), source="from memory"),
    _sheet("galvanised steel", 0.36, (0.25, 0.45), slope_mrad=(40.0, 40.0), diffuse=0.4),
    _stone(),
    _mirror(),
)

BUILT_IN: Mapping[str, Finish] = MappingProxyType({finish.name: finish for finish in _ALL})


def list_finishes(finishes: Iterable[Finish] | None = None) -> list[dict[str, object]]:
    """List finishes with their figures.

    Parameters
    ----------
    finishes : iterable of Finish, optional
        Those to list; the built-in ones if they are not given.

    Returns
    -------
    rows : list of dict
        Name, panes or sheets, solar and visible reflectance of unpolarised light at 0, 60 and
        75 degrees, what the angular law leaves open, usual range, roughness, source.
    """
    theta = np.radians([0.0, 60.0, 75.0])
    rows: list[dict[str, object]] = []
    for f in _ALL if finishes is None else finishes:
        R, low, high = (
            law(theta).sum(axis=0).mean(axis=1) for law in (f.reflectance, f.low, f.high)
        )
        slope = [1e3 * max(lobe.slope_error_rad[way] for lobe in f.lobes) for way in (0, 1)]
        rows.append(
            {
                "name": f.name,
                "lobes": ", ".join(lobe.name for lobe in f.lobes),
                "angular": f.angular,
                "solar_at_0": float(R[0, 0]),
                "visible_at_0": float(R[1, 0]),
                "solar_at_60": float(R[0, 1]),
                "solar_at_75": float(R[0, 2]),
                "open_at_75": f"{low[0, 2]:.2f} to {high[0, 2]:.2f}" if f.reflection.limits else "",
                "usual_solar_range": f"{f.solar_range[0]:g} to {f.solar_range[1]:g}",
                "slope_error_mrad": slope[0]
                if slope[0] == slope[1]
                else f"{slope[0]:g} along and {slope[1]:g} across the brush",
                "diffuse_fraction": max(lobe.diffuse_fraction for lobe in f.lobes),
                "source": f.source,
            }
        )
    return rows
