"""The tessellation check: whether a mesh can carry the answer, told by the mesh itself.

On a smooth surface the chord between two vertices is square to the mean of their normals, to the
third order. What it misses, and by how much the normals of neighbouring facets disagree at a
shared vertex, is taken as what is left wrong with the normals. An error ``e`` turns a reflected
ray by ``2 e``: it moves the image by ``2 e D`` at a distance ``D``, where the sun's own image is
9.3 mrad times ``D`` wide, so the verdict does not depend on the distance.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from causticload.scene.model import Floats, Scene
from causticload.scene.topology import weld

SUN_DIAMETER_MRAD = 9.30
CARRIES, MARGINAL = 0.2, 0.5  # shift over the diameter of the sun's image
SHOWN_AT_M = 30.0
CREASE_RAD = np.radians(30.0)


@dataclass(frozen=True, kw_only=True)
class TessellationCheck:
    """What the check says of one smooth surface."""

    surface: str
    rms_mrad: float  # area-weighted error of the normals
    worst_mrad: float  # of one triangle
    share: float  # shift of the image over the diameter of the sun's image, from the rms
    verdict: str  # "carries the answer" | "marginal" | "too coarse"
    sentence: str


def normal_errors(triangles: Floats, corner_normals: Floats) -> Floats:
    """Estimate what is wrong with the normals of each triangle of a smooth surface.

    Parameters
    ----------
    triangles : (k, 3, 3) float
        Corners. [m]
    corner_normals : (k, 3, 3) float
        Unit normals at the corners.

    Returns
    -------
    error : (k,) float
        Root mean square over its edges and corners. [rad]
    """
    chord = np.roll(triangles, -1, axis=1) - triangles
    mean = np.roll(corner_normals, -1, axis=1) + corner_normals
    scale = np.linalg.norm(chord, axis=2) * np.linalg.norm(mean, axis=2)
    miss = np.einsum("kei,kei->ke", chord, mean) / np.maximum(scale, 1e-300)
    vertex = weld(triangles.reshape(-1, 3))
    normal = corner_normals.reshape(-1, 3)
    count = np.bincount(vertex)[:, None]
    middle = np.stack([np.bincount(vertex, n) for n in normal.T], axis=1) / count
    middle /= np.maximum(np.linalg.norm(middle, axis=1, keepdims=True), 1e-300)
    jump = np.arccos(np.clip(np.einsum("ki,ki->k", normal, middle[vertex]), -1.0, 1.0))
    jump[jump > CREASE_RAD] = 0.0  # a crease is meant
    return np.sqrt(np.mean(miss**2 + jump.reshape(-1, 3) ** 2, axis=1))


def check_tessellation(scene: Scene) -> list[TessellationCheck]:
    """Check every smooth reflector of a scene.

    Parameters
    ----------
    scene : Scene
        The scene.

    Returns
    -------
    checks : list of TessellationCheck
        In the order of the surfaces.
    """
    checks = []
    for number, surface in enumerate(scene.surfaces):
        mine = np.flatnonzero((scene.surface == number) & (scene.panel >= 0))
        if surface.form != "smooth" or not len(mine):
            continue
        T = scene.triangles[mine]
        error = 1e3 * normal_errors(T, scene.corner_normals[mine])
        area = np.linalg.norm(np.cross(T[:, 1] - T[:, 0], T[:, 2] - T[:, 0]), axis=1)
        rms = float(np.sqrt(np.average(error**2, weights=area)))
        checks.append(_judge(surface.name, rms, float(error.max())))
    return checks


def _judge(name: str, rms: float, worst: float) -> TessellationCheck:
    share = 2.0 * rms / SUN_DIAMETER_MRAD
    if share <= CARRIES:
        verdict, cure = "carries the answer", ""
    elif share <= MARGINAL:
        verdict = "marginal"
        cure = " Export corner normals with the mesh, or a finer mesh."
    else:
        verdict = "too coarse"
        cure = (
            f" Peaks will be wrong. Export corner normals, or a mesh about "
            f"{int(np.ceil(np.sqrt(share / CARRIES)))} times finer with more decimals."
        )
    sentence = (
        f"{verdict}: normals are uncertain by about {rms:.2f} mrad (worst triangle {worst:.1f}), "
        f"which moves an image by {2e-3 * rms * SHOWN_AT_M * 1e3:.0f} mm at {SHOWN_AT_M:g} m, "
        f"{100.0 * share:.0f} % of the sun's image.{cure}"
    )
    return TessellationCheck(
        surface=name,
        rms_mrad=rms,
        worst_mrad=worst,
        share=share,
        verdict=verdict,
        sentence=sentence,
    )
