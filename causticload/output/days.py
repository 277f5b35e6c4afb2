"""Finished days on disk: what a run that was broken off goes on from."""

from __future__ import annotations

import json
import zipfile
from pathlib import Path
from typing import Any

import numpy as np

from causticload.errors import ResultError
from causticload.light.year import DayResult
from causticload.output.files import to_json, write_text, write_whole
from causticload.output.records import to_episode, to_record
from causticload.study import study_digest
from causticload.study.model import Study
from causticload.version import __version__

KEY = "key.json"


class DayStore:
    """Keeps the days of one study in the ``days`` folder of its results.

    Parameters
    ----------
    folder : Path
        Result folder.
    study : Study
        The study; days of any other study, mesh, weather or version do not count.
    resume : bool
        Whether to go on from days that are there. Otherwise they are removed.

    Raises
    ------
    ResultError
        If days of another study are there and ``resume`` asks for them.
    """

    def __init__(self, folder: Path, study: Study, *, resume: bool) -> None:
        self.folder = folder / "days"
        key = {"study": study_digest(study), "version": __version__}
        there = self._key()
        if resume and there is not None and there != key:
            raise ResultError(
                "the finished days here belong to another study, mesh, weather file or version",
                where=str(self.folder),
                hint="Run without --resume to start anew, or choose another folder with --out.",
            )
        if not resume or there is None:
            for path in self.folder.glob("*.npz"):
                path.unlink()
        write_text(self.folder / KEY, to_json(key))

    def _key(self) -> Any:
        try:
            return json.loads((self.folder / KEY).read_text(encoding="utf-8"))
        except (OSError, ValueError):
            return None

    def _path(self, index: int) -> Path:
        return self.folder / f"{index:03d}.npz"

    def load(self, index: int) -> DayResult | None:
        """Return a kept day.

        Parameters
        ----------
        index : int
            Number of the day in the plan.

        Returns
        -------
        day : DayResult or None
            None if it is not there, or cannot be read and must be done again.
        """
        try:
            with np.load(self._path(index)) as file:
                return _unpack(file)
        except (OSError, ValueError, KeyError, zipfile.BadZipFile):
            return None

    def save(self, day: DayResult) -> None:
        """Keep a day.

        Parameters
        ----------
        day : DayResult
            The day.
        """
        arrays = _pack(day)

        def write(path: Path) -> None:
            with path.open("wb") as file:
                np.savez_compressed(file, **arrays)

        write_whole(self._path(day.index), write)


def _pack(day: DayResult) -> dict[str, Any]:
    """Arrays as they are; plain records as one JSON text, no pickles."""
    arrays: dict[str, Any] = {"worst": day.worst}
    records: dict[str, Any] = {
        "index": day.index,
        "ledger": day.ledger,
        "steps": day.steps,
        "names": {},
    }
    for name, kept in day.kept.items():
        records["names"][name] = list(kept)
        for k, (key, value) in enumerate(kept.items()):
            if key == "episodes":
                records["episodes"] = to_record(value)
            elif isinstance(value, dict):
                for part, array in value.items():
                    arrays[f"{name}/{k}/{part}"] = array
            else:
                arrays[f"{name}/{k}"] = value
    arrays["records"] = np.frombuffer(json.dumps(records).encode(), np.uint8)
    return arrays


def _unpack(file: Any) -> DayResult:
    records = json.loads(file["records"].tobytes())
    kept: dict[str, dict[str, Any]] = {}
    for name, keys in records["names"].items():
        kept[name] = {}
        for k, key in enumerate(keys):
            stem = f"{name}/{k}"
            if key == "episodes":
                kept[name][key] = [to_episode(r) for r in records["episodes"]]
            elif stem in file:
                kept[name][key] = file[stem]
            else:
                kept[name][key] = {
                    n.rpartition("/")[2]: file[n] for n in file if n.startswith(stem + "/")
                }
    return DayResult(
        index=records["index"],
        kept=kept,
        worst=file["worst"],
        ledger=records["ledger"],
        steps=records["steps"],
    )
