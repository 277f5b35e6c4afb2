"""What a beam's rays meet, told in one number each, and whether they agree."""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numba import njit

from causticload.light.bvh import Tracer
from causticload.light.facets import Facets
from causticload.light.tubes import Beams
from causticload.scene.model import Bools, Floats, Ints, Scene

# Codes of what a ray meets. Charts are their numbers, from 0; mirrors count down from MIRROR.
SKY, BLOCKED, UNKNOWN, MIRROR = -1, -2, -3, -10

# Test rays start a little inside the corners: a corner itself lies on the seam to its neighbours.
INSET = 0.01
# How far a ray that has met nothing is thought to go when its blur is laid out.
FAR = 1000.0


class Meanings(NamedTuple):
    """What each triangle is to a ray that meets it. ``m`` triangles."""

    front: Ints  # (m,) code when met from the side of its normal
    back: Ints  # (m,) code when met from behind
    chart: Ints  # (m,) chart of a mirror that is a receiver too, else -1


def make_meanings(scene: Scene, leans: Bools) -> Meanings:
    """Say what each triangle is to a ray.

    Flat panels and such as lean by a figure are mirrors of their own; another smooth reflector is
    one mirror, whose normals run on across its facets. A receiver that is no reflector is lit on
    the side of its normal only.

    Parameters
    ----------
    scene : Scene
        What stands there.
    leans : (p,) bool
        Panels whose normals are not the mesh's, so that they end with the panel.

    Returns
    -------
    meanings : Meanings
        One row a triangle.
    """
    panel, chart = scene.panel, scene.chart
    front = np.where(chart >= 0, chart, BLOCKED).astype(np.int32)
    back = np.full(len(panel), BLOCKED, np.int32)
    mirrors = panel >= 0
    if mirrors.any():
        alone = scene.panels.flat | leans
        # Numbers of single panels first, then of smooth surfaces.
        unit = np.where(
            alone[panel[mirrors]], panel[mirrors], len(scene.panels) + scene.surface[mirrors]
        )
        front[mirrors] = back[mirrors] = MIRROR - unit
    return Meanings(front, back, np.where(mirrors, chart, -1).astype(np.int32))


@njit(cache=True, nogil=True, error_model="numpy")
def _codes(triangle, direction, face_normal, front, back, chart, out, under):
    for k in range(triangle.size):
        t = triangle[k]
        under[k] = -1
        if t < 0:
            out[k] = SKY
            continue
        toward = (
            direction[k, 0] * face_normal[t, 0]
            + direction[k, 1] * face_normal[t, 1]
            + direction[k, 2] * face_normal[t, 2]
        )
        out[k] = front[t] if toward < 0.0 else back[t]
        if toward < 0.0:
            under[k] = chart[t]


def meanings_of(
    triangle: Ints, direction: Floats, *, F: Facets, meanings: Meanings
) -> tuple[Ints, Ints]:
    """Say what rays meet.

    Parameters
    ----------
    triangle : (k,) int
        Triangle met, -1 for none.
    direction : (k, 3) float
        Directions of the rays.
    F : Facets
        The scene's triangles.
    meanings : Meanings
        What each triangle is to a ray.

    Returns
    -------
    code : (k,) int
        What it is.
    under : (k,) int
        Chart of a mirror met that is a receiver too, -1 for none.
    """
    code, under = np.empty(len(triangle), np.int32), np.empty(len(triangle), np.int32)
    _codes(
        np.ascontiguousarray(triangle, dtype=np.int32),
        direction,
        F.face_normal,
        meanings.front,
        meanings.back,
        meanings.chart,
        code,
        under,
    )
    return code, under


@njit(cache=True, nogil=True, error_model="numpy")
def _blurred_rays(B, depth, reach, ring, clearance, origin, direction):
    """Rays from the corners to the rim of the footprint at ``depth`` along the chief ray."""
    q = np.empty((3, 2))
    for k in range(depth.size):
        z = depth[k] if depth[k] < math.inf else FAR
        rho = (z + max(B.before[k, 0], B.before[k, 1], B.before[k, 2])) * reach[ring[k]]
        f = B.frame[k]
        mx, my = 0.0, 0.0
        for j in range(3):
            r = B.direction[k, j]
            along = r[0] * f[0, 0] + r[1] * f[0, 1] + r[2] * f[0, 2]
            x, y, w = 0.0, 0.0, 0.0
            rx, ry = 0.0, 0.0
            for i in range(3):
                offset = B.start[k, j, i] - B.chief[k, i]
                w += offset * f[0, i]
                x += offset * f[1, i]
                y += offset * f[2, i]
                rx += r[i] * f[1, i]
                ry += r[i] * f[2, i]
            q[j, 0] = x + (z - w) * rx / along
            q[j, 1] = y + (z - w) * ry / along
            mx += q[j, 0] / 3.0
            my += q[j, 1] / 3.0
        size = 0.0
        for j in range(3):
            size = max(size, math.hypot(q[j, 0] - mx, q[j, 1] - my))
        for j in range(3):
            ox, oy = q[j, 0] - mx, q[j, 1] - my
            length = math.hypot(ox, oy)
            if length > 1e-3 * rho and length > 1e-3 * size:
                ox, oy = ox / length, oy / length
            else:  # a point of an image has no outside of its own: share the rim out
                ox, oy = math.cos(2.0944 * j), math.sin(2.0944 * j)
            tx, ty = q[j, 0] + rho * ox, q[j, 1] + rho * oy
            norm = 0.0
            for i in range(3):
                start = B.start[k, j, i] + INSET * (B.chief[k, i] - B.start[k, j, i])
                start += clearance * B.side[k, i]
                origin[k, j, i] = start
                d = B.chief[k, i] + z * f[0, i] + tx * f[1, i] + ty * f[2, i] - start
                direction[k, j, i] = d
                norm += d * d
            norm = math.sqrt(norm)
            for i in range(3):
                direction[k, j, i] /= norm


def find_targets(
    beams: Beams,
    *,
    F: Facets,
    meanings: Meanings,
    tracer: Tracer,
    reach: Floats,
    ring: Ints,
    clearance_m: float,
) -> tuple[Ints, Ints]:
    """Send each beam's chief ray and three rays to the rim of its footprint.

    Parameters
    ----------
    beams : Beams
        ``k`` beams.
    F : Facets
        The scene's triangles.
    meanings : Meanings
        What each triangle is to a ray.
    tracer : Tracer
        Finds what rays meet.
    reach : (s,) float
        Tangent of the angular radius of the sun's largest disc for each kind of surface.
    ring : (k,) int
        Row of ``reach`` for each beam.
    clearance_m : float
        How far above the facet rays are traced from. [m]

    Returns
    -------
    code : (k, 4) int
        What the three rim rays and the chief ray meet.
    under : (k, 4) int
        Chart of a mirror met that is a receiver too, -1 for none.
    """
    k = len(beams.chief)
    triangle = np.empty((k, 4), np.int32)
    direction = np.empty((k, 4, 3))
    direction[:, 3] = beams.frame[:, 0]
    triangle[:, 3], depth = tracer.first_hit(
        beams.chief + clearance_m * beams.side, np.ascontiguousarray(beams.frame[:, 0])
    )
    origin, rim = np.empty((k, 3, 3)), np.empty((k, 3, 3))
    _blurred_rays(beams, depth, reach, ring, clearance_m, origin, rim)
    direction[:, :3] = rim
    hit, _ = tracer.first_hit(origin.reshape(-1, 3), rim.reshape(-1, 3))
    triangle[:, :3] = hit.reshape(k, 3)
    code, under = meanings_of(triangle.ravel(), direction.reshape(-1, 3), F=F, meanings=meanings)
    return code.reshape(k, 4), under.reshape(k, 4)


def count_sun(beams: Beams, *, tracer: Tracer, sun_direction: Floats, clearance_m: float) -> Ints:
    """Count how many of four points of each beam's start see the sun.

    Parameters
    ----------
    beams : Beams
        ``k`` beams at their first reflection.
    tracer : Tracer
        Finds what rays meet.
    sun_direction : (3,) float
        Unit vector to the sun.
    clearance_m : float
        How far above the facet rays are traced from. [m]

    Returns
    -------
    seen : (k,) int
        0 to 4.
    """
    k = len(beams.chief)
    origin = np.empty((k, 4, 3))
    origin[:, 3] = beams.chief
    origin[:, :3] = beams.start[:, :3] + INSET * (beams.chief[:, None] - beams.start[:, :3])
    origin += clearance_m * beams.side[:, None]
    to_sun = np.ascontiguousarray(np.broadcast_to(sun_direction, (4 * k, 3)))
    hidden = tracer.occluded(origin.reshape(-1, 3), to_sun)
    return 4 - hidden.reshape(k, 4).sum(axis=1).astype(np.int32)


@njit(cache=True, nogil=True, error_model="numpy")
def _spread_rays(B, reach, ring, clearance, origin, direction):
    """Rays spread evenly over a beam's start and, at each, over the sun's disc."""
    rays = origin.shape[1]
    for k in range(origin.shape[0]):
        f = B.frame[k]
        for a in range(rays):
            # Roberts' low-discrepancy sequence in three dimensions; the fourth number is the ray's
            # own rank, which is spread evenly by itself.
            u = (0.5 + (a + 1) * 0.8191725133961645) % 1.0
            v = (0.5 + (a + 1) * 0.6710436067037893) % 1.0
            turn = 2.0 * math.pi * ((0.5 + (a + 1) * 0.5497004779019703) % 1.0)
            r = math.sqrt((a + 0.5) / rays) * reach[ring[k]]
            if u + v > 1.0:
                u, v = 1.0 - u, 1.0 - v
            w = 1.0 - u - v
            norm = 0.0
            for i in range(3):
                origin[k, a, i] = (
                    w * B.start[k, 0, i]
                    + u * B.start[k, 1, i]
                    + v * B.start[k, 2, i]
                    + clearance * B.side[k, i]
                )
                d = (
                    w * B.direction[k, 0, i]
                    + u * B.direction[k, 1, i]
                    + v * B.direction[k, 2, i]
                    + r * (math.cos(turn) * f[1, i] + math.sin(turn) * f[2, i])
                )
                direction[k, a, i] = d
                norm += d * d
            norm = math.sqrt(norm)
            for i in range(3):
                direction[k, a, i] /= norm


def spread_targets(
    beams: Beams,
    *,
    F: Facets,
    meanings: Meanings,
    tracer: Tracer,
    reach: Floats,
    ring: Ints,
    clearance_m: float,
    sun_direction: Floats | None,
    rays: int,
) -> tuple[Ints, Ints, Bools]:
    """Send rays spread over each beam, to share out the light of beams whose rays disagree.

    Parameters
    ----------
    beams : Beams
        ``k`` beams.
    F : Facets
        The scene's triangles.
    meanings : Meanings
        What each triangle is to a ray.
    tracer : Tracer
        Finds what rays meet.
    reach : (s,) float
        Tangent of the angular radius of the sun's largest disc for each kind of surface.
    ring : (k,) int
        Row of ``reach`` for each beam.
    clearance_m : float
        How far above the facet rays are traced from. [m]
    sun_direction : (3,) float or None
        Unit vector to the sun, to ask whether each ray's start sees it; None where it does.
    rays : int
        Rays ``m`` per beam.

    Returns
    -------
    code : (k, m) int
        What the rays meet.
    under : (k, m) int
        Chart of a mirror met that is a receiver too, -1 for none.
    lit : (k, m) bool
        Whether the ray's start sees the sun.
    """
    shape = (len(beams.chief), rays)
    starts, ways = np.empty((*shape, 3)), np.empty((*shape, 3))
    _spread_rays(beams, reach, ring, clearance_m, starts, ways)
    origin, direction = starts.reshape(-1, 3), ways.reshape(-1, 3)
    hit, _ = tracer.first_hit(origin, direction)
    lit = np.ones(shape, bool)
    if sun_direction is not None:
        to_sun = np.ascontiguousarray(np.broadcast_to(sun_direction, origin.shape))
        lit = ~tracer.occluded(origin, to_sun).reshape(shape)
    code, under = meanings_of(hit, direction, F=F, meanings=meanings)
    return code.reshape(shape), under.reshape(shape), lit


def distinct_charts(code: Ints) -> tuple[Ints, Ints]:
    """List each beam with each chart among its codes once.

    Parameters
    ----------
    code : (k, m) int
        What the rays of each beam meet.

    Returns
    -------
    beam, chart : (p,) int
        The pairs.
    """
    ordered = np.sort(code, axis=1)
    new = np.ones_like(ordered, dtype=bool)
    new[:, 1:] = ordered[:, 1:] != ordered[:, :-1]
    beam, column = np.nonzero(new & (ordered >= 0))
    return beam.astype(np.int32), ordered[beam, column]
