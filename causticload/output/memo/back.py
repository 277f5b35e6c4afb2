"""The end of a memo: what would help, what the study cannot know, cautions, how to repeat it."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace

import numpy as np

from causticload.hazard.findings import Episode
from causticload.output import words
from causticload.output.memo import phrases
from causticload.output.memo.blocks import (
    Block,
    Bullets,
    Heading,
    Listing,
    Note,
    Table,
    Text,
    ref,
)
from causticload.output.memo.evidence import Evidence
from causticload.output.memo.findings import Finding, Need, need_of
from causticload.output.memo.front import columns, versions, when


def mitigation(findings: Sequence[Finding]) -> Iterator[Block]:
    """Tell what each set of panels would need.

    Parameters
    ----------
    findings : sequence of Finding
        What was found.

    Yields
    ------
    block : Block
        A section.
    """
    yield Heading(1, phrases.MITIGATION, "sec-mitigation")
    if not findings:
        yield Text(phrases.MITIGATION_NONE)
        return
    yield Text(phrases.MITIGATION_TEXT.format(table=ref("tab-mitigation")))
    yield Table(
        "tab-mitigation",
        phrases.MITIGATION_CAPTION,
        columns(phrases.MITIGATION_COLUMNS, (0.5, 1.8, 1.2, 1.2, 1.0, 1.4, 1.0), (0,)),
        tuple(row for f in findings for row in _rows(f)),
    )
    yield Bullets(tuple(t.format(focal=ref("sec-geometry")) for t in phrases.MITIGATION_OPTIONS))


def _rows(f: Finding) -> Iterator[tuple[str, ...]]:
    ends = (f.limits[-1], f.limits[0]) if len(f.limits) > 1 else (f.limits[0],)
    for facts in ends:
        limit = facts.criterion["limit"]
        need = need_of(_against(f.main, limit))
        yield (
            str(f.number),
            f"{facts.criterion['name']} ({limit:,.0f} W/m²)",
            words.load(_reflected(f.main)),
            *_told(need),
        )


def _against(episode: Episode, limit: float) -> Episode:
    """The same episode held against another limit."""
    return replace(episode, limit=limit)


def _reflected(episode: Episode) -> float:
    return episode.check.reflected if episode.check is not None else episode.reflected


def _told(need: Need) -> tuple[str, ...]:
    if need.allowed <= 0.0:
        return (phrases.CANNOT, "", "", "")
    panels = (
        phrases.OF_PANELS.format(n=need.panels, of=need.of_panels)
        if need.of_panels
        else phrases.NOT_TRACED
    )
    turn = phrases.TURNED.format(mrad=1000.0 * need.turn) if np.isfinite(need.turn) else ""
    return (words.load(need.allowed), f"{need.keep:.2f}", panels, turn)


def limits(evidence: Evidence) -> Iterator[Block]:
    """Say what the study cannot know.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Yields
    ------
    block : Block
        A section.
    """
    year = evidence.summary["year"]
    yield Heading(1, phrases.LIMITS, "sec-limits")
    told = {
        "glass": ref("sec-glass"),
        "stride": year["day_stride"],
        "step": year["step_minutes"],
    }
    yield Bullets(tuple(t.format(**told) for t in phrases.LIMITS_ITEMS))
    faults = evidence.summary["scene"]["faults"]
    if faults:
        yield Text(phrases.FAULTS_INTRO)
        yield Bullets(tuple(f["message"] for f in faults))


def cautions(evidence: Evidence) -> Iterator[Block]:
    """Repeat the cautions, and who decides.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Yields
    ------
    block : Block
        A section.
    """
    yield Heading(1, phrases.CAUTIONS, "sec-cautions")
    yield Note(phrases.DECIDES)
    yield Bullets(tuple(evidence.summary["cautions"]))


def appendix(evidence: Evidence) -> Iterator[Block]:
    """Give what is needed to repeat the study.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Yields
    ------
    block : Block
        A section.
    """
    s = evidence.summary
    yield Heading(1, phrases.APPENDIX, "sec-appendix")
    yield Text(phrases.REPEAT[0])
    study = next((n for n in s["inputs_sha256"] if n.endswith(".toml")), "study.toml")
    yield Listing(phrases.REPEAT[1].format(study=study, folder=evidence.folder.resolve().name))
    yield Text(phrases.DURATION.format(seconds=s["seconds"]))
    yield Heading(2, phrases.INPUTS, "sec-inputs")
    yield Table(
        "tab-inputs",
        phrases.INPUTS_CAPTION,
        columns(phrases.INPUTS_COLUMNS, (1.0, 3.0)),
        tuple(s["inputs_sha256"].items()),
    )
    yield Heading(2, phrases.VERSIONS, "sec-versions")
    yield Table(
        "tab-versions",
        phrases.VERSIONS_CAPTION,
        columns(phrases.VERSIONS_COLUMNS, (1.0, 2.0)),
        versions(evidence),
    )
    yield Heading(2, phrases.COUNTS, "sec-counts")
    checked = [e for e in evidence.year.episodes if e.check is not None]
    if checked:
        yield _count_table(evidence, checked)
    else:
        yield Text(phrases.NOT_ASSESSED)
    yield Heading(2, phrases.SETTINGS, "sec-settings")
    yield Text(phrases.SETTINGS_TEXT)
    yield Listing((evidence.folder / "study.toml").read_text(encoding="utf-8").rstrip())


def _count_table(evidence: Evidence, checked: Sequence[Episode]) -> Table:
    rows = []
    for e in checked:
        c = e.check
        if c is None:
            continue
        rows.append(
            (
                str(e.number),
                e.receiver,
                f"{c.reflected:,.0f}",
                when(c.time, evidence.zone),
                f"{1000.0 * c.disc_radius:.0f}",
                f"{c.disc_mean:,.0f}",
                f"{c.count_mean:,.0f} ± {c.count_error:,.0f}",
                phrases.YES if c.agrees else phrases.NO,
            )
        )
    return Table(
        "tab-counts",
        phrases.COUNTS_CAPTION,
        columns(phrases.COUNTS_COLUMNS, (0.8, 1.2, 0.9, 1.9, 0.7, 0.9, 1.3, 0.7), (0, 2, 4, 5, 6)),
        tuple(rows),
    )
