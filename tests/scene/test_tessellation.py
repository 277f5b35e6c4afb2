"""The tessellation check on surfaces whose normals are known."""

import numpy as np
import pytest

from causticload.scene.normals import fit_corner_normals
from causticload.scene.panels import find_panels
from causticload.scene.tessellation import _judge, normal_errors


def cylinder(radius=40.0, width=1.5, height=3.5, columns=20, rows=6):
    phi = np.arange(columns + 1) * width / radius
    a, z = np.meshgrid(phi, np.arange(rows + 1) * height, indexing="ij")
    p = np.stack([radius * np.sin(a), radius * np.cos(a), z], -1)
    n = np.stack([-np.sin(a), -np.cos(a), 0 * a], -1)
    return quads(p), quads(n)


def sphere(radius=30.0, step=1.0, count=16):
    u, v = np.meshgrid(*[np.arange(-count, count + 1) * step / radius / 2] * 2, indexing="ij")
    n = np.stack([np.sin(u), np.sin(v) * np.cos(u), np.cos(v) * np.cos(u)], -1)
    return quads(radius * n), quads(n)


def quads(g):
    a, b, c, d = g[:-1, :-1], g[1:, :-1], g[1:, 1:], g[:-1, 1:]
    return np.stack([np.stack([a, b, c], 2), np.stack([a, c, d], 2)], axis=2).reshape(-1, 3, 3)


def face_normals(T):
    n = np.cross(T[:, 1] - T[:, 0], T[:, 2] - T[:, 0])
    return n / np.linalg.norm(n, axis=1, keepdims=True)


@pytest.mark.parametrize("shape", [cylinder, sphere])
def test_true_normals_pass(shape):
    T, N = shape()
    assert 1e3 * np.sqrt(np.mean(normal_errors(T, N) ** 2)) < 0.2


@pytest.mark.parametrize("shape", [cylinder, sphere])
def test_facet_normals_are_found_out(shape):
    T, N = shape()
    flat = np.repeat(face_normals(T)[:, None], 3, axis=1)
    flat *= np.sign(np.einsum("kji,kji->kj", flat, N))[:, :, None]
    true = np.sqrt(np.mean(np.arccos(np.clip(np.einsum("kji,kji->kj", flat, N), -1, 1)) ** 2))
    said = np.sqrt(np.mean(normal_errors(T, flat) ** 2))
    assert true / 3 < said < 3 * true  # an estimate, to a factor of three
    assert _judge("x", 1e3 * said, 1e3 * said).verdict == "too coarse"


def test_rounded_coordinates_are_found_out():
    T, _ = cylinder()
    rounded = np.round(T, 2)
    fitted, _ = fit_corner_normals(rounded, crease_angle_rad=0.5)
    assert 1e3 * np.sqrt(np.mean(normal_errors(rounded, fitted) ** 2)) > 1.0


@pytest.mark.parametrize("shape", [cylinder, sphere])
def test_fitted_normals_are_exact_to_well_under_a_milliradian(shape):
    T, N = shape()
    fitted, curvature = fit_corner_normals(T, crease_angle_rad=0.5)
    cos = np.abs(np.einsum("kji,kji->kj", fitted, N))
    error = np.arccos(np.clip(cos, -1, 1))
    assert 1e3 * np.sqrt(np.mean(error**2)) < 0.3
    radius = 40.0 if shape is cylinder else 30.0
    assert np.median(np.abs(curvature[:, :, 0])) == pytest.approx(1 / radius, rel=0.03)


def test_creases_are_kept():
    import trimesh

    T = np.array(trimesh.creation.box((4, 3, 2)).subdivide().triangles)
    fitted, curvature = fit_corner_normals(T, crease_angle_rad=0.5)
    assert np.einsum("kji,ki->kj", fitted, face_normals(T)) == pytest.approx(1.0, abs=1e-9)
    assert np.abs(curvature).max() < 1e-9


def test_coplanar_faces_are_one_flat_panel_and_quads_are_panes():
    T, N = cylinder(columns=5, rows=2)
    k = len(T)
    panel, panels = find_panels(T, np.zeros(k, np.int32), np.zeros(k, bool), None)
    # flat form: each vertical strip is one plane
    assert len(panels) == 5
    assert panels.flat.all()
    assert panels.area.sum() == pytest.approx(
        0.5 * np.linalg.norm(np.cross(T[:, 1] - T[:, 0], T[:, 2] - T[:, 0]), axis=1).sum()
    )
    panel, panels = find_panels(T, np.zeros(k, np.int32), np.ones(k, bool), N)
    assert len(panels) == 10
    assert (np.bincount(panel) == 2).all()
