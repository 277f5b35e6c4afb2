"""How far an unknown angular law of reflectance leaves a load open."""

from __future__ import annotations

import numpy as np

from causticload.light.field import Bounced
from causticload.light.points import solve_points
from causticload.light.prepare import LitScene
from causticload.scene.model import Floats


def load_limits(
    lit: LitScene,
    *,
    sun_direction: Floats,
    sun_radius: float,
    point: int,
    spacing_m: float,
    bounced: list[Bounced],
) -> tuple[float, float]:
    """Find how far unknown angular laws leave open the load of one receiver point.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.
    sun_direction : (3,) float
        Unit vector to the sun, scene frame.
    sun_radius : float
        Angular radius of the sun. [rad]
    point : int
        Number of the receiver point.
    spacing_m : float
        Size of its cell. [m]
    bounced : list of Bounced
        Beams after a second reflection.

    Returns
    -------
    low, high : float
        Factors on the load; 1 and 1 where all laws are known. The range is that of unpolarised
        light, at each reflection. [1]
    """
    if (lit.sheets.low == 1.0).all() and (lit.sheets.high == 1.0).all():
        return 1.0, 1.0
    n = lit.point_normals[point]
    u = np.cross(n, [0.0, 0.0, 1.0] if abs(n[2]) < 0.9 else [1.0, 0.0, 0.0])
    u /= np.linalg.norm(u)
    step = spacing_m / 3.0 * np.array([-1.0, 0.0, 1.0])
    a, b = (v.ravel()[:, None] for v in np.meshgrid(step, step))
    P = lit.points[point] + a * u + b * np.cross(n, u)
    parts = solve_points(
        lit,
        sun_direction=sun_direction,
        sun_radius=sun_radius,
        points=P,
        normals=np.broadcast_to(n, P.shape),
        bounced=bounced,
        follow_waves=False,
    ).parts
    total = float(parts.load.sum())
    if total <= 0.0:
        return 1.0, 1.0
    return float(parts.low.sum()) / total, float(parts.high.sum()) / total
