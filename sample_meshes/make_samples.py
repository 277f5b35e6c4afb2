"""Make the three sample buildings: invented places, shapes and stories.

    python sample_meshes/make_samples.py

writes, beside itself, the meshes that the study files here name:

- ``tower.obj`` (with normals): Larkfield Tower, a concave, leaning, smoothly glazed front over a
  plaza, with a street and twenty neighbours, one of them with a market canopy;
- ``pavilion.glb`` (Y up, a node with a transform, no normals): the Heron Pavilion, a doubly curved
  shell of polished steel by a footpath, with a kiosk;
- ``crescent-glazing.ply``, ``crescent-houses.ply``, ``crescent-street.ply``: Saltmarsh Crescent,
  600 flat panes, each a little turned, opposite a row of vinyl-clad houses.

It is deterministic: the same bytes each time with the same libraries.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import trimesh

HERE = Path(__file__).resolve().parent


def box(x0, y0, x1, y1, z0, z1):
    """Six quads of a box, facing outwards."""
    p = np.array([[x, y, z] for z in (z0, z1) for x, y in ((x0, y0), (x1, y0), (x1, y1), (x0, y1))])
    sides = [[0, 3, 2, 1], [4, 5, 6, 7], [0, 1, 5, 4], [1, 2, 6, 5], [2, 3, 7, 6], [3, 0, 4, 7]]
    return p, np.array(sides)


def grid(points):
    """Quads of an (n, m, 3) grid of points."""
    n, m = points.shape[:2]
    k = np.arange(n * m).reshape(n, m)
    quads = np.stack([k[:-1, :-1], k[1:, :-1], k[1:, 1:], k[:-1, 1:]], axis=-1)
    return points.reshape(-1, 3), quads.reshape(-1, 4)


class Obj:
    """A Wavefront OBJ text in the making."""

    def __init__(self):
        self.lines = ["# Larkfield Tower: an invented building. Metres, Z up."]
        self.vertices = self.normals = 0

    def add(self, name, points, faces, normals=None):
        """Add an object; with normals, one for each point."""
        self.lines.append(f"o {name}")
        self.lines += [f"v {x:.5f} {y:.5f} {z:.5f}" for x, y, z in points]
        if normals is not None:
            self.lines += [f"vn {x:.7f} {y:.7f} {z:.7f}" for x, y, z in normals]
        for face in faces:
            if normals is None:
                corners = [f"{self.vertices + i + 1}" for i in face]
            else:
                corners = [f"{self.vertices + i + 1}//{self.normals + i + 1}" for i in face]
            self.lines.append("f " + " ".join(corners))
        self.vertices += len(points)
        self.normals += 0 if normals is None else len(normals)

    def write(self, path):
        """Write the file."""
        path.write_text("\n".join(self.lines) + "\n", encoding="ascii", newline="\n")


TOWER = {"radius": 130.0, "half_angle": 0.21, "height": 52.0, "lean": 0.04, "shrink": 0.1}


def tower_front(phi, z):
    """Point of the tower's front at angle ``phi`` and height ``z``: a leaning, tapering arc.

    The arc's middle stands at the origin; it faces south. Its radius shrinks with height and it
    leans forward, so that reflected light comes together on the plaza.
    """
    t = TOWER
    radius = t["radius"] * (1.0 - t["shrink"] * z / t["height"])
    x = radius * np.sin(phi)
    y = radius * (np.cos(phi) - 1.0) - t["lean"] * z
    return np.stack([x, y, z + 0.0 * x], axis=-1)


def normal_of(surface, a, b, step=1e-5):
    """Unit normal of a parametric surface by central differences, to the -y side."""
    da = surface(a + step, b) - surface(a - step, b)
    db = surface(a, b + step) - surface(a, b - step)
    n = np.cross(da, db)
    n /= np.linalg.norm(n, axis=-1, keepdims=True)
    return np.where(n[..., 1:2] > 0.0, -n, n)


def make_tower():
    """The tower, its plaza, its street and its neighbours."""
    obj = Obj()
    phi = np.linspace(-TOWER["half_angle"], TOWER["half_angle"], 35)
    z = np.linspace(5.0, TOWER["height"], 19)
    a, b = np.meshgrid(phi, z, indexing="ij")
    points, quads = grid(tower_front(a, b))
    obj.add("Glazing south", points, quads, normal_of(tower_front, a, b).reshape(-1, 3))
    left, right = tower_front(phi[0], z[:1])[0], tower_front(phi[-1], z[:1])[0]
    points, quads = box(left[0] - 0.5, 1.5, right[0] + 0.5, 24.0, 0.0, TOWER["height"] + 2.0)
    obj.add("Tower shell", points, quads)
    for name, x0, y0, x1, y1 in (
        ("Plaza", -42.0, -46.0, 42.0, 1.5),
        ("Street", -80.0, -56.0, 80.0, -46.0),
    ):
        corners = np.array([[x0, y0, 0], [x1, y0, 0], [x1, y1, 0], [x0, y1, 0]], float)
        obj.add(name, corners, [[0, 1, 2, 3]])
    rng = np.random.default_rng(20)
    places = [(-78 + 16.0 * k, -74.0) for k in range(10)]
    places += [(x, y) for x in (-78.0, 64.0) for y in (-40.0, -22.0, -4.0, 14.0)]
    places += [(-60.0, 40.0), (44.0, 40.0)]
    for k, (x, y) in enumerate(places, start=1):
        points, quads = box(x, y, x + 13.0, y + 14.0, 0.0, float(rng.integers(9, 24)))
        obj.add(f"Neighbour {k:02d}", points, quads)
    points, quads = box(16.0, -43.0, 30.0, -37.0, 3.2, 3.3)
    obj.add("Canopy", points, quads)
    obj.write(HERE / "tower.obj")


def shell(u, v):
    """Point of the pavilion's shell: a dish 20 m by 12 m that faces south and leans back."""
    depth = u**2 / (2.0 * 26.0) + v**2 / (2.0 * 22.0)
    tilt = np.radians(-8.0)
    forward = v * np.sin(tilt) + depth * np.cos(tilt)
    up = v * np.cos(tilt) - depth * np.sin(tilt)
    return np.stack([u, -forward, 7.2 + up], axis=-1)


def make_pavilion():
    """The shell, the footpath, the lawn and the kiosk, as GLB: Y up, millimetres nowhere."""
    u, v = np.meshgrid(np.linspace(-10, 10, 41), np.linspace(-6, 6, 25), indexing="ij")
    points, quads = grid(shell(u, v))
    parts = {"Shell mirror": (points, quads)}
    parts["Kiosk"] = box(7.0, -15.0, 10.0, -12.0, 0.0, 3.0)
    for name, x0, y0, x1, y1, z in (
        ("Footpath", -22.0, -11.0, 22.0, -6.5, 0.02),
        ("Lawn south", -22.0, -24.0, 22.0, -11.0, 0.0),
        ("Lawn north", -22.0, -6.5, 22.0, 8.0, 0.0),
    ):
        corners = np.array([[x0, y0, z], [x1, y0, z], [x1, y1, z], [x0, y1, z]], float)
        parts[name] = (corners, np.array([[0, 1, 2, 3]]))
    scene = trimesh.Scene()
    # The file's nodes stand at the kiosk's corner: a transform that a reader must apply.
    shift = np.eye(4)
    shift[:3, 3] = [7.0, 0.0, 15.0]
    for name, (p, q) in parts.items():
        y_up = np.stack([p[:, 0], p[:, 2], -p[:, 1]], axis=1) - shift[:3, 3]
        faces = np.concatenate([q[:, [0, 1, 2]], q[:, [0, 2, 3]]])
        mesh = trimesh.Trimesh(y_up, faces, process=False)
        scene.add_geometry(mesh, node_name=name, geom_name=name, transform=shift)
    (HERE / "pavilion.glb").write_bytes(
        trimesh.exchange.gltf.export_glb(scene, include_normals=False)
    )


CRESCENT = {"radius": 92.0, "columns": 50, "rows": 12, "width": 1.5, "height": 2.0}


def make_crescent():
    """600 flat panes on an arc, each turned a little from its neighbours, and houses opposite."""
    c = CRESCENT
    rng = np.random.default_rng(7)
    step = 1.02 * c["width"] / c["radius"]
    panes = []
    for i in range(c["columns"]):
        phi = (i - (c["columns"] - 1) / 2) * step
        middle = np.array([c["radius"] * np.sin(phi), c["radius"] * (np.cos(phi) - 1.0)])
        for j in range(c["rows"]):
            turn = phi + np.radians(rng.uniform(-0.25, 0.25))
            tip = np.radians(rng.uniform(-0.25, 0.25))
            along = np.array([np.cos(turn), -np.sin(turn), 0.0])
            front = np.array([-np.sin(turn), -np.cos(turn), 0.0])
            up = np.array([0.0, 0.0, np.cos(tip)]) + np.sin(tip) * front
            o = np.array([*middle, 2.0 + 1.02 * c["height"] * j])
            w, h = 0.5 * c["width"] * along, c["height"] * up
            panes.append([o - w, o + w, o + w + h, o - w + h])
    q = np.array(panes)
    tri = np.concatenate([q[:, [0, 1, 2]], q[:, [0, 2, 3]]], axis=1).reshape(-1, 3, 3)
    _write_ply("crescent-glazing", tri)
    houses = [box(-45.0 + 11.5 * k, -56.0, -35.0 + 11.5 * k, -46.0, 0.0, 7.5) for k in range(8)]
    _write_ply("crescent-houses", np.concatenate([_triangles(*b) for b in houses]))
    street = np.array([[-50, -46, 0], [50, -46, 0], [50, -2, 0], [-50, -2, 0]], float)
    _write_ply("crescent-street", _triangles(street, np.array([[0, 1, 2, 3]])))


def _triangles(points, quads):
    return np.concatenate([points[quads[:, [0, 1, 2]]], points[quads[:, [0, 2, 3]]]])


def _write_ply(name, triangles):
    faces = np.arange(3 * len(triangles)).reshape(-1, 3)
    mesh = trimesh.Trimesh(triangles.reshape(-1, 3), faces, process=False)
    mesh.merge_vertices()
    (HERE / f"{name}.ply").write_bytes(mesh.export(file_type="ply", vertex_normal=False))


if __name__ == "__main__":
    make_tower()
    make_pavilion()
    make_crescent()
