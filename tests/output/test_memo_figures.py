"""Figures of a memo, read by their artists: units, scale, north, and what they show."""

import re
import sys
from datetime import date, datetime
from pathlib import Path
from zoneinfo import ZoneInfo

import matplotlib as mpl
import numpy as np
import pytest

from causticload.output.memo.blocks import Picture
from causticload.output.memo.compose import compose
from causticload.output.memo.evidence import Evidence
from causticload.output.memo.figures.charts import calendar
from causticload.output.memo.figures.facade_maps import focal_distance, unroll
from causticload.output.memo.figures.plans import raster
from causticload.output.memo.figures.style import freeze, round_length, to_bytes
from causticload.output.memo.figures.views import spot_view
from causticload.output.memo.findings import peak_of
from causticload.output.memo.model3d import lit_cells

sys.path.insert(0, str(Path(__file__).parent))
from conftest import NOW

PLANS = ("fig-site-plan", "fig-load-plan", "fig-hours-plan", "fig-image-plan")


@pytest.fixture(scope="module")
def evidence(steel_year):
    return Evidence(steel_year)


@pytest.fixture(scope="module")
def drawn(evidence):
    memo = compose(evidence, now=NOW)
    return {b.key: b.draw() for b in memo.blocks if isinstance(b, Picture)}


def test_every_axis_has_its_unit(drawn):
    axes = [(k, a) for k, f in drawn.items() for a in f.axes if a.axison]
    assert len(axes) > 20
    for key, a in axes:
        is_bar = a.get_label() == "<colorbar>"
        labels = [a.get_xlabel(), a.get_ylabel()]
        if is_bar:
            labels = [x for x in labels if x]
            assert len(labels) == 1, key
        for label in labels:
            unit = re.search(r"\((m|h|W/m²|degrees|number|°C|h in the year)\)$", label)
            assert unit or label.startswith("day of the year"), (key, label)


def test_every_plan_has_north_and_a_true_scale_bar(drawn, evidence):
    flat = [drawn[k].axes[0] for k in PLANS]
    flat += [f.axes[0] for k, f in drawn.items() if k.startswith("fig-finding")]
    plans = [a for a in flat if a.get_xlabel().startswith("model x")]
    assert len(plans) >= len(PLANS) + 1
    for a in plans:
        assert "N" in [t.get_text() for t in a.texts]
        arrow = next(t for t in a.texts if getattr(t, "arrow_patch", None) is not None)
        dx, dy = np.array(arrow.xy) - np.array(arrow.xyann)
        # the model's +Y points to the bearing 20°, so north lies 20° anticlockwise of up
        assert np.degrees(np.arctan2(dx, dy)) == pytest.approx(-20.0, abs=1e-6)
        assert a.get_aspect() == 1.0
    for a in flat:
        bar = next(t for t in a.texts if t.get_gid() == "scale bar")
        length = float(bar.get_text().removesuffix(" m"))
        halves = [p for p in a.patches if isinstance(p, mpl.patches.Rectangle)]
        assert sum(p.get_width() for p in halves) == pytest.approx(length)


def test_scale_bars_are_round():
    assert [round_length(x) for x in (0.9, 1.0, 4.9, 5.0, 63.0, 2000.0)] == [0.5, 1, 2, 5, 50, 2000]


def test_colours_are_not_those_of_traffic_lights(drawn):
    maps = {
        c.get_cmap().name
        for f in drawn.values()
        for a in f.axes
        for c in (*a.images, *a.collections)
        if getattr(c, "get_array", lambda: None)() is not None and np.ndim(c.get_array()) < 3
    }
    assert maps <= {"cividis", "gray", "unnamed"}  # one grey alone has no name
    assert "cividis" in maps
    # lightness rises all the way: the figures can be read in grey print
    rgb = mpl.colormaps["cividis"](np.linspace(0, 1, 50))[:, :3]
    assert (np.diff(rgb @ [0.2126, 0.7152, 0.0722]) > 0).all()


def test_files_of_a_figure_do_not_change(evidence):
    memo = compose(evidence, now=NOW)
    picture = next(b for b in memo.blocks if getattr(b, "key", "") == "fig-contribution")
    first, second = freeze(picture.draw()), freeze(picture.draw())
    for kind in ("svg", "pdf", "png"):
        assert to_bytes(first, kind) == to_bytes(second, kind)


def test_an_arc_unrolls_to_its_length():
    phi = np.linspace(-0.6, 0.9, 400)
    arc = 12.0 * np.column_stack([np.sin(phi), np.cos(phi)]) + [100.0, -40.0]
    along = unroll(arc, arc)
    direct = 12.0 * (phi - phi[0])
    if along[0] > along[-1]:
        direct = direct[::-1]
    # lengths are measured along 120 chords: short of the arc by less than a thousandth
    assert along == pytest.approx(direct, abs=0.02)


def test_a_straight_wall_and_a_full_circle_unroll():
    t = np.linspace(0.0, 30.0, 301)
    wall = np.column_stack([t * 0.6, t * 0.8])
    assert np.abs(np.diff(unroll(wall, wall))) == pytest.approx(0.1, abs=1e-6)
    phi = np.linspace(0.0, 2 * np.pi, 720, endpoint=False)
    ring = 10.0 * np.column_stack([np.cos(phi), np.sin(phi)])
    assert np.ptp(unroll(ring, ring)) == pytest.approx(20 * np.pi, rel=0.01)


def test_a_cylinder_gathers_at_half_its_radius(evidence):
    # R / 2 for light that falls straight on a mirror of radius R: any textbook of optics
    straight = Evidence(evidence.folder)
    straight.facade_data = {
        k: v for k, v in evidence.facade_data.items() if not k.startswith("focal")
    }
    assert focal_distance(straight) == pytest.approx(6.0, rel=0.03)


def test_given_focal_distances_are_taken(evidence):
    other = Evidence(evidence.folder)
    n = len(other.facade)
    other.facade_data = {
        **other.facade_data,
        "focal tangential [m]": np.full(n, 9.0),
        "focal sagittal [m]": np.full(n, -4.0),
    }
    assert (focal_distance(other) == 9.0).all()


def test_a_raster_keeps_the_largest_at_its_place():
    got = raster(
        np.array([0.0, 1.0, 1.1]), np.array([0.0, 2.0, 2.1]), np.array([5.0, 7.0, 6.0]), 1.0
    )
    assert got.image.shape == (3, 2)
    assert got.image[0, 0] == 5.0
    assert got.image[2, 1] == 7.0
    assert np.isnan(got.image[1, 1])
    assert got.extent == (-0.5, 1.5, -0.5, 2.5)


def test_the_year_keeps_the_local_clock(evidence):
    """A step of a solved day stands where its own clock says, in summer and in winter time."""
    name = "ground"
    shown = calendar(evidence, [name], evidence.year.episodes)
    assert shown.load.shape == (365, 24)
    zone = ZoneInfo("Europe/London")
    offsets = set()
    for row in evidence.year.days:
        d = (date.fromisoformat(row["date"]) - date(2025, 1, 1)).days
        for time, value in zip(row["times"], row["worst"][name], strict=True):
            t = time.astype("datetime64[s]").astype(datetime).replace(tzinfo=ZoneInfo("UTC"))
            t = t.astimezone(zone)
            offsets.add(t.utcoffset())
            assert shown.load[d, t.hour] >= value
    assert len(offsets) == 2
    night = np.isnan(shown.load)
    assert night[:, 0].all()
    assert not night[:, 12].any()


def test_hours_over_a_limit_are_marked(evidence):
    year = evidence.year
    shown = calendar(evidence, ["ground"], year.episodes)
    zone = ZoneInfo("Europe/London")
    for e in year.episodes:
        t = e.peak_time.astype("datetime64[s]").astype(datetime).replace(tzinfo=ZoneInfo("UTC"))
        t = t.astimezone(zone)
        assert shown.over[(t.date() - date(2025, 1, 1)).days, t.hour]
    # marked hours are hours with light on some receiver
    every = calendar(evidence, list(year.receivers), year.episodes)
    assert (np.nan_to_num(every.load[every.over]) > 0.0).mean() > 0.95


def test_panels_stand_where_the_spot_sees_them(evidence):
    episode = next(e for e in evidence.year.episodes if e.contributors)
    figure = mpl.figure.Figure()
    axes = figure.subplots()
    spot_view(axes, evidence, episode)
    image = axes.images[0]
    left, right, bottom, top = image.get_extent()
    pixels = np.asarray(image.get_array())
    rows, columns = pixels.shape[:2]
    seen = 0
    for c in episode.contributors:
        dx, dy, dz = np.array(c.place) - np.array(peak_of(episode).place)
        azimuth = (np.degrees(np.arctan2(dx, dy)) + 20.0 - left) % 360.0 + left
        elevation = np.degrees(np.arctan2(dz, np.hypot(dx, dy)))
        assert left < azimuth < right
        assert bottom < elevation < top
        j = int((azimuth - left) / (right - left) * columns)
        i = int((elevation - bottom) / (top - bottom) * rows)
        colour = pixels[i, j]
        seen += bool(np.ptp(colour) > 0.03)  # neither white sky nor grey wall
    assert seen >= 0.8 * len(episode.contributors)


def test_coarser_cells_cover_the_same_ground(evidence, monkeypatch):
    fine, load = lit_cells(evidence)
    monkeypatch.setattr("causticload.output.memo.model3d.MOST_CELLS", len(fine) // 5)
    coarse, most = lit_cells(evidence)
    assert len(coarse) < 0.4 * len(fine)
    assert most.max() == load.max()
    assert coarse.reshape(-1, 3).min(axis=0) == pytest.approx(fine.reshape(-1, 3).min(axis=0))
    assert coarse.reshape(-1, 3).max(axis=0) == pytest.approx(fine.reshape(-1, 3).max(axis=0))
