"""What a surface sends back: Fresnel's equations, glazing units, metals, data sheets."""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from causticload.errors import InputError
from causticload.optics.builtin import BUILT_IN, list_finishes
from causticload.optics.finish import Finish, Lobe
from causticload.optics.fresnel import Floats
from causticload.optics.resolve import resolve_finish
from causticload.study.model import FinishSpec

__all__ = [
    "BUILT_IN",
    "Finish",
    "Lobe",
    "Reflectance",
    "list_finishes",
    "reflectance",
    "resolve_finish",
]


class Reflectance(NamedTuple):
    """Reflectance over angle, unpolarised light."""

    solar: Floats  # (n,)
    visible: Floats  # (n,)


def reflectance(
    name: str, angles: ArrayLike, finishes: Mapping[str, FinishSpec] | None = None
) -> Reflectance:
    """Reflectance of a finish for unpolarised light.

    Parameters
    ----------
    name : str
        A built-in finish, or one of ``finishes``.
    angles : (n,) float
        Angles of incidence, in [0, 90]. [degrees]
    finishes : mapping of str to FinishSpec, optional
        A study's own finishes.

    Returns
    -------
    reflectance : Reflectance
        Solar and visible, all panes together. [1]

    Raises
    ------
    InputError
        If an angle is out of range.
    StudyError
        If there is no such finish.
    """
    a = np.atleast_1d(np.asarray(angles, dtype=float))
    if not ((a >= 0.0) & (a <= 90.0)).all():
        raise InputError(f"angles must be in [0, 90] degrees, got {angles!r}")
    R = resolve_finish(name, finishes or {}).reflectance(np.radians(a))
    return Reflectance(*R.sum(axis=0).mean(axis=1))
