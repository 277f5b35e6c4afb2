"""Colours for loads: perceptually uniform, readable in grey and by people who confuse colours."""

from __future__ import annotations

import math

import numpy as np
from matplotlib import colormaps
from numpy.typing import NDArray

from causticload.scene.model import Floats

# Made to read alike with and without red-green confusion, and to rise evenly in lightness.
LOAD_MAP = "cividis"
CHANGE_MAP = "PuOr"  # two hues that stay apart under all common confusions
NEUTRAL = (178, 178, 178, 255)
REFLECTOR = (150, 158, 168, 255)
MARK = (20, 20, 20, 255)

Colours = NDArray[np.uint8]


def map_colours(values: Floats, *, low: float, high: float, name: str = LOAD_MAP) -> Colours:
    """Colours of values on a linear scale.

    Parameters
    ----------
    values : (n,) float
        Any unit.
    low, high : float
        Ends of the scale; values beyond them take the end colours.
    name : str
        Name of the colour map.

    Returns
    -------
    colours : (n, 4) uint8
        Red, green, blue, opacity as shown on a display; grey where a value is not a number.
    """
    span = high - low if high > low else 1.0
    share = np.clip((np.asarray(values, float) - low) / span, 0.0, 1.0)
    colours = colormaps[name](np.nan_to_num(share), bytes=True)
    colours[np.isnan(share)] = NEUTRAL
    return np.asarray(colours, np.uint8)


def round_end(highest: float) -> float:
    """Give the end of a scale that holds a value: 1, 1.5, 2, 2.5, 3, 4, 5, 6 or 8 times 10^n.

    Parameters
    ----------
    highest : float
        Largest value to show.

    Returns
    -------
    end : float
        At least ``highest``; 1 for nothing.
    """
    if not highest > 0.0:
        return 1.0
    power = 10.0 ** math.floor(math.log10(highest))
    for step in (1.0, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0, 8.0, 10.0):
        if highest <= step * power * (1.0 + 1e-12):
            return step * power
    return 10.0 * power
