"""How sure a finding is, and why."""

from __future__ import annotations

import numpy as np

from causticload.optics.finish import Finish
from causticload.output.memo import phrases
from causticload.output.memo.evidence import Evidence
from causticload.output.memo.findings import Finding, extras_of, peak_of

RANGE_60 = 0.05  # a solar reflectance at 60° left open by more than this is worth a word
GRID_ABOVE = 1.3  # a cell's mean cannot be far over the peak that a close look finds in it


def grid_is_doubtful(finding: Finding) -> bool:
    """Tell whether the grid's peak is far over what the close look found for the same episode.

    Parameters
    ----------
    finding : Finding
        The finding.

    Returns
    -------
    doubtful : bool
        False if no episode of it was looked at closely.
    """
    e = finding.main
    return e.check is not None and e.peak > GRID_ABOVE * peak_of(e).value


def open_finishes(evidence: Evidence) -> list[str]:
    """Finishes whose reflectance is recalled, or left open at slanting light.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Returns
    -------
    names : list of str
        In the order of the surfaces.
    """
    return [
        name
        for name, finish in evidence.finishes.items()
        if not isinstance(finish, Finish) or "memory" in finish.source or _is_open(finish)
    ]


def _is_open(finish: Finish) -> bool:
    angle = np.radians([60.0])
    high, low = (law(angle).sum(axis=0).mean(axis=1)[0, 0] for law in (finish.high, finish.low))
    return bool(high - low > RANGE_60)


def sureness(evidence: Evidence, finding: Finding) -> tuple[str, tuple[str, ...]]:
    """Grade a finding: by the year's own words where it has them, else by its checks.

    Parameters
    ----------
    evidence : Evidence
        The year.
    finding : Finding
        The finding.

    Returns
    -------
    level : str
        Firm, fair or weak.
    reasons : tuple of str
        Sentences.
    """
    given = extras_of(evidence.year, finding).get("confidence")
    if given:
        if grid_is_doubtful(finding):
            return phrases.WEAK, (phrases.WHY_GRID, *given["reasons"])
        return given["grade"], tuple(given["reasons"])
    check = finding.main.check
    names = open_finishes(evidence)
    recalled = [f.criterion for f in finding.limits if "memory" in f.criterion["confidence"]]
    coarse = any(c["verdict"] != "carries the answer" for c in evidence.summary["tessellation"])
    fair = [phrases.WHY_GLASS.format(names=", ".join(names))] if names else []
    fair += [
        phrases.WHY_LIMIT.format(name=f'"{c["name"]}"', confidence=c["confidence"])
        for c in recalled
    ]
    weak = []
    if check is None:
        weak.append(phrases.WHY_NOT_COUNTED)
    elif not check.agrees:
        weak.append(phrases.WHY_DISAGREES)
    if grid_is_doubtful(finding):
        weak.append(phrases.WHY_GRID)
    if coarse:
        weak.append(phrases.WHY_MESH)
    firm = [phrases.WHY_COUNTED] if check is not None and check.agrees else []
    level = phrases.WEAK if weak else phrases.FAIR if fair else phrases.FIRM
    return level, (*firm, *weak, *fair)
