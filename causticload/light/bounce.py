"""Second reflections: follow a beam's rays off the mirror that they meet."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit

from causticload.light.bvh import Tracer
from causticload.light.facets import Facets, normal_at, reflect
from causticload.light.targets import Meanings
from causticload.light.tubes import Beams, _frame_beam, _s_axis, empty_beams
from causticload.optics.tables import lookup
from causticload.scene.model import Bools, Floats, Ints


class Reflected(NamedTuple):
    """Beams off one sheet of the mirrors they met. ``k`` beams."""

    beams: Beams
    good: Bools  # (k,) all six rays met one mirror and left it; other rows carry no meaning
    sheet: Ints  # (k,) row of the tables of the mirror met
    meets: Bools  # (k,) the mirror has such a sheet; other rows are those of its last

    def take(self, index: Ints | Bools) -> Reflected:
        """Return the beams at ``index``."""
        return Reflected(
            self.beams.take(index), self.good[index], self.sheet[index], self.meets[index]
        )


@njit(cache=True, nogil=True, error_model="numpy")
def _barycentric(corner, x, out):
    """Barycentric coordinates of ``x`` in the triangle ``corner`` (3, 3), by areas."""
    e = np.empty((2, 3))
    p = np.empty(3)
    for i in range(3):
        e[0, i] = corner[1, i] - corner[0, i]
        e[1, i] = corner[2, i] - corner[0, i]
        p[i] = x[i] - corner[0, i]
    d00 = e[0, 0] ** 2 + e[0, 1] ** 2 + e[0, 2] ** 2
    d01 = e[0, 0] * e[1, 0] + e[0, 1] * e[1, 1] + e[0, 2] * e[1, 2]
    d11 = e[1, 0] ** 2 + e[1, 1] ** 2 + e[1, 2] ** 2
    d20 = p[0] * e[0, 0] + p[1] * e[0, 1] + p[2] * e[0, 2]
    d21 = p[0] * e[1, 0] + p[1] * e[1, 1] + p[2] * e[1, 2]
    det = d00 * d11 - d01 * d01
    out[1] = (d11 * d20 - d01 * d21) / det
    out[2] = (d00 * d21 - d01 * d20) / det
    out[0] = 1.0 - out[1] - out[2]


@njit(cache=True, nogil=True, error_model="numpy")
def _bounce(F, R, sheet_of, sheets_met, place, B, triangle, distance, C, good):
    """Reflect every ray of the beams ``B`` where it met ``triangle``; fills the beams ``C``.

    Off the sheet in the given place of each mirror, or its last if it has fewer.
    """
    x, n, b = np.empty(3), np.empty(3), np.empty(3)
    for k in range(good.size):
        for j in range(6):
            t = triangle[k, j]
            d = B.direction[k, j]
            f = F.face_normal[t]
            toward = d[0] * f[0] + d[1] * f[1] + d[2] * f[2]
            side = -1.0 if toward > 0.0 else 1.0
            for i in range(3):
                x[i] = B.start[k, j, i] + distance[k, j] * d[i]
            _barycentric(F.corner[t], x, b)
            normal_at(F, t, sheet_of[t] + min(place, sheets_met[t] - 1), b[0], b[1], b[2], n)
            reflect(d, n, C.direction[k, j])
            r = C.direction[k, j]
            # The normal must face the light and the ray must leave the facet.
            if side * (d[0] * n[0] + d[1] * n[1] + d[2] * n[2]) >= 0.0:
                good[k] = False
            if side * (r[0] * f[0] + r[1] * f[1] + r[2] * f[2]) <= 0.0:
                good[k] = False
            for i in range(3):
                C.start[k, j, i] = x[i]
            if j < 3:
                C.before[k, j] = B.before[k, j] + distance[k, j]
            if j == 0:
                for i in range(3):
                    C.side[k, i] = side * f[i]
        _frame_beam(C.start[k], C.direction[k], C.chief[k], C.frame[k])
        # Mirror law backwards: the chief normal halves the angle between the two directions.
        d, r = B.frame[k, 0], C.frame[k, 0]
        length = np.sqrt((r[0] - d[0]) ** 2 + (r[1] - d[1]) ** 2 + (r[2] - d[2]) ** 2)
        for i in range(3):
            n[i] = (r[i] - d[i]) / length
        cos_theta = min(1.0, abs(d[0] * n[0] + d[1] * n[1] + d[2] * n[2]))
        _s_axis(d, n, C.s_axis[k])
        turn = (
            C.s_axis[k, 0] * B.s_axis[k, 0]
            + C.s_axis[k, 1] * B.s_axis[k, 1]
            + C.s_axis[k, 2] * B.s_axis[k, 2]
        )
        c2 = min(1.0, turn * turn)
        t = triangle[k, 0]
        row = sheet_of[t] + min(place, sheets_met[t] - 1)
        for band in range(2):
            s, p = B.power[k, 2 * band], B.power[k, 2 * band + 1]
            C.power[k, 2 * band] = lookup(R[row, band, 0], cos_theta) * (c2 * s + (1.0 - c2) * p)
            C.power[k, 2 * band + 1] = lookup(R[row, band, 1], cos_theta) * (
                (1.0 - c2) * s + c2 * p
            )


def _from_start(F: Facets, beams: Beams, triangle: Ints) -> Floats:
    """Distance along each ray from its true start to the plane of the triangle met, (k, 6)."""
    n = F.face_normal[triangle]
    height = np.einsum("kji,kji->kj", F.corner[triangle, 0] - beams.start, n)
    with np.errstate(divide="ignore", invalid="ignore"):  # misses are sorted out by the caller
        return height / np.einsum("kji,kji->kj", beams.direction, n)


def bounce(
    beams: Beams,
    *,
    F: Facets,
    R: Floats,
    sheet_of: Ints,
    sheets_met: Ints,
    place: int,
    meanings: Meanings,
    tracer: Tracer,
    clearance_m: float,
) -> Reflected:
    """Reflect beams off one sheet of the mirror that all their rays meet.

    The two polarisations are turned from the first plane of incidence into the second: light
    reflected once is partly polarised, and a second pane at right angles may send on far less,
    or more, than two unpolarised reflectances would say. The blur of the sun's disc is that of a
    flat second mirror over the whole path; a curved one would widen or narrow it further.

    Parameters
    ----------
    beams : Beams
        ``k`` beams.
    F : Facets
        The scene's triangles.
    R : (sheets, 2, 2, angles) float
        Reflectance tables.
    sheet_of : (m,) int
        Row of the tables for each triangle's first sheet, -1 off reflectors.
    sheets_met : (m,) int
        How many sheets each triangle has.
    place : int
        Which of them, from 0.
    meanings : Meanings
        What each triangle is to a ray.
    tracer : Tracer
        Finds what rays meet.
    clearance_m : float
        How far above the facet rays are traced from. [m]

    Returns
    -------
    reflected : Reflected
        ``k`` beams.
    """
    k = len(beams.chief)
    origin = beams.start + clearance_m * beams.side[:, None]
    triangle, _ = tracer.first_hit(origin.reshape(-1, 3), beams.direction.reshape(-1, 3))
    triangle = triangle.reshape(k, 6)
    distance = _from_start(F, beams, triangle)
    unit = np.where(triangle >= 0, meanings.front[triangle], 0)
    mirror = np.where(triangle >= 0, sheet_of[triangle], -1)
    whole = (mirror >= 0).all(axis=1) & (unit == unit[:, :1]).all(axis=1)
    triangle = np.where(whole[:, None], triangle, 0)
    distance = np.where(whole[:, None], distance, 1.0)
    bounced = empty_beams(k)
    first, count = np.maximum(sheet_of, 0), np.maximum(sheets_met, 1)
    _bounce(F, R, first, count, place, beams, triangle, distance, bounced, whole)
    met = triangle[:, 0]
    sheet = first[met] + np.minimum(place, count[met] - 1)
    return Reflected(bounced, whole, sheet.astype(np.int32), place < count[met])
