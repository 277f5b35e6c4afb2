"""What a memo is made of: a flat list of blocks that every writer understands.

Texts may hold two kinds of marks, made by :func:`ref` and :func:`strong`: a reference to a
numbered block, and words in bold. The marks are characters of the private use area, so that no
text of a user can be taken for one.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

from matplotlib.figure import Figure

from causticload.output.memo import phrases

_REF, _END, _BOLD = "\ue000", "\ue001", "\ue002"
_MARK = re.compile(f"([{_REF}{_BOLD}])([^{_END}]*){_END}")
# What neither XML 1.0 nor a page can hold, but a text of a study file can.
_CONTROL = re.compile("[\x00-\x08\x0b-\x1f\x7f\ufffe\uffff]")

Align = Literal["left", "right"]


def ref(key: str) -> str:
    """Refer to a numbered block by its key.

    Parameters
    ----------
    key : str
        Key of a :class:`Heading`, :class:`Table` or :class:`Picture`.

    Returns
    -------
    mark : str
        To be put into a text.
    """
    return f"{_REF}{key}{_END}"


def strong(text: str) -> str:
    """Make words bold.

    Parameters
    ----------
    text : str
        Without marks.

    Returns
    -------
    mark : str
        To be put into a text.
    """
    return f"{_BOLD}{text}{_END}"


@dataclass(frozen=True)
class Span:
    """A run of text: plain, bold, or a reference that leads to a block."""

    text: str
    bold: bool = False
    target: str = ""


def spans(text: str, labels: Mapping[str, str]) -> Iterator[Span]:
    """Split a text at its marks.

    Parameters
    ----------
    text : str
        May hold marks.
    labels : mapping of str to str
        From :func:`number`.

    Yields
    ------
    span : Span
        In order; none is empty.
    """
    text = _CONTROL.sub("\ufffd", text)
    done = 0
    for found in _MARK.finditer(text):
        if found.start() > done:
            yield Span(text[done : found.start()])
        kind, inner = found.groups()
        yield Span(labels[inner], target=inner) if kind == _REF else Span(inner, bold=True)
        done = found.end()
    if done < len(text):
        yield Span(text[done:])


@dataclass(frozen=True)
class Heading:
    """Opens a section; level 1 or 2."""

    level: int
    text: str
    key: str
    roomy: bool = False  # what follows takes most of a page


@dataclass(frozen=True)
class Text:
    """A paragraph."""

    text: str


@dataclass(frozen=True)
class Note:
    """A paragraph that must not be overlooked, set apart from the rest."""

    text: str


@dataclass(frozen=True)
class Bullets:
    """A list."""

    items: tuple[str, ...]


@dataclass(frozen=True)
class Column:
    """A column of a table. ``share`` is its part of the width before all are scaled to fit."""

    title: str
    share: float = 1.0
    align: Align = "left"


@dataclass(frozen=True)
class Table:
    """A numbered table."""

    key: str
    caption: str
    columns: tuple[Column, ...]
    rows: tuple[tuple[str, ...], ...]


@dataclass(frozen=True)
class Picture:
    """A numbered figure, drawn when a writer asks for it. The size is that on paper."""

    key: str
    caption: str
    alt: str
    draw: Callable[[], Figure]


@dataclass(frozen=True)
class Listing:
    """Lines of a file, word for word."""

    text: str


Block = Heading | Text | Note | Bullets | Table | Picture | Listing


@dataclass(frozen=True)
class Memo:
    """A whole memo."""

    title: str
    subtitle: str
    facts: tuple[tuple[str, str], ...]  # rows of the title block
    summary: tuple[Block, ...]  # stands under the title block
    blocks: tuple[Block, ...]
    footer: str


def number(blocks: Sequence[Block]) -> dict[str, str]:
    """Number headings, figures and tables.

    Parameters
    ----------
    blocks : sequence of Block
        In their order on paper.

    Returns
    -------
    labels : dict of str to str
        Key of a block to what a reference to it reads, such as ``"Figure 3"``.
    """
    labels: dict[str, str] = {}
    section = part = figures = tables = 0
    for block in blocks:
        if isinstance(block, Heading):
            if block.level == 1:
                section, part = section + 1, 0
                labels[block.key] = phrases.SECTION.format(n=section)
            else:
                part += 1
                labels[block.key] = phrases.SECTION.format(n=f"{section}.{part}")
        elif isinstance(block, Picture):
            figures += 1
            labels[block.key] = phrases.FIGURE.format(n=figures)
        elif isinstance(block, Table):
            tables += 1
            labels[block.key] = phrases.TABLE.format(n=tables)
    return labels
