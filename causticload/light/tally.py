"""What a day adds up to, and how days are put together.

``light`` knows no limit of skin or eye: whatever is to be kept of a day beyond loads is kept by
*accumulators* that the caller hands in. Tallies merge in any order, so the same code serves a
loop, threads, a cluster, and a run that goes on from the days already on disk.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, Protocol

import numpy as np
from numba import njit

from causticload.light.field import Field
from causticload.light.prepare import LitScene
from causticload.scene.model import Bools, Floats, Ints


class StepLight:
    """The light of one step of a day: shared by the two dates with this geometry.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.
    field : Field
        Where reflected light lands, for a beam of 1 W/m².
    sun_direction : (3,) float
        Unit vector to the sun, scene frame.
    """

    def __init__(self, lit: LitScene, field: Field, sun_direction: Floats) -> None:
        self.lit, self.field, self.sun_direction = lit, field, sun_direction
        self._direct: Floats | None = None
        self._asked: Bools | None = None

    def direct_factor(self, index: Ints) -> Floats:
        """Return direct irradiance over direct normal irradiance at points.

        Parameters
        ----------
        index : (q,) int
            Numbers of the points.

        Returns
        -------
        factor : (q,) float
            Cosine of incidence where the point sees the sun, else 0. [1]
        """
        if self._direct is None or self._asked is None:
            self._direct = np.zeros(len(self.lit.point_areas))
            self._asked = np.zeros(len(self._direct), bool)
        ask = index[~self._asked[index]]
        if len(ask):
            self._direct[ask] = direct_factor(self.lit, self.sun_direction, ask)
            self._asked[ask] = True
        return self._direct[index]


def direct_factor(lit: LitScene, sun_direction: Floats, index: Ints) -> Floats:
    """Direct irradiance over direct normal irradiance at receiver points.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.
    sun_direction : (3,) float
        Unit vector to the sun, scene frame.
    index : (q,) int
        Numbers of the points.

    Returns
    -------
    factor : (q,) float
        Cosine of incidence where the point sees the middle of the sun, else 0. [1]
    """
    n = lit.point_normals[index]
    cos = np.maximum(0.0, n @ sun_direction)
    up = np.flatnonzero(cos > 0.0)
    start = lit.points[index[up]] + lit.clearance_m * n[up]
    to_sun = np.ascontiguousarray(np.broadcast_to(sun_direction, (len(up), 3)))
    cos[up[lit.tracer.occluded(start, to_sun)]] = 0.0
    return cos


class Moment:
    """One step on one date, as accumulators see it.

    Parameters
    ----------
    light : StepLight
        The light of the step.
    time : datetime64
        UTC.
    beam, diffuse : float
        Direct normal and diffuse horizontal irradiance. [W/m²]
    temperature_c : float
        Air temperature. [°C]
    wind_ms : float
        Wind speed. [m/s]
    minutes : float
        Length of the step. [min]
    """

    def __init__(
        self,
        light: StepLight,
        *,
        time: np.datetime64,
        beam: float,
        diffuse: float,
        temperature_c: float,
        wind_ms: float,
        minutes: float,
    ) -> None:
        self.light, self.time = light, time
        self.beam, self.diffuse = beam, diffuse
        self.temperature_c, self.wind_ms, self.minutes = temperature_c, wind_ms, minutes

    def reflected(self, index: Ints) -> Floats:
        """Return the reflected irradiance at points, (q,). [W/m²]"""
        return self.light.field.load[index] * self.beam

    def diffuse_at(self, index: Ints) -> Floats:
        """Return the diffuse irradiance at points under an even sky, (q,). [W/m²]"""
        return diffuse_on(
            self.light.lit.point_normals[index, 2],
            beam=self.beam,
            diffuse=self.diffuse,
            sun_up=float(self.light.sun_direction[2]),
        )

    def total(self, index: Ints) -> Floats:
        """Return reflected, direct and diffuse irradiance together at points, (q,). [W/m²]"""
        direct = self.beam * self.light.direct_factor(index)
        return self.reflected(index) + direct + self.diffuse_at(index)

    def points_over(self, limit: float, *, total: bool) -> tuple[Ints, Floats]:
        """Return the points whose irradiance is over a limit, and how much it is.

        A point counts only where reflected light adds at least ``LEAST_REFLECTED``: what the
        plain sun does to a pavement is nobody's facade.

        Parameters
        ----------
        limit : float
            The limit. [W/m²]
        total : bool
            Whether direct and diffuse light count too.

        Returns
        -------
        index : (q,) int
            Numbers of the points.
        value : (q,) float
            Their irradiance. [W/m²]
        """
        if self.beam <= 0.0:
            return np.zeros(0, np.int64), np.zeros(0)
        most_else = 1.1 * (self.beam + self.diffuse) if total else 0.0
        floor = max(limit - most_else, LEAST_REFLECTED)
        index = np.flatnonzero(self.light.field.load * self.beam >= floor)
        value = self.total(index) if total else self.reflected(index)
        over = value > limit
        return index[over], value[over]


# Albedo of the ground for what it sends up to walls: the usual default (common practice).
GROUND_REFLECTANCE = 0.2
LEAST_REFLECTED = 50.0  # W/m²


def diffuse_on(up: Floats, *, beam: float, diffuse: float, sun_up: float) -> Floats:
    """Diffuse irradiance of surfaces under an even sky over a level ground.

    Parameters
    ----------
    up : (q,) float
        Upward component of the surfaces' unit normals. [1]
    beam, diffuse : float
        Direct normal and diffuse horizontal irradiance. [W/m²]
    sun_up : float
        Upward component of the unit vector to the sun. [1]

    Returns
    -------
    irradiance : (q,) float
        From the sky and from the ground. [W/m²]
    """
    ground = GROUND_REFLECTANCE * (diffuse + beam * max(0.0, sun_up))
    return diffuse * 0.5 * (1.0 + up) + ground * 0.5 * (1.0 - up)


class Accumulator(Protocol):
    """Keeps something of a day."""

    name: str

    def add(self, moment: Moment, *, date: int) -> None:
        """Take in one step of the day's date number ``date``."""

    def result(self) -> dict[str, Any]:
        """Return what was kept, as arrays and plain records."""


@njit(cache=True, nogil=True, error_model="numpy")
def _add_load(load, beam, time, joules, peak, peak_time, energy):
    for i in range(load.size):
        if load[i] > 0.0:
            E = load[i] * beam
            energy[i] += E * joules
            if peak[i] < E:
                peak[i] = E
                peak_time[i] = time


class LoadTally:
    """Peak, its time, energy and most images at every receiver point.

    Parameters
    ----------
    n : int
        Number of points.
    weights : tuple of float
        Calendar days that each date of the day stands for.
    """

    name = "load"

    def __init__(self, n: int, weights: tuple[float, ...]) -> None:
        self.weights = weights
        self.peak = np.zeros(n)
        self.peak_time = np.full(n, NO_TIME, np.int64)
        self.energy = np.zeros(n)
        self.images = np.zeros(n, np.int32)

    def add(self, moment: Moment, *, date: int) -> None:
        """Take in one step."""
        field = moment.light.field
        if moment.beam <= 0.0:
            return
        _add_load(
            field.load,
            moment.beam,
            moment.time.astype("datetime64[s]").astype(np.int64),
            60.0 * moment.minutes * self.weights[date],
            self.peak,
            self.peak_time,
            self.energy,
        )
        np.maximum(self.images, field.images, out=self.images)

    def result(self) -> dict[str, Any]:
        """Return the arrays."""
        return {
            "peak": self.peak.astype(np.float32),
            "peak_time": self.peak_time,
            "energy": self.energy.astype(np.float32),
            "images": self.images,
        }


NO_TIME = np.iinfo(np.int64).min


def merge_loads(parts: list[Mapping[str, Any]]) -> dict[str, Any]:
    """Put the load tallies of several days together, in any order.

    Parameters
    ----------
    parts : list of mapping
        Results of :class:`LoadTally`; at least one.

    Returns
    -------
    total : dict
        The same keys: largest peak with its time (the earlier of equals), sum of energy, most
        images.
    """
    peak = np.array(parts[0]["peak"])
    time = np.array(parts[0]["peak_time"])
    energy = np.array(parts[0]["energy"], dtype=np.float64)
    images = np.array(parts[0]["images"])
    for part in parts[1:]:
        higher = (part["peak"] > peak) | (
            (part["peak"] == peak) & (part["peak_time"] < time) & (part["peak"] > 0)
        )
        peak[higher], time[higher] = part["peak"][higher], part["peak_time"][higher]
        energy += part["energy"]
        np.maximum(images, part["images"], out=images)
    return {"peak": peak, "peak_time": time, "energy": energy, "images": images}
