"""What the 3-D head shows, as arrays: the brain, the lesion by compartment, bundles parted into cut and spared."""

from __future__ import annotations

from functools import cache
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.space.template import brain_mask
from byway.widgets.head.surface import Surface, mask_surface

__all__ = ["Bundle", "brain_surface", "bundle_lines", "lesion_surfaces", "parcel_surface"]

CUT = 0.5  # a streamline counts as cut where the largest effect along it reaches this
MOST_STREAMLINES = 60
EVERY = 3  # of the points along a streamline, one in this many is drawn


class Bundle(NamedTuple):
    """Lines of one segment, (n, 3) mm with rows of NaN between streamlines."""

    cut_mm: NDArray[np.float32]
    spared_mm: NDArray[np.float32]


@cache
def brain_surface() -> Surface:
    """The template's brain, coarse."""
    return mask_surface(brain_mask(), TEMPLATE_GRID.affine, step=4, smoothing=12)


def lesion_surfaces(lesion: Any) -> list[tuple[str, str, Surface]]:
    """Name, kind and surface of every compartment; of a graded map, where it reaches one half."""
    found = [(c.name, c.kind, mask_surface(c.mask, TEMPLATE_GRID.affine)) for c in lesion.compartments]
    if lesion.effect_volume is not None:
        found.append(("graded", "other", mask_surface(lesion.effect_volume >= CUT, TEMPLATE_GRID.affine)))
    return found


def parcel_surface(geometry: Any, element: str) -> Surface:
    """Surface of a region's parcel."""
    inside = np.zeros(geometry.grid.size, bool)
    inside[geometry.parcel_voxels(geometry.region_ids.index(element))] = True
    return mask_surface(inside.reshape(geometry.grid.shape), geometry.grid.affine)


def bundle_lines(damage: Any, element: str) -> Bundle:
    """Streamlines of a segment, parted by whether the lesion cuts them; at most 60, evenly chosen."""
    geometry = damage.index.geometry
    segment = geometry.segment_ids.index(element)
    lines = geometry.streamlines(segment)
    chosen = np.unique(np.linspace(0, len(lines) - 1, min(MOST_STREAMLINES, len(lines))).astype(int))
    parts: dict[bool, list[NDArray[np.float32]]] = {True: [], False: []}
    gap = np.full((1, 3), np.nan, np.float32)
    for i in chosen:
        line = lines[i]
        parts[_largest_effect(damage, line) >= CUT] += [line[:: EVERY if len(line) > 2 * EVERY else 1], line[-1:], gap]
    empty = np.empty((0, 3), np.float32)
    cut, spared = (np.concatenate(parts[side]) if parts[side] else empty for side in (True, False))
    return Bundle(cut, spared)


def _largest_effect(damage: Any, line_mm: NDArray[np.float32]) -> float:
    """The largest effect of the lesion that a streamline meets."""
    if len(damage.voxels) == 0:
        return 0.0
    voxels = damage.index.geometry.grid.flat_index(line_mm)
    at = np.minimum(np.searchsorted(damage.voxels, voxels), len(damage.voxels) - 1)
    return float(np.where(damage.voxels[at] == voxels, damage.effects[at], 0.0).max())
