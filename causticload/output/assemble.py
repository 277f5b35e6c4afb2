"""Put a year's parts together: loads by receiver, rows for charts, and the summary."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict
from typing import Any

import numpy as np

from causticload.hazard.cautions import Protects, cautions_for
from causticload.hazard.criteria import Criterion
from causticload.hazard.exceed import CriterionMap
from causticload.light.prepare import LitScene
from causticload.light.year import DayResult
from causticload.output.results import ReceiverYear, Year
from causticload.scene.model import Scene
from causticload.scene.tessellation import check_tessellation
from causticload.sky.plan import DayPlan
from causticload.version import __version__


def points_by_surface(lit: LitScene) -> dict[int, Any]:
    """Numbers of the receiver points of each surface.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.

    Returns
    -------
    index : dict of int to (n,) int
        Number of the surface to those of its points, ascending.
    """
    return {int(s): np.flatnonzero(lit.point_surface == s) for s in np.unique(lit.point_surface)}


def receiver_years(
    lit: LitScene, loads: dict[str, Any], over: dict[str, Any], criteria: CriterionMap
) -> dict[str, ReceiverYear]:
    """Lay the year's sums out by receiver.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.
    loads : dict
        From :func:`causticload.light.tally.merge_loads`.
    over : dict
        From :func:`causticload.hazard.exceed.merge_exceedance`.
    criteria : CriterionMap
        Which criteria hold where.

    Returns
    -------
    receivers : dict of str to ReceiverYear
        By name.
    """
    scene = lit.scene
    spacing = np.repeat([c.spacing for c in scene.charts], [len(c.areas) for c in scene.charts])
    receivers = {}
    for number, index in points_by_surface(lit).items():
        surface = scene.surfaces[number]
        names = [c.name for k, c in enumerate(criteria.criteria) if criteria.holds[k, number]]
        nothing = np.zeros(len(index))
        kept = {n: over.get(n) for n in names}
        time = loads["peak_time"][index].astype("datetime64[s]")

        def column(key: str, index: Any = index, kept: Any = kept, nothing: Any = nothing) -> Any:
            return {n: k[key][index] if k else nothing.copy() for n, k in kept.items()}

        receivers[surface.name] = ReceiverYear(
            name=surface.name,
            kind=surface.kind,
            points=lit.points[index] + scene.origin,
            normals=lit.point_normals[index],
            areas=lit.point_areas[index],
            spacing=spacing[index],
            first=int(index[0]),
            peak_reflected=loads["peak"][index].astype(float),
            peak_time=time,
            energy=loads["energy"][index].astype(float),
            images=loads["images"][index],
            minutes_over=column("minutes"),
            days_over=column("days"),
            most_minutes=column("most"),
        )
    return receivers


def day_rows(
    scene: Scene, plan: Sequence[DayPlan], days: Sequence[DayResult]
) -> list[dict[str, Any]]:
    """Worst reflected load per receiver and step of each date, for charts of the year.

    Parameters
    ----------
    scene : Scene
        The scene.
    plan : sequence of DayPlan
        The year's representative days.
    days : sequence of DayResult
        What they came to, in the same order.

    Returns
    -------
    rows : list of dict
        One a date, in order.
    """
    names = [s.name for s in scene.surfaces]
    receives = [i for i, s in enumerate(scene.surfaces) if "receiver" in s.roles]
    rows = []
    for day, result in zip(plan, days, strict=True):
        for d, date in enumerate(day.dates):
            rows.append(
                {
                    "date": date.isoformat(),
                    "stands_for_days": float(day.weights[d]),
                    "times": day.times[d].astype("datetime64[s]"),
                    "azimuth": np.degrees(day.azimuth_rad),
                    "elevation": np.degrees(day.elevation_rad),
                    "worst": {names[i]: result.worst[d, :, i] for i in receives},
                }
            )
    return sorted(rows, key=lambda r: r["date"])


def summarise(
    year: Year,
    lit: LitScene,
    criteria: CriterionMap,
    plan: Sequence[DayPlan],
    days: Sequence[DayResult],
    *,
    assumed: Sequence[str],
    seconds: float,
) -> dict[str, Any]:
    """Sum a year up: figures, settings, assumptions and cautions, beside the findings.

    Parameters
    ----------
    year : Year
        The year, without its summary.
    lit : LitScene
        The prepared scene.
    criteria : CriterionMap
        Which criteria hold where.
    plan : sequence of DayPlan
        The year's representative days.
    days : sequence of DayResult
        What they came to.
    assumed : sequence of str
        What was assumed.
    seconds : float
        How long it took. [s]

    Returns
    -------
    summary : dict
        What ``summary.json`` holds.
    """
    ledger = _year_ledger(plan, days)
    scene, study = lit.scene, year.study
    checks = [e.check for e in year.episodes if e.check]
    return {
        "title": study.title,
        "program": {"name": "causticload", "version": __version__},
        "tracer": lit.tracer.name,
        "site": {
            "latitude": study.site.latitude,
            "longitude": study.site.longitude,
            "elevation": study.site.elevation,
            "timezone": study.site.timezone,
            "model_north": study.site.model_north,
        },
        "year": {
            "year": study.year.year,
            "step_minutes": study.year.step_minutes,
            "day_stride": study.year.day_stride,
            "representative_days": len(plan),
            "positions_of_the_sun": int(sum(p.beam.shape[1] for p in plan)),
        },
        "scene": _scene_record(scene),
        "criteria": [
            _criterion_record(c, [s.name for s, on in zip(scene.surfaces, row, strict=True) if on])
            for c, row in zip(criteria.criteria, criteria.holds, strict=True)
        ],
        "receivers": [_receiver_record(r) for r in year.receivers.values()],
        "ledger_kWh": ledger,
        "tessellation": [asdict(c) for c in check_tessellation(scene)],
        "ray_counts": {
            "made": len(checks),
            "agree_within_three_standard_errors": sum(bool(c.agrees) for c in checks),
        },
        "assumed": list(assumed),
        "cautions": list(cautions_for(_protected(criteria, year))),
        "seconds": seconds,
    }


def _protected(criteria: CriterionMap, year: Year) -> set[Protects]:
    """Whom and what the findings are about."""
    eyes: set[Protects] = {"people: eyes"} if year.study.observers else set()
    return {c.protects for c in criteria.criteria} | eyes


def _year_ledger(plan: Sequence[DayPlan], days: Sequence[DayResult]) -> dict[str, float]:
    """Energy of the year in kWh, and how well it closes, as a share of what was intercepted."""
    ledger = {
        key: sum(d.ledger[key] * sum(p.weights) for d, p in zip(days, plan, strict=True)) / 3.6e6
        for key in days[0].ledger
    }
    taken = ledger["intercepted"]
    parts = ("absorbed", "receivers", "obstructions", "sky", "scattered", "unfollowed")
    gap = taken - sum(ledger[p] for p in parts)
    return {**ledger, "closure": gap / taken if taken > 0.0 else 0.0}


def _scene_record(scene: Scene) -> dict[str, Any]:
    return {
        "triangles": len(scene.triangles),
        "panels": len(scene.panels),
        "reflector_area_m2": float(scene.panels.area.sum()),
        "receiver_points": scene.point_count,
        "origin_m": [float(x) for x in scene.origin],
        "surfaces": [
            {
                "name": s.name,
                "roles": sorted(s.roles),
                "form": s.form,
                "finish": s.finish,
                "kind": s.kind,
                "triangles": s.triangles,
            }
            for s in scene.surfaces
        ],
        "faults": [
            {"kind": f.kind, "count": f.count, "surface": f.surface, "message": f.message}
            for f in scene.faults
        ],
    }


def _criterion_record(c: Criterion, receivers: list[str]) -> dict[str, Any]:
    return {
        "name": c.name,
        "protects": c.protects,
        "quantity": c.quantity,
        "limit": c.limit,
        "unit": c.unit,
        "minutes": c.minutes,
        "formula": c.formula,
        "source": c.source,
        "confidence": c.confidence,
        "validity": c.validity,
        "caution": c.caution,
        "receivers": receivers,
    }


def _receiver_record(r: ReceiverYear) -> dict[str, Any]:
    peak = float(r.peak_reflected.max(initial=0.0))
    return {
        "name": r.name,
        "kind": r.kind,
        "points": len(r.areas),
        "area_m2": float(r.areas.sum()),
        "peak_reflected_W_m2": peak,
        "peak_time": f"{r.peak_time[r.peak_reflected.argmax()]}Z" if peak > 0.0 else None,
        "most_images": int(r.images.max(initial=0)),
        "energy_MJ": float((r.energy * r.areas).sum() / 1e6),
        "over": {
            name: {
                "most_minutes_per_day": float(r.most_minutes[name].max(initial=0.0)),
                "most_minutes_per_year": float(r.minutes_over[name].max(initial=0.0)),
                "most_days": float(r.days_over[name].max(initial=0.0)),
                "area_m2": float(r.areas[r.minutes_over[name] > 0.0].sum()),
            }
            for name in r.minutes_over
        },
    }
