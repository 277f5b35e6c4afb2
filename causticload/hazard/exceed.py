"""Keeps, for each criterion, how long it is exceeded where, and the episodes of the day."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from causticload.hazard.criteria import Criterion, criteria_for
from causticload.hazard.findings import Episode, HotSpot
from causticload.hazard.spots import follow, regions
from causticload.light.prepare import LitScene
from causticload.light.tally import Moment
from causticload.scene.model import Bools, Floats, Ints
from causticload.sky.plan import DayPlan
from causticload.study.model import CriterionSpec


class CriterionMap:
    """Which criteria hold on which receiver of a scene.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.
    own : sequence of CriterionSpec
        The study's own limits.
    """

    def __init__(self, lit: LitScene, own: Sequence[CriterionSpec]) -> None:
        by_surface = [
            criteria_for(s.kind, own, s.name) if "receiver" in s.roles else ()
            for s in lit.scene.surfaces
        ]
        names = {c.name: c for each in by_surface for c in each}
        self.criteria: tuple[Criterion, ...] = tuple(
            sorted(names.values(), key=lambda c: (order(c), c.limit))
        )
        self.holds: Bools = np.array(
            [[c.name in {x.name for x in each} for each in by_surface] for c in self.criteria]
        ).reshape(len(self.criteria), len(by_surface))
        counts = [len(c.areas) for c in lit.scene.charts]
        self.chart_of: Ints = np.repeat(np.arange(len(counts)), counts).astype(np.int32)


def order(criterion: Criterion) -> int:
    """Rank a criterion by what it protects: eyes and skin before things.

    Parameters
    ----------
    criterion : Criterion
        The limit.

    Returns
    -------
    rank : int
        0 for people, 1 for things.
    """
    return 0 if criterion.protects.startswith("people") else 1


class Exceedance:
    """Minutes over each criterion at each point, and the episodes of one representative day.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.
    day : DayPlan
        The day's steps and dates.
    criteria : CriterionMap
        Which criteria hold where.
    """

    name = "exceedance"

    def __init__(self, lit: LitScene, day: DayPlan, criteria: CriterionMap) -> None:
        self.lit, self.day, self.map = lit, day, criteria
        self.minutes: dict[tuple[int, int], Floats] = {}
        self.spots: dict[tuple[int, int, int], dict[int, list[HotSpot]]] = defaultdict(dict)
        self.step = [-1] * len(day.dates)

    def add(self, moment: Moment, *, date: int) -> None:
        """Take in one step of a date."""
        self.step[date] += 1
        for c, criterion in enumerate(self.map.criteria):
            index, value = moment.points_over(
                criterion.limit, total=criterion.quantity == "total irradiance"
            )
            surface = self.lit.point_surface[index]
            here = self.map.holds[c, surface]
            index, value, surface = index[here], value[here], surface[here]
            if not len(index):
                continue
            minutes = self.minutes.get((c, date))
            if minutes is None:
                minutes = self.minutes[c, date] = np.zeros(len(self.lit.point_areas))
            minutes[index] += moment.minutes
            for s in np.unique(surface):
                mine = surface == s
                self.spots[c, date, int(s)][self.step[date]] = self._spots(
                    moment, index[mine], value[mine]
                )

    def _spots(self, moment: Moment, index: Ints, value: Floats) -> list[HotSpot]:
        lit, scene = self.lit, self.lit.scene
        found = regions(
            index, value, charts=scene.charts, chart_of=self.map.chart_of, places=lit.points
        )
        spots = []
        for region in found:
            top = int(region.points[region.value.argmax()])
            areas = lit.point_areas[region.points]
            centre = np.average(lit.points[region.points], axis=0, weights=areas)
            spots.append(
                HotSpot(
                    time=moment.time,
                    area=float(areas.sum()),
                    peak=float(region.value.max()),
                    reflected=float(moment.reflected(np.array([top]))[0]),
                    place=_place(lit.points[top] + scene.origin),
                    centre=_place(centre + scene.origin),
                    point=top,
                )
            )
        return spots

    def result(self) -> dict[str, Any]:
        """Return the points with their minutes, per criterion, and the episodes."""
        kept: dict[str, Any] = {"episodes": self._episodes()}
        for c, criterion in enumerate(self.map.criteria):
            n = len(self.lit.point_areas)
            total, over, most = np.zeros(n), np.zeros(n), np.zeros(n)
            for date, weight in enumerate(self.day.weights):
                minutes = self.minutes.get((c, date))
                if minutes is not None:
                    total += weight * minutes
                    over += weight * (minutes > criterion.minutes)
                    np.maximum(most, minutes, out=most)
            points = np.flatnonzero(most)
            kept[criterion.name] = {
                "points": points.astype(np.int32),
                "minutes": total[points].astype(np.float32),
                "days": over[points].astype(np.float32),
                "most": most[points].astype(np.float32),
            }
        return kept

    def _episodes(self) -> list[Episode]:
        episodes = []
        half = np.timedelta64(int(self.day.step_s * 500), "ms")
        for (c, date, surface), by_step in sorted(self.spots.items()):
            criterion = self.map.criteria[c]
            steps = [by_step.get(k, []) for k in range(max(by_step) + 1)]
            for path in follow(steps):
                top = max((spots[0] for spots in path), key=lambda s: s.peak)
                episodes.append(
                    Episode(
                        number=0,
                        criterion=criterion.name,
                        protects=criterion.protects,
                        receiver=self.lit.scene.surfaces[surface].name,
                        day=self.day.dates[date],
                        mirror_day=self.day.dates[1 - date] if len(self.day.dates) > 1 else None,
                        days=float(self.day.weights[date]),
                        start=path[0][0].time - half,
                        end=path[-1][0].time + half,
                        minutes=len(path) * self.day.step_s / 60.0,
                        limit=criterion.limit,
                        peak=top.peak,
                        reflected=max(spots[0].reflected for spots in path),
                        peak_time=top.time,
                        area=max(sum(s.area for s in spots) for spots in path),
                        path=tuple(spots[0] for spots in path),
                    )
                )
        return episodes


def _place(x: Floats) -> tuple[float, float, float]:
    return (float(x[0]), float(x[1]), float(x[2]))


def merge_exceedance(parts: Sequence[Mapping[str, Any]], *, points: int) -> dict[str, Any]:
    """Put the exceedances of several days together, in any order.

    Parameters
    ----------
    parts : sequence of mapping
        Results of :class:`Exceedance`.
    points : int
        Number of points of the scene.

    Returns
    -------
    total : dict
        ``episodes``: list of Episode. For each criterion ``minutes``, ``days`` and ``most``,
        each (points,) float: minutes in the year, days with more than the tolerated minutes, and
        minutes on the worst day.
    """
    total: dict[str, Any] = {"episodes": []}
    for part in parts:
        total["episodes"] += part["episodes"]
        for name, kept in part.items():
            if name == "episodes":
                continue
            sums = total.setdefault(
                name, {key: np.zeros(points) for key in ("minutes", "days", "most")}
            )
            index = kept["points"]
            sums["minutes"][index] += kept["minutes"]
            sums["days"][index] += kept["days"]
            sums["most"][index] = np.maximum(sums["most"][index], kept["most"])
    return total
