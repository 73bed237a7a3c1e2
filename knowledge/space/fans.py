"""Fans: how the ends of a bundle spread from its trunk into a parcel, along cheap ways through the tissue.

A graph of 2 mm voxels over the whole brain, white matter cheap, grey matter dearer, fluid nearly closed. From one
point on the trunk the cheapest ways to all voxels of a parcel branch like a tree; streamlines follow them.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import gaussian_filter
from scipy.sparse.csgraph import dijkstra
from scipy.spatial import cKDTree

from byway.knowledge.space.curves import resample, smooth
from byway.knowledge.space.front import voxel_graph
from byway.knowledge.space.grid import TEMPLATE_GRID, Grid
from byway.knowledge.space.template import brain_mask, template_volume

__all__ = ["Reach", "reach_from"]

_STEP = 2
_LIMIT = 90.0
_SMOOTHING_POINTS = 6.0
_SPACING_MM = 0.5


@dataclass(frozen=True)
class _Ways:
    grid: Grid
    node_of: NDArray[np.int32]
    voxel_of: NDArray[np.int64]
    matrix: Any
    tree: Any


@cache
def _ways() -> _Ways:
    white = gaussian_filter(template_volume("wm"), 0.7)[::_STEP, ::_STEP, ::_STEP]
    grey = gaussian_filter(template_volume("gm"), 0.7)[::_STEP, ::_STEP, ::_STEP]
    inside = brain_mask()[::_STEP, ::_STEP, ::_STEP]
    fluid = np.clip(1.0 - white - grey, 0.0, 1.0)
    cost = _STEP * (1.0 + 3.0 * np.clip(grey, 0.0, 1.0) ** 2 + 25.0 * fluid**2)
    affine = TEMPLATE_GRID.affine.copy()
    affine[:3, :3] *= _STEP
    graph = voxel_graph(inside, cost)
    shape = (int(white.shape[0]), int(white.shape[1]), int(white.shape[2]))
    grid = Grid(shape, affine)
    voxels = np.argwhere(inside)
    return _Ways(grid, graph.node_of, voxels, graph.matrix(), cKDTree(grid.to_mm(voxels)))


@dataclass(frozen=True)
class Reach:
    """Cheapest ways from one point.

    Parameters
    ----------
    start_mm : (3,) float
        The point, MNI mm.
    cost : (nodes,) float
        Cost to each node, infinite where none is reached.
    before : (nodes,) int
        The node before each on its way.
    """

    start_mm: NDArray[np.float64]
    cost: NDArray[np.float64]
    before: NDArray[np.int32]

    def cost_to(self, targets_mm: NDArray[np.floating]) -> NDArray[np.float64]:
        """Cost to the voxels nearest to (n, 3) targets; infinite beyond reach."""
        return self.cost[_ways().tree.query(targets_mm)[1]]

    def way_to(self, target_mm: NDArray[np.floating]) -> NDArray[np.float64]:
        """Smooth polyline from the start to one target, points 0.5 mm apart; straight where it is out of reach."""
        ways = _ways()
        node = int(ways.tree.query(target_mm)[1])
        chain = []
        while node >= 0 and np.isfinite(self.cost[node]):
            chain.append(node)
            node = int(self.before[node])
        through = ways.grid.to_mm(ways.voxel_of[chain[-2:0:-1]]) if len(chain) > 2 else np.empty((0, 3))
        line = resample(np.concatenate([self.start_mm[None], through, np.asarray(target_mm, float)[None]]), _SPACING_MM)
        return smooth(line, _SMOOTHING_POINTS) if len(line) > 2 else line


def reach_from(start_mm: NDArray[np.floating]) -> Reach:
    """Cheapest ways from a point (MNI mm) to everything within reach (about 4 cm of grey matter, 9 cm of white)."""
    ways = _ways()
    start = np.asarray(start_mm, float)
    node = int(ways.tree.query(start)[1])
    cost, before = dijkstra(ways.matrix, indices=node, return_predecessors=True, limit=_LIMIT)
    return Reach(start, cost, before)
