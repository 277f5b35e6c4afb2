"""What a change of design did: two years side by side, as tables, meshes and a page."""

from __future__ import annotations

import csv
import io
from collections.abc import Callable, Sequence
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any, Literal

import numpy as np

from causticload.hazard.cautions import GENERAL
from causticload.output import meshes
from causticload.output.colours import CHANGE_MAP, map_colours, round_end
from causticload.output.files import to_json, working_in, write_text, write_whole
from causticload.output.memo.evidence import Evidence
from causticload.output.memo.findings import gather
from causticload.output.results import ReceiverYear
from causticload.scene.model import Floats

Fate = Literal["worse", "new", "same", "better", "gone"]
ORDER: tuple[Fate, ...] = ("new", "worse", "same", "better", "gone")
# A change of less is within what days and steps leave open.
PART = 0.05
SAME_PLACE = 0.01  # of a cell: points of two runs that lie this close are the same


@dataclass(frozen=True)
class Side:
    """What one design does to one limit on one receiver."""

    peak: float  # on the grid, of the limit's quantity, W/m²
    days: float  # calendar days
    place_minutes: float  # in the year, at the place that is hit longest


@dataclass(frozen=True)
class Change:
    """One receiver and one limit, before and after."""

    receiver: str
    criterion: str
    protects: str
    fate: Fate
    before: Side | None  # None: not over the limit
    after: Side | None


@dataclass(frozen=True)
class Comparison:
    """Two years side by side."""

    before: Evidence
    after: Evidence
    changes: tuple[Change, ...]  # for the worse first
    loads: dict[str, Floats]  # receiver -> (n,) change of peak reflected load, W/m²
    unlike: tuple[str, ...]  # receivers whose grids differ, or that stand in one run only
    settings: tuple[str, ...]  # what else is not the same in the two runs


def compare_years(before: str | Path, after: str | Path) -> Comparison:
    """Compare two result folders.

    Parameters
    ----------
    before, after : str or Path
        Result folders of two years.

    Returns
    -------
    comparison : Comparison
        Findings by receiver and limit, and loads where the receivers' grids are the same.

    Raises
    ------
    ResultError
        If a folder is missing, partial, or of another schema.
    """
    a, b = Evidence(Path(before)), Evidence(Path(after))
    mine, theirs = _sides(a), _sides(b)
    changes = [
        Change(
            receiver=key[0],
            criterion=key[1],
            protects=(mine.get(key) or theirs[key])[1],
            fate=_fate(x := _side(mine, key), y := _side(theirs, key)),
            before=x,
            after=y,
        )
        for key in dict.fromkeys([*mine, *theirs])
    ]
    rank = {fate: k for k, fate in enumerate(ORDER)}
    loads = {
        name: theirs_too.peak_reflected - r.peak_reflected
        for name, r in a.year.receivers.items()
        if (theirs_too := b.year.receivers.get(name)) is not None and _same_grid(r, theirs_too)
    }
    names = dict.fromkeys([*a.year.receivers, *b.year.receivers])
    return Comparison(
        before=a,
        after=b,
        changes=tuple(sorted(changes, key=lambda c: rank[c.fate])),
        loads=loads,
        unlike=tuple(n for n in names if n not in loads),
        settings=_settings(a, b),
    )


Sides = dict[tuple[str, str], tuple[Side, str]]


def _sides(evidence: Evidence) -> Sides:
    """Each receiver and limit with an exceedance, worst first."""
    peaks: dict[tuple[str, str], float] = {}
    for e in evidence.year.episodes:
        key = (e.receiver, e.criterion)
        peaks[key] = max(peaks.get(key, 0.0), e.peak)
    return {
        (f.receiver, c): (
            Side(peaks[f.receiver, c], facts.days, facts.place_minutes_per_year),
            f.protects,
        )
        for f in gather(evidence.year)
        for facts in f.limits
        for c in [facts.criterion["name"]]
    }


def _side(sides: Sides, key: tuple[str, str]) -> Side | None:
    return sides[key][0] if key in sides else None


def _fate(before: Side | None, after: Side | None) -> Fate:
    if before is None:
        return "new"
    if after is None:
        return "gone"
    pairs = ((before.peak, after.peak), (before.place_minutes, after.place_minutes))
    if any(y > x * (1.0 + PART) for x, y in pairs):
        return "worse"
    return "better" if any(y < x * (1.0 - PART) for x, y in pairs) else "same"


def _same_grid(a: ReceiverYear, b: ReceiverYear) -> bool:
    if len(a.points) != len(b.points):
        return False
    return bool((np.abs(a.points - b.points).max(axis=1) < SAME_PLACE * a.spacing).all())


def _settings(a: Evidence, b: Evidence) -> tuple[str, ...]:
    """Names of what differs in the two runs besides the model."""
    parts: dict[str, Callable[[Evidence], Any]] = {
        "site": lambda e: e.summary["site"],
        "year": lambda e: {k: e.summary["year"][k] for k in ("year", "step_minutes", "day_stride")},
        "sky": lambda e: asdict(e.year.study.sky),
        "limits": lambda e: {
            c["name"]: (c["quantity"], c["limit"], c["minutes"]) for c in e.summary["criteria"]
        },
        "program": lambda e: e.summary["program"],
    }
    return tuple(name for name, part in parts.items() if part(a) != part(b))


def comparison_record(comparison: Comparison) -> dict[str, Any]:
    """Turn a comparison into plain records.

    Parameters
    ----------
    comparison : Comparison
        The comparison.

    Returns
    -------
    record : dict
        For JSON.
    """
    c = comparison
    return {
        "before": {"title": c.before.summary["title"], "folder": str(c.before.folder)},
        "after": {"title": c.after.summary["title"], "folder": str(c.after.folder)},
        "differing_settings": list(c.settings),
        "counts": {fate: sum(x.fate == fate for x in c.changes) for fate in ORDER},
        "changes": [asdict(x) for x in c.changes],
        "receivers": [
            {
                "name": name,
                "largest_rise_W_m2": float(change.max(initial=0.0)),
                "largest_fall_W_m2": float(-change.min(initial=0.0)),
            }
            for name, change in c.loads.items()
        ],
        "receivers_not_compared": list(c.unlike),
        "cautions": list(GENERAL),
    }


def changes_csv(changes: Sequence[Change]) -> str:
    """List changes as CSV, with the caution in a column of its own.

    Parameters
    ----------
    changes : sequence of Change
        The changes.

    Returns
    -------
    text : str
        CSV.
    """
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    sides = [
        f"{name}_{when}"
        for name in ("grid_peak_W_m2", "days", "most_minutes_per_year_at_one_place")
        for when in ("before", "after")
    ]
    writer.writerow(["receiver", "criterion", "protects", "change", *sides, "caution"])
    for c in changes:
        pairs = [
            "" if side is None else f"{getattr(side, name):.1f}"
            for name in ("peak", "days", "place_minutes")
            for side in (c.before, c.after)
        ]
        writer.writerow([c.receiver, c.criterion, c.protects, c.fate, *pairs, GENERAL[0]])
    return out.getvalue()


def save_comparison(comparison: Comparison, path: Path) -> Path:
    """Write a comparison: JSON, a table, difference meshes, and a page for a memo.

    Parameters
    ----------
    comparison : Comparison
        The comparison.
    path : Path
        The folder.

    Returns
    -------
    path : Path
        The folder.

    Raises
    ------
    ResultError
        If it cannot be written.
    """
    from causticload.output.memo.change import write_change_memo

    with working_in(path):
        write_text(path / "comparison.json", to_json(comparison_record(comparison)))
        write_text(path / "changes.csv", changes_csv(comparison.changes))
        if comparison.loads:
            _save_meshes(comparison, path)
        write_change_memo(comparison, path)
    return path


def _save_meshes(comparison: Comparison, path: Path) -> None:
    """Cells of the receivers that both runs have, with loads before, after and their change."""
    a, b = comparison.before, comparison.after
    rows_a = np.concatenate([_rows(a.year.receivers[n]) for n in comparison.loads])
    rows_b = np.concatenate([_rows(b.year.receivers[n]) for n in comparison.loads])
    change = np.concatenate(list(comparison.loads.values()))
    end = round_end(float(np.abs(change).max(initial=0.0)))
    quads = a.cells[rows_a]
    n = len(quads)
    normal = np.cross(quads[:, 1] - quads[:, 0], quads[:, 3] - quads[:, 0])
    normal /= np.maximum(np.linalg.norm(normal, axis=1, keepdims=True), 1e-12)
    cells = meshes.Cells(
        quads.reshape(-1, 3),
        np.arange(4 * n).reshape(-1, 4),
        normal,
        np.linalg.norm(quads[:, 1] - quads[:, 0], axis=1),
    )
    peak = "peak reflected [W/m2]"
    arrays = {
        f"{peak} before": a.cell_data[peak][rows_a],
        f"{peak} after": b.cell_data[peak][rows_b],
        "change of peak reflected [W/m2]": change,
    }
    common = [c for c in a.cell_data if c.startswith("over ") and c in b.cell_data]
    for name in common:
        arrays[f"change of {name}"] = b.cell_data[name][rows_b] - a.cell_data[name][rows_a]
    notes = {
        "title": f"{a.summary['title']} and {b.summary['title']}: change of peak reflected load",
        "scale": f"purple: less, orange: more; ends at {end:g} W/m2; unit W/m2",
        "cautions": " ".join(GENERAL),
    }
    grid = meshes.cell_grid(cells, arrays, notes)
    write_whole(path / "change.vtp", grid.save)
    shown = np.abs(change) > 0.0
    if not shown.any():
        return  # an empty mesh is no PLY; the arrays above tell that nothing changed
    raised = quads[shown] + meshes.RAISE_M * normal[shown][:, None]
    colours = map_colours(-change[shown], low=-end, high=end, name=CHANGE_MAP)
    coloured = meshes.quad_mesh(raised, colours)
    write_whole(path / "change.ply", lambda p: meshes.write_ply(coloured, p, notes))


def _rows(r: ReceiverYear) -> Any:
    """Cells of a receiver in the order of its folder."""
    return np.arange(r.first, r.first + len(r.areas))
