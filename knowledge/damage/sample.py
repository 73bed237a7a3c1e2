"""The sample of streamline points and parcel voxels on which the ensemble is reckoned."""

from __future__ import annotations

import zlib
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.space.geometry import Geometry

__all__ = ["CELL", "Sample"]

CELL = 8  # voxels along the side of the cells on which displacements are reckoned
_OWN_MIRROR = {"left": "right", "right": "left"}


@dataclass(frozen=True, eq=False)
class Sample:
    """Points in groups: a group is a sampled streamline, or one sampled voxel of a parcel.

    Parameters
    ----------
    shape : tuple of int
        Shape of the grid.
    voxels : (P, 3) int32
        Voxel indices of the points (may lie outside the grid).
    mover : (P,) int32
        Which points move together: those of one element in one cell of 8 x 8 x 8 voxels.
    mover_element, mover_centre : (C,) int32, (C, 3) float32
        Whose points these are, and the centre of the cell, in voxels.
    group_offsets : (K + 1,) int64
        Bounds of the groups in ``voxels``.
    group_element : (K,) int32
        Element of each group, ascending.
    group_weight : (K,) float32
        Weight of each group in its element's share; sums to 1 over an element.
    partner : (E,) int32
        The element on the other side; itself where there is none.
    spread_mm : (E,) float32
        Between-subject spread of each element, mm.
    label : (E,) uint32
        A number that comes of each element's id alone, so that its draws do not depend on which others there are.
    """

    shape: tuple[int, int, int]
    voxels: NDArray[np.int32] = field(repr=False)
    mover: NDArray[np.int32] = field(repr=False)
    mover_element: NDArray[np.int32] = field(repr=False)
    mover_centre: NDArray[np.float32] = field(repr=False)
    group_offsets: NDArray[np.int64] = field(repr=False)
    group_element: NDArray[np.int32] = field(repr=False)
    group_weight: NDArray[np.float32] = field(repr=False)
    partner: NDArray[np.int32] = field(repr=False)
    spread_mm: NDArray[np.float32] = field(repr=False)
    label: NDArray[np.uint32] = field(repr=False)

    @classmethod
    def build(
        cls, geometry: Geometry, *, streamlines: int | None = 100, step: int = 2, voxels: int | None = 300
    ) -> Sample:
        """Take a sample, the same every time.

        Parameters
        ----------
        geometry : Geometry
            What to sample.
        streamlines : int, optional
            Most streamlines of a segment, evenly spaced in their order; all where None.
        step : int
            Take every so many points along a streamline, and always its last one.
        voxels : int, optional
            Most voxels of a parcel, evenly spaced from the midline outwards; all where None.
        """
        n_regions = len(geometry.region_ids)
        elements: list[NDArray[np.int32]] = []
        weights: list[NDArray[np.float32]] = []
        chosen_voxels = []
        for region in range(n_regions):
            first, last = geometry.region_offsets[region], geometry.region_offsets[region + 1]
            chosen = first + _outwards(geometry.region_voxels[first:last], geometry.grid.shape)
            chosen = chosen[_evenly(0, len(chosen), voxels)]
            chosen_voxels.append(chosen)
            elements.append(np.full(len(chosen), region, np.int32))
            weights.append(_unit(geometry.region_weights[chosen]))
        chosen_lines = []
        for segment in range(len(geometry.segment_ids)):
            first, last = geometry.segment_offsets[segment], geometry.segment_offsets[segment + 1]
            chosen = _evenly(int(first), int(last), streamlines)
            chosen_lines.append(chosen)
            elements.append(np.full(len(chosen), n_regions + segment, np.int32))
            weights.append(_unit(geometry.streamline_weights[chosen]))

        parcel = geometry.region_voxels[np.concatenate([np.empty(0, np.int64), *chosen_voxels])]
        ijk = [np.stack(np.unravel_index(parcel, geometry.grid.shape), axis=1).astype(np.int32)]
        lines = np.concatenate([np.empty(0, np.int64), *chosen_lines])
        at, count = _every(geometry.streamline_offsets[lines], geometry.streamline_offsets[lines + 1], step)
        ijk.append(np.rint(geometry.grid.to_voxel(geometry.points_mm[at])).astype(np.int32))
        sizes = np.concatenate([np.ones(len(parcel), np.int64), count])
        place = np.concatenate(ijk)
        group_element = np.concatenate([np.empty(0, np.int32), *elements])
        element = np.repeat(group_element, sizes)
        mover, centre, first = _movers(place, element, geometry.grid.shape)
        return cls(
            shape=geometry.grid.shape,
            voxels=place,
            mover=mover,
            mover_element=element[first],
            mover_centre=centre,
            group_offsets=np.concatenate([[0], np.cumsum(sizes)]),
            group_element=group_element,
            group_weight=np.concatenate([np.empty(0, np.float32), *weights]),
            partner=_partners(geometry),
            spread_mm=geometry.spread_mm,
            label=np.array([zlib.crc32(element.encode()) for element in geometry.element_ids], np.uint32),
        )


def _outwards(flat: NDArray[np.int32], shape: tuple[int, int, int]) -> NDArray[np.int64]:
    """Order of a parcel's voxels by distance from the midline plane, so that both sides' samples are mirror images."""
    i, j, k = np.unravel_index(flat, shape)
    return np.asarray(np.lexsort((k, j, np.abs(2 * i - (shape[0] - 1)))))


def _movers(
    voxels: NDArray[np.int32], element: NDArray[np.int32], shape: tuple[int, int, int]
) -> tuple[NDArray[np.int32], NDArray[np.float32], NDArray[np.int64]]:
    """Number of each point's mover, the centre of each mover's cell, and its first point."""
    middle = (np.array(shape) - 1) / 2
    # Cells are laid out from the middle of the grid, so that they mirror one another across the midline.
    cell = np.rint((voxels - middle) / CELL).astype(np.int64)
    radix = 2 * int(np.abs(cell).max(initial=0)) + 1
    key = element.astype(np.int64)
    for axis in range(3):
        key = key * radix + cell[:, axis] + radix // 2
    _, first, mover = np.unique(key, return_index=True, return_inverse=True)
    return mover.astype(np.int32), (cell[first] * CELL + middle).astype(np.float32), first


def _evenly(first: int, last: int, most: int | None) -> NDArray[np.int64]:
    """At most ``most`` whole numbers, evenly spaced in [first, last)."""
    total = last - first
    if most is None or total <= most:
        return np.arange(first, last)
    return first + ((np.arange(most) + 0.5) * total / most).astype(np.int64)


def _unit(weights: NDArray[np.float32]) -> NDArray[np.float32]:
    """Weights scaled to sum to 1, where they can be."""
    total = weights.sum(dtype=np.float64)
    return (weights / total).astype(np.float32) if total > 0 else weights


def _every(start: NDArray[np.int64], end: NDArray[np.int64], step: int) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Positions start, start + step, ... of each run, and always end - 1; and how many each run has."""
    length = end - start
    count = np.where(length > 0, -(-(length - 1) // step) + 1, 0)
    ends = np.cumsum(count)
    nth = np.arange(int(ends[-1]) if len(ends) else 0) - np.repeat(ends - count, count)
    return np.minimum(np.repeat(start, count) + nth * step, np.repeat(end - 1, count)), count


def _partners(geometry: Geometry) -> NDArray[np.int32]:
    """Position of the same key on the other side; of the element itself where there is none."""
    partner = np.arange(len(geometry.element_ids), dtype=np.int32)
    for i, element in enumerate(geometry.element_ids):
        key, side = element.rsplit("@", 1)
        other = geometry.index_of.get(f"{key}@{_OWN_MIRROR.get(side, side)}")
        if other is not None:
            partner[i] = other
    return partner
