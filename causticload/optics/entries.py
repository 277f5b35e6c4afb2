"""Reads the keys of an own finish that describe panes, coatings and roughness."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from difflib import get_close_matches
from math import isfinite
from pathlib import Path
from typing import Any

from causticload.errors import StudyError
from causticload.optics.finish import Along
from causticload.optics.stack import GLASS_INDEX, MOST_PANES, Pane
from causticload.study.model import FinishSpec

# Keys beyond the plain fields of FinishSpec.
EXTRA = (
    "base",
    "brush_along",
    "coatings",
    "diffuse_fraction",
    "gap_mm",
    "index",
    "pane_count",
    "panes",
    "slope_error_across_mrad",
    "spectral_file",
)
_PANE_KEYS = ("thickness_mm", "extinction_per_m", "index")
_FIGURES = (
    "solar_reflectance",
    "visible_reflectance",
    "solar_reflectance_back",
    "visible_reflectance_back",
    "solar_transmittance",
    "visible_transmittance",
)
_COATING_KEYS = ("surface", *_FIGURES)


@dataclass(frozen=True)
class CoatingEntry:
    """A coating as the study gives it.

    Figures are those of the coated *pane* at normal incidence: reflectance from outdoors,
    reflectance from indoors (``_back``), transmittance.
    """

    surface: int
    figures: Mapping[str, float]

    def pair(self, key: str) -> tuple[float | None, float | None]:
        """Solar and visible value of ``reflectance``, ``reflectance_back``, ``transmittance``."""
        return self.figures.get(f"solar_{key}"), self.figures.get(f"visible_{key}")


@dataclass(frozen=True)
class Entries:
    """The extra keys of an own finish, checked. None: the study is silent."""

    where: str
    base: str | None
    brush_along: Along | None
    coatings: tuple[CoatingEntry, ...]
    diffuse_fraction: float | None
    gaps: tuple[float, ...]  # m
    index: tuple[float, float] | None
    panes: tuple[Pane, ...] | None
    extinction_given: bool  # of any pane
    extinction_silent: bool  # of any pane
    slope_error_across: float | None  # rad
    spectral_file: Path | None


def read_entries(spec: FinishSpec) -> Entries:
    """Check the extra keys of an own finish.

    Parameters
    ----------
    spec : FinishSpec
        As the study has it.

    Returns
    -------
    entries : Entries
        Typed and in SI.

    Raises
    ------
    StudyError
        If a key is unknown or a value is out of range.
    """
    where, extra = f'finish."{spec.name}"', spec.extra
    _known(extra, EXTRA, where)
    if "panes" in extra and "pane_count" in extra:
        raise StudyError("panes and pane_count say the same thing; give one", where=where)
    panes, extinctions = _panes(extra, where)
    across = extra.get("slope_error_across_mrad")
    diffuse = extra.get("diffuse_fraction")
    along = extra.get("brush_along")
    if along not in (None, "width", "height"):
        raise StudyError(
            f"must be 'width' or 'height', got {along!r}", where=f"{where}.brush_along"
        )
    base, file = extra.get("base"), extra.get("spectral_file")
    if base is not None and not isinstance(base, str):
        raise StudyError(f"must be the name of a finish, got {base!r}", where=f"{where}.base")
    if file is not None and not isinstance(file, (str, Path)):
        raise StudyError(f"must be a file, got {file!r}", where=f"{where}.spectral_file")
    return Entries(
        where=where,
        base=base,
        brush_along=along,
        coatings=_coatings(extra.get("coatings", []), f"{where}.coatings"),
        diffuse_fraction=None
        if diffuse is None
        else _number(diffuse, f"{where}.diffuse_fraction", 0.0, 1.0),
        gaps=_gaps(extra.get("gap_mm"), panes, f"{where}.gap_mm"),
        index=_index(extra.get("index"), f"{where}.index"),
        panes=panes,
        extinction_given="given" in extinctions,
        extinction_silent="silent" in extinctions,
        slope_error_across=None
        if across is None
        else 1e-3 * _number(across, f"{where}.slope_error_across_mrad", 0.0, 200.0),
        spectral_file=None if file is None else Path(file),
    )


def _panes(extra: Mapping[str, object], where: str) -> tuple[tuple[Pane, ...] | None, set[str]]:
    """Panes, and whether their extinctions are "given", "silent" or some of each."""
    count = extra.get("pane_count")
    if count is not None:
        if not isinstance(count, int) or isinstance(count, bool) or not 1 <= count <= MOST_PANES:
            raise StudyError(
                f"must be a whole number from 1 to {MOST_PANES}, got {count!r}",
                where=f"{where}.pane_count",
            )
        return (Pane(),) * count, {"silent"}
    if "panes" not in extra:
        return None, set()
    rows = _tables(extra["panes"], f"{where}.panes")
    if not 1 <= len(rows) <= MOST_PANES:
        raise StudyError(
            f"1 to {MOST_PANES} panes are wanted, got {len(rows)}", where=f"{where}.panes"
        )
    panes = tuple(_pane(row, f"{where}.panes[{k}]") for k, row in enumerate(rows, 1))
    return panes, {"given" if "extinction_per_m" in row else "silent" for row in rows}


def _pane(row: Mapping[str, Any], where: str) -> Pane:
    _known(row, _PANE_KEYS, where)
    thickness = _number(row.get("thickness_mm", 6.0), f"{where}.thickness_mm", 0.1, 200.0)
    index = _number(row.get("index", GLASS_INDEX), f"{where}.index", 1.0, 4.0)
    given = row.get("extinction_per_m")
    extinction = Pane().extinction
    if given is not None:
        both = given if isinstance(given, (list, tuple)) else [given, given]
        if len(both) != 2:
            raise StudyError(
                f"must be one number or [solar, visible], got {given!r}",
                where=f"{where}.extinction_per_m",
            )
        solar, visible = (_number(x, f"{where}.extinction_per_m", 0.0, 1e5) for x in both)
        extinction = (solar, visible)
    return Pane(thickness=1e-3 * thickness, extinction=extinction, index=index)


def _coatings(value: object, where: str) -> tuple[CoatingEntry, ...]:
    entries: list[CoatingEntry] = []
    for k, row in enumerate(_tables(value, where), 1):
        place = f"{where}[{k}]"
        _known(row, _COATING_KEYS, place)
        surface = row.get("surface")
        if not isinstance(surface, int) or isinstance(surface, bool):
            raise StudyError(
                f"a coating needs the number of its surface, 1 = outdoors, got {surface!r}",
                where=f"{place}.surface",
            )
        if any((surface - 1) // 2 == (e.surface - 1) // 2 for e in entries):
            raise StudyError(
                "a pane may carry one coating: a data sheet cannot tell two apart", where=place
            )
        figures = {
            key: _number(row[key], f"{place}.{key}", 0.0, 1.0) for key in _FIGURES if key in row
        }
        if figures and not {"solar_reflectance", "visible_reflectance"} & set(figures):
            raise StudyError("a coated pane needs its reflectance from outdoors", where=place)
        entries.append(CoatingEntry(surface, figures))
    return tuple(entries)


def _gaps(value: object, panes: tuple[Pane, ...] | None, where: str) -> tuple[float, ...]:
    if value is None:
        return ()
    if panes is None:
        raise StudyError("a gap goes with panes or pane_count", where=where)
    many = value if isinstance(value, (list, tuple)) else [value] * (len(panes) - 1)
    if len(many) != len(panes) - 1:
        raise StudyError(f"{len(panes)} pane(s) have {len(panes) - 1} gap(s)", where=where)
    return tuple(1e-3 * _number(gap, where, 0.1, 1000.0) for gap in many)


def _index(value: object, where: str) -> tuple[float, float] | None:
    if value is None:
        return None
    if not isinstance(value, (list, tuple)) or len(value) != 2:
        raise StudyError(f"must be two numbers [n, k], got {value!r}", where=where)
    return _number(value[0], where, 1e-3, 100.0), _number(value[1], where, 0.0, 100.0)


def _tables(value: object, where: str) -> list[Mapping[str, Any]]:
    if not isinstance(value, (list, tuple)) or not all(isinstance(row, Mapping) for row in value):
        raise StudyError(f"must be a list of tables, got {value!r}", where=where)
    return list(value)


def _known(row: Mapping[str, object], keys: tuple[str, ...], where: str) -> None:
    for key in row:
        if key not in keys:
            near = get_close_matches(key, keys, n=1)
            raise StudyError(
                f"unknown key {key!r}",
                where=where,
                hint=f"Did you mean {near[0]!r}?" if near else f"Known keys: {', '.join(keys)}.",
            )


def _number(value: object, where: str, low: float, high: float) -> float:
    if not isinstance(value, (int, float)) or isinstance(value, bool) or not isfinite(value):
        raise StudyError(f"must be a number, got {value!r}", where=where)
    if not low <= value <= high:
        raise StudyError(f"must be from {low:g} to {high:g}, got {value!r}", where=where)
    return float(value)
