"""Regions: parcels grown from seeds over the template's grey matter.

All regions of the left half grow at once, as fronts over a graph of voxels; each voxel goes to the front that
arrives first, and a region keeps its earliest voxels up to its volume. Fluid is slow, so fronts do not jump the
Sylvian fissure, the falx or the tentorium. The template is symmetric, so the right side is the mirror of the left.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage

from byway.knowledge.graph.records import Region
from byway.knowledge.space.front import voxel_graph
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.space.template import brain_mask, template_volume

__all__ = ["grow_parcels", "mirror_flat"]

_MIDLINE = int(TEMPLATE_GRID.to_voxel(np.zeros((1, 3)))[0, 0])
_GREY = 0.2


def mirror_flat(flat: NDArray[np.integer]) -> NDArray[np.int32]:
    """C-order voxel indices of the mirror images (x to -x) of some voxels of the template grid, sorted."""
    i, j, k = np.unravel_index(np.asarray(flat), TEMPLATE_GRID.shape)
    mirrored = np.ravel_multi_index((2 * _MIDLINE - i, j, k), TEMPLATE_GRID.shape)
    return np.sort(mirrored).astype(np.int32)


def grow_parcels(regions: Mapping[str, Region]) -> dict[str, NDArray[np.int32]]:
    """Grow every region from its seeds.

    Parameters
    ----------
    regions : mapping of key to Region
        Seeds on the left (x < 0) or the midline, MNI mm; ``volume_ml`` is the volume of one side.

    Returns
    -------
    dict of element id to (n,) int32
        Sorted C-order voxel indices on ``TEMPLATE_GRID``; two entries for a paired region, mirror images.
    """
    keys = list(regions)
    half = slice(0, _MIDLINE + 1)
    grey, brain = template_volume("gm")[half], brain_mask()[half]
    seeds = [(owner, seed) for owner, key in enumerate(keys) for seed in regions[key].seeds_mni if seed[0] <= 0]
    owner = np.array([o for o, _ in seeds])
    voxel = np.rint(TEMPLATE_GRID.to_voxel(np.array([s for _, s in seeds]))).astype(int)
    domain = brain & (grey > _GREY)
    white = np.array([regions[key].tissue == "white_matter" for key in keys])
    domain[tuple(voxel[white[owner]].T)] = True
    cost = 1.0 + 3.0 * (1.0 - np.clip((grey - _GREY) / 0.5, 0.0, 1.0))
    graph = voxel_graph(domain, cost)
    nearest = ndimage.distance_transform_edt(~domain, return_distances=False, return_indices=True)
    node = graph.node_of[tuple(nearest[(slice(None), *voxel.T)])]
    arrival, winner = graph.compete(owner, node.astype(np.int64), np.full(len(keys), 1.0))
    flat = np.flatnonzero(_in_full(domain))
    parcels: dict[str, NDArray[np.int32]] = {}
    for number, key in enumerate(keys):
        region = regions[key]
        own = np.flatnonzero(winner == number)
        own = own[np.argsort(arrival[own], kind="stable")]
        paired = region.sides == "paired"
        own = own[: max(1, round(region.volume_ml * 1000 * (1.0 if paired else 0.5)))]
        left = np.sort(flat[own]).astype(np.int32)
        if paired:
            left = left[_x_index(left) < _MIDLINE]
            parcels[f"{key}@left"], parcels[f"{key}@right"] = left, mirror_flat(left)
        else:
            parcels[f"{key}@midline"] = np.union1d(left, mirror_flat(left)).astype(np.int32)
    return parcels


def _in_full(half: NDArray[np.bool_]) -> NDArray[np.bool_]:
    full = np.zeros(TEMPLATE_GRID.shape, bool)
    full[: half.shape[0]] = half
    return full


def _x_index(flat: NDArray[np.int32]) -> NDArray[np.int64]:
    return np.asarray(np.unravel_index(flat, TEMPLATE_GRID.shape)[0])
