"""Regions: parcels grown from seeds over the template's grey matter.

All regions of the left half grow at once, as fronts over a graph of voxels; each voxel goes to the front that
arrives first, and a region keeps its earliest voxels up to its volume. Fluid is slow, so fronts do not jump the
Sylvian fissure, the falx or the tentorium. The template is symmetric, so the right side is the mirror of the left.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.graph.records import Region
from byway.knowledge.space.front import voxel_graph
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.space.template import brain_mask, template_volume

__all__ = ["grow_parcels", "mirror_flat"]

_MIDLINE = int(TEMPLATE_GRID.to_voxel(np.zeros((1, 3)))[0, 0])
_MIXED_GREY = 0.05
_CORTEX_GREY = 0.45
_POOR_GREY_PRICE = 3.0
_WHITE_REACH = 10
_SLAB_MM = 3.0
# Grey and white matter of the template, about 1.7 l, against about 1.2 l in an average adult (from memory).
_ENLARGEMENT = 1.4


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
        Seeds on the left (x < 0) or the midline, MNI mm; ``volume_ml`` is the volume of one side in a person of
        average size, which the template exceeds by 1.4.

    Returns
    -------
    dict of element id to (n,) int32
        Sorted C-order voxel indices on ``TEMPLATE_GRID``; two entries for a paired region, mirror images.

    Notes
    -----
    A voxel belongs to cortex from 45 % grey-matter probability on; nuclei, brainstem and cerebellum, which the
    template shows as mixed tissue, from 5 % on. White-matter places (chiasm, midsagittal callosum) grow by themselves
    in a slab about the midline.
    """
    grey_keys = [key for key, region in regions.items() if region.tissue != "white_matter"]
    half = slice(0, _MIDLINE + 1)
    grey = template_volume("gm")[half]
    domain = brain_mask()[half] & (grey > _MIXED_GREY)
    owner, voxel = _seeds([regions[key] for key in grey_keys])
    domain[tuple(voxel.T)] = True
    cost = 1.0 + _POOR_GREY_PRICE * (1.0 - np.clip((grey - 0.2) / 0.5, 0.0, 1.0))
    graph = voxel_graph(domain, cost)
    arrival, winner = graph.compete(owner, graph.node_of[tuple(voxel.T)].astype(np.int64), np.ones(len(grey_keys)))
    flat, probability = np.flatnonzero(_in_full(domain)), grey[domain]
    grown = {}
    for number, key in enumerate(grey_keys):
        mine = winner == number
        if regions[key].tissue == "cortex":
            mine &= probability > _CORTEX_GREY
        grown[key] = _earliest(flat, arrival, mine, regions[key])
    for key in regions:
        if key not in grown:
            grown[key] = _grow_white(regions[key])
    parcels: dict[str, NDArray[np.int32]] = {}
    for key, region in regions.items():
        left = grown[key]
        if region.sides == "paired":
            left = left[_x_index(left) < _MIDLINE]
            parcels[f"{key}@left"], parcels[f"{key}@right"] = left, mirror_flat(left)
        else:
            parcels[f"{key}@midline"] = np.union1d(left, mirror_flat(left)).astype(np.int32)
    return parcels


def _seeds(regions: Sequence[Region]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Owners and voxels of the seeds on the left and on the midline."""
    seeds = [(owner, seed) for owner, region in enumerate(regions) for seed in region.seeds_mni if seed[0] <= 0]
    voxels = np.rint(TEMPLATE_GRID.to_voxel(np.array([seed for _, seed in seeds]))).astype(np.int64)
    return np.array([owner for owner, _ in seeds]), voxels


def _earliest(
    flat: NDArray[np.int64], arrival: NDArray[np.float64], mine: NDArray[np.bool_], region: Region
) -> NDArray[np.int32]:
    """The voxels that the front reached first, up to the region's volume in the left half; never none."""
    own = np.flatnonzero(mine)
    own = own[np.argsort(arrival[own], kind="stable")]
    share = 1.0 if region.sides == "paired" else 0.5
    count = max(1, round(region.volume_ml * _ENLARGEMENT * share / TEMPLATE_GRID.voxel_ml))
    return np.sort(flat[own[:count]]).astype(np.int32)


def _grow_white(region: Region) -> NDArray[np.int32]:
    """A place in white matter on the midline: from its seeds along white matter, in a slab about x = 0."""
    _, voxel = _seeds([region])
    white = template_volume("wm")[: _MIDLINE + 1]
    reach = np.zeros(white.shape, bool)
    low, high = voxel.min(0) - _WHITE_REACH, voxel.max(0) + _WHITE_REACH + 1
    reach[tuple(slice(max(0, int(a)), int(b)) for a, b in zip(low, high, strict=True))] = True
    off_midline = (_MIDLINE - np.arange(_MIDLINE + 1))[:, None, None] / _SLAB_MM
    graph = voxel_graph(reach, (1.0 + 8.0 * (1.0 - white) ** 2) * (1.0 + off_midline**2))
    node = graph.node_of[tuple(voxel.T)].astype(np.int64)
    arrival, winner = graph.compete(np.zeros(len(node), np.int64), node, np.ones(1))
    return _earliest(np.flatnonzero(_in_full(reach)), arrival, winner == 0, region)


def _in_full(half: NDArray[np.bool_]) -> NDArray[np.bool_]:
    full = np.zeros(TEMPLATE_GRID.shape, bool)
    full[: half.shape[0]] = half
    return full


def _x_index(flat: NDArray[np.int32]) -> NDArray[np.int64]:
    return np.asarray(np.unravel_index(flat, TEMPLATE_GRID.shape)[0])
