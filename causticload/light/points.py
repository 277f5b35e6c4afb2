"""Light at single points: a peak looked at closely, an eye, the panels behind a hot spot.

Grids serve whole receivers; here a few points, on a surface or in the air, ask every tube. Only
tubes whose beam passes near are refined, and every contribution that counts sends its own rays
to the reflecting point and from there to the sun. It shares the overlap law with the grids, but
neither their footprints nor their way of settling what is seen.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numba import njit

from causticload.light.cut import WAVE_PART, slice_waves, wave_sway
from causticload.light.field import LINEAR, Bounced, halve_generation, join_generations
from causticload.light.field import Generation as _Generation
from causticload.light.overlap import flux_density
from causticload.light.prepare import LitScene
from causticload.light.settle import blocked_between, nearest_in_triangle, reflecting_points
from causticload.light.splat import has_inside, path_at, path_plane
from causticload.light.tubes import LIT, Beams, Tubes, light_tubes
from causticload.scene.model import Bools, Floats, Ints

# Finer than for grids: a peak is read off to the last per cent.
FINE = 0.05
FINE_FLOOR_M = 1e-6  # what no double can make finer, at the distances of a town
MOST_HALVINGS = 16
# Three discs stray from the darkened sun by 1.3 % of its light within a circle, eight by 0.25 %.
FINE_RINGS = 8


class Parts(NamedTuple):
    """What each tube gives to each point. ``q`` parts."""

    point: Ints  # (q,) row of the point
    panel: Ints  # (q,) panel of the first reflection
    load: Floats  # (q,) share of the point's load [1]
    visible: Floats  # (q,) the same in the visible band
    direction: Floats  # (q, 3) unit, from the point to where the light comes from
    reflectance: Floats  # (q,) solar, of all reflections together [1]
    distance: Floats  # (q,) path from the first reflection [m]
    whole: Bools  # (q,) the middle of the sun's image is in view within this tube
    second: Bools  # (q,) by way of a second reflection
    low: Floats  # (q,) share of the point's load at the least reflectance that is left open [1]
    high: Floats  # (q,) the same at the largest


@dataclass
class PointLight:
    """Loads at points for a direct normal irradiance of 1 W/m²."""

    load: Floats  # (p,) [1]
    images: Ints  # (p,)
    parts: Parts

    def limits(self, point: int) -> tuple[float, float]:
        """Return the least and largest load that unknown angular laws leave open at a point."""
        mine = self.parts.point == point
        return float(self.parts.low[mine].sum()), float(self.parts.high[mine].sum())


@njit(cache=True, nogil=True, error_model="numpy")
def _section(start, direction, chief, frame, z, q):
    """Where three rays cross the plane across the chief ray at depth ``z``, into ``q`` (3, 2)."""
    for j in range(3):
        w = x = y = dw = dx = dy = 0.0
        for i in range(3):
            offset, d = start[j, i] - chief[i], direction[j, i]
            w += offset * frame[0, i]
            x += offset * frame[1, i]
            y += offset * frame[2, i]
            dw += d * frame[0, i]
            dx += d * frame[1, i]
            dy += d * frame[2, i]
        q[j, 0] = x + (z - w) * dx / dw
        q[j, 1] = y + (z - w) * dy / dw


@njit(cache=True, nogil=True, error_model="numpy")
def _approach(B, before, C, radius, reach, ring, sway, near, error, edge):
    """Tell which beams pass within ``radius`` of ``C``, and how well three rays describe them.

    Light may leave a beam by the angle ``sway`` of what its rays do not show.
    """
    q, m, far = np.empty((3, 2)), np.empty((3, 2)), np.empty((3, 2))
    for k in range(near.size):
        f = B.frame[k]
        z = x = y = 0.0
        for i in range(3):
            offset = C[i] - B.chief[k, i]
            z += offset * f[0, i]
            x += offset * f[1, i]
            y += offset * f[2, i]
        near[k], error[k], edge[k] = False, 0.0, 0
        if z < -radius:
            continue
        _section(B.start[k, :3], B.direction[k, :3], B.chief[k], f, z, q)
        _section(B.start[k, :3], B.direction[k, :3], B.chief[k], f, z + radius, far)
        _section(B.start[k, 3:], B.direction[k, 3:], B.chief[k], f, z, m)
        bulge, spread, size, worst = 0.0, 0.0, 0.0, -1.0
        mx, my = (q[0, 0] + q[1, 0] + q[2, 0]) / 3.0, (q[0, 1] + q[1, 1] + q[2, 1]) / 3.0
        for j in range(3):
            n = (j + 1) % 3
            e = math.hypot(m[j, 0] - 0.5 * (q[j, 0] + q[n, 0]), m[j, 1] - 0.5 * (q[j, 1] + q[n, 1]))
            bulge += e
            if e > worst:
                worst, edge[k] = e, j
            spread = max(spread, math.hypot(far[j, 0] - q[j, 0], far[j, 1] - q[j, 1]))
            size = max(size, math.hypot(q[j, 0] - mx, q[j, 1] - my))
        rho = reach[ring[k]] * (max(z, 0.0) + radius + before[k])
        within = size + 2.0 * bulge + spread + rho + radius + sway[k] * (max(z, 0.0) + radius)
        if math.hypot(x - mx, y - my) <= within:
            near[k], error[k] = True, worst / max(rho, FINE_FLOOR_M / FINE)


@njit(cache=True, nogil=True, error_model="numpy")
def _corner_lines(start, direction, before, chief, frame, at, slope):
    """Corner rays as lines over the depth: at + z slope, (3, 2) each; also the longest lag.

    The lag is what a ray's path from its first reflection is longer than its depth.
    """
    most = -math.inf
    for j in range(3):
        w = x = y = dw = dx = dy = 0.0
        for i in range(3):
            offset, d = start[j, i] - chief[i], direction[j, i]
            w += offset * frame[0, i]
            x += offset * frame[1, i]
            y += offset * frame[2, i]
            dw += d * frame[0, i]
            dx += d * frame[1, i]
            dy += d * frame[2, i]
        slope[j, 0], slope[j, 1] = dx / dw, dy / dw
        at[j, 0], at[j, 1] = x - w * dx / dw, y - w * dy / dw
        most = max(most, before[j] - w)
    return most


@njit(cache=True, nogil=True, error_model="numpy")
def _gather(B, factor, radii, weights, ring, P, N, tube, point, load, weight, whole):
    """Write every contribution of a beam to a point; without room, count the pairs at most."""
    q, w, W = np.empty((3, 2)), np.empty(3), np.empty(5)
    at, slope = np.empty((3, 2)), np.empty((3, 2))
    found = 0
    for k in range(factor.size):
        f, r = B.frame[k], radii[ring[k]]
        lag = _corner_lines(B.start[k], B.direction[k], B.before[k], B.chief[k], f, at, slope)
        for p in range(len(P)):
            z = x = y = 0.0
            for i in range(3):
                offset = P[p, i] - B.chief[k, i]
                z += offset * f[0, i]
                x += offset * f[1, i]
                y += offset * f[2, i]
            cos_g = -(N[p, 0] * f[0, 0] + N[p, 1] * f[0, 1] + N[p, 2] * f[0, 2])
            if N[p, 0] == 0.0 and N[p, 1] == 0.0 and N[p, 2] == 0.0:
                cos_g = 1.0  # an eye looks at the light
            if z <= 0.0 or cos_g <= 0.0:
                continue
            for j in range(3):
                q[j, 0], q[j, 1] = at[j, 0] + z * slope[j, 0], at[j, 1] + z * slope[j, 1]
            rho = r[-1] * (z + lag)
            if (
                min(q[0, 0], q[1, 0], q[2, 0]) > x + rho
                or max(q[0, 0], q[1, 0], q[2, 0]) < x - rho
                or min(q[0, 1], q[1, 1], q[2, 1]) > y + rho
                or max(q[0, 1], q[1, 1], q[2, 1]) < y - rho
            ):
                continue
            if tube.size == 0:
                found += 1
                continue
            path_plane(B, k, q, W)
            density = flux_density(
                q[0, 0] - x,
                q[0, 1] - y,
                q[1, 0] - x,
                q[1, 1] - y,
                q[2, 0] - x,
                q[2, 1] - y,
                path_at(W, x, y, z),
                r,
                weights[ring[k]],
            )
            if density <= 0.0:
                continue
            nearest_in_triangle(q, x, y, w)
            tube[found], point[found] = k, p
            load[found] = factor[k] * cos_g * density
            for i in range(3):
                weight[found, i] = w[i]
            whole[found] = has_inside(q, x, y)
            found += 1
    return found


def solve_points(
    lit: LitScene,
    *,
    sun_direction: Floats,
    sun_radius: float,
    points: Floats,
    normals: Floats | None = None,
    bounced: list[Bounced] | None = None,
    follow_waves: bool = True,
    quick: bool = False,
) -> PointLight:
    """Find the reflected light at points.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.
    sun_direction : (3,) float
        Unit vector to the sun, scene frame.
    sun_radius : float
        Angular radius of the sun. [rad]
    points : (p, 3) float
        Where, scene frame; near together, or the search is slow. [m]
    normals : (p, 3) float, optional
        Unit normals of the surface at the points. Without them each beam falls on a plane of its
        own across it, as on an eye that turns to it.
    bounced : list of Bounced, optional
        Beams after a second reflection, from :func:`causticload.light.field.solve_field`.
    follow_waves : bool
        Whether every roller wave is followed; else as the grids take them.
    quick : bool
        Refine tubes no further than for grids: to tell what is in view, not to read off a peak.

    Returns
    -------
    light : PointLight
        Loads, images and the parts they are made of.
    """
    P = np.ascontiguousarray(points, dtype=np.float64).reshape(-1, 3)
    N = np.zeros_like(P) if normals is None else np.ascontiguousarray(normals, dtype=np.float64)
    s = np.ascontiguousarray(sun_direction, dtype=np.float64)
    near = lit.close if follow_waves else lit
    found = [_Question(near, s, sun_radius, P, N, quick=quick).direct()]
    ask = _Question(lit, s, sun_radius, P, N, quick=quick)
    found += [ask.second(b) for b in bounced or [] if len(b.sheet)]
    parts = Parts(*(np.concatenate(a) for a in zip(*found, strict=True)))
    return PointLight(
        load=np.bincount(parts.point, weights=parts.load, minlength=len(P)).astype(float),
        images=np.bincount(parts.point[parts.whole], minlength=len(P)).astype(np.int32),
        parts=parts,
    )


def _room(q: int) -> tuple[Ints, Ints, Floats, Floats, Bools]:
    """Make arrays for ``q`` contributions: tube, point, load, weight, whole."""
    return (
        np.empty(q, np.int32),
        np.empty(q, np.int32),
        np.empty(q),
        np.empty((q, 3)),
        np.empty(q, bool),
    )


def _new_generation(tubes: Tubes) -> _Generation:
    n = len(tubes.facet)
    return _Generation(tubes, np.ones(n), np.zeros(n, np.int32), np.zeros(n, np.int32))


class _Question:
    """Points that ask under one sun."""

    def __init__(
        self, lit: LitScene, s: Floats, sun_radius: float, P: Floats, N: Floats, *, quick: bool
    ) -> None:
        self.lit, self.s = lit, s
        self.radii, self.weights = lit.rings(sun_radius, None if quick else FINE_RINGS)
        self.fine = LINEAR if quick else FINE
        self.P, self.N = P, N
        self.reach = np.ascontiguousarray(self.radii[:, -1])
        self.middle = 0.5 * (P.min(axis=0) + P.max(axis=0))
        self.radius = float(np.linalg.norm(P - self.middle, axis=1).max())

    def _approach(self, beams: Beams, ring: Ints, sway: Floats) -> tuple[Bools, Floats, Ints]:
        n = len(ring)
        near, error, edge = np.empty(n, bool), np.empty(n), np.empty(n, np.int64)
        _approach(
            beams,
            beams.longest,
            self.middle,
            self.radius,
            self.reach,
            ring,
            sway,
            near,
            error,
            edge,
        )
        return near, error, edge

    def direct(self) -> Parts:
        """Light by one reflection: refine the tubes that pass near, then gather."""
        lit = self.lit
        work = _new_generation(lit.base)
        tubes: list[Tubes] = []
        while len(work.age):
            beams, outcome = light_tubes(lit.F, lit.R, work.tubes, sun_direction=self.s)
            sway = wave_sway(lit.F, work.tubes)
            near, error, edge = self._approach(beams, work.tubes.sheet, sway)
            waved = near & (sway > 0.0)
            near &= (outcome == LIT) & ~waved
            fine = (error <= self.fine) | (work.age >= MOST_HALVINGS)
            tubes.append(work.tubes.take(near & fine))
            rest = near & ~fine
            # With a wave between its corners a tube may leave by another way than they do.
            strips = slice_waves(lit.F, work.tubes.take(waved), part=WAVE_PART)
            work = join_generations(
                [halve_generation(work.take(rest), edge[rest]), _new_generation(strips)]
            )
        ready = Tubes(*(np.concatenate(a) for a in zip(*tubes, strict=True)))
        beams, _ = light_tubes(lit.F, lit.R, ready, sun_direction=self.s)
        kept = 1.0 - lit.scatter[ready.sheet]
        return self._gather(beams, None, ready, kept, ready.sheet, lit.shows[ready.sheet])

    def second(self, bounced: Bounced) -> Parts:
        """Light by two reflections."""
        near, _, _ = self._approach(bounced.beams, bounced.sheet, np.zeros(len(bounced.sheet)))
        tubes = bounced.tubes.take(near)
        kept = bounced.kept[near]
        return self._gather(
            bounced.beams.take(near),
            bounced.sources.take(near),
            tubes,
            kept,
            bounced.sheet[near],
            bounced.shows[near],
            bounced.mirror[near],
        )

    def _left_open(
        self, beams: Beams, sources: Beams | None, tubes: Tubes, mirror: Ints | None
    ) -> tuple[Floats, Floats]:
        """Least and largest reflectance of each beam's mirrors over what was taken, (n,) each."""
        sheets = self.lit.sheets
        first = beams if sources is None else sources
        # A mirror turns light by pi less twice its angle of incidence.
        theta = [0.5 * np.arccos(np.clip(first.frame[:, 0] @ self.s, -1.0, 1.0))]
        rows = [tubes.sheet]
        if mirror is not None:
            turned = np.einsum("ni,ni->n", first.frame[:, 0], beams.frame[:, 0])
            theta.append(0.5 * np.arccos(np.clip(-turned, -1.0, 1.0)))
            rows.append(mirror)
        found = []
        for table in (sheets.low, sheets.high):
            factor = np.ones(len(tubes.facet))
            for angle, row in zip(theta, rows, strict=True):
                place = np.rint(angle * (2.0 / np.pi) * (table.shape[-1] - 1)).astype(np.int64)
                factor *= table[row, 0, place]
            found.append(factor)
        return found[0], found[1]

    def _gather(
        self,
        beams: Beams,
        sources: Beams | None,
        tubes: Tubes,
        kept: Floats,
        ring: Ints,
        shows: Bools,
        mirror: Ints | None = None,
    ) -> Parts:
        lit = self.lit
        factor = beams.solar * kept
        args = (beams, factor, self.radii, self.weights, ring, self.P, self.N)

        size = max(1, _gather(*args, *_room(0)))
        tube, point, load, weight, whole = out = _room(size)
        used = _gather(*args, *out)
        tube, point, load = tube[:used], point[:used], load[:used]
        weight, whole = weight[:used], whole[:used]
        X = reflecting_points(beams, tube, weight, lit.clearance_m)
        P = self.P[point] + lit.clearance_m * self.N[point]
        free = ~blocked_between(lit.tracer, P, X)
        first = X
        if sources is not None:
            first = reflecting_points(sources, tube, weight, lit.clearance_m)
            free[free] = ~blocked_between(lit.tracer, X[free], first[free])
        ask = np.flatnonzero(free)
        to_sun = np.ascontiguousarray(np.broadcast_to(self.s, (len(ask), 3)))
        free[ask] = ~lit.tracer.occluded(np.ascontiguousarray(first[ask]), to_sun)
        tube, point, load, X, whole = tube[free], point[free], load[free], X[free], whole[free]
        solar = beams.solar[tube]
        visible = beams.power[tube, 2] + beams.power[tube, 3]
        low, high = self._left_open(beams, sources, tubes, mirror)
        crossing = tubes.area * np.abs(lit.F.face_normal[tubes.facet] @ self.s)
        way = X - self.P[point]
        length = np.linalg.norm(way, axis=1)
        return Parts(
            point=point,
            panel=lit.F.panel[tubes.facet[tube]],
            load=load,
            visible=load * np.divide(visible, solar, out=np.zeros_like(solar), where=solar > 0),
            direction=way / length[:, None],
            reflectance=solar * kept[tube] / crossing[tube],
            distance=length + beams.longest[tube],
            whole=whole & shows[tube],
            second=np.full(len(tube), sources is not None),
            low=load * low[tube],
            high=load * high[tube],
        )
