"""On which line of a TOML text each key stands: the library's parser does not say."""

from __future__ import annotations

import re
import tomllib

_HEADER = re.compile(r"^\s*(\[\[?)\s*(.+?)\s*\]\]?\s*(#.*)?$")
_KEY = re.compile(
    r"""^\s*((?:[\w-]+|"[^"]*"|'[^']*')(?:\s*\.\s*(?:[\w-]+|"[^"]*"|'[^']*'))*)\s*="""
)
_PART = re.compile(r"""[\w-]+|"[^"]*"|'[^']*'""")

Path = tuple[str | int, ...]


def index_lines(text: str) -> dict[Path, int]:
    """Find the lines of tables and keys.

    Parameters
    ----------
    text : str
        A valid TOML document.

    Returns
    -------
    lines : dict of path to int
        Path of keys and list indices, such as ``("surface", 2, "match")``, to its line from 1.
    """
    lines: dict[Path, int] = {}
    counts: dict[Path, int] = {}
    here: Path = ()
    pending = ""
    for number, line in enumerate(text.splitlines(), start=1):
        if pending:  # within a value of several lines
            pending += "\n" + line
            pending = "" if _is_whole(pending) else pending
            continue
        header = _HEADER.match(line)
        if header:
            here = tuple(p.strip("\"'") for p in _PART.findall(header[2]))
            if header[1] == "[[":
                counts[here] = counts.get(here, -1) + 1
                here = (*here, counts[here])
            lines[here] = number
            continue
        key = _KEY.match(line)
        if key:
            path = (*here, *(p.strip("\"'") for p in _PART.findall(key[1])))
            for k in range(len(here) + 1, len(path) + 1):
                lines.setdefault(path[:k], number)
            statement = line[key.start(1) :]
            pending = "" if _is_whole(statement) else statement
    return lines


def _is_whole(statement: str) -> bool:
    """Whether a key and its value are complete."""
    try:
        tomllib.loads(statement)
    except tomllib.TOMLDecodeError:
        return False
    return True
