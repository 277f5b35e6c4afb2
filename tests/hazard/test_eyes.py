"""Eye and glare laws against published constants, closed forms and the ASTM G173 spectrum."""

import numpy as np
import pvlib
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import trapezoid

from causticload.errors import InputError
from causticload.hazard import eyes, glare
from causticload.hazard.eyes import EyeClass, assess_eyes

SUN_SOLID_ANGLE = 6.794e-5  # sr, from 695 700 km and 1 AU
SUN_ANGLE = 9.301e-3  # rad

# Ho, Ghanbari & Diver 2011: W/m² at the cornea, rad, then retina, burn, after-image in W/cm².
# Constants from memory; values computed independently.
HO_VECTORS = [
    (1000.0, 9.3e-3, 8.00, 12.7, 0.1415),
    (2500.0, 0.05, 0.692, 2.36, 7.21e-3),
    (2500.0, 0.2, 0.0433, 1.0, 6.20e-4),
    (300.0, 0.1, 0.02076, 1.18, 2.11e-3),
]


@pytest.mark.parametrize(("corneal", "angle", "retinal", "burn", "flash"), HO_VECTORS)
def test_retinal_vectors(corneal, angle, retinal, burn, flash):
    load = assess_eyes(corneal=corneal, angle=angle)
    # values have three digits
    np.testing.assert_allclose(load.retinal / 1e4, retinal, rtol=2e-3)
    np.testing.assert_allclose(load.burn_limit / 1e4, burn, rtol=2e-3)
    np.testing.assert_allclose(load.after_image_limit / 1e4, flash, rtol=2e-3)
    assert load.eye_class == EyeClass.AFTER_IMAGE


@pytest.mark.parametrize(
    ("mrad", "burn", "flash"),
    [
        (1.0, 171.0, 10.6),
        (5.0, 853.0, 15.3),
        (9.3, 1586.0, 17.7),
        (20.0, 3410.0, 21.1),
        (50.0, 8526.0, 26.1),
        (100.0, 17051.0, 30.6),
        (200.0, 57800.0, 35.8),
    ],
)
def test_classes_change_at_the_corneal_thresholds(mrad, burn, flash):
    """Corneal equivalents of the laws of Ho et al., closed form, to the digits shown."""
    angle = mrad / 1000.0
    levels = np.array([flash * 0.99, flash * 1.01, burn * 0.995, burn * 1.005])
    found = assess_eyes(corneal=levels, angle=angle).eye_class.tolist()
    assert found == [
        EyeClass.LOW,
        EyeClass.AFTER_IMAGE,
        EyeClass.AFTER_IMAGE,
        EyeClass.RETINAL_BURN,
    ]


def test_a_flat_mirror_never_burns_but_a_merged_image_does():
    """Radiance is constant: E_r = 8 W/cm² for rho 1, DNI 1000; burn needs omega > 14.7 mrad."""
    radiance = 1000.0 / (np.pi / 4.0 * 9.3e-3**2)
    angles = np.array([9.3e-3, 14.6e-3, 14.9e-3])
    corneal = eyes.corneal_irradiance(radiance, solid_angle=np.pi / 4.0 * angles**2)
    load = assess_eyes(corneal=corneal, angle=angles)
    np.testing.assert_allclose(load.retinal, 8.0e4, rtol=1e-3)
    assert load.eye_class.tolist() == [1, 1, 2]


def test_separate_images_share_the_light():
    """Four images of the sun apart are each as bright as one: the class is that of one."""
    one = assess_eyes(corneal=1000.0, angle=9.3e-3)
    four = assess_eyes(corneal=4000.0, angle=9.3e-3, images=4)
    assert four.retinal == pytest.approx(float(one.retinal))
    assert four.eye_class == EyeClass.AFTER_IMAGE
    lumped = assess_eyes(corneal=4000.0, angle=2.0 * 9.3e-3)  # joined into one patch
    assert lumped.eye_class == EyeClass.RETINAL_BURN


def test_images_that_touch_are_one_cluster():
    width = SUN_ANGLE
    bearings = np.array([0.0, 1.01 * width, 2.0 * width, 40.0 * width])
    directions = np.stack([np.cos(bearings), np.sin(bearings), 0.0 * bearings], axis=1)
    found = eyes.cluster_images(
        directions, solid_angles=np.full(4, SUN_SOLID_ANGLE), corneal=[100.0, 100.0, 100.0, 50.0]
    )
    assert found.cluster.tolist() == [0, 0, 0, 1]
    np.testing.assert_allclose(found.solid_angle, [3 * SUN_SOLID_ANGLE, SUN_SOLID_ANGLE])
    np.testing.assert_allclose(found.corneal, [300.0, 50.0])
    np.testing.assert_allclose(found.subtense[1], width, rtol=1e-3)
    np.testing.assert_allclose(found.subtense[0], np.sqrt(3.0) * width, rtol=1e-3)
    np.testing.assert_allclose(
        np.arctan2(found.direction[:, 1], found.direction[:, 0]),
        [bearings[:3].mean(), bearings[3]],
        rtol=1e-4,
    )
    apart = eyes.cluster_images(
        directions[::2], solid_angles=np.full(2, SUN_SOLID_ANGLE), corneal=[1.0, 1.0], gap=0.0
    )
    assert apart.cluster.tolist() == [0, 1]


def test_no_image_and_images_all_around():
    none = eyes.cluster_images(np.zeros((0, 3)), solid_angles=[], corneal=[])
    assert len(none.corneal) == 0
    two = eyes.cluster_images(
        [[1.0, 0.0, 0.0], [-1.0, 0.0, 0.0]], solid_angles=[6.0, 1e-4], corneal=[1.0, 1.0]
    )
    assert two.cluster.tolist() == [0, 1]


@given(st.integers(0, 2**32 - 1), st.integers(1, 12))
def test_clusters_match_brute_force(seed, count):
    rng = np.random.default_rng(seed)
    directions = np.array([1.0, 0.0, 0.0]) + rng.normal(0.0, 0.02, (count, 3))
    directions /= np.linalg.norm(directions, axis=1, keepdims=True)
    omega = rng.uniform(1e-5, 3e-4, count)
    found = eyes.cluster_images(directions, solid_angles=omega, corneal=np.ones(count), gap=1e-3)
    radius = np.arccos(1.0 - omega / (2.0 * np.pi))  # exact for a cone
    angle = np.arccos(np.clip(directions @ directions.T, -1.0, 1.0))
    joined = angle <= radius[:, None] + radius + 1e-3
    for _ in range(count):  # transitive closure
        joined = joined @ joined
    assert np.array_equal(joined, found.cluster[:, None] == found.cluster)


@given(st.floats(1e-4, 1.0), st.floats(1.0, 5000.0), st.floats(1.0, 3.0))
def test_more_light_never_lowers_the_class(angle, corneal, factor):
    low, high = assess_eyes(corneal=[corneal, corneal * factor], angle=angle).eye_class
    assert high >= low


def test_every_class_has_plain_words():
    assert set(eyes.EYE_CLASS_WORDS) == set(EyeClass)


def test_angle_from_gaze():
    found = eyes.angle_from_gaze(
        [[2.0, 0.0, 0.0], [1.0, 1.0, 0.0], [-3.0, 0.0, 0.0], [1.0, 1e-9, 0.0]], [1.0, 0.0, 0.0]
    )
    np.testing.assert_allclose(found, [0.0, np.pi / 4, np.pi, 1e-9], rtol=1e-12)


def test_sun_luminance():
    """Disc mean of the sun for 100, 109 and 133.1 klx: 1.47e9, 1.60e9, 1.96e9 cd/m²."""
    found = glare.luminance([100e3, 109e3, 133.1e3], solid_angle=SUN_SOLID_ANGLE)
    np.testing.assert_allclose(found, [1.47e9, 1.60e9, 1.96e9], rtol=4e-3)  # three digits
    assert eyes.subtense(SUN_SOLID_ANGLE) == pytest.approx(SUN_ANGLE, rel=2e-4)


def test_illuminance_uses_the_visible_share():
    """Coated glass, rho_v 0.10 and rho_e 0.30: 300 W/m² reflected is 10 klx, not 30."""
    assert glare.illuminance(300.0, visible_to_solar=0.1 / 0.3) == pytest.approx(1.0e4)


# L_v per lux: law, age, pigment, degrees, value. Closed forms of CIE 146:2002 and EN 13201-3.
VEIL_VECTORS = [
    (glare.CIE_GENERAL, 25, 0.5, 0.1, 10513.31, 5e-3),
    (glare.CIE_GENERAL, 25, 0.5, 1, 15.1805, 5e-5),
    (glare.CIE_GENERAL, 25, 0.5, 2, 2.55889, 5e-6),
    (glare.CIE_GENERAL, 25, 0.5, 5, 0.29663, 5e-6),
    (glare.CIE_GENERAL, 25, 0.5, 10, 0.06766, 5e-6),
    (glare.CIE_GENERAL, 25, 0.5, 30, 0.00903, 5e-6),
    (glare.CIE_GENERAL, 25, 0.5, 60, 0.00358, 5e-6),
    (glare.CIE_GENERAL, 70, 0.0, 1, 22.8676, 5e-5),
    (glare.CIE_GENERAL, 70, 0.0, 10, 0.13868, 5e-6),
    (glare.CIE_GENERAL, 70, 1.2, 10, 0.17256, 5e-6),
    (glare.CIE_SMALL_ANGLE, 25, 0.5, 1, 15.128, 5e-4),
    (glare.CIE_AGE_ADJUSTED, 70, 0.5, 10, 0.2000, 5e-5),
    (glare.STILES_HOLLADAY, 50, 0.5, 10, 0.1, 1e-12),
    (glare.EN_13201_3, 23, 0.5, 10, 0.100019, 5e-7),
]


@pytest.mark.parametrize(("law", "age", "pigment", "degrees", "value", "digit"), VEIL_VECTORS)
def test_veil_vectors(law, age, pigment, degrees, value, digit):
    found = glare.veil_per_lux(np.deg2rad(degrees), law=law, age=age, pigment=pigment)
    assert found.in_range
    assert found.value == pytest.approx(value, abs=1.01 * digit)


def test_en_13201_changes_its_form_at_one_and_a_half_degrees():
    below = glare.veil_per_lux(np.deg2rad(1.4), law=glare.EN_13201_3, age=23.0).value
    small = glare.veil_per_lux(np.deg2rad(1.4), law=glare.CIE_SMALL_ANGLE, age=23.0).value
    assert below == pytest.approx(float(small))


@pytest.mark.parametrize(
    ("law", "low", "high"),
    [
        (glare.STILES_HOLLADAY, 1.0, 30.0),
        (glare.CIE_AGE_ADJUSTED, 1.0, 30.0),
        (glare.CIE_SMALL_ANGLE, 0.1, 30.0),
        (glare.CIE_GENERAL, 0.1, 100.0),
        (glare.EN_13201_3, 0.1, 60.0),
    ],
)
def test_angles_of_a_law_are_enforced(law, low, high):
    found = glare.veil_per_lux(np.deg2rad([low * 0.99, low, high, high * 1.01]), law=law)
    assert found.in_range.tolist() == [False, True, True, False]
    assert np.isnan(found.value[[0, 3]]).all()


@given(st.floats(0.1, 99.0), st.floats(1.001, 1.5), st.floats(0.0, 100.0), st.floats(0.0, 1.2))
def test_the_veil_thins_with_angle_and_thickens_with_age(degrees, factor, age, pigment):
    angles = np.deg2rad([degrees, min(degrees * factor, 100.0)])
    near, far = glare.veil_per_lux(angles, age=age, pigment=pigment).value
    assert far <= near
    older = glare.veil_per_lux(angles[0], age=age + 10.0, pigment=pigment).value
    assert older > near


def test_veils_of_several_sources_add():
    angles = np.deg2rad([2.0, 10.0, 120.0])
    veil = glare.veiling_luminance(
        [1.0, 10.0, 5.0], angle=angles, law=glare.CIE_GENERAL, age=25.0, pigment=0.5
    )
    assert veil.luminance == pytest.approx(2.55889 + 0.6766, abs=6e-5)
    assert veil.left_out == 1
    assert not veil.too_close


def test_a_source_in_the_line_of_sight_has_no_number():
    veil = glare.veiling_luminance([[1.0, 1.0], [0.0, 1.0]], angle=np.deg2rad([0.05, 10.0]))
    assert veil.too_close.tolist() == [True, False]
    assert np.isnan(veil.luminance[0])
    assert np.isfinite(veil.luminance[1])


def test_glare_illuminance_is_on_the_plane_of_the_eye():
    found = glare.glare_illuminance(1000.0, angle=np.deg2rad([0.0, 60.0, 120.0]))
    np.testing.assert_allclose(found, [1000.0, 500.0, 0.0], atol=1e-9)


def test_threshold_increment():
    """CIE 140 / EN 13201: 14.10 % and 16.93 %, closed forms."""
    found = glare.threshold_increment([0.3, 2.0, 1.0], background=[1.5, 10.0, 0.05])
    np.testing.assert_allclose(found.value[:2], [14.10, 16.93], atol=0.005)
    assert found.in_range.tolist() == [True, True, False]
    assert np.isnan(found.value[2])


def test_contrast_left():
    assert glare.contrast_left(500.0, background=2000.0) == pytest.approx(0.8)
    assert glare.contrast_left(0.0, background=2000.0) == 1.0


def test_rogue_angle():
    """Hassall 1991 (from memory): 10 E/theta² = 500 cd/m²."""
    found = glare.rogue_angle([1e3, 5e3, 1e4, 2e4, 1e5])
    degrees = np.rad2deg(found.value)
    np.testing.assert_allclose(degrees, [4.47, 10.0, 14.1, 20.0, 44.7], atol=0.05)
    assert found.in_range.tolist() == [True, True, True, True, False]
    lux = glare.illuminance(800.0 * 0.1) * 0.9
    veil = glare.veiling_luminance(
        [lux], angle=[np.deg2rad(10.0)], law=glare.STILES_HOLLADAY
    ).luminance
    assert veil == pytest.approx(720.0)
    assert veil > glare.ROGUE_VEIL_LIMIT


def test_icnirp_retinal_limit():
    """ICNIRP 2013 (numbers from memory): the sun's 9.3 mrad, ends of alpha, and short times."""
    found = eyes.icnirp_retinal_limit(9.3e-3, duration_s=[0.25, 100.0])
    np.testing.assert_allclose(found.value, 3.01e6, rtol=2e-3)
    held = eyes.icnirp_retinal_limit([1e-4, 1.0], duration_s=1.0)
    np.testing.assert_allclose(held.value, [2.8e4 / 1.5e-3, 2.8e4 / 0.1])
    short = eyes.icnirp_retinal_limit(1.0, duration_s=[1e-4, 0.01, 1e-7])
    np.testing.assert_allclose(short.value[:2], [2e4 / (0.005 * 0.1), 2e4 / (0.02 * 0.01**0.25)])
    assert short.in_range.tolist() == [True, True, False]


def test_icnirp_infrared_and_blue_limits():
    """18 000 t^-0.75 then 100 W/m²; blue 100 J/m² then 1 W/m² (numbers from memory)."""
    np.testing.assert_allclose(
        eyes.icnirp_infrared_limit([1.0, 16.0, 2000.0]), [18000.0, 2250.0, 100.0]
    )
    always = 100.0 / eyes.INFRARED_SHARE  # sunlight above this is over the lasting limit
    assert always == pytest.approx(223.0, abs=0.5)
    np.testing.assert_allclose(eyes.icnirp_blue_small_source_limit([1.0, 200.0]), [100.0, 1.0])
    # 900 W/m² of sunlight reaches the blue dose in 1.29 s
    assert eyes.icnirp_blue_small_source_limit(1.29) == pytest.approx(
        900.0 * eyes.BLUE_SHARE, rel=5e-3
    )


def test_band_shares_come_from_the_reference_spectrum():
    """ASTM G173-03 direct spectrum as published, weights of ICNIRP 2013 (from memory)."""
    spectrum = pvlib.spectrum.get_reference_spectra(standard="ASTM G173-03")["direct"]
    nm, e = spectrum.index.to_numpy(), spectrum.to_numpy()
    total = trapezoid(e, nm)
    assert total == pytest.approx(900.0, abs=1.0)
    infrared = (nm >= 780.0) & (nm <= 3000.0)
    assert trapezoid(e[infrared], nm[infrared]) / total == pytest.approx(
        eyes.INFRARED_SHARE, abs=1e-3
    )
    retina = (nm >= 380.0) & (nm <= 1400.0)
    weight = np.select(
        [nm < 700.0, nm < 1050.0, nm < 1150.0, nm < 1200.0],
        [1.0, 10.0 ** ((700.0 - nm) / 500.0), 0.2, 0.2 * 10.0 ** (0.02 * (1150.0 - nm))],
        0.02,
    )
    share = trapezoid((e * weight)[retina], nm[retina]) / total
    assert share == pytest.approx(eyes.RETINAL_SHARE, abs=5e-4)
    assert 900.0 * share / 6.79e-5 == pytest.approx(8.06e6, rel=2e-3)


@pytest.mark.parametrize(
    "call",
    [
        lambda: assess_eyes(corneal=1.0, angle=0.0),
        lambda: assess_eyes(corneal=-1.0, angle=0.1),
        lambda: assess_eyes(corneal=1.0, angle=0.1, images=0),
        lambda: eyes.angle_from_gaze([0.0, 0.0, 0.0], [1.0, 0.0, 0.0]),
        lambda: eyes.angle_from_gaze([1.0, 0.0], [1.0, 0.0]),
        lambda: eyes.cluster_images([[1.0, 0.0, 0.0]], solid_angles=[1e-4, 1e-4], corneal=[1.0]),
        lambda: glare.veil_per_lux(0.1, age=-1.0),
        lambda: glare.veil_per_lux(np.nan),
        lambda: glare.veiling_luminance(1.0, angle=0.1),
        lambda: glare.contrast_left(1.0, background=0.0),
    ],
)
def test_bad_input_is_refused(call):
    with pytest.raises(InputError):
        call()
