"""The three tracers against one another, and each against plain geometry."""

from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest

from causticload.errors import InputError
from causticload.light.bvh import build_tracer

ENGINES = ["embree", "own", "rtree"]


def soup(n, seed=1):
    rng = np.random.default_rng(seed)
    middle = rng.uniform(-50, 50, (n, 1, 3))
    return middle + rng.normal(scale=2.0, size=(n, 3, 3))


def rays(n, seed=2):
    rng = np.random.default_rng(seed)
    origins = rng.uniform(-60, 60, (n, 3))
    directions = rng.normal(size=(n, 3))
    return origins, directions / np.linalg.norm(directions, axis=1, keepdims=True)


@pytest.mark.parametrize("engine", ["own", "rtree"])
def test_engines_agree_on_random_scenes(engine):
    n = 300 if engine == "rtree" else 5000
    T = soup(400)
    o, d = rays(n)
    a, b = build_tracer(T, engine="embree"), build_tracer(T, engine=engine)
    (ta, da), (tb, db) = a.first_hit(o, d), b.first_hit(o, d)
    assert (ta >= 0).mean() > 0.03
    # Embree decides in single precision: two triangles less than 0.1 mm apart may swap
    differ = ta != tb
    assert differ.mean() < 2e-3
    both = ~differ & (ta >= 0)
    assert da[both] == pytest.approx(db[both], abs=1e-7)
    limit = np.random.default_rng(3).uniform(1.0, 60.0, n)
    near = np.abs(np.where(np.isfinite(db), db, 1e9) - limit) < 1e-3
    oa, ob = a.occluded(o, d, limit=limit), b.occluded(o, d, limit=limit)
    assert (oa != ob)[~near].mean() < 2e-3
    assert (b.occluded(o, d) == (tb >= 0)).all()


def test_own_hierarchy_agrees_with_brute_force():
    # Every triangle by a linear solve: no hierarchy, no early out.
    T = soup(60, seed=5)
    o, d = rays(400, seed=6)
    best, found = np.full(400, np.inf), np.full(400, -1)
    for m, (a, b, c) in enumerate(T):
        system = np.stack([np.broadcast_to(b - a, d.shape), np.broadcast_to(c - a, d.shape), -d], 2)
        u, v, t = np.linalg.solve(system, (o - a)[:, :, None])[:, :, 0].T
        hit = (u >= 0) & (v >= 0) & (u + v <= 1) & (t > 1e-6) & (t < best)
        best[hit], found[hit] = t[hit], m
    triangle, distance = build_tracer(T, engine="own").first_hit(o, d)
    assert (triangle == found).all()
    assert distance[found >= 0] == pytest.approx(best[found >= 0], rel=1e-9)


def closed_box():
    import trimesh

    return np.array(trimesh.creation.box((2.0, 3.0, 4.0)).subdivide().subdivide().triangles)


@pytest.mark.parametrize("engine", ["embree", "own"])
def test_no_ray_slips_between_triangles(engine):
    # From inside a closed box at every edge middle and vertex, and along the axes.
    T = closed_box()
    targets = np.concatenate([T.reshape(-1, 3), 0.5 * (T + np.roll(T, 1, axis=1)).reshape(-1, 3)])
    targets = np.concatenate([targets, np.eye(3), -np.eye(3)])
    o = np.tile([0.01, -0.02, 0.03], (len(targets), 1))
    o[-6:] = 0.0
    d = targets - o
    d /= np.linalg.norm(d, axis=1, keepdims=True)
    triangle, distance = build_tracer(T, engine=engine).first_hit(o, d)
    assert (triangle >= 0).all()
    assert (distance < 3.0).all()


@pytest.mark.parametrize("engine", ["auto", "embree", "own"])
def test_nothing_there(engine):
    tracer = build_tracer(np.zeros((0, 3, 3)), engine=engine)
    o, d = rays(5)
    triangle, distance = tracer.first_hit(o, d)
    assert (triangle == -1).all()
    assert np.isinf(distance).all()
    assert not tracer.occluded(o, d).any()
    empty = np.zeros((0, 3))
    assert len(build_tracer(soup(3), engine=engine).first_hit(empty, empty)[0]) == 0


@pytest.mark.parametrize("engine", ["embree", "own"])
def test_nan_rays_miss(engine):
    o, d = rays(3)
    d[1] = np.nan
    triangle, _ = build_tracer(soup(50), engine=engine).first_hit(o, d)
    assert triangle[1] == -1


@pytest.mark.parametrize("engine", ["embree", "own"])
def test_huge_ground_and_tiny_things(engine):
    half = 5000.0
    ground = np.array([[[-half, -half, 0], [half, -half, 0], [0, 2 * half, 0]]], float)
    pin = np.array([[[0, 0, 1.0], [0.02, 0, 1.0], [0, 0.02, 1.0]]])
    tracer = build_tracer(np.concatenate([ground, pin]), engine=engine)
    o = np.array([[0.005, 0.005, 3.0], [0.5, 0.5, 3.0]])
    d = np.tile([0.0, 0.0, -1.0], (2, 1))
    triangle, distance = tracer.first_hit(o, d)
    assert list(triangle) == [1, 0]
    assert distance == pytest.approx([2.0, 3.0], abs=1e-9)


@pytest.mark.parametrize("engine", ["embree", "own"])
def test_threads_agree(engine):
    tracer = build_tracer(soup(2000), engine=engine)
    o, d = rays(40_000)
    alone = tracer.first_hit(o, d)
    with ThreadPoolExecutor(2) as pool:
        parts = list(
            pool.map(lambda k: tracer.first_hit(o[k], d[k]), np.split(np.arange(40_000), 2))
        )
    assert (np.concatenate([p[0] for p in parts]) == alone[0]).all()


@pytest.mark.parametrize("bad", [np.zeros((2, 3)), np.full((1, 3, 3), np.nan)])
def test_bad_triangles(bad):
    with pytest.raises(InputError, match="triangles"):
        build_tracer(bad)


def test_unknown_engine():
    with pytest.raises(InputError, match="engine"):
        build_tracer(soup(1), engine="warp")


def test_own_hierarchy_leaves_no_cracks_for_rays_from_afar():
    # A floor of squares near the origin; each ray is aimed within 10 µm of an edge that two
    # squares share, from 500 m away, where single precision has steps of 30 µm.
    i, j = (x.ravel()[:, None] for x in np.indices((40, 40)))
    a = np.concatenate([0.7 * (i - 20), 0.7 * (j - 20), 0.0 * i], axis=1)
    x, y = np.array([0.7, 0.0, 0.0]), np.array([0.0, 0.7, 0.0])
    T = np.concatenate([np.stack([a, a + x, a + x + y], 1), np.stack([a, a + x + y, a + y], 1)])
    rng = np.random.default_rng(8)
    n = 20_000
    target = 0.7 * rng.integers(-19, 19, (n, 3)) * [1.0, 1.0, 0.0]
    target += rng.uniform(-1e-5, 1e-5, (n, 3)) * [1, 1, 0]
    target[: n // 2, 0] += rng.uniform(0.0, 0.7, n // 2)
    o = rng.uniform([300, -400, 10], [400, -300, 80], (n, 3))
    d = target - o
    far = np.linalg.norm(d, axis=1)
    triangle, distance = build_tracer(T, engine="own").first_hit(o, d / far[:, None])
    assert (triangle >= 0).all()
    assert distance == pytest.approx(far, abs=1e-9)


def test_own_hierarchy_holds_triangles_that_no_split_parts():
    # A thousand copies of one triangle: their middles are the same.
    T = np.tile(np.array([[[0, 0, 0], [1, 0, 0], [0, 1, 0]]], float), (1000, 1, 1))
    T[500:, :, 2] += 1e-4 * np.arange(500)[:, None]
    tracer = build_tracer(T, engine="own")
    o, d = np.array([[0.2, 0.2, 5.0]]), np.array([[0.0, 0.0, -1.0]])
    triangle, distance = tracer.first_hit(o, d)
    assert triangle[0] == 999
    assert distance[0] == pytest.approx(5.0 - 0.0499, abs=1e-12)
    assert tracer.occluded(o, d, limit=np.array([4.9502]))[0]
    assert not tracer.occluded(o, d, limit=np.array([4.9500]))[0]


def test_own_hierarchy_takes_rays_in_any_order():
    # Many rays are sorted before they are sent, some from far outside, some not numbers at all.
    tracer = build_tracer(soup(500), engine="own")
    o, d = rays(9000)
    o[::7] *= 40.0
    d[5::70] = np.nan
    triangle, distance = tracer.first_hit(o, d)
    few = [tracer.first_hit(o[k : k + 1000], d[k : k + 1000]) for k in range(0, 9000, 1000)]
    assert (triangle == np.concatenate([f[0] for f in few])).all()
    assert (distance == np.concatenate([f[1] for f in few])).all()
    assert (triangle[5::70] == -1).all()
    assert 0.03 < (triangle >= 0).mean() < 0.9
    assert (tracer.occluded(o, d) == (triangle >= 0)).all()
