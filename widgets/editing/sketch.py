"""The course in the hand: core line and a thin bundle while waypoints are dragged, and slices to drag them on."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pydantic import ValidationError

from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.graph.grammar import to_record
from byway.knowledge.graph.records import Segment
from byway.knowledge.graph.references import split_reference
from byway.knowledge.space.build import sketch_segment
from byway.knowledge.space.geometry import Geometry
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.space.template import template_volume

__all__ = ["SLICE_STEP", "course_sketch", "slices_volume"]

SLICE_STEP = 2
"""Every second voxel of the template is sent: 2 mm, enough to see where a course runs."""
_EVERY = 3
_WORDS = {"name": "-", "variability": "moderate", "studied": "hardly", "crossing": "none", "fit": "fits", "course": "-",
          "serves_in_words": "-", "sources": []}  # fmt: skip


@cache
def slices_volume() -> NDArray[np.uint8]:
    """The template's T1 image, 0 to 255, at 2 mm; index (i, j, k) lies at the template grid's voxel 2 (i, j, k)."""
    step = slice(None, None, SLICE_STEP)
    scaled: NDArray[np.uint8] = np.rint(np.clip(template_volume("t1")[step, step, step], 0, 1) * 255).astype(np.uint8)
    return scaled


def course_sketch(
    body: Mapping[str, Any], geometry: Geometry | None, *, streamlines: int = 40
) -> dict[str, NDArray[np.float32] | NDArray[np.int32]]:
    """Core line and streamlines of a segment's block as it stands in the form.

    Parameters
    ----------
    body : mapping
        At least ``waypoints_mni``; ``from``, ``to``, ``sides``, ``radius_mm`` and ``fit`` where they are given.
    geometry : Geometry, optional
        Where the regions at its ends lie.
    streamlines : int
        How many; 0 for the core line alone.

    Returns
    -------
    dict
        ``line`` (n, 3) float32; ``points`` (m, 3) float32 and ``offsets`` (s + 1,) int32 of the streamlines. MNI mm.

    Raises
    ------
    BywayError
        Fewer than two waypoints, or one outside the template.
    """
    values = {"sides": "paired", "radius_mm": 3.0, **_WORDS, **{k: v for k, v in body.items() if v not in (None, "")}}
    values = {**values, "from": values.get("from") or "wm:here", "to": values.get("to") or "wm:there"}
    try:
        segment = to_record("segment", "sketch.segment", values)
    except ValidationError as error:
        raise BywayError(Fault("sketch", "segment", error.errors()[0]["msg"], "coordinates in mm")) from error
    assert isinstance(segment, Segment)
    points = np.array(segment.waypoints_mni, float).reshape(-1, 3)
    voxels = TEMPLATE_GRID.to_voxel(points)
    if len(points) < 2 or (voxels < 8).any() or (voxels > np.array(TEMPLATE_GRID.shape) - 9).any():
        raise BywayError(Fault("sketch", "segment", "no course to draw", "two waypoints or more inside the template"))
    line, bundle = sketch_segment(segment, _parcels(segment, geometry), streamlines=streamlines)
    lines = [each[::_EVERY] for each in bundle.streamlines] if bundle is not None else []
    offsets = np.cumsum([0, *(len(each) for each in lines)]).astype(np.int32)
    points_mm = np.concatenate(lines) if lines else np.empty((0, 3))
    return {"line": line.astype(np.float32), "points": points_mm.astype(np.float32), "offsets": offsets}


def _parcels(segment: Segment, geometry: Geometry | None) -> dict[str, NDArray[np.int32]]:
    if geometry is None:
        return {}
    names = {split_reference(place)[0] for place in (segment.from_place, segment.to_place)}
    return {element: geometry.parcel_voxels(i) for i, element in enumerate(geometry.region_ids)
            if split_reference(element)[0] in names}  # fmt: skip
