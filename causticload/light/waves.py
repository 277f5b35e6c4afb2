"""Roller waves: followed one by one, or taken as their mean over phases, and what that leaves out.

A pane's wave has a phase that nobody knows. The mean load over all phases is what a surface gives
whose slope, anywhere, is that of a wave at a random place; it costs little. One pane by itself
does not show that mean but ripples about it, so that waves are followed where that is cheap, and
always by peaks looked at closely and by the ray count.
"""

from __future__ import annotations

import numpy as np
from scipy.special import j1

from causticload.light.sheets import SUN_RADIUS, panes_of
from causticload.scene.model import Bools, Floats, Scene

# Waves are followed everywhere up to about this many tubes more: some seconds a position of the sun
FOLLOW_TUBES = 12_000
_DISTANCES_M = (20.0, 50.0)  # at which the ripple is stated


def ripple(distance_m: Floats, *, peak_to_valley_m: float, pitch_m: float) -> Floats:
    """Amplitude of the load's ripple behind one pane with a shallow wave, over its mean.

    The Laplacian law at right incidence, E / E0 = 1 + 2 D lap h, for a wave whose image the sun's
    even disc of radius D a blurs: the first order in the wave's depth. A darkened disc blurs a
    little less.

    Parameters
    ----------
    distance_m : (n,) float
        From the pane, > 0. [m]
    peak_to_valley_m, pitch_m : float
        The wave. [m]

    Returns
    -------
    amplitude : (n,) float
        Divide by sqrt(2) for the rms, and by sqrt(N) where N panes overlap. [1]
    """
    D = np.asarray(distance_m, dtype=np.float64)
    x = 2.0 * np.pi * D * SUN_RADIUS / pitch_m
    left = 2.0 * j1(x) / x
    return np.asarray(D * 4.0 * np.pi**2 * peak_to_valley_m / pitch_m**2 * np.abs(left))


def choose_waves(scene: Scene) -> Bools:
    """Choose the surfaces whose roller waves are followed one by one.

    Parameters
    ----------
    scene : Scene
        What stands there.

    Returns
    -------
    follow : (s,) bool
        True too where there is no wave.
    """
    follow = np.ones(len(scene.surfaces), bool)
    g = scene.figures
    if g is None or not g.wave.any():
        return follow
    auto, tubes = [], 0.0
    for i in range(len(follow)):
        rows = panes_of(g, scene, i)
        if not len(rows) or g.wave[rows[0]] == 0.0:
            continue
        told = g.follow[rows[0]]
        if told >= 0:
            follow[i] = bool(told)
            continue
        auto.append(i)
        # A pane's waves, eight strips to each; a strip in each half of the pane is two triangles.
        waves = np.abs(g.wave_number[rows]) / (2.0 * np.pi) * 2.0 * g.half[g.panel[rows]]
        tubes += 32.0 * float(waves.sum())
    follow[auto] = tubes <= FOLLOW_TUBES
    return follow


def say_mean_waves(scene: Scene, follow: Bools) -> tuple[str, ...]:
    """Say what the mean over phases leaves out.

    Parameters
    ----------
    scene : Scene
        What stands there.
    follow : (s,) bool
        Surfaces whose waves are followed.

    Returns
    -------
    said : tuple of str
        A sentence for each figure.
    """
    g = scene.figures
    said: dict[str, None] = {}
    for i in np.flatnonzero(~follow):
        row = panes_of(g, scene, int(i))[0]
        if g is None:  # only surfaces with figures are not followed
            continue
        depth, number = 2.0 * g.wave[row], float(np.linalg.norm(g.wave_number[row]))
        rms = ripple(
            np.array(_DISTANCES_M), peak_to_valley_m=depth, pitch_m=2.0 * np.pi / number
        ) / np.sqrt(2.0)
        shown = " and ".join(
            f"{100 * r:.0f} % at {d:g} m" for r, d in zip(rms, _DISTANCES_M, strict=True)
        )
        said[
            f"Figure {scene.surfaces[i].figure!r}: grids show the mean over the unknown phases of "
            f"its roller waves; the load behind a single pane strays from it by up to {shown} rms, "
            "by less where panes overlap (over the root of their number). Peaks looked at closely "
            "and ray counts follow every wave."
        ] = None
    return tuple(said)
