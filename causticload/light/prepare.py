"""Everything about a scene that does not depend on the sun, made once."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np

from causticload.light.bvh import Engine, Tracer, build_tracer
from causticload.light.cut import cut_to_figure
from causticload.light.facets import Facets, leaning_panels, make_facets
from causticload.light.sheets import Sheets, bow_apart, lay_sheets, panes_of
from causticload.light.splat import Grids, make_grids
from causticload.light.targets import Meanings, make_meanings
from causticload.light.tubes import Tubes, whole_facets
from causticload.light.waves import choose_waves, say_mean_waves
from causticload.optics.finish import Finish
from causticload.scene.model import Bools, Floats, Ints, Scene
from causticload.sky.disc import SunDisc


@dataclass(frozen=True)
class LitScene:
    """A scene ready for light. ``m`` triangles, ``n`` receiver points, ``k`` sheets."""

    scene: Scene
    F: Facets
    grids: Grids
    meanings: Meanings
    tracer: Tracer
    base: Tubes
    disc: SunDisc
    R: Floats  # (k, 2, 2, angles) reflectance tables: band, polarisation
    slope_error: Floats  # (k,) rad
    scatter: Floats  # (k,) share of the mirrored light that leaves the mirror direction
    first_sheet: Floats  # (k,) 1 for the sheet that enters what its facet takes in, else 0
    shows: Bools  # (k,) the sheet's light counts as an image of the sun
    sheet_of: Ints  # (m,) first sheet met by a second reflection, -1 off reflectors
    sheets_met: Ints  # (m,) how many there are from there on, 0 off reflectors
    sheets: Sheets
    exact: Sheets  # the same surfaces without nodes, every wave followed: for the ray count
    points: Floats  # (n, 3) m, local
    point_normals: Floats  # (n, 3) unit
    point_areas: Floats  # (n,) m²
    point_surface: Ints  # (n,) number of the surface
    mirror_point: Bools  # (n,) the point lies on a reflector
    clearance_m: float
    assumed: tuple[str, ...] = ()  # sentences for the user
    follower: LitScene | None = None  # the same with every wave followed; None: this one does
    _rings: dict[tuple[float, int | None], tuple[Floats, Floats]] = field(default_factory=dict)

    @property
    def close(self) -> LitScene:
        """The scene for a close look: every roller wave is followed with its own phase."""
        return self.follower or self

    def under(self, scene: Scene, disc: SunDisc) -> LitScene:
        """Return the same scene under another north and another sun's face."""
        follower = self.follower.under(scene, disc) if self.follower else None
        return replace(self, scene=scene, disc=disc, follower=follower, _rings={})

    def rings(self, sun_radius: float, count: int | None = None) -> tuple[Floats, Floats]:
        """Return the sun as each sheet blurs it: tangents of disc radii and shares, (k, r).

        ``count`` discs a sheet, or as few as serve a grid.
        """
        key = (round(sun_radius, 9), count)
        if key not in self._rings:
            self._rings[key] = _rings_of_sheets(self.disc, sun_radius, self.slope_error, count)
        return self._rings[key]


def _rings_of_sheets(
    disc: SunDisc, sun_radius: float, slope_error: Floats, count: int | None
) -> tuple[Floats, Floats]:
    """Tangents of the radii of the sun's discs and their shares for each sheet, (k, r)."""
    rows = [disc.rings(sun_radius, slope_error_rad=float(e), count=count) for e in slope_error]
    width = max(len(r) for r, _ in rows)
    radii, weights = np.empty((len(rows), width)), np.zeros((len(rows), width))
    for k, (r, w) in enumerate(rows):
        order = np.argsort(r)
        # Shorter rows repeat their smallest disc with no share, so that the last is the largest.
        radii[k] = np.tan(np.r_[np.full(width - len(r), r[order[0]]), r[order]])
        weights[k, width - len(r) :] = w[order]
    return radii, weights


def prepare(
    scene: Scene, *, finishes: Sequence[Finish], disc: SunDisc, engine: Engine = "auto"
) -> LitScene:
    """Make a scene ready for light.

    Parameters
    ----------
    scene : Scene
        What stands there.
    finishes : sequence of Finish
        Finish of each surface, in the order of ``scene.surfaces``; the entries of surfaces that
        do not reflect are not read.
    disc : SunDisc
        The sun's face.
    engine : {"auto", "embree", "own"}
        What traces rays.

    Returns
    -------
    lit : LitScene
        Arrays, grids, tracer and the tubes before any light.
    """
    waves = choose_waves(scene)
    tracer = build_tracer(scene.triangles, engine=engine)
    counts = [len(c.areas) for c in scene.charts]
    point_surface = np.repeat([c.surface for c in scene.charts], counts).astype(np.int32)
    mirrors = np.array([("reflector" in s.roles) for s in scene.surfaces], dtype=bool)
    normals = np.array([c.normal for c in scene.charts], dtype=float).reshape(-1, 3)
    size = float(np.ptp(scene.triangles.reshape(-1, 3), axis=0).max(initial=1.0))
    lit = LitScene(
        scene=scene,
        grids=make_grids(scene.charts),
        tracer=tracer,
        disc=disc,
        exact=lay_sheets(scene, finishes, waves=np.ones_like(waves), nodes=False),
        points=np.concatenate([c.points for c in scene.charts] or [np.zeros((0, 3))]),
        point_normals=np.repeat(normals, counts, axis=0),
        point_areas=np.concatenate([c.areas for c in scene.charts] or [np.zeros(0)]),
        point_surface=point_surface,
        mirror_point=mirrors[point_surface],
        # Embree works in single precision: stay clear by more than its last digit.
        clearance_m=max(1e-3, 4e-7 * size),
        assumed=(*say_mean_waves(scene, waves), *_say_panes(scene, finishes)),
        **_reflecting(scene, lay_sheets(scene, finishes, waves=waves), cut_waves=True),
    )
    if waves.all():
        return lit
    every = lay_sheets(scene, finishes, waves=np.ones_like(waves))
    # Questions from single points cut what lies near them: the other waves may stay long.
    follower = replace(lit, _rings={}, **_reflecting(scene, every, cut_waves=False))
    return replace(lit, _rings={}, follower=follower)


def _reflecting(scene: Scene, sheets: Sheets, *, cut_waves: bool) -> dict[str, Any]:
    """The fields of a lit scene that depend on its sheets."""
    F = make_facets(scene, sheets)
    on = scene.panel >= 0
    own = scene.surface
    facet = np.repeat(scene.reflectors, sheets.count[own[scene.reflectors]])
    first = sheets.first[own[facet]]
    # Sheets of one facet follow one another.
    again = np.arange(len(facet)) - np.searchsorted(facet, facet)
    base = cut_to_figure(F, whole_facets(F, facet, first + again), waves=cut_waves)
    return {
        "F": F,
        "meanings": make_meanings(scene, leaning_panels(F, scene, sheets)),
        "base": base,
        "R": sheets.R,
        "slope_error": sheets.slope_error,
        "scatter": sheets.scatter,
        "first_sheet": sheets.enters,
        "shows": sheets.shows,
        "sheet_of": np.where(on, sheets.again[own], -1).astype(np.int32),
        "sheets_met": np.where(on, sheets.again_count[own], 0).astype(np.int32),
        "sheets": sheets,
    }


def _say_panes(scene: Scene, finishes: Sequence[Finish]) -> tuple[str, ...]:
    """Surfaces whose figure and finish do not speak of the same panes."""
    said = []
    g = scene.figures
    for i, surface in enumerate(scene.surfaces):
        if g is None or not bow_apart(scene, i, follow_waves=False):
            continue
        panes = int(g.count[g.panel[panes_of(g, scene, i)[0]]])
        lobes = len(finishes[i].lobes)
        if lobes == 1:
            said.append(
                f"{surface.name}: its figure bows panes apart but its finish is known as one "
                "surface only, so all its light is given to the outer pane; name the panes in "
                "the finish (pane_count or panes) to part them."
            )
        elif lobes != panes:
            said.append(
                f"{surface.name}: its figure is of {panes} panes, its finish of {lobes}: the "
                "inner ones bow as the figure's last."
            )
    return tuple(said)
