"""The part of a sample that any draw could bring to a lesion, and what it meets there, draw by draw.

This is the ensemble's inner loop. It works through the points in parts small enough for the processor's cache.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage

from byway.knowledge.damage.anatomies import Anatomies
from byway.knowledge.damage.sample import CELL, Sample
from byway.knowledge.damage.words import EffectWords

__all__ = ["NearPart", "NearSample"]

_PART_POINTS = 24_000
_COARSE = 2  # voxels along the side of the blocks on which reach is judged

Words = NDArray[np.unsignedinteger]


@dataclass(frozen=True, eq=False)
class NearPart:
    """Whole elements of a near sample.

    Parameters
    ----------
    base, mover : (P,) int64
        Place of each point in the padded box (C order), and which of the displacements moves it.
    group_starts : (K,) int64
        First point of each group; as many leading groups as ``alone`` have one point.
    group_weight : (K,) float32
        Weight of each group in its element's share.
    element_starts, elements : (F,) int64
        First group of each element, and its position among all elements.
    last : int
        Points in this part and all before it.
    """

    base: NDArray[np.int64] = field(repr=False)
    mover: NDArray[np.int64] = field(repr=False)
    group_starts: NDArray[np.int64] = field(repr=False)
    group_weight: NDArray[np.float32] = field(repr=False)
    element_starts: NDArray[np.int64] = field(repr=False)
    elements: NDArray[np.int64] = field(repr=False)
    alone: int
    last: int

    def words(
        self, volumes: Sequence[Words], draws_of_shift: Sequence[NDArray[np.int64]], offset: NDArray[np.int64]
    ) -> Words:
        """OR of the words that each group meets in every draw, (M, K).

        Parameters
        ----------
        volumes : sequence of (V,) unsigned integer arrays
            Padded word volumes, flat, one for each boundary shift.
        draws_of_shift : sequence of int arrays
            The draws that have each shift.
        offset : (M, C) int64
            Displacements in steps of the flat volume.
        """
        met = np.empty((len(offset), len(self.group_starts)), volumes[0].dtype)
        at, found = np.empty(len(self.base), np.int64), np.empty(len(self.base), met.dtype)
        together = self.group_starts[self.alone :] - self.alone
        for volume, draws in zip(volumes, draws_of_shift, strict=True):
            for draw in draws:
                # Every index is in range by construction; "clip" spares take the buffer of "raise".
                np.take(offset[draw], self.mover, out=at, mode="clip")
                at += self.base
                np.take(volume, at, out=found, mode="clip")
                met[draw, : self.alone] = found[: self.alone]
                if len(together):
                    np.bitwise_or.reduceat(found[self.alone :], together, out=met[draw, self.alone :])
        return met

    def shares(self, effects: NDArray[np.float32]) -> NDArray[np.float32]:
        """Weighted sums over each element of its groups' D, (M, F); ``effects`` is (M, K)."""
        shares = np.add.reduceat(effects * self.group_weight, self.element_starts, axis=1)
        return np.minimum(shares, np.float32(1))


@dataclass(frozen=True, eq=False)
class NearSample:
    """Points of a sample that can meet a lesion in some draw. Fields as in :class:`NearPart`, for all of them.

    Parameters
    ----------
    pad : int
        Voxels added on each side of the words' box, so that no displacement leaves it.
    shape : tuple of int
        Shape of the padded box.
    mover_centre, mover_element, mover_spread
        Where, whose, and by how much (voxels) each displacement is.
    """

    pad: int
    shape: tuple[int, ...]
    base: NDArray[np.int64] = field(repr=False)
    mover: NDArray[np.int64] = field(repr=False)
    mover_centre: NDArray[np.float32] = field(repr=False)
    mover_element: NDArray[np.int32] = field(repr=False)
    mover_spread: NDArray[np.float64] = field(repr=False)
    group_starts: NDArray[np.int64] = field(repr=False)
    group_weight: NDArray[np.float32] = field(repr=False)
    element_starts: NDArray[np.int64] = field(repr=False)
    elements: NDArray[np.int64] = field(repr=False)

    @classmethod
    def build(cls, sample: Sample, words: EffectWords, anatomies: Anatomies, spread_scale: float) -> NearSample:
        """Pick the points within reach; ``spread_scale`` takes the sample's spread to voxels."""
        spread = sample.spread_mm.astype(float) * spread_scale
        reach = anatomies.reach(spread).astype(np.int64)[sample.mover_element]
        pad = int(reach.max(initial=0))
        shape = tuple(n + 2 * pad for n in words.volumes[0].shape)
        distance = _block_distance(words, pad)
        origin = words.origin - pad
        # Whole cells first, by the box alone, then points.
        from_box = sample.mover_centre - origin
        slack = CELL // 2 + 1
        near = np.asarray(((from_box >= -slack) & (from_box < np.array(shape) + slack)).all(axis=1))
        kept = np.flatnonzero(near[sample.mover])
        mover, place = sample.mover[kept], sample.voxels[kept] - origin
        inside = ((place >= 0) & (place < shape)).all(axis=1)
        kept, mover, place = kept[inside], mover[inside], place[inside]
        # Displacements are bounded along each axis; so is the distance between two blocks.
        inside = distance[tuple((place // _COARSE).T)] <= reach[mover]
        kept, mover, place = kept[inside], mover[inside], place[inside].astype(np.int64)

        group = np.searchsorted(sample.group_offsets, kept, side="right") - 1
        group_starts = np.flatnonzero(np.diff(group, prepend=-1))
        groups = group[group_starts]
        element = sample.group_element[groups]
        element_starts = np.flatnonzero(np.diff(element, prepend=-1))
        used = np.zeros(len(near), bool)
        used[mover] = True
        return cls(
            pad=pad,
            shape=shape,
            base=np.asarray(np.ravel_multi_index(tuple(place.T), shape), np.int64),
            mover=(np.cumsum(used) - 1)[mover],
            mover_centre=sample.mover_centre[used],
            mover_element=sample.mover_element[used],
            mover_spread=spread[sample.mover_element[used]],
            group_starts=group_starts,
            group_weight=sample.group_weight[groups],
            element_starts=element_starts,
            elements=element[element_starts].astype(np.int64),
        )

    def offsets(self, anatomies: Anatomies, sample: Sample) -> NDArray[np.int64]:
        """Displacement of each mover in each draw, (M, C), in steps of the flat padded box."""
        move = anatomies.displacements(
            self.mover_centre, self.mover_element, self.mover_spread, sample.partner, sample.shape, sample.label
        )
        along_x, along_y, along_z = move.T.astype(np.int64)
        return np.ascontiguousarray(((along_x * self.shape[1] + along_y) * self.shape[2] + along_z).T)

    def parts(self) -> Iterator[NearPart]:
        """Runs of whole elements of about equal numbers of points."""
        ends = np.append(self.element_starts, len(self.group_starts))
        points = np.append(self.group_starts, len(self.base))
        first = 0
        while first < len(self.elements):
            goal = points[ends[first]] + _PART_POINTS
            last = max(first + 1, int(np.searchsorted(points[ends], goal, side="right")) - 1)
            groups = slice(ends[first], ends[last])
            low, high = points[ends[first]], points[ends[last]]
            starts = self.group_starts[groups] - low
            several = np.flatnonzero(np.diff(starts, append=high - low) != 1)
            yield NearPart(
                base=self.base[low:high],
                mover=self.mover[low:high],
                group_starts=starts,
                group_weight=self.group_weight[groups],
                element_starts=self.element_starts[first:last] - ends[first],
                elements=self.elements[first:last],
                # The voxels of parcels come first; each is a group of its own, and needs no OR.
                alone=int(several[0]) if len(several) else len(starts),
                last=int(high),
            )
            first = last


def _block_distance(words: EffectWords, pad: int) -> NDArray[np.int64]:
    """Least distance along the farthest axis (voxels) from a voxel of each block of the padded box to any effect."""
    anywhere = np.pad(np.logical_or.reduce([volume != 0 for volume in words.volumes]), pad)
    extra = [(0, -n % _COARSE) for n in anywhere.shape]
    blocks = np.pad(anywhere, extra)
    for axis in range(3):
        blocks = np.logical_or.reduceat(blocks, np.arange(0, blocks.shape[axis], _COARSE), axis=axis)
    apart = ndimage.distance_transform_cdt(~blocks, "chessboard").astype(np.int64)
    return np.asarray(np.maximum(0, (apart - 1) * _COARSE + 1) * (apart > 0))
