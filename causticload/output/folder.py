"""The result folder of a year: written whole, read back without the study's meshes."""

from __future__ import annotations

import json
import warnings
from collections.abc import Callable
from datetime import UTC, datetime
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path
from typing import Any

import numpy as np
import pyvista as pv

from causticload.errors import CausticloadError, ResultError
from causticload.hazard.further import SurfaceHistory
from causticload.hazard.histories import History
from causticload.output import meshes, pictures, tables
from causticload.output.colours import round_end
from causticload.output.days import DayStore
from causticload.output.files import to_json, working_in, write_text, write_whole
from causticload.output.records import (
    to_episode,
    to_finding,
    to_observer,
    to_record,
    to_season,
)
from causticload.output.results import ReceiverYear, Year
from causticload.scene.model import Bools, Floats, Scene
from causticload.sky.position import sun_direction
from causticload.study import input_hashes, read_study, write_study

__all__ = ["DayStore", "read_year", "save_year", "working_in"]

SCHEMA = 1
LIBRARIES = ("numpy", "scipy", "numba", "trimesh", "embreex", "pvlib", "pyvista", "shapely")


def save_year(year: Year, path: Path) -> Path:
    """Write a year's result folder.

    Parameters
    ----------
    year : Year
        The year; it must still have its scene.
    path : Path
        The folder.

    Returns
    -------
    path : Path
        The folder.

    Raises
    ------
    ResultError
        If it cannot be written, or the year was read from a folder.
    """
    scene = year.scene
    if scene is None:
        raise ResultError("this year was read from a folder and is saved there already")
    # The summary is what says that a folder is complete: it goes first and comes last.
    (path / "summary.json").unlink(missing_ok=True)
    notes = _notes(year)
    flagged = flagged_points(year)
    peak = np.concatenate([r.peak_reflected for r in _ordered(year)] or [np.zeros(0)])
    high = round_end(float(peak.max(initial=0.0)))
    cells = meshes.cells_of(scene)
    _save_arrays(year, scene, cells, path, notes)
    coloured = meshes.coloured_cells(cells, peak, high=high, flagged=flagged, shown=peak > 0.0)
    facade = meshes.coloured_facade(
        scene, year.contribution, high=round_end(float(year.contribution.max(initial=0.0)))
    )
    write_whole(path / "receivers.ply", lambda p: meshes.write_ply(coloured, p, notes))
    write_whole(path / "facade.ply", lambda p: meshes.write_ply(facade, p, notes))
    parts = {
        "receivers: peak reflected load": coloured,
        "facade: contribution to the worst peak": facade,
        "surroundings": meshes.surroundings(scene),
    }
    write_whole(path / "model.glb", lambda p: meshes.write_glb(parts, p, notes))
    write_text(path / "episodes.csv", tables.episodes_csv(year))
    write_text(path / "seasons.csv", tables.seasons_csv(year))
    write_text(path / "panels.csv", tables.panels_csv(year))
    limits = sorted({c["limit"] for c in year.summary["criteria"]})
    write_whole(
        path / "scale.png",
        lambda p: pictures.draw_scale(p, high=high, limits=limits, label="Peak reflected load"),
    )
    pictures.year_pictures(year, path / "figures")
    _save_chart_rows(year, path)
    _save_panels(scene, path)
    _save_histories(year, path)
    write_study(year.study, path / "study.toml")
    write_text(path / "summary.json", to_json(_full_summary(year)))
    return path


def _ordered(year: Year) -> list[ReceiverYear]:
    """Receivers in the order of their points in the scene."""
    return sorted(year.receivers.values(), key=lambda r: r.first)


def flagged_points(year: Year) -> Bools:
    """Points over any criterion for longer than it tolerates, in the order of the scene, (n,).

    Parameters
    ----------
    year : Year
        The year.

    Returns
    -------
    flagged : (n,) bool
        One value a point.
    """
    rows = []
    for r in _ordered(year):
        over = np.zeros(len(r.areas), bool)
        for days in r.days_over.values():
            over |= days > 0.0
        rows.append(over)
    return np.concatenate(rows or [np.zeros(0, bool)])


def _notes(year: Year) -> dict[str, str]:
    return {
        "title": f"{year.summary['title']}: the year {year.summary['year']['year']}",
        "scale": "colours run evenly from 0 to the end given in scale.png; unit W/m2",
        "program": f"causticload {year.summary['program']['version']}",
        "cautions": " ".join(year.summary["cautions"]),
    }


def _save_arrays(
    year: Year, scene: Scene, cells: meshes.Cells, path: Path, notes: dict[str, str]
) -> None:
    ordered = _ordered(year)

    def joined(pick: Any) -> Floats:
        return np.concatenate([pick(r) for r in ordered] or [np.zeros(0)])

    seconds = joined(lambda r: r.peak_time.astype("datetime64[s]").astype(np.int64))
    arrays: dict[str, Any] = {
        "peak reflected [W/m2]": joined(lambda r: r.peak_reflected),
        "peak time [s since 1970 UTC]": seconds,
        "energy [MJ/m2]": joined(lambda r: r.energy / 1e6),
        "images [1]": joined(lambda r: r.images),
        "cell area [m2]": joined(lambda r: r.areas),
        "receiver [number]": np.concatenate(
            [np.full(len(r.areas), k) for k, r in enumerate(ordered)] or [np.zeros(0, int)]
        ),
    }
    for name in sorted({n for r in ordered for n in r.minutes_over}):
        for label, kept in (
            (f"over {name} [min/year]", "minutes_over"),
            (f"over {name} [days/year]", "days_over"),
            (f"over {name} [min on the worst day]", "most_minutes"),
        ):
            arrays[label] = joined(
                lambda r, k=kept, n=name: getattr(r, k).get(n, np.full(len(r.areas), np.nan))
            )
    receivers = meshes.cell_grid(
        cells, arrays, {**notes, "receivers": "; ".join(r.name for r in ordered)}
    )
    write_whole(path / "receivers.vtp", receivers.save)
    r = scene.reflectors
    focus, sun = _focus_at_worst(year, scene)
    facade = meshes.facade_grid(
        scene,
        {
            "panel [number]": scene.panel[r],
            "contribution to the worst peak [W/m2]": year.contribution[scene.panel[r]],
            "curvature [1/m]": scene.curvature[r].mean(axis=1),
            **focus,
        },
        {**notes, "sun of the focal distances": sun},
    )
    write_whole(path / "facade.vtp", facade.save)


def _focus_at_worst(year: Year, scene: Scene) -> tuple[dict[str, Floats], str]:
    """Focal distances under the sun of the worst peak that was looked at closely, and that sun."""
    check = next((e.check for e in year.episodes if e.check is not None), None)
    if check is None:
        return {}, "none: no peak was looked at closely"
    direction = sun_direction(
        np.radians([check.sun_azimuth]),
        np.radians([check.sun_elevation]),
        north_rad=scene.north_rad,
    )
    sun = f"azimuth {check.sun_azimuth:.2f}, elevation {check.sun_elevation:.2f} degrees"
    return meshes.focus_arrays(scene, direction[0]), sun


def _save_chart_rows(year: Year, path: Path) -> None:
    """Worst load per receiver, day and step, for the charts of a memo."""
    arrays: dict[str, Any] = {
        "dates": np.array([r["date"] for r in year.days]),
        "stands_for_days": np.array([r["stands_for_days"] for r in year.days]),
        "receivers": np.array([r.name for r in _ordered(year)]),
        "steps": np.array([len(r["times"]) for r in year.days]),
    }
    for key in ("times", "azimuth", "elevation"):
        arrays[key] = np.concatenate([r[key] for r in year.days])
    arrays["worst"] = np.concatenate(
        [np.stack([r["worst"][x.name] for x in _ordered(year)], axis=1) for r in year.days]
    )

    def write(p: Path) -> None:
        with p.open("wb") as file:
            np.savez_compressed(file, **arrays)

    write_whole(path / "chart.npz", write)


def _save_histories(year: Year, path: Path) -> None:
    """Loads and temperatures at the worst peak of each season looked at closely."""
    numbers = sorted(year.histories)
    each = [year.histories[n] for n in numbers]
    arrays: dict[str, Any] = {
        "season": np.array(numbers, dtype=np.int32),
        "start": np.cumsum([0, *(len(h.surface_c) for h in each)]),
    }
    columns: dict[str, Callable[[SurfaceHistory], Any]] = {
        "time": lambda h: h.loads.time,
        "reflected": lambda h: h.loads.reflected,
        "direct": lambda h: h.loads.direct,
        "diffuse": lambda h: h.loads.diffuse,
        "air_c": lambda h: h.loads.air_c,
        "wind_ms": lambda h: h.loads.wind,
        "surface_c": lambda h: h.surface_c,
        "without_c": lambda h: h.without_c,
    }
    for key, pick in columns.items():
        arrays[key] = np.concatenate([pick(h) for h in each] or [np.zeros(0)])

    def write(target: Path) -> None:
        with target.open("wb") as file:
            np.savez_compressed(file, **arrays)

    write_whole(path / "histories.npz", write)


def _read_histories(folder: Path) -> dict[int, SurfaceHistory]:
    with np.load(folder / "histories.npz") as file:
        found = {}
        for k, number in enumerate(file["season"]):
            part = slice(int(file["start"][k]), int(file["start"][k + 1]))
            loads = ("time", "reflected", "direct", "diffuse", "air_c", "wind_ms")
            found[int(number)] = SurfaceHistory(
                History(*(file[key][part] for key in loads)),
                file["surface_c"][part],
                file["without_c"][part],
            )
        return found


def _save_panels(scene: Scene, path: Path) -> None:
    """Panels' places and sizes, for tables and elevations."""
    p = scene.panels

    def write(target: Path) -> None:
        with target.open("wb") as file:
            np.savez_compressed(
                file,
                surface=p.surface,
                area=p.area,
                centroid=p.centroid + scene.origin,
                normal=p.normal,
                flat=p.flat,
                width_axis=p.width_axis,
                size=p.size,
            )

    write_whole(path / "panels.npz", write)


def _full_summary(year: Year) -> dict[str, Any]:
    return {
        "schema_version": SCHEMA,
        "finished": datetime.now(UTC).isoformat(timespec="seconds"),
        **year.summary,
        "inputs_sha256": input_hashes(year.study),
        "libraries": {name: _version(name) for name in LIBRARIES},
        "observers": to_record(year.observers),
        "findings": [to_record(year.findings[n]) for n in sorted(year.findings)],
        "seasons": to_record(year.seasons),
        "episodes": to_record(year.episodes),
    }


def _version(name: str) -> str:
    try:
        return version(name)
    except PackageNotFoundError:
        return "not installed"


def read_year(path: str | Path) -> Year:
    """Read a year's result folder.

    Parameters
    ----------
    path : str or Path
        The folder.

    Returns
    -------
    year : Year
        Without its scene; everything else as it was saved.

    Raises
    ------
    ResultError
        If the folder is missing, partial, or of another schema.
    """
    folder = Path(path)
    if not folder.is_dir():
        raise ResultError("there is no such folder", where=str(folder))
    try:
        summary = json.loads((folder / "summary.json").read_text(encoding="utf-8"))
    except FileNotFoundError:
        raise ResultError(
            "summary.json is missing: the year was not finished",
            where=str(folder),
            hint="Finish it with: causticload year STUDY --out DIR --resume.",
        ) from None
    except (OSError, ValueError) as error:
        raise ResultError(f"summary.json cannot be read: {error}", where=str(folder)) from error
    if summary.get("schema_version") != SCHEMA:
        raise ResultError(
            f"schema version {summary.get('schema_version')!r} is not {SCHEMA}",
            where=str(folder / "summary.json"),
            hint="Run the year again with this version of the program.",
        )
    try:
        return _rebuild(folder, summary)
    except CausticloadError as error:
        raise ResultError(
            error.message, where=str(folder / error.where), hint=error.hint
        ) from error
    except (OSError, KeyError, ValueError, TypeError) as error:
        raise ResultError(
            f"a file is missing or broken: {error}",
            where=str(folder),
            hint="Run the year again.",
        ) from error


def read_mesh(path: Path) -> pv.PolyData:
    """Read a VTK file whole, or say that it is broken.

    Parameters
    ----------
    path : Path
        A ``.vtp`` file.

    Returns
    -------
    mesh : pyvista.PolyData
        As it was saved.

    Raises
    ------
    ValueError
        If it is not such a file, or cut short; the reader alone would only warn.
    """
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        try:
            return pv.read(path)
        except UserWarning as warning:
            raise ValueError(f"{path.name} cannot be read") from warning


def _rebuild(folder: Path, summary: dict[str, Any]) -> Year:
    for name in ("receivers.vtp", "facade.vtp", "chart.npz", "histories.npz", "study.toml"):
        if not (folder / name).is_file():
            raise ResultError(f"{name} is missing", where=str(folder), hint="Run the year again.")
    episodes = [to_episode(r) for r in summary.pop("episodes")]
    seasons = [to_season(r) for r in summary.pop("seasons")]
    findings = {r["season"]: to_finding(r) for r in summary.pop("findings")}
    observers = [to_observer(r) for r in summary.pop("observers")]
    facade = read_mesh(folder / "facade.vtp")
    panel = np.asarray(facade.cell_data["panel [number]"])
    load = np.asarray(facade.cell_data["contribution to the worst peak [W/m2]"])
    contribution = np.zeros(int(summary["scene"]["panels"]))
    contribution[panel] = load
    return Year(
        study=read_study(folder / "study.toml", files_needed=False),
        receivers=_read_receivers(folder, summary),
        episodes=episodes,
        seasons=seasons,
        summary=summary,
        contribution=contribution,
        days=_read_chart_rows(folder),
        findings=findings,
        histories=_read_histories(folder),
        observers=observers,
    )


def _read_receivers(folder: Path, summary: dict[str, Any]) -> dict[str, ReceiverYear]:
    mesh = read_mesh(folder / "receivers.vtp")
    data = mesh.cell_data
    corner = np.asarray(mesh.points)[mesh.faces.reshape(-1, 5)[:, 1:]]
    edge = corner[:, 1] - corner[:, 0]
    spacing = np.linalg.norm(edge, axis=1)
    normals = np.cross(edge, corner[:, 3] - corner[:, 0])
    normals /= np.linalg.norm(normals, axis=1, keepdims=True)
    number = np.asarray(data["receiver [number]"])
    names = str(mesh.field_data["receivers"][0]).split("; ")
    by_name = {r["name"]: r for r in summary["receivers"]}
    receivers = {}
    for k, name in enumerate(names):
        mine = np.flatnonzero(number == k)
        if not len(mine):
            continue

        def column(key: str, mine: Any = mine) -> Any:
            return np.asarray(data[key])[mine]

        over = list(by_name[name]["over"])
        receivers[name] = ReceiverYear(
            name=name,
            kind=by_name[name]["kind"],
            points=corner[mine].mean(axis=1),
            normals=normals[mine],
            areas=column("cell area [m2]"),
            spacing=spacing[mine],
            first=int(mine[0]),
            peak_reflected=column("peak reflected [W/m2]"),
            peak_time=column("peak time [s since 1970 UTC]").astype("datetime64[s]"),
            energy=column("energy [MJ/m2]") * 1e6,
            images=column("images [1]"),
            minutes_over={n: column(f"over {n} [min/year]") for n in over},
            days_over={n: column(f"over {n} [days/year]") for n in over},
            most_minutes={n: column(f"over {n} [min on the worst day]") for n in over},
        )
    return receivers


def _read_chart_rows(folder: Path) -> list[dict[str, Any]]:
    with np.load(folder / "chart.npz") as file:
        kept = {name: file[name] for name in file.files}  # each access would unpack it again
    ends = np.cumsum(kept["steps"])
    rows = []
    for k, end in enumerate(ends):
        part = slice(int(end - kept["steps"][k]), int(end))
        rows.append(
            {
                "date": str(kept["dates"][k]),
                "stands_for_days": float(kept["stands_for_days"][k]),
                "times": kept["times"][part],
                "azimuth": kept["azimuth"][part],
                "elevation": kept["elevation"][part],
                "worst": {str(n): kept["worst"][part, i] for i, n in enumerate(kept["receivers"])},
            }
        )
    return rows
