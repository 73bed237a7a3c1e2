"""The core of every element, arranged for distance queries."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.damage.rows import Rows
from byway.knowledge.space.geometry import Geometry

__all__ = ["BLOCK", "CoreTable"]

BLOCK = 3  # voxels along the side of a search block; odd, so that its centre is a voxel


@dataclass(frozen=True, eq=False)
class CoreTable:
    """Voxels of every element's core: of core streamlines, or of a parcel (membership of at least one half).

    Parameters
    ----------
    n_elements : int
        Number of elements, E.
    by_row : Rows
        Elements whose core passes the voxel of each row of the index.
    group_element, group_block : (K,) int32
        A group is what one element's core has in one block of ``BLOCK`` voxels a side; groups ascend by element, and
        blocks are counted in C order.
    group_offsets : (K + 1,) int64
        Bounds of each group in ``voxels``.
    voxels : (M, 3) int16
        Voxel indices of all groups.
    blocks : tuple of int
        Blocks along each axis of the grid.
    """

    n_elements: int
    by_row: Rows = field(repr=False)
    group_element: NDArray[np.int32] = field(repr=False)
    group_block: NDArray[np.int32] = field(repr=False)
    group_offsets: NDArray[np.int64] = field(repr=False)
    voxels: NDArray[np.int16] = field(repr=False)
    blocks: tuple[int, ...]

    @classmethod
    def build(
        cls,
        geometry: Geometry,
        voxel_of_row: NDArray[np.int32],
        streamlines: Rows,
        segment_of_streamline: NDArray[np.int32],
        regions: Rows,
    ) -> CoreTable:
        """Arrange the cores of an index's geometry."""
        n_regions = len(geometry.region_ids)
        segments = streamlines.chosen(geometry.core[streamlines.members])
        segments = Rows(segments.offsets, segment_of_streamline[segments.members]).without_repeats(shift=n_regions)
        if regions.weights is not None:
            regions = regions.chosen(regions.weights >= 0.5)
        # Both tables have the same rows; regions come first in every row.
        counts = [np.diff(table.offsets) for table in (regions, segments)]
        row = np.concatenate([np.repeat(np.arange(len(c)), c) for c in counts])
        element = np.concatenate([regions.members, segments.members])
        order = np.argsort(row, kind="stable")
        row, element = row[order], element[order]
        offsets = np.concatenate([[0], np.cumsum(counts[0] + counts[1])]).astype(np.int32)

        shape = geometry.grid.shape
        ijk = np.stack(np.unravel_index(voxel_of_row, shape), axis=1).astype(np.int16)
        blocks = tuple(-(-n // BLOCK) for n in shape)
        block_of_row = np.asarray(np.ravel_multi_index(tuple((ijk // BLOCK).T), blocks))
        n_blocks = int(np.prod(blocks))
        key = element.astype(np.int64) * n_blocks + block_of_row[row]
        order = np.argsort(key)
        key, row_sorted = key[order], row[order]
        first = np.flatnonzero(np.diff(key, prepend=-1))
        return cls(
            n_elements=len(geometry.element_ids),
            by_row=Rows(offsets, element),
            group_element=(key[first] // n_blocks).astype(np.int32),
            group_block=(key[first] % n_blocks).astype(np.int32),
            group_offsets=np.append(first, len(key)),
            voxels=ijk[row_sorted],
            blocks=blocks,
        )
