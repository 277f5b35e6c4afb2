"""Write a study as a file, and tell two studies apart."""

from __future__ import annotations

import hashlib
import os
from dataclasses import asdict
from pathlib import Path
from typing import Any

import tomlkit

from causticload.errors import StudyError
from causticload.study.model import Study


def write_study(study: Study, path: str | Path) -> Path:
    """Write a study file; it appears whole or not at all.

    Parameters
    ----------
    study : Study
        The study.
    path : str or Path
        The file. Paths in it are written relative to it.

    Returns
    -------
    path : Path
        The file.

    Raises
    ------
    StudyError
        If it cannot be written.
    """
    file = Path(path).resolve()
    temporary = file.with_name(f".{os.getpid()}-{file.name}")
    try:
        file.parent.mkdir(parents=True, exist_ok=True)
        temporary.write_text(tomlkit.dumps(_tables(study, file.parent)), encoding="utf-8")
        temporary.replace(file)
    except OSError as error:
        raise StudyError(f"cannot be written: {error.strerror}", where=str(path)) from error
    finally:
        temporary.unlink(missing_ok=True)
    return file


def _tables(study: Study, folder: Path) -> dict[str, Any]:
    """The study as TOML tables; what is not given is left out."""

    def near(file: Path) -> str:
        try:
            return Path(os.path.relpath(file, folder)).as_posix()
        except ValueError:  # another drive
            return file.as_posix()

    def given(record: Any, **replaced: Any) -> dict[str, Any]:
        table = {**asdict(record), **replaced}
        return {
            k: list(v) if isinstance(v, tuple) else v for k, v in table.items() if v is not None
        }

    tables: dict[str, Any] = {
        "title": study.title,
        "site": given(study.site),
        "model": given(study.model, files=[near(f) for f in study.model.files]),
        "sky": given(study.sky, file=near(study.sky.file) if study.sky.file else None),
        "year": given(study.year),
    }
    surfaces = []
    for rule in study.surfaces:
        table = given(rule)
        table["role"] = table.pop("roles")
        surfaces.append(table)
    if surfaces:
        tables["surface"] = surfaces
    if study.finishes:
        tables["finish"] = {
            name: {
                **{k: v for k, v in given(f).items() if k not in ("name", "extra")},
                **{k: near(v) if isinstance(v, Path) else v for k, v in f.extra.items()},
                **({"table": [list(r) for r in f.table]} if f.table else {}),
            }
            for name, f in study.finishes.items()
        }
    if study.figures:
        tables["figure"] = {name: dict(f.settings) for name, f in study.figures.items()}
    if study.observers:
        tables["observer"] = [given(o, path=[list(p) for p in o.path]) for o in study.observers]
    if study.criteria:
        tables["criterion"] = [given(c) for c in study.criteria]
    return tables


def _inputs(study: Study) -> list[Path]:
    """Every file that a study names: meshes, weather, layers of coatings."""
    layers = [f.extra.get("spectral_file") for f in study.finishes.values()]
    sky = [study.sky.file] if study.sky.file else []
    return [*study.model.files, *sky, *(file for file in layers if isinstance(file, Path))]


def input_hashes(study: Study) -> dict[str, str]:
    """SHA-256 of every file that a study reads.

    Parameters
    ----------
    study : Study
        The study.

    Returns
    -------
    hashes : dict of str to str
        File name to hexadecimal digest.
    """
    files = _inputs(study)
    if study.path is not None and study.path.is_file():
        files.insert(0, study.path)
    return {f.name: hashlib.sha256(f.read_bytes()).hexdigest() for f in files}


def study_digest(study: Study) -> str:
    """SHA-256 of all that decides a study's result: its settings and the bytes of its inputs.

    Parameters
    ----------
    study : Study
        The study.

    Returns
    -------
    digest : str
        Hexadecimal.
    """
    record = asdict(study)
    record.pop("path")
    record["model"].pop("files")
    record["sky"].pop("file")
    for finish in record["finishes"].values():
        finish["extra"].pop("spectral_file", None)
    total = hashlib.sha256(repr(record).encode())
    for file in _inputs(study):
        total.update(hashlib.sha256(file.read_bytes()).digest())
    return total.hexdigest()
