"""Figures of a memo as files: drawn once, written in the formats that writers ask for."""

from __future__ import annotations

from pathlib import Path

import matplotlib as mpl

from causticload.output.files import write_whole
from causticload.output.memo.blocks import Picture
from causticload.output.memo.figures.style import PAPER_RC, Format, freeze, to_bytes


class Drawings:
    """Draws pictures when they are first asked for and keeps what it wrote.

    Parameters
    ----------
    folder : Path
        Where a copy of each file goes.
    """

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self._figures: dict[str, mpl.figure.Figure] = {}
        self._data: dict[tuple[str, Format], bytes] = {}

    def data(self, picture: Picture, kind: Format) -> bytes:
        """Give a picture's file.

        Parameters
        ----------
        picture : Picture
            The picture.
        kind : {"svg", "pdf", "png"}
            Format.

        Returns
        -------
        data : bytes
            What the file holds.
        """
        key = (picture.key, kind)
        if key not in self._data:
            data = to_bytes(self._figure(picture), kind)
            self._data[key] = data
            path = self.folder / f"{picture.key.removeprefix('fig-')}.{kind}"
            write_whole(path, lambda p: p.write_bytes(data))
        return self._data[key]

    def aspect(self, picture: Picture) -> float:
        """Give a picture's height over its width.

        Parameters
        ----------
        picture : Picture
            The picture.

        Returns
        -------
        aspect : float
            > 0.
        """
        width, height = self._figure(picture).get_size_inches()
        return float(height / width)

    def _figure(self, picture: Picture) -> mpl.figure.Figure:
        if picture.key not in self._figures:
            with mpl.rc_context(PAPER_RC):
                self._figures[picture.key] = freeze(picture.draw())
        return self._figures[picture.key]
