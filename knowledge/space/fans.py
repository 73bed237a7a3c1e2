"""Fans: how the ends of a bundle spread from its trunk into a parcel, along cheap ways through the tissue.

A graph of 2 mm voxels over the whole brain, white matter cheap, grey matter dearer, fluid nearly closed. From one
trunk the cheapest ways to all voxels of a parcel branch like a tree; streamlines follow them.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import gaussian_filter
from scipy.sparse import csr_matrix
from scipy.sparse.csgraph import dijkstra
from scipy.spatial import cKDTree

from byway.knowledge.space.curves import arc_length, resample, smooth
from byway.knowledge.space.front import voxel_graph
from byway.knowledge.space.grid import TEMPLATE_GRID, Grid
from byway.knowledge.space.template import brain_mask, template_volume

__all__ = ["Reach", "reach_from"]

_STEP = 2
_LIMIT = 75.0
_DOORS = 48
_TRUNK_PRICE = 0.8
_SMOOTHING_POINTS = 6.0
_SPACING_MM = 0.5


@dataclass(frozen=True)
class _Ways:
    grid: Grid
    voxel_of: NDArray[np.int64]
    matrix: csr_matrix
    tree: cKDTree


@cache
def _ways() -> _Ways:
    white = gaussian_filter(template_volume("wm"), 0.7)[::_STEP, ::_STEP, ::_STEP]
    grey = gaussian_filter(template_volume("gm"), 0.7)[::_STEP, ::_STEP, ::_STEP]
    inside = brain_mask()[::_STEP, ::_STEP, ::_STEP]
    fluid = np.clip(1.0 - white - grey, 0.0, 1.0)
    cost = _STEP * (1.0 + 3.0 * np.clip(grey, 0.0, 1.0) ** 2 + 40.0 * fluid**2)
    affine = TEMPLATE_GRID.affine.copy()
    affine[:3, :3] *= _STEP
    graph = voxel_graph(inside, cost)
    shape = (int(white.shape[0]), int(white.shape[1]), int(white.shape[2]))
    voxels = np.argwhere(inside)
    grid = Grid(shape, affine)
    return _Ways(grid, voxels, _with_doors(graph.matrix()), cKDTree(grid.to_mm(voxels)))


def _with_doors(matrix: csr_matrix) -> csr_matrix:
    """One node more, whose edges lead to the points of a trunk: they are set anew for every bundle end."""
    count = matrix.shape[0]
    indptr = np.concatenate([matrix.indptr, [matrix.indptr[-1] + _DOORS]]).astype(np.int32)
    indices = np.concatenate([matrix.indices, np.zeros(_DOORS)]).astype(np.int32)
    data = np.concatenate([matrix.data, np.ones(_DOORS)])
    return csr_matrix((data, indices, indptr), shape=(count + 1, count + 1))


@dataclass(frozen=True)
class Reach:
    """Cheapest ways from a trunk to the tissue about it.

    Parameters
    ----------
    trunk_mm : (n, 3) float
        Points of the trunk, MNI mm.
    door_of : dict of node to int
        The point of the trunk at which the ways through a node leave it.
    cost : (nodes,) float
        Cost to each node, infinite where none is reached.
    before : (nodes,) int
        The node before each on its way.
    """

    trunk_mm: NDArray[np.float64]
    door_of: dict[int, int]
    cost: NDArray[np.float64]
    before: NDArray[np.int32]

    def cost_to(self, targets_mm: NDArray[np.floating]) -> NDArray[np.float64]:
        """Cost to the voxels nearest to (n, 3) targets; infinite beyond reach."""
        nodes = _ways().tree.query(targets_mm)[1]
        return np.asarray(self.cost[nodes])

    def way_to(self, target_mm: NDArray[np.floating]) -> tuple[int, NDArray[np.float64]]:
        """The trunk point at which the way to a target leaves, and the way: points 0.5 mm apart from there on.

        A target out of reach is led to straight from the end of the trunk.
        """
        ways = _ways()
        node = int(ways.tree.query(target_mm)[1])
        chain = []
        if np.isfinite(self.cost[node]):
            while node < len(ways.voxel_of):
                chain.append(node)
                node = int(self.before[node])
        door = self.door_of[chain[-1]] if chain else len(self.trunk_mm) - 1
        through = ways.grid.to_mm(ways.voxel_of[chain[-2:0:-1]]) if len(chain) > 2 else np.empty((0, 3))
        corners = np.concatenate([self.trunk_mm[door][None], through, np.asarray(target_mm, float)[None]])
        line = resample(corners, _SPACING_MM)
        return door, smooth(line, _SMOOTHING_POINTS) if len(line) > 4 else line


def reach_from(trunk_mm: NDArray[np.floating]) -> Reach:
    """Cheapest ways from the last part of a trunk, (n, 3) MNI mm in order, to everything within reach.

    Following the trunk costs 0.8 a mm and leaving it 1 a mm in pure white matter, so that ways leave it forward, at
    an angle, and not at once.
    """
    ways = _ways()
    trunk = np.asarray(trunk_mm, float)
    nodes = ways.tree.query(trunk)[1]
    delay = 0.1 + _TRUNK_PRICE * arc_length(trunk)
    door_of: dict[int, int] = {}
    for door, node in enumerate(nodes):
        door_of.setdefault(int(node), door)
    doors = list(door_of.items())
    if len(doors) > _DOORS:
        doors = [doors[i] for i in np.linspace(0, len(doors) - 1, _DOORS).astype(int)]
    padded = doors + [doors[-1]] * (_DOORS - len(doors))
    ways.matrix.indices[-_DOORS:] = [node for node, _ in padded]
    ways.matrix.data[-_DOORS:] = [delay[door] for _, door in padded]
    start = len(ways.voxel_of)
    cost, before = dijkstra(ways.matrix, indices=start, return_predecessors=True, limit=_LIMIT)
    return Reach(trunk, door_of, cost[:start], before[:start])
