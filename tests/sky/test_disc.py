"""The sun's disc, against its law, closed forms, numerical convolution and random points."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import integrate, stats

from causticload.errors import InputError
from causticload.sky.disc import SunDisc

R = 4.6505e-3  # rad, mean angular radius of the sun
LIMB, UNIFORM = SunDisc("limb-darkened"), SunDisc("uniform")


def law(x, kind):
    """Cox (ed.), Allen's Astrophysical Quantities (2000), 550 nm, over its disc mean 0.805."""
    mu = np.sqrt(1.0 - np.asarray(x) ** 2)
    return (0.3 + 0.93 * mu - 0.23 * mu**2) / 0.805 if kind == "limb-darkened" else 1.0 + 0.0 * mu


def ring_energy(x, radii, weights):
    """Light of uniform discs within a circle of radius x."""
    return np.minimum(1.0, (np.asarray(x)[:, None] / radii) ** 2) @ weights


def test_limb_darkening_values():
    # closed form, computed independently: the law over its mean at r/R 0, .5, .75, .9, 1
    np.testing.assert_allclose(
        LIMB.relative_radiance([0.0, 0.5, 0.75, 0.9, 1.0]),
        [1.2422, 1.1589, 1.0118, 0.8220, 0.3727],
        atol=5e-5,  # digits printed
    )


@pytest.mark.parametrize(("disc", "sigma_mrad"), [(LIMB, 2.198), (UNIFORM, 2.325)])
def test_spread_along_one_axis(disc, sigma_mrad):
    # closed form, computed independently, per-axis sigma of the mean sun
    assert np.sqrt(disc.variance) * 4.6505 == pytest.approx(sigma_mrad, abs=5e-4)


@pytest.mark.parametrize("disc", [LIMB, UNIFORM])
def test_encircled_energy_is_the_integral_of_the_law(disc):
    for x in (0.0, 0.3, 0.8, 0.99, 1.0):
        want, _ = integrate.quad(lambda r: 2.0 * r * law(r, disc.kind), 0.0, x)
        assert disc.encircled_energy(x) == pytest.approx(want, abs=1e-9)  # quadrature


def test_solid_angle():
    # closed form, computed independently: 6.794e-5 sr at the mean distance
    assert UNIFORM.solid_angle(R) == pytest.approx(6.794e-5, abs=1e-8)
    assert UNIFORM.solid_angle(np.pi) == pytest.approx(4.0 * np.pi)


def test_a_uniform_disc_is_one_ring():
    radii, weights = UNIFORM.rings(R)
    assert radii.tolist() == [R]
    assert weights.tolist() == [1.0]


@pytest.mark.parametrize(("count", "error"), [(None, 0.013), (2, 0.030), (5, 0.005), (8, 0.0025)])
def test_rings_of_the_darkened_disc(count, error):
    radii, weights = LIMB.rings(R, count=count)
    assert len(radii) == (count or 3)
    assert radii[-1] <= R  # nothing beyond the limb
    assert weights.sum() == pytest.approx(1.0, abs=1e-15)
    moment, _ = integrate.quad(lambda r: 2.0 * r**3 * law(r, LIMB.kind), 0.0, 1.0)
    assert (weights * radii**2).sum() / 2.0 == pytest.approx(moment * R**2, rel=1e-9)
    assert (weights / radii**2).sum() * R**2 == pytest.approx(law(0.0, LIMB.kind), rel=1e-9)
    x = np.linspace(0.0, 1.0, 400)
    off = ring_energy(x * R, radii, weights) - LIMB.encircled_energy(x)
    assert np.abs(off).max() < error


def blurred_energy(disc, blur, x):
    """Encircled energy of the disc convolved with a Gaussian, by brute force.

    A point at distance s from the centre, blurred, lands within x with the probability of
    Marcum's Q function, that is of a noncentral chi-square distribution.
    """
    nodes, h = np.polynomial.legendre.leggauss(80)
    s = np.sin(0.25 * np.pi * (nodes + 1.0))  # smooth at the limb
    ds = 0.25 * np.pi * h * np.sqrt(1.0 - s**2)
    light = 2.0 * s * law(s, disc.kind) * ds
    within = stats.ncx2.cdf((x[:, None] / blur) ** 2, 2, (s / blur) ** 2)
    return within @ light


@pytest.mark.parametrize("disc", [LIMB, UNIFORM])
@pytest.mark.parametrize("blur", [0.05, 0.3, 1.0, 4.0, 20.0])
def test_rings_with_slope_error(disc, blur):
    radii, weights = disc.rings(R, slope_error_rad=blur * R / 2.0)
    assert len(radii) == 6
    assert np.all(np.diff(radii) > 0.0)
    assert np.all(weights > 0.0)
    assert weights.sum() == pytest.approx(1.0, abs=1e-14)
    variance = {"limb-darkened": (2.198 / 4.6505) ** 2, "uniform": 0.25}[disc.kind]
    got = (weights * radii**2).sum() / 4.0 / R**2
    assert got == pytest.approx(variance + blur**2, rel=2e-4)  # digits of 2.198
    x = np.linspace(0.0, 1.0 + 4.0 * blur, 120)
    want = blurred_energy(disc, blur, x)
    off = ring_energy(x * R, radii, weights) - want
    assert np.abs(off).max() < 0.0135  # 1.3 % by design, and 1 % steps of the blur kept
    # light at the very centre: closed form for the uniform disc, 1 - exp(-R²/2 sigma²)
    if disc is UNIFORM:
        centre = (weights / radii**2).sum() * R**2
        assert centre == pytest.approx(-np.expm1(-0.5 / blur**2), rel=5e-3)


def test_a_minute_slope_error_changes_next_to_nothing():
    plain, _ = LIMB.rings(R)
    nearly, weights = LIMB.rings(R, slope_error_rad=1e-9)
    np.testing.assert_allclose(nearly, plain, rtol=1e-6)
    assert (weights * nearly**2).sum() > (weights * plain**2).sum()


@settings(max_examples=25, deadline=None)
@given(st.floats(0.005, 40.0), st.integers(2, 8), st.sampled_from([LIMB, UNIFORM]))
def test_rings_are_sound_at_any_slope_error(blur, count, disc):
    slope = blur * R / 2.0
    radii, weights = disc.rings(R, slope_error_rad=slope, count=count)
    assert np.all(weights > 0.0)
    assert weights.sum() == pytest.approx(1.0, abs=1e-14)
    # the nine-tenths that a Gaussian keeps within 2.15 sigma bound the innermost ring
    assert 0.0 < radii[0] < 3.0 * R * np.hypot(1.0, blur)
    variance = (weights * radii**2).sum() / 4.0
    assert variance == pytest.approx(disc.variance * R**2 + 4.0 * slope**2, rel=1e-9)


def test_rings_are_the_same_each_time_and_not_shared():
    radii, weights = LIMB.rings(R, slope_error_rad=1e-3)
    weights[:] = 0.0
    radii[:] = 0.0
    again, light = LIMB.rings(R, slope_error_rad=1e-3)
    assert light.sum() == pytest.approx(1.0)
    assert again.min() > 0.0


@pytest.mark.parametrize("disc", [LIMB, UNIFORM])
def test_random_points_follow_the_law(disc, rng):
    """Kolmogorov-Smirnov against the integrated law; a fixed seed, so never by chance."""
    points = disc.sample(rng, 20_000, R)
    r = np.hypot(*points.T) / R

    def energy(x):
        m2 = 1.0 - x**2
        if disc is UNIFORM:
            return x**2
        return 1.0 - (0.3 * m2 + 0.62 * m2**1.5 - 0.115 * m2**2) / 0.805  # integral of the law

    assert stats.kstest(r, energy).pvalue > 0.01
    turn = np.arctan2(points[:, 1], points[:, 0]) / (2.0 * np.pi) + 0.5
    assert stats.kstest(turn, "uniform").pvalue > 0.01


def test_the_wrong_law_would_be_noticed(rng):
    """The same test tells a darkened disc from a uniform one."""
    r = np.hypot(*LIMB.sample(rng, 20_000, R).T) / R
    assert stats.kstest(r, lambda x: x**2).pvalue < 1e-6


def test_the_inverse_is_exact_to_rounding():
    """Numbers spread evenly, in place of random ones, give back their own shares."""

    class Even:
        def random(self, n):
            return (np.arange(n) + 0.5) / n

    r = np.hypot(*LIMB.sample(Even(), 1000, 1.0).T)
    outside = 1.0 - LIMB.encircled_energy(np.minimum(r, 1.0))
    np.testing.assert_allclose(outside, Even().random(1000), atol=1e-12)


def test_no_points():
    assert LIMB.sample(np.random.default_rng(1), 0, R).shape == (0, 2)


@pytest.mark.parametrize(
    ("call", "text"),
    [
        (lambda: SunDisc("square"), "no sun disc"),
        (lambda: LIMB.relative_radiance([1.1]), "x must be"),
        (lambda: LIMB.encircled_energy([-0.1]), "x must be"),
        (lambda: LIMB.relative_radiance([np.nan]), "x must be"),
        (lambda: LIMB.rings(0.0), "radius_rad"),
        (lambda: LIMB.rings(np.nan), "radius_rad"),
        (lambda: LIMB.rings(R, slope_error_rad=-1e-3), "slope_error_rad"),
        (lambda: LIMB.rings(R, slope_error_rad=0.2), "slope_error_rad"),
        (lambda: LIMB.rings(R, count=1), "count"),
        (lambda: LIMB.rings(R, count=9), "count"),
    ],
)
def test_refuses_what_is_out_of_range(call, text):
    with pytest.raises(InputError, match=text):
        call()
