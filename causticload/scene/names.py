"""What the names in a mesh file say: words, globs, and names that are told apart."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Sequence
from fnmatch import fnmatchcase

from causticload.scene.read import Part

GLASS = re.compile(r"(?<!fibre)(?<!fiber)(glass|glaz)(?!fib)")
METAL = re.compile(r"mirror|\bmetal|\bpolished|\bstainless")
OPENING = re.compile(r"\bwindow|\bcurtain ?wall")
NOT_A_PANE = re.compile(r"\b(frame|sill|mullion|transom|blind|shutter)")
GROUND = re.compile(r"\b(ground|plaza|street|pavement|road|terrain)s?\b")
ROAD = re.compile(r"\b(street|road)s?\b")


def words(name: str) -> str:
    """Lower-case words of a name, parted by single spaces.

    Parameters
    ----------
    name : str
        Name as in the file, such as ``CurtainWall_EastFace.001``.

    Returns
    -------
    words : str
        Such as ``curtain wall east face``.
    """
    parted = re.sub(r"(?<=[a-z])(?=[A-Z])", " ", name)
    return " ".join(re.findall(r"[^\W\d_]+", parted)).lower()


def substance(part: Part) -> str:
    """Tell from its names what a part without a rule reflects like.

    Parameters
    ----------
    part : Part
        The part.

    Returns
    -------
    substance : str
        ``glass``, ``metal``, or an empty string for neither.
    """
    texts = [words(name) for name in part.names]
    if any(NOT_A_PANE.search(text) for text in texts):
        return ""
    if any(METAL.search(text) for text in texts) and not any(GLASS.search(t) for t in texts):
        return "metal"
    if any(GLASS.search(text) or OPENING.search(text) for text in texts):
        return "glass"
    return ""


def ground_kind(part: Part) -> str:
    """Tell from its names what kind of ground a part without a rule is.

    Parameters
    ----------
    part : Part
        The part.

    Returns
    -------
    kind : str
        ``roadway``, ``walkway``, or an empty string if it is no ground.
    """
    texts = [words(name) for name in part.names]
    if not any(GROUND.search(text) for text in texts):
        return ""
    return "roadway" if any(ROAD.search(text) for text in texts) else "walkway"


def matching_name(glob: str, part: Part) -> str | None:
    """Find the name of a part that a glob fits, without regard to case.

    Parameters
    ----------
    glob : str
        Pattern of shell wildcards.
    part : Part
        The part.

    Returns
    -------
    name : str or None
        The first that fits, of object, group, layer and material.
    """
    pattern = glob.casefold()
    return next((name for name in part.names if fnmatchcase(name.casefold(), pattern)), None)


def told_apart(names: Sequence[str], parts: Sequence[Part]) -> list[str]:
    """Make names unique by adding the other names of their parts, or numbers at the last.

    Parameters
    ----------
    names : sequence of str
        Wished names, one per part.
    parts : sequence of Part
        The parts.

    Returns
    -------
    unique : list of str
        Same length and order.
    """
    unique = list(names)
    for other in ("object_name", "group", "material", "file"):
        count = Counter(unique)
        unique = [
            f"{name} ({extra})"
            if count[name] > 1 and (extra := getattr(part, other)) and extra not in name
            else name
            for name, part in zip(unique, parts, strict=True)
        ]
    taken = set(unique)
    seen: Counter[str] = Counter()
    for i, name in enumerate(unique):
        seen[name] += 1
        if seen[name] > 1:
            number = seen[name]
            while f"{name} {number}" in taken:
                number += 1
            unique[i] = f"{name} {number}"
            taken.add(unique[i])
    return unique
