"""Virtual anatomies: random but repeatable displacements of elements against the lesion.

A draw is one person and one registration. Half of the variance of an element's displacement is a smooth field that
all elements in that place share, half is the element's own; a rigid jitter of the registration is added.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse, special

__all__ = ["Anatomies", "normal_levels"]

_NODE = 30.0  # distance between the nodes of the shared field, voxels: it is smooth over about this length
_CAP = 2.5  # no displacement is longer than so many standard deviations along an axis


def normal_levels(count: int) -> NDArray[np.float64]:
    """``count`` equally likely values with mean 0 and standard deviation 1 that stand for a normal distribution.

    Examples
    --------
    >>> normal_levels(3).round(3).tolist()
    [-1.225, 0.0, 1.225]
    """
    levels = special.ndtri((np.arange(count) + 0.5) / count)
    levels = (levels - levels[::-1]) / 2  # exactly symmetric
    scale = np.sqrt(np.mean(levels**2))
    return np.asarray(levels / scale if scale > 0 else levels)


@dataclass(frozen=True)
class Anatomies:
    """Random numbers of M draws, the same for every lesion.

    Every second half of the draws mirrors the first half, left for right, so that a mirrored lesion has mirrored
    intervals to the last digit (an odd draw at the end stands alone).

    Parameters
    ----------
    draws : int
        Number of draws, M.
    seed : int
        Seed.
    jitter_mm, jitter_deg : float
        Standard deviation along and about each axis of the registration's rigid error.
    """

    draws: int
    seed: int
    jitter_mm: float
    jitter_deg: float

    def displacements(
        self,
        centre: NDArray[np.floating],
        element: NDArray[np.integer],
        spread: NDArray[np.floating],
        partner: NDArray[np.integer],
        shape: tuple[int, int, int],
        label: NDArray[np.integer] | None = None,
    ) -> NDArray[np.int16]:
        """Displacements in whole voxels.

        Parameters
        ----------
        centre : (C, 3) float array
            Where, in voxels.
        element : (C,) int array
            Whose.
        spread : (C,) float array
            Standard deviation along each axis of the between-subject displacement, voxels.
        partner : (E,) int array
            The element on the other side.
        shape : tuple of int
            Shape of the grid; its middle along the first axis is the midline.
        label : (E,) int array, optional
            What seeds each element's own part; its position where None. With labels that come of the elements' ids,
            one element more or less leaves the draws of the others as they are.

        Returns
        -------
        (M, C, 3) int16
        """
        half = (self.draws + 1) // 2
        rng = np.random.default_rng(self.seed)
        nodes = tuple(int(np.ceil(n / _NODE)) + 3 for n in shape)
        field = rng.standard_normal((3, int(np.prod(nodes)), half), np.float32)
        shift = rng.standard_normal((3, half), np.float32) * np.float32(self.jitter_mm)
        turn = rng.standard_normal((3, half), np.float32) * np.float32(np.deg2rad(self.jitter_deg))
        own = self._own(np.union1d(element, partner[element]), len(partner), label)
        middle = (np.array(shape) - 1) / 2.0

        limit = self.reach(spread).astype(np.float32)[:, None]
        size = (np.sqrt(0.5) * np.asarray(spread, float)).astype(np.float32)[:, None]
        # Draws run fastest in memory, so that every step below is one pass over a plain block.
        out = np.empty((3, len(centre), self.draws), np.int16)
        for mirrored in range(2):
            count = half if mirrored == 0 else self.draws - half
            at = ((centre - middle) * ([-1, 1, 1] if mirrored else [1, 1, 1])).astype(np.float32)
            whose = partner[element] if mirrored else element
            weight = _interpolation(at, nodes)
            for axis in range(3):
                move = weight @ field[axis]
                move += own[axis][whose]
                move *= size
                move += shift[axis]
                # A small turn w takes a place r to r + w x r.
                after, before = (axis + 1) % 3, (axis + 2) % 3
                move += np.stack([at[:, before], -at[:, after]], axis=1) @ turn[[after, before]]
                np.rint(move, out=move)
                np.clip(move, -limit, limit, out=move)
                if mirrored and axis == 0:
                    np.negative(move, out=move)
                out[axis, :, half * mirrored : half * mirrored + count] = move[:, :count]
        return out.transpose(2, 1, 0)

    def _own(
        self, elements: NDArray[np.integer], count: int, label: NDArray[np.integer] | None
    ) -> NDArray[np.float32]:
        """Own part of the displacement of some elements, (3, E, half); zero for the others."""
        half = (self.draws + 1) // 2
        own = np.zeros((3, count, half), np.float32)
        for element in elements:
            seed = int(element if label is None else label[element])
            own[:, element] = np.random.default_rng([self.seed, 2, seed]).standard_normal((3, half), np.float32)
        return own

    def reach(self, spread: NDArray[np.floating]) -> NDArray[np.float64]:
        """Longest displacement along an axis, voxels, that is possible for a spread (voxels); longer ones are cut."""
        rigid = self.jitter_mm**2 + (np.deg2rad(self.jitter_deg) * 70) ** 2
        return np.asarray(np.ceil(_CAP * np.sqrt(np.asarray(spread, float) ** 2 + rigid)), float)


def _interpolation(at: NDArray[np.floating], nodes: tuple[int, ...]) -> sparse.csr_matrix:
    """Weights (C, N) of the shared field's nodes at places given in voxels from the middle; unit variance."""
    place = at / _NODE + (np.array(nodes) - 1) / 2
    place = np.clip(place, 0, np.array(nodes) - 1.001)
    low = np.floor(place).astype(int)
    part = place - low
    columns, weights = [], []
    for corner in np.ndindex(2, 2, 2):
        columns.append(np.ravel_multi_index((low + corner).T, nodes))
        weights.append(np.prod(np.where(corner, part, 1 - part), axis=1))
    weight = np.stack(weights, axis=1)
    weight /= np.sqrt((weight**2).sum(axis=1, keepdims=True))
    rows = np.repeat(np.arange(len(at)), 8)
    matrix = sparse.csr_matrix(
        (weight.ravel(), (rows, np.stack(columns, axis=1).ravel())), shape=(len(at), int(np.prod(nodes)))
    )
    return matrix.astype(np.float32)
