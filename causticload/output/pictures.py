"""Pictures: the hottest moment as a view, the year as a plan, and the colour scale."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

import matplotlib as mpl
import numpy as np
import pyvista as pv
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from causticload.optics.builtin import BUILT_IN
from causticload.output import words
from causticload.output.colours import LOAD_MAP, round_end
from causticload.output.files import write_whole
from causticload.output.meshes import cells_of, flag_marks, surroundings
from causticload.output.results import Instant, ReceiverYear, Year
from causticload.scene.model import Bools, Floats, Scene

SIZE = (1280, 860)
CAUTION = "Screening aid. Local codes and licensed practice decide."


def new_figure(width_in: float, height_in: float) -> Figure:
    """Make a figure that needs no screen and leaves global settings alone.

    Parameters
    ----------
    width_in, height_in : float
        Size. [inch]

    Returns
    -------
    figure : matplotlib.figure.Figure
        Laid out as it is drawn.
    """
    figure = Figure(figsize=(width_in, height_in), layout="constrained")
    FigureCanvasAgg(figure)
    return figure


def draw_scale(path: Path, *, high: float, limits: Sequence[float], label: str) -> None:
    """Draw the colour scale with the limits marked on it.

    Parameters
    ----------
    path : Path
        PNG.
    high : float
        End of the scale. [W/m²]
    limits : sequence of float
        Limits to mark, where they lie on the scale. [W/m²]
    label : str
        What the colours show.
    """
    figure = new_figure(6.0, 1.25)
    axes = figure.subplots()
    bar = figure.colorbar(
        mpl.cm.ScalarMappable(mpl.colors.Normalize(0.0, high), LOAD_MAP),
        cax=axes,
        orientation="horizontal",
        label=f"{label} (W/m²)",
    )
    for limit in limits:
        if limit <= high:
            bar.ax.axvline(limit, color="white", linewidth=3.0)
            bar.ax.axvline(limit, color="black", linewidth=1.2)
            bar.ax.annotate(
                f"{limit:,.0f}",
                (limit, 1.0),
                xycoords=("data", "axes fraction"),
                xytext=(0, 3),
                textcoords="offset points",
                ha="center",
                fontsize=8,
            )
    figure.savefig(path, format="png", dpi=150)


def render_moment(instant: Instant, path: Path, *, limit: float | None = None) -> None:
    """Draw the scene with the loads of one instant, off screen.

    Parameters
    ----------
    instant : Instant
        The instant.
    path : Path
        PNG.
    limit : float, optional
        Reflected load whose exceedance is outlined and hatched. [W/m²]
    """
    ordered = sorted(instant.receivers.values(), key=lambda r: r.first)
    reflected = np.concatenate([r.reflected for r in ordered] or [np.zeros(0)])
    when = (
        words.moment(instant.sun.time, instant.study.site.timezone)
        if instant.sun.time is not None
        else f"sun at azimuth {instant.sun.azimuth:.1f}°, elevation {instant.sun.elevation:.1f}°"
    )
    peak = float(reflected.max(initial=0.0))
    title = f"{instant.study.title}, {when}: reflected load up to {words.load(peak)}"
    over = reflected > limit if limit is not None else np.zeros(len(reflected), bool)
    view = _View(instant.scene, title)
    view.loads(reflected, over, "Reflected load (W/m²)", limit)
    view.aim(_hot_middle(instant, reflected))
    view.save(path)


def _hot_middle(instant: Instant, reflected: Floats) -> Floats:
    """Middle of the load, in model coordinates."""
    ordered = sorted(instant.receivers.values(), key=lambda r: r.first)
    points = np.concatenate([r.points for r in ordered] or [np.zeros((0, 3))])
    if not len(points) or reflected.max() <= 0.0:
        return instant.scene.origin
    weight = np.where(reflected > 0.5 * reflected.max(), reflected, 0.0)
    return np.average(points, axis=0, weights=weight)


class _View:
    """A picture of the scene in the making."""

    def __init__(self, scene: Scene, title: str) -> None:
        self.scene = scene
        self.plot = pv.Plotter(off_screen=True, window_size=list(SIZE), lighting="light kit")
        self.plot.set_background("white")
        grey = pv.wrap(surroundings(scene))
        self.plot.add_mesh(grey, color="#d2d2cf", ambient=0.25, show_edges=False)
        T = scene.triangles[scene.reflectors] + scene.origin
        faces = np.column_stack([np.full(len(T), 3), np.arange(3 * len(T)).reshape(-1, 3)])
        glass = pv.PolyData(T.reshape(-1, 3), faces.ravel())
        self.plot.add_mesh(glass, color="#8fa3b5", ambient=0.3, specular=0.3)
        edges = glass.clean().extract_feature_edges(feature_angle=0.02)
        if edges.n_cells:
            self.plot.add_mesh(edges, color="#5c6b78", line_width=0.7)
        self.plot.add_text(title, position="upper_left", font_size=9, color="black")
        self.plot.add_text(CAUTION, position="lower_left", font_size=7, color="#444444")

    def loads(self, values: Floats, over: Bools, label: str, limit: float | None) -> None:
        """Lay the loads on the receivers; cells over the limit are outlined and hatched."""
        cells = cells_of(self.scene)
        lit = values > 0.005 * values.max(initial=0.0)
        if not lit.any():
            return
        corner = cells.vertices[cells.quads[lit]] + 0.03 * cells.normals[lit][:, None]
        n = len(corner)
        mesh = pv.PolyData(
            corner.reshape(-1, 3),
            np.column_stack([np.full(n, 4), np.arange(4 * n).reshape(-1, 4)]).ravel(),
        )
        mesh.cell_data[label] = values[lit]
        self.plot.add_mesh(
            mesh,
            scalars=label,
            cmap=LOAD_MAP,
            clim=(0.0, round_end(float(values.max()))),
            lighting=False,
            scalar_bar_args={
                "color": "black",
                "title": label,
                "n_labels": 5,
                "fmt": "%.0f",
                "vertical": False,
                "position_x": 0.3,
                "position_y": 0.04,
                "width": 0.4,
                "height": 0.07,
                "title_font_size": 15,
                "label_font_size": 13,
            },
        )
        marks = flag_marks(cells, over)
        if len(marks):
            k = len(marks)
            ribbon = pv.PolyData(
                (marks + 0.05 * np.array([0.0, 0.0, 1.0])).reshape(-1, 3),
                np.column_stack([np.full(k, 4), np.arange(4 * k).reshape(-1, 4)]).ravel(),
            )
            self.plot.add_mesh(ribbon, color="black", lighting=False)
            if limit is not None:
                self.plot.add_text(
                    f"outlined and hatched: over {limit:,.0f} W/m² reflected",
                    position="lower_right",
                    font_size=7,
                    color="black",
                )

    def aim(self, hot: Floats) -> None:
        """Look from high on the side of the light, past the hot spot, at the reflectors."""
        scene = self.scene
        r = scene.reflectors
        corners = (scene.triangles[r] + scene.origin).reshape(-1, 3)
        middle = 0.5 * (corners.min(axis=0) + corners.max(axis=0))
        spread = float(np.linalg.norm(np.ptp(corners, axis=0)))
        size = max(spread, 1.2 * float(np.linalg.norm(hot - middle)))
        out = hot - middle
        out[2] = 0.0
        length = float(np.linalg.norm(out))
        out = out / length if length > 1e-6 else np.array([0.0, -1.0, 0.0])
        side = np.array([-out[1], out[0], 0.0])
        focus = 0.5 * (hot + middle)
        eye = focus + 1.5 * size * out + 0.7 * size * side + np.array([0, 0, 1.15 * size])
        self.plot.camera_position = [tuple(eye), tuple(focus), (0.0, 0.0, 1.0)]
        self.plot.camera.view_angle = 38.0
        self.plot.camera.clipping_range = (0.05 * size, 40.0 * size)
        north = np.radians(0.0) - scene.north_rad
        arrow = pv.Arrow(
            start=(0, 0, 0),
            direction=(float(np.sin(north)), float(np.cos(north)), 0.0),
            tip_radius=0.16,
            shaft_radius=0.05,
        )
        self.plot.add_orientation_widget(arrow, color="black", viewport=(0.9, 0.82, 1.0, 0.98))
        self.plot.add_text("N", position=(0.955, 0.80), viewport=True, font_size=8, color="black")

    def save(self, path: Path) -> None:
        """Render and write."""
        self.plot.screenshot(str(path))
        self.plot.close()


def year_pictures(year: Year, folder: Path) -> list[Path]:
    """Draw a plan of the year's peak for each flat receiver that is lit.

    Parameters
    ----------
    year : Year
        The year.
    folder : Path
        Where to.

    Returns
    -------
    paths : list of Path
        The pictures.
    """
    grounds = [
        r
        for r in year.receivers.values()
        if len(r.areas) and r.normals[:, 2].mean() > 0.9 and r.peak_reflected.max() > 0.0
    ]
    if not grounds:
        return []
    path = folder / "plan.png"
    high = round_end(max(float(r.peak_reflected.max()) for r in grounds))
    write_whole(path, lambda p: plan_picture(grounds, p, year=year, high=high))
    return [path]


def plan_picture(grounds: Sequence[ReceiverYear], path: Path, *, year: Year, high: float) -> None:
    """Draw a plan of peak reflected load with north, a scale bar and contours of the limits.

    Parameters
    ----------
    grounds : sequence of ReceiverYear
        Receivers that face up.
    path : Path
        PNG.
    year : Year
        The year.
    high : float
        End of the scale. [W/m²]
    """
    points = np.concatenate([r.points for r in grounds])
    load = np.concatenate([r.peak_reflected for r in grounds])
    h = float(max(r.spacing.max() for r in grounds))
    low = points[:, :2].min(axis=0)
    index = np.floor((points[:, :2] - low) / h + 0.5).astype(int)
    image = np.full(tuple(index.max(axis=0) + 1), np.nan)
    order = np.argsort(load)
    image[tuple(index[order].T)] = load[order]
    extent = (
        low[0] - h / 2,
        low[0] + (image.shape[0] - 0.5) * h,
        low[1] - h / 2,
        low[1] + (image.shape[1] - 0.5) * h,
    )
    aspect = (extent[3] - extent[2]) / (extent[1] - extent[0])
    figure = new_figure(8.0, min(10.0, max(4.0, 7.0 * aspect + 1.2)))
    axes = figure.subplots()
    shown = axes.imshow(
        image.T,
        origin="lower",
        extent=extent,
        cmap=LOAD_MAP,
        vmin=0.0,
        vmax=high,
        interpolation="nearest",
    )
    figure.colorbar(shown, ax=axes, shrink=0.8, label="Peak reflected load in the year (W/m²)")
    _draw_scene_outline(axes, year.scene)
    axes.set_xlabel("model x (m)")
    axes.set_ylabel("model y (m)")
    axes.set_aspect("equal")
    axes.set_xlim(extent[0], extent[1])
    axes.set_ylim(extent[2], extent[3])
    axes.set_title(f"{year.summary['title']}, {year.summary['year']['year']}", fontsize=10)
    north_arrow(axes, year.study.site.model_north)
    figure.savefig(path, format="png", dpi=150)


def _draw_scene_outline(axes: Any, scene: Scene | None) -> None:
    """Plan lines of what stands there."""
    if scene is None:
        return
    from matplotlib.collections import LineCollection

    reflects = scene.panel >= 0
    for mask, colour, width in (
        (~reflects & (scene.chart < 0), "0.55", 0.4),
        (reflects, "black", 0.8),
    ):
        T = scene.triangles[mask][:, :, :2] + scene.origin[:2]
        lines = np.stack([T, np.roll(T, -1, axis=1)], axis=2).reshape(-1, 2, 2)
        axes.add_collection(LineCollection(list(lines), colors=colour, linewidths=width))


def plot_finishes(path: Path) -> None:
    """Draw the solar reflectance of the built-in finishes over the angle of incidence.

    Parameters
    ----------
    path : Path
        PNG.
    """
    angle = np.linspace(0.0, 90.0, 181)
    theta = np.linspace(0.0, np.pi / 2, len(angle))
    figure = new_figure(9.0, 5.5)
    axes = figure.subplots()
    styles = ("-", "--", ":", "-.")
    for k, finish in enumerate(BUILT_IN.values()):
        unit = finish.combined()
        solar = unit.reflectance(theta)[0, 0].mean(axis=0)
        shade = mpl.colormaps[LOAD_MAP](k / len(BUILT_IN))
        axes.plot(angle, solar, styles[k % 4], color=shade, label=finish.name)
        if unit.reflection.limits is not None:
            low, high = (limit(theta)[0, 0].mean(axis=0) for limit in (unit.low, unit.high))
            axes.fill_between(angle, low, high, color=shade, alpha=0.08)
    axes.set_xlabel("angle of incidence (degrees)")
    axes.set_ylabel("solar reflectance, outdoor side")
    axes.set_xlim(0.0, 90.0)
    axes.set_ylim(0.0, 1.02)
    figure.legend(loc="outside right upper", fontsize=8)
    write_whole(path, lambda p: figure.savefig(p, format="png", dpi=150))


def north_arrow(axes: Any, model_north: float) -> None:
    """Draw an arrow to true north in a corner of a plan.

    Parameters
    ----------
    axes : matplotlib axes
        The plan, model +Y up.
    model_north : float
        Bearing of the model's +Y axis. [degrees]
    """
    angle = np.radians(-model_north)
    tip = 0.06 * np.array([np.sin(angle), np.cos(angle)])
    at = np.array([0.93, 0.9])
    axes.annotate(
        "",
        xy=at + tip,
        xytext=at - tip,
        xycoords="axes fraction",
        arrowprops={"arrowstyle": "-|>", "color": "black", "lw": 1.6},
    )
    axes.text(
        *(at + 1.45 * tip),
        "N",
        transform=axes.transAxes,
        ha="center",
        va="center",
        fontsize=9,
        bbox={"boxstyle": "circle,pad=0.15", "fc": "white", "ec": "none", "alpha": 0.8},
    )
