"""Everything about a scene that does not depend on the sun, made once."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from causticload.light.bvh import Engine, Tracer, build_tracer
from causticload.light.facets import Facets, make_facets
from causticload.light.splat import Grids, make_grids
from causticload.light.targets import Meanings, make_meanings
from causticload.light.tubes import Tubes, cut_to_length, whole_facets
from causticload.optics.finish import Finish
from causticload.optics.tables import ReflectanceTables
from causticload.scene.model import Bools, Floats, Ints, Scene
from causticload.sky.disc import SunDisc

# Longest edge of a tube before any light: its rays must not step over a pier or a tree trunk.
LONGEST_EDGE_M = 4.0


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
    sheet_of: Ints  # (m,) sheet met by a second reflection, -1 off reflectors
    points: Floats  # (n, 3) m, local
    point_normals: Floats  # (n, 3) unit
    point_areas: Floats  # (n,) m²
    point_surface: Ints  # (n,) number of the surface
    mirror_point: Bools  # (n,) the point lies on a reflector
    clearance_m: float
    _rings: dict[tuple[float, int | None], tuple[Floats, Floats]] = field(default_factory=dict)

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
    scene: Scene, *, finishes: list[Finish], disc: SunDisc, engine: Engine = "auto"
) -> LitScene:
    """Make a scene ready for light.

    Parameters
    ----------
    scene : Scene
        What stands there.
    finishes : list of Finish
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
    F = make_facets(scene)
    tables = ReflectanceTables.build([f.combined() for f in finishes])
    sheet_of = np.where(scene.panel >= 0, tables.first_sheet[scene.surface], -1).astype(np.int32)
    facet = scene.reflectors
    base = cut_to_length(F, whole_facets(F, facet, sheet_of[facet]), longest_m=LONGEST_EDGE_M)
    grids = make_grids(scene.charts)
    mirrors = np.array([("reflector" in s.roles) for s in scene.surfaces], dtype=bool)
    counts = [len(c.areas) for c in scene.charts]
    point_surface = np.repeat([c.surface for c in scene.charts], counts).astype(np.int32)
    normals = np.array([c.normal for c in scene.charts], dtype=float).reshape(-1, 3)
    size = float(np.ptp(scene.triangles.reshape(-1, 3), axis=0).max()) if len(F.area) else 1.0
    return LitScene(
        scene=scene,
        F=F,
        grids=grids,
        meanings=make_meanings(scene),
        tracer=build_tracer(scene.triangles, engine=engine),
        base=base,
        disc=disc,
        R=tables.R,
        slope_error=tables.slope_error,
        scatter=tables.diffuse_fraction,
        first_sheet=tables.enters,
        sheet_of=sheet_of,
        points=np.concatenate([c.points for c in scene.charts] or [np.zeros((0, 3))]),
        point_normals=np.repeat(normals, counts, axis=0),
        point_areas=np.concatenate([c.areas for c in scene.charts] or [np.zeros(0)]),
        point_surface=point_surface,
        mirror_point=mirrors[point_surface],
        # Embree works in single precision: stay clear by more than its last digit.
        clearance_m=max(1e-3, 4e-7 * size),
    )
