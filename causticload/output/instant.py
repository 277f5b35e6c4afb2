"""An instant as a record, and as files."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np

from causticload.output import meshes, pictures
from causticload.output.colours import round_end
from causticload.output.files import to_json, write_text, write_whole
from causticload.output.results import Instant, ReceiverInstant


def instant_record(instant: Instant, *, limits: bool = True) -> dict[str, Any]:
    """Say an instant in plain records.

    Parameters
    ----------
    instant : Instant
        The instant.
    limits : bool
        Whether to work out what unknown angular laws leave open; it takes some time.

    Returns
    -------
    record : dict
        Ready for JSON.
    """
    sun = instant.sun
    receivers = []
    for r in instant.receivers.values():
        top = int(r.reflected.argmax()) if len(r.reflected) else 0
        receivers.append(
            {
                "name": r.name,
                "kind": r.kind,
                "points": len(r.areas),
                "peak_reflected_W_m2": float(r.reflected.max(initial=0.0)),
                **_limits(r, wanted=limits),
                "peak_place_m": [float(x) for x in r.points[top]] if len(r.points) else None,
                "most_images": int(r.images.max(initial=0)),
                "reflected_W": float((r.reflected * r.areas).sum()),
            }
        )
    return {
        "title": instant.study.title,
        "sun": {
            "time": f"{sun.time}Z" if sun.time is not None else None,
            "azimuth": sun.azimuth,
            "elevation": sun.elevation,
            "beam_W_m2": sun.beam,
            "diffuse_W_m2": sun.diffuse,
            "radius_mrad": 1000.0 * sun.radius,
        },
        "receivers": receivers,
        "ledger_W": instant.ledger,
        "tracer": instant.tracer,
        "tubes": instant.tubes,
        "rays": instant.rays,
        "seconds": instant.seconds,
        "assumed": list(instant.assumed),
    }


def _limits(r: ReceiverInstant, *, wanted: bool) -> dict[str, float]:
    if not wanted:
        return {}
    low, high = r.peak_limits
    return {"peak_reflected_low_W_m2": low, "peak_reflected_high_W_m2": high}


def save_instant(instant: Instant, folder: Path) -> Path:
    """Write an instant's meshes, picture and record.

    Parameters
    ----------
    instant : Instant
        The instant.
    folder : Path
        Made if it is not there.

    Returns
    -------
    folder : Path
        The same.
    """
    ordered = sorted(instant.receivers.values(), key=lambda r: r.first)
    reflected = np.concatenate([r.reflected for r in ordered] or [np.zeros(0)])
    notes = {
        "title": instant.study.title,
        "scale": "colours run evenly from 0 to the end given in scale.png; unit W/m2",
    }
    high = round_end(float(reflected.max(initial=0.0)))
    cells = meshes.cells_of(instant.scene)
    grid = meshes.cell_grid(
        cells,
        {
            "reflected [W/m2]": reflected,
            "direct [W/m2]": np.concatenate([r.direct for r in ordered] or [np.zeros(0)]),
            "images [1]": np.concatenate([r.images for r in ordered] or [np.zeros(0, int)]),
        },
        notes,
    )
    write_whole(folder / "receivers.vtp", grid.save)
    coloured = meshes.coloured_cells(
        cells, reflected, high=high, flagged=np.zeros(len(reflected), bool), shown=reflected > 0
    )
    write_whole(folder / "receivers.ply", lambda p: meshes.write_ply(coloured, p, notes))
    write_whole(
        folder / "scale.png",
        lambda p: pictures.draw_scale(p, high=high, limits=[], label="Reflected load"),
    )
    write_whole(folder / "view.png", lambda p: pictures.render_moment(instant, p))
    write_text(folder / "instant.json", to_json(instant_record(instant)))
    return folder
