"""The figure of a finding: where it is, what stands behind it, when it comes, how a day goes."""

from __future__ import annotations

from typing import Any

import numpy as np
from matplotlib.figure import Figure

from causticload.output.memo.evidence import Evidence
from causticload.output.memo.figures.charts import calendar, draw_calendar, draw_day
from causticload.output.memo.figures.plans import spot_crop
from causticload.output.memo.figures.style import WIDTH_MM, colour_bar, paper_figure
from causticload.output.memo.figures.views import spot_view
from causticload.output.memo.findings import Finding, peak_of


def finding_figure(evidence: Evidence, finding: Finding) -> Figure:
    """Draw a finding in four parts.

    Parameters
    ----------
    evidence : Evidence
        The year.
    finding : Finding
        One of the year's.

    Returns
    -------
    figure : Figure
        Parts a to d.
    """
    figure = paper_figure(WIDTH_MM, 98.0)
    (where, behind), (when, day) = figure.subplots(2, 2)
    episode = finding.main
    place = np.array(peak_of(episode).place)
    levels = sorted({f.criterion["limit"] for f in finding.limits})
    image = spot_crop(where, evidence, finding.receiver, place, levels)
    bar: dict[str, Any] = {"shrink": 0.95, "aspect": 25}
    colour_bar(figure, image, where, "peak of the year (W/m²)", **bar)
    where.set_title("a  where")
    scale = spot_view(behind, evidence, episode)
    if scale is not None:
        colour_bar(figure, scale, behind, "load by the panel (W/m²)", **bar)
    behind.set_title("b  seen from the spot")
    mine = [e for e in evidence.year.episodes if e.season in set(finding.seasons)]
    shown = calendar(evidence, [finding.receiver], mine)
    image = draw_calendar(when, shown, every=2)
    colour_bar(figure, image, when, "worst load (W/m²)", **bar)
    when.set_title("c  when")
    draw_day(day, evidence, finding.receiver, episode)
    day.set_title("d  the day of the peak")
    return figure
