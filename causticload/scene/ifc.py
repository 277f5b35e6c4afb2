"""IFC building models, through ifcopenshell (the optional extra ``ifc``)."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from causticload.errors import MeshError
from causticload.scene.model import Floats

NO_SURFACE = ("IfcOpeningElement", "IfcSpace")  # bodies that nothing can be seen of


@dataclass(frozen=True, kw_only=True)
class IfcPiece:
    """Faces of one element and material. Triangles (k, 3, 3) in metres, Z up."""

    object_name: str
    group: str  # class of the element, storey and layer, joined with "/"
    material: str
    triangles: Floats


def read_ifc(path: Path) -> list[IfcPiece]:
    """Read the elements of an IFC file that have a body.

    Parameters
    ----------
    path : pathlib.Path
        The file.

    Returns
    -------
    pieces : list of IfcPiece
        In the order of the elements' numbers in the file. Openings and spaces are left out.

    Raises
    ------
    MeshError
        If ifcopenshell is missing or cannot read the file.
    """
    try:
        import ifcopenshell
        import ifcopenshell.geom
    except ImportError as error:
        raise MeshError(
            "IFC files are read with ifcopenshell, which is not installed.",
            where=path.name,
            hint='Install it with: pip install "causticload[ifc]"',
        ) from error
    try:
        model = ifcopenshell.open(str(path))
        elements = [
            e
            for e in model.by_type("IfcElement") + model.by_type("IfcSite")
            if e.Representation and not any(e.is_a(kind) for kind in NO_SURFACE)
        ]
        shapes = _shapes(model, elements) if elements else {}
    except Exception as error:  # ifcopenshell raises many kinds
        raise MeshError(
            f"ifcopenshell cannot read the file: {error}.",
            where=path.name,
            hint="Open it in the program that wrote it and export it again.",
        ) from error
    return [
        piece
        for element in sorted(elements, key=lambda e: e.id())
        if element.id() in shapes
        for piece in _pieces(element, shapes[element.id()])
    ]


def _shapes(model: Any, elements: list[Any]) -> dict[int, Any]:
    """Triangulate the elements: shape of each, by its number in the file."""
    import ifcopenshell.geom

    settings = ifcopenshell.geom.settings()
    settings.set("use-world-coords", True)
    iterator = ifcopenshell.geom.iterator(settings, model, include=elements)
    shapes = {}
    if iterator.initialize():
        while True:
            shape = iterator.get()
            shapes[shape.id] = shape
            if not iterator.next():
                break
    return shapes


def _pieces(element: Any, shape: Any) -> list[IfcPiece]:
    """Split the faces of an element by material."""
    import ifcopenshell.util.element as util

    geometry = shape.geometry
    vertices = np.array(geometry.verts, dtype=np.float64).reshape(-1, 3)
    faces = np.array(geometry.faces, dtype=np.int64).reshape(-1, 3)
    material = np.array(geometry.material_ids, dtype=np.int64)
    storey = util.get_container(element)
    layers = sorted(layer.Name for layer in util.get_layers(element.file, element) if layer.Name)
    group = "/".join([element.is_a(), *([storey.Name] if storey and storey.Name else []), *layers])
    name = element.Name or f"{element.is_a()} {element.id()}"
    return [
        IfcPiece(
            object_name=name,
            group=group,
            material=geometry.materials[m].name if m >= 0 else "",
            triangles=vertices[faces[material == m]],
        )
        for m in np.unique(material)
    ]
