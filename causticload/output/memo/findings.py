"""Findings as a client reads them: seasons of one receiver that endanger the same, put together.

A year of a busy facade has a hundred seasons, several for each place and limit. A finding gathers
those of one receiver and one sort of harm, and tells for each limit how often and how long.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date, timedelta
from itertools import pairwise
from typing import Any

import numpy as np

from causticload.hazard.findings import Episode, Season
from causticload.hazard.seasons import severity, union_minutes
from causticload.output.records import to_record
from causticload.output.results import Year

Span = tuple[date, date]


@dataclass(frozen=True)
class LimitFacts:
    """What the year did to one limit on one receiver."""

    criterion: dict[str, Any]  # its record in the summary
    days: float  # calendar days with light over it somewhere on the receiver
    spans: tuple[Span, ...]
    clock: tuple[str, str]  # earliest start and latest end, local clock time
    minutes_per_day: float  # somewhere on the receiver, longest
    place_minutes_per_day: float  # at the place that is hit longest
    place_minutes_per_year: float
    area: float  # m² that is ever over it


@dataclass(frozen=True)
class Finding:
    """All that one receiver suffers of one sort."""

    number: int  # from 1, worst first
    receiver: str
    kind: str
    protects: str
    limits: tuple[LimitFacts, ...]  # the lowest limit first
    worst: Episode  # the strongest one
    looked_at: Episode | None  # the strongest one that was looked at closely
    seasons: tuple[int, ...]

    @property
    def main(self) -> Episode:
        """The episode that pictures and panels are of."""
        return self.looked_at or self.worst


@dataclass(frozen=True)
class Peak:
    """The strongest moment of an episode."""

    value: float  # of the criterion's quantity, W/m²
    reflected: float  # W/m²
    time: np.datetime64  # UTC
    place: tuple[float, float, float]  # model coordinates [m]
    counted: bool  # looked at closely


def peak_of(episode: Episode) -> Peak:
    """Strongest moment of an episode: looked at closely if it was, else by the grid.

    Parameters
    ----------
    episode : Episode
        The episode.

    Returns
    -------
    peak : Peak
        Its strongest moment.
    """
    check = episode.check
    if check is None:
        top = max(episode.path, key=lambda s: s.peak)
        return Peak(top.peak, top.reflected, top.time, top.place, False)
    value = check.total if is_total(episode) else check.reflected
    return Peak(value, check.reflected, check.time, check.place, True)


def is_total(episode: Episode) -> bool:
    """Tell whether an episode's limit is on direct and reflected light together.

    Parameters
    ----------
    episode : Episode
        The episode.

    Returns
    -------
    total : bool
        False for a limit on reflected light alone.
    """
    return episode.peak > episode.reflected * (1.0 + 1e-9)


def extras_of(year: Year, finding: Finding) -> dict[str, Any]:
    """What a year worked out beyond loads for the season of a finding's main episode.

    Parameters
    ----------
    year : Year
        The year.
    finding : Finding
        One of its findings.

    Returns
    -------
    extras : dict
        Empty if the run worked nothing out.
    """
    found = year.findings.get(finding.main.season)
    return to_record(found) if found else {}


def gather(year: Year) -> list[Finding]:
    """Gather a year's seasons into findings.

    Parameters
    ----------
    year : Year
        The year.

    Returns
    -------
    findings : list of Finding
        People before things, then by the time over a limit.
    """
    episodes = {e.number: e for e in year.episodes}
    criteria = {c["name"]: c for c in year.summary["criteria"]}
    receivers = {r["name"]: r for r in year.summary["receivers"]}
    groups: dict[tuple[str, str], list[Season]] = {}
    for season in sorted(year.seasons, key=severity):
        groups.setdefault((season.receiver, season.protects), []).append(season)
    findings = []
    for n, ((receiver, protects), seasons) in enumerate(groups.items(), start=1):
        mine = [episodes[k] for s in seasons for k in s.episodes]
        checked = [e for e in mine if e.check is not None]
        record = receivers[receiver]
        names = sorted({s.criterion for s in seasons}, key=lambda c: criteria[c]["limit"])
        findings.append(
            Finding(
                number=n,
                receiver=receiver,
                kind=record["kind"],
                protects=protects,
                limits=tuple(
                    _limit_facts(
                        criteria[c],
                        [s for s in seasons if s.criterion == c],
                        [e for e in mine if e.criterion == c],
                        record["over"].get(c, {}),
                    )
                    for c in names
                ),
                worst=max(mine, key=lambda e: (e.peak, -e.number)),
                looked_at=max(checked, key=lambda e: (peak_of(e).value, -e.number), default=None),
                seasons=tuple(s.number for s in seasons),
            )
        )
    return findings


def _limit_facts(
    criterion: dict[str, Any],
    seasons: Sequence[Season],
    episodes: Sequence[Episode],
    record: dict[str, float],
) -> LimitFacts:
    by_day: dict[date, list[Episode]] = {}
    for e in episodes:
        by_day.setdefault(e.day, []).append(e)
    return LimitFacts(
        criterion=criterion,
        days=float(sum(each[0].days for each in by_day.values())),
        spans=join_spans([span for s in seasons for span in s.spans]),
        clock=(min(s.clock[0] for s in seasons), max(s.clock[1] for s in seasons)),
        minutes_per_day=max(union_minutes(each) for each in by_day.values()),
        place_minutes_per_day=float(record.get("most_minutes_per_day", 0.0)),
        place_minutes_per_year=float(record.get("most_minutes_per_year", 0.0)),
        area=float(record.get("area_m2", 0.0)),
    )


def join_spans(spans: Sequence[Span]) -> tuple[Span, ...]:
    """Join runs of days that overlap or touch.

    Parameters
    ----------
    spans : sequence of (date, date)
        First and last day of each run.

    Returns
    -------
    joined : tuple of (date, date)
        In order, with at least a day between each and the next.
    """
    joined: list[Span] = []
    for first, last in sorted(spans):
        if joined and first - joined[-1][1] <= timedelta(days=1):
            joined[-1] = (joined[-1][0], max(last, joined[-1][1]))
        else:
            joined.append((first, last))
    return tuple(joined)


def gaps_within(spans: Sequence[Span]) -> int:
    """Longest gap between runs of days, 0 for none. [days]

    Parameters
    ----------
    spans : sequence of (date, date)
        From :func:`join_spans`.

    Returns
    -------
    days : int
        Days without.
    """
    return max(((b[0] - a[1]).days - 1 for a, b in pairwise(spans)), default=0)


def without_exceedance(year: Year) -> list[tuple[dict[str, Any], dict[str, Any]]]:
    """Receivers and limits that no episode exceeds.

    Parameters
    ----------
    year : Year
        The year.

    Returns
    -------
    pairs : list of (receiver, criterion)
        Their records in the summary.
    """
    over = {(e.receiver, e.criterion) for e in year.episodes}
    receivers = {r["name"]: r for r in year.summary["receivers"]}
    return [
        (receivers[name], c)
        for c in year.summary["criteria"]
        for name in c["receivers"]
        if name in receivers and (name, c["name"]) not in over
    ]


@dataclass(frozen=True)
class Need:
    """What would bring one peak down to its limit."""

    limit: float  # W/m²
    other: float  # W/m²: direct and diffuse light, which no change of the facade removes
    allowed: float  # W/m² that may come by reflection; not above 0: a reflection cannot cure it
    keep: float  # share of the reflected load that may stay, [0, 1]
    panels: int  # strongest panels that would have to send nothing; 0 if not known
    of_panels: int
    turn: float  # rad, turn of a panel that moves its light by the width of the spot; nan unknown
    distance: float  # m, from the panels to the spot; nan if not known


def need_of(episode: Episode) -> Need:
    """Work out what would bring an episode's peak down to its limit.

    Parameters
    ----------
    episode : Episode
        With its contributors, if panels are to be told.

    Returns
    -------
    need : Need
        For that peak alone; another may take its place.
    """
    peak = peak_of(episode)
    other = max(0.0, peak.value - peak.reflected) if is_total(episode) else 0.0
    allowed = episode.limit - other
    keep = float(np.clip(allowed / peak.reflected, 0.0, 1.0)) if peak.reflected > 0.0 else 1.0
    load = np.array([c.load for c in episode.contributors])
    panels = 0
    turn = distance = float("nan")
    if len(load):
        left = load.sum() - np.cumsum(load)
        panels = int(np.searchsorted(-left, -max(allowed, 0.0)) + 1) if keep < 1.0 else 0
        panels = min(panels, len(load))
        places = np.array([c.place for c in episode.contributors])
        distance = float(
            np.average(np.linalg.norm(places - np.array(peak.place), axis=1), weights=load)
        )
        if episode.check is not None:
            # A turn by d moves the mirrored ray by 2 d.
            turn = float(episode.check.width / (2.0 * distance))
    return Need(episode.limit, other, allowed, keep, panels, len(load), turn, distance)
