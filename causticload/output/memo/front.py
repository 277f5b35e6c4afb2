"""The first half of a memo: the question, the site, what was assumed, and the method."""

from __future__ import annotations

import platform
from collections.abc import Iterator
from typing import Any

import numpy as np

from causticload.hazard.cautions import CONFIDENCE_MEANING
from causticload.optics.finish import Finish
from causticload.output import words
from causticload.output.memo import phrases
from causticload.output.memo.blocks import (
    Block,
    Bullets,
    Column,
    Heading,
    Note,
    Picture,
    Table,
    Text,
    ref,
    strong,
)
from causticload.output.memo.evidence import Evidence
from causticload.output.memo.figures.facade_maps import FAR, focal_distance, focal_map
from causticload.output.memo.figures.plans import site_plan
from causticload.output.memo.figures.views import LIT_W_M2, site_view

SUN_NOTE = "sun of the focal distances"  # as the folder's facade calls it


def columns(
    titles: tuple[str, ...], shares: tuple[float, ...], right: tuple[int, ...] = ()
) -> tuple[Column, ...]:
    """Make the columns of a table.

    Parameters
    ----------
    titles : tuple of str
        Their titles.
    shares : tuple of float
        Their parts of the width.
    right : tuple of int
        Numbers of the columns that hold figures and stand at the right.

    Returns
    -------
    columns : tuple of Column
        As many as titles.
    """
    return tuple(
        Column(title, share, "right" if k in right else "left")
        for k, (title, share) in enumerate(zip(titles, shares, strict=True))
    )


def purpose(evidence: Evidence) -> Iterator[Block]:
    """Say what the study is for.

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
    yield Heading(1, phrases.PURPOSE, "sec-purpose")
    yield Text(
        phrases.PURPOSE_TEXT.format(
            title=s["title"],
            year=s["year"]["year"],
            step=s["year"]["step_minutes"],
            days=s["year"]["representative_days"],
            suns=s["year"]["positions_of_the_sun"],
        )
    )
    yield Text(phrases.SCOPE_TEXT.format(roles=ref("tab-roles")))
    yield Note(phrases.DECIDES)


def geometry(evidence: Evidence) -> Iterator[Block]:
    """Show what stands there.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Yields
    ------
    block : Block
        A section.
    """
    scene = evidence.summary["scene"]
    yield Heading(1, phrases.GEOMETRY, "sec-geometry")
    north = phrases.NORTH_FACTS.format(north=evidence.summary["site"]["model_north"])
    yield Text(
        phrases.GEOMETRY_TEXT.format(
            triangles=scene["triangles"],
            panels=scene["panels"],
            area=scene["reflector_area_m2"],
            points=scene["receiver_points"],
            north=north,
        )
    )
    yield Picture(
        "fig-site-view",
        phrases.SITE_VIEW.format(least=LIT_W_M2),
        phrases.GEOMETRY,
        lambda: site_view(evidence),
    )
    yield Picture("fig-site-plan", phrases.SITE_PLAN, phrases.SITE, lambda: site_plan(evidence))
    yield Table(
        "tab-roles",
        phrases.ROLES_CAPTION,
        columns(phrases.ROLES_COLUMNS, (2.0, 1.6, 1.2, 2.4, 0.9), (4,)),
        tuple(
            (
                s["name"],
                ", ".join(s["roles"]),
                s["kind"] or (s["form"] if "reflector" in s["roles"] else ""),
                s["finish"],
                f"{s['triangles']:,}",
            )
            for s in scene["surfaces"]
        ),
    )
    yield _panel_table(evidence)
    yield from _focus(evidence)


def _panel_table(evidence: Evidence) -> Table:
    p, surfaces = evidence.panels, evidence.summary["scene"]["surfaces"]
    rows = []
    for number in np.unique(p.surface):
        mine = p.surface == number
        spread = [phrases.MIDDLE_RANGE.format(low=a.min(), high=a.max()) for a in p.size[mine].T]
        rows.append(
            (
                surfaces[int(number)]["name"],
                f"{int(mine.sum()):,}",
                f"{int(p.flat[mine].sum()):,}",
                f"{p.area[mine].sum():,.0f}",
                *spread,
            )
        )
    shares = (2.2, 0.9, 0.8, 1.0, 1.5, 1.5)
    return Table(
        "tab-panels",
        phrases.PANELS_CAPTION,
        columns(phrases.PANELS_COLUMNS, shares, (1, 2, 3, 4, 5)),
        tuple(rows),
    )


def _focus(evidence: Evidence) -> Iterator[Block]:
    distance = focal_distance(evidence)
    near = distance <= FAR
    if not near.any():
        yield Text(phrases.FOCAL_NONE.format(far=FAR))
        return
    T = evidence.facade[near]
    area = 0.5 * np.linalg.norm(np.cross(T[:, 1] - T[:, 0], T[:, 2] - T[:, 0]), axis=1)
    order = np.argsort(distance[near])
    share = np.cumsum(area[order]) / area.sum()
    low, high = (
        float(distance[near][order][min(int(np.searchsorted(share, q)), len(order) - 1)])
        for q in (0.25, 0.75)
    )
    yield Text(phrases.FOCAL_TEXT.format(low=low, high=high, map=ref("fig-focal")))
    sun = evidence.facade_notes.get(SUN_NOTE)
    caption = phrases.FOCAL_SLANTING if sun else phrases.FOCAL_STRAIGHT
    yield Picture(
        "fig-focal",
        caption.format(far=FAR, sun=sun),
        phrases.GEOMETRY,
        lambda: focal_map(evidence),
    )


def sources(evidence: Evidence) -> Iterator[Block]:
    """Say where figures come from and what was assumed.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Yields
    ------
    block : Block
        A section.
    """
    yield Heading(1, phrases.SOURCES, "sec-sources")
    yield Heading(2, phrases.GLASS, "sec-glass")
    rows, missing = [], []
    for name, finish in evidence.finishes.items():
        if isinstance(finish, Finish):
            rows.append(_finish_row(finish))
        else:
            missing.append(phrases.GLASS_MISSING.format(name=name, why=finish))
    if rows:
        yield Table(
            "tab-glass",
            phrases.GLASS_CAPTION,
            columns(phrases.GLASS_COLUMNS, (1.4, 1.0, 1.2, 0.9, 1.1, 3.0)),
            tuple(rows),
        )
        yield Text(phrases.GLASS_TEXT)
    for text in missing:
        yield Text(text)
    yield Heading(2, phrases.WEATHER, "sec-weather")
    yield Text(_sky_text(evidence))
    yield Heading(2, phrases.CRITERIA, "sec-criteria")
    yield from _criteria(evidence.summary["criteria"])
    yield Heading(2, phrases.ASSUMED, "sec-assumed")
    yield Bullets(tuple(evidence.summary["assumed"]))


def _finish_row(finish: Finish) -> tuple[str, ...]:
    theta = np.radians([0.0, 60.0])
    value, low, high = (
        law(theta).sum(axis=0).mean(axis=1) for law in (finish.reflectance, finish.low, finish.high)
    )

    def told(band: int, k: int) -> str:
        if high[band, k] - low[band, k] < 0.005:
            return f"{value[band, k]:.2f}"
        return phrases.GLASS_RANGE.format(
            value=value[band, k], low=low[band, k], high=high[band, k]
        )

    return (finish.name, told(0, 0), told(0, 1), told(1, 0), finish.angular, finish.source)


def _sky_text(evidence: Evidence) -> str:
    sky = evidence.year.study.sky
    disc = phrases.SUN_DISC[sky.disc]
    if sky.source == "weather" and sky.file is not None:
        return f"{phrases.SKY_FILE.format(name=sky.file.name)} {disc}"
    turbidity = (
        phrases.TURBIDITY_MONTHLY
        if sky.turbidity is None
        else phrases.TURBIDITY_GIVEN.format(value=sky.turbidity)
    )
    return f"{phrases.SKY_CLEAR.format(turbidity=turbidity)} {disc}"


def limit_text(criterion: dict[str, Any]) -> str:
    """Write a limit's value with what it bounds.

    Parameters
    ----------
    criterion : dict
        Its record in the summary.

    Returns
    -------
    text : str
        Like ``total irradiance 1,500 W/m²``.
    """
    return f"{criterion['quantity']} {criterion['limit']:,.0f} {criterion['unit']}"


def _criteria(criteria: list[dict[str, Any]]) -> Iterator[Block]:
    yield Table(
        "tab-criteria",
        phrases.CRITERIA_CAPTION,
        columns(phrases.CRITERIA_COLUMNS, (1.3, 1.0, 1.3, 0.9, 3.4, 1.2)),
        tuple(
            (
                c["name"],
                phrases.WHO[c["protects"]],
                limit_text(c),
                phrases.TOLERATED.format(minutes=c["minutes"]) if c["minutes"] else phrases.NO_TIME,
                c["source"],
                c["confidence"],
            )
            for c in criteria
        ),
    )
    yield Bullets(
        tuple(
            phrases.VALID_FOR.format(
                name=strong(c["name"]), validity=c["validity"].rstrip("."), caution=c["caution"]
            )
            for c in criteria
        )
    )
    yield Text(phrases.MEMORY_TEXT.format(memory=strong(phrases.FROM_MEMORY)))
    used = {c["confidence"] for c in criteria}
    yield Bullets(tuple(f"{strong(k)}: {v}" for k, v in CONFIDENCE_MEANING.items() if k in used))


def method(evidence: Evidence) -> Iterator[Block]:
    """Tell the method and what its checks came to.

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
    yield Heading(1, phrases.METHOD, "sec-method")
    for text in phrases.METHOD_TEXT:
        yield Text(text)
    yield Text(phrases.CHECKS_INTRO)
    ledger, counts = s["ledger_kWh"], s["ray_counts"]
    taken = ledger["intercepted"]

    def share(part: str) -> float:
        return 100.0 * ledger[part] / taken if taken > 0.0 else 0.0

    items = [
        phrases.CHECK_LEDGER.format(
            taken=taken,
            absorbed=share("absorbed"),
            receivers=share("receivers"),
            obstructions=share("obstructions"),
            sky=share("sky"),
            gap=100.0 * abs(ledger["closure"]),
        ),
        phrases.CHECK_COUNT.format(
            made=counts["made"],
            agree=counts["agree_within_three_standard_errors"],
            table=ref("tab-counts"),
        )
        if counts["made"]
        else phrases.CHECK_NO_COUNT,
    ]
    items += [
        phrases.CHECK_MESH.format(surface=c["surface"], sentence=c["sentence"])
        for c in s["tessellation"]
    ] or [phrases.CHECK_MESH_NONE]
    yield Bullets(tuple(items))


def versions(evidence: Evidence) -> tuple[tuple[str, str], ...]:
    """List what the run was made with.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Returns
    -------
    rows : tuple of (str, str)
        Part and version.
    """
    s = evidence.summary
    return (
        (s["program"]["name"], s["program"]["version"]),
        (phrases.TRACER, s["tracer"]),
        *s["libraries"].items(),
        (f"{phrases.PYTHON_NAME} (of this memo)", platform.python_version()),
    )


def when(time: np.datetime64, zone: str) -> str:
    """Write a UTC time as local clock time.

    Parameters
    ----------
    time : datetime64
        UTC.
    zone : str
        IANA time zone.

    Returns
    -------
    text : str
        Like ``21 March 2026, 13:30 (UTC+01:00)``.
    """
    return phrases.long_time(words.local(time, zone))
