"""Small scenes for the tests of light, built from arrays: no files, no study."""

import numpy as np

from causticload.light.prepare import prepare
from causticload.optics.finish import Finish, Lobe, Reflection
from causticload.scene.model import Chart, Panels, Scene, Surface
from causticload.sky.disc import SunDisc


class UniformDisc:
    """An evenly bright sun, written out here; rough surfaces blur it as the sky package says."""

    def rings(self, radius_rad, *, slope_error_rad=0.0, count=None):
        if slope_error_rad > 0.0:
            return SunDisc("uniform").rings(
                radius_rad, slope_error_rad=slope_error_rad, count=count
            )
        return np.array([radius_rad]), np.array([1.0])

    def sample(self, rng, n, radius_rad):
        r, turn = radius_rad * np.sqrt(rng.random(n)), 2.0 * np.pi * rng.random(n)
        return np.stack([r * np.cos(turn), r * np.sin(turn)], axis=1)


def unit(v):
    v = np.asarray(v, dtype=float)
    return v / np.linalg.norm(v, axis=-1, keepdims=True)


def grid_triangles(values):
    """Two triangles for each cell of an (n, m, 3) grid of corner values."""
    a, b, c, d = values[:-1, :-1], values[1:, :-1], values[1:, 1:], values[:-1, 1:]
    return np.concatenate(
        [
            np.stack([a, b, c], axis=2).reshape(-1, 3, 3),
            np.stack([a, c, d], axis=2).reshape(-1, 3, 3),
        ]
    )


def face_normals(triangles):
    return unit(np.cross(triangles[:, 1] - triangles[:, 0], triangles[:, 2] - triangles[:, 0]))


def plane_chart(centre, normal, *, half, spacing, u=None, surface=1):
    """A square chart and its two triangles."""
    n = unit(normal)
    helper = np.array([1.0, 0.0, 0.0]) if abs(n[0]) < 0.9 else np.array([0.0, 1.0, 0.0])
    u = unit(helper - (helper @ n) * n) if u is None else unit(u)
    v = np.cross(n, u)
    count = round(2 * half / spacing)
    origin = np.asarray(centre, float) - half * (u + v)
    i, j = (x.ravel() + 0.5 for x in np.indices((count, count)))
    points = origin + (i * spacing)[:, None] * u + (j * spacing)[:, None] * v
    chart = Chart(
        surface=surface,
        origin=origin,
        u=u,
        v=v,
        normal=n,
        spacing=spacing,
        cell=np.arange(count * count, dtype=np.int32).reshape(count, count),
        points=points,
        areas=np.full(count * count, spacing**2),
    )
    size = count * spacing
    corners = np.array([origin, origin + size * u, origin + size * (u + v), origin + size * v])
    return chart, corners[[[0, 1, 2], [0, 2, 3]]]


def lit_scene(
    mirrors,
    normals=None,
    *,
    receiver=None,
    obstacles=None,
    R=None,
    smooth=True,
    engine="auto",
    mirror_units=None,
    receiver_mirrors=False,
):
    """A prepared scene of mirrors, one receiver and obstacles.

    ``mirrors`` (k, 3, 3) with corner ``normals`` (k, 3, 3), face normals if None; ``receiver`` is
    what :func:`plane_chart` returns, a mirror too with ``receiver_mirrors``;
    ``R`` reflectance, a number or an (s, p) table (2, angles).
    """
    k = len(mirrors)
    parts, kinds = [mirrors], [np.zeros(k, int)]
    charts = ()
    if receiver is not None:
        charts = (receiver[0],)
        parts.append(receiver[1])
        kinds.append(np.ones(2, int))
    if obstacles is not None:
        parts.append(obstacles)
        kinds.append(np.full(len(obstacles), 2))
    triangles, kind = np.concatenate(parts), np.concatenate(kinds).astype(np.int32)
    corner_normals = np.repeat(face_normals(triangles)[:, None], 3, axis=1)
    if normals is not None:
        corner_normals[:k] = normals
    panel = np.where(kind == 0, np.arange(len(kind)), -1).astype(np.int32)
    if mirror_units is not None:  # panel number of each mirror triangle
        panel[:k] = mirror_units
    if receiver_mirrors:
        panel[kind == 1] = panel.max() + 1
    receives = {"receiver", "reflector"} if receiver_mirrors else {"receiver"}
    p = int(panel.max(initial=-1)) + 1
    first = np.array([np.flatnonzero(panel == q)[0] for q in range(p)], dtype=int)
    scene = Scene(
        origin=np.zeros(3),
        north_rad=0.0,
        triangles=triangles,
        surface=kind,
        panel=panel,
        chart=np.where(kind == 1, 0, -1).astype(np.int32),
        corner_normals=corner_normals,
        curvature=np.zeros((len(kind), 3, 2)),
        surfaces=(
            Surface(name="mirror", file="", roles=frozenset({"reflector"})),
            Surface(name="receiver", file="", roles=frozenset(receives)),
            Surface(name="obstacle", file="", roles=frozenset({"obstruction"})),
        ),
        panels=Panels(
            surface=np.zeros(p, np.int32),
            area=np.ones(p),
            centroid=triangles[first].mean(axis=1),
            normal=corner_normals[first, 0],
            flat=np.full(p, not smooth),
            width_axis=np.zeros((p, 3)),
            size=np.ones((p, 2)),
        ),
        charts=charts,
    )
    return prepare(scene, finishes=[table_finish(R)] * 3, disc=UniformDisc(), engine=engine)


def table_finish(R=None):
    """A finish of one sheet; ``R`` a number, an (s, p) table (2, angles) or None for 1."""
    table = np.broadcast_to(1.0 if R is None else np.asarray(R, float), (2, 361))
    angle = np.radians(np.linspace(0.0, 90.0, 361))

    def law(theta):
        both = np.stack([np.interp(theta, angle, row) for row in table])
        return np.broadcast_to(both, (1, 2, *both.shape)).copy()

    return Finish(
        name="table",
        lobes=(Lobe(name="sheet"),),
        reflection=Reflection(law),
        angular="table",
        source="test",
        solar_range=(0.0, 1.0),
    )


def quadric_mirror(k_xx, k_xy, k_yy, *, half=0.2, cells=8):
    """A mirror facing +z at the origin, curved towards +z where curvatures are positive."""
    line = np.linspace(-half, half, cells + 1)
    x, y = np.meshgrid(line, line, indexing="ij")
    z = 0.5 * (k_xx * x**2 + 2.0 * k_xy * x * y + k_yy * y**2)
    slope = np.stack([-(k_xx * x + k_xy * y), -(k_xy * x + k_yy * y), np.ones_like(x)], axis=-1)
    return grid_triangles(np.stack([x, y, z], axis=-1)), grid_triangles(unit(slope))


def cylinder_mirror(radius, *, half_angle, bottom, top, cells):
    """A wall facing -x on a vertical cylinder about the z axis: the sun shines along +x."""
    phi = np.linspace(-half_angle, half_angle, cells + 1)
    z = np.array([bottom, top])
    a, b = np.meshgrid(phi, z, indexing="ij")
    place = np.stack([radius * np.cos(a), radius * np.sin(a), b], axis=-1)
    normal = np.stack([-np.cos(a), -np.sin(a), np.zeros_like(a)], axis=-1)
    return grid_triangles(place), grid_triangles(normal)


def balance(field):
    """Relative gap of a field's ledger."""
    L = field.ledger
    out = sum(
        L[k] for k in ("absorbed", "receivers", "obstructions", "sky", "scattered", "unfollowed")
    )
    return (L["intercepted"] - out) / L["intercepted"]
