"""One interface, against Fresnel's closed forms, the tmm package and reciprocity."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from causticload.errors import InputError
from causticload.optics.fresnel import cosine_of, interface_reflectance, metal_reflectance

# Fresnel's equations at n = 1.52, unpolarised; closed form, computed independently to 1e-5.
SURFACE = {
    0: 0.04258,
    20: 0.04285,
    30: 0.04414,
    40: 0.04845,
    50: 0.06059,
    60: 0.09248,
    65: 0.12402,
    70: 0.17471,
    75: 0.25672,
    80: 0.39095,
    85: 0.61492,
    88: 0.81971,
}


@pytest.mark.parametrize("angle", SURFACE)
def test_glass_surface(angle):
    R = interface_reflectance(np.cos(np.radians([angle])), eta=1.52)
    assert R.mean() == pytest.approx(SURFACE[angle], abs=6e-6)  # half the last digit


def test_brewster_s_angle():
    brewster = np.arctan(1.52)  # Brewster's law
    assert np.degrees(brewster) == pytest.approx(56.66, abs=5e-3)
    R = interface_reflectance(np.cos([brewster]), eta=1.52)
    assert R[1, 0] == pytest.approx(0.0, abs=1e-15)
    assert R.mean() == pytest.approx(0.07835, abs=6e-6)


def test_total_reflection_and_grazing():
    critical = np.arcsin(1 / 1.52)
    beyond = interface_reflectance(
        np.cos([critical + 1e-6, 1.2, np.pi / 2]).clip(0, 1), eta=1 / 1.52
    )
    assert (beyond == 1.0).all()
    assert (interface_reflectance(np.cos([critical - 1e-3]), eta=1 / 1.52) < 1.0).all()
    assert (interface_reflectance(np.zeros(1), eta=1.52) == 1.0).all()
    assert (metal_reflectance(np.zeros(1), n=1.0, k=0.0) == 1.0).all()


@given(st.floats(0.0, 89.9), st.floats(1.01, 4.0))
def test_reciprocity(angle, eta):
    # Stokes: the same reflectance from the other side at the refracted angle.
    theta = np.radians(angle)
    there = interface_reflectance(np.cos([theta]), eta=eta)
    back = interface_reflectance(np.cos([np.arcsin(np.sin(theta) / eta)]), eta=1.0 / eta)
    assert back == pytest.approx(there, abs=1e-9)


@given(st.floats(0.0, 1.0), st.floats(0.3, 4.0))
def test_a_dielectric_reflects_s_at_least_as_p(cos, eta):
    s, p = interface_reflectance(np.array([cos]), eta=eta)[:, 0]
    assert 0.0 <= p <= s + 1e-15
    assert s <= 1.0


# Complex Fresnel reflectance at 0, 60, 75 and 85 degrees: closed form, computed independently;
# the indices (aluminium, titanium, iron type) are from memory.
METALS = [
    (0.958, 6.69, (0.921, 0.907, 0.878, 0.885)),
    (1.86, 2.56, (0.495, 0.496, 0.541, 0.731)),
    (2.9, 3.1, (0.533, 0.516, 0.514, 0.660)),
]


@pytest.mark.parametrize(("n", "k", "expected"), METALS)
def test_metals(n, k, expected):
    R = metal_reflectance(np.cos(np.radians([0, 60, 75, 85])), n=n, k=k).mean(axis=0)
    assert pytest.approx(expected, abs=6e-4) == R  # half the last digit


@pytest.mark.parametrize(("n", "k"), [(m[0], m[1]) for m in METALS] + [(0.2, 3.0), (1.6, 0.0)])
@pytest.mark.parametrize("angle", [0.0, 33.0, 61.0, 82.0, 89.5])
def test_against_the_tmm_package(n, k, angle):
    tmm = pytest.importorskip("tmm")  # S. Byrnes, tmm
    ours = metal_reflectance(np.cos(np.radians([angle])), n=n, k=k)[:, 0]
    for row, pol in enumerate("sp"):
        theirs = tmm.coh_tmm(pol, [1, n + 1j * k], [np.inf, np.inf], np.radians(angle), 550.0)
        assert ours[row] == pytest.approx(theirs["R"], abs=1e-12)


@pytest.mark.parametrize("cos", [-0.1, 1.1, np.nan])
def test_bad_cosines(cos):
    with pytest.raises(InputError, match=r"cos_i\[1\]"):
        interface_reflectance(np.array([0.5, cos]), eta=1.5)
    with pytest.raises(InputError, match=r"cos_i\[1\]"):
        metal_reflectance(np.array([0.5, cos]), n=1.0, k=5.0)


@pytest.mark.parametrize("theta", [-0.1, 1.6, np.nan])
def test_bad_angles(theta):
    with pytest.raises(InputError, match=r"theta\[1\]"):
        cosine_of(np.array([0.5, theta]))


@pytest.mark.parametrize("eta", [0.0, -1.0, np.nan, np.inf])
def test_bad_index_ratio(eta):
    with pytest.raises(InputError, match="eta"):
        interface_reflectance(np.ones(1), eta=eta)


@pytest.mark.parametrize(("n", "k"), [(0.0, 1.0), (1.0, -1.0), (np.nan, 1.0)])
def test_bad_metal_index(n, k):
    with pytest.raises(InputError, match="index"):
        metal_reflectance(np.ones(1), n=n, k=k)
