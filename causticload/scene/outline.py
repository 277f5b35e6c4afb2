"""Outlines of panels in their own frames."""

from __future__ import annotations

import numpy as np
from scipy.spatial import ConvexHull

from causticload.scene.model import Floats

STRAIGHT = 2e-3  # a corner that stands out less than this, over the size, is on an edge


def convex_outline(points: Floats) -> Floats:
    """Convex hull of points without corners that hardly stand out.

    Parameters
    ----------
    points : (n, 2) float
        Corners of a panel's triangles, not all on one line. [m]

    Returns
    -------
    outline : (c, 2) float
        Corners, counter-clockwise. [m]
    """
    corner = points[ConvexHull(points).vertices]
    size = float(np.linalg.norm(np.ptp(corner, axis=0)))
    while len(corner) > 3:
        back, ahead = np.roll(corner, 1, axis=0), np.roll(corner, -1, axis=0)
        chord = ahead - back
        off = np.abs(
            chord[:, 0] * (corner - back)[:, 1] - chord[:, 1] * (corner - back)[:, 0]
        ) / np.linalg.norm(chord, axis=1)
        if off.min() > STRAIGHT * size:
            break
        corner = np.delete(corner, off.argmin(), axis=0)
    return corner


def area(outline: Floats) -> float:
    """Area of a polygon.

    Parameters
    ----------
    outline : (c, 2) float
        Corners, counter-clockwise. [m]

    Returns
    -------
    area : float
        Its area. [m²]
    """
    x, y = outline.T
    return float(0.5 * (x @ np.roll(y, -1) - y @ np.roll(x, -1)))


def end_edges(outline: Floats, along: Floats) -> Floats:
    """Lines of the edges that end a panel in one direction.

    Parameters
    ----------
    outline : (c, 2) float
        Corners, counter-clockwise. [m]
    along : (2,) float
        Unit vector: edges whose normal lies within 45 degrees of it, either way, are meant.

    Returns
    -------
    lines : (e, 3) float
        Rows a, b, c: the distance inwards is a x + b y + c. [m]
    """
    step = np.roll(outline, -1, axis=0) - outline
    normal = np.stack([-step[:, 1], step[:, 0]], axis=1)
    normal /= np.linalg.norm(normal, axis=1, keepdims=True)
    line = np.concatenate([normal, -np.einsum("ni,ni->n", normal, outline)[:, None]], axis=1)
    return np.asarray(line[np.abs(normal @ along) >= np.sqrt(0.5) - 1e-9])
