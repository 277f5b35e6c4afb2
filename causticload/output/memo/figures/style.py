"""How figures of a memo look, and how they become files that are the same each time."""

from __future__ import annotations

import io
from typing import Any, Literal

import matplotlib as mpl
import numpy as np
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.backends.backend_pdf import FigureCanvasPdf
from matplotlib.backends.backend_svg import FigureCanvasSVG
from matplotlib.figure import Figure

from causticload.output.colours import LOAD_MAP, round_end
from causticload.output.pictures import north_arrow
from causticload.scene.model import Floats

MM = 1.0 / 25.4  # inch
WIDTH_MM = 170.0  # of the text on an A4 page
INK, FAINT = "0.1", "0.55"
COMMON = 99.7  # percentile of the lit values that ends a scale of loads
PAPER_RC: dict[str, Any] = {
    "font.family": "DejaVu Sans",
    "font.size": 7.5,
    "axes.titlesize": 8.0,
    "axes.titleweight": "bold",
    "axes.titlelocation": "left",
    "axes.linewidth": 0.6,
    "axes.edgecolor": "0.3",
    "lines.linewidth": 1.0,
    "xtick.major.width": 0.6,
    "ytick.major.width": 0.6,
    "hatch.linewidth": 0.5,
    "image.cmap": LOAD_MAP,
    # Files that do not change from run to run, with text that stays text in a PDF.
    "svg.hashsalt": "causticload",
    "svg.fonttype": "path",
    "pdf.fonttype": 3,
    "path.simplify": True,
}
Format = Literal["svg", "pdf", "png"]
_METADATA: dict[str, dict[str, Any]] = {
    "svg": {"Date": None, "Creator": "causticload"},
    "pdf": {"CreationDate": None, "Creator": "causticload", "Producer": None},
    "png": {"Software": "causticload"},
}
PNG_DPI = 200
MANY_LINES = 20_000  # from which lines are drawn as pixels


def paper_figure(width_mm: float, height_mm: float) -> Figure:
    """Make a figure that needs no screen.

    Parameters
    ----------
    width_mm, height_mm : float
        Size on paper. [mm]

    Returns
    -------
    figure : matplotlib.figure.Figure
        Laid out as it is drawn.
    """
    figure = Figure(figsize=(width_mm * MM, height_mm * MM), dpi=PNG_DPI, layout="constrained")
    FigureCanvasAgg(figure)
    return figure


def freeze(figure: Figure) -> Figure:
    """Lay a figure out once, so that writing it in several formats does not do it again.

    Parameters
    ----------
    figure : Figure
        Complete.

    Returns
    -------
    figure : Figure
        The same.
    """
    figure.get_layout_engine().execute(figure)  # type: ignore[union-attr]
    figure.set_layout_engine("none")
    return figure


def to_bytes(figure: Figure, kind: Format) -> bytes:
    """Write a figure.

    Parameters
    ----------
    figure : Figure
        The figure.
    kind : {"svg", "pdf", "png"}
        Format.

    Returns
    -------
    data : bytes
        The same for the same figure.
    """
    out = io.BytesIO()
    # The canvases' own doors: Figure.savefig would draw everything once more to lay it out. They
    # leave their own resolution behind.
    figure.set_dpi(PNG_DPI)
    with mpl.rc_context(PAPER_RC):
        if kind == "svg":
            FigureCanvasSVG(figure).print_svg(out, metadata=_METADATA[kind])
        elif kind == "pdf":
            FigureCanvasPdf(figure).print_pdf(out, metadata=_METADATA[kind])
        else:
            FigureCanvasAgg(figure).print_png(out, metadata=_METADATA[kind])
    return out.getvalue()


def load_scale(values: Floats) -> tuple[Any, str]:
    """Give a scale of loads that single bright cells do not stretch: even in its square root.

    Parameters
    ----------
    values : float array
        Loads; nan and 0 are left out. [W/m²]

    Returns
    -------
    norm : matplotlib norm
        From 0 to a round end.
    extend : {"neither", "max"}
        ``"max"`` if some values lie beyond the end.
    """
    lit = values[np.nan_to_num(values) > 0.0]
    high = round_end(float(np.percentile(lit, COMMON)) if len(lit) else 0.0)
    extend = "max" if lit.max(initial=0.0) > high else "neither"
    return mpl.colors.PowerNorm(0.5, 0.0, high), extend


def colour_bar(figure: Any, shown: Any, axes: Any, label: str, **options: Any) -> Any:
    """Draw a colour bar with few, round ticks.

    Parameters
    ----------
    figure : Figure
        The figure.
    shown : matplotlib mappable
        What it explains.
    axes : matplotlib axes
        Beside which.
    label : str
        What it shows, with its unit.
    **options
        For ``Figure.colorbar``.

    Returns
    -------
    bar : matplotlib colorbar
        The bar.
    """
    bar = figure.colorbar(shown, ax=axes, pad=0.02, **options)
    bar.set_label(label)
    norm = shown.norm
    if isinstance(norm, mpl.colors.PowerNorm):
        ticks = [share * float(norm.vmax or 0.0) for share in (0.0, 0.05, 0.25, 0.5, 1.0)]
        bar.set_ticks(ticks, labels=[f"{t:,.0f}" for t in ticks])
        bar.minorticks_off()
    return bar


def draw_lines(axes: Any, segments: Floats, colour: str, width: float) -> None:
    """Draw many short lines as one path, which keeps vector files small.

    Parameters
    ----------
    axes : matplotlib axes
        In metres.
    segments : (n, 2, 2) float
        Their ends. [m]
    colour : str
        Of all.
    width : float
        Of all. [pt]
    """
    if not len(segments):
        return
    path = mpl.path.Path(
        segments.reshape(-1, 2),
        np.tile([mpl.path.Path.MOVETO, mpl.path.Path.LINETO], len(segments)),
    )
    axes.add_artist(  # not add_patch, which would measure each line
        mpl.patches.PathPatch(
            path,
            facecolor="none",
            edgecolor=colour,
            linewidth=width,
            rasterized=len(segments) > MANY_LINES,
        )
    )


def finish_plan(axes: Any, model_north: float) -> None:
    """Give a plan its axes, its north arrow and its scale bar.

    Parameters
    ----------
    axes : matplotlib axes
        The plan, with its limits set; model +Y is up.
    model_north : float
        Bearing of the model's +Y axis. [degrees]
    """
    axes.set_aspect("equal")
    axes.set_xlabel("model x (m)")
    axes.set_ylabel("model y (m)")
    north_arrow(axes, model_north)
    scale_bar(axes)


def scale_bar(axes: Any) -> None:
    """Draw a scale bar of a round length in the lower left corner.

    Parameters
    ----------
    axes : matplotlib axes
        In metres, with its limits set.
    """
    low, high = axes.get_xlim()
    bottom, top = axes.get_ylim()
    length = round_length(0.25 * abs(high - low))
    x, y = low + 0.04 * (high - low), bottom + 0.04 * (top - bottom)
    thick = 0.012 * (top - bottom)
    half = length / 2.0
    for start, colour in ((x, INK), (x + half, "white")):
        axes.add_patch(
            mpl.patches.Rectangle(
                (start, y), half, thick, facecolor=colour, edgecolor=INK, linewidth=0.6, zorder=9
            )
        )
    axes.text(
        x + length,
        y + 1.6 * thick,
        f"{length:g} m",
        ha="right",
        va="bottom",
        zorder=9,
        bbox={"boxstyle": "square,pad=0.15", "fc": "white", "ec": "none", "alpha": 0.8},
    ).set_gid("scale bar")


def round_length(most: float) -> float:
    """Give the largest of 1, 2, 5 times a power of ten that is not above a length.

    Parameters
    ----------
    most : float
        The length, > 0. [m]

    Returns
    -------
    length : float
        A round one. [m]
    """
    power = 10.0 ** np.floor(np.log10(most))
    return float(max(step for step in (1.0, 2.0, 5.0) if step * power <= most * (1 + 1e-9)) * power)
