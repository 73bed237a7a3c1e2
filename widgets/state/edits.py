"""Every edit of the drawing, by name. An edit is a plain record, so that it can be sent, journalled and replayed.

Each function takes the drawing, the record and the scans, and makes one step. ``compartment`` counts from 0; None
stands for all. Coordinates of strokes and polygons are those of :mod:`byway.widgets.state.raster`.
"""

from __future__ import annotations

import base64
from collections.abc import Callable, Mapping
from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import BywayError, Fault, nearest
from byway.knowledge.lesion.shapes import ellipsoid_mask
from byway.widgets.state.drawing import MOST_COMPARTMENTS, Change, Drawing, Style
from byway.widgets.state.history import packed_indices, unpacked_indices
from byway.widgets.state.raster import polygon_voxels, stroke_voxels
from byway.widgets.state.scans import Scans

__all__ = ["EDITS", "apply_edit", "voxels_edit"]

Edit = Mapping[str, Any]
Indices = NDArray[np.int64]


def apply_edit(drawing: Drawing, edit: Edit, scans: Scans) -> Change | None:
    """Make one edit; None where an undo or redo has nowhere to go.

    Raises
    ------
    BywayError
        If the record names no edit, misses a field, or a value is out of range.
    """
    name = str(edit.get("op"))
    if name not in EDITS:
        raise BywayError(Fault("unknown-edit", "drawing", f"no edit {name!r}", "", nearest(name, EDITS)))
    try:
        return EDITS[name](drawing, edit, scans)
    except KeyError as missing:
        raise BywayError(Fault("edit-field", f"edit {name}", f"no {missing}", "all fields of this edit")) from None


def _laid(drawing: Drawing, edit: Edit, indices: Indices) -> Change:
    """Give voxels to the edit's compartment, or take them away (``mode`` "cut"), sparing what is to be kept."""
    label = str(edit["op"])
    if edit.get("mode", "add") == "cut":
        if edit.get("compartment") is None:
            return drawing.set(label, indices, 0)
        keep = np.uint8(255 - drawing.bit(int(edit["compartment"])))
        return drawing.set(label, indices, drawing.flat[indices] & keep)
    if edit.get("spare"):  # leaves other compartments as they are
        indices = indices[drawing.flat[indices] == 0]
    return drawing.set(label, indices, drawing.bit(int(edit["compartment"])))


def _stroke(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    radius = float(edit["radius"])
    if not 0 < radius <= 64:
        raise BywayError(Fault("brush-radius", "stroke", f"{radius} mm", "more than 0 and at most 64 mm"))
    voxels = stroke_voxels(drawing.grid.shape, _plane(edit), int(edit["index"]), edit["points"], radius,
                           ball=bool(edit.get("ball")))  # fmt: skip
    return _laid(drawing, edit, voxels)


def _polygon(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    return _laid(drawing, edit, polygon_voxels(drawing.grid.shape, _plane(edit), int(edit["index"]), edit["points"]))


def _plane(edit: Edit) -> int:
    plane = int(edit["plane"])
    if plane not in (0, 1, 2):
        raise BywayError(Fault("plane", str(edit["op"]), f"plane {plane}", "0 (sagittal), 1 (coronal) or 2 (axial)"))
    return plane


def _ellipsoid(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    return _laid(drawing, edit, np.flatnonzero(ellipsoid_mask(edit["centre_mm"], edit["radii_mm"], grid=drawing.grid)))


def _clear(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    return _laid(drawing, {**edit, "mode": "cut"}, drawing.voxels_of(edit.get("compartment")))


def voxels_edit(indices: Indices, compartment: int, *, fresh: bool = False, overlap: bool = False) -> dict[str, Any]:
    """The edit that gives voxels (C order, ascending) to a compartment, self-contained for the journal.

    ``fresh`` first empties the compartment; ``overlap`` leaves other compartments' claims standing.
    """
    packed = base64.b64encode(packed_indices(indices)).decode("ascii")
    return {"op": "voxels", "indices": packed, "compartment": compartment, "fresh": fresh, "overlap": overlap}


def _voxels(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    indices = unpacked_indices(base64.b64decode(edit["indices"]))
    if len(indices) and indices[-1] >= drawing.grid.size:
        raise BywayError(Fault("voxel-index", "drawing", f"voxel {indices[-1]}", f"below {drawing.grid.size}"))
    bit = np.uint8(drawing.bit(int(edit["compartment"])))
    every = np.union1d(indices, drawing.voxels_of(int(edit["compartment"]))) if edit.get("fresh") else indices
    new = drawing.flat[every] & np.uint8(255 - bit) if edit.get("fresh") else drawing.flat[every]
    inside = np.isin(every, indices, assume_unique=True) if edit.get("fresh") else slice(None)
    new[inside] = new[inside] | bit if edit.get("overlap") else bit
    return drawing.set("voxels", every, new)


def _compartment(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    """Change ``name``, ``kind`` or ``effect`` of a compartment."""
    changes = {key: edit[key] for key in ("name", "kind", "effect") if key in edit}
    return drawing.configure("compartment", drawing.restyle(int(edit["compartment"]), **changes))


def _add_compartment(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    if len(drawing.styles) >= MOST_COMPARTMENTS:
        raise BywayError(Fault("compartments", "drawing", "one compartment too many", f"at most {MOST_COMPARTMENTS}"))
    styles = (*drawing.styles, Style.of(edit))
    return drawing.configure("add_compartment", replace(drawing.settings, styles=styles))


def _remove_compartment(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    """Remove a compartment with its voxels; those after it move up."""
    c = int(edit["compartment"])
    drawing.bit(c)
    if len(drawing.styles) == 1:
        raise BywayError(Fault("compartments", "drawing", "the only compartment", "", "clear it instead"))
    indices = drawing.voxels_of(None)
    old = drawing.flat[indices]
    new = (old & np.uint8((1 << c) - 1)) | ((old >> 1) & np.uint8(255 & ~((1 << c) - 1)))
    styles = tuple(s for i, s in enumerate(drawing.styles) if i != c)
    moved = old != new
    return drawing.configure("remove_compartment", replace(drawing.settings, styles=styles), indices[moved], new[moved])


EDITS: dict[str, Callable[[Drawing, Edit, Scans], Change | None]] = {
    "stroke": _stroke,
    "polygon": _polygon,
    "ellipsoid": _ellipsoid,
    "clear": _clear,
    "voxels": _voxels,
    "compartment": _compartment,
    "add_compartment": _add_compartment,
    "remove_compartment": _remove_compartment,
    "undo": lambda drawing, edit, scans: drawing.undo(),
    "redo": lambda drawing, edit, scans: drawing.redo(),
}
