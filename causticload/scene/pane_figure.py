"""From the surface figures of a study to numbers for each panel and each of its panes."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from causticload.errors import StudyError
from causticload.scene.cavity import isochore_pressure, share_load
from causticload.scene.model import Bools, Floats, Ints, PaneFigures, Panels, Surface
from causticload.scene.outline import area, convex_outline, end_edges
from causticload.scene.plate import MOST_EDGES, TERMS, Plate, solve_plate, stiffness
from causticload.study.model import FigureSpec

PANES_MM = (6.0, 6.0)  # of a unit whose panes are not given; common practice
GAP_MM = 16.0  # common practice
KINKED_EDGES = 4
CONVEX = 0.99  # a panel fills at least this share of its convex outline
QUADS = 0.95  # share of a smooth surface's area in quadrilaterals: then they are its panes


@dataclass(frozen=True, kw_only=True)
class Figured:
    """Figures of a scene's panes and what is to be said about them."""

    figures: PaneFigures | None
    assumed: tuple[str, ...]


@dataclass(frozen=True)
class _Outlines:
    """Panels in their own frames."""

    middle: Floats  # (p, 3) m
    height_axis: Floats  # (p, 3)
    half: Floats  # (p, 2) m
    area: Floats  # (p,) m², without what the outline adds to a panel that is not convex
    corners: dict[int, Floats]  # of the panels asked for: (c, 2) m about the middle


def figure_panes(
    *,
    triangles: Floats,
    panel: Ints,
    panels: Panels,
    surfaces: Sequence[Surface],
    figures: Mapping[str, FigureSpec],
    site_elevation_m: float,
) -> Figured:
    """Lay out the surface figures of all panels.

    Parameters
    ----------
    triangles : (k, 3, 3) float
        Corners of the reflectors' triangles. [m]
    panel : (k,) int
        Their panels.
    panels : Panels
        The panels, ``p`` of them.
    surfaces : sequence of Surface
        All surfaces.
    figures : mapping of str to FigureSpec
        The study's figures.
    site_elevation_m : float
        Altitude of the site. [m]

    Returns
    -------
    figured : Figured
        ``figures`` is None where no surface has one.

    Raises
    ------
    StudyError
        If a figure stands on a surface whose panes cannot be told.
    """
    of_panel = np.array([surfaces[i].figure or "" for i in panels.surface])
    names = [name for name in figures if (of_panel == name).any()]
    if not names:
        return Figured(figures=None, assumed=())
    for i, surface in enumerate(surfaces):
        if surface.figure and surface.form == "smooth":
            _require_panes(surface.name, i, panel, panels)
    figured = of_panel != ""
    outlines = _outlines(triangles, panel, panels, figured)
    rows: list[dict[str, Any]] = []
    said: list[str] = []
    first = np.full(len(panels), -1, np.int32)
    count = np.zeros(len(panels), np.int32)
    kinked = np.tile([0.0, 0.0, np.inf], (len(panels), KINKED_EDGES, 1))
    plates: dict[int, int] = {}
    shapes: list[Plate] = []
    for name in names:
        maker = _Maker(name, figures[name].settings, site_elevation_m)
        mine = np.flatnonzero(of_panel == name)
        for p, tilt, phase in zip(mine, *maker.draw(len(mine)), strict=True):
            plate, row = maker.plate(outlines, int(p)), -1
            if plate is not None:
                if id(plate) not in plates:  # the solver keeps its plates, so ids stay theirs
                    plates[id(plate)] = len(shapes)
                    shapes.append(plate)
                row = plates[id(plate)]
            first[p], count[p] = len(rows), maker.panes
            lines = maker.kinked(outlines, int(p))
            kinked[p, : len(lines)] = lines
            bows = maker.bows(plate, float(outlines.half[p, 0]))
            rows += [
                {"panel": p, "shape": row, "bow": bows[k], "tilt": tilt, "phase": phase[k]}
                | maker.plain
                for k in range(maker.panes)
            ]
        said += maker.say()

    def column(key: str, kind: Any = float) -> Any:
        return np.array([r[key] for r in rows], dtype=kind)

    return Figured(
        figures=PaneFigures(
            first=first,
            count=count,
            middle=outlines.middle,
            height_axis=outlines.height_axis,
            half=outlines.half,
            panel=column("panel", np.int32),
            shape=column("shape", np.int32),
            bow=column("bow"),
            wave=column("wave"),
            wave_number=column("wave_number"),
            phase=column("phase"),
            follow=column("follow", np.int32),
            tilt=column("tilt"),
            kink=column("kink"),
            kink_width=column("kink_width"),
            kinked=kinked,
            shapes=np.array([q.shape for q in shapes]).reshape(-1, TERMS, TERMS),
            tops=np.array([q.top for q in shapes]).reshape(-1, 2),
        ),
        assumed=tuple(dict.fromkeys(said)),
    )


def _require_panes(name: str, number: int, panel: Ints, panels: Panels) -> None:
    """A figure is a pane's: say no where the mesh of a smooth surface does not show the panes."""
    mine = panels.surface == number
    faces = np.bincount(panel, minlength=len(panels))
    whole = panels.area[mine & (faces > 1)].sum()
    if whole < QUADS * panels.area[mine].sum():
        raise StudyError(
            f"{name!r} is smooth and its mesh is not made of quadrilaterals: the panes that its "
            "figure belongs to cannot be told",
            where=f"surface {name!r}: figure",
            hint='Model each pane as one quadrilateral, or as a flat pane with form = "flat", '
            "or take the figure out.",
        )


def _outlines(triangles: Floats, panel: Ints, panels: Panels, wanted: Bools) -> _Outlines:
    """Frames of all panels; outlines of those wanted."""
    count = len(panels)
    height = np.cross(panels.normal, panels.width_axis)
    axes = np.stack([panels.width_axis, height], axis=1)
    along = np.einsum("kci,kai->kca", triangles - panels.centroid[panel][:, None], axes[panel])
    low, high = np.full((count, 2), np.inf), np.full((count, 2), -np.inf)
    np.minimum.at(low, panel, along.min(axis=1))
    np.maximum.at(high, panel, along.max(axis=1))
    offset = 0.5 * (low + high)
    middle = panels.centroid + np.einsum("pa,pai->pi", offset, axes)
    order = np.argsort(panel, kind="stable")
    start = np.searchsorted(panel[order], np.arange(count + 1))
    corners = {}
    for p in np.flatnonzero(wanted):
        own = along[order[start[p] : start[p + 1]]].reshape(-1, 2) - offset[p]
        corners[int(p)] = convex_outline(own)
    return _Outlines(middle, height, 0.5 * (high - low), panels.area, corners)


class _Maker:
    """One figure of the study, in SI."""

    def __init__(self, name: str, settings: Mapping[str, Any], site_elevation_m: float) -> None:
        s = dict(settings)
        self.name, self.settings = name, s
        self.isochore = _isochore(s, site_elevation_m)
        panes = s.get("panes_mm")
        if panes is None and (self.isochore is not None or "inner_bow_mm" in s):
            panes = PANES_MM
        self.thickness = [1e-3 * float(t) for t in panes or ()]
        self.panes = max(1, len(self.thickness))
        gap = s.get("gap_mm", GAP_MM)
        gaps = gap if isinstance(gap, list) else [gap] * (self.panes - 1)
        self.gaps = [1e-3 * float(g) for g in gaps]
        along = np.array([0.0, 1.0] if s.get("roller_along") == "height" else [1.0, 0.0])
        self.along = along
        pitch = 1e-3 * float(s.get("roller_pitch_mm", 1.0))
        self.plain = {
            "wave": 0.5e-3 * float(s.get("roller_wave_mm", 0.0)),
            "wave_number": 2.0 * np.pi / pitch * along,
            "follow": {"waves": 1, "mean": 0}.get(s.get("roller_as", ""), -1),
            "kink": 1e-3 * float(s.get("edge_kink_mm", 0.0)),
            "kink_width": 1e-3 * float(s.get("edge_kink_width_mm", 1.0)),
        }
        self.bent = self.stout = self.odd = self.many = 0

    def draw(self, panels: int) -> tuple[Floats, Floats]:
        """Random tilts (p, 2) and phases (p, panes): the same for the same seed and model."""
        rng = np.random.default_rng(int(self.settings.get("seed", 1)))
        phase = rng.uniform(0.0, 2.0 * np.pi, (panels, self.panes))
        tilt = 1e-3 * float(self.settings.get("tilt_mrad", 0.0)) * rng.normal(size=(panels, 2))
        return tilt, phase

    def plate(self, outlines: _Outlines, p: int) -> Plate | None:
        """How the panel bends; None if it does not."""
        if self.isochore is None and "bow_mm" not in self.settings:
            return None
        outline, half = outlines.corners[p], outlines.half[p]
        self.bent += 1
        if len(outline) > MOST_EDGES:
            self.many += 1
            outline = half * np.array([[-1, -1], [1, -1], [1, 1], [-1, 1]])
        elif area(outline) * CONVEX > outlines.area[p]:
            self.odd += 1
        return solve_plate(outline, half)

    def bows(self, plate: Plate | None, half_width: float) -> list[float]:
        """Largest deflection of each pane. [m]"""
        s = self.settings
        if plate is None:
            return [0.0] * self.panes
        if self.isochore is None:
            outer = 1e-3 * float(s["bow_mm"])
            inner = 1e-3 * float(s.get("inner_bow_mm", s["bow_mm"]))
            return [outer] + [inner] * (self.panes - 1)
        give = np.array([plate.largest * half_width**4 / stiffness(t) for t in self.thickness])
        load = share_load(self.isochore, gaps_m=self.gaps, compliance=list(give * plate.mean))
        bows = load * give
        self.stout += bool((np.abs(bows) > 0.5 * np.array(self.thickness)).any())
        return [float(b) for b in bows]

    def kinked(self, outlines: _Outlines, p: int) -> Floats:
        """Lines of the edges that the panel's kinks run along."""
        if self.plain["kink"] == 0.0:
            return np.zeros((0, 3))
        return end_edges(outlines.corners[p], self.along)[:KINKED_EDGES]

    def say(self) -> list[str]:
        """Sentences on what was assumed."""
        s, said = self.settings, []
        if self.isochore is not None:
            said.append(
                f"cavities press with {1e-3 * self.isochore:+.1f} kPa before the panes give way; "
                + ("panes are " if "panes_mm" in s else "panes are taken as ")
                + "/".join(f"{1e3 * t:g}" for t in self.thickness)
                + " mm, gaps "
                + "/".join(f"{1e3 * g:g}" for g in self.gaps)
                + " mm, simply supported"
            )
        if "bow_mm" in s and "inner_bow_mm" not in s:
            said.append(
                "all panes of a unit are taken to bow alike; give inner_bow_mm where they do not"
            )
        if self.stout:
            said.append(
                f"{self.stout} of {self.bent} panels have a pane that bends by more than half "
                "its thickness: a real one is flatter in the middle, so its focal length is "
                "longer than found here"
            )
        if self.odd:
            said.append(
                f"{self.odd} of {self.bent} panels are not convex or have holes: they bend as "
                "their convex outlines"
            )
        if self.many:
            said.append(
                f"{self.many} of {self.bent} panels have more than {MOST_EDGES} corners: they "
                "bend as their bounding rectangles"
            )
        return [f"Figure {self.name!r}: {text}." for text in said]


def _isochore(s: Mapping[str, Any], site_elevation_m: float) -> float | None:
    """Isochore over-pressure [Pa], None where the figure does not speak of cavities."""
    if "cavity_pressure_kpa" in s:
        return 1e3 * float(s["cavity_pressure_kpa"])
    if "temperature_c" not in s:
        return None
    return isochore_pressure(
        warmer_k=float(s["temperature_c"]) - float(s["sealed_temperature_c"]),
        barometer_rise_pa=1e3
        * (float(s.get("pressure_kpa", 101.3)) - float(s.get("sealed_pressure_kpa", 101.3))),
        higher_m=site_elevation_m - float(s.get("sealed_altitude_m", site_elevation_m)),
    )
