"""The page of a memo that tells what a change of design did."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING

import matplotlib as mpl
import numpy as np
from matplotlib.figure import Figure

from causticload.output.colours import CHANGE_MAP, round_end
from causticload.output.memo import phrases
from causticload.output.memo.blocks import Block, Memo, Note, Picture, Table, Text
from causticload.output.memo.drawings import Drawings
from causticload.output.memo.figures.plans import flat_receivers, plan_map
from causticload.output.memo.front import columns
from causticload.output.memo.write import available_formats, write_one

if TYPE_CHECKING:
    from causticload.output.compare import Change, Comparison


def write_change_memo(
    comparison: Comparison, folder: Path, *, now: datetime | None = None
) -> list[Path]:
    """Write the page of a comparison in each format that can be written here.

    Parameters
    ----------
    comparison : Comparison
        The comparison.
    folder : Path
        Where to.
    now : datetime, optional
        Time stamp; the clock's if it is not given.

    Returns
    -------
    paths : list of Path
        The files.
    """
    stamp = now if now is not None else datetime.now().astimezone()
    memo = compose_change(comparison, now=stamp)
    drawings = Drawings(folder / "figures")
    return [
        write_one(memo, drawings, folder / f"comparison.{name}", now=stamp)
        for name in available_formats()
    ]


def compose_change(comparison: Comparison, *, now: datetime) -> Memo:
    """Write the page of a comparison.

    Parameters
    ----------
    comparison : Comparison
        The comparison.
    now : datetime
        When it is written.

    Returns
    -------
    memo : Memo
        About a page.
    """
    before, after = (e.summary["title"] for e in (comparison.before, comparison.after))
    return Memo(
        title=phrases.COMPARE_TITLE,
        subtitle=phrases.COMPARE_SUBTITLE.format(before=before, after=after),
        facts=(
            (phrases.BEFORE, f"{before} ({comparison.before.folder.resolve().name})"),
            (phrases.AFTER, f"{after} ({comparison.after.folder.resolve().name})"),
            (phrases.WRITTEN, phrases.long_time(now)),
        ),
        summary=tuple(_blocks(comparison)),
        blocks=(),
        footer=phrases.FOOTER.format(title=after),
    )


def _blocks(comparison: Comparison) -> Iterator[Block]:
    changes = comparison.changes
    if not changes:
        yield Note(phrases.COMPARE_NONE)
    else:
        yield Text(count_text(comparison))
    if comparison.settings:
        yield Note(phrases.COMPARE_DIFFERS.format(what=", ".join(comparison.settings)))
    if changes:
        yield Table(
            "tab-changes",
            phrases.COMPARE_CAPTION,
            columns(
                phrases.COMPARE_COLUMNS,
                (1.5, 1.5, 0.9, 1.0, 0.9, 0.8, 0.7, 1.2, 0.7),
                (3, 4, 5, 6, 7, 8),
            ),
            tuple(_row(c) for c in changes),
        )
    flat = [r for r in flat_receivers(comparison.before) if r.name in comparison.loads]
    if flat:
        yield Picture(
            "fig-change",
            phrases.COMPARE_FIGURE,
            phrases.CHANGES,
            lambda: change_plan(comparison),
        )
        if comparison.unlike:
            yield Text(phrases.COMPARE_PART.format(names=", ".join(comparison.unlike)))
    else:
        yield Text(phrases.COMPARE_NO_MESH)
    yield Note(phrases.DECIDES)


def count_text(comparison: Comparison) -> str:
    """Say how many findings are gone, better, as before, worse and new.

    Parameters
    ----------
    comparison : Comparison
        The comparison.

    Returns
    -------
    text : str
        With the rule that was used.
    """
    from causticload.output.compare import ORDER, PART

    counts = {fate: sum(c.fate == fate for c in comparison.changes) for fate in ORDER}
    return phrases.COMPARE_TEXT.format(
        all=sum(c.before is not None for c in comparison.changes), part=100.0 * PART, **counts
    )


def _row(c: Change) -> tuple[str, ...]:
    figures: list[str] = []
    shown = ((",.0f", 1.0, "peak"), (".0f", 1.0, "days"), (".1f", 60.0, "place_minutes"))
    for form, per, name in shown:
        for side in (c.before, c.after):
            figures.append("" if side is None else format(getattr(side, name) / per, form))
    return (c.receiver, c.criterion, phrases.FATES[c.fate], *figures)


def change_plan(comparison: Comparison) -> Figure:
    """Draw the change of the year's peak reflected load on surfaces that lie.

    Parameters
    ----------
    comparison : Comparison
        With at least one such receiver in both runs.

    Returns
    -------
    figure : Figure
        A plan.
    """
    flat = [r for r in flat_receivers(comparison.before) if r.name in comparison.loads]
    values = [comparison.loads[r.name] for r in flat]
    every = np.abs(np.concatenate(values))
    end = round_end(float(np.percentile(every[every > 0.0], 99.7)) if every.any() else 1.0)
    norm = mpl.colors.Normalize(-end, end)
    extend = "both" if every.max(initial=0.0) > end else "neither"
    return plan_map(
        comparison.before,
        flat,
        values,
        norm,
        phrases.COMPARE_LABEL,
        cmap=f"{CHANGE_MAP}_r",
        extend=extend,
    )
