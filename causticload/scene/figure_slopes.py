"""Height, slope and curvature of figured panes at points, in plain NumPy.

The light kernels have their own way to the same slopes; the ray count uses this one.
"""

from __future__ import annotations

import numpy as np
from numpy.polynomial import polynomial

from causticload.scene.model import Floats, Ints, PaneFigures


def slopes_at(figures: PaneFigures, row: Ints, xy: Floats, *, waves: bool = True) -> Floats:
    """Slope of panes at points of their planes.

    Parameters
    ----------
    figures : PaneFigures
        The panes.
    row : (n,) int
        Which pane.
    xy : (n, 2) float
        Points in the panel's frame, from the middle of its bounding box. [m]
    waves : bool
        Whether roller waves are part of it.

    Returns
    -------
    slope : (n, 2) float
        Of the height along width and across it. [1]
    """
    g = figures
    p = g.panel[row]
    slope = g.tilt[row].copy()
    unit = xy / g.half[p]
    for shape in np.unique(g.shape[row]):
        if shape < 0:
            continue
        mine = g.shape[row] == shape
        c = g.shapes[shape]
        for a in range(2):
            by = polynomial.polyval2d(unit[mine, 0], unit[mine, 1], polynomial.polyder(c, axis=a))
            slope[mine, a] += g.bow[row[mine]] * by / g.half[p[mine], a]
    if waves:
        turn = np.einsum("ni,ni->n", g.wave_number[row], xy) + g.phase[row]
        slope -= (g.wave[row] * np.sin(turn))[:, None] * g.wave_number[row]
    line = g.kinked[p]
    inwards = np.einsum("nei,ni->ne", line[:, :, :2], xy) + line[:, :, 2]
    left = np.clip(1.0 - inwards / g.kink_width[row][:, None], 0.0, None)
    rise = -2.0 * (g.kink[row] / g.kink_width[row])[:, None] * left
    return np.asarray(slope + np.einsum("ne,nei->ni", rise, line[:, :, :2]))


def curvature_at_top(figures: PaneFigures, *, waves: bool = False) -> Floats:
    """Curvature of each pane where it bows most, (g, 3): along width, twist, along height.

    Parameters
    ----------
    figures : PaneFigures
        The panes.
    waves : bool
        Whether to add a roller wave's strongest curvature, where it is hollow.

    Returns
    -------
    curvature : (g, 3) float
        Second slopes of the height; positive where hollow seen from outdoors. [1/m]
    """
    g = figures
    out = np.zeros((len(g.panel), 3))
    for shape in np.unique(g.shape):
        if shape < 0:
            continue
        mine = np.flatnonzero(g.shape == shape)
        c = g.shapes[shape]
        x, y = g.tops[shape]
        for a, (dx, dy) in enumerate(((2, 0), (1, 1), (0, 2))):
            d = polynomial.polyder(polynomial.polyder(c, dx, axis=0), dy, axis=1)
            half = g.half[g.panel[mine]]
            value = polynomial.polyval2d(x, y, d) / (half[:, 0] ** dx * half[:, 1] ** dy)
            out[mine, a] = g.bow[mine] * value
    if waves:
        kx, ky = g.wave_number.T
        out += g.wave[:, None] * np.stack([kx * kx, kx * ky, ky * ky], axis=1)
    return out


def steepest_of_panels(figures: PaneFigures) -> Floats:
    """Steepest slope of any pane of each panel, never too little.

    Parameters
    ----------
    figures : PaneFigures
        The panes.

    Returns
    -------
    slope : (p,) float
        0 where there is no figure. [1]
    """
    g = figures
    steep = np.zeros(len(g.panel))
    line = np.linspace(-1.0, 1.0, 41)
    x, y = np.meshgrid(line, line, indexing="ij")
    for shape in np.unique(g.shape[g.shape >= 0]):
        c, mine = g.shapes[shape], g.shape == shape
        value = polynomial.polyval2d(x, y, c)
        # Outside the outline the polynomial is negative near the edges, and means nothing.
        inside = (value > -0.02) & (value < 1.02)
        for a in range(2):
            most = np.abs(polynomial.polyval2d(x, y, polynomial.polyder(c, axis=a)))[inside].max()
            steep[mine] += np.abs(g.bow[mine]) * most / g.half[g.panel[mine], a]
    steep += g.wave * np.linalg.norm(g.wave_number, axis=1) + np.abs(g.tilt).sum(axis=1)
    steep += 2.0 * g.kinked.shape[1] * np.abs(g.kink) / g.kink_width
    out = np.zeros(len(g.first))
    # A net sees the steepest place to a per cent; the sum of both ways is far above its norm.
    np.maximum.at(out, g.panel, 1.05 * steep)
    return out
