"""Clearance: how far the lesion's edge is from each element."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage, spatial

from byway.knowledge.damage.core import BLOCK, CoreTable
from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.damage.rows import gather_rows, gather_runs

__all__ = ["clearance_mm"]

# From a block's centre to its farthest voxel centre, in voxels.
_REACH = (BLOCK - 1) / 2 * float(np.sqrt(3))
# Nearer than this (voxels) every voxel that could be the nearest is measured; farther, where the distance changes
# evenly over a block, only those that interpolation between block centres puts within the slack of the best.
_NEAR, _SLACK = 12.0, 0.5


def clearance_mm(voxels: NDArray[np.int64], index: DamageIndex) -> NDArray[np.float32]:
    """Signed distance from the lesion's edge to the nearest core streamline of a segment, or voxel of a parcel.

    Parameters
    ----------
    voxels : (L,) int64
        C-order indices of the lesion's voxels (D > 0), ascending.
    index : DamageIndex
        Inverted geometry, on a grid of cubic voxels.

    Returns
    -------
    (E,) float32
        Millimetres; positive outside (how far the edge would have to move to reach the element), negative inside (the
        depth of the deepest core point or parcel voxel). NaN where there is no lesion, or an element without core.

    Notes
    -----
    Distances run between voxel centres, less half a voxel, so that the edge lies on the face between a voxel inside
    and one outside. The distance at the centre of every block of 3 x 3 x 3 voxels bounds the search: no nearest voxel
    lies in a block that is farther than the best one by two half-diagonals. Up to 12 mm the answer is exact; beyond,
    the voxel measured may, next to a fold of the lesion's edge, be up to half a millimetre farther than the nearest.
    """
    core, grid = index.core, index.geometry.grid
    out = np.full(core.n_elements, np.nan)
    if len(voxels) == 0:
        return out.astype(np.float32)
    side_mm = float(np.cbrt(grid.voxel_ml * 1000))
    ijk = np.stack(np.unravel_index(voxels, grid.shape), axis=1)
    low = ijk.min(axis=0) - 1
    crop = np.zeros(ijk.max(axis=0) - low + 2, bool)
    place = tuple((ijk - low).T)
    crop[place] = True
    depth = ndimage.distance_transform_edt(crop)[place]

    inner = _deepest(core, index.row_of_voxel[voxels], depth)
    hit = inner > 0
    surface = ijk[depth < 1.001]
    outer = _nearest(core, ~hit, surface)
    out = np.where(hit, 0.5 - inner, outer - 0.5) * side_mm
    return np.where(np.isfinite(out), out, np.nan).astype(np.float32)


def _deepest(core: CoreTable, rows: NDArray[np.int32], depth: NDArray[np.float64]) -> NDArray[np.float64]:
    """The greatest depth (voxels) at which each element's core runs in the lesion; 0 where it does not."""
    order = np.argsort(depth)
    order = order[rows[order] >= 0]
    at, count = gather_rows(core.by_row, rows[order])
    deepest = np.zeros(core.n_elements)
    # Written in ascending order, so that the greatest stays.
    deepest[core.by_row.members[at]] = np.repeat(depth[order], count)
    return deepest


def _nearest(core: CoreTable, wanted: NDArray[np.bool_], surface: NDArray[np.int64]) -> NDArray[np.float64]:
    """Distance (voxels) from surface voxels to each wanted element's core; infinite for others."""
    best = np.full(core.n_elements, np.inf)
    groups = np.flatnonzero(wanted[core.group_element])
    if len(groups) == 0:
        return best
    at_centres = _distance_at_centres(surface, core.blocks)
    element, from_centre = core.group_element[groups], at_centres.reshape(-1)[core.group_block[groups]]
    least = _least(element, from_centre, core.n_elements)
    opened = from_centre <= least[element] + 2 * _REACH
    at, count = gather_runs(core.group_offsets, groups[opened])
    element, voxels = np.repeat(element[opened], count), core.voxels[at]

    far = least[element] > _NEAR
    guess = np.full(len(voxels), -np.inf)
    place = (voxels[far].T - (BLOCK - 1) / 2) / BLOCK
    guess[far] = ndimage.map_coordinates(at_centres, place, order=1, mode="nearest")
    kept = guess <= _least(element, guess, core.n_elements)[element] + _SLACK
    element, voxels = element[kept], voxels[kept]
    return _least(element, spatial.cKDTree(surface).query(voxels)[0], core.n_elements)


def _least(element: NDArray[np.int32], value: NDArray[np.floating], n_elements: int) -> NDArray[np.float64]:
    """The least value of each element (ascending in ``element``); infinite for those that do not occur."""
    least = np.full(n_elements, np.inf)
    starts = np.flatnonzero(np.diff(element, prepend=-1))
    if len(starts):
        least[element[starts]] = np.minimum.reduceat(value, starts)
    return least


def _distance_at_centres(surface: NDArray[np.int64], blocks: tuple[int, ...]) -> NDArray[np.float32]:
    """Exact distance (voxels) from every block's centre to the nearest surface voxel.

    Squared distances are a sum over axes, so the least is found axis by axis, over the lesion's extent alone.
    """
    low = surface.min(axis=0)
    extent = surface.max(axis=0) - low + 1
    there = np.zeros(extent, bool)
    there[tuple((surface - low).T)] = True
    squared = np.where(there, np.float32(0), np.float32(np.inf))
    for axis in (2, 1, 0):
        centres = np.arange(blocks[axis]) * BLOCK + (BLOCK - 1) // 2 - low[axis]
        squared = np.moveaxis(squared, axis, 0)
        reached = np.full((len(centres), *squared.shape[1:]), np.inf, np.float32)
        for step in range(len(squared)):
            along = ((centres - step) ** 2).astype(np.float32)
            np.minimum(reached, squared[step] + along[:, None, None], out=reached)
        squared = np.moveaxis(reached, 0, axis)
    return np.sqrt(squared)
