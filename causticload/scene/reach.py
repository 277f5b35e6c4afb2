"""How far reflected light can reach: where a huge receiver is worth sampling."""

from __future__ import annotations

import numpy as np

from causticload.scene.model import Floats

MARGIN_SHARE, MARGIN_M = 0.05, 2.0
CHUNK = 2_000_000  # rays at once


def reach_bounds(
    centroids: Floats,
    normals: Floats,
    sun_directions: Floats,
    *,
    plane_point: Floats,
    plane_normal: Floats,
    limit_m: float,
) -> Floats | None:
    """Bound where reflected rays fall on a plane.

    Every panel is taken as a mirror on the side that the sun is on; nothing stands in the way.

    Parameters
    ----------
    centroids, normals : (p, 3) float
        Middles and unit normals of pieces of the reflectors. [m]
    sun_directions : (s, 3) float
        Unit vectors to the sun.
    plane_point, plane_normal : (3,) float
        The receiver's plane.
    limit_m : float
        Rays are followed so far. [m]

    Returns
    -------
    bounds : (2, 3) float or None
        Lower and upper corner, grown by a margin; None where no ray falls on the plane.
    """
    low, high = np.full(3, np.inf), np.full(3, -np.inf)
    step = max(1, CHUNK // max(1, len(centroids)))
    for k in range(0, len(sun_directions), step):
        s = sun_directions[k : k + step]
        cos = normals @ s.T
        r = 2.0 * cos[:, :, None] * normals[:, None] - s[None]
        height = (plane_point - centroids) @ plane_normal
        with np.errstate(divide="ignore", invalid="ignore"):
            t = height[:, None] / (r @ plane_normal)
        p, q = np.nonzero((t > 0.0) & (t <= limit_m))
        if len(p):
            hit = centroids[p] + t[p, q][:, None] * r[p, q]
            low, high = np.minimum(low, hit.min(axis=0)), np.maximum(high, hit.max(axis=0))
    if not np.isfinite(low).all():
        return None
    margin = MARGIN_M + MARGIN_SHARE * (high - low)
    return np.stack([low - margin, high + margin])
