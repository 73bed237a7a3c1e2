"""Clearance: how far the lesion's edge is from each element."""

from __future__ import annotations

import numpy as np
from byway.knowledge.damage.core import BLOCK, CoreTable
from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.damage.rows import gather_rows, gather_runs
from numpy.typing import NDArray
from scipy import ndimage, spatial

__all__ = ["clearance_mm"]

# From a block's centre to its farthest voxel centre, in voxels.
_REACH = (BLOCK - 1) / 2 * np.sqrt(3)


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
    and one outside. Blocks of voxels bound the search: no element's nearest voxel lies in a block that is farther
    than the best one found. Within the blocks that are left the answer is exact.
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
    outer = _nearest(core, ~hit, spatial.cKDTree(surface))
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


def _nearest(core: CoreTable, wanted: NDArray[np.bool_], tree: spatial.cKDTree) -> NDArray[np.float64]:
    """Distance (voxels) from the tree's points to each wanted element's core; infinite for others."""
    best = np.full(core.n_elements, np.inf)
    groups = np.flatnonzero(wanted[core.group_element])
    if len(groups) == 0:
        return best
    blocks, block = np.unique(core.group_block[groups], return_inverse=True)
    to_block = tree.query(core.block_centres[blocks])[0][block]
    element = core.group_element[groups]
    # The block nearest by its centre gives each element a first, attained distance ...
    order = np.lexsort((to_block, element))
    first = order[np.flatnonzero(np.diff(element[order], prepend=-1))]
    _update(best, core, groups[first], tree)
    # ... and only blocks that could hold something nearer are opened.
    rest = np.ones(len(groups), bool)
    rest[first] = False
    rest &= to_block - _REACH < best[element]
    _update(best, core, groups[rest], tree)
    return best


def _update(best: NDArray[np.float64], core: CoreTable, groups: NDArray[np.int64], tree: spatial.cKDTree) -> None:
    """Lower ``best`` by the exact distances of the voxels of some groups."""
    if len(groups) == 0:
        return
    at, count = gather_runs(core.group_offsets, groups)
    distance = tree.query(core.voxels[at])[0]
    starts = np.concatenate([[0], np.cumsum(count)[:-1]])
    np.minimum.at(best, core.group_element[groups], np.minimum.reduceat(distance, starts))
