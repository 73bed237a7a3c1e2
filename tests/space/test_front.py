"""Fronts over voxels: competing growth against a plain loop."""

from __future__ import annotations

import numpy as np
from scipy.sparse.csgraph import dijkstra

from byway.knowledge.space.front import voxel_graph


def test_every_pair_of_neighbours_is_one_edge() -> None:
    """A full 3 x 3 x 3 block has 26-neighbour pairs counted by hand: 54 straight, 72 by an edge, 32 by a corner."""
    graph = voxel_graph(np.ones((3, 3, 3), bool), np.ones((3, 3, 3)))
    lengths = np.round(graph.cost, 4)
    assert {float(each): int((lengths == each).sum()) for each in np.unique(lengths)} == {
        1.0: 54,
        float(np.float32(1.4142)): 72,
        float(np.float32(1.7321)): 32,
    }


def test_competition_equals_separate_fronts() -> None:
    """Each voxel goes to the owner whose own front, delay included, comes first; arrival is that cost."""
    rng = np.random.default_rng(4)
    domain = rng.random((9, 8, 7)) > 0.25
    cost = 1 + rng.random(domain.shape)
    graph = voxel_graph(domain, cost)
    nodes = rng.choice(graph.count, 6, replace=False).astype(np.int64)
    owner = np.array([0, 0, 1, 1, 2, 2])
    delay = np.array([1.0, 2.0, 0.5])
    arrival, winner = graph.compete(owner, nodes, delay)
    alone = np.array(
        [dijkstra(graph.matrix(), indices=nodes[owner == each]).min(axis=0) + delay[each] for each in range(3)]
    )
    np.testing.assert_allclose(arrival, alone.min(axis=0), rtol=1e-5)
    reached = np.isfinite(arrival)
    np.testing.assert_allclose(alone[winner[reached], np.flatnonzero(reached)], alone.min(axis=0)[reached], rtol=1e-5)
    assert (winner[~reached] == -1).all()


def test_fronts_do_not_jump_gaps() -> None:
    """Voxels without a neighbour in the domain are never reached."""
    domain = np.ones((7, 1, 1), bool)
    domain[3] = False
    graph = voxel_graph(domain, np.ones(domain.shape))
    _, winner = graph.compete(np.array([0]), np.array([0]), np.ones(1))
    assert winner.tolist() == [0, 0, 0, -1, -1, -1]
