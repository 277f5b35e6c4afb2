"""Least-squares fit of a height field to scattered neighbours: normal, curvature, and how sure.

The height over the tangent plane is a polynomial of degree two, or three where the neighbours
carry it, through the vertex itself (an osculating *jet*). The estimate is of second (third) order
in the spacing of the neighbours.

References
----------
F. Cazals, M. Pouget, "Estimating differential quantities using polynomial fitting of osculating
jets", Computer Aided Geometric Design 22 (2005) 121-146.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, fields

import numpy as np

from causticload.scene.model import Bools, Floats
from causticload.scene.topology import Indices

CUBIC_FROM = 8  # neighbours needed for the four terms of degree three
_TERM_NEW = 0.04  # least share of a term that the terms before it leave over
_SLOPE_NEW = 1e-6  # the same for the slopes: neighbours on one line give no slope across it
_SPARE = 1  # neighbours beyond the terms without which a cubic is not believed
_FLATTEST = 1e-6  # least ratio of the neighbourhood's width to its length
_TURN_RAD = 0.15
_PASSES = 8  # the frame turns to the fitted normal between passes,
_STILL_RAD = 1e-5  # until it turns by less
_ROWS = 2_000_000  # neighbours fitted in one batch


@dataclass(frozen=True, kw_only=True)
class Jets:
    """Fits at ``n`` nodes."""

    normal: Floats  # (n, 3) unit, on the side of the starting normal
    tensor: Floats  # (n, 3, 3) 1/m, curvature as a form on vectors, > 0 where concave
    residual: Floats  # (n,) m, rms distance of the neighbours from the fit, per degree of freedom
    misfit: Floats  # (n,) m, the same for degree two
    share: Floats  # (n,) misfit over the rms height above the tangent plane
    slope_error: Floats  # (n,) rad, standard error that the residual leaves in the normal
    free: Floats  # (n,) neighbours beyond the terms fitted
    gain: Floats  # (n,) rad/m, error of the normal for 1 m rms of noise in the coordinates

    def take(self, rows: Indices | Bools) -> Jets:
        """Some of the fits.

        Parameters
        ----------
        rows : (m,) int or (n,) bool
            Which.

        Returns
        -------
        jets : Jets
            Those fits.
        """
        return Jets(**{f.name: getattr(self, f.name)[rows] for f in fields(self)})

    def join(self, more: Jets) -> Jets:
        """These fits, then others.

        Parameters
        ----------
        more : Jets
            The others.

        Returns
        -------
        jets : Jets
            All of them.
        """
        return Jets(
            **{
                f.name: np.concatenate([getattr(self, f.name), getattr(more, f.name)])
                for f in fields(self)
            }
        )

    def put(self, at: Indices, part: Jets) -> None:
        """Write the fits of some nodes into this record.

        Parameters
        ----------
        at : (m,) int
            Nodes.
        part : Jets
            Their fits.
        """
        for name in fields(self):
            getattr(self, name.name)[at] = getattr(part, name.name)


def empty_jets(n: int) -> Jets:
    """Room for some fits.

    Parameters
    ----------
    n : int
        How many.

    Returns
    -------
    jets : Jets
        All zero.
    """
    one = [np.zeros(n) for _ in range(6)]
    return Jets(
        normal=np.zeros((n, 3)),
        tensor=np.zeros((n, 3, 3)),
        residual=one[0],
        misfit=one[1],
        share=one[4],
        free=one[5],
        slope_error=one[2],
        gain=one[3],
    )


def batches(sizes: Indices) -> Iterator[tuple[Indices, int]]:
    """Gather rows of similar length, so that little is padded and memory stays bounded.

    Parameters
    ----------
    sizes : (n,) int
        Lengths.

    Yields
    ------
    rows : (m,) int
        Rows of one batch.
    width : int
        Longest of them.
    """
    order = np.argsort(sizes, kind="stable")
    ordered = sizes[order]
    start = 0
    while start < len(order):
        width = max(int(ordered[start] * 1.15) + 2, 4)
        limit = max(_ROWS // width, 1)
        stop = min(int(np.searchsorted(ordered, width, side="right")), start + limit)
        rows = order[start:stop]
        yield rows, int(ordered[stop - 1])
        start = stop


def tangent_frame(normal: Floats) -> tuple[Floats, Floats]:
    """Two unit vectors perpendicular to each normal and to each other.

    Parameters
    ----------
    normal : (n, 3) float
        Unit normals.

    Returns
    -------
    u, v : (n, 3) float
        Unit vectors, ``u`` x ``v`` = ``normal``.
    """
    # the axis furthest from the normal, so that the product is never short
    axis = np.eye(3)[np.argmin(np.abs(normal), axis=1)]
    u = np.cross(axis, normal)
    u /= np.linalg.norm(u, axis=1)[:, None]
    return u, np.cross(normal, u)


def fit_jets(
    offset: Floats, used: Bools, normal: Floats, *, noise_m: float, cubic: bool = True
) -> Jets:
    """Fit one jet at each node.

    Parameters
    ----------
    offset : (n, s, 3) float
        Neighbours relative to the node. [m]
    used : (n, s) bool
        Which of them count.
    normal : (n, 3) float
        Unit starting normals.
    noise_m : float
        Noise that the coordinates carry at least, > 0. [m]
    cubic : bool
        Use terms of degree three where there are :data:`CUBIC_FROM` neighbours and the normal
        becomes surer by them.

    Returns
    -------
    jets : Jets
        The fits. With fewer than two neighbours the starting normal stays.
    """
    last = _fit_in_frame(offset, used, normal, np.zeros((len(normal), 3, 3)), degree=2)
    moved = np.arange(len(normal))
    for _ in range(_PASSES):
        if len(moved) == 0:
            break
        before = last.take(moved)
        jets = _fit_in_frame(offset[moved], used[moved], before.normal, before.tensor, degree=2)
        last.put(moved, jets)
        moved = moved[np.abs(jets.normal - before.normal).max(axis=1) > _STILL_RAD]
    at = np.flatnonzero(cubic & (used.sum(axis=1) >= CUBIC_FROM))
    if len(at):
        third = _fit_in_frame(offset[at], used[at], last.normal[at], last.tensor[at], degree=3)
        third.misfit[:], third.share[:] = last.misfit[at], last.share[at]
        doubt = [j.gain * np.hypot(j.residual, noise_m) for j in (last.take(at), third)]
        better = doubt[1] < doubt[0]
        last.put(at[better], third.take(better))
    return last


def _fit_in_frame(
    offset: Floats, used: Bools, normal: Floats, tensor: Floats, *, degree: int
) -> Jets:
    """Fit over the plane across ``normal``; ``tensor`` is the curvature known so far."""
    frame = np.stack([*tangent_frame(normal), normal], axis=1)
    local = np.einsum("nsi,nai->nsa", offset, frame)
    tangents = frame[:, :2]
    known = tangents @ tensor @ _flip(tangents)
    axes = _bent_axes(_long_axes(local[..., :2], used), known)
    fit = _Fit(local[..., :2], _unrolled(local, known), used, axes, degree=degree)
    tilted = normal - np.einsum("na,nai->ni", fit.slope, tangents)
    return Jets(
        normal=tilted / np.linalg.norm(tilted, axis=1)[:, None],
        tensor=_flip(tangents) @ fit.hessian @ tangents,  # good where the slope has come to nothing
        residual=fit.residual,
        misfit=fit.residual.copy(),
        share=fit.residual / np.maximum(fit.relief, 1e-300),
        free=fit.free,
        slope_error=fit.residual * fit.gain,
        gain=fit.gain,
    )


def _unrolled(local: Floats, known: Floats) -> Floats:
    """Heights of a parabola with the curvature of the circle that the neighbours lie on. (n, s)

    A circle obeys z - κ z²/2 = κ x²/2, so that the left side, unlike z, is of degree two. With
    κ = x·H²x / x·Hx the same holds in every direction on a cylinder, on a sphere, and along the
    principal directions of any surface.
    """
    xy, z = local[..., :2], local[..., 2]
    turn = xy @ known
    bend = np.einsum("nsa,nsa->ns", turn, turn)
    along = np.einsum("nsa,nsa->ns", turn, xy)
    most = np.linalg.norm(known, axis=(1, 2))[:, None]  # x·Hx may vanish; κ then has no meaning
    curvature = np.clip(bend / np.where(along == 0.0, 1.0, along), -most, most)
    return z - 0.5 * curvature * z * z


def _flip(a: Floats) -> Floats:
    """Transpose of each matrix."""
    return a.swapaxes(1, 2)


class _Fit:
    """Weighted least squares for one pass, in axes that suit the neighbours.

    Terms are taken in order of degree. One that the neighbours cannot tell from those before it
    is left out: a bay with vertices at head and foot only says nothing on its middle, and must
    not borrow curvature from its slope.
    """

    def __init__(self, xy: Floats, z: Floats, used: Bools, axes: Floats, *, degree: int) -> None:
        n = len(z)
        count = used.sum(axis=1)
        t = np.einsum("nab,nsb->nsa", axes, np.where(used[..., None], xy, 0.0))
        size = np.sqrt(np.einsum("nsa,ns->na", t * t, used) / np.maximum(count, 1)[:, None])
        size = np.maximum(size, np.maximum(_FLATTEST * size.max(axis=1), 1e-300)[:, None])
        white = axes / size[..., None]
        t = t / size[:, None]
        root = np.sqrt(used / (0.5 + np.einsum("nsa,nsa->ns", t, t)))

        a = _design(t, degree)
        q, r, kept = _orthogonal(a * root[:, None])
        zw = z * root
        c = np.einsum("njs,ns->nj", q, zw)
        miss = zw - np.einsum("njs,nj->ns", q, c)
        c = np.linalg.solve(r, c[..., None])[..., 0]

        self.slope = np.einsum("na,nab->nb", c[:, :2], white)
        h = np.stack([2 * c[:, 2], c[:, 3], c[:, 3], 2 * c[:, 4]], axis=1).reshape(n, 2, 2)
        self.hessian = white.swapaxes(1, 2) @ h @ white
        free = count - kept.sum(axis=1)
        total = np.maximum((root * root).sum(axis=1), 1e-300)
        self.residual = np.sqrt((miss * miss).sum(axis=1) / total * count / np.maximum(free, 0.1))
        self.free = free
        if degree == 3:
            self.residual[free < _SPARE] = np.inf
        height = zw - np.einsum("nas,na->ns", a[:, :2] * root[:, None], c[:, :2])
        self.relief = np.sqrt((height * height).sum(axis=1) / total)
        # slope = rows . z: noise of each neighbour, and of the node itself, which shifts them all
        back = np.linalg.inv(r)[:, :2]
        rows = np.einsum("nba,nbj,njs->nsa", white, back, q) * root[..., None]
        own = rows.sum(axis=1)
        self.gain = np.sqrt((rows * rows).sum(axis=(1, 2)) + (own * own).sum(axis=1))


def _orthogonal(a: Floats) -> tuple[Floats, Floats, Bools]:
    """Gram-Schmidt, twice, over the terms (n, j, s), dropping those that bring nothing new.

    Gives orthonormal rows, the triangle R with a unit diagonal where a term is dropped, and
    which terms are kept.
    """
    n, terms, _ = a.shape
    q = np.zeros_like(a)
    r = np.zeros((n, terms, terms))
    kept = np.zeros((n, terms), bool)
    for j in range(terms):
        rest = a[:, j].copy()
        before = np.linalg.norm(rest, axis=1)
        for _ in range(2 if j else 0):
            share = np.einsum("nis,ns->ni", q[:, :j], rest)
            rest -= np.einsum("nis,ni->ns", q[:, :j], share)
            r[:, :j, j] += share
        length = np.linalg.norm(rest, axis=1)
        kept[:, j] = length > np.maximum((_SLOPE_NEW if j < 2 else _TERM_NEW) * before, 1e-300)
        q[:, j] = np.where(kept[:, j, None], rest / np.maximum(length, 1e-300)[:, None], 0.0)
        r[:, j, j] = np.where(kept[:, j], length, 1.0)
    return q, r, kept


def _long_axes(xy: Floats, used: Bools) -> Floats:
    """Axes across and along the neighbourhood. (n, 2, 2), rows"""
    count = np.maximum(used.sum(axis=1), 1)[:, None]
    off = np.where(
        used[..., None],
        xy - (xy * used[..., None]).sum(axis=1, keepdims=True) / count[..., None],
        0.0,
    )
    return np.linalg.eigh(np.einsum("nsa,nsb->nab", off, off))[1].swapaxes(1, 2)


def _bent_axes(axes: Floats, hessian: Floats) -> Floats:
    """Turn the axes into those of the curvature where these are close. (n, 2, 2)

    Of all surfaces that pass through two rows of vertices this picks the one that is straight
    between them, and not one that is straight along a line some degrees off.
    """
    bent = np.linalg.eigh(hessian)[1].swapaxes(1, 2)
    cosine = np.einsum("nb,nab->na", axes[:, 0], bent)
    best = np.argmax(np.abs(cosine), axis=1)
    row = np.arange(len(best))
    x = bent[row, best] * np.sign(cosine[row, best])[:, None]
    turned = np.stack([x, np.stack([-x[:, 1], x[:, 0]], axis=1)], axis=1)
    close = np.abs(cosine[row, best]) > np.cos(_TURN_RAD)
    return np.where(close[:, None, None], turned, axes)


def _design(t: Floats, degree: int) -> Floats:
    """Monomials x, y, x², xy, y² [, x³, x²y, xy², y³]. (n, terms, s)"""
    x, y = t[..., 0], t[..., 1]
    quadratic = [x, y, x * x, x * y, y * y]
    cubic = [x**3, x * x * y, x * y * y, y**3] if degree == 3 else []
    return np.stack(quadratic + cubic, axis=1)
