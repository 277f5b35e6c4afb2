"""Finds where, when and how strongly a curved glazed or polished facade concentrates sunlight.

The calls of this package are read in when they are first asked for: starting a command line must
not wait for a compiler.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

from causticload.version import __version__

if TYPE_CHECKING:
    from causticload.errors import (
        CausticloadError,
        InputError,
        MeshError,
        ResultError,
        StudyError,
        WeatherError,
    )
    from causticload.optics import reflectance
    from causticload.output.folder import read_year
    from causticload.run import count_rays, inspect, open_project, solve_instant, solve_year
    from causticload.sky.position import sun_position
    from causticload.study import read_study, write_study

_HOMES = {
    "CausticloadError": "errors",
    "InputError": "errors",
    "MeshError": "errors",
    "ResultError": "errors",
    "StudyError": "errors",
    "WeatherError": "errors",
    "count_rays": "run",
    "inspect": "run",
    "open_project": "run",
    "read_study": "study",
    "read_year": "output.folder",
    "reflectance": "optics",
    "solve_instant": "run",
    "solve_year": "run",
    "sun_position": "sky.position",
    "write_study": "study",
}

__all__ = [
    "CausticloadError",
    "InputError",
    "MeshError",
    "ResultError",
    "StudyError",
    "WeatherError",
    "__version__",
    "count_rays",
    "inspect",
    "open_project",
    "read_study",
    "read_year",
    "reflectance",
    "solve_instant",
    "solve_year",
    "sun_position",
    "write_study",
]


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(f"module 'causticload' has no attribute {name!r}")
    value = getattr(import_module(f"causticload.{_HOMES[name]}"), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return __all__
