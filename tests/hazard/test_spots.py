"""Hot spots, episodes and seasons on synthetic discs whose places and times are known."""

from dataclasses import replace
from datetime import date, timedelta

import numpy as np
import pytest

from causticload.hazard.findings import Episode, HotSpot
from causticload.hazard.seasons import make_seasons, severity
from causticload.hazard.spots import follow, regions
from causticload.scene.model import Chart

H = 0.5


def chart(nu=60, nv=40, first=0, shift=(0.0, 0.0, 0.0)):
    i, j = (x.ravel() + 0.5 for x in np.indices((nu, nv)))
    origin = np.asarray(shift, float)
    return Chart(
        surface=0,
        origin=origin,
        u=np.array([1.0, 0, 0]),
        v=np.array([0, 1.0, 0]),
        normal=np.array([0, 0, 1.0]),
        spacing=H,
        cell=np.arange(nu * nv, dtype=np.int32).reshape(nu, nv),
        points=origin + np.stack([i * H, j * H, 0 * i], axis=1),
        areas=np.full(nu * nv, H * H),
        first=first,
    )


def disc_values(points, centre, radius):
    distance = np.linalg.norm(points[:, :2] - centre, axis=1)
    return np.where(distance < radius, 3000.0 - 500.0 * distance, 0.0)


def test_two_discs_are_two_regions_with_their_areas():
    c = chart()
    value = np.maximum(disc_values(c.points, (5, 5), 2.0), disc_values(c.points, (20, 12), 3.0))
    index = np.flatnonzero(value > 0)
    found = regions(
        index,
        value[index],
        charts=(c,),
        chart_of=np.zeros(len(c.areas), int),
        places=c.points,
    )
    areas = sorted(len(r.points) * H * H for r in found)
    # a disc counted in 0.5 m cells: off by at most its rim, a cell wide
    assert areas == pytest.approx([np.pi * 4, np.pi * 9], rel=0.08)
    assert len(set(found[0].points) & set(found[1].points)) == 0


def test_a_region_runs_on_over_the_seam_of_two_charts():
    a = chart(nu=20)
    b = chart(nu=20, first=len(a.areas), shift=(20 * H, 0, 0))
    points = np.concatenate([a.points, b.points])
    value = disc_values(points, (20 * H, 8.0), 2.0)
    index = np.flatnonzero(value > 0)
    of = np.repeat([0, 1], [len(a.areas), len(b.areas)])
    found = regions(index, value[index], charts=(a, b), chart_of=of, places=points)
    assert len(found) == 1
    assert len(found[0].points) == len(index)


def test_no_points_no_regions():
    c = chart()
    assert (
        regions(
            np.zeros(0, int), np.zeros(0), charts=(c,), chart_of=np.zeros(1, int), places=c.points
        )
        == []
    )


def spot(minute, x, y, *, area=4.0, peak=3000.0):
    return HotSpot(
        time=np.datetime64("2025-03-01T12:00:00") + np.timedelta64(60 * minute, "s"),
        area=area,
        peak=peak,
        reflected=peak - 900.0,
        place=(x, y, 0.0),
        centre=(x, y, 0.0),
        point=0,
    )


def test_a_moving_disc_is_one_episode_with_its_start_end_and_speed():
    speed = 0.4  # m/min
    steps = (
        [[] for _ in range(4)] + [[spot(5 * k, speed * 5 * k, 0.0)] for k in range(4, 16)] + [[]]
    )
    episodes = follow(steps)
    assert len(episodes) == 1
    path = [spots[0] for spots in episodes[0]]
    assert path[0].time == np.datetime64("2025-03-01T12:20:00")
    assert path[-1].time == np.datetime64("2025-03-01T13:15:00")
    way = np.linalg.norm(np.subtract(path[-1].centre, path[0].centre))
    assert way / 55.0 == pytest.approx(speed)


def test_far_spots_are_episodes_of_their_own_and_parted_ones_stay_one():
    far = [[spot(0, 0, 0), spot(0, 60, 0)], [spot(5, 1, 0), spot(5, 61, 0)]]
    assert len(follow(far)) == 2
    parting = [[spot(0, 0, 0)], [spot(5, 2, 0), spot(5, -2, 0)], [spot(10, 0, 0)]]
    assert len(follow(parting)) == 1


def test_a_gap_of_a_step_ends_an_episode():
    assert len(follow([[spot(0, 0, 0)], [], [spot(10, 0, 0)]])) == 2


def episode(
    day,
    *,
    mirror=None,
    minute=0,
    x=0.0,
    criterion="skin pain",
    protects="people: skin",
    peak=3000.0,
    minutes=40.0,
    days=4.0,
):
    top = replace(
        spot(0, x, 0.0, peak=peak), time=np.datetime64(day) + np.timedelta64(12 * 60 + minute, "m")
    )
    return Episode(
        number=0,
        criterion=criterion,
        protects=protects,
        receiver="Plaza",
        day=day,
        mirror_day=mirror,
        days=days,
        start=top.time - np.timedelta64(int(30 * minutes), "s"),
        end=top.time + np.timedelta64(int(30 * minutes), "s"),
        minutes=minutes,
        limit=2500.0,
        peak=peak,
        reflected=peak - 900,
        peak_time=top.time,
        area=4.0,
        path=(top,),
    )


def test_a_season_and_its_mirror_are_told_as_two_runs_of_days():
    first = date(2025, 2, 19)
    spring = [first + timedelta(days=4 * k) for k in range(8)]
    autumn = [date(2025, 10, 22) - timedelta(days=4 * k) for k in range(8)]
    episodes = [episode(a, mirror=b) for a, b in zip(spring, autumn, strict=True)]
    episodes += [episode(b, mirror=a, minute=-20) for a, b in zip(spring, autumn, strict=True)]
    numbered, seasons = make_seasons(episodes, zone="Europe/London", day_stride=4)
    assert len(seasons) == 1
    (a, b), (c, d) = seasons[0].spans
    # each day stands for four: the runs reach a day further than the outermost ones
    assert (a, b) == (spring[0] - timedelta(days=1), spring[-1] + timedelta(days=1))
    assert (c, d) == (autumn[-1] - timedelta(days=1), autumn[0] + timedelta(days=1))
    assert seasons[0].days == 16 * 4.0
    assert seasons[0].minutes_per_year == pytest.approx(16 * 4 * 40.0)
    assert sorted(e.number for e in numbered) == list(range(1, 17))


def test_other_hours_and_other_places_are_other_seasons():
    day = date(2025, 5, 1)
    same = [episode(day), episode(day + timedelta(days=4))]
    later = [episode(day, minute=180)]
    elsewhere = [episode(day, x=50.0)]
    _, seasons = make_seasons(same + later + elsewhere, zone="UTC", day_stride=4)
    assert len(seasons) == 3


def test_clock_times_are_local():
    winter, summer = date(2025, 1, 15), date(2025, 7, 15)
    _, seasons = make_seasons(
        [episode(winter), episode(summer)], zone="Europe/London", day_stride=4
    )
    clocks = {s.spans[0][0].month: s.clock for s in seasons}
    assert clocks[1] == ("11:40", "12:20")
    assert clocks[7] == ("12:40", "13:20")  # summer time, an hour ahead of UTC


def test_people_come_before_things_and_longer_before_stronger():
    people = episode(date(2025, 5, 1), minutes=5.0, peak=2600.0)
    longer = episode(date(2025, 5, 1), minutes=50.0, peak=2600.0)
    things = episode(date(2025, 5, 1), protects="things", minutes=300.0, peak=9000.0)
    ranked = sorted([things, people, longer], key=severity)
    assert ranked == [longer, people, things]


def test_no_episodes_no_seasons():
    assert make_seasons([], zone="UTC", day_stride=4) == ([], [])


def walking(day, *, peak_at, x=0.0, hours=4):
    """An episode of some hours whose spot walks 10 m an hour and peaks at a given minute."""
    first = episode(day)
    start = np.datetime64(day) + np.timedelta64(10 * 60, "m")
    path = tuple(
        replace(
            spot(0, x + m / 6.0, 0.0, peak=3000.0 + 500.0 * (m == peak_at)),
            time=start + np.timedelta64(m, "m"),
        )
        for m in range(0, 60 * hours + 1, 5)
    )
    return replace(
        first,
        path=path,
        start=path[0].time,
        end=path[-1].time,
        peak_time=start + np.timedelta64(peak_at, "m"),
    )


def test_a_lasting_caustic_is_one_season_though_its_peak_jumps():
    days = [date(2025, 6, 1) + timedelta(4 * k) for k in range(6)]
    jumping = [walking(d, peak_at=5 + 230 * (k % 2)) for k, d in enumerate(days)]
    _, seasons = make_seasons(jumping, zone="UTC", day_stride=4)
    assert len(seasons) == 1
    # The same hours on the same days, but a path 40 m away: another spot.
    beside = [walking(d, peak_at=5 + 230 * (k % 2), x=40.0) for k, d in enumerate(days)]
    _, seasons = make_seasons(jumping + beside, zone="UTC", day_stride=4)
    assert len(seasons) == 2
