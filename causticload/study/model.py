"""What a study says, as plain frozen records.

Units here are those of the study file (metres, degrees, W/m², mm and mrad where the name says
so); :mod:`causticload.scene`, :mod:`causticload.sky` and :mod:`causticload.optics` convert to SI
and radians where they read them.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path
from typing import Literal

Role = Literal["reflector", "receiver", "obstruction", "ignore"]
Form = Literal["smooth", "flat"]
Unit = Literal["m", "cm", "mm", "ft", "in"]
UpAxis = Literal["Z", "Y"]
AngularLaw = Literal["clear glass", "coated glass", "metal", "constant", "table"]


@dataclass(frozen=True, kw_only=True)
class Site:
    """Where the model stands. Degrees, metres; north, east and up positive."""

    latitude: float
    longitude: float
    elevation: float = 0.0
    timezone: str = "UTC"
    model_north: float = 0.0  # bearing of the model's +Y axis, clockwise from true north


@dataclass(frozen=True, kw_only=True)
class Model:
    """Mesh files and how to read them."""

    files: tuple[Path, ...]  # absolute
    unit: Unit = "m"
    up: UpAxis = "Z"


@dataclass(frozen=True, kw_only=True)
class SurfaceRule:
    """What the surfaces are whose name fits ``match``. The first rule that fits wins."""

    match: str  # glob, compared without regard to case
    roles: tuple[Role, ...]
    form: Form = "flat"
    finish: str | None = None
    figure: str | None = None
    spacing: float | None = None  # m; None: chosen from the size of the sun's image
    kind: str | None = None  # walkway, roadway, facade, roof, planting, ...
    material: str | None = None  # of a receiver; None: the usual one of its kind


@dataclass(frozen=True, kw_only=True)
class FinishSpec:
    """An own finish of the study file. Fields not given stay None."""

    name: str
    solar_reflectance: float | None = None  # normal incidence, outdoor side, [0, 1]
    visible_reflectance: float | None = None
    angular: AngularLaw | None = None
    slope_error_mrad: float = 0.0
    table: tuple[tuple[float, ...], ...] | None = None  # rows: angle (deg), solar[, visible]
    extra: dict[str, object] = field(default_factory=dict)  # keys that optics checks


@dataclass(frozen=True, kw_only=True)
class FigureSpec:
    """A surface figure: how far a pane is from flat. Keys are checked when read."""

    name: str
    settings: dict[str, object]


@dataclass(frozen=True, kw_only=True)
class SkySpec:
    """What shines."""

    source: Literal["clear", "weather"] = "clear"
    file: Path | None = None  # absolute; with source = "weather"
    disc: Literal["limb-darkened", "uniform"] = "limb-darkened"
    turbidity: float | None = None  # Linke turbidity; None: monthly table


@dataclass(frozen=True, kw_only=True)
class YearSpec:
    """How the year is sampled."""

    year: int = 2025
    step_minutes: int = 5
    day_stride: int = 4


@dataclass(frozen=True, kw_only=True)
class ObserverSpec:
    """Eyes: a point or a path, in model coordinates after unit and up axis."""

    name: str
    path: tuple[tuple[float, float, float], ...]
    look: Literal["along"] | tuple[float, float, float] = "along"
    age: float = 50.0  # years, for the veil in the eye
    spacing: float = 2.0  # m between eye points along the path


@dataclass(frozen=True, kw_only=True)
class CriterionSpec:
    """An own limit."""

    name: str
    applies_to: tuple[str, ...]  # globs over receiver names
    quantity: str  # "total irradiance" | "reflected irradiance" | ...
    limit: float
    minutes: float = 0.0  # tolerated time per day above the limit


@dataclass(frozen=True, kw_only=True)
class Study:
    """A whole study, read and checked."""

    title: str
    path: Path | None  # the study file, absolute; None if made in Python
    site: Site
    model: Model
    surfaces: tuple[SurfaceRule, ...] = ()  # empty: the defaults are used, and said
    finishes: dict[str, FinishSpec] = field(default_factory=dict)
    figures: dict[str, FigureSpec] = field(default_factory=dict)
    sky: SkySpec = SkySpec()
    year: YearSpec = YearSpec()
    observers: tuple[ObserverSpec, ...] = ()
    criteria: tuple[CriterionSpec, ...] = ()
