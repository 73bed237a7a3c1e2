"""Every edit of the drawing, by name. An edit is a plain record, so that it can be sent, journalled and replayed.

Each function takes the drawing, the record and the scans, and makes one step. ``compartment`` counts from 0; None
stands for all. Coordinates of strokes and polygons are those of :mod:`byway.widgets.state.raster`.
"""

from __future__ import annotations

import base64
import zlib
from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import BywayError, Fault, nearest
from byway.knowledge.lesion.shapes import ellipsoid_mask
from byway.widgets.state import reshape
from byway.widgets.state.drawing import MOST_COMPARTMENTS, Change, Drawing, Style
from byway.widgets.state.history import packed_indices, unpacked_indices
from byway.widgets.state.laying import Edit, laid, number_in, plane_of
from byway.widgets.state.raster import polygon_voxels, stroke_voxels
from byway.widgets.state.scans import Scans

__all__ = ["EDITS", "LEANS_ON_SCANS", "apply_edit", "bytes_edit"]

Indices = NDArray[np.int64]


def apply_edit(drawing: Drawing, edit: Edit, scans: Scans) -> Change | None:
    """Make one edit; None where an undo or redo has nowhere to go.

    Raises
    ------
    BywayError
        If the record names no edit, misses a field, or a value is out of range; nothing has changed then.
    """
    name = str(edit.get("op"))
    if name not in EDITS:
        raise BywayError(Fault("unknown-edit", "drawing", f"no edit {name!r}", "", nearest(name, EDITS)))
    try:
        return EDITS[name](drawing, edit, scans)
    except KeyError as missing:
        raise BywayError(Fault("edit-field", f"edit {name}", f"no {missing}", "all fields of this edit")) from None


def _stroke(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    radius = number_in(edit, "radius", 0.1, 64, "voxels")
    voxels = stroke_voxels(drawing.grid.shape, plane_of(edit), int(edit["index"]), edit["points"], radius,
                           ball=bool(edit.get("ball")))  # fmt: skip
    return laid(drawing, edit, voxels)


def _polygon(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    voxels = polygon_voxels(drawing.grid.shape, plane_of(edit), int(edit["index"]), edit["points"])
    return laid(drawing, edit, voxels)


def _ellipsoid(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    mask = ellipsoid_mask(edit["centre_mm"], edit["radii_mm"], grid=drawing.grid)
    return laid(drawing, edit, np.flatnonzero(mask))


def _clear(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    return laid(drawing, {**edit, "mode": "cut"}, drawing.voxels_of(edit.get("compartment")))


def _text(data: bytes) -> str:
    return base64.b64encode(data).decode("ascii")


def bytes_edit(indices: Indices, values: NDArray[np.uint8], styles: tuple[Style, ...] | None = None) -> dict[str, Any]:
    """The edit that gives voxels (C order, ascending) exact bytes, and compartments where given; leans on nothing."""
    edit: dict[str, Any] = {"op": "bytes", "indices": _text(packed_indices(indices)),
                            "values": _text(zlib.compress(values.tobytes(), 1))}  # fmt: skip
    if styles is not None:
        edit["styles"] = [dict(vars(style)) for style in styles]
    return edit


def _bytes(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    indices = unpacked_indices(base64.b64decode(edit["indices"]))
    values = np.frombuffer(zlib.decompress(base64.b64decode(edit["values"])), np.uint8)
    if len(indices) != len(values) or (len(indices) and indices[-1] >= drawing.grid.size):
        raise BywayError(Fault("voxel-bytes", "drawing", f"{len(indices)} places, {len(values)} bytes",
                               "as many of each, all on the grid"))  # fmt: skip
    label = str(edit.get("label", "bytes"))
    if "styles" not in edit:
        return drawing.set(label, indices, values)
    styles = tuple(Style.of(style) for style in edit["styles"])
    return drawing.configure(label, replace(drawing.settings, styles=styles), indices, values)


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
    below = np.uint8((1 << c) - 1)
    new = (old & below) | ((old >> 1) & np.uint8(255 - below))
    styles = tuple(s for i, s in enumerate(drawing.styles) if i != c)
    moved = old != new
    settings = replace(drawing.settings, styles=styles)
    return drawing.configure("remove_compartment", settings, indices[moved], new[moved])


def _remove_graded(drawing: Drawing, edit: Edit, scans: Scans) -> Change | None:
    """Take the graded effect map away."""
    if drawing.settings.effect_volume is None:
        return None
    return drawing.configure("remove_graded", replace(drawing.settings, effect_volume=None, scale=None))


LEANS_ON_SCANS = frozenset({"spread", "threshold"})

EDITS: dict[str, Callable[[Drawing, Edit, Scans], Change | None]] = {
    "stroke": _stroke,
    "polygon": _polygon,
    "ellipsoid": _ellipsoid,
    "clear": _clear,
    "bytes": _bytes,
    "compartment": _compartment,
    "add_compartment": _add_compartment,
    "remove_compartment": _remove_compartment,
    "remove_graded": _remove_graded,
    "resize": reshape.resize,
    "fill_between": reshape.fill_between,
    "mirror": reshape.mirrored,
    "place": reshape.place,
    "spread": reshape.spread,
    "threshold": reshape.threshold,
    "undo": lambda drawing, edit, scans: drawing.undo(),
    "redo": lambda drawing, edit, scans: drawing.redo(),
}
