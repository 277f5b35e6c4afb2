"""The model for the page that turns: packed small enough to travel inside it."""

from __future__ import annotations

import base64
import json
import zlib
from typing import Any

import matplotlib as mpl
import numpy as np

from causticload.output.colours import LOAD_MAP
from causticload.output.memo.evidence import Evidence
from causticload.output.memo.figures.style import load_scale
from causticload.output.memo.figures.views import GREY, LIT_W_M2, PLAIN_GLASS, shade
from causticload.scene.model import Floats, Ints

MOST_CELLS = 40_000  # coarser cells are shown above this
MOST_TRIANGLES = 60_000  # of the surroundings; the largest are kept
RAISE_M = 0.03  # cells stand off their receiver, or the two would flicker


def pack(evidence: Evidence) -> str:
    """Pack facade, surroundings and lit cells.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Returns
    -------
    text : str
        Base64 of a deflated block: a line of JSON that says what follows, then the corners as
        16-bit steps through the bounding box, then one byte of colour for each shape.
    """
    cells, load = lit_cells(evidence)
    norm, _ = load_scale(evidence.cell_data["peak reflected [W/m2]"])
    others = _largest(evidence.surroundings)
    palette = [mpl.colors.to_hex(c) for c in mpl.colormaps[LOAD_MAP](np.linspace(0.0, 1.0, 200))]
    shades = np.linspace(0.6, 1.0, 28)
    palette += [mpl.colors.to_hex(np.clip(GREY * s, 0, 1)) for s in shades]
    palette += [mpl.colors.to_hex(np.clip(PLAIN_GLASS * s, 0, 1)) for s in shades]
    parts: list[tuple[str, Floats, Ints]] = [
        ("quads", cells, np.round(199 * np.clip(norm(load), 0.0, 1.0)).astype(int)),
        ("triangles", others, 200 + _tone(others)),
        ("triangles", evidence.facade, 228 + _tone(evidence.facade)),
        ("lines", evidence.panel_edges, np.full(len(evidence.panel_edges), 201)),
    ]
    corners = [p.reshape(-1, 3) for _, p, _ in parts if len(p)]
    low = np.min([c.min(axis=0) for c in corners], axis=0)
    high = np.max([c.max(axis=0) for c in corners], axis=0)
    step = float((high - low).max()) / 65_535.0
    head = {
        "parts": [{"kind": kind, "count": len(p)} for kind, p, _ in parts],
        "size": [float(x) for x in np.round(high - low, 3)],
        "step": step,
        "palette": palette,
        "focus": [float(x) for x in np.round(_focus(evidence) - low, 3)],
        "reach": round(_reach(evidence), 3),
    }
    body = b"".join(
        np.round((p.reshape(-1, 3) - low) / step).astype("<u2").tobytes() for _, p, _ in parts
    )
    tail = b"".join(c.astype(np.uint8).tobytes() for *_, c in parts)
    # The corners must start at an even place.
    line = json.dumps(head, separators=(",", ":")).encode()
    line += b" " * ((len(line) + 1) % 2) + b"\n"
    return base64.b64encode(zlib.compress(line + body + tail, 9)).decode()


def _tone(T: Floats) -> Any:
    return np.round((shade(T) - 0.6) / 0.4 * 27).clip(0, 27).astype(int)


def _largest(T: Floats) -> Floats:
    if len(T) <= MOST_TRIANGLES:
        return T
    area = np.linalg.norm(np.cross(T[:, 1] - T[:, 0], T[:, 2] - T[:, 0]), axis=1)
    return T[np.sort(np.argsort(-area, kind="stable")[:MOST_TRIANGLES])]


def _focus(evidence: Evidence) -> Floats:
    corner = evidence.facade.reshape(-1, 3)
    middle = 0.5 * (corner.min(axis=0) + corner.max(axis=0))
    cells, _ = lit_cells(evidence)
    return 0.5 * (middle + cells.reshape(-1, 3).mean(axis=0)) if len(cells) else middle


def _reach(evidence: Evidence) -> float:
    corner = evidence.facade.reshape(-1, 3)
    return 2.2 * float(np.linalg.norm(np.ptp(corner, axis=0)))


def lit_cells(evidence: Evidence) -> tuple[Floats, Floats]:
    """Cells that get light, made coarser where there are too many.

    Parameters
    ----------
    evidence : Evidence
        The year.

    Returns
    -------
    cells : (k, 4, 3) float
        Corners. [m]
    load : (k,) float
        Largest peak reflected load in each. [W/m²]
    """
    peak = evidence.cell_data["peak reflected [W/m2]"]
    lit = peak > LIT_W_M2
    Q, load = evidence.cells[lit], peak[lit]
    if not len(Q):
        return Q, load
    u, v = Q[:, 1] - Q[:, 0], Q[:, 3] - Q[:, 0]
    h = np.linalg.norm(u, axis=1)
    u, v = u / h[:, None], v / h[:, None]
    n = np.cross(u, v)
    Q = Q + RAISE_M * n[:, None]
    k = int(np.ceil(np.sqrt(len(Q) / MOST_CELLS)))
    if k > 1:
        Q, load = _merged(Q, load, k * h, (u, v, n))
    return Q, load


def _merged(
    Q: Floats, load: Floats, h: Floats, axes: tuple[Floats, Floats, Floats]
) -> tuple[Floats, Floats]:
    """Rectangles around groups of cells that lie in one square of size ``h`` of one plane."""
    u, v, n = axes
    middle = Q.mean(axis=1)
    a, b, c = (np.einsum("ij,ij->i", middle, axis) for axis in axes)
    key = np.column_stack(
        [
            np.floor(a / h),
            np.floor(b / h),
            np.round(c * 20.0),
            np.round(50.0 * n),
            np.round(50.0 * u),
        ]
    )
    _, first, group = np.unique(key, axis=0, return_index=True, return_inverse=True)
    group = group.ravel()
    k = len(first)
    ends = []
    for axis in (u, v):
        t = np.einsum("ijk,ik->ij", Q, axis)
        low, high = np.full(k, np.inf), np.full(k, -np.inf)
        np.minimum.at(low, group, t.min(axis=1))
        np.maximum.at(high, group, t.max(axis=1))
        ends.append((low, high))
    most = np.zeros(k)
    np.maximum.at(most, group, load)
    U, V, N = u[first], v[first], n[first]
    off = np.einsum("ij,ij->i", Q[first, 0], N)
    (a0, a1), (b0, b1) = ends
    corners = [
        off[:, None] * N + x[:, None] * U + y[:, None] * V
        for x, y in ((a0, b0), (a1, b0), (a1, b1), (a0, b1))
    ]
    return np.stack(corners, axis=1), most
