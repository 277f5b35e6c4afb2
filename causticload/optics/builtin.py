"""Built-in finishes by generic trade names, each with its source and usual range."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from causticload.optics import angular
from causticload.optics.finish import Finish, Lobe
from causticload.optics.fresnel import Floats
from causticload.optics.stack import pane_reflectances

_FLOAT = "Fresnel's equations for 6 mm clear float, index 1.52 (common practice)"
_ABSORPTANCE = "1 - solar absorptance of handbook tables (read in secondary sources)"
_MEMORY = "typical of data sheets by EN 410, from memory"
_PANES = ("outer pane", "middle pane", "inner pane")


def _clear(name: str, panes: int, usual: tuple[float, float]) -> Finish:
    """Uncoated unit, each pane a lobe of its own."""
    unit = [angular.PANE_6MM] * panes

    def lobe(k: int) -> Lobe:
        def law(cos_i: Floats) -> Floats:
            R = pane_reflectances(unit, cos_i)[k]
            return np.stack([R, R])

        label = _PANES[k] if panes == 3 else (_PANES[0], _PANES[2])[k]
        return Lobe(label, law)

    return Finish(
        name=name,
        lobes=tuple(lobe(k) for k in range(panes)),
        source=_FLOAT,
        solar_range=usual,
    )


def _coated(name: str, solar: float, visible: float, usual: tuple[float, float]) -> Finish:
    return Finish(
        name=name,
        lobes=(Lobe("unit", angular.coated_glass(solar, visible)),),
        source=_MEMORY,
        solar_range=usual,
        band=angular.coated_band,
        assumed=(
            f"{name}: solar reflectance {solar:g} and visible {visible:g} at normal incidence are "
            "typical figures; enter those of the glazing's data sheet.",
        ),
    )


def _metal(
    name: str,
    solar: float,
    usual: tuple[float, float],
    *,
    slope_mrad: float = 0.0,
    diffuse: float = 0.0,
    source: str = _ABSORPTANCE,
) -> Finish:
    return Finish(
        name=name,
        lobes=(Lobe("sheet", angular.metal(solar, solar)),),
        source=source,
        solar_range=usual,
        slope_error_rad=1e-3 * slope_mrad,
        diffuse_fraction=diffuse,
    )


_ALL: tuple[Finish, ...] = (
    _clear("single clear glass", 1, (0.07, 0.08)),
    _clear("double clear glass", 2, (0.11, 0.14)),
    _clear("triple clear glass", 3, (0.14, 0.19)),
    _coated("low-emissivity double glass", 0.25, 0.12, (0.20, 0.30)),
    _coated("solar-control double glass", 0.33, 0.12, (0.28, 0.50)),
    _coated("reflective solar-control glass", 0.35, 0.32, (0.20, 0.45)),
    _coated("tinted glass", 0.055, 0.06, (0.05, 0.06)),
    _metal("polished stainless steel", 0.67, (0.60, 0.68)),
    _metal(
        "satin stainless steel",
        0.48,
        (0.40, 0.55),
        slope_mrad=60.0,
        diffuse=0.2,
        source=_ABSORPTANCE + "; slope error and diffuse share from memory",
    ),
    _metal("polished aluminium", 0.87, (0.85, 0.90)),
    _metal(
        "anodised aluminium",
        0.86,
        (0.80, 0.86),
        slope_mrad=30.0,
        diffuse=0.3,
        source=_ABSORPTANCE + "; slope error and diffuse share from memory",
    ),
    _metal("polished copper", 0.82, (0.75, 0.82)),
    _metal("weathered copper", 0.36, (0.20, 0.40), slope_mrad=80.0, diffuse=0.6),
    _metal("titanium sheet", 0.45, (0.40, 0.50), slope_mrad=20.0, source="from memory"),
    _metal("galvanised steel", 0.36, (0.25, 0.45), slope_mrad=40.0, diffuse=0.4),
    Finish(
        name="perfect mirror",
        lobes=(Lobe("sheet", angular.constant(1.0, 1.0)),),
        source="by definition; for checks",
        solar_range=(1.0, 1.0),
    ),
)

BUILT_IN: dict[str, Finish] = {f.name: f for f in _ALL}


def list_finishes(finishes: Sequence[Finish] = _ALL) -> list[dict[str, object]]:
    """List finishes with their figures.

    Parameters
    ----------
    finishes : sequence of Finish
        Those to list; the built-in ones if they are not given.

    Returns
    -------
    rows : list of dict
        Name, solar and visible reflectance at 0 and 60 degrees, range, source.
    """
    cos = np.array([1.0, 0.5])
    rows: list[dict[str, object]] = []
    for f in finishes:
        R = f.reflectance(cos).mean(axis=1)
        rows.append(
            {
                "name": f.name,
                "solar_at_0": float(R[0, 0]),
                "visible_at_0": float(R[1, 0]),
                "solar_at_60": float(R[0, 1]),
                "usual_solar_range": f"{f.solar_range[0]:g} to {f.solar_range[1]:g}",
                "slope_error_mrad": 1e3 * f.slope_error_rad,
                "diffuse_fraction": f.diffuse_fraction,
                "source": f.source,
            }
        )
    return rows
