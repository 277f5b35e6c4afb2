"""The middle of a memo: the year as a whole, each finding, observers, and what was not exceeded."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

import numpy as np

from causticload.hazard.cautions import EYES
from causticload.hazard.eyes import EYE_CLASS_WORDS, EyeClass
from causticload.hazard.findings import Episode, ObserverFinding
from causticload.output import words
from causticload.output.memo import phrases
from causticload.output.memo.blocks import (
    Block,
    Bullets,
    Heading,
    Note,
    Picture,
    Table,
    Text,
    ref,
)
from causticload.output.memo.evidence import Evidence
from causticload.output.memo.figures.charts import sun_path, temperature_chart, year_chart
from causticload.output.memo.figures.facade_maps import contribution_map
from causticload.output.memo.figures.finding import finding_figure
from causticload.output.memo.figures.plans import flat_receivers, hours_plan, image_plan, load_plan
from causticload.output.memo.findings import (
    Finding,
    LimitFacts,
    Peak,
    Span,
    extras_of,
    is_total,
    need_of,
    peak_of,
    without_exceedance,
)
from causticload.output.memo.front import columns, limit_text, when
from causticload.output.memo.sureness import grid_is_doubtful, sureness

MOST_SPANS = 3
MOST_PANELS = 5


def the_year(evidence: Evidence, findings: Sequence[Finding]) -> Iterator[Block]:
    """Show the year as a whole.

    Parameters
    ----------
    evidence : Evidence
        The year.
    findings : sequence of Finding
        What was found.

    Yields
    ------
    block : Block
        A section.
    """
    yield Heading(1, phrases.YEAR_SECTION, "sec-year")
    yield _receiver_table(evidence)
    if flat_receivers(evidence):
        yield Picture(
            "fig-load-plan", phrases.LOAD_PLAN, phrases.YEAR_SECTION, lambda: load_plan(evidence)
        )
        criterion = _criterion_for_plan(evidence, findings)
        if criterion is not None:
            name = criterion["name"]
            yield Picture(
                "fig-hours-plan",
                phrases.HOURS_PLAN.format(criterion=name, limit=limit_text(criterion)),
                phrases.YEAR_SECTION,
                lambda: hours_plan(evidence, name),
            )
        yield Picture(
            "fig-image-plan", phrases.IMAGE_PLAN, phrases.YEAR_SECTION, lambda: image_plan(evidence)
        )
    yield Picture(
        "fig-year", phrases.YEAR_CHART, phrases.YEAR_SECTION, lambda: year_chart(evidence)
    )
    yield Picture("fig-sun", phrases.SUN_PATH, phrases.YEAR_SECTION, lambda: sun_path(evidence))
    traced = next((e for e in evidence.year.episodes if e.contributors), None)
    if traced is not None:
        yield Picture(
            "fig-contribution",
            phrases.CONTRIBUTION_MAP.format(
                episode=traced.number, receiver=traced.receiver, unrolled=phrases.UNROLLED
            ),
            phrases.YEAR_SECTION,
            lambda: contribution_map(evidence),
        )


def _criterion_for_plan(evidence: Evidence, findings: Sequence[Finding]) -> dict[str, Any] | None:
    flat = {r.name for r in flat_receivers(evidence)}
    for finding in findings:
        if finding.receiver in flat:
            return finding.limits[0].criterion
    return None


def _receiver_table(evidence: Evidence) -> Table:
    rows = sorted(evidence.summary["receivers"], key=lambda r: -r["peak_reflected_W_m2"])
    return Table(
        "tab-receivers",
        phrases.RECEIVERS_CAPTION,
        columns(phrases.RECEIVERS_COLUMNS, (1.6, 1.0, 1.0, 1.1, 2.3, 0.8, 1.1), (2, 3, 5, 6)),
        tuple(
            (
                r["name"],
                r["kind"],
                f"{r['area_m2']:,.0f}",
                f"{r['peak_reflected_W_m2']:,.0f}",
                _utc(r["peak_time"], evidence.zone),
                str(r["most_images"]),
                f"{r['energy_MJ']:,.0f}",
            )
            for r in rows
        ),
    )


def _utc(text: str | None, zone: str) -> str:
    return when(np.datetime64(text.rstrip("Z")), zone) if text else ""


def span_text(spans: Sequence[Span]) -> str:
    """Write runs of days, the first few of them.

    Parameters
    ----------
    spans : sequence of (date, date)
        In order.

    Returns
    -------
    text : str
        Like ``19 February to 21 March, 4 September``.
    """
    told = "; ".join(words.span(a, b) for a, b in spans[:MOST_SPANS])
    rest = len(spans) - MOST_SPANS
    return told + (phrases.MORE_SPANS.format(n=rest) if rest > 0 else "")


def clock_text(clock: tuple[str, str]) -> str:
    """Write hours of the clock.

    Parameters
    ----------
    clock : (str, str)
        First and last, "HH:MM".

    Returns
    -------
    text : str
        Like ``14:10 to 14:50``.
    """
    return f"{clock[0]} to {clock[1]}"


def overview(evidence: Evidence, findings: Sequence[Finding]) -> Table:
    """List the findings.

    Parameters
    ----------
    evidence : Evidence
        The year.
    findings : sequence of Finding
        At least one.

    Returns
    -------
    table : Table
        A row each.
    """
    return Table(
        "tab-overview",
        phrases.OVERVIEW_CAPTION,
        columns(phrases.OVERVIEW_COLUMNS, (0.5, 1.6, 1.2, 0.7, 1.4, 1.4, 1.1), (0, 3)),
        tuple(
            (
                str(f.number),
                f.receiver,
                phrases.WHO[f.protects],
                f"{f.limits[0].days:.0f}",
                clock_text(f.limits[0].clock),
                words.load(peak_of(f.main).value),
                sureness(evidence, f)[0],
            )
            for f in findings
        ),
    )


def all_findings(evidence: Evidence, findings: Sequence[Finding]) -> Iterator[Block]:
    """Tell each finding.

    Parameters
    ----------
    evidence : Evidence
        The year.
    findings : sequence of Finding
        What was found.

    Yields
    ------
    block : Block
        A section.
    """
    yield Heading(1, phrases.FINDINGS, "sec-findings", roomy=bool(findings))
    if not findings:
        yield Note(words.NO_EXCEEDANCE)
        return
    for finding in findings:
        yield from one_finding(evidence, finding)


def one_finding(evidence: Evidence, finding: Finding) -> Iterator[Block]:
    """Tell one finding: when, how strong, how long, who, which panels, how sure.

    Parameters
    ----------
    evidence : Evidence
        The year.
    finding : Finding
        It.

    Yields
    ------
    block : Block
        A part of a section.
    """
    f, e = finding, finding.main
    title = phrases.FINDING.format(n=f.number, receiver=f.receiver, whom=phrases.WHO[f.protects])
    yield Heading(2, title, f"sec-finding-{f.number}", roomy=True)
    yield Table(
        f"tab-finding-{f.number}",
        phrases.LIMIT_CAPTION.format(receiver=f.receiver),
        columns(phrases.LIMIT_COLUMNS, (1.7, 0.7, 2.2, 1.1, 1.0, 1.3, 0.9), (1, 4, 6)),
        tuple(_limit_row(facts) for facts in f.limits),
    )
    yield Bullets(tuple(_facts(evidence, f)))
    if e.check is not None and not e.check.agrees:
        yield Note(_count_text(e))
    caption = phrases.FINDING_FIGURE if e.contributors else phrases.FINDING_FIGURE_PLAIN
    yield Picture(
        f"fig-finding-{f.number}",
        caption.format(receiver=f.receiver),
        title,
        lambda: finding_figure(evidence, f),
    )
    if e.contributors:
        yield _contributor_table(f)
    yield from _temperature(evidence, f)


def _limit_row(facts: LimitFacts) -> tuple[str, ...]:
    c = facts.criterion
    return (
        f"{c['name']}: {limit_text(c)}",
        f"{facts.days:.0f}",
        span_text(facts.spans),
        clock_text(facts.clock),
        f"{facts.minutes_per_day:.0f}",
        f"{facts.place_minutes_per_day:.0f}; {facts.place_minutes_per_year / 60.0:.1f}",
        f"{facts.area:,.1f}",
    )


def _facts(evidence: Evidence, f: Finding) -> Iterator[str]:
    e = f.main
    peak = peak_of(e)
    quantity = "total irradiance" if is_total(e) else "reflected irradiance"
    told = {
        "load": words.load(peak.value),
        "quantity": quantity,
        "reflected": words.load(peak.reflected),
        "place": phrases.place(peak.place),
        "when": when(peak.time, evidence.zone),
    }
    if e.check is None:
        yield phrases.PEAK_GRID.format(**told)
    else:
        n = e.check.images
        yield phrases.PEAK_CHECKED.format(
            **told,
            azimuth=e.check.sun_azimuth,
            elevation=e.check.sun_elevation,
            images=phrases.IMAGES.get(n, phrases.IMAGES_MANY.format(n=n)),
            are="is" if n == 1 else "are",
            width=e.check.width,
        )
        low, high = e.check.reflected_low, e.check.reflected_high
        if low is not None and high is not None and high > low:
            yield phrases.PEAK_RANGE.format(low=words.load(low), high=words.load(high))
        if e.check.agrees:
            yield _count_text(e)
    yield from _grid_doubts(evidence, f, peak)
    yield phrases.WHO_LINE.format(
        text=phrases.EXPOSED.get((f.protects, f.kind), phrases.EXPOSED_ELSE[f.protects])
    )
    extras = extras_of(evidence.year, f)
    for key, text in (("skin", phrases.SKIN_LINE), ("surface", phrases.SURFACE_LINE)):
        if extras.get(key):
            yield text.format(text=extras[key]["text"])
    yield _panels_line(f)
    if extras.get("least_panels"):
        yield phrases.LEAST_PANELS.format(text=extras["least_panels"]["text"])
    level, reasons = sureness(evidence, f)
    yield phrases.CONFIDENCE_LINE.format(level=level, reasons=" ".join(reasons))


def _grid_doubts(evidence: Evidence, f: Finding, peak: Peak) -> Iterator[str]:
    e = f.main
    if grid_is_doubtful(f):
        yield phrases.GRID_DIFFERS.format(grid=words.load(e.peak), close=words.load(peak.value))
    if f.worst.number != e.number and f.worst.peak > peak.value:
        top = max(f.worst.path, key=lambda s: s.peak)
        yield phrases.GRID_HIGHER.format(
            load=words.load(f.worst.peak),
            place=phrases.place(top.place),
            when=when(top.time, evidence.zone),
            episode=f.worst.number,
        )


def _count_text(e: Episode) -> str:
    c = e.check
    if c is None:
        return ""
    text = phrases.COUNT_AGREES if c.agrees else phrases.COUNT_DISAGREES
    return text.format(
        radius=1000.0 * c.disc_radius,
        tubes=c.disc_mean,
        rays=c.rays,
        count=c.count_mean,
        error=c.count_error,
    )


def _panels_line(f: Finding) -> str:
    e = f.main
    if not e.contributors:
        return phrases.NO_PANELS
    running = np.cumsum([c.share for c in e.contributors])
    return phrases.PANELS_LINE.format(
        n=len(e.contributors),
        half=int(np.searchsorted(running, 0.5 * running[-1]) + 1),
        distance=need_of(e).distance,
        table=ref(f"tab-panels-{f.number}"),
    )


def _contributor_table(f: Finding) -> Table:
    rows, running = [], 0.0
    for c in f.main.contributors[:MOST_PANELS]:
        running += c.share
        rows.append(
            (
                str(c.panel),
                c.surface,
                ", ".join(f"{x:.1f}" for x in c.place),
                f"{c.load:,.0f}",
                f"{100.0 * c.share:.1f} %",
                f"{100.0 * running:.1f} %",
            )
        )
    return Table(
        f"tab-panels-{f.number}",
        phrases.CONTRIBUTORS_CAPTION.format(receiver=f.receiver),
        columns(phrases.CONTRIBUTOR_COLUMNS, (0.7, 1.6, 1.9, 1.0, 0.9, 1.1), (0, 3, 4, 5)),
        tuple(rows),
    )


def _temperature(evidence: Evidence, f: Finding) -> Iterator[Block]:
    history = evidence.year.histories.get(f.main.season)
    if history is None:
        return
    time = history.loads.time
    lines = {phrases.WITH_FACADE: history.surface_c, phrases.WITHOUT_FACADE: history.without_c}
    yield Picture(
        f"fig-temperature-{f.number}",
        phrases.TEMPERATURE_FIGURE.format(receiver=f.receiver),
        phrases.FINDINGS,
        lambda: temperature_chart(time, lines, evidence.zone),
    )


def observers(evidence: Evidence) -> Iterator[Block]:
    """Tell what reaches the eyes of observers, or that it was not assessed.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Yields
    ------
    block : Block
        A section.
    """
    yield Heading(1, phrases.OBSERVERS, "sec-eyes")
    rows = evidence.year.observers
    named = evidence.year.study.observers
    if not rows:
        yield Text(
            phrases.EYES_NOT_ASSESSED.format(names=", ".join(o.name for o in named))
            if named
            else phrases.EYES_NONE_GIVEN
        )
        return
    yield Text(phrases.EYES_TEXT)
    yield Table(
        "tab-eyes",
        phrases.EYES_CAPTION,
        columns(phrases.EYES_COLUMNS, (1.3, 0.9, 1.8, 1.2, 1.3, 1.0, 1.0), (1, 5, 6)),
        tuple(_observer_row(o) for o in rows),
    )
    yield Bullets(tuple(_observer_worst(o, evidence.zone) for o in rows))
    yield Note(" ".join(EYES))
    yield Bullets(phrases.EYES_SOURCES)


def _observer_row(o: ObserverFinding) -> tuple[str, ...]:
    return (
        o.name,
        f"{o.after_image_days:.0f}",
        span_text(list(o.spans)),
        clock_text(o.clock) if o.clock else "",
        f"{o.after_image_minutes:.0f}; {o.after_image_most:.0f}",
        f"{o.rogue_minutes:.0f}",
        f"{o.burn_minutes:.0f}",
    )


def _observer_worst(o: ObserverFinding, zone: str) -> str:
    w = o.worst
    if w is None:
        return phrases.EYES_NOTHING.format(name=o.name)
    said = EYE_CLASS_WORDS[EyeClass(w.eye_class)]
    return phrases.EYES_WORST.format(
        name=o.name,
        when=when(w.time, zone),
        place=phrases.place(w.place),
        images=w.images,
        off=w.angle_deg,
        cls=said[:1].upper() + said[1:],
        lux=w.illuminance,
        veil=w.veil,
        contrast=100.0 * w.contrast_left,
        retinal=w.retinal,
        limit=w.after_image_limit,
    )


def none_over(evidence: Evidence) -> Iterator[Block]:
    """List receivers and limits without exceedance.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Yields
    ------
    block : Block
        A section.
    """
    yield Heading(1, phrases.NONE_OVER, "sec-none")
    pairs = without_exceedance(evidence.year)
    if not pairs:
        yield Text(phrases.NONE_OVER_NOTHING)
        return
    yield Text(phrases.NONE_OVER_TEXT)
    yield Table(
        "tab-none",
        phrases.NONE_OVER_CAPTION,
        columns(phrases.NONE_OVER_COLUMNS, (1.4, 0.9, 1.5, 1.7, 1.3, 2.2)),
        tuple(
            (
                r["name"],
                r["kind"],
                c["name"],
                limit_text(c),
                words.load(r["peak_reflected_W_m2"]),
                _utc(r["peak_time"], evidence.zone),
            )
            for r, c in pairs
        ),
    )
