"""Reflectance laid out for kernels: one table a sheet, read by interpolation over angle."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numba import njit
from numpy.typing import NDArray

from causticload.errors import InputError
from causticload.optics.finish import Finish
from causticload.optics.fresnel import Floats

STEPS_PER_DEGREE = 4
ANGLES = 90 * STEPS_PER_DEGREE + 1


@njit(cache=True, nogil=True, error_model="numpy")
def lookup(row, cos_theta):
    """Value of a table over 0 to 90 degrees at an angle of incidence, linear in the angle."""
    place = math.acos(min(1.0, max(0.0, cos_theta))) * (STEPS_PER_DEGREE * 180.0 / math.pi)
    i = min(int(place), row.size - 2)
    f = place - i
    return row[i] * (1.0 - f) + row[i + 1] * f


@dataclass(frozen=True)
class ReflectanceTables:
    """Tables of all sheets of a scene: ``k`` sheets of ``f`` finishes.

    A sheet is a lobe of a finish. Bands are solar, visible; polarisations s, p. Angles run from 0
    to 90 degrees by a quarter.
    """

    R: Floats  # (k, 2, 2, ANGLES) by band and polarisation
    R_low: Floats  # (k, 2, 2, ANGLES) what an unknown angular law leaves open
    R_high: Floats  # (k, 2, 2, ANGLES)
    low_factor: Floats  # (k, 2, ANGLES) by band: low over nominal, unpolarised light
    high_factor: Floats  # (k, 2, ANGLES)
    finish_of: NDArray[np.int32]  # (k,) number of the finish a sheet belongs to
    first_sheet: NDArray[np.int32]  # (f,) row of each finish's first sheet
    sheet_count: NDArray[np.int32]  # (f,) they follow one another
    pane: NDArray[np.int32]  # (k,) number of the pane it sits on, 0 = outermost
    enters: Floats  # (k,) 1 for a finish's first sheet, else 0
    slope_error: Floats  # (k,) rad, rms of both ways
    slope_errors: Floats  # (k, 2) rad, along and across the brush
    brush_along_height: NDArray[np.bool_]  # (k,) the lines run along the panel's height
    diffuse_fraction: Floats  # (k,)

    @classmethod
    def build(
        cls, finishes: Sequence[Finish], bow_apart: Sequence[bool] | None = None
    ) -> ReflectanceTables:
        """Lay out finishes.

        Parameters
        ----------
        finishes : sequence of Finish
            In any order.
        bow_apart : sequence of bool, optional
            For each finish: its panes part company, so each lobe becomes a sheet. Otherwise the
            finish is one sheet. Not given: each finish as it comes.

        Returns
        -------
        tables : ReflectanceTables
            Contiguous arrays.

        Raises
        ------
        InputError
            If there is no finish, or not one flag for each.
        """
        if not finishes:
            raise InputError("there must be at least one finish to lay out")
        if bow_apart is not None:
            if len(bow_apart) != len(finishes):
                raise InputError(
                    f"bow_apart must have one entry a finish: {len(finishes)}, got {len(bow_apart)}"
                )
            finishes = [
                f if apart else f.combined() for f, apart in zip(finishes, bow_apart, strict=True)
            ]
        theta = np.linspace(0.0, np.pi / 2, ANGLES)
        R, low, high = (
            np.ascontiguousarray(np.concatenate(tables), dtype=np.float64)
            for tables in (
                [f.reflectance(theta) for f in finishes],
                [f.low(theta) for f in finishes],
                [f.high(theta) for f in finishes],
            )
        )
        lobes = [lobe for f in finishes for lobe in f.lobes]
        counts = np.array([len(f.lobes) for f in finishes], dtype=np.int32)
        first = (np.cumsum(counts) - counts).astype(np.int32)
        enters = np.zeros(len(lobes))
        enters[first] = 1.0
        return cls(
            R=R,
            R_low=low,
            R_high=high,
            low_factor=_over(low.mean(axis=2), R.mean(axis=2)),
            high_factor=_over(high.mean(axis=2), R.mean(axis=2)),
            finish_of=np.repeat(np.arange(len(finishes), dtype=np.int32), counts),
            first_sheet=first,
            sheet_count=counts,
            pane=np.array([lobe.pane for lobe in lobes], dtype=np.int32),
            enters=enters,
            slope_error=np.array([lobe.mean_slope_error_rad for lobe in lobes]),
            slope_errors=np.array([lobe.slope_error_rad for lobe in lobes], dtype=np.float64),
            brush_along_height=np.array([lobe.brush_along == "height" for lobe in lobes]),
            diffuse_fraction=np.array([lobe.diffuse_fraction for lobe in lobes], dtype=np.float64),
        )


def _over(limit: Floats, nominal: Floats) -> Floats:
    """Ratio, 1 where nothing is reflected anyway."""
    return np.divide(limit, nominal, out=np.ones_like(nominal), where=nominal > 0.0)
