"""Ray tubes: small triangles of reflecting surface and the beams they send out.

A *tube* is a piece of one facet, kept as the barycentric coordinates of its corners. Lit by the
sun it becomes a *beam*: three corner rays, three rays from the middles of its edges (which say
whether three corners are enough) and a chief ray with a frame across it.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numba import njit

from causticload.light.facets import (
    Facets,
    lean_by_figure,
    mesh_normal_at,
    position_at,
    reflect,
)
from causticload.optics.tables import lookup
from causticload.scene.model import Bools, Floats, Ints

# Outcome of lighting a tube.
LIT, TURNED_AWAY, GRAZES = 0, 1, 2


class Tubes(NamedTuple):
    """Pieces of reflecting surface. ``n`` tubes."""

    facet: Ints  # (n,) number of the triangle in the scene
    sheet: Ints  # (n,) row of the reflectance tables
    bary: Floats  # (n, 3, 3) barycentric coordinates of the corners in the facet
    area: Floats  # (n,) m²

    def take(self, index: Ints | Bools) -> Tubes:
        """Return the tubes at ``index``."""
        return Tubes(self.facet[index], self.sheet[index], self.bary[index], self.area[index])


class Beams(NamedTuple):
    """Light on its way. ``n`` beams; rays 0 to 2 start at the corners, 3 to 5 between them.

    ``power`` is the reflected flux over the direct normal irradiance, an area: columns are
    solar s, solar p, visible s, visible p, the two polarisations about ``s_axis``.
    """

    start: Floats  # (n, 6, 3) m
    direction: Floats  # (n, 6, 3) unit
    side: Floats  # (n, 3) unit normal of the facet left last, on the side of the light
    chief: Floats  # (n, 3) m, middle of the corner rays' starts
    frame: Floats  # (n, 3, 3) unit: chief direction, and two axes across it
    before: Floats  # (n, 3) m, path from the first reflector to each corner ray's start
    power: Floats  # (n, 4) m²
    s_axis: Floats  # (n, 3) unit

    def take(self, index: Ints | Bools) -> Beams:
        """Return the beams at ``index``."""
        return Beams(*(a[index] for a in self))

    @property
    def longest(self) -> Floats:
        """Longest path before the start, (n,). [m]"""
        return self.before.max(axis=1)

    @property
    def solar(self) -> Floats:
        """Solar power over both polarisations, (n,). [m²]"""
        return self.power[:, 0] + self.power[:, 1]


def empty_beams(n: int) -> Beams:
    """Make room for ``n`` beams.

    Parameters
    ----------
    n : int
        How many.

    Returns
    -------
    beams : Beams
        Uninitialised arrays.
    """
    return Beams(
        start=np.empty((n, 6, 3)),
        direction=np.empty((n, 6, 3)),
        side=np.empty((n, 3)),
        chief=np.empty((n, 3)),
        frame=np.empty((n, 3, 3)),
        before=np.zeros((n, 3)),
        power=np.zeros((n, 4)),
        s_axis=np.zeros((n, 3)),
    )


def whole_facets(F: Facets, facet: Ints, sheet: Ints) -> Tubes:
    """One tube for each facet.

    Parameters
    ----------
    F : Facets
        The scene's triangles.
    facet : (n,) int
        Numbers of the triangles that reflect.
    sheet : (n,) int
        Their rows of the reflectance tables.

    Returns
    -------
    tubes : Tubes
        ``n`` tubes.
    """
    n = len(facet)
    return Tubes(
        facet=np.asarray(facet, np.int32),
        sheet=np.asarray(sheet, np.int32),
        bary=np.broadcast_to(np.eye(3), (n, 3, 3)).copy(),
        area=F.area[facet],
    )


def halve(tubes: Tubes, edge: Ints) -> Tubes:
    """Split each tube in two through the middle of an edge.

    Parameters
    ----------
    tubes : Tubes
        ``n`` tubes.
    edge : (n,) int
        Edge to halve: ``e`` runs from corner e to corner e + 1.

    Returns
    -------
    halves : Tubes
        ``2 n`` tubes, first all first halves, then all second halves.
    """
    n = len(edge)
    row = np.arange(n)
    head, tail = edge, (edge + 1) % 3
    middle = 0.5 * (tubes.bary[row, head] + tubes.bary[row, tail])
    first, second = tubes.bary.copy(), tubes.bary.copy()
    first[row, tail] = middle
    second[row, head] = middle
    return Tubes(
        facet=np.concatenate([tubes.facet, tubes.facet]),
        sheet=np.concatenate([tubes.sheet, tubes.sheet]),
        bary=np.concatenate([first, second]),
        area=0.5 * np.concatenate([tubes.area, tubes.area]),
    )


@njit(cache=True, nogil=True, error_model="numpy")
def _frame_beam(start, direction, chief, frame):
    """Chief ray and frame of one beam from its corner rays."""
    for i in range(3):
        chief[i] = (start[0, i] + start[1, i] + start[2, i]) / 3.0
        frame[0, i] = direction[0, i] + direction[1, i] + direction[2, i]
    length = math.sqrt(frame[0, 0] ** 2 + frame[0, 1] ** 2 + frame[0, 2] ** 2)
    for i in range(3):
        frame[0, i] /= length
    # First axis across: away from the coordinate axis that the chief ray is least along.
    x, y, z = frame[0, 0], frame[0, 1], frame[0, 2]
    if abs(x) <= abs(y) and abs(x) <= abs(z):
        ax, ay, az = 0.0, z, -y
    elif abs(y) <= abs(z):
        ax, ay, az = -z, 0.0, x
    else:
        ax, ay, az = y, -x, 0.0
    length = math.sqrt(ax * ax + ay * ay + az * az)
    ax, ay, az = ax / length, ay / length, az / length
    frame[1, 0], frame[1, 1], frame[1, 2] = ax, ay, az
    frame[2, 0], frame[2, 1], frame[2, 2] = y * az - z * ay, z * ax - x * az, x * ay - y * ax


@njit(cache=True, nogil=True, error_model="numpy")
def _s_axis(d, n, out):
    """Unit vector across the plane of incidence of direction ``d`` at normal ``n``."""
    out[0] = d[1] * n[2] - d[2] * n[1]
    out[1] = d[2] * n[0] - d[0] * n[2]
    out[2] = d[0] * n[1] - d[1] * n[0]
    length = math.sqrt(out[0] ** 2 + out[1] ** 2 + out[2] ** 2)
    if length < 1e-9:  # normal incidence: every axis is as good
        out[0], out[1], out[2] = 0.0, 0.0, 0.0
        return
    for i in range(3):
        out[i] /= length


@njit(cache=True, nogil=True, error_model="numpy")
def _ray_place(bary, j):
    """Barycentric coordinates of ray ``j`` of a tube: 0 to 2 corners, 3 to 5 between, 6 chief."""
    if j < 3:
        return bary[j, 0], bary[j, 1], bary[j, 2]
    if j == 6:
        return (
            (bary[0, 0] + bary[1, 0] + bary[2, 0]) / 3.0,
            (bary[0, 1] + bary[1, 1] + bary[2, 1]) / 3.0,
            (bary[0, 2] + bary[1, 2] + bary[2, 2]) / 3.0,
        )
    a, b = j - 3, (j - 2) % 3
    return (
        0.5 * (bary[a, 0] + bary[b, 0]),
        0.5 * (bary[a, 1] + bary[b, 1]),
        0.5 * (bary[a, 2] + bary[b, 2]),
    )


@njit(cache=True, nogil=True, error_model="numpy")
def _mesh_normals(F, T, N):
    """Normals of the mesh where the rays of tubes start, into ``N`` (n, 7, 3)."""
    for k in range(T.facet.size):
        for j in range(7):
            u, v, w = _ray_place(T.bary[k], j)
            mesh_normal_at(F, T.facet[k], u, v, w, N[k, j])


@njit(cache=True, nogil=True, error_model="numpy")
def _lean_normals(F, T, N):
    """Tilt normals by the figures of panes. Apart, for a call with all of ``F`` is dear."""
    for k in range(T.facet.size):
        if F.row[T.facet[k]] < 0:
            continue
        for j in range(7):
            u, v, w = _ray_place(T.bary[k], j)
            lean_by_figure(F, T.facet[k], T.sheet[k], u, v, w, N[k, j])


@njit(cache=True, nogil=True, error_model="numpy")
def _light_tubes(F, R, T, s, N, B, outcome):
    """Light each tube by the sun in direction ``s``; fills the beams ``B`` and ``outcome``."""
    d, x = np.empty(3), np.empty(3)
    for i in range(3):
        d[i] = -s[i]
    for k in range(T.facet.size):
        t = T.facet[k]
        f = F.face_normal[t]
        cos_face = f[0] * s[0] + f[1] * s[1] + f[2] * s[2]
        side = 1.0 if cos_face > 0.0 else -1.0
        outcome[k] = LIT if cos_face != 0.0 else TURNED_AWAY
        for j in range(6):
            u, v, w = _ray_place(T.bary[k], j)
            position_at(F, t, u, v, w, x)
            n = N[k, j]
            cos_n = side * (n[0] * s[0] + n[1] * s[1] + n[2] * s[2])
            if cos_n <= 0.0:
                outcome[k] = TURNED_AWAY
            reflect(d, n, B.direction[k, j])
            r = B.direction[k, j]
            if side * (r[0] * f[0] + r[1] * f[1] + r[2] * f[2]) <= 0.0 and outcome[k] == LIT:
                outcome[k] = GRAZES
            for i in range(3):
                B.start[k, j, i] = x[i]
        for i in range(3):
            B.side[k, i] = side * f[i]
        _frame_beam(B.start[k], B.direction[k], B.chief[k], B.frame[k])
        n = N[k, 6]
        cos_theta = min(1.0, abs(n[0] * s[0] + n[1] * s[1] + n[2] * s[2]))
        _s_axis(d, n, B.s_axis[k])
        B.before[k, :] = 0.0
        crossing = T.area[k] * abs(cos_face)
        for band in range(2):
            for pol in range(2):
                B.power[k, 2 * band + pol] = (
                    0.5 * lookup(R[T.sheet[k], band, pol], cos_theta) * crossing
                )


def light_tubes(F: Facets, R: Floats, tubes: Tubes, *, sun_direction: Floats) -> tuple[Beams, Ints]:
    """Light tubes by the sun.

    Parameters
    ----------
    F : Facets
        The scene's triangles.
    R : (sheets, 2, 2, angles) float
        Reflectance of each sheet in the solar and visible band for s and p polarisation. [1]
    tubes : Tubes
        ``n`` tubes.
    sun_direction : (3,) float
        Unit vector to the sun, scene frame.

    Returns
    -------
    beams : Beams
        ``n`` beams.
    outcome : (n,) int
        ``LIT``; ``TURNED_AWAY`` where the sun is behind a corner; ``GRAZES`` where a reflected
        ray would start into the facet itself.
    """
    n = len(tubes.facet)
    beams = empty_beams(n)
    outcome = np.empty(n, np.int32)
    s = np.ascontiguousarray(sun_direction, dtype=np.float64)
    normals = np.empty((n, 7, 3))
    _mesh_normals(F, tubes, normals)
    if len(F.half):  # rows of panes that are not as the mesh has them
        _lean_normals(F, tubes, normals)
    _light_tubes(F, R, tubes, s, normals, beams, outcome)
    return beams, outcome


@njit(cache=True, nogil=True, error_model="numpy")
def image_on_plane(start, direction, chief, frame, o, n, Q):
    """Where three corner rays meet the plane through ``o`` with normal ``n``.

    ``Q`` (3, 2) takes the crossings along the frame's two cross axes, relative to the chief ray.
    Returns the depth of the nearest and of the farthest crossing along the chief ray, or
    (-1, -1) where a ray does not reach the front of the plane.
    """
    near, far = math.inf, -math.inf
    for j in range(3):
        down = -(direction[j, 0] * n[0] + direction[j, 1] * n[1] + direction[j, 2] * n[2])
        height = (
            (start[j, 0] - o[0]) * n[0] + (start[j, 1] - o[1]) * n[1] + (start[j, 2] - o[2]) * n[2]
        )
        if not (down > 1e-6 and height > 0.0):
            return -1.0, -1.0
        t = height / down
        x = start[j, 0] + t * direction[j, 0] - chief[0]
        y = start[j, 1] + t * direction[j, 1] - chief[1]
        z = start[j, 2] + t * direction[j, 2] - chief[2]
        depth = x * frame[0, 0] + y * frame[0, 1] + z * frame[0, 2]
        near, far = min(near, depth), max(far, depth)
        Q[j, 0] = x * frame[1, 0] + y * frame[1, 1] + z * frame[1, 2]
        Q[j, 1] = x * frame[2, 0] + y * frame[2, 1] + z * frame[2, 2]
    return near, far


@njit(cache=True, nogil=True, error_model="numpy")
def _image_errors(B, beam, o, n, error, longest, depth):
    Q, M = np.empty((3, 2)), np.empty((3, 2))
    for p in range(depth.size):
        k = beam[p]
        near, far = image_on_plane(
            B.start[k, :3], B.direction[k, :3], B.chief[k], B.frame[k], o[p], n[p], Q
        )
        mid_near, _ = image_on_plane(
            B.start[k, 3:], B.direction[k, 3:], B.chief[k], B.frame[k], o[p], n[p], M
        )
        if near < 0.0 or mid_near < 0.0:
            depth[p] = -1.0
            continue
        depth[p] = 0.5 * (near + far)
        for e in range(3):
            a, b = e, (e + 1) % 3
            error[p, e] = math.hypot(
                M[e, 0] - 0.5 * (Q[a, 0] + Q[b, 0]), M[e, 1] - 0.5 * (Q[a, 1] + Q[b, 1])
            )
            longest[p, e] = math.hypot(Q[a, 0] - Q[b, 0], Q[a, 1] - Q[b, 1])


def image_errors(
    beams: Beams, beam: Ints, *, o: Floats, n: Floats
) -> tuple[Floats, Floats, Floats]:
    """How far three corner rays misplace the middles of the image's edges.

    Parameters
    ----------
    beams : Beams
        Any number of beams.
    beam : (p,) int
        Row of the beam, one for each pair of a beam and a plane.
    o, n : (p, 3) float
        A point and the unit normal of the plane.

    Returns
    -------
    error : (p, 3) float
        Distance across the beam between the image of an edge's middle and the middle of the
        image's edge. [m]
    length : (p, 3) float
        Length of the image's edges across the beam. [m]
    depth : (p,) float
        Distance to the image along the chief ray; -1 where a ray misses the plane's front. [m]
    """
    p = len(beam)
    error, length, depth = np.zeros((p, 3)), np.zeros((p, 3)), np.empty(p)
    _image_errors(
        beams,
        beam,
        np.ascontiguousarray(o, dtype=float),
        np.ascontiguousarray(n, dtype=float),
        error,
        length,
        depth,
    )
    return error, length, depth
