"""Findings as plain records for JSON, and back."""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from datetime import date
from typing import Any

import numpy as np

from causticload.hazard.findings import (
    Confidence,
    Contributor,
    Episode,
    Finding,
    HotSpot,
    LeastPanels,
    ObserverFinding,
    PeakCheck,
    Season,
    Sight,
    SkinFinding,
    SurfaceFinding,
)


def to_record(value: Any) -> Any:
    """Turn a finding into plain lists and mappings.

    Parameters
    ----------
    value : dataclass instance, datetime64, date, number, text, tuple or None
        What to turn.

    Returns
    -------
    record : object
        What JSON can hold.
    """
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {f.name: to_record(getattr(value, f.name)) for f in dataclasses.fields(value)}
    if isinstance(value, (tuple, list)):
        return [to_record(v) for v in value]
    if isinstance(value, np.datetime64):
        return f"{value.astype('datetime64[ms]')}Z"
    if isinstance(value, date):
        return value.isoformat()
    if isinstance(value, np.generic):
        return value.item()
    return value


def _time(text: str) -> np.datetime64:
    return np.datetime64(text.rstrip("Z"), "ms")


def _spot(r: Mapping[str, Any]) -> HotSpot:
    return HotSpot(
        **{**r, "time": _time(r["time"]), "place": tuple(r["place"]), "centre": tuple(r["centre"])}
    )


def _check(r: Mapping[str, Any]) -> PeakCheck:
    return PeakCheck(
        **{**r, "time": _time(r["time"]), "place": tuple(r["place"]), "normal": tuple(r["normal"])}
    )


def to_episode(r: Mapping[str, Any]) -> Episode:
    """Rebuild an episode.

    Parameters
    ----------
    r : mapping
        From :func:`to_record`.

    Returns
    -------
    episode : Episode
        The same as before.
    """
    return Episode(
        **{
            **r,
            "day": date.fromisoformat(r["day"]),
            "mirror_day": date.fromisoformat(r["mirror_day"]) if r["mirror_day"] else None,
            "start": _time(r["start"]),
            "end": _time(r["end"]),
            "peak_time": _time(r["peak_time"]),
            "path": tuple(_spot(s) for s in r["path"]),
            "check": _check(r["check"]) if r["check"] else None,
            "contributors": tuple(
                Contributor(**{**c, "place": tuple(c["place"])}) for c in r["contributors"]
            ),
        }
    )


def to_season(r: Mapping[str, Any]) -> Season:
    """Rebuild a season.

    Parameters
    ----------
    r : mapping
        From :func:`to_record`.

    Returns
    -------
    season : Season
        The same as before.
    """
    return Season(
        **{
            **r,
            "spans": tuple((date.fromisoformat(a), date.fromisoformat(b)) for a, b in r["spans"]),
            "clock": tuple(r["clock"]),
            "episodes": tuple(r["episodes"]),
        }
    )


def to_finding(r: Mapping[str, Any]) -> Finding:
    """Rebuild what a season was found to do.

    Parameters
    ----------
    r : mapping
        From :func:`to_record`.

    Returns
    -------
    finding : Finding
        The same as before.
    """
    confidence, least = r["confidence"], r["least_panels"]
    return Finding(
        season=r["season"],
        confidence=Confidence(grade=confidence["grade"], reasons=tuple(confidence["reasons"])),
        least_panels=LeastPanels(**{**least, "panels": tuple(least["panels"])}),
        skin=SkinFinding(**r["skin"]) if r["skin"] else None,
        surface=SurfaceFinding(**r["surface"]) if r["surface"] else None,
    )


def to_observer(r: Mapping[str, Any]) -> ObserverFinding:
    """Rebuild what an observer meets.

    Parameters
    ----------
    r : mapping
        From :func:`to_record`.

    Returns
    -------
    finding : ObserverFinding
        The same as before.
    """
    worst = r["worst"]
    return ObserverFinding(
        **{
            **r,
            "worst_day": date.fromisoformat(r["worst_day"]) if r["worst_day"] else None,
            "spans": tuple((date.fromisoformat(a), date.fromisoformat(b)) for a, b in r["spans"]),
            "clock": tuple(r["clock"]) if r["clock"] else None,
            "daily": tuple((date.fromisoformat(d), n, m) for d, n, m in r["daily"]),
            "worst": Sight(
                **{**worst, "time": _time(worst["time"]), "place": tuple(worst["place"])}
            )
            if worst
            else None,
        }
    )
