"""Read a study file: every key known, every value in range, or one clear sentence why not."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from difflib import get_close_matches
from pathlib import Path
from typing import Any
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

from causticload.errors import StudyError
from causticload.study import schema
from causticload.study.figures import check_figure
from causticload.study.lines import index_lines
from causticload.study.model import (
    CriterionSpec,
    FigureSpec,
    FinishSpec,
    Model,
    ObserverSpec,
    Site,
    SkySpec,
    Study,
    SurfaceRule,
    YearSpec,
)

PLAIN_FINISH = (
    "solar_reflectance",
    "visible_reflectance",
    "angular",
    "slope_error_mrad",
    "table",
)


def read_study(path: str | Path, *, files_needed: bool = True) -> Study:
    """Read and check a study file.

    Parameters
    ----------
    path : str or Path
        The file.
    files_needed : bool
        Whether the files that it names must be there; a result folder is read without them.

    Returns
    -------
    study : Study
        Paths in it are absolute.

    Raises
    ------
    StudyError
        If anything in it is wrong; ``where`` names the file, the line and the key.
    """
    file = Path(path).resolve()
    if file.is_dir():
        raise StudyError("this is a folder, not a study file", where=str(path))
    try:
        text = file.read_text(encoding="utf-8")
    except FileNotFoundError:
        raise StudyError("there is no such file", where=str(path)) from None
    except UnicodeDecodeError as error:
        raise StudyError(f"it is not UTF-8 text (byte {error.start})", where=str(path)) from error
    except OSError as error:
        raise StudyError(f"cannot be read: {error.strerror}", where=str(path)) from error
    try:
        data = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise StudyError(f"not valid TOML: {error}", where=file.name) from error
    return _Reader(file, index_lines(text), files_needed=files_needed).study(data)


class _Reader:
    """Turns tables into records."""

    def __init__(
        self, file: Path, lines: Mapping[tuple[str | int, ...], int], *, files_needed: bool
    ) -> None:
        self.file, self.lines, self.files_needed = file, lines, files_needed

    def error(self, message: str, path: tuple[str | int, ...], hint: str = "") -> StudyError:
        """Say what is wrong with the key at ``path``."""
        line = next(
            (self.lines[path[:k]] for k in range(len(path), 0, -1) if path[:k] in self.lines), None
        )
        name = ""
        for part in path:
            if isinstance(part, int):
                name += f"[{part + 1}]"
            else:
                name += ("." if name else "") + (f'"{part}"' if " " in part else part)
        place = self.file.name + (f", line {line}" if line else "")
        return StudyError(message, where=f"{place}: {name}" if name else place, hint=hint)

    def take(
        self, data: Any, keys: Mapping[str, schema.Key], path: tuple[str | int, ...]
    ) -> dict[str, Any]:
        """Check a table against its keys."""
        if not isinstance(data, dict):
            raise self.error(f"must be a table, got {data!r}", path)
        for key in data:
            if key not in keys:
                near = get_close_matches(key, keys, n=1)
                raise self.error(
                    f"unknown key {key!r}",
                    (*path, key),
                    hint=f"Did you mean {near[0]!r}?"
                    if near
                    else f"Known keys: {', '.join(keys)}.",
                )
        for name, key in keys.items():
            if name not in data:
                if key.required:
                    raise self.error(f"{name!r} is missing ({key.meaning})", path)
                continue
            value = data[name]
            if not _is_kind(value, key.kind):
                raise self.error(f"must be a {key.kind}, got {value!r}", (*path, name))
            wrong = key.check(value) if key.check else None
            if wrong:
                raise self.error(wrong, (*path, name))
        return data

    def study(self, data: dict[str, Any]) -> Study:
        """The whole file."""
        self.take(data, schema.TOP, ())
        finishes = {
            name: self.finish(name, d, ("finish", name))
            for name, d in data.get("finish", {}).items()
        }
        figures = {
            name: self.figure(name, d, ("figure", name))
            for name, d in data.get("figure", {}).items()
        }
        surfaces = tuple(
            self.surface(d, ("surface", k), figures) for k, d in enumerate(data.get("surface", []))
        )
        observers = tuple(
            self.observer(d, ("observer", k)) for k, d in enumerate(data.get("observer", []))
        )
        criteria = tuple(
            self.criterion(d, ("criterion", k)) for k, d in enumerate(data.get("criterion", []))
        )
        self.distinct("observer", [o.name for o in observers])
        self.distinct("criterion", [c.name for c in criteria])
        return Study(
            title=data.get("title", self.file.stem),
            path=self.file,
            site=self.site(data["site"]),
            model=self.model(data["model"]),
            surfaces=surfaces,
            finishes=finishes,
            figures=figures,
            sky=self.sky(data.get("sky", {})),
            year=YearSpec(**self.take(data.get("year", {}), schema.YEAR, ("year",))),
            observers=observers,
            criteria=criteria,
        )

    def distinct(self, table: str, names: list[str]) -> None:
        """Names of a list must differ."""
        for k, name in enumerate(names):
            if name in names[:k]:
                raise self.error(f"the name {name!r} stands twice", (table, k, "name"))

    def site(self, data: Any) -> Site:
        """Where the model stands."""
        table = self.take(data, schema.SITE, ("site",))
        zone = table.get("timezone", "UTC")
        try:
            ZoneInfo(zone)
        except (ZoneInfoNotFoundError, ValueError, OSError):
            raise self.error(
                f"unknown time zone {zone!r}",
                ("site", "timezone"),
                hint="An IANA name such as 'Europe/London' is wanted.",
            ) from None
        numbers = {k: float(v) for k, v in table.items() if k != "timezone"}
        return Site(**numbers, timezone=zone)

    def model(self, data: Any) -> Model:
        """Mesh files."""
        table = dict(self.take(data, schema.MODEL, ("model",)))
        where = ("model", "files")
        files = []
        for name in table.pop("files"):
            if not isinstance(name, str):
                raise self.error(f"must be a list of file names, got {name!r}", where)
            files.append(self.existing(name, where))
        return Model(files=tuple(files), **table)

    def existing(self, name: str, path: tuple[str | int, ...]) -> Path:
        """A file beside the study."""
        file = (self.file.parent / name).resolve()
        if self.files_needed and not file.is_file():
            raise self.error(
                f"there is no file {name!r}", path, hint="Paths are relative to the study file."
            )
        return file

    def surface(
        self, data: Any, path: tuple[str | int, ...], figures: Mapping[str, FigureSpec]
    ) -> SurfaceRule:
        """One rule."""
        table = dict(self.take(data, schema.SURFACE, path))
        given = table.pop("role")
        roles = (given,) if isinstance(given, str) else tuple(given)
        if not roles:
            raise self.error("must not be empty", (*path, "role"))
        for role in roles:
            if role not in schema.ROLES:
                near = get_close_matches(str(role), schema.ROLES, n=1)
                raise self.error(
                    f"unknown role {role!r}",
                    (*path, "role"),
                    hint=f"Did you mean {near[0]!r}?"
                    if near
                    else f"Roles: {', '.join(schema.ROLES)}.",
                )
        if "ignore" in roles and len(roles) > 1:
            raise self.error("'ignore' goes with no other role", (*path, "role"))
        figure = table.get("figure")
        if figure is not None and figure not in figures:
            raise self.error(
                f"there is no figure {figure!r}",
                (*path, "figure"),
                hint=f"Figures here: {', '.join(figures) or 'none'}.",
            )
        return SurfaceRule(roles=roles, **table)

    def figure(self, name: str, data: Any, path: tuple[str | int, ...]) -> FigureSpec:
        """One surface figure."""
        table = self.take(data, schema.FIGURE, path)
        wrong = check_figure(table)
        if wrong is not None:
            raise self.error(wrong.message, (*path, wrong.key), hint=wrong.hint)
        return FigureSpec(name=name, settings=dict(table))

    def finish(self, name: str, data: Any, path: tuple[str | int, ...]) -> FinishSpec:
        """One own finish."""
        table = self.take(data, schema.FINISH, path)
        if table.get("angular") == "table" and "table" not in table:
            raise self.error("angular = 'table' wants a table", (*path, "angular"))
        plain = {k: v for k, v in table.items() if k in PLAIN_FINISH}
        if "table" in plain:
            plain["table"] = self.rows(plain["table"], (*path, "table"))
        index = table.get("index")
        if index is not None and not (len(index) == 2 and all(_is_number(x) for x in index)):
            raise self.error(f"must be two numbers [n, k], got {index!r}", (*path, "index"))
        extra = {k: v for k, v in table.items() if k not in PLAIN_FINISH}
        if "spectral_file" in extra:
            extra["spectral_file"] = self.existing(extra["spectral_file"], (*path, "spectral_file"))
        return FinishSpec(name=name, extra=extra, **plain)

    def rows(self, data: Any, path: tuple[str | int, ...]) -> tuple[tuple[float, ...], ...]:
        """A list of rows of numbers."""
        rows = []
        for row in data:
            if not (isinstance(row, list) and row and all(_is_number(x) for x in row)):
                raise self.error(f"rows of numbers are wanted, got {row!r}", path)
            rows.append(tuple(float(x) for x in row))
        return tuple(rows)

    def sky(self, data: Any) -> SkySpec:
        """What shines."""
        table = dict(self.take(data, schema.SKY, ("sky",)))
        weather = table.get("source") == "weather"
        if weather and "file" not in table:
            raise self.error("source = 'weather' wants a file", ("sky", "source"))
        if not weather and "file" in table:
            raise self.error(
                "a file goes with source = 'weather'", ("sky", "file"), hint="Add it or drop it."
            )
        if "file" in table:
            table["file"] = self.existing(table["file"], ("sky", "file"))
        return SkySpec(**table)

    def observer(self, data: Any, path: tuple[str | int, ...]) -> ObserverSpec:
        """One observer."""
        table = dict(self.take(data, schema.OBSERVER, path))
        points = self.rows(table.pop("path"), (*path, "path"))
        if any(len(p) != 3 for p in points):
            raise self.error("points [x, y, z] are wanted", (*path, "path"))
        look = table.pop("look", "along")
        if isinstance(look, list):
            if not (len(look) == 3 and all(_is_number(x) for x in look) and any(look)):
                raise self.error(f"must be a direction [x, y, z], got {look!r}", (*path, "look"))
            look = tuple(float(x) for x in look)
        elif look != "along":
            raise self.error(f"must be 'along' or [x, y, z], got {look!r}", (*path, "look"))
        elif len(points) == 1:
            raise self.error("a single point has nothing to look along", (*path, "look"))
        return ObserverSpec(path=tuple((p[0], p[1], p[2]) for p in points), look=look, **table)

    def criterion(self, data: Any, path: tuple[str | int, ...]) -> CriterionSpec:
        """One own limit."""
        table = dict(self.take(data, schema.CRITERION, path))
        globs = table.pop("applies_to")
        if not all(isinstance(g, str) and g for g in globs):
            raise self.error(f"must be a list of globs, got {globs!r}", (*path, "applies_to"))
        return CriterionSpec(applies_to=tuple(globs), **table)


def _is_number(value: Any) -> bool:
    return isinstance(value, (int, float)) and not isinstance(value, bool)


def _is_kind(value: Any, kind: str) -> bool:
    tests = {
        schema.NUMBER: _is_number(value),
        schema.WHOLE: isinstance(value, int) and not isinstance(value, bool),
        schema.TEXT: isinstance(value, str),
        schema.FLAG: isinstance(value, bool),
        schema.LIST: isinstance(value, list),
        schema.TABLE: isinstance(value, dict),
        "text or list": isinstance(value, (str, list)),
        "number or list": _is_number(value) or isinstance(value, list),
    }
    return tests[kind]
