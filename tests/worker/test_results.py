"""Values, colours, panels and jobs as a host sees them."""

from pathlib import Path

import matplotlib
import numpy as np
import pytest
from client import Client, scene

COARSE = {"day_stride": 30, "step_minutes": 30}
AT = "2025-03-05T13:40"


def arrays_of(answer: dict) -> dict[str, np.ndarray]:
    with np.load(answer["arrays"]) as file:
        return {key: file[key] for key in file.files}


@pytest.fixture(scope="module")
def loaded(worker: Client, tmp_path_factory: pytest.TempPathFactory) -> Client:
    path = tmp_path_factory.mktemp("scene") / "a.npz"
    worker.call("load", scene=scene(path, year=COARSE))
    return worker


@pytest.fixture(scope="module")
def screened(loaded: Client) -> dict:
    return loaded.call("year", checks=3)


def test_colours_are_those_of_the_map(loaded: Client) -> None:
    instant = loaded.call("instant", at=AT)
    arrays, high = arrays_of(instant), instant["scale"]["high"]
    assert instant["scale"]["low"] == 0.0
    assert high >= arrays["r0/reflected"].max()
    # matplotlib's own table, Nuñez, Anderton & Renslow, PLoS ONE 13(7), 2018.
    expected = matplotlib.colormaps["cividis"](arrays["r0/reflected"] / high, bytes=True)
    assert np.array_equal(arrays["r0/colours"], expected)
    bar = matplotlib.colormaps["cividis"](np.linspace(0, 1, 64), bytes=True)
    assert np.array_equal(instant["scale"]["colours"], bar[:, :3])


@pytest.mark.slow
def test_cautions_come_with_every_figure(loaded: Client, screened: dict) -> None:
    for answer in (loaded.call("instant", at=AT), screened):
        assert any("screening aid" in c for c in answer["cautions"])


def test_marks_lie_on_the_scale(loaded: Client) -> None:
    total = loaded.call("instant", at=AT, show="total")
    names = {m["name"]: m["value"] for m in total["scale"]["marks"]}
    # ISO 13571:2012 gives 2.5 kW/m2; API 521's 1.58 is rounded down.
    assert names["skin pain"] == 2500.0
    assert names["skin, prolonged"] == 1500.0
    assert all(v <= total["scale"]["high"] for v in names.values())
    arrays = arrays_of(total)
    assert (arrays["r0/total"] >= arrays["r0/reflected"]).all()
    over = arrays["r0/over"]
    assert over.any()
    # Where reflected light takes part, over is what its total says against the lowest limit.
    counts = arrays["r0/reflected"] >= 50.0
    assert np.array_equal(over[counts], (arrays["r0/total"] > 1500.0)[counts])
    assert arrays["marks"].shape[1:] == (4, 3)


def test_rays_obey_the_mirror_law(loaded: Client) -> None:
    instant = loaded.call("instant", at=AT)
    behind = loaded.call("contributors")
    rays = arrays_of(behind)["rays"]
    assert len(rays) > 2
    sun, turn, spot = rays[:, 0], rays[:, 1], rays[:, 2]
    assert spot == pytest.approx(np.tile(behind["place_m"], (len(rays), 1)), abs=1e-6)
    # They turn on chords of a cylinder of 30 m radius, so at most its sagitta of 29 mm inside;
    # they are drawn by the middle of their tubes, which may be some millimetres off.
    radius = np.hypot(turn[:, 0], turn[:, 1])
    assert (radius <= 30.0 + 5e-3).all()
    assert (radius >= 30.0 * np.cos(np.radians(2.5)) - 5e-3).all()
    inward = -turn * [1, 1, 0] / radius[:, None]
    to_sun = (sun - turn) / np.linalg.norm(sun - turn, axis=1, keepdims=True)
    mirrored = 2.0 * (to_sun * inward).sum(axis=1)[:, None] * inward - to_sun
    gone = (spot - turn) / np.linalg.norm(spot - turn, axis=1, keepdims=True)
    off = np.arccos(np.clip((mirrored * gone).sum(axis=1), -1.0, 1.0))
    # The sun's radius is 4.7 mrad; a tube's rays may run 5 mrad beside its middle.
    assert off.max() < 0.010
    azimuth, elevation = np.radians([instant["sun"]["azimuth"], instant["sun"]["elevation"]])
    away = [
        np.sin(azimuth) * np.cos(elevation),
        np.cos(azimuth) * np.cos(elevation),
        np.sin(elevation),
    ]
    assert to_sun == pytest.approx(np.tile(away, (len(rays), 1)), abs=1e-9)


def test_contributions_add_up(loaded: Client) -> None:
    loaded.call("instant", at=AT)
    behind = loaded.call("contributors")
    rows = behind["contributors"]
    assert sum(r["share"] for r in rows) == pytest.approx(1.0, abs=1e-9)
    assert [r["load"] for r in rows] == sorted((r["load"] for r in rows), reverse=True)
    assert {r["object"] for r in rows} == {"Glass [bow]"}
    arrays = arrays_of(behind)
    assert arrays["facade/contribution"].max() == pytest.approx(rows[0]["load"])
    assert len(arrays["facade/colours"]) == 48


@pytest.mark.slow
def test_year_lists_and_moment_jumps(loaded: Client, screened: dict) -> None:
    worst = screened["episodes"][0]
    assert worst["number"] == 1
    assert worst["receiver"] == "Yard"
    assert "Yard" in worst["text"]
    assert "Yard" in screened["seasons"][0]["text"]
    moment = loaded.call("moment", episode=1)
    # The same instant, asked for by its local time, gives the same figures.
    again = loaded.call("instant", at=moment["local"])
    assert arrays_of(again)["r0/reflected"] == pytest.approx(
        arrays_of(moment)["r0/reflected"], rel=1e-9, abs=1e-9
    )
    behind = loaded.call("contributors", episode=1)
    assert behind["place_m"] == pytest.approx(worst["place_m"], abs=1e-6)
    # An episode's peak is total; what is reflected must be most of it and never more.
    assert 0.5 * worst["peak_W_m2"] < behind["reflected_W_m2"] < worst["peak_W_m2"]
    assert loaded.fail("moment", episode=10**6)["data"]["where"] == "episode"


@pytest.mark.slow
def test_paint(loaded: Client, screened: dict) -> None:
    hours = loaded.call("paint", show="hours", criterion="skin pain")
    every = loaded.call("paint", show="hours")
    assert hours["scale"]["unit"] == "h/year"
    h, e = arrays_of(hours)["r0/hours"], arrays_of(every)["r0/hours"]
    assert 0.0 < h.max() < 4400.0  # half of a year's hours have no sun
    assert (e >= h).all()
    assert loaded.fail("paint", show="hours", criterion="nonsense")["data"]["where"] == "criterion"


def test_change_is_later_less_earlier(loaded: Client, tmp_path: Path) -> None:
    np.savez(tmp_path / "a.npz", a=np.array([0.0, 100.0, 30.0]), b=np.array([80.0, 0.0, 30.0]))
    answer = loaded.call("change", arrays=str(tmp_path / "a.npz"), before="a", after="b")
    arrays = arrays_of(answer)
    assert np.array_equal(arrays["change"], [80.0, -100.0, 0.0])
    assert (answer["scale"]["low"], answer["scale"]["high"]) == (-100.0, 100.0)
    np.savez(tmp_path / "b.npz", a=np.zeros(3), b=np.zeros(4))
    wrong = loaded.fail("change", arrays=str(tmp_path / "b.npz"), before="a", after="b")
    assert "one length" in wrong["data"]["message"]


def test_newest_instant_wins(loaded: Client, tmp_path: Path) -> None:
    # While the scene is made anew, five instants wait; only the last is worth solving.
    load = loaded.send("load", scene=scene(tmp_path / "b.npz", spacing=0.2, year=COARSE))
    numbers = [loaded.send("instant", at=f"2025-03-21T12:{m:02d}") for m in range(5)]
    answers = [loaded.wait(n) for n in numbers]
    assert [a.get("error", {}).get("code") for a in answers] == [-32001] * 4 + [None]
    assert "result" in loaded.wait(load)
    assert answers[-1]["result"]["time"].startswith("2025-03-21 12:04")


@pytest.mark.slow
def test_year_in_the_background(fresh: Client, tmp_path: Path) -> None:
    fine = {"day_stride": 1, "step_minutes": 1}  # many minutes of work
    fresh.call("load", scene=scene(tmp_path / "a.npz", year=fine))
    fresh.call("instant", at=AT)  # compiles what can be
    year = fresh.send("year")
    while not fresh.notes:
        fresh.call("hello")  # is answered all the while
    assert fresh.notes[-1]["params"]["id"] == year
    assert fresh.fail("year")["code"] == -32003
    assert fresh.call("instant", at=AT)["hottest"]["reflected_W_m2"] > 0.0
    assert not fresh.call("cancel", id=10**9)["found"]
    assert fresh.call("cancel", id=year)["found"]
    assert fresh.wait(year)["error"]["code"] == -32002
    # Nothing is stuck: the next year starts.
    again = fresh.send("year")
    assert fresh.call("cancel", id=again)["found"]
    assert fresh.wait(again)["error"]["code"] == -32002
