"""Results as people hold them: an instant and a year, in model coordinates and W/m²."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from causticload.hazard.findings import Episode, Finding, ObserverFinding, Season
from causticload.hazard.further import SurfaceHistory
from causticload.scene.model import Floats, Ints, Scene
from causticload.study.model import Study


@dataclass(frozen=True)
class InstantSun:
    """The sun of an instant."""

    azimuth: float  # degrees, clockwise from true north
    elevation: float  # degrees, apparent
    direction: Floats  # (3,) unit, model axes
    beam: float  # W/m², direct normal irradiance
    diffuse: float  # W/m², on a horizontal surface
    radius: float  # rad
    time: np.datetime64 | None = None  # UTC; None for a sun given by its angles


@dataclass
class ReceiverInstant:
    """The load on one receiver at one instant. ``n`` points."""

    name: str
    kind: str
    points: Floats  # (n, 3) m, model coordinates
    normals: Floats  # (n, 3) unit
    areas: Floats  # (n,) m²
    reflected: Floats  # (n,) W/m², mean over the point's cell
    images: Ints  # (n,) reflected images of the sun in view
    first: int  # number of the receiver's first point in the scene
    _direct: Any = None  # callable that gives (n,) W/m² when first asked
    _limits: Any = (1.0, 1.0)  # or callable that gives both factors when first asked

    @property
    def peak_limits(self) -> tuple[float, float]:
        """Least and largest load at the hottest point that unknown angular laws leave. [W/m²]"""
        if callable(self._limits):
            self._limits = self._limits()
        low, high = self._limits
        peak = float(self.reflected.max(initial=0.0))
        return low * peak, high * peak

    @property
    def direct(self) -> Floats:
        """Irradiance straight from the sun, (n,). [W/m²]"""
        if callable(self._direct):
            self._direct = self._direct()
        return np.asarray(self._direct)


@dataclass
class Instant:
    """One position of the sun."""

    study: Study
    scene: Scene
    sun: InstantSun
    receivers: dict[str, ReceiverInstant]
    ledger: dict[str, float]  # W
    tracer: str  # what traced the rays
    tubes: int
    rays: int
    seconds: float
    assumed: tuple[str, ...] = ()


@dataclass
class ReceiverYear:
    """What the year did to one receiver. ``n`` points."""

    name: str
    kind: str
    points: Floats  # (n, 3) m, model coordinates
    normals: Floats  # (n, 3) unit
    areas: Floats  # (n,) m²
    spacing: Floats  # (n,) m, size of the point's grid cell
    first: int  # number of the receiver's first point in the scene
    peak_reflected: Floats  # (n,) W/m²
    peak_time: NDArray[np.datetime64]  # (n,) UTC; NaT where no light ever fell
    energy: Floats  # (n,) J/m² in the year, by reflection
    images: Ints  # (n,) most images of the sun in view at once
    minutes_over: dict[str, Floats]  # criterion -> (n,) minutes in the year
    days_over: dict[str, Floats]  # criterion -> (n,) days on which the tolerated time is exceeded
    most_minutes: dict[str, Floats]  # criterion -> (n,) minutes on the worst day


@dataclass
class Year:
    """A whole year."""

    study: Study
    receivers: dict[str, ReceiverYear]
    episodes: list[Episode]  # worst first
    seasons: list[Season]  # worst first
    summary: dict[str, Any]  # what summary.json holds
    contribution: Floats  # (panels,) W/m² at the worst episode's peak
    findings: dict[int, Finding] = field(default_factory=dict)  # by number of the season
    histories: dict[int, SurfaceHistory] = field(default_factory=dict)  # by number of the season
    observers: list[ObserverFinding] = field(default_factory=list)
    scene: Scene | None = None  # None when read from a folder without its meshes
    days: list[dict[str, Any]] = field(default_factory=list)
    # one row per day and date: date, worst load per receiver by time, for charts

    def save(self, path: str | Path) -> Path:
        """Write the result folder.

        Parameters
        ----------
        path : str or Path
            Folder; made if it is not there.

        Returns
        -------
        path : Path
            The folder.
        """
        from causticload.output.folder import save_year

        return save_year(self, Path(path))
