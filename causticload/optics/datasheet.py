"""From figures of a data sheet at normal incidence back to panes and coatings.

All of it is at normal incidence, where s and p are alike, one band at a time.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np
from scipy.optimize import brentq

from causticload.errors import InputError
from causticload.optics.angular import SheetCoating, check_share
from causticload.optics.stack import Glazing, Pane

_MOST_EXTINCTION = 2000.0  # 1/m: 6 mm of it are black
_ROUNDING = 5e-4  # a sheet's figure may lie beyond a limit by half its third digit

Pair = tuple[float, float]


def clear_glazing(
    panes: Sequence[Pane],
    *,
    solar: float | None,
    visible: float | None,
    gaps: tuple[float, ...] = (),
) -> Glazing:
    """Find uncoated panes that meet a data sheet, by what the glass absorbs.

    Parameters
    ----------
    panes : sequence of Pane
        From outdoors inwards; thickness and index are kept.
    solar, visible : float or None
        Reflectance of the unit at normal incidence, outdoor side. None keeps the extinction that
        the panes come with. [1]
    gaps : tuple of float
        Between the panes, if known. [m]

    Returns
    -------
    glazing : Glazing
        All panes of the same extinction in a band whose figure is given.

    Raises
    ------
    InputError
        If no absorption meets the figure.
    """
    unit = tuple(panes)
    for band, (name, r0) in enumerate((("solar", solar), ("visible", visible))):
        if r0 is None:
            continue
        check_share(**{f"{name}_reflectance": r0})
        extinction = _extinction_meeting(unit, band, r0)
        unit = tuple(replace(p, extinction=_with(p.extinction, band, extinction)) for p in unit)
    return Glazing(panes=unit, gaps=gaps)


def _extinction_meeting(panes: tuple[Pane, ...], band: int, r0: float) -> float:
    def miss(extinction: float) -> float:
        unit = [replace(p, extinction=_with(p.extinction, band, extinction)) for p in panes]
        return normal_reflectance(Glazing(panes=tuple(unit)), band) - r0

    most, least = r0 + miss(0.0), r0 + miss(_MOST_EXTINCTION)
    if r0 > most + _ROUNDING:
        raise InputError(
            f"{len(panes)} pane(s) of clear glass reflect at most {most:.3f} at normal incidence, "
            f"even if they absorb nothing, got {r0}",
            hint="A figure beyond that is of a coated unit: use angular = 'coated glass'.",
        )
    if r0 < least - _ROUNDING:
        raise InputError(
            f"the outdoor face of clear glass alone reflects {least:.3f}, got {r0}",
            hint="A figure below that is of a coated unit: use angular = 'coated glass'.",
        )
    if r0 >= most:
        return 0.0
    return _MOST_EXTINCTION if r0 <= least else float(brentq(miss, 0.0, _MOST_EXTINCTION))


def coating_of_unit(
    panes: Sequence[Pane],
    surface: int,
    *,
    solar: float,
    visible: float,
    absorbed: Pair = (0.0, 0.0),
) -> SheetCoating:
    """Find the coating that gives a whole unit its data-sheet reflectance.

    The film is taken to reflect alike from both sides, exact for one that absorbs nothing.

    Parameters
    ----------
    panes : sequence of Pane
        From outdoors inwards.
    surface : int
        Number of the coated surface, 1 = outdoors.
    solar, visible : float
        Reflectance of the unit at normal incidence, outdoor side. [1]
    absorbed : tuple of float
        Share that the film absorbs, solar and visible. [1]

    Returns
    -------
    coating : SheetCoating
        Its figures.

    Raises
    ------
    InputError
        If no film on that surface gives such figures.
    """
    found: list[float] = []
    for band, (name, r0) in enumerate((("solar", solar), ("visible", visible))):
        taken = absorbed[band]
        check_share(**{f"{name}_reflectance": r0, f"absorbed {name}_share": taken})

        most = 1.0 - taken

        def miss(film: float, band: int = band, r0: float = r0, most: float = most) -> float:
            both = (film, film)
            through = (max(most - film, 0.0),) * 2
            coating = SheetCoating(air=both, glass=both, transmittance=through)
            unit = Glazing(panes=tuple(panes), coatings={surface: coating})
            return normal_reflectance(unit, band) - r0

        root = _root(miss, most)
        if root is None:
            raise InputError(
                f"a coating on surface {surface} gives this unit a {name} reflectance of "
                f"{r0 + miss(0.0):.3f} to {r0 + miss(most):.3f}, got {r0}",
                hint="Is the coating on another surface?",
            )
        found.append(root)
    film = (found[0], found[1])
    left = (max(1.0 - film[0] - absorbed[0], 0.0), max(1.0 - film[1] - absorbed[1], 0.0))
    return SheetCoating(air=film, glass=film, transmittance=left)


def coating_of_pane(
    pane: Pane,
    *,
    indoor_face: bool,
    outdoor: Pair,
    indoor: tuple[float | None, float | None] = (None, None),
    transmittance: tuple[float | None, float | None] = (None, None),
) -> SheetCoating:
    """Find the film on one face of a pane from the data sheet of the coated pane.

    Where the sheet is silent the film is taken to reflect alike from both sides and to absorb
    nothing: each follows exactly from the other for a lossless film.

    Parameters
    ----------
    pane : Pane
        The glass.
    indoor_face : bool
        The film is on the face towards indoors (surfaces 2, 4, ...).
    outdoor : tuple of float
        Reflectance of the coated pane seen from outdoors, solar and visible. [1]
    indoor : tuple of float or None
        The same from indoors. [1]
    transmittance : tuple of float or None
        Transmittance of the coated pane. [1]

    Returns
    -------
    coating : SheetCoating
        Figures of the film itself.

    Raises
    ------
    InputError
        If the figures do not fit together.
    """
    bare = ((pane.index - 1.0) / (pane.index + 1.0)) ** 2
    films = []
    for band in range(2):
        a = float(np.exp(-pane.extinction[band] * pane.thickness))
        out, into = outdoor[band], indoor[band]
        glass, film = (out, into) if indoor_face else (into, out)
        films.append(_film(bare, a, film=film, glass=glass, T=transmittance[band]))
    air, within, through = zip(*films, strict=True)
    return SheetCoating(air=air, glass=within, transmittance=through)


def _film(
    r: float, a: float, *, film: float | None, glass: float | None, T: float | None
) -> tuple[float, float, float]:
    """Film from a pane's figures: its film side, its bare side, its transmittance.

    ``r`` is the bare face, ``a`` what the glass lets through. Inverse of the two-surface sums.
    """
    for name, value in (("reflectance", film), ("reflectance", glass), ("transmittance", T)):
        if value is not None:
            check_share(**{name: value})

    def from_air(R: float) -> tuple[float, float, float]:
        within = R
        if glass is not None:
            within = (glass - r) / ((1.0 - r) ** 2 * a**2 + r * a**2 * (glass - r))
        if T is None:
            return R, within, 1.0 - max(R, within)
        return R, within, T * (1.0 - r * within * a**2) / ((1.0 - r) * a)

    def miss(R: float) -> float:
        _, within, through = from_air(R)
        return R + through**2 * a**2 * r / (1.0 - r * within * a**2) - (film or 0.0)

    # Without the coated side's figure the film is taken to reflect alike from both sides.
    answer = from_air(0.0)[1] if film is None else _root(miss, 1.0)
    if answer is None or not (
        all(-1e-9 <= x <= 1.0 + 1e-9 for x in from_air(answer))
        and max(from_air(answer)[:2]) + from_air(answer)[2] <= 1.0 + 1e-9
    ):
        given = {"coated side": film, "bare side": glass, "transmittance": T}
        text = ", ".join(f"{k} {v:g}" for k, v in given.items() if v is not None)
        raise InputError(
            f"no film on this pane gives these figures: {text}",
            hint="Check the sides, the thickness and the extinction of the glass.",
        )
    air, within, through = (min(max(x, 0.0), 1.0) for x in from_air(answer))
    return air, within, through


def normal_reflectance(glazing: Glazing, band: int) -> float:
    """Reflectance of a unit at normal incidence in one band.

    Parameters
    ----------
    glazing : Glazing
        The unit.
    band : int
        0 solar, 1 visible.

    Returns
    -------
    reflectance : float
        From outdoors. [1]
    """
    return float(glazing.unit_reflectance(np.zeros(1))[band, 0, 0])


def _with(pair: Pair, band: int, value: float) -> Pair:
    return (value, pair[1]) if band == 0 else (pair[0], value)


def _root(miss: Callable[[float], float], most: float) -> float | None:
    """Zero of a rising function over [0, most], None if it is not there."""
    at_0, at_most = miss(0.0), miss(most)
    if at_0 > _ROUNDING or at_most < -_ROUNDING:
        return None
    if at_0 >= 0.0:
        return 0.0
    return most if at_most <= 0.0 else float(brentq(miss, 0.0, most, xtol=1e-13))
