"""Put a memo together from a result folder."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from datetime import UTC, datetime
from zoneinfo import ZoneInfo

from causticload.output import words
from causticload.output.memo import phrases
from causticload.output.memo.back import appendix, cautions, limits, mitigation
from causticload.output.memo.blocks import Block, Memo, Note, Text, ref
from causticload.output.memo.evidence import Evidence
from causticload.output.memo.findings import Finding, gather, peak_of
from causticload.output.memo.front import geometry, method, purpose, sources, when
from causticload.output.memo.results import all_findings, none_over, observers, overview, the_year


def compose(evidence: Evidence, *, now: datetime) -> Memo:
    """Write the memo of a year.

    Parameters
    ----------
    evidence : Evidence
        The year.
    now : datetime
        When the memo is written, with its offset.

    Returns
    -------
    memo : Memo
        Complete; its figures are drawn when a writer asks.
    """
    findings = gather(evidence.year)
    s = evidence.summary
    return Memo(
        title=phrases.TITLE,
        subtitle=phrases.SUBTITLE.format(title=s["title"]),
        facts=title_block(evidence, now=now),
        summary=tuple(_glance(evidence, findings)),
        blocks=(
            *purpose(evidence),
            *geometry(evidence),
            *sources(evidence),
            *method(evidence),
            *the_year(evidence, findings),
            *all_findings(evidence, findings),
            *observers(evidence),
            *none_over(evidence),
            *mitigation(findings),
            *limits(evidence),
            *cautions(evidence),
            *appendix(evidence),
        ),
        footer=phrases.FOOTER.format(title=s["title"]),
    )


def title_block(evidence: Evidence, *, now: datetime) -> tuple[tuple[str, str], ...]:
    """Rows of the title block; what only people know is left to be filled in.

    Parameters
    ----------
    evidence : Evidence
        The year.
    now : datetime
        When the memo is written.

    Returns
    -------
    rows : tuple of (str, str)
        Name and text.
    """
    s, site = evidence.summary, evidence.summary["site"]
    return (
        (phrases.PROJECT, s["title"]),
        (phrases.CLIENT, phrases.TO_FILL),
        (
            phrases.SITE,
            phrases.SITE_FACTS.format(
                lat=phrases.angle(site["latitude"], "N", "S"),
                lon=phrases.angle(site["longitude"], "E", "W"),
                h=site["elevation"],
                zone=site["timezone"],
            ),
        ),
        (phrases.YEAR, str(s["year"]["year"])),
        (phrases.REFERENCE, phrases.TO_FILL),
        (phrases.AUTHOR, phrases.TO_FILL),
        (phrases.CHECKER, phrases.TO_FILL),
        (phrases.ANALYSED, phrases.long_time(_analysed(evidence))),
        (phrases.WRITTEN, phrases.long_time(now)),
        (phrases.PROGRAM, f"{s['program']['name']} {s['program']['version']}"),
    )


def _analysed(evidence: Evidence) -> datetime:
    """When the year's folder was finished, on the site's clock."""
    told = evidence.summary.get("finished")
    zone = ZoneInfo(evidence.zone)
    if told:
        return datetime.fromisoformat(told).astimezone(zone)
    seconds = (evidence.folder / "summary.json").stat().st_mtime
    return datetime.fromtimestamp(seconds, UTC).astimezone(zone)


def _glance(evidence: Evidence, findings: Sequence[Finding]) -> Iterator[Block]:
    if not findings:
        yield Note(words.NO_EXCEEDANCE)
        yield Text(
            phrases.GLANCE_NONE.format(sources=ref("sec-sources"), criteria=ref("tab-criteria"))
        )
        return
    n = phrases.PLACES.get(len(findings), phrases.PLACES_MANY.format(n=len(findings)))
    checked = [f for f in findings if f.looked_at is not None]
    if checked:
        top = max(checked, key=lambda f: peak_of(f.main).reflected)
        peak = peak_of(top.main)
        yield Text(
            phrases.GLANCE_SOME.format(
                n=n,
                load=words.load(peak.reflected),
                receiver=top.receiver,
                when=when(peak.time, evidence.zone),
            )
        )
    else:
        yield Text(phrases.GLANCE_UNCHECKED.format(n=n))
    yield overview(evidence, findings)
    yield Note(phrases.DECIDES)
