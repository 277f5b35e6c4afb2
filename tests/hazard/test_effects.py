"""Doses, temperatures, cures and grades on histories that are known."""

from types import SimpleNamespace

import numpy as np
import pytest
from scenes import lit_scene, plane_chart, unit
from scipy.integrate import quad

from causticload.errors import InputError
from causticload.hazard.effects import (
    assess_skin,
    assess_surface,
    grade,
    least_panels,
    material_of,
)
from causticload.hazard.findings import Contributor
from causticload.hazard.histories import History, follow_place
from causticload.hazard.material_table import material
from causticload.hazard.materials import Surroundings, steady_temperature_c
from causticload.hazard.peaks import SunState

DAY = np.datetime64("2025-06-21T06:00:00")


def history(reflected, minutes, direct=800.0, diffuse=100.0):
    n = len(minutes)
    return History(
        DAY + np.asarray(minutes).astype("timedelta64[m]"),
        np.asarray(reflected, float),
        np.full(n, direct),
        np.full(n, diffuse),
        np.full(n, 25.0),
        np.full(n, 1.0),
    )


def check(total=4000.0, width=1.2, agrees=True):
    return SimpleNamespace(total=total, width=width, agrees=agrees)


def test_skin_dose_of_a_passing_spot_agrees_with_an_integral():
    # A hump of reflected light over 20 minutes; ISO 13571 counts only above 2.5 kW/m2.
    minutes = np.arange(0, 41)
    hump = 3100.0 * np.exp(-(((minutes - 20) / 6.0) ** 2))
    found = assess_skin(history(hump, minutes), check())

    def rate(t, c, n):
        q = np.interp(t, minutes, hump + 900.0) / 1000.0
        return (c * q**-n) ** -1 if q > 2.5 else 0.0

    # times of the law in minutes: 4.2 q^-1.9 (from memory), 6.9 q^-1.56 (published)
    pain = quad(rate, 0, 40, args=(4.2, 1.9), limit=400, points=minutes[1:-1])[0]
    burn = quad(rate, 0, 40, args=(6.9, 1.56), limit=400, points=minutes[1:-1])[0]
    assert found.pain_dose == pytest.approx(pain, rel=1e-4)
    assert found.burn_dose == pytest.approx(burn, rel=1e-4)
    assert found.seconds_to_pain == pytest.approx(60 * 4.2 * 4.0**-1.9, rel=1e-6)
    # 1.2 m across at 1.2 m/s is one second at the peak
    assert found.walking_pain_dose == pytest.approx(1.0 / found.seconds_to_pain, rel=1e-6)


def test_skin_under_the_limit_gathers_nothing_and_less_absorbed_is_less():
    minutes = np.arange(0, 20)
    calm = assess_skin(history(np.full(20, 500.0), minutes), check(total=1400.0))
    assert calm.pain_dose == 0.0
    assert calm.seconds_to_pain is None
    bright = history(np.full(20, 3000.0), minutes)
    assert (
        assess_skin(bright, check(), absorbed_share=0.7).pain_dose
        < assess_skin(bright, check()).pain_dose
    )


def test_surface_settles_at_the_steady_balance_and_cools_without_the_facade():
    minutes = np.arange(0, 241, 5)
    vinyl = material("vinyl cladding")
    found, hot, plain = assess_surface(
        history(np.full(len(minutes), 700.0), minutes), thing=vinyl, normal_up=0.0
    )
    around = Surroundings(air_c=25.0, wind=1.0, sky_view=0.5)
    for value, load in ((hot, 1600.0), (plain, 900.0)):
        steady = steady_temperature_c(
            load, absorptance=vinyl.absorptance, emissivity=vinyl.emissivity, surroundings=around
        )
        assert value[-1] == pytest.approx(float(steady), abs=0.1)  # a sheet of 1 mm has no memory
    assert found.peak_c > found.peak_without_c + 20.0
    assert found.limit_c == 61.0  # lowest distortion reported (national-laboratory white paper)
    assert found.minutes_over == pytest.approx(240.0)
    assert "without the facade" in found.text


def test_touching_a_hot_pavement():
    minutes = np.arange(0, 601, 10)
    found, _, _ = assess_surface(
        history(np.full(len(minutes), 2500.0), minutes), thing=material("asphalt"), normal_up=1.0
    )
    # ISO 13732-1 (from memory): stone burns from 66 degrees at a touch of 10 s, 80 at 1 s
    assert found.contact_seconds == (1.0 if found.peak_c >= 80.0 else 10.0)
    cool, _, _ = assess_surface(
        history(np.zeros(len(minutes)), minutes, direct=50.0),
        thing=material("concrete"),
        normal_up=1.0,
    )
    assert cool.contact_seconds is None


def panels(*loads):
    total = sum(loads)
    return [
        Contributor(panel=k, surface="glass", load=v, share=v / total, place=(0.0, 0.0, 0.0))
        for k, v in enumerate(loads)
    ]


def test_least_panels_is_the_fewest_by_trying_every_set():
    rng = np.random.default_rng(3)
    for _ in range(20):
        loads = np.sort(rng.uniform(10.0, 400.0, 8))[::-1]
        other, limit = 800.0, 800.0 + rng.uniform(0.1, 0.9) * loads.sum()
        found = least_panels(panels(*loads), reflected=loads.sum(), other=other, limit=limit)
        fewest = min(
            bin(mask).count("1")
            for mask in range(256)
            if loads.sum() - sum(v for k, v in enumerate(loads) if mask >> k & 1) + other <= limit
        )
        assert len(found.panels) == fewest
        assert found.enough
        assert found.reflectance_factor * loads.sum() + other == pytest.approx(limit)


def test_no_panel_cures_what_the_plain_sun_does():
    found = least_panels(panels(100.0, 50.0), reflected=150.0, other=1600.0, limit=1500.0)
    assert not found.enough
    assert found.reflectance_factor is None
    assert found.panels == (0, 1)


def episode(over=0.5, agrees=True):
    return SimpleNamespace(peak=1500.0 * (1.0 + over), limit=1500.0, check=check(agrees=agrees))


@pytest.mark.parametrize(
    ("spoils", "expected"),
    [
        ({}, "firm"),
        ({"tessellation_share": 0.3}, "fair"),
        ({"glass_range": 0.3}, "fair"),
        ({"glass_range": 0.3, "tessellation_share": 0.3}, "weak"),
        ({"tessellation_share": 0.8}, "weak"),
        ({"over": 0.05}, "fair"),
        ({"agrees": False}, "weak"),
    ],
)
def test_grades(spoils, expected):
    spoils = dict(spoils)
    found = episode(spoils.pop("over", 0.5), spoils.pop("agrees", True))
    settings = {"tessellation_share": 0.05, "glass_range": 0.0, "weather": False, **spoils}
    said = grade(found, **settings)
    assert said.grade == expected
    assert said.reasons  # a grade never stands without its reasons


def test_materials_by_kind_and_by_name():
    assert material_of("facade", "").name == "vinyl cladding"
    assert material_of("facade", "brick").name == "brick"
    with pytest.raises(InputError, match="cheese"):
        material_of("facade", "cheese")


def test_a_place_before_a_plane_mirror_is_lit_while_the_image_passes():
    # A pane 2 m wide, 10 m from the place; the sun goes by at a quarter degree a minute.
    z = np.array([0.0, 0.0, 1.0])
    x = np.array([1.0, 0.0, 0.0])
    centre = np.array([0.0, 10.0, 3.0])
    corner = [centre + s * x + t * z for s, t in ((-1, -2), (1, -2), (1, 2), (-1, 2))]
    pane = np.array([[corner[0], corner[1], corner[2]], [corner[0], corner[2], corner[3]]])
    lit = lit_scene(
        pane, receiver=plane_chart([0, 0, 0], z, half=2.0, spacing=0.5), R=0.5, smooth=False
    )
    elevation = np.arctan2(3.0, 10.0)

    def sun_at(time):
        a = np.radians((time - DAY) / np.timedelta64(60, "s") * 0.25 - 30.0)
        d = unit([np.sin(a) * np.cos(elevation), -np.cos(a) * np.cos(elevation), np.sin(elevation)])
        return SunState(d, 0.0, elevation, 4.6505e-3, 900.0, 0.0)

    found = follow_place(
        lit,
        place=np.zeros(3),
        normal=z,
        first=DAY,
        last=DAY + np.timedelta64(240, "m"),
        sun_at=sun_at,
        air_at=lambda t: (np.full(len(t), 20.0), np.full(len(t), 1.0)),
    )
    on = found.time[found.reflected > 0.5 * found.reflected.max()]
    minutes = (on - DAY) / np.timedelta64(1, "m")
    # The pane fills 2 atan(1/10) = 11.4 degrees of azimuth as seen over 10 m: 46 minutes about
    # the middle of the four hours. A minute either way.
    assert minutes.min() == pytest.approx(120 - 22.8, abs=1.0)
    assert minutes.max() == pytest.approx(120 + 22.8, abs=1.0)
    assert found.reflected.max() == pytest.approx(0.5 * 900.0 * np.sin(elevation), rel=2e-3)
    assert found.direct[0] == pytest.approx(900.0 * np.sin(elevation), rel=1e-9)
    fine = np.diff(found.seconds)
    assert fine.min() == 60.0
    assert fine.max() == 600.0
