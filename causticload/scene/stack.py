"""Triangles of all parts in one set of arrays."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from causticload.scene.model import Bools, Floats, Ints
from causticload.scene.read import Part
from causticload.scene.roles import Roles


@dataclass(frozen=True, kw_only=True)
class Stack:
    """Triangles of all parts that are not ignored, one below the other."""

    triangles: Floats  # (m, 3, 3) m
    surface: Ints  # (m,)
    source: Ints  # (m,) row within the part
    file_normals: Floats  # (m, 3, 3) unit; nan where the file has none
    rule: Ints  # (m,) number of the rule; -1: none

    def rows(self, number: int) -> NDArray[np.int64]:
        """Rows of one surface; surfaces stand one below the other.

        Parameters
        ----------
        number : int
            Number of the surface.

        Returns
        -------
        rows : (k,) int
            Numbers of its triangles.
        """
        first, last = np.searchsorted(self.surface, [number, number + 1])
        return np.arange(first, last)

    def take(self, rows: Bools) -> Stack:
        """Some of the triangles.

        Parameters
        ----------
        rows : (m,) bool
            Which to keep.

        Returns
        -------
        stack : Stack
            The kept triangles, in the same order.
        """
        return Stack(
            triangles=self.triangles[rows],
            surface=self.surface[rows],
            source=self.source[rows],
            file_normals=self.file_normals[rows],
            rule=self.rule[rows],
        )


def stack_parts(roles: Roles) -> Stack:
    """Lay the parts that are not ignored one below the other.

    Parameters
    ----------
    roles : Roles
        Parts and their surfaces.

    Returns
    -------
    stack : Stack
        In the order of the parts and their faces.
    """
    used = [
        (part, number, rule)
        for part, number, rule in zip(
            roles.parts, roles.surface_of_part, roles.rule_of_part, strict=True
        )
        if number >= 0
    ]
    counts = [len(part.triangles) for part, _, _ in used]
    return Stack(
        triangles=np.concatenate([part.triangles for part, _, _ in used]),
        surface=np.repeat([number for _, number, _ in used], counts).astype(np.int32),
        source=np.concatenate([np.arange(n, dtype=np.int32) for n in counts]),
        file_normals=np.concatenate([_file_normals(part) for part, _, _ in used]),
        rule=np.repeat([rule for _, _, rule in used], counts).astype(np.int32),
    )


def _file_normals(part: Part) -> Floats:
    if part.corner_normals is None:
        return np.full(part.triangles.shape, np.nan)
    return part.corner_normals
