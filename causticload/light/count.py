"""The ray count: an independent measure of the load at a spot, with its standard error.

Random points of the reflectors, random points of the sun's face, the mirror law, and a count of
what falls within a small disc of the receiver. It shares with the ray tubes the scene, the
reflectance tables and the tracer, and nothing else: no tubes, no overlap law, no grids.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, fields

import numpy as np

from causticload.errors import InputError
from causticload.light.prepare import LitScene
from causticload.scene.figure_slopes import slopes_at, steepest_of_panels
from causticload.scene.model import Bools, Floats, Ints

# Pieces of facets between which rays are shared out have no longer edge than this.
PIECE_M = 1.5
BATCH = 400_000


@dataclass(frozen=True)
class RayCount:
    """A load counted with random rays."""

    mean: float  # W/m² over the disc, or in suns where no beam was given
    standard_error: float  # the same unit
    rays: int
    hits: int


@dataclass(frozen=True)
class _Pieces:
    """Pieces of facets that may send light to the spot."""

    facet: Ints  # (k,)
    corner: Floats  # (k, 3, 3) m
    normal: Floats  # (k, 3, 3) corner normals, not renormalised between
    across: Floats  # (k,) m², area across the sun's rays
    lean: Floats  # (k,) rad, at most: how far figures turn the normals given here


def _quarter(corner: Floats, normal: Floats) -> tuple[Floats, Floats]:
    """Split triangles in four; values at corners are interpolated linearly."""

    def split(v: Floats) -> Floats:
        a, b, c = v[:, 0], v[:, 1], v[:, 2]
        ab, bc, ca = (a + b) / 2, (b + c) / 2, (c + a) / 2
        rows = ((a, ab, ca), (ab, b, bc), (ca, bc, c), (ab, bc, ca))
        return np.concatenate([np.stack(r, axis=1) for r in rows])

    return split(corner), split(normal)


def _pieces(lit: LitScene, s: Floats) -> _Pieces:
    """All reflectors in pieces that are short against the distances in a street."""
    facet = lit.scene.reflectors
    corner = lit.scene.triangles[facet]
    normal = lit.scene.corner_normals[facet]
    done: list[tuple[Ints, Floats, Floats]] = []
    while len(facet):
        longest = np.linalg.norm(corner - np.roll(corner, 1, axis=1), axis=2).max(axis=1)
        large = longest > PIECE_M
        done.append((facet[~large], corner[~large], normal[~large]))
        corner, normal = _quarter(corner[large], normal[large])
        facet = np.tile(facet[large], 4)
    facet, corner, normal = (np.concatenate(a) for a in zip(*done, strict=True))
    cross = np.cross(corner[:, 1] - corner[:, 0], corner[:, 2] - corner[:, 0])
    lean = np.zeros(len(facet))
    g = lit.scene.figures
    if g is not None:
        lean = np.append(steepest_of_panels(g), 0.0)[lit.scene.panel[facet]]
    return _Pieces(facet, corner, normal, 0.5 * np.abs(cross @ s), lean)


def _may_reach(p: _Pieces, s: Floats, *, spread: float, centre: Floats, radius: float) -> Bools:
    """Pieces of which any ray could pass within ``radius`` of ``centre``; never too few.

    A ray starts within the piece's radius of its middle, and leaves within twice the largest
    angle between its normals and that of its figure, plus ``spread``, of the middle's reflected
    ray.
    """
    middle = p.corner.mean(axis=1)
    size = np.linalg.norm(p.corner - middle[:, None], axis=2).max(axis=1)
    unit = p.normal / np.linalg.norm(p.normal, axis=2, keepdims=True)
    n = unit.mean(axis=1)
    n /= np.linalg.norm(n, axis=1, keepdims=True)
    turn = np.arccos(np.clip(np.einsum("kji,ki->kj", unit, n), -1, 1)).max(axis=1)
    r = 2.0 * (n @ s)[:, None] * n - s
    way = centre - middle
    depth = np.einsum("ki,ki->k", way, r)
    lateral = np.linalg.norm(way - depth[:, None] * r, axis=1)
    angle = np.minimum(2.0 * (turn + p.lean) + spread, 1.5)
    reach = size + radius + (np.abs(depth) + size + radius) * np.tan(angle)
    return (depth > -(size + radius)) & (lateral <= reach)


def _tangent_frame(n: Floats) -> tuple[Floats, Floats]:
    """Two unit vectors across each row of ``n``."""
    helper = np.where(np.abs(n[:, 2:3]) < 0.9, [0.0, 0.0, 1.0], [1.0, 0.0, 0.0])
    e1 = np.cross(helper, n)
    e1 /= np.linalg.norm(e1, axis=1, keepdims=True)
    return e1, np.cross(n, e1)


class _Experiment:
    """Random rays under one sun, and what they bring to one spot."""

    def __init__(
        self,
        lit: LitScene,
        s: Floats,
        sun_radius: float,
        centre: Floats,
        normal: Floats,
        radius: float,
        rng: np.random.Generator,
    ) -> None:
        self.lit, self.s, self.sun_radius, self.rng = lit, s, sun_radius, rng
        self.centre, self.normal, self.radius = centre, normal, radius
        self.angle = np.radians(np.linspace(0.0, 90.0, lit.R.shape[-1]))

    def emit(self, p: _Pieces, rays: int) -> tuple[Floats, Floats, Floats, Floats, Floats]:
        """Random rays off the pieces: start, direction, power (2,), s axis, and sun direction.

        ``power`` is in m² per ray: summed over rays, the flux over direct normal irradiance.
        """
        rng, lit = self.rng, self.lit
        total = p.across.sum()
        k = rng.choice(len(p.across), size=rays, p=p.across / total)
        root, split = np.sqrt(rng.random(rays)), rng.random(rays)
        b = np.stack([1.0 - root, root * (1.0 - split), root * split], axis=1)
        x = np.einsum("nj,nji->ni", b, p.corner[k])
        n = np.einsum("nj,nji->ni", b, p.normal[k])
        n /= np.linalg.norm(n, axis=1, keepdims=True)
        e1, e2 = _tangent_frame(np.broadcast_to(self.s, (rays, 3)))
        d = lit.disc.sample(rng, rays, self.sun_radius)
        sun = self.s + d[:, :1] * e1 + d[:, 1:] * e2
        sun /= np.linalg.norm(sun, axis=1, keepdims=True)
        facet = p.facet[k]
        face = lit.F.face_normal[facet]
        sheet, sheets = self._sheet(facet)
        n = self._lean(n, facet, sheet, x)
        n = n * np.sign(np.einsum("ni,ni->n", n, face))[:, None]
        side = np.sign(np.einsum("ni,ni->n", face, sun))
        lit_side = np.einsum("ni,ni->n", n, sun) * side
        share = np.repeat(0.5 * sheets[:, None], 2, axis=1)
        out, power, axis = self._mirror(-sun, n, sheet, share)
        leaves = np.einsum("ni,ni->n", out, face) * side
        tilt = np.abs(np.einsum("ni,ni->n", face, sun)) / np.abs(face @ self.s)
        keep = (lit_side > 0.0) & (leaves > 0.0)
        power *= (np.where(keep, tilt, 0.0) * total / rays)[:, None]
        return x + (side * lit.clearance_m)[:, None] * face, out, power, axis, sun

    def _sheet(self, facet: Ints) -> tuple[Ints, Ints]:
        """Pick one of each facet's sheets; also how many there are, which weighs the ray."""
        exact, own = self.lit.exact, self.lit.scene.surface[facet]
        count = exact.count[own]
        return exact.first[own] + self.rng.integers(0, count), count

    def _lean(self, n: Floats, facet: Ints, sheet: Ints, x: Floats) -> Floats:
        """Tilt normals by the figure of their sheet and, at random, by its roughness."""
        scene, exact = self.lit.scene, self.lit.exact
        panel = scene.panel[facet]
        frame = self._panel_frame(n, panel)
        slope = self.rng.normal(size=(len(n), 2)) * exact.slopes[sheet]
        g = scene.figures
        if g is not None and (on := np.flatnonzero(g.first[panel] >= 0)).size:
            p = panel[on]
            row = g.first[p] + np.minimum(exact.pane[sheet[on]], g.count[p] - 1)
            axes = np.stack([scene.panels.width_axis[p], g.height_axis[p]], axis=1)
            xy = np.einsum("ni,nai->na", x[on] - g.middle[p], axes)
            side = np.sign(
                np.einsum("ni,ni->n", self.lit.F.face_normal[facet[on]], scene.panels.normal[p])
            )
            slope[on] += side[:, None] * slopes_at(g, row, xy)
        if not slope.any():
            return n
        leant = n - slope[:, :1] * frame[0] - slope[:, 1:] * frame[1]
        return np.asarray(leant / np.linalg.norm(leant, axis=1, keepdims=True))

    def _panel_frame(self, n: Floats, panel: Ints) -> tuple[Floats, Floats]:
        """The panel's width and height axis for each ray; any axes where it has none."""
        panels = self.lit.scene.panels
        width = panels.width_axis[panel]
        height = np.cross(panels.normal[panel], width)
        e1, e2 = _tangent_frame(n)
        none = (np.einsum("ni,ni->n", width, width) < 0.5)[:, None]
        return np.where(none, e1, width), np.where(none, e2, height)

    def _mirror(
        self, d: Floats, n: Floats, sheet: Ints, power: Floats, before: Floats | None = None
    ) -> tuple[Floats, Floats, Floats]:
        """Mirror law and reflectance; ``before`` is the axis that ``power`` refers to."""
        cos = np.einsum("ni,ni->n", d, n)
        out = d - 2.0 * cos[:, None] * n
        axis = np.cross(d, n)
        length = np.linalg.norm(axis, axis=1, keepdims=True)
        axis = np.divide(axis, length, out=np.zeros_like(axis), where=length > 1e-12)
        if before is not None:
            c2 = np.einsum("ni,ni->n", axis, before)[:, None] ** 2
            power = c2 * power + (1.0 - c2) * power[:, ::-1]
        theta = np.arccos(np.clip(np.abs(cos), 0.0, 1.0))
        R = np.empty_like(power)
        for row in np.unique(sheet):
            mine = sheet == row
            for pol in range(2):
                R[mine, pol] = np.interp(theta[mine], self.angle, self.lit.exact.R[row, 0, pol])
        return out, power * R * (1.0 - self.lit.exact.scatter[sheet])[:, None], axis

    def arrive(self, x: Floats, d: Floats) -> tuple[Bools, Floats]:
        """Which rays cross the spot from its front, and how far away that is."""
        down = -(d @ self.normal)
        t = ((x - self.centre) @ self.normal) / np.where(down > 0.0, down, np.nan)
        hit = x + t[:, None] * d - self.centre
        inside = (t > 0.0) & (np.einsum("ni,ni->n", hit, hit) <= self.radius**2)
        return inside, t

    def first_order(self, p: _Pieces, rays: int) -> Floats:
        """Power of each ray that reaches the spot by one reflection, 0 for the others."""
        x, d, power, _, sun = self.emit(p, rays)
        value = power.sum(axis=1)
        inside, t = self.arrive(x, d)
        value[~inside] = 0.0
        return self._unless_blocked(value, x, d, t, x, sun)

    def second_order(self, p: _Pieces, rays: int) -> Floats:
        """Power of each ray that reaches the spot by two reflections, 0 for the others."""
        lit = self.lit
        x, d, power, axis, sun = self.emit(p, rays)
        triangle, way = lit.tracer.first_hit(x, d)
        value = np.zeros(rays)
        on = np.flatnonzero((triangle >= 0) & (lit.sheet_of[triangle] >= 0))
        if not len(on):
            return value
        t = triangle[on]
        y = x[on] + way[on, None] * d[on]
        sheet, sheets = self._sheet(t)
        n = self._lean(self._normal_at(t, y), t, sheet, y)
        before = power[on] * sheets[:, None]
        out, again, _ = self._mirror(d[on], n, sheet, before, axis[on])
        face = lit.F.face_normal[t]
        side = -np.sign(np.einsum("ni,ni->n", d[on], face))
        turned = np.sign(np.einsum("ni,ni->n", n, face)) * side
        leaves = (np.einsum("ni,ni->n", out, face) * side > 0.0) & (
            np.einsum("ni,ni->n", n, d[on]) * turned < 0.0
        )
        z = y + (side * lit.clearance_m)[:, None] * face
        inside, far = self.arrive(z, out)
        value[on] = np.where(inside & leaves, again.sum(axis=1), 0.0)
        value[on] = self._unless_blocked(value[on], z, out, far, x[on], sun[on])
        return value

    def _normal_at(self, t: Ints, y: Floats) -> Floats:
        """Interpolated normal of triangle ``t`` at the point ``y`` on it, by a linear solve."""
        T = self.lit.scene.triangles[t]
        frame = np.stack([T[:, 1] - T[:, 0], T[:, 2] - T[:, 0], self.lit.F.face_normal[t]], axis=2)
        uv = np.linalg.solve(frame, (y - T[:, 0])[:, :, None])[:, :2, 0]
        b = np.concatenate([1.0 - uv.sum(axis=1, keepdims=True), uv], axis=1)
        n = np.einsum("nj,nji->ni", b, self.lit.scene.corner_normals[t])
        return n / np.linalg.norm(n, axis=1, keepdims=True)

    def _unless_blocked(
        self, value: Floats, x: Floats, d: Floats, t: Floats, lit_at: Floats, sun: Floats
    ) -> Floats:
        """Strike out rays that something stops, on the last leg or before the first mirror."""
        tracer = self.lit.tracer
        live = np.flatnonzero(value > 0.0)
        limit = t[live] - self.lit.clearance_m
        value[live[tracer.occluded(x[live], d[live], limit=limit)]] = 0.0
        live = np.flatnonzero(value > 0.0)
        value[live[tracer.occluded(lit_at[live], sun[live])]] = 0.0
        return value


def count_spot(
    lit: LitScene,
    *,
    sun_direction: Floats,
    sun_radius: float,
    centre: Floats,
    normal: Floats,
    radius_m: float,
    rays: int,
    seed: int,
    second: bool = True,
) -> RayCount:
    """Count random rays that reach a small disc on a receiver.

    Rays start only on pieces of reflectors from which the disc can be reached by one reflection,
    by a bound that leaves none out; that changes the error, not the mean. Second reflections are
    counted from all reflectors with as many rays again, since no such bound is at hand.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.
    sun_direction : (3,) float
        Unit vector to the middle of the sun, scene frame.
    sun_radius : float
        Angular radius of the sun. [rad]
    centre, normal : (3,) float
        Middle of the disc and the unit normal of its lit side, scene frame. [m]
    radius_m : float
        Radius of the disc, > 0. [m]
    rays : int
        Number of rays, >= 1,000.
    seed : int
        Seed of the random numbers.
    second : bool
        Whether to count second reflections too.

    Returns
    -------
    count : RayCount
        In suns: irradiance over direct normal irradiance.

    Raises
    ------
    InputError
        If the radius or the number of rays is out of range.
    """
    if not (0.0 < radius_m < math.inf):
        raise InputError(f"radius must be > 0, got {radius_m}")
    if rays < 1000:
        raise InputError(f"rays must be at least 1,000 to give a standard error, got {rays}")
    s = np.asarray(sun_direction, dtype=float)
    experiment = _Experiment(
        lit,
        s,
        sun_radius,
        np.asarray(centre, float),
        np.asarray(normal, float),
        radius_m,
        np.random.default_rng(seed),
    )
    everything = _pieces(lit, s)
    everything = _select(everything, everything.across > 0.0)
    # Far out on the Gaussian of a rough surface a ray still counts: six standard deviations.
    spread = 1.001 * sun_radius + 12.0 * float(lit.exact.slopes.max(initial=0.0))
    near = _select(
        everything,
        _may_reach(everything, s, spread=spread, centre=experiment.centre, radius=radius_m),
    )
    mean, variance, hits = 0.0, 0.0, 0
    for pieces, order, wanted in (
        (near, experiment.first_order, True),
        (everything, experiment.second_order, second),
    ):
        if wanted and len(pieces.across):
            m, v, h = _accumulate(order, pieces, rays)
            mean, variance, hits = mean + m, variance + v, hits + h
    area = math.pi * radius_m**2
    return RayCount(mean / area, math.sqrt(variance) / area, rays, hits)


def _select(p: _Pieces, index: Bools) -> _Pieces:
    return _Pieces(*(getattr(p, f.name)[index] for f in fields(p)))


def _accumulate(order, pieces: _Pieces, rays: int) -> tuple[float, float, int]:  # type: ignore[no-untyped-def]
    """Sum of the rays' powers, its variance, and the number that arrived."""
    total, squares, hits, left = 0.0, 0.0, 0, rays
    while left > 0:
        n = min(BATCH, left)
        value = order(pieces, n) * (n / rays)  # powers were shared out over the batch
        total += float(value.sum())
        squares += float((value**2).sum())
        hits += int(np.count_nonzero(value))
        left -= n
    return total, max(0.0, squares - total**2 / rays), hits
