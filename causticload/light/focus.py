"""How much of a facade focuses where its light lands."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from causticload.light.prepare import LitScene
from causticload.scene.focus import focal_distances
from causticload.scene.model import Floats
from causticload.scene.topology import face_normals

GAIN = 2.0  # light counts as focused from here on


class FocusShare(NamedTuple):
    """How much of a facade focuses within reach of a receiver under one sun."""

    lit: float  # m² of reflectors that the sun reaches
    landing: float  # m² of them whose light meets a receiver
    focused: float  # m² of those whose light is at least twice as dense there, before blur

    @property
    def share(self) -> float:
        """Share of the lit facade that focuses within reach of a receiver. [1]"""
        return self.focused / self.lit if self.lit > 0.0 else 0.0


def focus_share(lit: LitScene, sun_direction: Floats) -> FocusShare:
    """Find how much of the facade focuses within reach of a receiver.

    One ray from the middle of each triangle goes to the sun and one to what its light meets; at
    that distance D the light's density has grown by 1 / |det(I - 2 D M)|, before the sun's own
    size blurs it.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.
    sun_direction : (3,) float
        Unit vector to the sun, scene frame.

    Returns
    -------
    share : FocusShare
        Areas.
    """
    scene, s = lit.scene, np.ascontiguousarray(sun_direction, dtype=np.float64)
    focus = focal_distances(scene, s)
    rows = scene.reflectors
    T = scene.triangles[rows]
    normal, area = face_normals(T)
    side = np.sign(normal @ s)
    start = T.mean(axis=1) + lit.clearance_m * side[:, None] * normal
    sees = ~lit.tracer.occluded(start, np.broadcast_to(s, start.shape).copy())
    sees &= np.einsum("ki,ki->k", focus.direction, normal) * side > 0.0
    met, distance = lit.tracer.first_hit(start, np.ascontiguousarray(focus.direction))
    lands = sees & (met >= 0)
    lands[lands] = scene.chart[met[lands]] >= 0
    D = np.where(lands, distance, 0.0)
    gain = np.abs(np.linalg.det(np.eye(2) - 2.0 * D[:, None, None] * focus.matrix))
    focused = lands & (gain <= 1.0 / GAIN)
    return FocusShare(*(float(area[mask].sum()) for mask in (sees, lands, focused)))
