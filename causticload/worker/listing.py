"""Findings as rows of a list, and other small answers."""

from __future__ import annotations

import zipfile
from pathlib import Path
from typing import Any

import numpy as np

from causticload.errors import InputError
from causticload.hazard.findings import Episode, Season
from causticload.output import words
from causticload.output.results import Year
from causticload.output.text import finding_sentences
from causticload.scene.model import Floats


def peak_of(episode: Episode) -> tuple[np.datetime64, tuple[float, float, float]]:
    """When and where an episode is worst: looked at closely if it was, else by the grid.

    Parameters
    ----------
    episode : Episode
        The episode.

    Returns
    -------
    time : datetime64
        UTC.
    place : (float, float, float)
        Model coordinates. [m]
    """
    if episode.check is not None:
        return episode.check.time, episode.check.place
    top = max(episode.path, key=lambda s: s.peak)
    return top.time, top.place


def local_text(time: np.datetime64, zone: str) -> str:
    """Local clock time that a request may carry: ``2026-06-21T13:30:00``.

    Parameters
    ----------
    time : datetime64
        UTC.
    zone : str
        IANA time zone.

    Returns
    -------
    text : str
        To the second.
    """
    return words.local(time, zone).strftime("%Y-%m-%dT%H:%M:%S")


def episode_row(episode: Episode, year: Year) -> dict[str, Any]:
    """One line of the list of episodes.

    Parameters
    ----------
    episode : Episode
        The episode.
    year : Year
        Its year.

    Returns
    -------
    row : dict
        Ready for JSON; ``text`` is the line itself.
    """
    zone = year.study.site.timezone
    time, place = peak_of(episode)
    start, end = words.local(episode.start, zone), words.local(episode.end, zone)
    load = episode.check.total if episode.check else episode.peak
    text = (
        f"{words.day(episode.day)}, {start:%H:%M} to {end:%H:%M}: {episode.receiver}, "
        f"{words.load(load)}, over {episode.criterion} for {words.length(episode.minutes)}"
    )
    return {
        "number": episode.number,
        "season": episode.season,
        "criterion": episode.criterion,
        "protects": episode.protects,
        "receiver": episode.receiver,
        "day": episode.day,
        "mirror_day": episode.mirror_day,
        "minutes": episode.minutes,
        "limit_W_m2": episode.limit,
        "peak_W_m2": load,
        "counted": bool(episode.check),
        "agrees": episode.check.agrees if episode.check else None,
        "peak_time": words.moment(time, zone),
        "place_m": place,
        "text": text,
    }


def season_row(season: Season, year: Year) -> dict[str, Any]:
    """One line of the list of seasons.

    Parameters
    ----------
    season : Season
        The season.
    year : Year
        Its year.

    Returns
    -------
    row : dict
        Ready for JSON; ``worst`` is the number of its worst episode, ``text`` the line itself,
        ``found`` sentences on what it does and what would cure it.
    """
    worst = next((e for e in year.episodes if e.number == season.worst), None)
    load = worst.check.total if worst and worst.check else season.peak
    text = (
        f"{words.spans(season)}, {season.clock[0]} to {season.clock[1]}: {season.receiver}, "
        f"{words.load(load)}, over {season.criterion}"
    )
    return {
        "number": season.number,
        "worst": season.worst,
        "criterion": season.criterion,
        "protects": season.protects,
        "receiver": season.receiver,
        "days": season.days,
        "minutes_per_day": season.minutes_per_day,
        "minutes_per_year": season.minutes_per_year,
        "peak_W_m2": load,
        "text": text,
        "found": finding_sentences(year.findings.get(season.number)),
    }


def difference(path: str, before: str, after: str) -> Floats:
    """Later less earlier, of two arrays in a file of a host.

    Parameters
    ----------
    path : str
        An ``.npz`` file.
    before, after : str
        Keys of (n,) arrays in it.

    Returns
    -------
    change : (n,) float
        Their difference.

    Raises
    ------
    InputError
        If the file cannot be read, or the arrays do not fit each other.
    """
    try:
        with np.load(path, allow_pickle=False) as file:
            a, b = np.asarray(file[before], float), np.asarray(file[after], float)
    except (OSError, ValueError, KeyError, zipfile.BadZipFile, AttributeError) as error:
        raise InputError(f"the arrays cannot be read: {error}", where="arrays") from error
    if a.shape != b.shape or a.ndim != 1:
        raise InputError(
            f"the two arrays must be of one length, got {a.shape} and {b.shape}",
            where="arrays",
            hint="Compare results with the same receivers and the same sample distance.",
        )
    change: Floats = b - a
    return change


def write_memo(folder: Path, formats: list[Any] | None) -> list[str]:
    """Write the memo of a result folder.

    Parameters
    ----------
    folder : Path
        Result folder of a year.
    formats : list of str or None
        Of docx, pdf, html; None for all that can be written with what is installed.

    Returns
    -------
    files : list of str
        Paths.

    Raises
    ------
    CausticloadError
        If the folder or a format is wrong.
    """
    from causticload.output.memo import available_formats
    from causticload.output.memo import write_memo as write

    return [str(p) for p in write(folder, formats=formats or available_formats())]
