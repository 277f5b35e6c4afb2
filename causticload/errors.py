"""The one family of errors.

::

    CausticloadError
    ├── InputError      an argument of a Python call is out of its range
    ├── StudyError      the study file is wrong
    ├── MeshError       a mesh file cannot be read or used
    ├── WeatherError    a weather file cannot be read or used
    ├── ResultError     a result folder is missing, partial, locked or of another version
    └── HostError       a host program sent a request that does not follow the protocol

Each says where it happened, which rule was broken and by which value, and what to do. The
command line prints them as one paragraph and leaves with exit code 2; anything else that is
raised is a fault of the program (exit code 1).
"""

from __future__ import annotations

__all__ = [
    "CausticloadError",
    "HostError",
    "InputError",
    "MeshError",
    "ResultError",
    "StudyError",
    "WeatherError",
]


class CausticloadError(Exception):
    """Base of every error that a user can put right.

    Parameters
    ----------
    message : str
        What rule was broken and by which value.
    where : str
        Place, such as ``kestrel.toml, line 12: surface[3].spacing``. Empty if there is none.
    hint : str
        What to do about it. Empty if the message says it all.
    """

    def __init__(self, message: str, *, where: str = "", hint: str = "") -> None:
        self.message = message
        self.where = where
        self.hint = hint
        super().__init__(message)

    def __str__(self) -> str:
        place = f"{self.where}: " if self.where else ""
        cure = f" {self.hint}" if self.hint else ""
        return f"{place}{self.message}{cure}"


class InputError(CausticloadError, ValueError):
    """An argument of a Python call is out of its range."""


class StudyError(CausticloadError):
    """The study file is wrong."""


class MeshError(CausticloadError):
    """A mesh file cannot be read or used."""


class WeatherError(CausticloadError):
    """A weather file cannot be read or used."""


class ResultError(CausticloadError):
    """A result folder is missing, partial, locked or of another version."""


class HostError(CausticloadError):
    """A host program sent a request that does not follow the protocol."""
