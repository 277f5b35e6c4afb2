"""What stands there, as arrays: the scene that light travels through.

Frames: the *model* frame is the file's own after unit (to metres) and up axis (to Z up); the
*local* frame, used by every array here, is the model frame moved so that the scene's middle is
the origin, so that coordinates 500 km from home lose no digits. The axes stay those of the model:
``+Y`` points to the bearing ``model_north``; the sun is turned into this frame, not the mesh.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.integer[Any]]
Bools = NDArray[np.bool_]


@dataclass(frozen=True, kw_only=True)
class Surface:
    """One named part of the model with its role. Index in ``Scene.surfaces`` is its number."""

    name: str  # object, group, layer or material name from the file, made unique
    file: str  # file it came from
    roles: frozenset[str]  # of "reflector", "receiver", "obstruction"
    form: str = "flat"
    finish: str = ""  # reflectors only
    figure: str | None = None
    spacing: float = 0.0  # m, receivers only; 0: chosen by the charts
    kind: str = ""  # receivers only
    material: str = ""  # receivers only; empty: the usual one of its kind
    triangles: int = 0
    assumed: tuple[str, ...] = ()  # sentences on what was assumed for this surface


@dataclass(frozen=True, kw_only=True)
class Panels:
    """Panes and sheets of the reflectors, one row each. ``p`` panels."""

    surface: Ints  # (p,) number of the surface
    area: Floats  # (p,) m²
    centroid: Floats  # (p, 3) m, local
    normal: Floats  # (p, 3) unit, area mean
    flat: Bools  # (p,) one plane, corner normals all equal
    width_axis: Floats  # (p, 3) unit, in the pane's plane, horizontal where that is defined
    size: Floats  # (p, 2) m, extent along width axis and across it

    def __len__(self) -> int:
        return len(self.area)


@dataclass(frozen=True, kw_only=True)
class PaneFigures:
    """How far panes are from flat. ``p`` panels, ``g`` rows: a pane of a panel, outermost first.

    Heights are along the panel's normal, outward positive, over the plane coordinates (x, y) along
    its width axis and across it, from the middle of its bounding box.
    """

    first: Ints  # (p,) row of the panel's outermost pane, -1: as the mesh has it
    count: Ints  # (p,) panes
    middle: Floats  # (p, 3) m, local
    height_axis: Floats  # (p, 3) unit, normal x width axis
    half: Floats  # (p, 2) m, half sizes of the bounding box
    panel: Ints  # (g,)
    shape: Ints  # (g,) row of shapes, -1: no bow
    bow: Floats  # (g,) m, largest deflection
    wave: Floats  # (g,) m, half of peak to valley
    wave_number: Floats  # (g, 2) rad/m along width and height
    phase: Floats  # (g,) rad
    follow: Ints  # (g,) 1: follow the wave, 0: take its mean over phases, -1: by cost
    tilt: Floats  # (g, 2) slope along width and height
    kink: Floats  # (g,) m, lift at the rim of the edges in kinked
    kink_width: Floats  # (g,) m
    kinked: Floats  # (p, 4, 3) lines a x + b y + c, the distance inwards [m]; c = inf: none
    shapes: Floats  # (s, n, n) powers of x and y over the half sizes; the largest value is 1
    tops: Floats  # (s, 2) where that is, over the half sizes


@dataclass(frozen=True, kw_only=True)
class Chart:
    """A planar piece of a receiver with a regular grid of cells.

    Cell (i, j) covers ``origin + (i..i+1) h u + (j..j+1) h v``. ``cell[i, j]`` is the number of
    its point within the chart, or -1 where the grid is not on the receiver. A cell that the edge
    of the receiver cuts keeps the cut area and the middle of what is left as its point.
    """

    surface: int
    origin: Floats  # (3,) m, local: the corner of cell (0, 0)
    u: Floats  # (3,) unit, in the plane
    v: Floats  # (3,) unit, in the plane, perpendicular to u
    normal: Floats  # (3,) unit, u x v, the lit side
    spacing: float  # h, m
    cell: Ints  # (nu, nv) point number or -1
    points: Floats  # (n, 3) m, local
    areas: Floats  # (n,) m²
    first: int = 0  # number of the chart's point 0 among all points of the scene


@dataclass(frozen=True, kw_only=True)
class Fault:
    """Something found in the model that the user should know. ``kind`` is a short slug."""

    kind: str
    count: int
    surface: str
    message: str
    hint: str


@dataclass(frozen=True, kw_only=True)
class Scene:
    """Everything that stands there. ``m`` triangles, ``n`` receiver points."""

    origin: Floats  # (3,) m: model coordinates = local + origin
    north_rad: float  # bearing of +Y, clockwise from true north
    triangles: Floats  # (m, 3, 3) m, local; no zero-area, nan or duplicate triangle
    surface: Ints  # (m,) number of the surface
    panel: Ints  # (m,) number of the panel, -1 off reflectors
    chart: Ints  # (m,) number of the chart, -1 off receivers (or beyond reach)
    corner_normals: Floats  # (m, 3, 3) unit; the face normal off smooth reflectors
    curvature: Floats  # (m, 3, 2) 1/m principal curvatures at the corners; 0 on flat panels
    surfaces: tuple[Surface, ...]
    panels: Panels
    charts: tuple[Chart, ...]
    faults: tuple[Fault, ...] = ()
    assumed: tuple[str, ...] = ()  # sentences for the user
    source_triangle: Ints = field(default_factory=lambda: np.zeros(0, np.int32))
    # (m,) row of the triangle in its file's surface, to hand colours back in the file's order
    figures: PaneFigures | None = None  # None: every pane is as the mesh has it

    @property
    def point_count(self) -> int:
        """Number of receiver points over all charts."""
        return sum(len(c.areas) for c in self.charts)

    @property
    def reflectors(self) -> Ints:
        """Numbers of the triangles that reflect, (k,)."""
        return np.flatnonzero(self.panel >= 0).astype(np.int32)
