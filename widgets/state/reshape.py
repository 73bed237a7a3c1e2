"""Edits that reshape what is drawn, or lay what a scan shows: thin calls of ``byway.knowledge.lesion.morphology``."""

from __future__ import annotations

from typing import Any, cast

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.lesion import morphology
from byway.knowledge.lesion.shapes import sphere_mask
from byway.knowledge.space.template import brain_mask
from byway.widgets.state.drawing import Change, Drawing
from byway.widgets.state.laying import Edit, laid, number_in, plane_of
from byway.widgets.state.scans import Scans

__all__ = ["fill_between", "mirrored", "place", "resize", "spread", "threshold"]

Mask = NDArray[np.bool_]


def _mask(drawing: Drawing, compartment: int) -> Mask:
    return np.asarray((drawing.bits & np.uint8(drawing.bit(compartment))) != 0)


def _redrawn(drawing: Drawing, edit: Edit, new: Mask) -> Change:
    """One compartment gets a new mask: what it gains belongs to it alone, what it loses is left to the others."""
    compartment = int(edit["compartment"])
    bit = np.uint8(drawing.bit(compartment))
    moved = np.flatnonzero(new != _mask(drawing, compartment))
    gained = new.reshape(-1)[moved]
    if edit.get("spare"):
        free = drawing.flat[moved] == 0
        moved, gained = moved[free | ~gained], gained[free | ~gained]
    values = np.where(gained, bit, drawing.flat[moved] & np.uint8(255 - bit)).astype(np.uint8)
    return drawing.set(str(edit["op"]), moved, values)


def resize(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    """Grow (``mm`` above 0) or shrink a compartment."""
    by = number_in(edit, "mm", -60, 60, "mm")
    mask = _mask(drawing, int(edit["compartment"]))
    change = morphology.grow_mm if by > 0 else morphology.shrink_mm
    return _redrawn(drawing, edit, change(mask, abs(by), grid=drawing.grid))


def fill_between(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    """Fill a compartment between its slices drawn on ``plane``."""
    return _redrawn(drawing, edit, morphology.fill_between(_mask(drawing, int(edit["compartment"])), plane_of(edit)))


def mirrored(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    """Move the drawing (``compartment`` None) or one compartment to the other side."""
    there = np.asarray(morphology.mirror(drawing.bits, grid=drawing.grid), np.uint8)
    if edit.get("compartment") is not None:
        bit = np.uint8(drawing.bit(int(edit["compartment"])))
        there = (drawing.bits & np.uint8(255 - bit)) | (there & bit)
    moved = np.flatnonzero(drawing.flat != there.reshape(-1))
    return drawing.set("mirror", moved, there.reshape(-1)[moved])


def place(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    """Move by ``shift`` (whole voxels) and scale by ``scale`` about the middle of what moves."""
    factor = number_in(edit, "scale", 0.1, 10)
    shift_mm = np.asarray(edit["shift"], float) * np.diag(drawing.grid.affine)[:3]
    chosen = range(len(drawing.styles)) if edit.get("compartment") is None else [int(edit["compartment"])]
    indices = np.unique(np.concatenate([drawing.voxels_of(c) for c in chosen]))
    if not len(indices):
        raise BywayError(Fault("nothing-drawn", "move", "an empty drawing", "something drawn"))
    ijk = np.stack(np.unravel_index(indices, drawing.grid.shape))
    centre_mm = drawing.grid.to_mm((ijk.min(1) + ijk.max(1))[None] / 2)[0]
    new = drawing.bits.copy()
    for c in chosen:
        new &= np.uint8(255 - drawing.bit(c))
    for c in chosen:
        mask = _mask(drawing, c)
        if factor != 1:
            mask = morphology.scaled(mask, factor, centre_mm=centre_mm.tolist(), grid=drawing.grid)
        new[morphology.move_mm(mask, shift_mm.tolist(), grid=drawing.grid)] |= np.uint8(drawing.bit(c))
    moved = np.flatnonzero(drawing.flat != new.reshape(-1))
    return drawing.set("place", moved, new.reshape(-1)[moved])


def spread(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    """Grow from the voxel ``seed`` over like intensity: its neighbourhood's mean plus or minus ``tolerance``."""
    scan = scans[str(edit["scan"])]
    seed = [int(v) for v in edit["seed"]]
    if not all(0 <= v < n for v, n in zip(seed, drawing.grid.shape, strict=True)):
        raise BywayError(Fault("click", "scan", f"voxel {seed}", f"inside {drawing.grid.shape}"))
    near = scan.stored[tuple(slice(max(0, v - 1), v + 2) for v in seed)]
    tolerance = number_in(edit, "tolerance", 0, 1e6) / scan.slope
    middle = float(near.mean())
    mask = morphology.grow_from_click(
        cast(Any, scan.stored),
        drawing.grid.to_mm(np.array([seed]))[0].tolist(),
        limits=(middle - tolerance, middle + tolerance),
        most_mm=number_in(edit, "reach_mm", 1, 200, "mm"),
        within=brain_mask(),
        grid=drawing.grid,
    )
    return laid(drawing, edit, np.flatnonzero(mask))


def threshold(drawing: Drawing, edit: Edit, scans: Scans) -> Change:
    """Lay all voxels whose value lies in [``low``, ``high``], ``within`` the brain, the drawing, or a sphere.

    The sphere lies about the voxel ``centre`` with a radius of ``reach_mm``.
    """
    mask = scans[str(edit["scan"])].in_range(float(edit["low"]), float(edit["high"]))
    within = str(edit.get("within", "brain"))
    if within == "lesion":
        mask &= drawing.bits > 0
    elif within == "sphere":
        centre = drawing.grid.to_mm(np.asarray([edit["centre"]], float))[0]
        mask &= sphere_mask(centre.tolist(), number_in(edit, "reach_mm", 1, 200, "mm"), grid=drawing.grid)
    elif within != "brain":
        raise BywayError(Fault("threshold", "within", within, "brain, lesion or sphere"))
    return laid(drawing, edit, np.flatnonzero(mask & brain_mask()))
