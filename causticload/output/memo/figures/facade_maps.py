"""Maps of the facade, unrolled: which panels send the light, and how far off they gather it."""

from __future__ import annotations

from typing import Any

import matplotlib as mpl
import numpy as np
from matplotlib.collections import PolyCollection
from matplotlib.figure import Figure

from causticload.output.colours import LOAD_MAP, round_end
from causticload.output.memo.evidence import Evidence
from causticload.output.memo.figures.style import (
    INK,
    WIDTH_MM,
    colour_bar,
    draw_lines,
    finish_plan,
    paper_figure,
    scale_bar,
)
from causticload.scene.model import Floats

MANY = 20_000  # triangles from which a map is drawn as pixels
FAR = 300.0  # m, end of the scale of focal distances
STRAIGHT = 1e-3  # least depth over length of a facade that is bent in plan
FLAT_ABOVE = 50.0  # a circle this many times wider than the facade is a straight line


def unroll(points: Floats, base: Floats) -> Floats:
    """Distance along the facade's plan curve of points.

    The plan curve is followed by the angle about the circle that fits it best, or along its
    longer axis where it is as good as straight; lengths are measured along the middle of the
    facade's own points.

    Parameters
    ----------
    points : (n, 2) float
        Places in plan. [m]
    base : (k, 2) float
        Places of the whole facade in plan. [m]

    Returns
    -------
    along : (n,) float
        From one end of the facade. [m]
    """
    order = _order(base)
    t = order(base)
    edges = np.unique(np.quantile(t, np.linspace(0.0, 1.0, 121)))
    if len(edges) < 3:
        return order(points) - t.min()
    which = np.clip(np.searchsorted(edges, t, side="right") - 1, 0, len(edges) - 2)
    count = np.bincount(which, minlength=len(edges) - 1)
    full = count > 0
    middle = np.stack(
        [
            np.bincount(which, base[:, i], minlength=len(edges) - 1)[full] / count[full]
            for i in (0, 1)
        ],
        axis=1,
    )
    at = (np.bincount(which, t, minlength=len(edges) - 1) / np.maximum(count, 1))[full]
    length = np.concatenate([[0.0], np.cumsum(np.linalg.norm(np.diff(middle, axis=0), axis=1))])
    # Beyond the middles of the first and last group the curve goes on as it went.
    slope_a = (length[1] - length[0]) / (at[1] - at[0])
    slope_b = (length[-1] - length[-2]) / (at[-1] - at[-2])
    start = length[0] - slope_a * (at[0] - t.min())
    u = order(points)
    along = np.interp(u, at, length)
    along = np.where(u < at[0], length[0] - slope_a * (at[0] - u), along)
    along = np.where(u > at[-1], length[-1] + slope_b * (u - at[-1]), along)
    result: Floats = along - start
    return result


def _order(base: Floats) -> Any:
    """Give a function that orders places along the plan curve."""
    middle = base.mean(axis=0)
    local = base - middle
    spread = float(np.ptp(local, axis=0).max())
    _, sizes, axes = np.linalg.svd(local, full_matrices=False)
    axis = axes[0] if axes[0][np.argmax(np.abs(axes[0]))] > 0 else -axes[0]
    # Kasa's fit of a circle: x² + y² + D x + E y + F = 0 by least squares. Points on a line have
    # none, and least squares would make one up.
    A = np.column_stack([local, np.ones(len(local))])
    D, E, F = np.linalg.lstsq(A, -(local**2).sum(axis=1), rcond=None)[0]
    centre = np.array([-D / 2.0, -E / 2.0])
    radius = float(np.sqrt(max(centre @ centre - F, 0.0)))
    if sizes[1] < STRAIGHT * sizes[0] or not 0.0 < radius < FLAT_ABOVE * spread:
        return lambda p: (p - middle) @ axis

    def angle(p: Floats) -> Floats:
        return np.arctan2(*(p - middle - centre).T[::-1])

    # The circle is cut open at its widest gap, so that a facade never wraps around the cut.
    a = np.sort(angle(base))
    gap = np.diff(np.concatenate([a, a[:1] + 2.0 * np.pi]))
    k = int(np.argmax(gap))
    cut = a[k] + gap[k] / 2.0
    return lambda p: np.mod(angle(p) - cut, 2.0 * np.pi)


def elevation(axes: Any, evidence: Evidence, values: Floats, norm: Any) -> Any:
    """Draw the facade unrolled, one value a triangle; nan is left white.

    Parameters
    ----------
    axes : matplotlib axes
        Empty.
    evidence : Evidence
        The year.
    values : (k,) float
        One value a triangle of the facade.
    norm : matplotlib norm
        Scale of the colours.

    Returns
    -------
    patches : matplotlib collection
        For a colour bar.
    """
    T = evidence.facade
    base = T.reshape(-1, 3)[:, :2]
    flat = np.ptp(T[:, :, 2]) < 0.2 * np.ptp(base, axis=0).max()
    if flat:  # a roof or a dish: its plan tells more
        place = T[:, :, :2]
        edges = evidence.panel_edges[:, :, :2]
        axes.set_xlabel("model x (m)")
        axes.set_ylabel("model y (m)")
    else:
        place = np.stack([unroll(base, base).reshape(-1, 3), T[:, :, 2]], axis=2)
        ends = evidence.panel_edges
        edges = np.stack(
            [unroll(ends.reshape(-1, 3)[:, :2], base).reshape(-1, 2), ends[:, :, 2]], axis=2
        )
        axes.set_xlabel("along the facade in plan, unrolled (m)")
        axes.set_ylabel("model z (m)")
    cmap = mpl.colormaps[LOAD_MAP].with_extremes(bad="white")
    many = len(T) > MANY
    patches = PolyCollection(
        list(place), array=np.ma.masked_invalid(values), cmap=cmap, norm=norm, rasterized=many
    )
    patches.set_edgecolor("face")
    patches.set_linewidth(0.2)
    axes.add_collection(patches)
    draw_lines(axes, edges, INK, 0.25)
    low, high = place.reshape(-1, 2).min(axis=0), place.reshape(-1, 2).max(axis=0)
    margin = 0.03 * float((high - low).max())
    axes.set_xlim(low[0] - margin, high[0] + margin)
    axes.set_ylim(low[1] - margin, high[1] + margin)
    axes.set_aspect("equal")
    if flat:
        finish_plan(axes, evidence.year.study.site.model_north)
    else:
        scale_bar(axes)
    return patches


def _map(evidence: Evidence, values: Floats, norm: Any, label: str) -> Figure:
    T = evidence.facade
    tall = np.ptp(T[:, :, 2]) > 0.9 * np.ptp(T.reshape(-1, 3)[:, :2], axis=0).max()
    figure = paper_figure(WIDTH_MM, 110.0 if tall else 75.0)
    axes = figure.subplots()
    patches = elevation(axes, evidence, values, norm)
    colour_bar(figure, patches, axes, label, shrink=0.9)
    return figure


def contribution_map(evidence: Evidence) -> Figure:
    """Draw what each panel adds to the worst peak.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Returns
    -------
    figure : Figure
        The facade unrolled.
    """
    value = evidence.year.contribution[evidence.panel_of]
    shown = np.where(value > 0.0, value, np.nan)
    norm = mpl.colors.Normalize(0.0, round_end(float(value.max(initial=0.0))))
    return _map(evidence, shown, norm, "load that the panel adds to the peak (W/m²)")


def focal_distance(evidence: Evidence) -> Floats:
    """Distance at which each triangle gathers light.

    It is that under the sun of the worst peak where the folder tells it, else that of light which
    falls straight on the facade.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Returns
    -------
    distance : (k,) float
        The shorter of the two focal distances; nan where it gathers in neither way. [m]
    """
    data = evidence.facade_data
    given = [data[n] for n in ("focal tangential [m]", "focal sagittal [m]") if n in data]
    if given:
        both = np.stack(given, axis=1).astype(float)
    else:
        with np.errstate(divide="ignore"):  # a mirror of radius R gathers at R / 2
            both = 0.5 / np.asarray(data["curvature [1/m]"], float).reshape(
                len(evidence.facade), -1
            )
    both = np.where((both > 0.0) & np.isfinite(both), both, np.inf)
    least = both.min(axis=1)
    return np.where(np.isfinite(least), least, np.nan)


def focal_map(evidence: Evidence) -> Figure:
    """Draw the focal distance of the facade.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Returns
    -------
    figure : Figure
        The facade unrolled.
    """
    distance = focal_distance(evidence)
    near = np.nanmin(distance) if np.isfinite(distance).any() else 1.0
    low = 10.0 ** np.floor(np.log10(near))
    shown = np.where(distance <= FAR, distance, np.nan)
    norm = mpl.colors.LogNorm(low, FAR)
    figure = _map(evidence, shown, norm, "focal distance (m)")
    scale = figure.axes[-1]
    ticks = [t * p for p in (0.1, 1.0, 10.0, 100.0) for t in (1, 2, 5) if low <= t * p <= FAR]
    scale.set_yticks(ticks, labels=[f"{t:g}" for t in ticks])
    scale.minorticks_off()
    return figure
