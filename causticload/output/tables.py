"""Tables of findings as plain CSV, with the caution in a column of its own."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Sequence
from typing import Any

from causticload.hazard.cautions import GENERAL
from causticload.output import words
from causticload.output.results import Year


def _csv(header: Sequence[str], rows: Iterable[Sequence[Any]]) -> str:
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(header)
    writer.writerows(rows)
    return out.getvalue()


def _utc(time: Any) -> str:
    return f"{time.astype('datetime64[s]')}Z"


def episodes_csv(year: Year) -> str:
    """List every episode, worst first.

    Parameters
    ----------
    year : Year
        The year.

    Returns
    -------
    text : str
        CSV.
    """
    zone = year.study.site.timezone
    header = (
        "episode",
        "season",
        "criterion",
        "protects",
        "receiver",
        "day",
        "mirror_day",
        "stands_for_days",
        "start_local",
        "end_local",
        "start_utc",
        "end_utc",
        "minutes",
        "limit_W_m2",
        "grid_peak_W_m2",
        "grid_peak_reflected_W_m2",
        "grid_peak_local",
        "largest_area_m2",
        "refined_total_W_m2",
        "refined_reflected_W_m2",
        "refined_local",
        "refined_x_m",
        "refined_y_m",
        "refined_z_m",
        "images",
        "tubes_on_disc_W_m2",
        "ray_count_W_m2",
        "ray_count_standard_error_W_m2",
        "agrees",
        "panels",
        "caution",
    )
    rows = []
    for e in year.episodes:
        c = e.check
        rows.append(
            [
                e.number,
                e.season,
                e.criterion,
                e.protects,
                e.receiver,
                e.day.isoformat(),
                e.mirror_day.isoformat() if e.mirror_day else "",
                f"{e.days:g}",
                words.moment(e.start, zone),
                words.moment(e.end, zone),
                _utc(e.start),
                _utc(e.end),
                f"{e.minutes:g}",
                f"{e.limit:g}",
                f"{e.peak:.1f}",
                f"{e.reflected:.1f}",
                words.moment(e.peak_time, zone),
                f"{e.area:.3f}",
                *(
                    [
                        f"{c.total:.1f}",
                        f"{c.reflected:.1f}",
                        words.moment(c.time, zone),
                        *(f"{x:.3f}" for x in c.place),
                        c.images,
                        f"{c.disc_mean:.1f}",
                        f"{c.count_mean:.1f}",
                        f"{c.count_error:.1f}",
                        "yes" if c.agrees else "no",
                    ]
                    if c
                    else [""] * 11
                ),
                len(e.contributors) or "",
                GENERAL[0],
            ]
        )
    return _csv(header, rows)


def seasons_csv(year: Year) -> str:
    """List every season, worst first.

    Parameters
    ----------
    year : Year
        The year.

    Returns
    -------
    text : str
        CSV.
    """
    header = (
        "season",
        "criterion",
        "protects",
        "receiver",
        "days_of_year",
        "days",
        "clock_from",
        "clock_to",
        "most_minutes_per_day",
        "minutes_per_year",
        "grid_peak_W_m2",
        "worst_episode",
        "episodes",
        "caution",
    )
    rows = [
        [
            s.number,
            s.criterion,
            s.protects,
            s.receiver,
            words.spans(s),
            f"{s.days:g}",
            s.clock[0],
            s.clock[1],
            f"{s.minutes_per_day:g}",
            f"{s.minutes_per_year:g}",
            f"{s.peak:.1f}",
            s.worst,
            " ".join(map(str, s.episodes)),
            GENERAL[0],
        ]
        for s in year.seasons
    ]
    return _csv(header, rows)


def panels_csv(year: Year) -> str:
    """List the panels behind every episode whose peak was looked at closely.

    Parameters
    ----------
    year : Year
        The year.

    Returns
    -------
    text : str
        CSV.
    """
    header = (
        "episode",
        "season",
        "panel",
        "surface",
        "x_m",
        "y_m",
        "z_m",
        "load_W_m2",
        "share",
        "running_share",
        "caution",
    )
    rows = []
    for e in year.episodes:
        running = 0.0
        for c in e.contributors:
            running += c.share
            rows.append(
                [
                    e.number,
                    e.season,
                    c.panel,
                    c.surface,
                    *(f"{x:.3f}" for x in c.place),
                    f"{c.load:.3f}",
                    f"{c.share:.6f}",
                    f"{running:.6f}",
                    GENERAL[0],
                ]
            )
    return _csv(header, rows)
