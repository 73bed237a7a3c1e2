"""Fronts over a voxel graph: shortest distances through tissue, the tool that parcels and courses share."""

from __future__ import annotations

import itertools
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csr_matrix
from scipy.sparse.csgraph import dijkstra

__all__ = ["VoxelGraph", "voxel_graph"]

_HALF_NEIGHBOURS = tuple(step for step in itertools.product((-1, 0, 1), repeat=3) if step > (0, 0, 0))


@dataclass(frozen=True)
class VoxelGraph:
    """Voxels of a domain and the cost of stepping between neighbours (26 of them).

    Parameters
    ----------
    shape : tuple of int
        Shape of the box.
    node_of : int32 array of that shape
        Node number of each voxel of the domain, -1 elsewhere.
    first, second : (E,) int32
        Nodes at the two ends of each edge, every edge once.
    cost : (E,) float32
        Length of the step in voxels times the mean cost of its two ends.
    """

    shape: tuple[int, int, int]
    node_of: NDArray[np.int32]
    first: NDArray[np.int32]
    second: NDArray[np.int32]
    cost: NDArray[np.float32]

    @property
    def count(self) -> int:
        """Number of nodes."""
        return int(self.node_of.max()) + 1

    def compete(
        self, owner: NDArray[np.int64], node: NDArray[np.int64], delay: NDArray[np.float64]
    ) -> tuple[NDArray[np.float64], NDArray[np.int64]]:
        """Grow all owners at once: each node goes to the owner whose front arrives first.

        Parameters
        ----------
        owner, node : (n,) int
            Seeds: who owns them and on which node they sit.
        delay : (owners,) float, positive
            Cost before an owner's front leaves its seeds.

        Returns
        -------
        arrival : (nodes,) float
            Cost at arrival, delay included; infinite where no front comes.
        winner : (nodes,) int
            Owner of each node, -1 where no front comes.
        """
        count, owners = self.count, len(delay)
        rows = np.concatenate([self.first, self.second, count + owner])
        columns = np.concatenate([self.second, self.first, node])
        costs = np.concatenate([self.cost, self.cost, delay[owner]])
        matrix = csr_matrix((costs, (rows, columns)), shape=(count + owners, count + owners))
        arrival, _, source = dijkstra(
            matrix, indices=count + np.arange(owners), min_only=True, return_predecessors=True
        )
        winner = np.where(source[:count] >= 0, source[:count] - count, -1)
        return arrival[:count], winner.astype(np.int64)

    def matrix(self) -> csr_matrix:
        """The graph as a sparse matrix, both directions."""
        rows = np.concatenate([self.first, self.second])
        columns = np.concatenate([self.second, self.first])
        return csr_matrix((np.concatenate([self.cost, self.cost]), (rows, columns)), shape=(self.count, self.count))


def voxel_graph(domain: NDArray[np.bool_], cost: NDArray[np.floating]) -> VoxelGraph:
    """Graph of the voxels of ``domain``; a step costs its length (voxels) times the mean ``cost`` of its ends.

    >>> line = np.ones((4, 1, 1), bool)
    >>> graph = voxel_graph(line, np.full(line.shape, 2.0))
    >>> graph.cost.tolist()
    [2.0, 2.0, 2.0]
    """
    node_of = np.full(domain.shape, -1, np.int32)
    node_of[domain] = np.arange(int(domain.sum()), dtype=np.int32)
    first, second, costs = [], [], []
    for step in _HALF_NEIGHBOURS:
        here = tuple(slice(max(0, -d), n - max(0, d)) for d, n in zip(step, domain.shape, strict=True))
        there = tuple(slice(max(0, d), n - max(0, -d)) for d, n in zip(step, domain.shape, strict=True))
        a, b = node_of[here], node_of[there]
        both = (a >= 0) & (b >= 0)
        first.append(a[both])
        second.append(b[both])
        length = 0.5 * float(np.sqrt(sum(d * d for d in step)))
        costs.append((cost[here][both] + cost[there][both]) * length)
    shape = (int(domain.shape[0]), int(domain.shape[1]), int(domain.shape[2]))
    return VoxelGraph(
        shape, node_of, np.concatenate(first), np.concatenate(second), np.concatenate(costs).astype(np.float32)
    )
