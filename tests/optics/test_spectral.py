"""Layer files: weights, reading, and a unit solved by tmm wavelength by wavelength."""

import builtins
from pathlib import Path

import numpy as np
import pytest

from causticload.errors import InputError, StudyError
from causticload.optics import spectral
from causticload.optics.spectral import WAVELENGTHS, band_weights, read_layers, solved_glazing
from causticload.optics.stack import Pane

FILE = """\
# silver between two oxides; indices invented for this test
layer,         oxide, oxide, silver, silver, oxide, oxide
thickness_nm,  40,    40,    12,     12,     40,    40

wavelength_nm, n,     k,     n,      k,      n,     k
300,           2.2,   0.01,  1.2,    1.0,    2.2,   0.01
550,           2.0,   0,     0.06,   3.6,    2.0,   0
1000,          1.95,  0,     0.14,   6.9,    1.95,  0
2500,          1.9,   0,     0.7,    17,     1.9,   0
"""


def write(folder: Path, text: str = FILE) -> Path:
    path = folder / "coat.csv"
    path.write_text(text, encoding="utf-8")
    return path


def test_eye_sensitivity():
    # CIE 1924: peak 1 at 555 nm; integral 106.857 nm, so that 683 lm/W at 555 nm gives
    # 683 x 106.857 lm for an equal-energy spectrum.
    assert spectral.V_LAMBDA.sum() * 10.0 == pytest.approx(106.857, abs=2e-3)
    assert len(spectral.V_LAMBDA) == len(spectral.V_WAVELENGTHS)
    assert spectral.V_WAVELENGTHS[spectral.V_LAMBDA.argmax()] == 560.0
    assert spectral.V_LAMBDA.max() == 0.995


def test_illuminance_of_the_reference_beam():
    # ASTM G173-03 direct: 97.2 klx and 900 W/m², 108 lm/W (computed independently).
    from pvlib.spectrum import get_reference_spectra

    beam = get_reference_spectra()["direct"]
    seen = np.interp(beam.index, spectral.V_WAVELENGTHS, spectral.V_LAMBDA, left=0, right=0)
    klx = 0.683 * np.trapezoid(beam.to_numpy() * seen, beam.index.to_numpy())
    assert klx == pytest.approx(97.2, rel=2e-3)


def test_weights():
    from pvlib.spectrum import get_reference_spectra

    weights = band_weights(WAVELENGTHS)
    assert weights.sum(axis=1) == pytest.approx([1.0, 1.0], abs=1e-12)
    assert (weights >= 0.0).all()
    # The share of the solar band below 780 nm: integral of the same spectrum at full resolution.
    # A step is linear between wavelengths only in the limit: within half the step's weight.
    beam = get_reference_spectra()["direct"]
    nm, power = beam.index.to_numpy(), beam.to_numpy()
    band, low = (nm >= 300) & (nm <= 2500), (nm >= 300) & (nm <= 780)
    expected = np.trapezoid(power[low], nm[low]) / np.trapezoid(power[band], nm[band])
    at = np.flatnonzero(WAVELENGTHS == 780.0)[0]
    assert weights[0, :at].sum() + weights[0, at] / 2 == pytest.approx(expected, abs=0.01)
    assert weights[1, WAVELENGTHS > 800.0].sum() == 0.0


def test_file_is_read_as_written(tmp_path):
    stack = read_layers(write(tmp_path))
    assert stack.names == ("oxide", "silver", "oxide")
    assert stack.thickness_nm.tolist() == [40.0, 12.0, 40.0]
    assert stack.index[1].tolist() == [2.0, 0.06 + 3.6j, 2.0]
    middle = stack.at(np.array([775.0]))
    assert middle.index[0, 1] == pytest.approx(0.10 + 5.25j)


def test_bands_of_a_coated_unit(tmp_path):
    # The same sum done by hand: every wavelength of a finer net through tmm's incoherent stack,
    # weighted by the trapezium rule, at angles that are not on the law's own net.
    tmm = pytest.importorskip("tmm")
    from pvlib.spectrum import get_reference_spectra

    stack = read_layers(write(tmp_path))
    panes = (Pane(thickness=0.006, extinction=(20.0, 6.0)),) * 2
    glazing, reflection = solved_glazing(panes, 2, stack)
    assert len(glazing.panes) == 2
    assert reflection.limits is None
    beam = get_reference_spectra()["direct"]
    nm = np.r_[np.arange(300.0, 780.0, 10.0), np.arange(780.0, 2501.0, 20.0)]
    power = np.interp(nm, beam.index.to_numpy(), beam.to_numpy())
    seen = power * np.interp(nm, spectral.V_WAVELENGTHS, spectral.V_LAMBDA, left=0, right=0)
    films = stack.at(nm)
    widths = [np.inf, 6e6, *stack.thickness_nm[::-1], 12e6, 6e6, np.inf]
    kinds = ["i", "i", "c", "c", "c", "i", "i", "i"]
    for angle in (0.0, 57.0, 74.0):
        got = reflection.law(np.radians([angle])).sum(axis=0)[:, :, 0]
        for band, (extinction, weight) in enumerate(((20.0, power), (6.0, seen))):
            for row, pol in enumerate("sp"):
                R = np.array(
                    [
                        tmm.inc_tmm(
                            pol,
                            [1, g := 1.52 + 1j * extinction * w * 1e-9 / (4 * np.pi)]
                            + [*films.index[k][::-1], 1, g, 1],
                            widths,
                            kinds,
                            np.radians(angle),
                            w,
                        )["R"]
                        for k, w in enumerate(nm)
                    ]
                )
                exact = np.trapezoid(R * weight, nm) / np.trapezoid(weight, nm)
                # spectrum's own lines between the coarse net's points, and the curve over angle
                assert got[band, row] == pytest.approx(exact, abs=4e-3)


@pytest.mark.parametrize(
    ("old", "new", "says"),
    [
        ("layer,", "layers,", "must start with 'layer'"),
        ("wavelength_nm, n,     k,", "wavelength_nm, k,     n,", "n, k for each layer"),
        ("thickness_nm,  40,    40", "thickness_nm,  40,    41", "its name and thickness"),
        ("thickness_nm,  40,    40", "thickness_nm,  -4,    -4", "thicknesses must be"),
        ("2500,  ", "2400,  ", "must span 300 to 2500"),
        ("1000,  ", "500,  ", "must rise"),
        ("0.06,   3.6", "0.06,   -3.6", "k >= 0"),
        ("0.06,   3.6", "0.06,   much", "line 7"),
        ("0.06,   3.6", "0.06", "numbers are wanted"),
    ],
)
def test_bad_files(tmp_path, old, new, says):
    assert old in FILE
    with pytest.raises(InputError, match=says) as error:
        read_layers(write(tmp_path, FILE.replace(old, new, 1)))
    assert "coat.csv" in error.value.message


def test_no_file_or_an_empty_one(tmp_path):
    with pytest.raises(InputError, match=r"nowhere\.csv cannot be read"):
        read_layers(tmp_path / "nowhere.csv")
    with pytest.raises(InputError, match="at least two wavelengths"):
        read_layers(write(tmp_path, "layer,a,a\n"))


def test_without_the_package(tmp_path, monkeypatch):
    real = builtins.__import__

    def without(name, *args, **kwargs):
        if name == "tmm":
            raise ImportError(name)
        return real(name, *args, **kwargs)

    stack = read_layers(write(tmp_path))
    monkeypatch.setattr(builtins, "__import__", without)
    with pytest.raises(StudyError, match="not installed") as error:
        solved_glazing((Pane(),), 2, stack)
    assert "causticload[spectral]" in error.value.hint
