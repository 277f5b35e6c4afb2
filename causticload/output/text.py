"""Plain summaries for a terminal: what, when, where, how strong, how long, how sure."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from textwrap import fill
from typing import TYPE_CHECKING, Any

import numpy as np

from causticload.hazard.cautions import cautions_for
from causticload.hazard.eyes import EYE_CLASS_WORDS, EyeClass
from causticload.hazard.findings import Episode, Finding, ObserverFinding, PeakCheck, Season
from causticload.output import words
from causticload.output.results import Instant, Year

if TYPE_CHECKING:
    from causticload.output.compare import Comparison

WIDTH = 100
MOST_SEASONS = 8


def _wrap(text: str, indent: str = "  ", first: str | None = None) -> str:
    return fill(
        text,
        WIDTH,
        initial_indent=indent if first is None else first,
        subsequent_indent=indent,
        break_on_hyphens=False,
        break_long_words=False,
    )


def _listed(title: str, lines: Iterable[str]) -> list[str]:
    body = [_wrap(line, "    ", "  - ") for line in lines]
    return ["", title, *body] if body else []


def summarise_year(year: Year) -> str:
    """Say what a year found.

    Parameters
    ----------
    year : Year
        The year.

    Returns
    -------
    text : str
        About 100 columns wide.
    """
    s = year.summary
    zone = year.study.site.timezone
    lines = [f"{s['title']}: the year {s['year']['year']}", ""]
    if not year.seasons:
        lines.append(words.NO_EXCEEDANCE)
    else:
        lines.append(
            _wrap(
                f"{len(year.seasons)} hot spot{'s' if len(year.seasons) > 1 else ''} over a "
                f"criterion, people before things, longest first:",
                "",
            )
        )
    by_number = {e.number: e for e in year.episodes}
    for season in year.seasons[:MOST_SEASONS]:
        lines += ["", *describe_season(season, by_number[season.worst], zone)]
        lines += [
            _wrap(text, "   ") for text in finding_sentences(year.findings.get(season.number))
        ]
    if len(year.seasons) > MOST_SEASONS:
        lines += ["", f"  and {len(year.seasons) - MOST_SEASONS} more; see episodes.csv."]
    if year.observers:
        lines += ["", "Observers"]
        for observer in year.observers:
            lines += [_wrap(text, "  ") for text in observer_sentences(observer, zone)]
    lines += ["", "Largest reflected load on each receiver"]
    width = max([len(r["name"]) for r in s["receivers"]], default=0)
    for r in sorted(s["receivers"], key=lambda r: -r["peak_reflected_W_m2"]):
        when = r["peak_time"]
        time = words.moment(np.datetime64(when.rstrip("Z")), zone) if when else "never lit"
        lines.append(f"  {r['name']:<{width}}  {words.load(r['peak_reflected_W_m2']):>12}  {time}")
    lines += _how_sure(s)
    lines += _listed("Assumed", s["assumed"])
    lines += _listed("Cautions", s["cautions"])
    return "\n".join(lines)


def describe_season(season: Season, worst: Episode, zone: str) -> list[str]:
    """Say what a season is, in a few lines.

    Parameters
    ----------
    season : Season
        The season.
    worst : Episode
        Its worst episode.
    zone : str
        IANA time zone.

    Returns
    -------
    lines : list of str
        The first one names it.
    """
    check = worst.check
    peak = check.total if check and _is_total(worst) else worst.peak
    if check and not _is_total(worst):
        peak = check.reflected
    place = check.place if check else max(worst.path, key=lambda p: p.peak).place
    time = check.time if check else worst.peak_time
    lines = [
        f'{season.number}. {season.receiver}: over the criterion "{season.criterion}" '
        f"({season.protects}, {words.load(worst.limit)})",
        _wrap(
            f"{words.spans(season)}, between {season.clock[0]} and {season.clock[1]} local clock "
            f"time; up to {words.length(season.minutes_per_day)} a day on about "
            f"{season.days:.0f} days, {words.length(season.minutes_per_year)} in the year.",
            "   ",
        ),
        _wrap(
            f"Strongest {words.load(peak)} at {words.place(place)} on "
            f"{words.moment(time, zone)}, over at most {worst.area:.1f} m² at once.",
            "   ",
        ),
    ]
    if check:
        lines.append(_wrap(describe_check(check), "   "))
    if worst.contributors:
        half = _panels_for(worst, 0.5)
        lines.append(
            _wrap(
                f"{len(worst.contributors)} panels send light there; the strongest {half} bring "
                f"half of it.",
                "   ",
            )
        )
    return lines


def finding_sentences(finding: Finding | None) -> list[str]:
    """Say what a season's worst peak does, what would cure it, and how sure that is.

    Parameters
    ----------
    finding : Finding or None
        None: the season was not looked at closely.

    Returns
    -------
    sentences : list of str
        One paragraph each.
    """
    if finding is None:
        return ["Not looked at closely: the peak is the grid's own and was not counted."]
    said = [finding.skin.text] if finding.skin else []
    if finding.surface:
        said.append(finding.surface.text)
    said.append(finding.least_panels.text)
    confidence = finding.confidence
    return [*said, f"Confidence: {confidence.grade}. {' '.join(confidence.reasons)}"]


def observer_sentences(observer: ObserverFinding, zone: str) -> list[str]:
    """Say what an observer meets in the year.

    Parameters
    ----------
    observer : ObserverFinding
        The observer.
    zone : str
        IANA time zone.

    Returns
    -------
    sentences : list of str
        One paragraph each, the first with the observer's name.
    """
    sight = observer.worst
    if sight is None:
        return [f"{observer.name}: no image of the sun came into view under these assumptions."]
    said = []
    if observer.clock and observer.worst_day:
        runs = words.runs(observer.spans, observer.after_image_days)
        said.append(
            f"{observer.name}: a look can leave an after-image on about "
            f"{observer.after_image_days:.0f} days ({runs}), between {observer.clock[0]} and "
            f"{observer.clock[1]} local clock time, for up to "
            f"{words.length(observer.after_image_most)} a day ({words.day(observer.worst_day)}) "
            f"and {words.length(observer.after_image_minutes)} in "
            f"the year, somewhere on its path."
        )
    else:
        said.append(f"{observer.name}: no look leaves an after-image under these assumptions.")
    said.append(
        f"Worst at {words.place(sight.place)} on {words.moment(sight.time, zone)}: {sight.images} "
        f"bright area{'s' if sight.images != 1 else ''}, the worst {sight.subtense_mrad:.1f} mrad "
        f"across and {sight.angle_deg:.0f}° from the line of sight; {words.load(sight.corneal)} at "
        f"the eye; {EYE_CLASS_WORDS[EyeClass(sight.eye_class)]}. Veil {sight.veil:,.0f} cd/m² at "
        f"the age of {observer.age:.0f}, which leaves {100 * sight.contrast_left:.0f} % of the "
        f"contrast of a sunlit street."
    )
    if observer.burn_minutes > 0.0:
        said.append(
            f"For {words.length(observer.burn_minutes)} in the year a look can burn the retina "
            f"before a person blinks."
        )
    if observer.rogue_minutes > 0.0:
        said.append(
            f"Over 500 cd/m² by 10 E/theta² for {words.length(observer.rogue_minutes)} in the year "
            f"(Hassall 1991, from memory)."
        )
    return said


def _is_total(episode: Episode) -> bool:
    return episode.peak > episode.reflected * (1.0 + 1e-9)


def _panels_for(episode: Episode, share: float) -> int:
    running = np.cumsum([c.share for c in episode.contributors])
    return int(np.searchsorted(running, share) + 1)


def describe_check(check: PeakCheck) -> str:
    """Say how a peak was confirmed.

    Parameters
    ----------
    check : PeakCheck
        The close look.

    Returns
    -------
    text : str
        One or two sentences.
    """
    verdict = (
        "which agree"
        if check.agrees
        else "which DISAGREE by more than three standard errors: do not rely on this peak"
    )
    left = ""
    if check.reflected_low is not None and check.reflected_high is not None:
        left = _left_open(check.reflected, check.reflected_low, check.reflected_high)
        left = f" It may be {left}." if left else ""
    return (
        f"Reflected light {words.load(check.reflected)} with {check.images} "
        f"image{'s' if check.images != 1 else ''} of the sun in view. Over a disc of "
        f"{1000 * check.disc_radius:.0f} mm radius ray tubes give {check.disc_mean:,.0f} and "
        f"{check.rays:,} random rays {check.count_mean:,.0f} ± {check.count_error:,.0f} W/m², "
        f"{verdict}.{left}"
    )


def _how_sure(s: Mapping[str, Any]) -> list[str]:
    counts = s["ray_counts"]
    ledger = s["ledger_kWh"]
    lines = []
    if counts["made"]:
        lines.append(
            f"Ray count: {counts['agree_within_three_standard_errors']} of {counts['made']} peaks "
            f"agree within three standard errors."
        )
    lines.append(
        f"Energy ledger of the year: {ledger['intercepted']:,.0f} kWh fell on the reflectors; it "
        f"closes to {100 * abs(ledger['closure']):.2f} %."
    )
    lines += [f"Tessellation of {c['surface']} {c['sentence']}" for c in s["tessellation"]]
    lines.append(f"Rays by {s['tracer']}.")
    lines += [f"{f['message']}" for f in s["scene"]["faults"]]
    return _listed("How sure", lines)


def summarise_instant(instant: Instant) -> str:
    """Say what an instant found.

    Parameters
    ----------
    instant : Instant
        The instant.

    Returns
    -------
    text : str
        About 100 columns wide.
    """
    sun = instant.sun
    zone = instant.study.site.timezone
    when = words.moment(sun.time, zone) if sun.time is not None else "a sun given by its angles"
    lines = [
        f"{instant.study.title}: {when}",
        f"Sun at azimuth {sun.azimuth:.1f}°, elevation {sun.elevation:.1f}°; beam "
        f"{words.load(sun.beam)}, diffuse {words.load(sun.diffuse)}.",
        "",
        "Reflected load (mean over grid cells)",
    ]
    width = max([len(n) for n in instant.receivers], default=0)
    for r in sorted(instant.receivers.values(), key=lambda r: -r.reflected.max(initial=0.0)):
        top = int(r.reflected.argmax()) if len(r.reflected) else -1
        if top < 0 or r.reflected[top] <= 0.0:
            lines.append(f"  {r.name:<{width}}  no reflected light")
            continue
        where = words.place(
            (float(r.points[top][0]), float(r.points[top][1]), float(r.points[top][2]))
        )
        lines.append(
            f"  {r.name:<{width}}  {words.load(float(r.reflected[top])):>12}  "
            f"{r.reflected[top] / sun.beam:5.2f} suns  {r.images[top]} images  at {where}"
        )
        left = _left_open(float(r.reflected[top]), *r.peak_limits)
        if left:
            lines.append(f"  {'':<{width}}  {left}")
    L = instant.ledger
    taken = L["intercepted"]
    if taken > 0.0:
        shares = ", ".join(
            f"{name} {100 * L[name] / taken:.1f} %"
            for name in ("absorbed", "receivers", "obstructions", "sky", "scattered", "unfollowed")
            if L[name] > 0.0
        )
        lines += ["", _wrap(f"Of {taken / 1000:,.1f} kW on the reflectors: {shares}.", "")]
    lines.append(
        f"{instant.tubes:,} tubes and {instant.rays:,} rays in {instant.seconds:.2f} s by "
        f"{instant.tracer}."
    )
    lines += _listed("Assumed", instant.assumed)
    lines += _listed("Cautions", cautions_for({"people: skin", "people: eyes", "things"}))
    return "\n".join(lines)


def summarise_comparison(comparison: Comparison) -> str:
    """Say what a change of design did.

    Parameters
    ----------
    comparison : Comparison
        Two years.

    Returns
    -------
    text : str
        About 100 columns wide.
    """
    from causticload.output.memo.change import count_text

    c = comparison
    lines = [f"{c.before.summary['title']} and {c.after.summary['title']}", ""]
    lines.append(_wrap(count_text(c), "") if c.changes else words.NO_EXCEEDANCE)
    width = max([len(f"{x.receiver}, {x.criterion}") for x in c.changes], default=0)
    for x in c.changes:
        peaks = " -> ".join(
            words.load(side.peak) if side else "not over it" for side in (x.before, x.after)
        )
        name = f"{x.receiver}, {x.criterion}"
        lines.append(f"  {x.fate:<7} {name:<{width}}  grid peak {peaks}")
    if c.settings:
        lines += ["", f"Not the same in the two runs: {', '.join(c.settings)}."]
    if c.unlike:
        lines += ["", _wrap(f"Not compared place by place: {', '.join(c.unlike)}.", "")]
    lines += _listed("Cautions", cautions_for(()))
    return "\n".join(lines)


def summarise_inspect(report: Mapping[str, Any]) -> str:
    """Say what a model is.

    Parameters
    ----------
    report : mapping
        From :func:`causticload.run.inspect`.

    Returns
    -------
    text : str
        About 100 columns wide.
    """
    lines = ["Surfaces"]
    surfaces = report.get("surfaces", [])
    width = max([len(s["name"]) for s in surfaces], default=0)
    for s in surfaces:
        roles = ", ".join(s["roles"]) or "ignored"
        more = []
        if s.get("panels"):
            more.append(f"{s['panels']} panels, {s.get('form', '')}, {s.get('finish', '')}")
        if s.get("kind"):
            more.append(s["kind"])
        lines.append(
            f"  {s['name']:<{width}}  {roles:<22} {s.get('triangles', 0):>7,} triangles  "
            f"{s.get('area_m2', 0.0):>11,.1f} m²  {'; '.join(more)}".rstrip()
        )
    checks: Sequence[Mapping[str, Any]] = report.get("tessellation", [])
    lines += _listed("Tessellation check", [f"{c['surface']}: {c['sentence']}" for c in checks])
    lines += _listed(
        "Curvature", [f"{c['surface']}: {c['sentence']}" for c in report.get("curvature", [])]
    )
    lines += _listed(
        "Panes that are not flat", [_figure_line(f) for f in report.get("figures", [])]
    )
    focus = report.get("focus")
    if focus:
        lines += _listed(
            f"Focus, sun at azimuth {focus['sun_azimuth']:.1f}°, "
            f"elevation {focus['sun_elevation']:.1f}°",
            [
                f"{100.0 * focus['share']:.0f} % of the {focus['lit_m2']:,.0f} m² in the sun "
                "gather their light to at least twice its density where it meets a receiver "
                "(before the sun's own size blurs it; single reflection, outermost pane)."
            ],
        )
    lines += _listed(
        "Found in the model",
        [f"{f['message']} {f.get('hint', '')}".strip() for f in report.get("faults", [])],
    )
    lines += _listed("Assumed", report.get("assumed", []))
    lines += ["", f"Rays will be traced by {report.get('tracer', 'nothing yet')}."]
    return "\n".join(lines)


def _left_open(load: float, low: float, high: float) -> str:
    """Say what an unknown angular law leaves open; nothing where that is nothing."""
    if not high - low > 0.01 * load:
        return ""
    return (
        f"{low:,.0f} to {high:,.0f} W/m² by what the data leave open of reflectance at slanting "
        "angles"
    )


def _figure_line(f: Mapping[str, Any]) -> str:
    """Say how one pane of a surface's panels bends."""
    said = [f"{f['surface']}, pane {f['pane']} of {f['panels']} panels ({f['figure']})"]
    if f["short_focal_m"]:
        low, high = f["bow_mm"]
        said.append(
            f"bow {low:+.2f} mm" if high - low < 0.005 else f"bow {low:+.2f}…{high:+.2f} mm"
        )
        for name in ("short", "long"):
            if f[f"{name}_focal_m"]:
                nearest, _, farthest = f[f"{name}_focal_m"]
                span = f"{nearest:.1f} m"
                if abs(farthest - nearest) > 0.05 * abs(nearest):
                    span = f"{nearest:.1f}…{farthest:.1f} m"
                said.append(f"{name}er focal length {span}")
    if f["wave_focal_m"]:
        said.append(f"roller wave focuses at {f['wave_focal_m'][0]:.1f} m")
    return "; ".join(said) + "."


def summarise_finishes(rows: Sequence[Mapping[str, Any]]) -> str:
    """List finishes.

    Parameters
    ----------
    rows : sequence of mapping
        From :func:`causticload.optics.list_finishes`.

    Returns
    -------
    text : str
        One finish a paragraph.
    """
    lines = ["Built-in finishes (reflectance at normal incidence, outdoor side)"]
    for row in rows:
        name = f"  {row['name']}"
        figures = ", ".join(
            f"{key.replace('_', ' ')} {value:.3f}" if isinstance(value, float) else f"{key} {value}"
            for key, value in row.items()
            if key not in ("name", "source") and value not in (None, "", ())
        )
        lines += ["", name, _wrap(figures, "    "), _wrap(str(row.get("source", "")), "    ")]
    return "\n".join(lines)
