"""How an edit lays voxels: adds them to a compartment, or cuts them away, and what it spares."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import BywayError, Fault
from byway.widgets.state.drawing import Change, Drawing

__all__ = ["Edit", "laid", "number_in", "plane_of"]

Edit = Mapping[str, Any]


def laid(drawing: Drawing, edit: Edit, indices: NDArray[np.int64]) -> Change:
    """Lay voxels (C order, ascending) as the record says.

    ``mode`` "cut" takes them from ``compartment``, or from all where that is None; otherwise they come to belong to
    ``compartment`` alone, except where ``spare`` leaves voxels of other compartments as they are.
    """
    label = str(edit["op"])
    if edit.get("mode", "add") == "cut":
        if edit.get("compartment") is None:
            return drawing.set(label, indices, 0)
        keep = np.uint8(255 - drawing.bit(int(edit["compartment"])))
        return drawing.set(label, indices, drawing.flat[indices] & keep)
    if edit.get("spare"):
        indices = indices[drawing.flat[indices] == 0]
    return drawing.set(label, indices, drawing.bit(int(edit["compartment"])))


def plane_of(edit: Edit) -> int:
    """The plane that a record names.

    Raises
    ------
    BywayError
        If it is none of 0, 1, 2.
    """
    plane = int(edit["plane"])
    if plane not in (0, 1, 2):
        raise BywayError(Fault("plane", str(edit["op"]), f"plane {plane}", "0 (sagittal), 1 (coronal) or 2 (axial)"))
    return plane


def number_in(edit: Edit, key: str, low: float, high: float, unit: str = "") -> float:
    """A number of a record, checked to lie in [low, high].

    Raises
    ------
    BywayError
        If it does not.
    """
    value = float(edit[key])
    if not low <= value <= high:
        raise BywayError(Fault("edit-range", f"{edit['op']} {key}", f"{value:g} {unit}", f"{low:g} to {high:g} {unit}"))
    return value
