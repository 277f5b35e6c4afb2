"""How a data sheet's figure at normal incidence goes on to other angles.

Clear glass follows Fresnel's equations (:mod:`causticload.optics.datasheet`). The other laws stand
here, each with the range that it leaves open.

*Coated glass.* No published law gives the *reflectance* of an unknown coating over angle; the
formula of Karlsson and Roos (Solar Energy 69, 2000) is for transmittance. This closure is this
project's own engineering rule: what is not reflected falls off as it does for uncoated glass,

    R(theta) = 1 - (1 - R0) (1 - r(theta)) / (1 - r(0)),

for s and p apart. With r of a lossless pane it is applied to a whole unit
(:func:`coated_glass`); with r of one uncoated surface, to the coated surface alone inside a stack
(:class:`SheetCoating`), which errs less because panes and gaps are then exact.

Both were held against thin-film calculations of eleven coatings (one and two silver layers at
550 and 1000 nm, chromium, titanium nitride, steel, tin oxide), on surface 1 or 2 of one pane and 2
or 3 of two, with clear and with absorbing glass. Largest errors for unpolarised light at 60, 75
and 85 degrees: unit closure too low by 0.09, 0.19, 0.11 (silver) and too high by 0.07, 0.15, 0.18
(absorbing films); surface closure too low by 0.06, 0.10, 0.06 and too high by 0.06, 0.12, 0.13.
The tables below enclose them. Beyond them lies only a bare absorbing metal film in the open on
surface 1, where the closures
were too high by up to 0.30 and 0.22. Above 60 degrees measured angular
data or a layer file are worth asking for.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.interpolate import PchipInterpolator

from causticload.errors import InputError
from causticload.optics.finish import Law, Reflection
from causticload.optics.fresnel import Floats, cosine_of, interface_reflectance, metal_reflectance
from causticload.optics.stack import GLASS_INDEX, Glazing, Layer

_ANGLE = np.radians([0.0, 20.0, 30.0, 40.0, 50.0, 60.0, 70.0, 75.0, 80.0, 85.0, 87.0, 89.0, 90.0])


@dataclass(frozen=True)
class Band:
    """Largest errors of a closure at ``_ANGLE``, for unpolarised light."""

    down: tuple[float, ...]  # the closure is too high by as much
    up: tuple[float, ...]  # the closure is too low by as much

    def spread(self, theta: Floats, nominal: Floats) -> tuple[Floats, Floats]:
        """Move a unit's reflectance down and up by the errors, without leaving [0, 1].

        Parameters
        ----------
        theta : (n,) float
            Angle of incidence. [rad]
        nominal : (lobes, 2, 2, n) float
            Reflectances by the closure. [1]

        Returns
        -------
        low, high : (lobes, 2, 2, n) float
            Lobes move in proportion; s and p so that their mean moves by the error. [1]
        """
        total = nominal.sum(axis=0)
        mean = total.mean(axis=1, keepdims=True)
        down = np.maximum(mean - np.interp(theta, _ANGLE, self.down), 0.0)
        up = np.minimum(mean + np.interp(theta, _ANGLE, self.up), 1.0)
        low = nominal * np.divide(down, mean, out=np.ones_like(mean), where=mean > 0.0)
        shrink = np.divide(1.0 - up, 1.0 - mean, out=np.ones_like(mean), where=mean < 1.0)
        more = (1.0 - total) * (1.0 - shrink)
        even = np.full_like(nominal, 1.0 / len(nominal))
        share = np.divide(nominal, total, out=even, where=total > 0.0)
        return low, np.minimum(nominal + more * share, 1.0)


UNIT_BAND = Band(
    down=(0.0, 0.008, 0.012, 0.02, 0.04, 0.08, 0.135, 0.17, 0.19, 0.19, 0.15, 0.08, 0.0),
    up=(0.0, 0.01, 0.018, 0.03, 0.05, 0.10, 0.17, 0.19, 0.185, 0.12, 0.08, 0.03, 0.0),
)
SURFACE_BAND = Band(
    down=(0.0, 0.008, 0.012, 0.02, 0.03, 0.07, 0.115, 0.125, 0.135, 0.135, 0.11, 0.055, 0.0),
    up=(0.0, 0.01, 0.018, 0.03, 0.045, 0.065, 0.10, 0.10, 0.09, 0.07, 0.05, 0.025, 0.0),
)


def check_share(**values: float) -> None:
    """Refuse what is no share.

    Parameters
    ----------
    **values : float
        By name; each must be in [0, 1]. [1]

    Raises
    ------
    InputError
        Naming the first that is not.
    """
    for name, value in values.items():
        if not 0.0 <= value <= 1.0:
            raise InputError(f"{name.replace('_', ' ')} must be in [0, 1], got {value!r}")


def _single(bands: list[Floats]) -> Floats:
    """One lobe from its (2, n) tables of the solar and the visible band."""
    return np.stack(bands)[None]


def glazing_reflection(glazing: Glazing, band: Band | None = None) -> Reflection:
    """Take the reflectance of a glazing unit, each pane a lobe.

    Parameters
    ----------
    glazing : Glazing
        Panes and coatings.
    band : Band, optional
        What its coatings leave open; None if nothing.

    Returns
    -------
    reflection : Reflection
        Law and limits.
    """

    def law(theta: Floats) -> Floats:
        R = glazing.pane_reflectances(theta)
        return np.ascontiguousarray(np.broadcast_to(R, (len(R), 2, 2, np.size(theta))))

    if band is None:
        return Reflection(law)
    return Reflection(law, lambda theta: band.spread(theta, law(theta)))


def constant(*, solar: float, visible: float) -> Reflection:
    """Keep the same reflectance at every angle.

    Parameters
    ----------
    solar, visible : float
        Reflectance, in [0, 1]. [1]

    Returns
    -------
    reflection : Reflection
        Nothing is left open: the user has said so.
    """
    check_share(solar_reflectance=solar, visible_reflectance=visible)

    def law(theta: Floats) -> Floats:
        one = np.ones_like(cosine_of(theta))
        return _single([np.stack([one, one]) * value for value in (solar, visible)])

    return Reflection(law)


def coated_glass(*, solar: float, visible: float) -> Reflection:
    """Continue a coated unit's reflectance by the closure.

    Parameters
    ----------
    solar, visible : float
        Reflectance of the whole unit at normal incidence, outdoor side, in [0, 1]. [1]

    Returns
    -------
    reflection : Reflection
        One lobe, with the closure's error band: about 0.09 at 60 degrees, 0.18 at 75, 0.15 at 85
        (see the head of this module, which states each side and how they were found).
    """
    check_share(solar_reflectance=solar, visible_reflectance=visible)
    slab0 = float(_lossless_pane(np.ones(1))[0, 0])

    def law(theta: Floats) -> Floats:
        kept = (1.0 - _lossless_pane(cosine_of(theta))) / (1.0 - slab0)
        return _single([_never_below_zero(1.0 - (1.0 - r0) * kept) for r0 in (solar, visible)])

    return Reflection(law, lambda theta: UNIT_BAND.spread(theta, law(theta)))


def _never_below_zero(R: Floats) -> Floats:
    """Keep the mean of s and p where p would fall below 0, near Brewster's angle."""
    short = np.minimum(R[1], 0.0)
    return np.stack([R[0] + short, R[1] - short]).clip(0.0, 1.0)


def _lossless_pane(cos_i: Floats) -> Floats:
    r = interface_reflectance(cos_i, eta=GLASS_INDEX)
    return 2.0 * r / (1.0 + r)


@dataclass(frozen=True, kw_only=True)
class SheetCoating:
    """A coated surface known by its figures at normal incidence, solar and visible.

    They are those of the film between air and glass, not of the coated pane;
    :mod:`causticload.optics.datasheet` finds them from a pane's or a unit's data sheet.
    """

    air: tuple[float, float]  # reflectance seen from the air
    glass: tuple[float, float]  # reflectance seen from within the glass
    transmittance: tuple[float, float]  # the same both ways

    def __post_init__(self) -> None:
        for air, glass, T in zip(self.air, self.glass, self.transmittance, strict=True):
            check_share(reflectance_from_air=air, reflectance_from_glass=glass, transmittance=T)
            if max(air, glass) + T > 1.0 + 1e-9:
                raise InputError(
                    "a coating cannot send on more than it receives: reflectance "
                    f"{max(air, glass):.4g} and transmittance {T:.4g} add up to more than 1"
                )

    def layer(self, cos_i: Floats) -> Layer:
        """Return the film over angle by the closure.

        Parameters
        ----------
        cos_i : (n,) float
            Cosine of the angle of incidence in air. [1]

        Returns
        -------
        layer : Layer
            Reflectances and transmittance. Reflected, transmitted and absorbed shares add up to
            1 at every angle.
        """
        r = interface_reflectance(cos_i, eta=GLASS_INDEX)[None]
        kept = (1.0 - r) / (1.0 - ((GLASS_INDEX - 1.0) / (GLASS_INDEX + 1.0)) ** 2)
        air, glass, T = (
            np.reshape(x, (2, 1, 1)) for x in (self.air, self.glass, self.transmittance)
        )
        # Near Brewster's angle a film that reflects less than bare glass would fall below 0.
        R = np.maximum(1.0 - (1.0 - air) * kept, 0.0)
        R_back = np.maximum(1.0 - (1.0 - glass) * kept, 0.0)
        return Layer(R, R_back, np.minimum(T * kept, 1.0 - np.maximum(R, R_back)))


def metal(*, solar: float, visible: float) -> Reflection:
    """Continue a metal's reflectance by a complex index that meets it at normal incidence.

    One figure does not settle two parts of an index. The real part is taken as
    n = 1 + 2 (1 - R0), about that of aluminium where R0 is near 0.9 and of titanium where it is
    near 0.5; the imaginary part follows. The limits are those between half that n and n = 3.5,
    about that of chromium, as far as the figure allows: this project's own choice. Up to 60
    degrees they are close: metals are nearly flat there. They are taken for s and p apart, which
    widens them a little.

    Parameters
    ----------
    solar, visible : float
        Reflectance at normal incidence, in [0, 1). [1]

    Returns
    -------
    reflection : Reflection
        One lobe.
    """
    check_share(solar_reflectance=solar, visible_reflectance=visible)
    choices = [
        [_index_of(r0, n) for n in (_usual_n(r0), _usual_n(r0) / 2.0, 3.5)]
        for r0 in (solar, visible)
    ]

    def all_three(theta: Floats) -> Floats:  # (3, 2, 2, n)
        cos_i = cosine_of(theta)
        return np.stack(
            [[metal_reflectance(cos_i, n=n, k=k) for n, k in band] for band in choices], axis=1
        )

    def limits(theta: Floats) -> tuple[Floats, Floats]:
        R = all_three(theta)
        return R.min(axis=0, keepdims=True), R.max(axis=0, keepdims=True)

    return Reflection(lambda theta: all_three(theta)[:1], limits)


def _usual_n(r0: float) -> float:
    return 1.0 + 2.0 * (1.0 - r0)


def _index_of(r0: float, n: float) -> tuple[float, float]:
    """Index with r0 = ((n-1)² + k²) / ((n+1)² + k²), its real part as near n as can be."""
    if not r0 < 1.0:
        raise InputError(
            f"a metal reflects less than 1, got {r0!r}", hint="Use angular = 'constant'."
        )
    root = np.sqrt(r0)
    n = float(np.clip(n, (1.0 - root) / (1.0 + root), (1.0 + root) / (1.0 - root)))
    k2 = (r0 * (n + 1.0) ** 2 - (n - 1.0) ** 2) / (1.0 - r0)
    return n, float(np.sqrt(max(k2, 0.0)))


def complex_index(*, n: float, k: float) -> Reflection:
    """Take a metal of a given index, the same in both bands.

    Parameters
    ----------
    n, k : float
        Real and imaginary part, n > 0, k >= 0. [1]

    Returns
    -------
    reflection : Reflection
        One lobe; nothing is left open.
    """
    metal_reflectance(np.ones(1), n=n, k=k)  # checks the values

    def law(theta: Floats) -> Floats:
        R = metal_reflectance(cosine_of(theta), n=n, k=k)
        return _single([R, R])

    return Reflection(law)


def table(rows: Floats) -> Reflection:
    """Interpolate measured reflectances over angle, both polarisations alike.

    Parameters
    ----------
    rows : (r, 2) or (r, 3) float
        Angle in degrees, solar and visible reflectance (visible as solar if it is not given).
        The first angle may be up to 10 degrees, where spectrometers measure "normal" incidence.
        Between the rows the curve keeps their rise and fall; beyond the last one it runs to 1 at
        90 degrees.

    Returns
    -------
    reflection : Reflection
        One lobe; nothing is left open.

    Raises
    ------
    InputError
        If there are fewer than two rows, angles do not rise, or a value is out of range.

    References
    ----------
    F. N. Fritsch and J. Butland, SIAM J. Sci. Stat. Comput. 5 (1984) 300-304.
    """
    rows = np.asarray(rows, dtype=float)
    if rows.ndim != 2 or len(rows) < 2 or rows.shape[1] not in (2, 3):
        raise InputError("a table must have at least two rows of angle, solar[, visible]")
    angle, values = rows[:, 0], rows[:, [1, -1]]
    rises = bool((np.diff(angle) > 0.0).all())
    if not (rises and 0.0 <= angle[0] <= 10.0 and angle[-1] <= 90.0):
        raise InputError(
            "angles of a table must start at 0 to 10 degrees and rise to at most 90, "
            f"got {angle.tolist()}"
        )
    if not ((values >= 0.0) & (values <= 1.0)).all():
        raise InputError("reflectances of a table must be in [0, 1]")
    if angle[0] > 0.0:
        angle, values = np.r_[0.0, angle], np.vstack([values[0], values])
    if angle[-1] < 90.0:
        angle, values = np.r_[angle, 90.0], np.vstack([values, [1.0, 1.0]])
    return Reflection(through_points(np.radians(angle), values.T[None, :, None, :]))


def through_points(theta_rad: Floats, values: Floats) -> Law:
    """Make a law that runs through points, monotone between them.

    Parameters
    ----------
    theta_rad : (m,) float
        Angles of incidence from 0 to pi/2, rising. [rad]
    values : (lobes, 2, 1 or 2, m) float
        Reflectances; one polarisation stands for both. [1]

    Returns
    -------
    law : callable
        See :data:`causticload.optics.finish.Law`.
    """
    curve = PchipInterpolator(theta_rad, values, axis=-1)

    def law(theta: Floats) -> Floats:
        cosine_of(theta)  # checks the angles
        R = curve(theta).clip(0.0, 1.0)
        return np.ascontiguousarray(np.broadcast_to(R, (len(R), 2, 2, np.size(theta))))

    return law
