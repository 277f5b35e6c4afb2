"""The sample buildings: remade to the same shapes, and the engine's figures held on them."""

import importlib.util
from pathlib import Path

import numpy as np
import pytest

import causticload as cl
from causticload.light.field import solve_field
from causticload.light.points import solve_points

SAMPLES = Path(__file__).parents[1] / "sample_meshes"


def test_the_script_remakes_the_meshes(tmp_path):
    spec = importlib.util.spec_from_file_location("make_samples", SAMPLES / "make_samples.py")
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    module.HERE = tmp_path
    module.make_tower()
    module.make_pavilion()
    module.make_crescent()
    made = {p.name for p in tmp_path.iterdir()}
    assert made == {p.name for p in SAMPLES.iterdir()} - {
        p.name for p in SAMPLES.iterdir() if p.suffix in (".toml", ".py", ".png", "")
    }
    assert (tmp_path / "tower.obj").read_text() == (SAMPLES / "tower.obj").read_text()


@pytest.fixture(scope="module", params=["tower", "pavilion", "crescent"])
def project(request):
    return cl.open_project(cl.read_study(SAMPLES / f"{request.param}.toml"))


SUNS = [(az, el) for az in (110.0, 145.0, 180.0, 215.0, 250.0) for el in (8.0, 20.0, 38.0, 58.0)]


@pytest.mark.slow
def test_ledger_closes_at_twenty_suns(project):
    for azimuth, elevation in SUNS:
        L = cl.solve_instant(project, sun=(azimuth, elevation)).ledger
        out = ("absorbed", "receivers", "obstructions", "sky", "scattered", "unfollowed")
        assert L["intercepted"] > 0.0
        gap = L["intercepted"] - sum(L[k] for k in out)
        assert abs(gap) <= 0.005 * L["intercepted"], (azimuth, elevation, gap / L["intercepted"])


@pytest.mark.slow
def test_peak_agrees_with_its_ray_count(project):
    lit = project.lit
    instant = cl.solve_instant(project, sun=(190.0, 38.0))
    s, radius = instant.sun.direction, instant.sun.radius
    field = solve_field(lit, sun_direction=s, sun_radius=radius)
    top = int(field.load.argmax())
    receiver = next(
        r for r in instant.receivers.values() if r.first <= top < r.first + len(r.areas)
    )
    k = np.arange(200) + 0.5
    r, turn = 0.2 * np.sqrt(k / 200), k * 2.39996
    n = lit.point_normals[top]
    e1 = np.cross(n, [0.3, 0.5, 0.81])
    e1 /= np.linalg.norm(e1)
    e2 = np.cross(n, e1)
    disc = lit.points[top] + (r * np.cos(turn))[:, None] * e1 + (r * np.sin(turn))[:, None] * e2
    light = solve_points(
        lit,
        sun_direction=s,
        sun_radius=radius,
        points=disc,
        normals=np.tile(n, (200, 1)),
        bounced=field.bounced,
    )
    count = cl.count_rays(
        project,
        receiver=receiver.name,
        centre=lit.points[top] + project.scene.origin,
        radius=0.2,
        sun=(190.0, 38.0),
        beam=1.0,
        rays=400_000,
    )
    assert count.hits > 300
    assert abs(light.load.mean() - count.mean) < 3.5 * count.standard_error
