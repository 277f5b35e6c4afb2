"""Charts of when: the year by day and clock, the sun's path, and the worst day."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import UTC, date, datetime, timedelta
from typing import Any
from zoneinfo import ZoneInfo

import matplotlib as mpl
import numpy as np
from matplotlib.dates import date2num
from matplotlib.figure import Figure
from numpy.typing import NDArray

from causticload.hazard.findings import Episode
from causticload.output.colours import LOAD_MAP
from causticload.output.memo.evidence import Evidence
from causticload.output.memo.figures.style import (
    INK,
    WIDTH_MM,
    colour_bar,
    load_scale,
    paper_figure,
)
from causticload.output.words import MONTHS, local
from causticload.scene.model import Bools, Floats, Ints

DAWN = "0.93"  # shade of hours in which the sun is up and nothing is lit


@dataclass(frozen=True)
class Calendar:
    """A year by day and clock. ``days`` rows, ``bins`` columns of equal length from midnight."""

    first: date
    load: Floats  # (days, bins) W/m², nan while the sun is down
    over: Bools  # (days, bins) a limit is exceeded
    minutes: float  # length of a bin


def calendar(evidence: Evidence, receivers: Sequence[str], episodes: Sequence[Episode]) -> Calendar:
    """Lay the worst reflected load of some receivers out by day and local clock.

    Days that were not solved take the nearest one that was; each keeps its own clock.

    Parameters
    ----------
    evidence : Evidence
        The year.
    receivers : sequence of str
        Their worst load is taken, at each step.
    episodes : sequence of Episode
        What counts as over a limit.

    Returns
    -------
    calendar : Calendar
        The whole year.
    """
    year = int(evidence.summary["year"]["year"])
    minutes = float(evidence.summary["year"]["step_minutes"])
    zone = ZoneInfo(evidence.zone)
    first = date(year, 1, 1)
    days = (date(year + 1, 1, 1) - first).days
    bins = int(np.ceil(1440.0 / minutes))
    load = np.full((days, bins), np.nan)
    over = np.zeros((days, bins), bool)
    rows = evidence.year.days
    at = np.array([(date.fromisoformat(r["date"]) - first).days for r in rows])
    by_row: dict[int, list[Episode]] = {}
    for e in episodes:
        for day in (e.day, e.mirror_day):
            if day is not None:
                by_row.setdefault((day - first).days, []).append(e)
    for d in range(days):
        row = int(np.argmin(np.abs(at - d)))
        source = rows[row]
        worst = np.max([source["worst"][n] for n in receivers], axis=0)
        offset = _offset(source["times"][0], zone, timedelta(days=d - int(at[row])))
        np.fmax.at(load[d], _bins(source["times"], offset, minutes, bins), worst)
        mine = by_row.get(int(at[row]), [])
        if mine:
            # An episode of the mirror day is told by the times of its own day.
            own = [timedelta(days=d - (e.day - first).days) for e in mine]
            offsets = np.array(
                [_offset(e.start, zone, shift) for e, shift in zip(mine, own, strict=True)]
            )
            begin = _bins(np.array([e.start for e in mine]), offsets, minutes, bins)
            last = np.array([e.end - np.timedelta64(1, "s") for e in mine])
            for a, b in zip(begin, _bins(last, offsets, minutes, bins), strict=True):
                over[d, a : max(b, a) + 1] = True
    return Calendar(first, load, over, minutes)


def _offset(time: np.datetime64, zone: ZoneInfo, shift: timedelta) -> int:
    """Seconds from UTC to the local clock on the day that lies ``shift`` after a time's."""
    seconds = int(time.astype("datetime64[s]").astype(np.int64))
    there = (datetime.fromtimestamp(seconds, UTC) + shift).astimezone(zone).utcoffset()
    return int(there.total_seconds()) if there is not None else 0


def _bins(times: NDArray[np.datetime64], offset: Any, minutes: float, bins: int) -> Ints:
    """Bin of the local clock for each time (UTC), with its offset in seconds."""
    seconds = times.astype("datetime64[s]").astype(np.int64) + offset
    return np.minimum((seconds % 86_400) // round(60.0 * minutes), bins - 1)


def draw_calendar(axes: Any, shown: Calendar, *, every: int = 1) -> Any:
    """Draw a year by day and clock; hours over a limit are outlined and hatched.

    Parameters
    ----------
    axes : matplotlib axes
        Empty.
    shown : Calendar
        The year.
    every : int
        Months from one label to the next.

    Returns
    -------
    image : matplotlib image
        For a colour bar.
    """
    start = float(date2num(shown.first))
    extent = (start, start + len(shown.load), 0.0, 24.0)
    load = shown.load.T
    up = np.where(np.isnan(load), np.nan, 1.0)
    axes.imshow(
        up,
        origin="lower",
        extent=extent,
        aspect="auto",
        cmap=mpl.colors.ListedColormap([DAWN]),
        interpolation="nearest",
    )
    lit = np.where(np.nan_to_num(load) > 0.0, load, np.nan)
    image = axes.imshow(
        lit,
        origin="lower",
        extent=extent,
        aspect="auto",
        cmap=LOAD_MAP,
        norm=load_scale(load)[0],
        interpolation="nearest",
    )
    if shown.over.any():
        days, bins = shown.over.shape
        x = start + np.arange(-1, days + 1) + 0.5
        y = (np.arange(-1, bins + 1) + 0.5) * shown.minutes / 60.0
        mask = np.pad(shown.over.T.astype(float), 1)
        axes.contourf(x, y, mask, [0.5, 1.5], colors="none", hatches=["////"])
        axes.contour(x, y, mask, [0.5], colors="white", linewidths=1.4)
        axes.contour(x, y, mask, [0.5], colors="black", linewidths=0.6)
    sunny = np.flatnonzero(np.isfinite(shown.load).any(axis=0))
    if len(sunny):
        axes.set_ylim(
            max(0.0, np.floor(sunny[0] * shown.minutes / 60.0)),
            min(24.0, np.ceil((sunny[-1] + 1) * shown.minutes / 60.0)),
        )
    axes.set_xlim(extent[0], extent[1])
    months = [date(shown.first.year, m, 1) for m in range(1, 13)]
    axes.set_xticks([float(date2num(m)) for m in months])
    names = [MONTHS[m.month - 1][:3] if (m.month - 1) % every == 0 else "" for m in months]
    axes.set_xticklabels(names, ha="left")
    axes.set_xlabel(f"day of the year {shown.first.year}")
    axes.set_ylabel("local clock time (h)")
    axes.yaxis.set_major_locator(mpl.ticker.MultipleLocator(2))
    return image


def year_chart(evidence: Evidence) -> Figure:
    """Draw the worst reflected load on any receiver by day and clock.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Returns
    -------
    figure : Figure
        A chart.
    """
    figure = paper_figure(WIDTH_MM, 80.0)
    axes = figure.subplots()
    names = list(evidence.year.receivers)
    shown = calendar(evidence, names, evidence.year.episodes)
    image = draw_calendar(axes, shown)
    extend = load_scale(shown.load)[1]
    colour_bar(figure, image, axes, "worst reflected load (W/m²)", extend=extend)
    return figure


def sun_path(evidence: Evidence) -> Figure:
    """Draw where the sun stands when something is over a limit.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Returns
    -------
    figure : Figure
        Azimuth by elevation.
    """
    figure = paper_figure(WIDTH_MM, 90.0)
    axes = figure.subplots()
    rows = evidence.year.days
    azimuth, elevation, load, over = [], [], [], []
    by_day: dict[date, list[Episode]] = {}
    for e in evidence.year.episodes:
        by_day.setdefault(e.day, []).append(e)
    for row in rows:
        worst = np.max(list(row["worst"].values()), axis=0)
        hot = np.zeros(len(worst), bool)
        for e in by_day.get(date.fromisoformat(row["date"]), []):
            hot |= (row["times"] >= e.start) & (row["times"] < e.end)
        azimuth.append(row["azimuth"])
        elevation.append(row["elevation"])
        load.append(worst)
        over.append(hot)
    a, up, w, hot = (np.concatenate(v) for v in (azimuth, elevation, load, over))
    south = evidence.year.study.site.latitude < 0.0
    a = _unwrapped(a, south=south)
    axes.scatter(a, up, s=1.5, color="0.82", rasterized=True, linewidths=0)
    order = np.argsort(w, kind="stable")
    order = order[hot[order]]
    norm, extend = load_scale(w[order])
    dots = axes.scatter(
        a[order],
        up[order],
        c=w[order],
        s=5.0,
        cmap=LOAD_MAP,
        norm=norm,
        rasterized=True,
        linewidths=0,
    )
    _dates(axes, evidence, south=south)
    label = "worst reflected load while over a limit (W/m²)"
    colour_bar(figure, dots, axes, label, extend=extend)
    axes.set_xlabel("azimuth of the sun, clockwise from true north (degrees)")
    axes.set_ylabel("elevation of the sun (degrees)")
    axes.set_ylim(0.0, min(90.0, float(np.ceil(up.max() / 10.0) * 10.0 + 5.0)))
    axes.xaxis.set_major_locator(mpl.ticker.MultipleLocator(30))
    axes.xaxis.set_major_formatter(lambda x, _: f"{x % 360:.0f}")
    return figure


def _unwrapped(azimuth: Floats, *, south: bool) -> Floats:
    """Azimuths on an axis that is not cut where the sun stands at noon."""
    return np.where(azimuth > 180.0, azimuth - 360.0, azimuth) if south else azimuth


def _dates(axes: Any, evidence: Evidence, *, south: bool) -> None:
    """Lines of three days of the year with the hours of the clock on them."""
    year = int(evidence.summary["year"]["year"])
    rows = evidence.year.days
    dates = [date.fromisoformat(r["date"]) for r in rows]
    for wanted in (date(year, 6, 21), date(year, 3, 21), date(year, 12, 21)):
        k = min(range(len(rows)), key=lambda i: abs((dates[i] - wanted).days))
        row = rows[k]
        order = np.argsort(row["times"])
        a = _unwrapped(row["azimuth"][order], south=south)
        e = row["elevation"][order]
        axes.plot(a, e, color=INK, linewidth=0.7)
        clock = [local(t, evidence.zone) for t in row["times"][order]]
        for i in range(1, len(clock)):
            if clock[i].hour != clock[i - 1].hour and clock[i].hour % 2 == 0:
                axes.plot(a[i], e[i], ".", color=INK, markersize=3)
                axes.annotate(
                    f"{clock[i].hour:02d} h",
                    (a[i], e[i]),
                    xytext=(0, 3),
                    textcoords="offset points",
                    ha="center",
                    fontsize=5.5,
                )
        axes.annotate(
            f"{dates[k].day} {MONTHS[dates[k].month - 1]}",
            (a[-1], e[-1]),
            xytext=(3, 0),
            textcoords="offset points",
            fontsize=6.0,
        )


def draw_day(axes: Any, evidence: Evidence, receiver: str, episode: Episode) -> None:
    """Draw the worst load on a receiver through the day of an episode.

    Parameters
    ----------
    axes : matplotlib axes
        Empty.
    evidence : Evidence
        The year.
    receiver : str
        The receiver.
    episode : Episode
        The day, the limit and the path of the peak.
    """
    row = next((r for r in evidence.year.days if r["date"] == episode.day.isoformat()), None)
    if row is not None:
        hour = [_hour(t, evidence.zone) for t in row["times"]]
        axes.step(
            hour,
            row["worst"][receiver],
            where="mid",
            color="0.45",
            linewidth=0.8,
            label="reflected, largest anywhere on it",
        )
    steps = sorted({s.time for s in episode.path})
    peaks = [max(s.peak for s in episode.path if s.time == t) for t in steps]
    axes.plot(
        [_hour(t, evidence.zone) for t in steps],
        peaks,
        ".-",
        color=INK,
        markersize=3.0,
        label="of the limit's quantity, this episode",
    )
    axes.axhline(episode.limit, color=INK, linestyle="--", linewidth=0.8)
    axes.annotate(
        f"limit {episode.limit:,.0f}",
        (0.01, episode.limit),
        xycoords=("axes fraction", "data"),
        xytext=(0, 2),
        textcoords="offset points",
        fontsize=6.0,
    )
    if episode.check is not None:
        top = episode.check.total if max(peaks) > episode.reflected * (1 + 1e-9) else None
        value = episode.check.reflected if top is None else top
        axes.plot(
            _hour(episode.check.time, evidence.zone),
            value,
            marker="D",
            mfc="white",
            color=INK,
            markersize=4.5,
            linestyle="none",
            label="looked at closely",
        )
    axes.set_xlabel(f"local clock time on {episode.day.day} {MONTHS[episode.day.month - 1]} (h)")
    axes.set_ylabel("load (W/m²)")
    axes.set_ylim(bottom=0.0)
    axes.xaxis.set_major_locator(mpl.ticker.MaxNLocator(integer=True))
    axes.legend(fontsize=6.0, loc="best", framealpha=0.85)
    low, high = axes.get_ylim()
    axes.set_ylim(low, 1.35 * high)


def _hour(time: np.datetime64, zone: str) -> float:
    t = local(time, zone)
    return t.hour + t.minute / 60.0 + t.second / 3600.0


def temperature_chart(
    time: NDArray[np.datetime64], lines: Mapping[str, Floats], zone: str
) -> Figure:
    """Draw histories of a temperature.

    Parameters
    ----------
    time : (n,) datetime64
        UTC.
    lines : mapping of str to (n,) float
        Name of each line and its temperatures. [°C]
    zone : str
        IANA time zone.

    Returns
    -------
    figure : Figure
        A chart.
    """
    figure = paper_figure(WIDTH_MM, 60.0)
    axes = figure.subplots()
    hours = [_hour(t, zone) for t in time]
    for (name, values), style in zip(lines.items(), ("-", "--"), strict=True):
        axes.plot(hours, values, style, color=INK, label=name)
    axes.set_xlabel("local clock time (h)")
    axes.set_ylabel("surface temperature (°C)")
    axes.legend(fontsize=6.5)
    return figure
