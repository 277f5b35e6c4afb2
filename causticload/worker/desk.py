"""What a host can ask for: one method of the desk for each method of the protocol."""

from __future__ import annotations

import os
import platform
import shutil
import threading
import time as clock
from collections import deque
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

from causticload import __version__
from causticload.errors import InputError
from causticload.study import schema
from causticload.worker import protocol
from causticload.worker.methods import METHODS
from causticload.worker.protocol import RequestError

if TYPE_CHECKING:
    from causticload.output.results import Instant, Year
    from causticload.run import Project

# Hands progress on as ``note(stage, done, total)``; ends early when the event is set.
Note = Callable[[str, int, int], None]
LongJob = Callable[[Note, threading.Event], Any]

KEPT_FILES = 12  # a host reads its arrays soon, so older files go
MOST_EPISODES = 200


class Desk:
    """Keeps one scene warm and answers questions about it, one at a time.

    Parameters
    ----------
    folder : Path
        Private folder for arrays.
    """

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self._project: Project | None = None
        self._key = ""
        self._names: dict[str, str] = {}  # surface -> object of the host
        self._laid = ""
        self._count = 0
        self._files: dict[str, deque[Path]] = {}
        self._lock = threading.Lock()
        self._instant: tuple[Project, Instant] | None = None
        self._year: tuple[Project, Year] | None = None
        self._year_folder: Path | None = None

    # --- files -------------------------------------------------------------------------------

    def _save(self, name: str, arrays: Mapping[str, Any]) -> str:
        """Write arrays into the private folder and drop the oldest of that name."""
        import numpy as np

        with self._lock:
            self._count += 1
            path = self.folder / f"{name}-{self._count}.npz"
            kept = self._files.setdefault(name, deque())
            kept.append(path)
            while len(kept) > KEPT_FILES:
                kept.popleft().unlink(missing_ok=True)
        np.savez(path, **arrays)
        return str(path)

    # --- about the engine --------------------------------------------------------------------

    def hello(self) -> dict[str, Any]:
        """Say who answers, without reading in the engine."""
        return {
            "program": "causticload",
            "version": __version__,
            "protocol": protocol.VERSION,
            "python": platform.python_version(),
            "process": os.getpid(),
            "threads": os.cpu_count() or 1,
            "folder": str(self.folder),
            "methods": list(METHODS),
        }

    def vocabulary(self) -> dict[str, Any]:
        """Say what words a study may use."""
        from causticload.hazard.criteria import BUILT_IN, KINDS
        from causticload.optics import list_finishes

        return {
            "roles": list(schema.ROLES),
            "forms": ["flat", "smooth"],
            "finishes": list_finishes(),
            "kinds": list(KINDS),
            "criteria": [c for c in BUILT_IN if c.default],
            "quantities": list(schema.QUANTITIES),
            "keys": {
                table: {name: key.meaning for name, key in keys.items()}
                for table, keys in schema.TABLES.items()
            },
        }

    def guess(self, names: list[Any]) -> dict[str, Any]:
        """Tell from names what objects are, as the engine does for a study without rules."""
        import numpy as np

        from causticload.scene.names import ground_kind, substance
        from causticload.scene.read import Part
        from causticload.scene.roles import DEFAULT_FINISH, DEFAULT_METAL

        rules = []
        for k, name in enumerate(names):
            if not isinstance(name, str):
                raise RequestError(
                    f"must be a text, got {name!r}",
                    code=protocol.INVALID_PARAMS,
                    where=f"params.names[{k}]",
                )
            part = Part(
                name=name,
                object_name=name,
                group="",
                material="",
                file="",
                triangles=np.zeros((0, 3, 3)),
                corner_normals=None,
            )
            stuff, kind = substance(part), ground_kind(part)
            rule: dict[str, Any] = {"role": []}
            if stuff:
                rule["role"].append("reflector")
                rule["finish"] = DEFAULT_FINISH if stuff == "glass" else DEFAULT_METAL
            if kind:
                rule["role"].append("receiver")
                rule["kind"] = kind
            rule["role"] = rule["role"] or ["obstruction"]
            rules.append(rule)
        return {"rules": rules}

    # --- the scene ---------------------------------------------------------------------------

    def load(
        self, study: str | None = None, scene: dict[str, Any] | None = None, ground: bool = True
    ) -> dict[str, Any]:
        """Read a study, or a host's scene; what stands already is kept."""
        from causticload.study import read_study
        from causticload.worker import scenes

        if (study is None) == (scene is None):
            raise RequestError(
                "give either a study or a scene", code=protocol.INVALID_PARAMS, where="params"
            )
        started = clock.perf_counter()
        if study is not None:
            read = read_study(study)
            key, laid = scenes.file_key(read), ""
            names: dict[str, str] = {}
            same = self._project is not None and key == self._key
        else:
            objects = scenes.read_objects(scene or {})
            laid = ""
            if ground:
                objects, laid = scenes.with_ground(objects)
            tables = (scene or {})["study"]
            key = scenes.scene_key(objects, tables)
            names = {o.stem: o.name for o in objects}
            same = self._project is not None and key == self._key
            place = self.folder / f"scene-{key[:16]}"
            if same:
                scenes.write_tables(objects, tables, place)
                read = read_study(place / "study.toml")
            else:
                read = scenes.write_scene(objects, tables, place)
        project, rebuilt = self._open(read, same)
        if rebuilt:
            self._drop_other_scenes(key)
        self._project, self._key, self._names, self._laid = project, key, names, laid
        return self._loaded(project, rebuilt, clock.perf_counter() - started)

    def _open(self, study: Any, same: bool) -> tuple[Project, bool]:
        """Make a study ready for light, from what is warm if its shapes and roles stand."""
        from causticload.worker.warm import relit

        if same and self._project is not None:
            project = relit(self._project, study)
            if project is not None:
                return project, False
        from causticload.run import open_project

        return open_project(study), True

    def _drop_other_scenes(self, key: str) -> None:
        for path in self.folder.glob("scene-*"):
            if path.name != f"scene-{key[:16]}":
                shutil.rmtree(path, ignore_errors=True)

    def _loaded(self, project: Project, rebuilt: bool, seconds: float) -> dict[str, Any]:
        from causticload.worker import views

        receivers, arrays = views.receiver_geometry(project.scene)
        for record in receivers:
            record["object"] = self._names.get(record["name"], record["name"])
        arrays |= views.facade_geometry(project.scene)
        return {
            "title": project.study.title,
            "key": self._key,
            "rebuilt": rebuilt,
            "seconds": seconds,
            "receivers": receivers,
            "surfaces": [self._names.get(s.name, s.name) for s in project.scene.surfaces],
            "triangles": len(project.scene.triangles),
            "panels": len(project.scene.panels),
            "points": project.scene.point_count,
            "tracer": project.lit.tracer.name,
            "faults": project.scene.faults,
            "assumed": [*([self._laid] if self._laid else []), *project.assumed],
            "arrays": self._save("geometry", arrays),
        }

    def _need(self) -> Project:
        if self._project is None:
            raise RequestError(
                "nothing is loaded",
                code=protocol.INVALID_REQUEST,
                hint="Call load first, with a study or a scene.",
            )
        return self._project

    def inspect(self) -> dict[str, Any]:
        """Say what the model is."""
        from causticload.run import inspect

        return inspect(self._need())

    def save_study(self, path: str, overwrite: bool = False) -> dict[str, Any]:
        """Write the study with its meshes."""
        from causticload.worker.scenes import save_study

        file = save_study(self._need().study, Path(path), overwrite=overwrite)
        return {"path": str(file)}

    # --- one position of the sun -------------------------------------------------------------

    def instant(
        self,
        at: str | None = None,
        sun: list[Any] | None = None,
        beam: float | None = None,
        show: str = "reflected",
    ) -> dict[str, Any]:
        """Find the loads for one position of the sun."""
        project = self._need()
        pair: tuple[float, float] | None = None
        if sun is not None:
            if len(sun) != 2 or not all(_is_number(x) for x in sun):
                raise InputError(
                    f"two numbers are wanted, azimuth and elevation, got {sun!r}", where="sun"
                )
            pair = (float(sun[0]), float(sun[1]))
        return self._solve(project, show, at=at, sun=pair, beam=beam)

    def _solve(self, project: Project, show: str, **sun: Any) -> dict[str, Any]:
        import numpy as np

        from causticload.hazard.cautions import cautions_for
        from causticload.output import words
        from causticload.output.instant import instant_record
        from causticload.run import solve_instant
        from causticload.worker import views

        started = clock.perf_counter()
        instant = solve_instant(project, **sun)
        self._instant = (project, instant)
        arrays, scale = views.instant_arrays(project, instant, show)
        ordered = sorted(instant.receivers.values(), key=lambda r: r.first)
        over = np.concatenate([arrays[f"r{k}/over"] for k in range(len(ordered))] or [[]])
        arrays["marks"] = views.mark_quads(project.scene, over.astype(bool))
        record = instant_record(instant, limits=False)
        zone = project.study.site.timezone
        time = instant.sun.time
        return {
            **record,
            "key": self._key,
            "show": show,
            "time": words.moment(time, zone) if time is not None else "",
            "hottest": _hottest(record["receivers"], instant.sun.beam),
            "scale": scale,
            "cautions": cautions_for({"people: skin", "people: eyes", "things"}),
            "answered_in": clock.perf_counter() - started,
            "arrays": self._save("instant", arrays),
        }

    # --- a year ------------------------------------------------------------------------------

    def year(self, out: str | None = None, threads: int | None = None, checks: int = 24) -> LongJob:
        """Screen a year: fix now what is asked, and hand back the job."""
        project, key = self._need(), self._key

        def job(note: Note, stop: threading.Event) -> dict[str, Any]:
            from causticload.run import Stopped, solve_year

            def progress(stage: str, done: int, total: int) -> None:
                note(stage, done, total)

            try:
                year = solve_year(
                    project, progress=progress, threads=threads, stop=stop, checks=checks
                )
            except Stopped:
                raise RequestError("it was cancelled", code=protocol.CANCELLED) from None
            folder = None
            if out is not None:
                from causticload.output.folder import save_year, working_in

                note("writing", 0, 1)
                with working_in(Path(out)):
                    folder = save_year(year, Path(out))
                note("writing", 1, 1)
            self._year, self._year_folder = (project, year), folder
            return self._yearly(project, year, key, folder)

        return job

    def _yearly(
        self, project: Project, year: Year, key: str, folder: Path | None
    ) -> dict[str, Any]:
        from causticload.output.text import observer_sentences
        from causticload.worker import listing

        return {
            "key": key,
            "folder": folder,
            "summary": year.summary,
            "cautions": year.summary["cautions"],
            "seasons": [listing.season_row(s, year) for s in year.seasons],
            "episodes": [listing.episode_row(e, year) for e in year.episodes[:MOST_EPISODES]],
            "episodes_found": len(year.episodes),
            "observers": [
                observer_sentences(o, project.study.site.timezone) for o in year.observers
            ],
            **self._painted(project, year, "peak", ""),
        }

    def _last_year(self) -> tuple[Project, Year]:
        if self._year is None:
            raise RequestError(
                "no year has been screened", code=protocol.INVALID_REQUEST, hint="Call year first."
            )
        return self._year

    def paint(self, show: str = "peak", criterion: str = "") -> dict[str, Any]:
        """Colour the last year by another quantity."""
        return self._painted(*self._last_year(), show, criterion)

    def _painted(self, project: Project, year: Year, show: str, criterion: str) -> dict[str, Any]:
        import numpy as np

        from causticload.hazard.exceed import CriterionMap
        from causticload.worker import views

        criteria = CriterionMap(project.lit, project.study.criteria)
        names = [c.name for c in criteria.criteria]
        if criterion and criterion not in names:
            raise InputError(
                f"there is no criterion {criterion!r} here",
                where="criterion",
                hint=f"Criteria: {', '.join(names)}.",
            )
        arrays, scale = views.year_arrays(year.receivers, show, criterion, criteria)
        over = np.concatenate([arrays[f"r{k}/over"] for k in range(len(year.receivers))] or [[]])
        arrays["marks"] = views.mark_quads(project.scene, over.astype(bool))
        return {
            "show": show,
            "criteria": names,
            "scale": scale,
            "arrays": self._save("year", arrays),
        }

    # --- what is behind a spot ---------------------------------------------------------------

    def _episode(self, number: int) -> tuple[Project, Year, Any]:
        project, year = self._last_year()
        found = next((e for e in year.episodes if e.number == number), None)
        if found is None:
            raise InputError(
                f"there is no episode {number}",
                where="episode",
                hint=f"Numbers run from 1 to {len(year.episodes)}.",
            )
        return project, year, found

    def moment(self, episode: int, show: str = "reflected") -> dict[str, Any]:
        """Solve the instant of an episode's peak."""
        from causticload.worker import listing

        project, year, found = self._episode(episode)
        time, place = listing.peak_of(found)
        return {
            **self._solve(project, show, at=time),
            "episode": listing.episode_row(found, year),
            "local": listing.local_text(time, year.study.site.timezone),
            "place_m": place,
            "size_m": float(max(found.area, 0.01) ** 0.5),
        }

    def contributors(self, episode: int | None = None) -> dict[str, Any]:
        """Name the panels behind an episode, or behind the hottest spot of the last instant."""
        from causticload.worker import behind

        if episode is not None:
            project, _, found = self._episode(episode)
            spot = behind.spot_of_episode(project, found)
        else:
            if self._instant is None:
                raise RequestError(
                    "no instant has been solved",
                    code=protocol.INVALID_REQUEST,
                    hint="Call instant first.",
                )
            project, instant = self._instant
            spot = behind.spot_of_instant(project, instant)
        rows, arrays, scale = behind.contributors(project, spot)
        for row in rows:
            row["object"] = self._names.get(row["surface"], row["surface"])
        return {
            "contributors": rows,
            "place_m": spot.place + project.scene.origin,
            "reflected_W_m2": sum(r["load"] for r in rows),
            "scale": scale,
            "arrays": self._save("facade", arrays),
        }

    def change(self, arrays: str, before: str, after: str) -> dict[str, Any]:
        """Colour the difference of two arrays of a host."""
        from causticload.worker import listing, views

        values = listing.difference(arrays, before, after)
        colours, scale = views.change_colours(values)
        return {
            "scale": scale,
            "arrays": self._save("change", {"change": values, "colours": colours}),
        }

    def memo(self, folder: str | None = None, formats: list[Any] | None = None) -> dict[str, Any]:
        """Write the memo of a year's result folder."""
        place = Path(folder) if folder else self._year_folder
        if place is None:
            raise RequestError(
                "the last year was not written to a folder",
                code=protocol.INVALID_REQUEST,
                where="params.folder",
                hint="Call year with out, or name a result folder.",
            )
        from causticload.worker.listing import write_memo

        return {"files": write_memo(place, formats)}


def _hottest(receivers: list[dict[str, Any]], beam: float) -> dict[str, Any] | None:
    lit = [r for r in receivers if r["peak_reflected_W_m2"] > 0.0]
    if not lit:
        return None
    top = max(lit, key=lambda r: r["peak_reflected_W_m2"])
    return {
        "receiver": top["name"],
        "reflected_W_m2": top["peak_reflected_W_m2"],
        "suns": top["peak_reflected_W_m2"] / beam,
        "images": top["most_images"],
        "place_m": top["peak_place_m"],
    }


def _is_number(value: Any) -> bool:
    return isinstance(value, (int, float)) and not isinstance(value, bool)
