"""What a beam's rays meet, told in one number each, and whether they agree."""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numba import njit

from causticload.light.bvh import Tracer
from causticload.light.facets import Facets
from causticload.light.tubes import Beams
from causticload.scene.model import Floats, Ints, Scene

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


def make_meanings(scene: Scene) -> Meanings:
    """Say what each triangle is to a ray.

    Flat panels are mirrors of their own; a smooth reflector is one mirror, whose normals run on
    across its facets. A receiver that is no reflector is lit on the side of its normal only.

    Parameters
    ----------
    scene : Scene
        What stands there.

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
        flat = scene.panels.flat[panel[mirrors]]
        # Numbers of flat panels first, then of smooth surfaces.
        unit = np.where(flat, panel[mirrors], len(scene.panels) + scene.surface[mirrors])
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
    code, under = np.empty(4 * k, np.int32), np.empty(4 * k, np.int32)
    _codes(
        triangle.ravel(),
        direction.reshape(-1, 3),
        F.face_normal,
        meanings.front,
        meanings.back,
        meanings.chart,
        code,
        under,
    )
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


def distinct_charts(code: Ints) -> tuple[Ints, Ints]:
    """List each beam with each chart among its codes once.

    Parameters
    ----------
    code : (k, 4) int
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
