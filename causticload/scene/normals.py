"""Corner normals and curvature of smooth surfaces, from positions or from given normals.

Light amplifies a normal's error: 1 mrad moves an image by 60 mm at 30 m. So normals are not
averaged over facets but fitted (:mod:`causticload.scene.jets`).

Curvature is positive where the surface is concave towards the side of its normal, that is where it
gathers light that arrives from that side; a sphere of radius R has -1/R on its outside.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from causticload.errors import InputError
from causticload.scene.jets import tangent_frame
from causticload.scene.model import Floats
from causticload.scene.stencils import choose_sides, find_nodes, fit_nodes
from causticload.scene.topology import face_normals, require_triangles, weld

CREASE_RAD = float(np.radians(25.0))  # usual limit; neighbours that fold by more meet at a crease
_SAME_NORMAL_RAD = 1e-3  # corners of one vertex with closer normals share their curvature


@dataclass(frozen=True, kw_only=True)
class CornerFit:
    """What the fit says at each corner of ``k`` triangles."""

    normal: Floats  # (k, 3, 3) unit, on the side of the face's winding
    tensor: Floats  # (k, 3, 3, 3) 1/m, curvature form, > 0 where concave towards the normal
    slope_error: Floats  # (k, 3) rad, standard error by the misfit
    gain: Floats  # (k, 3) rad/m, error for 1 m rms of noise in the coordinates


def fit_corner_normals(
    triangles: Floats, *, crease_angle_rad: float = CREASE_RAD
) -> tuple[Floats, Floats]:
    """Rebuild corner normals and curvature from the positions alone.

    Parameters
    ----------
    triangles : (k, 3, 3) float
        Corners. Windings need not agree. [m]
    crease_angle_rad : float
        Neighbours that fold by more do not belong together: their corners get normals of their
        own side. In (0, π]. [rad]

    Returns
    -------
    corner_normals : (k, 3, 3) float
        Unit normals, on the side of each triangle's winding.
    curvature : (k, 3, 2) float
        Principal curvatures, the stronger first; positive where concave towards the normal. [1/m]

    Raises
    ------
    InputError
        The crease angle or the triangles are out of range.
    """
    fit = fit_corners(triangles, crease_angle_rad=crease_angle_rad)
    return fit.normal, _principal(fit.tensor, fit.normal)


def fit_corners(triangles: Floats, *, crease_angle_rad: float = CREASE_RAD) -> CornerFit:
    """As :func:`fit_corner_normals`, with what is needed to judge the fit.

    Where one polynomial does not suit a neighbourhood but half of it suits far better, the half
    is taken: a flat wall that runs into a rounded corner stays flat up to the tangent line, and
    a kink too gentle to count as a crease keeps a normal for each side.

    Parameters
    ----------
    triangles : (k, 3, 3) float
        Corners. [m]
    crease_angle_rad : float
        Largest fold within a smooth surface, in (0, π]. [rad]

    Returns
    -------
    fit : CornerFit
        Normals, curvature and errors.

    Raises
    ------
    InputError
        The crease angle or the triangles are out of range.
    """
    require_triangles(triangles)
    if not 0.0 < crease_angle_rad <= np.pi:
        raise InputError(f"crease_angle_rad must be in (0, pi], got {crease_angle_rad!r}")
    nodes = find_nodes(triangles, crease_angle_rad=crease_angle_rad)
    jets, source = choose_sides(nodes, fit_nodes(nodes), triangles)
    normals, _ = face_normals(triangles)
    fitted = jets.normal[source]
    turn = np.where(np.einsum("kci,ki->kc", fitted, normals) < 0.0, -1.0, 1.0)
    return CornerFit(
        normal=fitted * turn[..., None],
        tensor=jets.tensor[source] * turn[..., None, None],
        slope_error=jets.slope_error[source],
        gain=jets.gain[source],
    )


def curvature_from_normals(triangles: Floats, corner_normals: Floats) -> Floats:
    """Curvature that given corner normals imply.

    Each triangle gives the form that best explains how the normal turns along its edges; corners of
    one vertex with the same normal share the area-weighted mean.

    Parameters
    ----------
    triangles : (k, 3, 3) float
        Corners. [m]
    corner_normals : (k, 3, 3) float
        Unit normals at the corners.

    Returns
    -------
    curvature : (k, 3, 2) float
        Principal curvatures, the stronger first; positive where concave towards the normal. [1/m]

    Raises
    ------
    InputError
        The arrays do not fit together.

    References
    ----------
    S. Rusinkiewicz, "Estimating curvatures and their derivatives on triangle meshes", 2nd
    International Symposium on 3D Data Processing, Visualization and Transmission (2004), sec. 3.
    """
    require_triangles(triangles)
    if corner_normals.shape != triangles.shape:
        raise InputError(
            f"corner_normals must have shape {triangles.shape}, got {corner_normals.shape}"
        )
    normals, areas = face_normals(triangles)
    u, v = tangent_frame(normals)
    axes = np.stack([u, v], axis=1)  # (k, 2, 3)
    edge = np.einsum("kci,kai->kca", np.roll(triangles, -1, axis=1) - triangles, axes)
    turn = np.einsum("kci,kai->kca", np.roll(corner_normals, -1, axis=1) - corner_normals, axes)
    # the normal turns by -S e along e. In units of the triangle's own axes (edge 0, and across)
    # a thin triangle is solved as well as a round one.
    size = np.maximum(np.abs(edge).max(axis=(1, 2)), 1e-300)[:, None, None]
    x, y = np.moveaxis(edge / size, 2, 0)
    zero = np.zeros_like(x)
    rows = np.concatenate([np.stack([x, y, zero], -1), np.stack([zero, x, y], -1)], axis=1)
    right = -np.concatenate([turn[..., 0], turn[..., 1]], axis=1)
    form = np.einsum("kij,kj->ki", np.linalg.pinv(rows, rcond=1e-9), right) / size[:, 0]
    shape = form[:, [0, 1, 1, 2]].reshape(-1, 2, 2)
    tensor = np.einsum("kab,kai,kbj->kij", shape, axes, axes)

    both = np.concatenate(
        [triangles.reshape(-1, 3) / 1e-4, corner_normals.reshape(-1, 3) / _SAME_NORMAL_RAD], axis=1
    )
    node = weld(both, 1.0)
    weight = np.repeat(areas, 3)
    spread = np.repeat(tensor.reshape(-1, 9), 3, axis=0) * weight[:, None]
    sums: Floats = np.stack([np.bincount(node, s).astype(float) for s in spread.T], axis=1)
    total = sums / np.maximum(np.bincount(node, weight), 1e-300)[:, None]
    return _principal(total[node].reshape(-1, 3, 3, 3), corner_normals)


def _principal(tensor: Floats, normals: Floats) -> Floats:
    """Eigenvalues in the tangent plane, the stronger first. (k, 3, 2)"""
    u, v = tangent_frame(normals.reshape(-1, 3))
    axes = np.stack([u, v], axis=1)
    form = np.einsum("nij,nai,nbj->nab", tensor.reshape(-1, 3, 3), axes, axes)
    value = np.linalg.eigvalsh(form)
    order = np.argsort(-np.abs(value), axis=1, kind="stable")
    return np.take_along_axis(value, order, axis=1).reshape(*normals.shape[:2], 2)
