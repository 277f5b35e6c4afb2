"""Checks of arguments, and the pair "value, in range" that every law here hands back."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from causticload.errors import InputError

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]


class Ranged(NamedTuple):
    """A figure and whether the law behind it was asked inside its range."""

    value: Floats
    in_range: Bools


def within(
    name: str, values: ArrayLike, low: float = 0.0, high: float = np.inf, *, above: bool = False
) -> Floats:
    """Values as floats, all finite and in [low, high]; (low, high] with ``above``.

    Parameters
    ----------
    name : str
        Name of the argument, for the message.
    values : array_like of float
        Any shape.
    low, high : float
        Limits, in the unit of the values.
    above : bool
        True if ``low`` itself is not allowed.

    Returns
    -------
    values : ndarray of float
        Same shape.

    Raises
    ------
    InputError
        Names the first value that breaks the rule; nan does.
    """
    array = np.asarray(values, dtype=np.float64)
    over_low = array > low if above else array >= low
    bad = np.flatnonzero(~(over_low & (array <= high) & (array < np.inf)))
    if bad.size:
        bracket = "(" if above else "["
        raise InputError(
            f"{name} must be in {bracket}{low:g}, {high:g}], got {array.flat[bad[0]]:g} "
            f"(value number {bad[0]})"
        )
    return array


def rising(name: str, values: ArrayLike) -> Floats:
    """Values as floats, (t,) with t >= 2, finite and strictly rising.

    Parameters
    ----------
    name : str
        Name of the argument, for the message.
    values : array_like of float
        (t,) times or distances.

    Returns
    -------
    values : (t,) ndarray of float
        The same values.

    Raises
    ------
    InputError
        If they are not one row of at least two finite, rising values.
    """
    array = np.asarray(values, dtype=np.float64)
    if array.ndim != 1 or len(array) < 2:
        raise InputError(f"{name} must be one row of at least two values, got shape {array.shape}")
    if not (np.isfinite(array).all() and (np.diff(array) > 0.0).all()):
        raise InputError(f"{name} must be finite and rise from each value to the next")
    return array


def history(name: str, values: ArrayLike, steps: int) -> Floats:
    """Values as floats, (t, ...) with the given t, finite and not negative.

    Parameters
    ----------
    name : str
        Name of the argument, for the message.
    values : array_like of float
        (t, ...) time first.
    steps : int
        The t it must have.

    Returns
    -------
    values : (t, ...) ndarray of float
        The same values.

    Raises
    ------
    InputError
        If the first axis has another length, or a value is negative or not finite.
    """
    array = within(name, values)
    if array.ndim < 1 or array.shape[0] != steps:
        raise InputError(f"{name} must have {steps} rows, one for each time, got {array.shape}")
    return array
