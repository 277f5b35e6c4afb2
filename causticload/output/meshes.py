"""Results as meshes: with all arrays for engineers, and coloured for any modelling program."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pyvista as pv
import trimesh

from causticload.output.colours import MARK, NEUTRAL, REFLECTOR, Colours, map_colours
from causticload.scene.focus import focal_distances
from causticload.scene.model import Bools, Chart, Floats, Ints, Scene

# Coloured copies stand this far off the surface they belong to, or the two would flicker.
RAISE_M = 0.005
# The mark around flagged cells: a ribbon this share of a cell wide, and at least this many metres.
RIBBON_SHARE, RIBBON_M = 0.08, 0.02
HATCH_CELLS = 4  # one diagonal stroke in so many cells


@dataclass(frozen=True)
class Cells:
    """Grid cells of receivers as quadrilaterals. ``n`` points, ``k`` corner points."""

    vertices: Floats  # (k, 3) m, model coordinates
    quads: Ints  # (n, 4)
    normals: Floats  # (n, 3)
    spacing: Floats  # (n,) m


def cells_of(scene: Scene, charts: Sequence[Chart] | None = None) -> Cells:
    """Turn the grid cells of charts into quadrilaterals, in the order of the points.

    A cell that the edge of its receiver cuts is drawn whole.

    Parameters
    ----------
    scene : Scene
        The scene.
    charts : sequence of Chart, optional
        Charts to draw; all of the scene if they are not given.

    Returns
    -------
    cells : Cells
        Model coordinates.
    """
    vertices, quads, normals, spacing = [], [], [], []
    base = 0
    for c in scene.charts if charts is None else charts:
        i, j = np.nonzero(c.cell >= 0)
        order = np.argsort(c.cell[i, j])
        i, j = i[order], j[order]
        nv = c.cell.shape[1]
        used, inverse = np.unique(
            np.stack(
                [
                    i * (nv + 1) + j,
                    (i + 1) * (nv + 1) + j,
                    (i + 1) * (nv + 1) + j + 1,
                    i * (nv + 1) + j + 1,
                ],
                axis=1,
            ),
            return_inverse=True,
        )
        a, b = np.divmod(used, nv + 1)
        vertices.append(
            c.origin
            + scene.origin
            + (a * c.spacing)[:, None] * c.u
            + (b * c.spacing)[:, None] * c.v
        )
        quads.append(inverse.reshape(-1, 4) + base)
        normals.append(np.broadcast_to(c.normal, (len(i), 3)))
        spacing.append(np.full(len(i), c.spacing))
        base += len(used)
    if not quads:
        return Cells(np.zeros((0, 3)), np.zeros((0, 4), int), np.zeros((0, 3)), np.zeros(0))
    return Cells(
        np.concatenate(vertices),
        np.concatenate(quads),
        np.concatenate(normals),
        np.concatenate(spacing),
    )


def cell_grid(cells: Cells, arrays: Mapping[str, Any], notes: Mapping[str, str]) -> pv.PolyData:
    """Build the receivers as polygons with their arrays.

    Parameters
    ----------
    cells : Cells
        The cells.
    arrays : mapping of str to (n,) array
        One value a cell; the unit is part of the name.
    notes : mapping of str to str
        Field data: title, units, cautions.

    Returns
    -------
    mesh : pyvista.PolyData
        Ready to save.
    """
    faces = np.column_stack([np.full(len(cells.quads), 4), cells.quads]).ravel()
    return _with_arrays(pv.PolyData(cells.vertices, faces), arrays, notes)


def facade_grid(scene: Scene, arrays: Mapping[str, Any], notes: Mapping[str, str]) -> pv.PolyData:
    """Build the reflectors' triangles with one value a triangle.

    Parameters
    ----------
    scene : Scene
        The scene.
    arrays : mapping of str to (k,) or (k, 3) array
        One row a reflecting triangle, in the order of ``scene.reflectors``.
    notes : mapping of str to str
        Field data.

    Returns
    -------
    mesh : pyvista.PolyData
        Model coordinates.
    """
    T = scene.triangles[scene.reflectors] + scene.origin
    faces = np.column_stack([np.full(len(T), 3), np.arange(3 * len(T)).reshape(-1, 3)]).ravel()
    return _with_arrays(pv.PolyData(T.reshape(-1, 3), faces), arrays, notes)


def focus_arrays(scene: Scene, sun_direction: Floats) -> dict[str, Floats]:
    """Focal distances of the facade under one sun, for :func:`facade_grid`.

    Parameters
    ----------
    scene : Scene
        The scene.
    sun_direction : (3,) float
        Unit vector to the sun, scene frame.

    Returns
    -------
    arrays : dict of str to (k,) float
        Metres along the reflected ray; negative where light spreads from a virtual focus, nan
        where there is none within 100 km.
    """
    focus = focal_distances(scene, sun_direction)
    return {"focal tangential [m]": focus.tangential, "focal sagittal [m]": focus.sagittal}


def _with_arrays(
    mesh: pv.PolyData, arrays: Mapping[str, Any], notes: Mapping[str, str]
) -> pv.PolyData:
    for name, values in arrays.items():
        mesh.cell_data[name] = values
    for name, text in notes.items():
        mesh.field_data[name] = np.array([text])
    return mesh


def coloured_cells(
    cells: Cells, values: Floats, *, high: float, flagged: Bools, shown: Bools | None = None
) -> trimesh.Trimesh:
    """Build the receivers coloured by load, with flagged regions outlined and hatched.

    Parameters
    ----------
    cells : Cells
        The cells.
    values : (n,) float
        Load. [W/m²]
    high : float
        End of the scale, which starts at 0. [W/m²]
    flagged : (n,) bool
        Cells over a criterion.
    shown : (n,) bool, optional
        Cells to draw; all if they are not given.

    Returns
    -------
    mesh : trimesh.Trimesh
        One colour a face; the marks are faces of their own, above the cells.
    """
    draw = np.ones(len(values), bool) if shown is None else shown
    corner = cells.vertices[cells.quads] + RAISE_M * cells.normals[:, None]
    colours = map_colours(values, low=0.0, high=high)
    marks = flag_marks(cells, flagged & draw)
    quads = np.concatenate([corner[draw], marks])
    face_colours = np.concatenate(
        [colours[draw], np.broadcast_to(np.array(MARK, np.uint8), (len(marks), 4))]
    )
    return quad_mesh(quads, face_colours)


def quad_mesh(quads: Floats, colours: Colours) -> trimesh.Trimesh:
    """Turn quadrilaterals into two triangles each, every corner with its face's colour.

    Parameters
    ----------
    quads : (n, 4, 3) float
        Corners in order. [m]
    colours : (n, 4) uint8
        One a quadrilateral.

    Returns
    -------
    mesh : trimesh.Trimesh
        4 n vertices.
    """
    n = len(quads)
    faces = (np.arange(n)[:, None, None] * 4 + np.array([[0, 1, 2], [0, 2, 3]])).reshape(-1, 3)
    return trimesh.Trimesh(
        vertices=quads.reshape(-1, 3),
        faces=faces,
        vertex_colors=np.repeat(colours, 4, axis=0),
        process=False,
    )


def flag_marks(cells: Cells, flagged: Bools) -> Floats:
    """Ribbons around flagged regions and hatching across them, so that colour is not alone.

    Parameters
    ----------
    cells : Cells
        The cells.
    flagged : (n,) bool
        Cells over a criterion.

    Returns
    -------
    quads : (q, 4, 3) float
        Corners of the ribbons. [m]
    """
    q = cells.quads[flagged]
    if not len(q):
        return np.zeros((0, 4, 3))
    n = cells.normals[flagged]
    width = np.maximum(RIBBON_SHARE * cells.spacing[flagged], RIBBON_M)
    edges = np.stack([q, np.roll(q, -1, axis=1)], axis=2).reshape(-1, 2)
    key = np.sort(edges, axis=1)
    _, inverse, count = np.unique(key, axis=0, return_inverse=True, return_counts=True)
    rim = count[inverse.ravel()] == 1
    ends = cells.vertices[edges[rim]]
    lift = 2.0 * RAISE_M * np.repeat(n, 4, axis=0)[rim]
    ribbons = _ribbons(ends + lift[:, None], np.repeat(n, 4, axis=0)[rim], np.repeat(width, 4)[rim])
    corner = cells.vertices[q]
    # A stroke along the diagonal of every few cells, by where the cell lies: an even pattern.
    place = np.round(corner.mean(axis=1) / cells.spacing[flagged][:, None]).astype(int)
    stroke = place.sum(axis=1) % HATCH_CELLS == 0
    diagonals = corner[stroke][:, [0, 2]] + 2.0 * RAISE_M * n[stroke][:, None]
    hatch = _ribbons(diagonals, n[stroke], 0.6 * width[stroke])
    return np.concatenate([ribbons, hatch])


def _ribbons(ends: Floats, normals: Floats, width: Floats) -> Floats:
    """Flat ribbons along segments ``ends`` (n, 2, 3), lying across ``normals``."""
    along = ends[:, 1] - ends[:, 0]
    along /= np.maximum(np.linalg.norm(along, axis=1, keepdims=True), 1e-12)
    side = 0.5 * width[:, None] * np.cross(normals, along)
    a, b = ends[:, 0], ends[:, 1]
    return np.stack([a - side, b - side, b + side, a + side], axis=1)


def coloured_facade(scene: Scene, contribution: Floats, *, high: float) -> trimesh.Trimesh:
    """Build the reflectors coloured by what each panel adds to the worst peak.

    Parameters
    ----------
    scene : Scene
        The scene.
    contribution : (p,) float
        One value a panel. [W/m²]
    high : float
        End of the scale, which starts at 0. [W/m²]

    Returns
    -------
    mesh : trimesh.Trimesh
        Model coordinates.
    """
    r = scene.reflectors
    values = contribution[scene.panel[r]]
    colours = map_colours(values, low=0.0, high=high)
    colours[values <= 0.0] = REFLECTOR
    return _triangle_mesh(scene.triangles[r] + scene.origin, colours)


def _triangle_mesh(T: Floats, colours: Colours) -> trimesh.Trimesh:
    return trimesh.Trimesh(
        vertices=T.reshape(-1, 3),
        faces=np.arange(3 * len(T)).reshape(-1, 3),
        vertex_colors=np.repeat(colours, 3, axis=0),
        process=False,
    )


def surroundings(scene: Scene) -> trimesh.Trimesh:
    """Build everything that does not reflect, in plain grey.

    Parameters
    ----------
    scene : Scene
        The scene.

    Returns
    -------
    mesh : trimesh.Trimesh
        Model coordinates.
    """
    rest = scene.panel < 0
    T = scene.triangles[rest] + scene.origin
    return _triangle_mesh(T, np.tile(np.array(NEUTRAL, np.uint8), (len(T), 1)))


def write_ply(mesh: trimesh.Trimesh, path: Path, notes: Mapping[str, str]) -> None:
    """Write a coloured PLY whose header carries the scale and the cautions as comments.

    Parameters
    ----------
    mesh : trimesh.Trimesh
        The mesh.
    path : Path
        Where to.
    notes : mapping of str to str
        One comment each.
    """
    data = mesh.export(file_type="ply", encoding="binary")
    comments = "".join(f"comment {key}: {' '.join(text.split())}\n" for key, text in notes.items())
    head, rest = data.split(b"\n", 2)[:2], data.split(b"\n", 2)[2]
    text = comments.encode("ascii", "replace")
    path.write_bytes(b"\n".join(head) + b"\n" + text + rest)


def _linear(display: Colours) -> Colours:
    """Display colours as the linear ones that the format asks for (IEC 61966-2-1)."""
    share = np.asarray(display, float) / 255.0
    rgb = share[:, :3]
    share[:, :3] = np.where(rgb <= 0.04045, rgb / 12.92, ((rgb + 0.055) / 1.055) ** 2.4)
    return np.round(255.0 * share).astype(np.uint8)


def write_glb(parts: Mapping[str, trimesh.Trimesh], path: Path, notes: Mapping[str, str]) -> None:
    """Write coloured parts as one GLB, turned to its Y-up axes; the scale is in its extras.

    Parameters
    ----------
    parts : mapping of str to trimesh.Trimesh
        Named parts; empty ones are left out.
    path : Path
        Where to.
    notes : mapping of str to str
        Written as ``extras`` of the scene.
    """
    scene = trimesh.Scene()
    to_y_up = np.array([[1, 0, 0, 0], [0, 0, 1, 0], [0, -1, 0, 0], [0, 0, 0, 1]], float)
    for name, mesh in parts.items():
        if len(mesh.faces):
            part = mesh.copy()
            part.visual.vertex_colors = _linear(part.visual.vertex_colors)
            scene.add_geometry(part, node_name=name, geom_name=name)
    scene.apply_transform(to_y_up)
    scene.metadata.update(notes)

    def double_sided(tree: dict[str, Any]) -> None:
        tree["materials"] = [
            {
                "name": "result colours",
                "doubleSided": True,
                "pbrMetallicRoughness": {"metallicFactor": 0.0, "roughnessFactor": 1.0},
                "extensions": {"KHR_materials_unlit": {}},
            }
        ]
        tree["extensionsUsed"] = [*tree.get("extensionsUsed", []), "KHR_materials_unlit"]
        for mesh in tree["meshes"]:
            for primitive in mesh["primitives"]:
                primitive["material"] = 0
        tree.setdefault("asset", {})["extras"] = dict(notes)

    path.write_bytes(trimesh.exchange.gltf.export_glb(scene, tree_postprocessor=double_sided))
