"""The damage index: which streamlines and parcels lie at a voxel, so that cost follows the lesion and not the brain."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from byway.knowledge.damage.core import CoreTable
from byway.knowledge.damage.rows import Rows
from byway.knowledge.damage.sample import Sample
from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.lesion.distance import squared_distance
from byway.knowledge.space.geometry import Geometry

__all__ = ["DamageIndex"]

_CHUNK = 1_000_000
_CHARTED_MM = 1.5


@dataclass(frozen=True, eq=False)
class DamageIndex:
    """Geometry, inverted: for every voxel the streamlines, segments and parcels that lie there.

    Parameters
    ----------
    geometry : Geometry
        What it was built from; per-element arrays follow ``geometry.element_ids``.
    row_of_voxel : (V,) int32
        Row of each voxel of the grid (C order) in the ragged tables; -1 where nothing lies.
    voxel_of_row : (N,) int32
        The inverse of it.
    streamlines : Rows
        Streamlines that have a point in the voxel.
    segments : Rows
        Segments that have one, as element positions.
    regions : Rows
        Regions whose parcel holds the voxel, as element positions, with their membership weights.

    Notes
    -----
    Built in about a second for two hundred segments of two hundred streamlines. Use :meth:`build`.
    """

    geometry: Geometry
    row_of_voxel: NDArray[np.int32] = field(repr=False)
    voxel_of_row: NDArray[np.int32] = field(repr=False)
    streamlines: Rows = field(repr=False)
    segments: Rows = field(repr=False)
    regions: Rows = field(repr=False)

    @classmethod
    def build(cls, geometry: Geometry) -> DamageIndex:
        """Invert a geometry.

        Raises
        ------
        BywayError
            A point is not finite. Points outside the grid are allowed: no lesion reaches them.
        """
        grid = geometry.grid
        n_streamlines = len(geometry.streamline_offsets) - 1
        n_regions, n_segments = len(geometry.region_ids), len(geometry.segment_ids)
        voxel, offsets = _visited_voxels(geometry)
        parcel_voxels = geometry.region_voxels.astype(np.int64)
        occupied = np.zeros(grid.size, bool)
        occupied[voxel] = True
        occupied[parcel_voxels] = True
        used = np.flatnonzero(occupied)
        row_of_voxel = np.full(grid.size, -1, np.int32)
        row_of_voxel[used] = np.arange(len(used), dtype=np.int32)

        by_streamline = sparse.csr_matrix(
            (np.ones(len(voxel), bool), row_of_voxel[voxel], offsets), shape=(n_streamlines, len(used))
        )
        # The same rows, cut at the segments' bounds instead of the streamlines'.
        by_segment = sparse.csr_matrix(
            (by_streamline.data, by_streamline.indices, offsets[geometry.segment_offsets]),
            shape=(n_segments, len(used)),
        )
        segments = Rows.inverted(by_segment)
        streamlines = Rows.inverted(by_streamline)
        by_region = sparse.csr_matrix(
            (geometry.region_weights, row_of_voxel[parcel_voxels], geometry.region_offsets),
            shape=(n_regions, len(used)),
        )
        return cls(
            geometry=geometry,
            row_of_voxel=row_of_voxel,
            voxel_of_row=used.astype(np.int32),
            streamlines=streamlines,
            segments=segments.without_repeats(shift=n_regions),
            regions=Rows.inverted(by_region, weighted=True),
        )

    @cached_property
    def segment_of_streamline(self) -> NDArray[np.int32]:
        """Position among the segments (not the elements) of each streamline's segment."""
        counts = np.diff(self.geometry.segment_offsets)
        return np.repeat(np.arange(len(counts), dtype=np.int32), counts)

    @cached_property
    def core(self) -> CoreTable:
        """Core of every element, for clearance; built when first asked for."""
        return CoreTable.build(
            self.geometry, self.voxel_of_row, self.streamlines, self.segment_of_streamline, self.regions
        )

    @cached_property
    def sample(self) -> Sample:
        """The ensemble's usual sample; built when first asked for."""
        return Sample.build(self.geometry)

    @cached_property
    def charted(self) -> NDArray[np.bool_]:
        """Voxels within 1.5 mm of one that a streamline of any segment passes; built when first asked for.

        The reach closes the gaps between the streamlines of one bundle, which stand for all of its fibres.
        """
        grid = self.geometry.grid
        passed = np.zeros(grid.size, bool)
        passed[self.voxel_of_row[np.diff(self.segments.offsets) > 0]] = True
        reach = _CHARTED_MM / float(np.cbrt(grid.voxel_ml * 1000))
        near = squared_distance(passed.reshape(grid.shape), int(np.ceil(reach)))
        return np.asarray(near <= reach**2)

    @cached_property
    def region_weight(self) -> NDArray[np.float64]:
        """Summed membership of each parcel."""
        return _sums(self.geometry.region_weights, self.geometry.region_offsets)

    @cached_property
    def segment_weight(self) -> NDArray[np.float64]:
        """Summed weight of each segment's streamlines."""
        return _sums(self.geometry.streamline_weights, self.geometry.segment_offsets)


def _sums(values: NDArray[np.float32], offsets: NDArray[np.int64]) -> NDArray[np.float64]:
    """Sums of consecutive runs; 0 for an empty run."""
    running = np.concatenate([[0.0], np.cumsum(values, dtype=np.float64)])
    return np.asarray(running[offsets[1:]] - running[offsets[:-1]])


def _chunks(total: int) -> Iterator[slice]:
    """Slices that cover ``total``, so that scratch memory stays small."""
    for first in range(0, total, _CHUNK):
        yield slice(first, min(first + _CHUNK, total))


def _visited_voxels(geometry: Geometry) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Voxels that each streamline passes in turn, without pauses, and the streamlines' bounds in that list."""
    points = geometry.points_mm
    voxel = np.empty(len(points), np.int64)
    for part in _chunks(len(points)):
        if not np.isfinite(points[part]).all():
            raise BywayError(Fault("streamline-points", "geometry", "a streamline point that is not a finite number"))
        voxel[part] = geometry.grid.flat_index(points[part])
    moved = np.ones(len(points), bool)
    moved[1:] = voxel[1:] != voxel[:-1]
    starts = geometry.streamline_offsets[:-1]
    moved[starts[starts < len(points)]] = True
    moved &= voxel >= 0
    kept = np.concatenate([[0], np.cumsum(moved)])
    return voxel[moved], kept[geometry.streamline_offsets]
