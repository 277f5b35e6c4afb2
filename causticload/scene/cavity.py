"""Sealed cavities of insulating units: what pressure builds up, and what load each pane carries.

Linear theory of EN 16612:2019 and DIN 18008-2 (from memory; the constants follow from the gas law
and the weight of air), written for any number of panes. Loads from outside, such as wind, are not
part of it. Leaks of gas are not either: give their pressure directly.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from causticload.errors import InputError
from causticload.scene.model import Floats

PRESSURE_PER_KELVIN_PA = 340.0  # of a sealed gas: 100 kPa over 290 K or so
PRESSURE_PER_METRE_PA = 12.0  # weight of a metre of air
ATMOSPHERE_PA = 100e3  # that the standards linearise about


def isochore_pressure(
    *,
    warmer_k: float = 0.0,
    barometer_rise_pa: float = 0.0,
    higher_m: float = 0.0,
) -> float:
    """Over-pressure in a cavity whose panes do not give way.

    Parameters
    ----------
    warmer_k : float
        Gas in the cavity now, less its temperature at sealing. [K]
    barometer_rise_pa : float
        Barometer now, less that at sealing, both reduced to sea level. [Pa]
    higher_m : float
        Altitude of the building, less that of the factory. [m]

    Returns
    -------
    pressure : float
        Positive pushes the panes apart. [Pa]
    """
    return PRESSURE_PER_KELVIN_PA * warmer_k - barometer_rise_pa + PRESSURE_PER_METRE_PA * higher_m


def share_load(
    isochore_pa: float, *, gaps_m: Sequence[float], compliance: Sequence[float]
) -> Floats:
    """Load that each pane carries once the panes have given way.

    Parameters
    ----------
    isochore_pa : float
        Isochore over-pressure, alike in all cavities. [Pa]
    gaps_m : sequence of float
        Widths of the ``n - 1`` cavities from outdoors, > 0. [m]
    compliance : sequence of float
        Mean deflection of each of the ``n`` panes under an even pressure of 1 Pa, > 0. [m/Pa]

    Returns
    -------
    load : (n,) float
        Net pressure on each pane, positive towards outdoors. [Pa]

    Raises
    ------
    InputError
        If there is not one gap fewer than panes, or a value is not above 0.
    """
    gap, give = np.asarray(gaps_m, float), np.asarray(compliance, float)
    n = len(give)
    if n < 2 or len(gap) != n - 1:
        raise InputError(f"{n} pane(s) have {max(n - 1, 0)} cavities, got {len(gap)} gap(s)")
    if not ((gap > 0.0).all() and (give > 0.0).all()):
        raise InputError("gaps and compliances must be > 0")
    # Column j: what a pascal in cavity j does to its outer and to its inner pane.
    on_pane = np.zeros((n, n - 1))
    j = np.arange(n - 1)
    on_pane[j, j], on_pane[j + 1, j] = 1.0, -1.0
    widening = (on_pane.T * give) @ on_pane  # m per Pa
    pressure = np.linalg.solve(
        np.eye(n - 1) + ATMOSPHERE_PA * widening / gap[:, None], np.full(n - 1, isochore_pa)
    )
    return np.asarray(on_pane @ pressure)
