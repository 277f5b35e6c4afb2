"""Coatings solved as thin films, wavelength by wavelength, by way of the ``tmm`` package.

A *layer file* is a CSV file with the layers of one coating, in order from the air to the glass.
Lines that start with ``#`` and empty lines are skipped::

    layer,         zinc oxide, zinc oxide, silver, silver
    thickness_nm,  40,         40,         12,     12
    wavelength_nm, n,          k,          n,      k
    300,           2.40,       0.02,       1.51,   0.96
    ...

Two columns a layer: real part n and imaginary part k >= 0 of the refractive index. Between the
wavelengths given, which must span 300 to 2500 nm, n and k are linear.

The panes themselves keep their extinctions of the solar and the visible band. The solar band is
weighted by the direct spectrum of ASTM G173-03; the visible band by the same spectrum times the
eye's sensitivity V(lambda) of CIE 1924. (Data sheets by EN 410 take illuminant D65 in its place;
for the usual coatings that changes the visible figure in the third digit.)
"""

from __future__ import annotations

import csv
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from causticload.errors import InputError, StudyError
from causticload.optics.angular import through_points
from causticload.optics.finish import Reflection
from causticload.optics.fresnel import Floats
from causticload.optics.stack import GLASS_INDEX, Coating, Glazing, Layer, Pane

# Denser in the visible, where coatings change fast and V(lambda) is narrow. [nm]
WAVELENGTHS = np.r_[
    np.arange(300.0, 780.0, 15.0), np.arange(780.0, 1280.0, 50.0), np.arange(1280.0, 2501.0, 122.0)
]
# Denser where reflectance rises. [degrees]
ANGLES = np.array(
    [0.0, 15, 30, 40, 48, 54, 60, 64, 68, 72, 75, 78, 80.5, 83, 85, 87, 88.5, 89.5, 90]
)

# CIE 1924 spectral luminous efficiency V(lambda), 380 to 780 nm by 10 nm (published table, from
# memory; its sum times 10 nm is the known 106.86 nm).
V_LAMBDA = np.array(
    [0.000039, 0.00012, 0.000396, 0.00121, 0.0040, 0.0116, 0.023, 0.038, 0.060, 0.09098]
    + [0.13902, 0.20802, 0.323, 0.503, 0.710, 0.862, 0.954, 0.99495, 0.995, 0.952]
    + [0.870, 0.757, 0.631, 0.503, 0.381, 0.265, 0.175, 0.107, 0.061, 0.032]
    + [0.017, 0.00821, 0.004102, 0.002091, 0.001047, 0.00052, 0.000249, 0.00012, 0.00006, 0.00003]
    + [0.000015]
)
V_WAVELENGTHS = np.arange(380.0, 781.0, 10.0)


@dataclass(frozen=True, kw_only=True)
class FilmStack:
    """Thin layers of one coating, from the air to the glass. ``w`` wavelengths, ``l`` layers."""

    names: tuple[str, ...]  # (l,)
    thickness_nm: Floats  # (l,)
    wavelength_nm: Floats  # (w,)
    index: np.ndarray[Any, np.dtype[np.complex128]]  # (w, l) n + i k

    def at(self, wavelength_nm: Floats) -> FilmStack:
        """Return the same layers at other wavelengths.

        Parameters
        ----------
        wavelength_nm : (v,) float
            Within those of the stack. [nm]

        Returns
        -------
        stack : FilmStack
            Indices interpolated linearly.
        """
        index = np.stack(
            [np.interp(wavelength_nm, self.wavelength_nm, column) for column in self.index.T],
            axis=1,
        )
        return FilmStack(
            names=self.names,
            thickness_nm=self.thickness_nm,
            wavelength_nm=np.asarray(wavelength_nm, dtype=float),
            index=index,
        )


@dataclass(frozen=True)
class FilmCoating:
    """A coating solved as a coherent film; its layer has a leading axis for the wavelength."""

    stack: FilmStack

    def layer(self, cos_i: Floats) -> Layer:
        """Solve the film.

        Parameters
        ----------
        cos_i : (n,) float
            Cosine of the angle of incidence in air, > 0. [1]

        Returns
        -------
        layer : Layer
            Arrays (w, 1, 2, n).
        """
        tmm = _tmm()
        thick = [np.inf, *self.stack.thickness_nm, np.inf]
        shape = (len(self.stack.wavelength_nm), 1, 2, len(cos_i))
        R, R_back, T = np.empty(shape), np.empty(shape), np.empty(shape)
        outside = np.arccos(cos_i)
        inside = np.arcsin(np.sin(outside) / GLASS_INDEX)
        for w, (wave, films) in enumerate(
            zip(self.stack.wavelength_nm, self.stack.index, strict=True)
        ):
            indices = [1.0, *films, GLASS_INDEX]
            for p, pol in enumerate("sp"):
                for a in range(len(cos_i)):
                    there = tmm.coh_tmm(pol, indices, thick, outside[a], wave)
                    back = tmm.coh_tmm(pol, indices[::-1], thick[::-1], inside[a], wave)
                    R[w, 0, p, a], T[w, 0, p, a] = there["R"], there["T"]
                    R_back[w, 0, p, a] = back["R"]
        return Layer(R, R_back, T)


def _tmm() -> Any:
    try:
        import tmm
    except ImportError:
        raise StudyError(
            "a layer file needs the package tmm, which is not installed",
            hint="Install it with: pip install 'causticload[spectral]'",
        ) from None
    return tmm


def read_layers(path: Path) -> FilmStack:
    """Read a layer file.

    Parameters
    ----------
    path : Path
        CSV file; see the head of this module for its layout.

    Returns
    -------
    stack : FilmStack
        Layers from the air to the glass.

    Raises
    ------
    InputError
        If the file cannot be read or its contents are out of range.
    """
    name = Path(path).name
    try:
        text = Path(path).read_text(encoding="utf-8-sig")
    except (OSError, UnicodeDecodeError) as error:
        raise InputError(f"{name} cannot be read: {error}") from None
    lines = [(k, line) for k, line in enumerate(text.splitlines(), 1) if _holds_data(line)]
    rows = [(k, [cell.strip() for cell in next(csv.reader([line]))]) for k, line in lines]
    if len(rows) < 5:
        raise InputError(f"{name} must have three head rows and at least two wavelengths")
    heads = ("layer", "thickness_nm", "wavelength_nm")
    for (line, row), head in zip(rows, heads, strict=False):
        if row[0] != head:
            raise InputError(f"{name}, line {line}: must start with {head!r}, got {row[0]!r}")
    width = len(rows[0][1])
    if width < 3 or width % 2 == 0:
        raise InputError(f"{name}, line {rows[0][0]}: two columns a layer are wanted")
    if rows[2][1][1:] != ["n", "k"] * (width // 2):
        raise InputError(f"{name}, line {rows[2][0]}: columns must be n, k for each layer")
    thickness = _numbers(name, rows[1][0], rows[1][1][1:], width - 1)
    data = np.array([_numbers(name, line, row, width) for line, row in rows[3:]])
    _check_layers(name, rows[0][1][1:], thickness, data)
    return FilmStack(
        names=tuple(rows[0][1][1::2]),
        thickness_nm=thickness[::2],
        wavelength_nm=data[:, 0],
        index=data[:, 1::2] + 1j * data[:, 2::2],
    )


def _holds_data(line: str) -> bool:
    return bool(line.strip()) and not line.lstrip().startswith("#")


def _numbers(name: str, line: int, cells: list[str], count: int) -> Floats:
    try:
        values = np.array([float(cell) for cell in cells])
    except ValueError as error:
        raise InputError(f"{name}, line {line}: {error}") from None
    if len(values) != count or not np.isfinite(values).all():
        raise InputError(f"{name}, line {line}: {count} numbers are wanted, got {len(values)}")
    return values


def _check_layers(name: str, labels: list[str], thickness: Floats, data: Floats) -> None:
    if labels[::2] != labels[1::2] or (thickness[::2] != thickness[1::2]).any():
        raise InputError(f"{name}: both columns of a layer must carry its name and thickness")
    if not ((thickness > 0.0) & (thickness < 5000.0)).all():
        raise InputError(f"{name}: thicknesses must be in (0, 5000) nm, got {thickness.tolist()}")
    wave = data[:, 0]
    if not (np.diff(wave) > 0.0).all():
        raise InputError(f"{name}: wavelengths must rise")
    if wave[0] > WAVELENGTHS[0] or wave[-1] < WAVELENGTHS[-1]:
        raise InputError(
            f"{name}: wavelengths must span {WAVELENGTHS[0]:g} to {WAVELENGTHS[-1]:g} nm, "
            f"got {wave[0]:g} to {wave[-1]:g}"
        )
    if not ((data[:, 1::2] > 0.0).all() and (data[:, 2::2] >= 0.0).all()):
        raise InputError(f"{name}: n must be > 0 and k >= 0")


def band_weights(wavelength_nm: Floats) -> Floats:
    """Shares of the solar and the visible band that fall to each wavelength.

    A quantity that is linear between the wavelengths is averaged exactly.

    Parameters
    ----------
    wavelength_nm : (w,) float
        Rising, from 300 to 2500 nm. [nm]

    Returns
    -------
    weights : (2, w) float
        Solar and visible; each row sums to 1. [1]

    References
    ----------
    ASTM G173-03, direct normal spectrum (as shipped by pvlib); CIE 1924 V(lambda).
    """
    from pvlib.spectrum import get_reference_spectra

    sun = get_reference_spectra()["direct"]
    fine = np.arange(wavelength_nm[0], wavelength_nm[-1] + 0.5, 1.0)
    beam = np.interp(fine, sun.index.to_numpy(), sun.to_numpy())
    seen = beam * np.interp(fine, V_WAVELENGTHS, V_LAMBDA, left=0.0, right=0.0)
    hats = np.stack([np.interp(fine, wavelength_nm, row) for row in np.eye(len(wavelength_nm))])
    weights = np.stack([beam, seen]) @ hats.T
    return np.asarray(weights / weights.sum(axis=1, keepdims=True))


def solved_glazing(
    panes: tuple[Pane, ...],
    surface: int,
    stack: FilmStack,
    *,
    others: Mapping[int, Coating] | None = None,
    gaps: tuple[float, ...] = (),
) -> tuple[Glazing, Reflection]:
    """Solve a glazing unit with a thin-film coating.

    Parameters
    ----------
    panes : tuple of Pane
        From outdoors inwards.
    surface : int
        Number of the coated surface, 1 = outdoors.
    stack : FilmStack
        Layers of the coating.
    others : mapping of int to Coating, optional
        Coatings of further surfaces.
    gaps : tuple of float, optional
        Between the panes. [m]

    Returns
    -------
    glazing : Glazing
        With the coating at :data:`WAVELENGTHS`.
    reflection : Reflection
        Its panes' reflectances in both bands, a monotone curve through :data:`ANGLES`. Nothing
        is left open.
    """
    film = FilmCoating(stack.at(WAVELENGTHS))
    glazing = Glazing(panes=panes, coatings={**(others or {}), surface: film}, gaps=gaps)
    theta = np.radians(ANGLES)
    theta[-1] = np.pi / 2
    spectrum = glazing.pane_reflectances(theta)  # (panes, w, 2, 2, n)
    R = np.einsum("kwbpn,bw->kbpn", spectrum, band_weights(WAVELENGTHS))
    return glazing, Reflection(through_points(theta, R))
