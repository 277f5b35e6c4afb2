"""Eyes through the year: what observers see of the reflected sun, and for how long.

At each step the images of the sun are sought at every eye point, joined where they touch, and
weighed one bright area at a time: the eye does not add up areas that lie apart, so the size of an
area must come from the images themselves and not from one flux.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import fields
from datetime import date
from itertools import pairwise
from typing import Any, NamedTuple

import numpy as np

from causticload.hazard.eyes import (
    EyeClass,
    angle_from_gaze,
    assess_eyes,
    cluster_images,
)
from causticload.hazard.findings import ObserverFinding, Sight
from causticload.hazard.glare import (
    contrast_left,
    glare_illuminance,
    illuminance,
    veiling_luminance,
)
from causticload.hazard.seasons import clock_span, day_spans
from causticload.light.points import solve_points
from causticload.light.prepare import LitScene
from causticload.light.tally import Moment
from causticload.scene.model import Floats, Ints
from causticload.sky.plan import DayPlan
from causticload.study.model import ObserverSpec

# What lies further from the line of sight than this is out of view; the law of the veil ends here.
FIELD_RAD = np.radians(100.0)
# Luminance of a sunlit street, against which a veil takes contrast (common practice: 10^3 to 10^4).
STREET_CD_M2 = 5000.0
ROGUE_CD_M2 = 500.0  # Hassall (1991): 10 E/theta² at a driver's eye, from memory
NO_TIME = np.iinfo(np.int64).min
_AFTER_IMAGE, _BURN, _ROGUE = range(3)


class EyePoints(NamedTuple):
    """Places of eyes. ``p`` points of ``o`` observers."""

    place: Floats  # (p, 3) m, local
    gaze: Floats  # (p, 3) unit
    observer: Ints  # (p,)
    specs: tuple[ObserverSpec, ...]  # (o,)


class Areas(NamedTuple):
    """Bright areas in view at one step, for a beam of 1 W/m². ``a`` areas."""

    point: Ints  # (a,) eye point
    direction: Floats  # (a, 3) unit, from the eye
    subtense: Floats  # (a,) rad
    corneal: Floats  # (a,) suns, normal to the area
    visible: Floats  # (a,) the same in the visible band
    angle: Floats  # (a,) rad, from the line of sight


def place_eyes(specs: Sequence[ObserverSpec], *, origin: Floats) -> EyePoints:
    """Lay eye points along the paths of observers.

    Parameters
    ----------
    specs : sequence of ObserverSpec
        Observers of a study.
    origin : (3,) float
        Origin of the scene frame. [m]

    Returns
    -------
    eyes : EyePoints
        Points no further apart than each observer's spacing, ends included.
    """
    place, gaze, owner = [], [], []
    for number, spec in enumerate(specs):
        corner = np.asarray(spec.path, dtype=float) - origin
        for a, b in pairwise(corner):
            length = float(np.linalg.norm(b - a))
            steps = max(1, int(np.ceil(length / spec.spacing)))
            for k in range(steps):
                place.append(a + (b - a) * k / steps)
                gaze.append(b - a)
                owner.append(number)
        place.append(corner[-1])
        gaze.append(gaze[-1] if len(corner) > 1 else np.zeros(3))
        owner.append(number)
    view = np.array(gaze, dtype=float).reshape(-1, 3)
    index = np.array(owner, dtype=np.int32)
    for number, spec in enumerate(specs):
        if spec.look != "along":
            view[index == number] = spec.look
    view /= np.maximum(np.linalg.norm(view, axis=1, keepdims=True), 1e-300)
    return EyePoints(np.array(place, dtype=float).reshape(-1, 3), view, index, tuple(specs))


def areas_in_view(
    lit: LitScene, eyes: EyePoints, *, sun_direction: Floats, sun_radius: float
) -> Areas:
    """Find the bright areas that eyes have in view.

    First reflections only. An area counts within 100 degrees of the line of sight.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.
    eyes : EyePoints
        The eyes.
    sun_direction : (3,) float
        Unit vector to the sun, scene frame.
    sun_radius : float
        Angular radius of the sun. [rad]

    Returns
    -------
    areas : Areas
        For a beam of 1 W/m².
    """
    rows: list[Areas] = []
    disc = 2.0 * np.pi * (1.0 - np.cos(sun_radius))
    for number in range(len(eyes.specs)):
        mine = np.flatnonzero(eyes.observer == number)
        light = solve_points(
            lit,
            sun_direction=sun_direction,
            sun_radius=sun_radius,
            points=eyes.place[mine],
            follow_waves=False,
            quick=True,
        )
        parts = light.parts
        for q in np.unique(parts.point):
            p = mine[q]
            here = np.flatnonzero((parts.point == q) & (parts.reflectance > 0.0))
            angle = angle_from_gaze(parts.direction[here], eyes.gaze[p])
            here = here[angle <= FIELD_RAD]
            if not len(here):
                continue
            # A part that sends ``load`` suns at this reflectance shows that share of the disc.
            share = parts.load[here] / parts.reflectance[here]
            # A stretched image comes in pieces longer than wide, whose round stand-ins may not
            # touch: pieces closer than half a sun are one area.
            found = cluster_images(
                parts.direction[here],
                solid_angles=share * disc,
                corneal=parts.load[here],
                gap=sun_radius,
            )
            k = len(found.corneal)
            rows.append(
                Areas(
                    point=np.full(k, p, np.int32),
                    direction=found.direction,
                    subtense=found.subtense,
                    corneal=found.corneal,
                    visible=np.bincount(found.cluster, parts.visible[here], k).astype(float),
                    angle=angle_from_gaze(found.direction, eyes.gaze[p]),
                )
            )
    if not rows:
        none = np.zeros(0)
        return Areas(np.zeros(0, np.int32), np.zeros((0, 3)), none, none, none, none)
    return Areas(*(np.concatenate(a) for a in zip(*rows, strict=True)))


class EyeWatch:
    """Minutes of after-image, burn and veil at each observer, and the worst sight, of a day.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.
    day : DayPlan
        The day's steps and dates.
    eyes : EyePoints
        The eyes.
    """

    name = "eyes"

    def __init__(self, lit: LitScene, day: DayPlan, eyes: EyePoints) -> None:
        self.lit, self.day, self.eyes = lit, day, eyes
        dates, observers = len(day.dates), len(eyes.specs)
        self.minutes = np.zeros((dates, observers, 3))
        self.span = np.full((dates, observers, 2), NO_TIME, np.int64)
        self.worst: list[Sight | None] = [None] * observers
        self.step = [-1] * dates
        self.seen: tuple[int, Areas] | None = None

    def add(self, moment: Moment, *, date: int) -> None:
        """Take in one step of a date."""
        self.step[date] += 1
        if moment.beam <= 0.0 or not len(self.eyes.place):
            return
        areas = self._areas(moment, self.step[date])
        if not len(areas.point):
            return
        load = assess_eyes(corneal=areas.corneal * moment.beam, angle=areas.subtense)
        for o in np.unique(self.eyes.observer[areas.point]):
            of_observer = self.eyes.observer[areas.point] == o
            worst = int(load.eye_class[of_observer].max())
            rogue = 0.0
            for p in np.unique(areas.point[of_observer]):
                here = np.flatnonzero(areas.point == p)
                sight = self._sight(moment, areas, here, load)
                rogue = max(rogue, sight.rogue_veil)
                if _rank(sight) > _rank(self.worst[o]):
                    self.worst[o] = sight
            self._count(moment, date, int(o), worst, rogue)

    def _areas(self, moment: Moment, step: int) -> Areas:
        """Areas of this step; the two dates of a day share them."""
        if self.seen is None or self.seen[0] != step:
            areas = areas_in_view(
                self.lit,
                self.eyes,
                sun_direction=moment.light.sun_direction,
                sun_radius=float(self.day.radius_rad[:, step].mean()),
            )
            self.seen = (step, areas)
        return self.seen[1]

    def _count(self, moment: Moment, date: int, o: int, worst: int, rogue: float) -> None:
        kept = self.minutes[date, o]
        kept[_BURN] += moment.minutes * (worst >= EyeClass.RETINAL_BURN)
        kept[_ROGUE] += moment.minutes * (rogue > ROGUE_CD_M2)
        if worst >= EyeClass.AFTER_IMAGE:
            kept[_AFTER_IMAGE] += moment.minutes
            seconds = int(moment.time.astype("datetime64[s]").astype(np.int64))
            half = int(moment.minutes * 30.0)
            if self.span[date, o, 0] == NO_TIME:
                self.span[date, o, 0] = seconds - half
            self.span[date, o, 1] = seconds + half

    def _sight(self, moment: Moment, areas: Areas, here: Ints, load: Any) -> Sight:
        """What the eye of some areas sees, told by the area that is worst."""
        top = here[np.lexsort((areas.corneal[here], load.eye_class[here]))[-1]]
        spec = self.eyes.specs[self.eyes.observer[areas.point[top]]]
        lux = np.asarray(illuminance(areas.visible[here] * moment.beam))
        angle = np.maximum(areas.angle[here], np.radians(0.1))  # where the law of the veil begins
        veil = float(veiling_luminance(lux, angle=angle, age=spec.age).luminance)
        on_eye = np.asarray(glare_illuminance(lux, angle=angle))
        north = self.lit.scene.north_rad
        d = areas.direction[top]
        place = self.eyes.place[areas.point[top]] + self.lit.scene.origin
        return Sight(
            time=moment.time,
            place=(float(place[0]), float(place[1]), float(place[2])),
            images=len(here),
            subtense_mrad=1000.0 * float(areas.subtense[top]),
            corneal=float(areas.corneal[top]) * moment.beam,
            retinal=float(load.retinal[top]),
            after_image_limit=float(load.after_image_limit[top]),
            burn_limit=float(load.burn_limit[top]),
            eye_class=int(load.eye_class[top]),
            illuminance=float(lux.sum()),
            veil=veil,
            rogue_veil=float((10.0 * on_eye / np.degrees(angle) ** 2).sum()),
            contrast_left=float(contrast_left(veil, background=STREET_CD_M2)),
            angle_deg=float(np.degrees(areas.angle[top])),
            azimuth_deg=float(np.degrees(np.arctan2(d[0], d[1]) + north) % 360.0),
            elevation_deg=float(np.degrees(np.arcsin(np.clip(d[2], -1.0, 1.0)))),
        )

    def result(self) -> dict[str, Any]:
        """Return minutes, spans of clock time and worst sights, as arrays."""
        return {
            "minutes": self.minutes,
            "span": self.span,
            "worst": np.array([_to_row(s) for s in self.worst]).reshape(-1, len(fields(Sight)) + 2),
        }


def _rank(sight: Sight | None) -> tuple[float, float]:
    return (-1.0, 0.0) if sight is None else (float(sight.eye_class), sight.corneal)


def _to_row(sight: Sight | None) -> list[float]:
    """A sight as numbers, so that a day on disk holds arrays only; nan for none."""
    if sight is None:
        return [np.nan] * (len(fields(Sight)) + 2)
    time = float(sight.time.astype("datetime64[s]").astype(np.int64))
    rest = [float(getattr(sight, f.name)) for f in fields(Sight)[2:]]
    return [time, *sight.place, *rest]


def _from_row(row: Floats) -> Sight | None:
    if np.isnan(row[0]):
        return None
    rest: dict[str, Any] = dict(zip((f.name for f in fields(Sight)[2:]), row[4:], strict=True))
    for name in ("images", "eye_class"):
        rest[name] = int(rest[name])
    return Sight(
        time=np.datetime64(int(row[0]), "s"),
        place=(float(row[1]), float(row[2]), float(row[3])),
        **{k: v if isinstance(v, int) else float(v) for k, v in rest.items()},  # type: ignore[arg-type]
    )


def merge_eyes(
    parts: Sequence[Mapping[str, Any]],
    plan: Sequence[DayPlan],
    specs: Sequence[ObserverSpec],
    *,
    points: Sequence[int],
    zone: str,
    day_stride: int,
) -> list[ObserverFinding]:
    """Put the days of observers together.

    Parameters
    ----------
    parts : sequence of mapping
        Results of :class:`EyeWatch`, one a representative day.
    plan : sequence of DayPlan
        The days, in the same order.
    specs : sequence of ObserverSpec
        The observers.
    points : sequence of int
        Number of eye points of each.
    zone : str
        IANA time zone of the site.
    day_stride : int
        Days from one representative day to the next.

    Returns
    -------
    findings : list of ObserverFinding
        In the order of the study.
    """
    findings = []
    for o, spec in enumerate(specs):
        rows: list[tuple[date, float, Floats, Ints]] = []
        worst: Sight | None = None
        for part, day in zip(parts, plan, strict=True):
            for d, when in enumerate(day.dates):
                rows.append(
                    (when, float(day.weights[d]), part["minutes"][d, o], part["span"][d, o])
                )
            sight = _from_row(part["worst"][o])
            if _rank(sight) > _rank(worst):
                worst = sight
        rows.sort(key=lambda r: r[0])
        weight = np.array([r[1] for r in rows])
        minutes = np.array([r[2] for r in rows]).reshape(-1, 3)
        hit = minutes[:, _AFTER_IMAGE] > 0.0
        most = int(minutes[:, _AFTER_IMAGE].argmax())
        findings.append(
            ObserverFinding(
                name=spec.name,
                points=int(points[o]),
                age=spec.age,
                after_image_days=float(weight[hit].sum()),
                after_image_minutes=float(weight @ minutes[:, _AFTER_IMAGE]),
                after_image_most=float(minutes[most, _AFTER_IMAGE]),
                worst_day=rows[most][0] if hit.any() else None,
                burn_minutes=float(weight @ minutes[:, _BURN]),
                rogue_minutes=float(weight @ minutes[:, _ROGUE]),
                spans=day_spans(
                    [(r[0], r[1]) for r, h in zip(rows, hit, strict=True) if h], day_stride
                ),
                clock=clock_span([r[3] for r, h in zip(rows, hit, strict=True) if h], zone),
                daily=tuple(
                    (r[0], r[1], float(m))
                    for r, m in zip(rows, minutes[:, _AFTER_IMAGE], strict=True)
                ),
                worst=worst,
            )
        )
    return findings
