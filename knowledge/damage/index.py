"""The damage index: which streamlines and parcels lie at a voxel, so that cost follows the lesion and not the brain."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

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
    members : Rows
        What lies at the voxel of each row, by one number: ``r`` for region r, ``R + g`` for segment g, and
        ``E + s`` for streamline s (R regions, E elements). Weights are memberships of parcels, and 1 for others.

    Notes
    -----
    Built in about a second for two hundred segments of two hundred streamlines. Use :meth:`build`.
    """

    geometry: Geometry
    row_of_voxel: NDArray[np.int32] = field(repr=False)
    voxel_of_row: NDArray[np.int32] = field(repr=False)
    members: Rows = field(repr=False)

    @classmethod
    def build(cls, geometry: Geometry) -> DamageIndex:
        """Invert a geometry.

        Raises
        ------
        BywayError
            A point is not finite. Points outside the grid are allowed: no lesion reaches them.
        """
        grid = geometry.grid
        voxel, offsets = _visited_voxels(geometry)
        parcel_voxels = geometry.region_voxels.astype(np.int64)
        occupied = np.zeros(grid.size, bool)
        occupied[voxel] = True
        occupied[parcel_voxels] = True
        used = np.flatnonzero(occupied)
        row_of_voxel = np.full(grid.size, -1, np.int32)
        row_of_voxel[used] = np.arange(len(used), dtype=np.int32)

        n_rows = len(used)
        by_streamline = _table(row_of_voxel[voxel], offsets, n_rows)
        # The same list, cut at the segments' bounds instead of the streamlines'.
        by_segment = _table(row_of_voxel[voxel], offsets[geometry.segment_offsets], n_rows)
        by_segment.sum_duplicates()
        by_region = _table(row_of_voxel[parcel_voxels], geometry.region_offsets, n_rows)
        weights = geometry.region_weights
        hard = bool((weights == 1).all())
        if not hard:
            by_region.data = weights.astype(np.float32)
            by_segment.data = np.ones(by_segment.nnz, np.float32)
            by_streamline.data = np.ones(by_streamline.nnz, np.float32)
        every = sparse.vstack([by_region, by_segment, by_streamline], format="csr")
        return cls(
            geometry=geometry,
            row_of_voxel=row_of_voxel,
            voxel_of_row=used.astype(np.int32),
            members=Rows.inverted(every, weighted=not hard),
        )

    @cached_property
    def streamlines(self) -> Rows:
        """Streamlines at the voxel of each row."""
        chosen = self.members.chosen(self.members.members >= len(self.geometry.element_ids))
        return Rows(chosen.offsets, chosen.members - np.int32(len(self.geometry.element_ids)))

    @cached_property
    def segments(self) -> Rows:
        """Segments at the voxel of each row, as element positions."""
        members = self.members.members
        inside = (members >= len(self.geometry.region_ids)) & (members < len(self.geometry.element_ids))
        return self.members.chosen(inside)

    @cached_property
    def regions(self) -> Rows:
        """Regions at the voxel of each row, with their weights where parcels are graded."""
        return self.members.chosen(self.members.members < len(self.geometry.region_ids))

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
    def streamline_share(self) -> NDArray[np.float64]:
        """Weight of each streamline as a share of its segment's; 0 in a segment without weight."""
        weights = self.geometry.streamline_weights
        whole = _sums(weights, self.geometry.segment_offsets)[self.segment_of_streamline]
        return np.asarray(np.divide(weights, whole, out=np.zeros(len(whole)), where=whole > 0))

    def severed(self, cut: NDArray[Any]) -> NDArray[np.float64]:
        """Severed share of each segment, given the largest D along every streamline."""
        shares = np.zeros(len(self.geometry.segment_ids))
        filled, starts = self._filled_segments
        if len(starts):
            shares[filled] = np.add.reduceat(self.streamline_share * cut, starts)
        return shares

    @cached_property
    def _filled_segments(self) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
        """Segments that have streamlines, and the first of each."""
        offsets = np.array(self.geometry.segment_offsets)
        filled = np.flatnonzero(np.diff(offsets) > 0)
        return filled, offsets[filled]

    @cached_property
    def voxel_ml(self) -> float:
        """Volume of a voxel in ml."""
        return self.geometry.grid.voxel_ml


def _table(rows: NDArray[np.int32], offsets: NDArray[np.int64], n_rows: int) -> sparse.csr_matrix:
    """Sparse matrix of (member, row) from the concatenated rows of all members."""
    return sparse.csr_matrix(
        (np.ones(len(rows), np.int8), rows, offsets.astype(np.int32)), shape=(len(offsets) - 1, n_rows)
    )


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
