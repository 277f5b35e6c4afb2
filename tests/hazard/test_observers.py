"""Eyes before plane mirrors, where image, direction, size and minutes follow from geometry."""

from datetime import date
from types import SimpleNamespace

import numpy as np
import pytest
from scenes import lit_scene, unit

from causticload.hazard.observers import EyeWatch, areas_in_view, merge_eyes, place_eyes
from causticload.light.tally import Moment, StepLight
from causticload.study.model import ObserverSpec

SUN = 4.6505e-3
R = 0.2


def wall(y=10.0, half=6.0, turn=0.0):
    """A vertical mirror, facing south (-y) but for a turn about the vertical. [rad]"""
    u = np.array([np.cos(turn), np.sin(turn), 0.0])
    z = np.array([0.0, 0.0, 1.0])
    centre = np.array([0.0, y, 5.0])
    a, b, c, d = (centre + half * (s * u + t * z) for s, t in ((-1, -1), (1, -1), (1, 1), (-1, 1)))
    return np.array([[a, b, c], [a, c, d]])


def eye(look=(0.0, 1.0, 0.0), path=((0.0, 0.0, 1.6),), **more):
    return ObserverSpec(name="eye", path=path, look=look, **more)


def seen(mirrors, spec, s):
    lit = lit_scene(mirrors, R=R, smooth=False)
    eyes = place_eyes([spec], origin=np.zeros(3))
    return areas_in_view(lit, eyes, sun_direction=unit(s), sun_radius=SUN)


def test_one_plane_mirror_shows_one_sun_where_the_law_puts_it():
    s = unit([0.1, -1.0, 0.2])  # from the south: mirrored at y = const it comes from the north
    areas = seen(wall(), eye(), s)
    assert len(areas.point) == 1
    # directions end 1 mm off the pane, ten metres away
    np.testing.assert_allclose(areas.direction[0], s * [1.0, -1.0, 1.0], atol=1e-4)
    # The whole even disc: its subtense is the sun's own, its flux the reflectance. Tubes are
    # refined until they misplace an image by 15 % of the sun's radius; a plane is exact.
    assert areas.subtense[0] == pytest.approx(2.0 * SUN, rel=1e-3)
    assert areas.corneal[0] == pytest.approx(R, rel=1e-3)
    assert areas.angle[0] == pytest.approx(np.arccos(-s[1]), abs=1e-4)


def test_an_image_behind_the_back_is_not_in_view():
    assert not len(seen(wall(), eye(look=(0.0, -1.0, 0.0)), [0.1, -1.0, 0.2]).point)


def test_two_turned_mirrors_show_two_suns():
    # Two panes whose images stand to the left and right of the line of sight.
    west = wall(half=2.0) + [-4.0, 0.0, 0.0]
    east = wall(half=2.0) + [4.0, 0.0, 0.0]
    pivot_w, pivot_e = np.array([-4.0, 10.0, 0.0]), np.array([4.0, 10.0, 0.0])

    def turned(T, pivot, a):
        turn = np.array([[np.cos(a), -np.sin(a), 0], [np.sin(a), np.cos(a), 0], [0, 0, 1]])
        return (T - pivot) @ turn.T + pivot

    a = 0.5 * np.arctan2(4.0, 10.0)  # sends a ray from due south to the eye
    both = np.concatenate([turned(west, pivot_w, a), turned(east, pivot_e, -a)])
    areas = seen(both, eye(), [0.0, -1.0, 0.3])
    assert len(areas.point) == 2
    assert np.sign(areas.direction[:, 0]).sum() == 0
    assert areas.subtense == pytest.approx([2.0 * SUN] * 2, rel=2e-3)


def test_eye_points_along_a_path():
    spec = eye(
        look="along", path=((0.0, 0.0, 1.0), (10.0, 0.0, 1.0), (10.0, 3.0, 1.0)), spacing=4.0
    )
    eyes = place_eyes([spec, eye()], origin=np.array([1.0, 2.0, 0.0]))
    assert len(eyes.place) == 3 + 1 + 1 + 1
    np.testing.assert_allclose(eyes.place[0], [-1.0, -2.0, 1.0])
    np.testing.assert_allclose(eyes.gaze[[0, 3, 4]], [[1, 0, 0], [0, 1, 0], [0, 1, 0]])
    assert eyes.observer.tolist() == [0] * 5 + [1]


def walk_through_a_day(elevations, beams):
    """Minutes of an eye before a wall while the sun rises due south. 5-minute steps."""
    lit = lit_scene(wall(half=1.0), R=R, smooth=False)
    spec = eye(path=((0.0, 0.0, 5.0),))
    eyes = place_eyes([spec], origin=np.zeros(3))
    days = (date(2025, 3, 21), date(2025, 9, 22))
    plan = SimpleNamespace(
        dates=days, weights=(4.0, 3.0), radius_rad=np.full((2, len(elevations)), SUN)
    )
    watch = EyeWatch(lit, plan, eyes)
    for k, e in enumerate(np.radians(elevations)):
        light = StepLight(lit, None, np.array([0.0, -np.cos(e), np.sin(e)]))
        for d in range(2):
            moment = Moment(
                light,
                time=np.datetime64(f"{days[d]}T12:00") + np.timedelta64(5 * k, "m"),
                beam=beams[d],
                diffuse=0.0,
                temperature_c=20.0,
                wind_ms=1.0,
                minutes=5.0,
            )
            watch.add(moment, date=d)
    return merge_eyes(
        [watch.result()], [plan], [spec], points=[1], zone="Europe/London", day_stride=4
    )[0]


def test_minutes_and_days_follow_from_geometry():
    # The pane is 2 m high 10 m away, the eye level with its middle: the sun's image is in it up
    # to atan(1/10) = 5.7 degrees: steps at 1, 3 and 5 degrees.
    found = walk_through_a_day([1.0, 3.0, 5.0, 7.0, 9.0], beams=(800.0, 10.0))
    # On the second date 0.2 * 10 W/m2 at the eye is under what leaves an after-image, 17.7 W/m2
    # at the eye for the sun's own size (Ho et al. 2011, from memory).
    assert found.after_image_most == 15.0
    assert found.after_image_minutes == 4.0 * 15.0
    assert found.after_image_days == 4.0
    assert found.worst_day == date(2025, 3, 21)
    assert found.clock == ("11:57", "12:12")  # half a step on either side
    assert [(d.isoformat(), m) for d, _, m in found.daily] == [
        ("2025-03-21", 15.0),
        ("2025-09-22", 0.0),
    ]
    assert found.burn_minutes == 0.0  # one sun by a fifth never burns
    sight = found.worst
    assert sight.images == 1
    assert sight.corneal == pytest.approx(160.0, rel=1e-3)
    # 10 E/theta² with 100 lm/W: 16,000 lx are over 500 cd/m² within 17.9 degrees, so at all three
    # steps; 200 lx within 2 degrees, at the first.
    assert found.rogue_minutes == 4.0 * 15.0 + 3.0 * 5.0
    assert np.sin(np.radians(sight.azimuth_deg)) == pytest.approx(0.0, abs=1e-6)


def test_nothing_in_view_is_said_as_nothing():
    found = walk_through_a_day([20.0, 40.0], beams=(800.0, 800.0))
    assert found.worst is None
    assert found.clock is None
    assert found.worst_day is None
    assert found.spans == ()
