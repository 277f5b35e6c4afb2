"""Seasons: episodes that come back day after day, told in dates and clock hours."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from datetime import UTC, date, datetime, timedelta
from zoneinfo import ZoneInfo

import numpy as np
from scipy import sparse
from scipy.sparse.csgraph import connected_components

from causticload.hazard.findings import Episode, Season

# Two episodes on neighbouring days are the same thing if their peaks are no further apart...
SAME_PLACE_M = 15.0
SAME_HOUR_MIN = 45.0
# ...or if for this share of the shorter one they are on at the same hour and mostly that near: on a
# caustic that lasts for hours the moment of the peak jumps about.
SAME_SHARE = 0.5


def severity(item: Episode | Season) -> tuple[float, ...]:
    """Rank for sorting: people before things, then minutes in the year, then excess of the peak.

    Parameters
    ----------
    item : Episode or Season
        What to rank.

    Returns
    -------
    key : tuple of float
        Smaller is worse.
    """
    people = 0.0 if item.protects.startswith("people") else 1.0
    minutes = item.minutes_per_year if isinstance(item, Season) else item.minutes
    return (people, -minutes, -item.peak)


def worth_a_close_look(seasons: Sequence[Season], most: int) -> list[Season]:
    """Choose the seasons whose worst peak is looked at closely.

    The strongest of each receiver and sort of harm comes first, so that a place with many
    seasons does not leave another without one; then the rest, worst first.

    Parameters
    ----------
    seasons : sequence of Season
        Worst first.
    most : int
        How many, at least 0.

    Returns
    -------
    chosen : list of Season
        At most ``most``.
    """
    strongest: dict[tuple[str, str], Season] = {}
    for s in seasons:
        place = (s.receiver, s.protects)
        if place not in strongest or s.peak > strongest[place].peak:
            strongest[place] = s
    first = sorted(strongest.values(), key=severity)
    taken = {s.number for s in first}
    return [*first, *(s for s in seasons if s.number not in taken)][:most]


def make_seasons(
    episodes: Sequence[Episode], *, zone: str, day_stride: int
) -> tuple[list[Episode], list[Season]]:
    """Number episodes, worst first, and gather them into seasons.

    Parameters
    ----------
    episodes : sequence of Episode
        The year's episodes, in any order.
    zone : str
        IANA time zone of the site.
    day_stride : int
        Days from one representative day to the next.

    Returns
    -------
    episodes : list of Episode
        Numbered from 1, worst first, each with the number of its season.
    seasons : list of Season
        Numbered from 1, worst first.
    """
    worst_first = sorted(
        episodes, key=lambda e: (*severity(e), e.day.toordinal(), e.receiver, str(e.start))
    )
    numbered = [replace(e, number=i) for i, e in enumerate(worst_first, start=1)]
    label = _labels(numbered, day_stride)
    groups: list[list[Episode]] = [[] for _ in range(int(label.max(initial=-1)) + 1)]
    for episode, k in zip(numbered, label, strict=True):
        groups[k].append(episode)
    tz = ZoneInfo(zone)
    seasons = sorted((_season(g, tz, day_stride) for g in groups), key=severity)
    seasons = [replace(s, number=i) for i, s in enumerate(seasons, start=1)]
    of_episode = {e: s.number for s in seasons for e in s.episodes}
    return [replace(e, season=of_episode[e.number]) for e in numbered], seasons


def _labels(episodes: Sequence[Episode], day_stride: int) -> np.ndarray:
    """Number of the season of each episode, from 0."""
    n = len(episodes)
    heads, tails = [], []
    by_place: dict[tuple[str, str], list[int]] = {}
    for i, e in enumerate(episodes):
        by_place.setdefault((e.criterion, e.receiver), []).append(i)
    for members in by_place.values():
        day = np.array([episodes[i].day.toordinal() for i in members])
        mirror = np.array(
            [e.mirror_day.toordinal() if (e := episodes[i]).mirror_day else -1 for i in members]
        )
        hour = np.array([_minute_of_day(episodes[i].peak_time) for i in members])
        place = np.array([_peak_place(episodes[i]) for i in members])
        near = np.linalg.norm(place[:, None] - place[None], axis=2) <= SAME_PLACE_M
        gap = np.abs(hour[:, None] - hour[None])
        near &= np.minimum(gap, 1440.0 - gap) <= SAME_HOUR_MIN
        # Neighbouring representative days, or a day and its mirror day.
        beside = np.abs(day[:, None] - day[None]) <= day_stride + 1
        beside |= day[:, None] == mirror[None]
        tracks = [_track(episodes[i]) for i in members]
        for a, b in zip(*np.nonzero(np.triu(beside, 1)), strict=True):
            if near[a, b] or _run_together(tracks[a], tracks[b]):
                heads.append(members[a])
                tails.append(members[b])
    graph = sparse.coo_matrix(
        (np.ones(len(heads)), (np.array(heads, int), np.array(tails, int))), shape=(n, n)
    )
    return connected_components(graph, directed=False)[1] if n else np.zeros(0, int)


def _track(episode: Episode) -> tuple[np.ndarray, np.ndarray]:
    """Minutes of the day (n,), rising, and places (n, 3) of an episode's path."""
    minute = np.array([_minute_of_day(s.time) for s in episode.path])
    minute += 1440.0 * (minute < minute[0])  # over midnight in UTC
    return minute, np.array([s.place for s in episode.path])


def _run_together(
    first: tuple[np.ndarray, np.ndarray], second: tuple[np.ndarray, np.ndarray]
) -> bool:
    """Whether two paths are on at the same hours and mostly near each other then."""
    (t1, x1), (t2, x2) = first, second
    low, high = max(t1[0], t2[0]), min(t1[-1], t2[-1])
    shorter = min(t1[-1] - t1[0], t2[-1] - t2[0])
    if high <= low or high - low < SAME_SHARE * shorter:
        return False
    t = np.linspace(low, high, 9)
    apart = [np.interp(t, t1, x1[:, k]) - np.interp(t, t2, x2[:, k]) for k in range(3)]
    return bool(np.median(np.linalg.norm(apart, axis=0)) <= SAME_PLACE_M)


def _minute_of_day(time: np.datetime64) -> float:
    return float((time - time.astype("datetime64[D]")) / np.timedelta64(60, "s"))


def _peak_place(episode: Episode) -> tuple[float, float, float]:
    return max(episode.path, key=lambda s: s.peak).place


def _season(group: Sequence[Episode], tz: ZoneInfo, day_stride: int) -> Season:
    worst = min(group, key=lambda e: (-e.peak, e.number))
    by_day: dict[date, list[Episode]] = {}
    for e in group:
        by_day.setdefault(e.day, []).append(e)
    minutes = {d: union_minutes(each) for d, each in by_day.items()}
    starts = [_clock(e.start, tz) for e in group]
    ends = [_clock(e.end, tz) for e in group]
    return Season(
        number=0,
        criterion=worst.criterion,
        protects=worst.protects,
        receiver=worst.receiver,
        spans=day_spans(sorted((d, each[0].days) for d, each in by_day.items()), day_stride),
        days=float(sum(each[0].days for each in by_day.values())),
        clock=(min(starts), max(ends)),
        minutes_per_day=float(max(minutes.values())),
        minutes_per_year=float(sum(minutes[d] * by_day[d][0].days for d in by_day)),
        peak=worst.peak,
        worst=worst.number,
        episodes=tuple(sorted(e.number for e in group)),
    )


def union_minutes(episodes: Sequence[Episode]) -> float:
    """Minutes of a day in which at least one of the episodes is on.

    Parameters
    ----------
    episodes : sequence of Episode
        Episodes of one day.

    Returns
    -------
    minutes : float
        Time that several share counts once. [min]
    """
    total, reached = 0.0, -np.inf
    for begin, end in sorted((_minutes(e.start), _minutes(e.end)) for e in episodes):
        total += max(0.0, end - max(begin, reached))
        reached = max(reached, end)
    return total


def _minutes(time: np.datetime64) -> float:
    """Minutes since 1970."""
    return float(time.astype("datetime64[ms]").astype(np.int64)) / 60_000.0


def day_spans(days: Sequence[tuple[date, float]], day_stride: int) -> tuple[tuple[date, date], ...]:
    """Gather days into runs: each representative day stands for days on either side of it.

    Parameters
    ----------
    days : sequence of (date, float)
        Representative days in order, and the calendar days that each stands for.
    day_stride : int
        Days from one representative day to the next.

    Returns
    -------
    spans : tuple of (date, date)
        First and last day of each run.
    """
    spans: list[tuple[date, date]] = []
    for day, weight in days:
        half = timedelta(days=int((weight - 1.0) // 2))
        first, last = day - half, day + half
        if spans and (first - spans[-1][1]).days <= day_stride:
            spans[-1] = (spans[-1][0], last)
        else:
            spans.append((first, last))
    return tuple(spans)


def clock_span(spans: Sequence[np.ndarray], zone: str) -> tuple[str, str] | None:
    """Tell between which clock times something happens.

    Parameters
    ----------
    spans : sequence of (2,) int
        First and last second of each day, since 1970 UTC.
    zone : str
        IANA time zone.

    Returns
    -------
    clock : (str, str) or None
        Earliest and latest local clock time, "HH:MM"; None for no days.
    """
    if not len(spans):
        return None
    tz = ZoneInfo(zone)
    ends = [[_clock(np.datetime64(int(t), "s"), tz) for t in span] for span in spans]
    return min(a for a, _ in ends), max(b for _, b in ends)


def _clock(time: np.datetime64, tz: ZoneInfo) -> str:
    seconds = int(time.astype("datetime64[s]").astype(np.int64))
    return datetime.fromtimestamp(seconds, UTC).astimezone(tz).strftime("%H:%M")
