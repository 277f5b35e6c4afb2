"""Reflectance laid out for kernels: one table a sheet, read by interpolation over angle."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numba import njit

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
    """Tables of all sheets of a scene. ``k`` sheets of ``f`` finishes."""

    R: Floats  # (k, 2, 2, ANGLES) solar and visible by s and p
    first_sheet: np.ndarray  # (f,) row of each finish's first sheet
    enters: Floats  # (k,) 1 for a finish's first sheet, else 0
    slope_error: Floats  # (k,) rad
    diffuse_fraction: Floats  # (k,)

    @classmethod
    def build(cls, finishes: Sequence[Finish]) -> ReflectanceTables:
        """Lay out finishes.

        Parameters
        ----------
        finishes : sequence of Finish
            In any order; each of their lobes becomes a sheet.

        Returns
        -------
        tables : ReflectanceTables
            Contiguous arrays.
        """
        cos = np.cos(np.radians(np.linspace(0.0, 90.0, ANGLES))).clip(0.0, 1.0)
        cos[-1] = 0.0
        counts = [len(f.lobes) for f in finishes]
        first = np.concatenate([[0], np.cumsum(counts)[:-1]]).astype(np.int32)
        enters = np.zeros(sum(counts))
        enters[first] = 1.0
        return cls(
            R=np.ascontiguousarray([lobe.law(cos) for f in finishes for lobe in f.lobes]),
            first_sheet=first,
            enters=enters,
            slope_error=np.repeat([f.slope_error_rad for f in finishes], counts),
            diffuse_fraction=np.repeat([f.diffuse_fraction for f in finishes], counts),
        )
