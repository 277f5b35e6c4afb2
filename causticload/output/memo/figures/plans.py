"""Plans and elevations of what falls on receivers."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import matplotlib as mpl
import numpy as np
from matplotlib.figure import Figure
from scipy import ndimage

from causticload.output.colours import LOAD_MAP, round_end
from causticload.output.memo.evidence import Evidence
from causticload.output.memo.figures.style import (
    FAINT,
    INK,
    WIDTH_MM,
    colour_bar,
    draw_lines,
    finish_plan,
    load_scale,
    paper_figure,
    scale_bar,
)
from causticload.output.results import ReceiverYear
from causticload.scene.model import Floats

LIES = 0.9  # least upward part of a normal for a receiver to be shown in plan
SMOOTH_M = 1.0  # lines of limits go by the median over so much
MOST_LINES = 4  # limits that are drawn as lines, the lowest first
LIT = 0.02  # share of the largest load from which a place counts as lit, to frame plans


@dataclass(frozen=True)
class Raster:
    """Values on an even grid in a plane. ``image[row, column]``, nan off the receivers."""

    image: Floats
    extent: tuple[float, float, float, float]  # left, right, bottom, top [m]


def raster(across: Floats, up: Floats, values: Floats, h: float) -> Raster:
    """Lay values at places into an even grid; the largest wins where several fall in one cell.

    Parameters
    ----------
    across, up, values : (n,) float
        Places in the plane and what is there. [m]
    h : float
        Size of a cell, > 0. [m]

    Returns
    -------
    raster : Raster
        Just large enough.
    """
    left, bottom = across.min(), up.min()
    i = np.floor((across - left) / h + 0.5).astype(int)
    j = np.floor((up - bottom) / h + 0.5).astype(int)
    image = np.full((j.max() + 1, i.max() + 1), np.nan)
    order = np.argsort(values, kind="stable")
    image[j[order], i[order]] = values[order]
    rows, columns = image.shape
    left, bottom = left - h / 2, bottom - h / 2
    return Raster(image, (left, left + columns * h, bottom, bottom + rows * h))


def flat_receivers(evidence: Evidence) -> list[ReceiverYear]:
    """Receivers that face up and are lit.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Returns
    -------
    receivers : list of ReceiverYear
        May be empty.
    """
    return [
        r
        for r in evidence.year.receivers.values()
        if len(r.areas) and r.normals[:, 2].mean() > LIES and r.peak_reflected.max() > 0.0
    ]


def frame_of(evidence: Evidence) -> tuple[float, float, float, float]:
    """Part of the plan that matters: the facade and all that it lights, with a margin.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Returns
    -------
    frame : (left, right, bottom, top)
        Model coordinates. [m]
    """
    parts = [evidence.facade.reshape(-1, 3)[:, :2]]
    for r in evidence.year.receivers.values():
        if len(r.areas):
            parts.append(r.points[r.peak_reflected > LIT * r.peak_reflected.max(), :2])
    places = np.concatenate(parts)
    low, high = places.min(axis=0), places.max(axis=0)
    margin = 0.05 * float((high - low).max())
    return (
        float(low[0] - margin),
        float(high[0] + margin),
        float(low[1] - margin),
        float(high[1] + margin),
    )


def plan_size(frame: tuple[float, float, float, float]) -> tuple[float, float]:
    """Size on paper of a plan with its colour bar.

    Parameters
    ----------
    frame : (left, right, bottom, top)
        What it shows. [m]

    Returns
    -------
    width, height : float
        [mm]
    """
    aspect = (frame[3] - frame[2]) / (frame[1] - frame[0])
    return WIDTH_MM, float(np.clip(130.0 * aspect + 18.0, 70.0, 150.0))


def _ground(axes: Any, evidence: Evidence, frame: tuple[float, float, float, float]) -> None:
    """Lines of the surroundings and the facade, and the frame of the plan."""
    draw_lines(axes, evidence.outlines[:, :, :2], FAINT, 0.4)
    draw_lines(axes, evidence.panel_edges[:, :, :2], INK, 0.5)
    axes.set_xlim(frame[0], frame[1])
    axes.set_ylim(frame[2], frame[3])


def _stack(receivers: Sequence[ReceiverYear], values: Sequence[Floats]) -> Raster:
    points = np.concatenate([r.points for r in receivers])
    h = float(min(r.spacing.max() for r in receivers))
    coarse = [r for r in receivers if r.spacing.max() > 1.5 * h]
    x, y, v = points[:, 0], points[:, 1], np.concatenate(values)
    if coarse:  # fill the cells of a coarser receiver with as many fine ones
        xs, ys, vs = [], [], []
        for r, value in zip(receivers, values, strict=True):
            k = int(np.ceil(float(r.spacing.max()) / h - 1e-6))
            step = (np.arange(k) - (k - 1) / 2) * float(r.spacing.max()) / k
            dx, dy = (a.ravel() for a in np.meshgrid(step, step))
            xs.append((r.points[:, 0, None] + dx).ravel())
            ys.append((r.points[:, 1, None] + dy).ravel())
            vs.append(np.repeat(value, k * k))
        x, y, v = (np.concatenate(a) for a in (xs, ys, vs))
    return raster(x, y, v, h)


def site_plan(evidence: Evidence) -> Figure:
    """Draw where the facade, the receivers and the observers are.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Returns
    -------
    figure : Figure
        A plan.
    """
    frame = frame_of(evidence)
    figure = paper_figure(*plan_size(frame))
    axes = figure.subplots()
    receivers = [r for r in evidence.year.receivers.values() if len(r.areas)]
    tones = np.linspace(0.94, 0.72, max(len(receivers), 2))
    for r, tone in zip(receivers, tones, strict=False):
        lies = r.normals[:, 2] > LIES
        if lies.any():
            h = float(r.spacing.max())
            area = raster(r.points[lies, 0], r.points[lies, 1], np.full(lies.sum(), tone), h)
            axes.imshow(
                area.image,
                origin="lower",
                extent=area.extent,
                cmap="gray",
                vmin=0.0,
                vmax=1.0,
                interpolation="nearest",
            )
        places = r.points[lies] if lies.any() else r.points
        wide, tall = np.ptp(places[:, 0]), np.ptp(places[:, 1])
        turned = wide < 0.011 * len(r.name) * (frame[1] - frame[0]) and tall > wide
        _label(axes, np.median(places, axis=0)[:2], r.name, rotation=90 if turned else 0)
    _ground(axes, evidence, frame)
    for observer in evidence.year.study.observers:
        path = np.array(observer.path)
        axes.plot(path[:, 0], path[:, 1], "--", color=INK, marker="o", markersize=2.5)
        start = path[np.argmin(path[:, 0])]
        axes.annotate(
            observer.name,
            start[:2],
            xytext=(4, 5),
            textcoords="offset points",
            fontsize=6.5,
            style="italic",
            parse_math=False,
            annotation_clip=True,
        )
    finish_plan(axes, evidence.year.study.site.model_north)
    return figure


def _label(axes: Any, at: Floats, text: str, **style: Any) -> None:
    axes.text(
        *at,
        text,
        ha="center",
        va="center",
        fontsize=6.5,
        clip_on=True,
        parse_math=False,
        bbox={"boxstyle": "square,pad=0.15", "fc": "white", "ec": "none", "alpha": 0.75},
        **style,
    )


def load_plan(evidence: Evidence) -> Figure:
    """Draw the year's peak reflected load with contours of the limits.

    Parameters
    ----------
    evidence : Evidence
        The year; at least one receiver lies and is lit.

    Returns
    -------
    figure : Figure
        A plan.
    """
    receivers = flat_receivers(evidence)
    shown = _stack(receivers, [r.peak_reflected for r in receivers])
    norm, extend = load_scale(shown.image)
    label = "peak reflected load in the year (W/m²)"
    figure, axes = _map(evidence, shown, norm, label, extend=extend)
    names = {r.name for r in receivers}
    here = [c for c in evidence.summary["criteria"] if names & set(c["receivers"])]
    contour(axes, shown, sorted({c["limit"] for c in here})[:MOST_LINES])
    return figure


def contour(axes: Any, shown: Raster, levels: Sequence[float]) -> None:
    """Draw lines where a raster crosses values, white under black, each of its own dashes.

    Single bright cells are left out: the lines go by the median over about a metre.

    Parameters
    ----------
    axes : matplotlib axes
        In metres.
    shown : Raster
        What is shown there.
    levels : sequence of float
        Ascending. [W/m²]
    """
    if min(shown.image.shape) < 3:
        return
    left, right, bottom, top = shown.extent
    rows, columns = shown.image.shape
    x = left + (np.arange(columns) + 0.5) * (right - left) / columns
    y = bottom + (np.arange(rows) + 0.5) * (top - bottom) / rows
    dashes = ("solid", "dashed", "dotted", "dashdot")
    cells = int(np.clip(round(SMOOTH_M * columns / (right - left)), 3, 9)) // 2 * 2 + 1
    values = ndimage.median_filter(np.nan_to_num(shown.image), size=cells, mode="nearest")
    handles = []
    for k, level in enumerate(levels):
        style = dashes[k % len(dashes)]
        if not (values > level).any():
            continue
        axes.contour(x, y, values, [level], colors="white", linewidths=1.8, linestyles="solid")
        axes.contour(x, y, values, [level], colors="black", linewidths=0.8, linestyles=style)
        handles.append(
            mpl.lines.Line2D([], [], color="black", ls=style, lw=0.8, label=f"{level:,.0f} W/m²")
        )
    if handles:
        axes.legend(handles=handles, loc="lower right", fontsize=6.0, framealpha=0.85)


def hours_plan(evidence: Evidence, criterion: str) -> Figure:
    """Draw the hours of the year over a limit.

    Parameters
    ----------
    evidence : Evidence
        The year.
    criterion : str
        Name of the limit; it holds for at least one receiver that lies.

    Returns
    -------
    figure : Figure
        A plan.
    """
    receivers = [r for r in flat_receivers(evidence) if criterion in r.minutes_over]
    hours = [r.minutes_over[criterion] / 60.0 for r in receivers]
    norm = mpl.colors.Normalize(0.0, round_end(max(float(h.max(initial=0.0)) for h in hours)))
    return plan_map(evidence, receivers, hours, norm, f'hours over "{criterion}" (h in the year)')


def image_plan(evidence: Evidence) -> Figure:
    """Draw the most images of the sun in view at once, whose steps are the caustics.

    Parameters
    ----------
    evidence : Evidence
        The year; at least one receiver lies and is lit.

    Returns
    -------
    figure : Figure
        A plan.
    """
    receivers = flat_receivers(evidence)
    images = [r.images.astype(float) for r in receivers]
    most = int(max(i.max(initial=0.0) for i in images))
    norm = mpl.colors.BoundaryNorm(np.arange(0.5, max(most, 2) + 1.0), 256)
    label = "most images of the sun in view at once (number)"
    return plan_map(evidence, receivers, images, norm, label)


def plan_map(
    evidence: Evidence,
    receivers: Sequence[ReceiverYear],
    values: Sequence[Floats],
    norm: Any,
    label: str,
    *,
    cmap: str = LOAD_MAP,
    extend: str = "neither",
) -> Figure:
    """Draw values on receivers that lie.

    Parameters
    ----------
    evidence : Evidence
        The year, for the lines of what stands there.
    receivers : sequence of ReceiverYear
        Which.
    values : sequence of (n,) float
        One array a receiver, nan or 0 left white.
    norm : matplotlib norm
        Scale of the colours.
    label : str
        What they show, with its unit.
    cmap : str
        Colour map.
    extend : str
        Ends of the scale that hold larger values.

    Returns
    -------
    figure : Figure
        A plan.
    """
    shown = _stack(receivers, values)
    shown.image[shown.image == 0.0] = np.nan
    return _map(evidence, shown, norm, label, extend=extend, cmap=cmap)[0]


def _map(
    evidence: Evidence,
    shown: Raster,
    norm: Any,
    label: str,
    *,
    extend: str = "neither",
    cmap: str = LOAD_MAP,
) -> tuple[Figure, Any]:
    frame = frame_of(evidence)
    figure = paper_figure(*plan_size(frame))
    axes = figure.subplots()
    image = axes.imshow(
        shown.image,
        origin="lower",
        extent=shown.extent,
        cmap=cmap,
        norm=norm,
        interpolation="nearest",
    )
    bar = colour_bar(figure, image, axes, label, shrink=0.85, extend=extend)
    if isinstance(norm, mpl.colors.BoundaryNorm):
        most = int(norm.boundaries[-1])
        bar.set_ticks(list(range(1, most + 1, max(1, most // 8))))
    _ground(axes, evidence, frame)
    finish_plan(axes, evidence.year.study.site.model_north)
    return figure, axes


def spot_crop(
    axes: Any, evidence: Evidence, receiver: str, place: Floats, levels: Sequence[float]
) -> Any:
    """Draw the surroundings of a spot: a plan if it lies there, else the wall's elevation.

    Parameters
    ----------
    axes : matplotlib axes
        Empty.
    evidence : Evidence
        The year.
    receiver : str
        Its receiver.
    place : (3,) float
        The spot, model coordinates. [m]
    levels : sequence of float
        Limits to contour. [W/m²]

    Returns
    -------
    image : matplotlib image
        For a colour bar.
    """
    r = evidence.year.receivers[receiver]
    nearest = int(np.argmin(((r.points - place) ** 2).sum(axis=1)))
    normal = r.normals[nearest]
    lies = normal[2] > LIES
    h = float(r.spacing[nearest])
    same = (r.normals @ normal > 0.99) & (np.abs((r.points - place) @ normal) < max(h, 0.3))
    right = np.array([1.0, 0.0, 0.0]) if lies else np.array([-normal[1], normal[0], 0.0])
    right = right / max(float(np.linalg.norm(right)), 1e-9)
    up = np.array([0.0, 1.0, 0.0]) if lies else np.array([0.0, 0.0, 1.0])
    start = np.zeros(3) if lies else (r.points[same] @ right).min() * right
    a, b = (r.points[same] - start) @ right, r.points[same] @ up
    shown = raster(a, b, r.peak_reflected[same], h)
    at = (float((place - start) @ right), float(place @ up))
    image = axes.imshow(
        shown.image,
        origin="lower",
        extent=shown.extent,
        cmap=LOAD_MAP,
        norm=load_scale(shown.image)[0],
        interpolation="nearest",
    )
    contour(axes, shown, levels)
    reach = crop_reach(shown, at)
    axes.set_xlim(at[0] - reach, at[0] + reach)
    axes.set_ylim(at[1] - reach, at[1] + reach)
    axes.plot(*at, marker="o", markersize=9, mfc="none", mec="white", mew=2.2)
    axes.plot(*at, marker="o", markersize=9, mfc="none", mec="black", mew=1.0)
    if lies:
        draw_lines(axes, evidence.outlines[:, :, :2], FAINT, 0.4)
        draw_lines(axes, evidence.panel_edges[:, :, :2], INK, 0.5)
        finish_plan(axes, evidence.year.study.site.model_north)
    else:
        axes.set_aspect("equal")
        axes.set_xlabel("along the wall, seen from outside (m)")
        axes.set_ylabel("model z (m)")
        scale_bar(axes)
    return image


def crop_reach(shown: Raster, at: tuple[float, float]) -> float:
    """Half the width of a crop: enough for the strong light around a spot, at least 4 m.

    Parameters
    ----------
    shown : Raster
        The receiver.
    at : (float, float)
        The spot. [m]

    Returns
    -------
    reach : float
        At most 15 m. [m]
    """
    left, right, bottom, top = shown.extent
    rows, columns = shown.image.shape
    x = left + (np.arange(columns) + 0.5) * (right - left) / columns - at[0]
    y = bottom + (np.arange(rows) + 0.5) * (top - bottom) / rows - at[1]
    strong = np.nan_to_num(shown.image) > 0.25 * np.nanmax(shown.image)
    far = np.hypot(x[None, :], y[:, None])[strong]
    return float(np.clip(1.3 * np.percentile(far, 80) if len(far) else 4.0, 4.0, 15.0))
