"""Geometry of every element, packed into flat arrays: what damage is reckoned on.

Values only: how it is built (template) or loaded (a site's own atlas, a person's tractogram) lives beside this.
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.space.grid import Grid

__all__ = ["Geometry"]


@dataclass(frozen=True)
class Geometry:
    """Parcels and bundles of all elements, on one grid.

    Parameters
    ----------
    grid : Grid
        Grid and space of the voxel indices and mm coordinates.
    region_ids, segment_ids : tuple of str
        Element ids ``key@side``. In every per-element array regions come first, then segments.
    region_voxels : (V,) int32
        C-order voxel indices of all parcels, concatenated.
    region_weights : (V,) float32
        Membership in (0, 1] of each voxel in its parcel (1 for hard parcels).
    region_offsets : (R + 1,) int64
        Parcel ``r`` is ``region_voxels[region_offsets[r]:region_offsets[r + 1]]``.
    points_mm : (P, 3) float32
        Points of all streamlines, MNI mm, at most 1 mm apart, ordered from the segment's first place to its second.
    streamline_offsets : (S + 1,) int64
        Streamline ``s`` is ``points_mm[streamline_offsets[s]:streamline_offsets[s + 1]]``.
    segment_offsets : (G + 1,) int64
        Segment ``g`` owns streamlines ``segment_offsets[g]`` to ``segment_offsets[g + 1]``.
    core : (S,) bool
        Whether a streamline belongs to the segment's core (else to its fringe).
    streamline_weights : (S,) float32
        Weight of each streamline in its segment's severed share (1 for the template).
    spread_mm : (R + G,) float32
        Between-subject spread (standard deviation of displacement, mm) of each element.
    anatomy : tuple of str
        Whose anatomy each element rests on: ``"template"`` or the name of a site's atlas or a person's tractogram.
    content_hash : str
        Hash of all that this was built from.
    """

    grid: Grid
    region_ids: tuple[str, ...]
    segment_ids: tuple[str, ...]
    region_voxels: NDArray[np.int32]
    region_weights: NDArray[np.float32]
    region_offsets: NDArray[np.int64]
    points_mm: NDArray[np.float32]
    streamline_offsets: NDArray[np.int64]
    segment_offsets: NDArray[np.int64]
    core: NDArray[np.bool_]
    streamline_weights: NDArray[np.float32]
    spread_mm: NDArray[np.float32]
    anatomy: tuple[str, ...]
    content_hash: str

    @cached_property
    def element_ids(self) -> tuple[str, ...]:
        """All element ids, regions first."""
        return self.region_ids + self.segment_ids

    @cached_property
    def index_of(self) -> dict[str, int]:
        """Position of each element id in per-element arrays."""
        return {element: i for i, element in enumerate(self.element_ids)}

    def parcel_voxels(self, region: int) -> NDArray[np.int32]:
        """C-order voxel indices of one parcel."""
        return self.region_voxels[self.region_offsets[region] : self.region_offsets[region + 1]]

    def streamlines(self, segment: int) -> list[NDArray[np.float32]]:
        """Streamlines of one segment, each (n, 3) in MNI mm."""
        first, last = self.segment_offsets[segment], self.segment_offsets[segment + 1]
        bounds = self.streamline_offsets[first : last + 1]
        return [self.points_mm[a:b] for a, b in itertools.pairwise(bounds)]
