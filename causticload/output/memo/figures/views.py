"""Views of the model, by rays: what an eye at a spot sees, and the site from above."""

from __future__ import annotations

from typing import Any

import matplotlib as mpl
import numpy as np
from matplotlib.figure import Figure

from causticload.hazard.findings import Episode
from causticload.light.bvh import build_tracer
from causticload.output.colours import LOAD_MAP, map_colours, round_end
from causticload.output.memo.evidence import Evidence
from causticload.output.memo.figures.style import (
    WIDTH_MM,
    colour_bar,
    load_scale,
    paper_figure,
)
from causticload.output.memo.findings import peak_of
from causticload.scene.model import Floats

SKY = np.array([1.0, 1.0, 1.0])
GREY = np.array([0.80, 0.80, 0.78])
PLAIN_GLASS = np.array([0.55, 0.61, 0.67])
EDGE = np.array([0.15, 0.15, 0.15])
LIT_W_M2 = 20.0  # cells with less are left grey in the view of the site
EYE_M = 0.05  # the eye stands this far off the surface
WIDE, TALL = 420, 420  # most rays across and up a view from a spot
LIGHT = np.array([0.35, -0.5, 0.79])  # for shading only


def spot_view(axes: Any, evidence: Evidence, episode: Episode) -> Any:
    """Draw what an eye at an episode's peak sees towards the panels that light it.

    Parameters
    ----------
    axes : matplotlib axes
        Empty.
    evidence : Evidence
        The year.
    episode : Episode
        The episode.

    Returns
    -------
    scale : matplotlib mappable or None
        For a colour bar; None if the panels are not known.
    """
    peak = peak_of(episode)
    place = np.array(peak.place)
    out = _outward(evidence, episode, place)
    eye = place + EYE_M * out - evidence.origin
    load = np.zeros(len(evidence.panels.area))
    for c in episode.contributors:
        load[c.panel] = c.load
    high = round_end(float(load.max(initial=0.0)))
    frame = _frame(evidence, eye, load, out)
    az, el = _grid(frame)
    north = np.radians(evidence.year.study.site.model_north)
    a = az - north  # bearing to the model's +Y axis
    d = np.stack([np.sin(a) * np.cos(el), np.cos(a) * np.cos(el), np.sin(el)], axis=2)
    rays = d.reshape(-1, 3)
    hit, _ = evidence.tracer.first_hit(np.broadcast_to(eye, rays.shape), rays)
    axes.imshow(
        _paint(evidence, hit, load, high).reshape(*az.shape, 3),
        origin="lower",
        extent=tuple(np.degrees(frame)),
        interpolation="nearest",
    )
    if episode.check is not None:
        left, right = np.degrees(frame[:2])
        sun = (episode.check.sun_azimuth - left) % 360.0 + left
        axes.plot(sun, episode.check.sun_elevation, marker="*", mfc="white", mec="black", ms=9)
        axes.set_xlim(left, right)
        axes.set_ylim(*np.degrees(frame[2:]))
    axes.set_aspect("equal")
    axes.set_xlabel("azimuth (degrees)")
    axes.set_ylabel("elevation (degrees)")
    axes.xaxis.set_major_locator(mpl.ticker.MaxNLocator(5, integer=True))
    axes.xaxis.set_major_formatter(lambda x, _: f"{x % 360:.0f}")
    if not episode.contributors:
        return None
    return mpl.cm.ScalarMappable(mpl.colors.Normalize(0.0, high), LOAD_MAP)


def _outward(evidence: Evidence, episode: Episode, place: Floats) -> Floats:
    if episode.check is not None:
        return np.array(episode.check.normal)
    r = evidence.year.receivers[episode.receiver]
    return np.asarray(r.normals[int(np.argmin(((r.points - place) ** 2).sum(axis=1)))])


def _frame(
    evidence: Evidence, eye: Floats, load: Floats, out: Floats
) -> tuple[float, float, float, float]:
    """Azimuths and elevations that hold the panels which matter. [rad]"""
    which = load[evidence.panel_of] > 0.0
    T = evidence.facade[which] if which.any() else evidence.facade
    d = T.reshape(-1, 3) - evidence.origin - eye
    d = d[d @ out > 0.0] if (d @ out > 0.0).any() else d
    north = np.radians(evidence.year.study.site.model_north)
    az = np.arctan2(d[:, 0], d[:, 1]) + north
    el = np.arctan2(d[:, 2], np.hypot(d[:, 0], d[:, 1]))
    middle = np.angle(np.exp(1j * az).mean())
    off = np.angle(np.exp(1j * (az - middle)))
    low, high = float(off.min()), float(off.max())
    bottom, top = float(el.min()), float(el.max())
    least = np.radians(16.0)
    for_each = max(least, 1.25 * (high - low)), max(least, 1.25 * (top - bottom))
    wide = min(2.0 * np.pi, max(for_each[0], 0.8 * for_each[1]))
    tall = min(np.pi, max(for_each[1], 0.8 * for_each[0]))
    centre = middle + (low + high) / 2.0
    level = float(np.clip((bottom + top) / 2.0, tall / 2 - np.pi / 2, np.pi / 2 - tall / 2))
    return centre - wide / 2, centre + wide / 2, level - tall / 2, level + tall / 2


def _grid(frame: tuple[float, float, float, float]) -> tuple[Floats, Floats]:
    step = max((frame[1] - frame[0]) / WIDE, (frame[3] - frame[2]) / TALL)
    columns = max(2, int((frame[1] - frame[0]) / step))
    rows = max(2, int((frame[3] - frame[2]) / step))
    az = frame[0] + (np.arange(columns) + 0.5) / columns * (frame[1] - frame[0])
    el = frame[2] + (np.arange(rows) + 0.5) / rows * (frame[3] - frame[2])
    both = np.meshgrid(az, el)
    return both[0], both[1]


def _paint(evidence: Evidence, hit: Any, load: Floats, high: float) -> Floats:
    """Colours (n, 3) of what rays met: panels by their load, the rest in shades of grey."""
    k = len(evidence.facade)
    T = np.concatenate([evidence.facade, evidence.surroundings])
    colours = np.empty((len(T) + 1, 3))
    colours[:-1] = GREY * shade(T)[:, None]
    colours[:k] = PLAIN_GLASS
    panel = evidence.panel_of
    lit = load[panel] > 0.0
    colours[:k][lit] = map_colours(load[panel[lit]], low=0.0, high=high)[:, :3] / 255.0
    colours[-1] = SKY
    return colours[hit]


def shade(T: Floats) -> Floats:
    """Brightness of triangles by how they lie, so that bodies can be told apart.

    Parameters
    ----------
    T : (n, 3, 3) float
        Corners. [m]

    Returns
    -------
    brightness : (n,) float
        In [0.68, 1].
    """
    n = np.cross(T[:, 1] - T[:, 0], T[:, 2] - T[:, 0])
    n /= np.maximum(np.linalg.norm(n, axis=1, keepdims=True), 1e-12)
    return 0.68 + 0.32 * np.abs(n @ LIGHT) / np.linalg.norm(LIGHT)


def site_view(evidence: Evidence) -> Figure:
    """Draw the site from above with the year's peak load on what it lights.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Returns
    -------
    figure : Figure
        A view without axes.
    """
    peak = evidence.cell_data["peak reflected [W/m2]"]
    lit = peak > LIT_W_M2
    Q = evidence.cells[lit]
    normal = np.cross(Q[:, 1] - Q[:, 0], Q[:, 3] - Q[:, 0])
    normal /= np.maximum(np.linalg.norm(normal, axis=1, keepdims=True), 1e-12)
    Q = Q + 0.02 * normal[:, None]
    cells = np.concatenate([Q[:, [0, 1, 2]], Q[:, [0, 2, 3]]])
    T = np.concatenate([evidence.facade, evidence.surroundings, cells]) - evidence.origin
    norm, extend = load_scale(peak)
    colours = np.empty((len(T) + 1, 3))
    k, s = len(evidence.facade), len(evidence.surroundings)
    colours[:k] = PLAIN_GLASS * shade(evidence.facade)[:, None]
    colours[k : k + s] = GREY * shade(evidence.surroundings)[:, None]
    tint = mpl.colormaps[LOAD_MAP](norm(peak[lit]))[:, :3]
    colours[k + s : -1] = np.concatenate([tint, tint])
    colours[-1] = SKY
    wide, tall = 1100, 640
    eye, rays = _camera(evidence, wide, tall)
    hit, _ = build_tracer(T).first_hit(np.broadcast_to(eye, rays.shape), rays)
    figure = paper_figure(WIDTH_MM, 106.0)
    axes = figure.subplots()
    axes.imshow(colours[hit].reshape(tall, wide, 3), origin="upper", interpolation="nearest")
    axes.set_axis_off()
    colour_bar(
        figure,
        mpl.cm.ScalarMappable(norm, LOAD_MAP),
        axes,
        "peak reflected load in the year (W/m²)",
        orientation="horizontal",
        shrink=0.6,
        extend=extend,
    )
    return figure


def _camera(evidence: Evidence, wide: int, tall: int) -> tuple[Floats, Floats]:
    """Eye and rays (n, 3) of a view from above, from the side that the light falls on."""
    corner = evidence.facade.reshape(-1, 3) - evidence.origin
    middle = 0.5 * (corner.min(axis=0) + corner.max(axis=0))
    spread = float(np.linalg.norm(np.ptp(corner, axis=0)))
    peak = evidence.cell_data["peak reflected [W/m2]"]
    strong = peak > 0.05 * peak.max(initial=0.0)
    hot = middle - np.array([0.0, spread, 0.0])
    if strong.any():
        hot = np.average(
            evidence.cells[strong].mean(axis=1) - evidence.origin, axis=0, weights=peak[strong]
        )
    out = (hot - middle) * np.array([1.0, 1.0, 0.0])
    length = float(np.linalg.norm(out))
    out = out / length if length > 1e-6 else np.array([0.0, -1.0, 0.0])
    side = np.array([-out[1], out[0], 0.0])
    size = max(spread, 1.4 * float(np.linalg.norm(hot - middle)))
    focus = 0.5 * (hot + middle)
    eye = focus + 1.35 * size * out + 0.7 * size * side + np.array([0.0, 0.0, 1.05 * size])
    ahead = (focus - eye) / np.linalg.norm(focus - eye)
    right = np.cross(ahead, [0.0, 0.0, 1.0])
    right /= np.linalg.norm(right)
    up = np.cross(right, ahead)
    half = np.tan(np.radians(19.0))
    y, x = np.meshgrid(
        half * (1.0 - 2.0 * (np.arange(tall) + 0.5) / tall),
        half * wide / tall * (2.0 * (np.arange(wide) + 0.5) / wide - 1.0),
        indexing="ij",
    )
    d = ahead + x[..., None] * right + y[..., None] * up
    d = d.reshape(-1, 3)
    return eye, d / np.linalg.norm(d, axis=1, keepdims=True)
