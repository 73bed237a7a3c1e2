"""Which route of a function carries what, in one damage state: usual ways first, then what the spared parts take over.

To begin with, every route carries its usual load times what its worst element lets through, which is always possible.
Then the flow is augmented along shortest paths to the maximum, at most 1 (Edmonds and Karp 1972); what is added uses
headroom and spare parts of other routes.
"""

from __future__ import annotations

import itertools
from collections import deque
from dataclasses import dataclass

import networkx as nx
import numpy as np
from numpy.typing import NDArray

from byway.knowledge.graph.networks import FunctionNetwork

__all__ = ["RouteFlow", "flow_graph", "route_flows"]

_SOURCE, _SINK = 0, 1
_TINY = 1e-6
Edge = tuple[int, int]


@dataclass(frozen=True)
class RouteFlow:
    """What one route carries.

    Parameters
    ----------
    key : str
        Route key, or ``"recombined"`` for a path that takes pieces of several routes.
    elements : tuple of str
        Element ids from source to sink.
    usual, now : float
        Share of the function that it usually carries, and carries in this damage state.
    """

    key: str
    elements: tuple[str, ...]
    usual: float
    now: float

    def words(self, name: str = "") -> str:
        """One clause for a card, under the route's name in the graph (or its key).

        >>> RouteFlow("indirect", (), 0.4, 0.55).words()
        'indirect carries 0.55 of the function (usually 0.40)'
        """
        called = name or ("a detour" if self.key == "recombined" else self.key.replace("_", " "))
        if self.now < 0.005:
            return f"{called} carries nothing (usually {self.usual:.2f})"
        return f"{called} carries {self.now:.2f} of the function (usually {self.usual:.2f})"


def flow_graph(network: FunctionNetwork, damage: NDArray[np.floating], headroom: float) -> nx.DiGraph:
    """The node-split graph whose maximum flow from ``"source"`` to ``"sink"`` is the capacity before it is cut at 1.

    Parameters
    ----------
    damage : (n_elements,) float
        Damage in [0, 1] of the network's elements.
    headroom : float
        As in :mod:`~byway.knowledge.reasoning.capacity`.
    """
    names = {_SOURCE: "source", _SINK: "sink"}
    for i in range(len(network.elements)):
        names |= {_in(i): ("in", i), _out(i): ("out", i)}  # type: ignore[dict-item]
    graph = nx.DiGraph()
    for (a, b), capacity in _edge_capacities(network, damage, headroom).items():
        graph.add_edge(names[a], names[b], capacity=capacity)
    return graph


def route_flows(network: FunctionNetwork, damage: NDArray[np.floating], headroom: float) -> tuple[RouteFlow, ...]:
    """What every route carries in one damage state, named routes first, then recombined paths that carry something.

    The ``now`` of all of them sum to the function's capacity (to 1e-4).
    """
    flow = _flow(network, damage, headroom)
    order = sorted(range(len(network.routes)), key=lambda r: -network.route_loads[r])
    named = dict.fromkeys(order, 0.0)
    for capped in (True, False):  # first each route's usual load, then what is left on its steps
        for r in order:
            steps = _steps(network.routes[r])
            carried = min(flow[step] for step in steps)
            if capped:
                carried = min(carried, network.route_loads[r])
            for step in steps:
                flow[step] -= carried
            named[r] += carried
    found = [
        RouteFlow(key, tuple(network.elements[i] for i in route), network.route_loads[r], named[r])
        for r, (key, route) in enumerate(zip(network.route_keys, network.routes, strict=True))
    ]
    found += [RouteFlow("recombined", tuple(network.elements[i] for i in path), 0.0, carried)
              for path, carried in _left_over(flow)]  # fmt: skip
    return tuple(found)


def _in(element: int) -> int:
    return 2 + 2 * element


def _out(element: int) -> int:
    return 3 + 2 * element


def _edge_capacities(
    network: FunctionNetwork, damage: NDArray[np.floating], headroom: float
) -> dict[Edge, float]:
    """Capacity of every edge of the node-split graph."""
    room = 1.0 + headroom
    edges = {(_in(i), _out(i)): load * room * (1.0 - float(damage[i]))
             for i, load in enumerate(network.element_loads)}  # fmt: skip
    edges |= {(_out(a), _in(b)): load * room for (a, b), load in zip(network.links, network.link_loads, strict=True)}
    edges |= {(_SOURCE, _in(i)): network.source_loads[i] * room for i in network.sources}
    edges |= {(_out(i), _SINK): network.sink_loads[i] * room for i in network.sinks}
    return edges


def _steps(route: tuple[int, ...]) -> list[Edge]:
    """Edges of the node-split graph along a route."""
    nodes = [_SOURCE, *(node for i in route for node in (_in(i), _out(i))), _SINK]
    return list(itertools.pairwise(nodes))


def _flow(network: FunctionNetwork, damage: NDArray[np.floating], headroom: float) -> dict[Edge, float]:
    """A maximum flow, at most 1, that starts from the usual pattern."""
    capacity = _edge_capacities(network, damage, headroom)
    flow = dict.fromkeys(capacity, 0.0)
    total = 0.0
    for route, load in zip(network.routes, network.route_loads, strict=True):
        carried = load * (1.0 - max(float(damage[i]) for i in route))
        total += carried
        for step in _steps(route):
            flow[step] += carried
    onward: dict[int, list[tuple[int, Edge, int]]] = {}
    for a, b in capacity:
        onward.setdefault(a, []).append((b, (a, b), 1))
        onward.setdefault(b, []).append((a, (a, b), -1))
    while total < 1.0 - _TINY:
        path = _augmenting(onward, capacity, flow)
        if path is None:
            break
        more = min(capacity[edge] - flow[edge] if way > 0 else flow[edge] for edge, way in path)
        more = min(more, 1.0 - total)
        for edge, way in path:
            flow[edge] += way * more
        total += more
    return flow


def _augmenting(
    onward: dict[int, list[tuple[int, Edge, int]]], capacity: dict[Edge, float], flow: dict[Edge, float]
) -> list[tuple[Edge, int]] | None:
    """The shortest path on which more can flow: its edges, each with 1 (more) or -1 (less); None if there is none."""
    reached: dict[int, tuple[int, Edge, int] | None] = {_SOURCE: None}
    waiting = deque([_SOURCE])
    while waiting and _SINK not in reached:
        here = waiting.popleft()
        for ahead, edge, way in onward.get(here, ()):
            room = capacity[edge] - flow[edge] if way > 0 else flow[edge]
            if ahead not in reached and room > _TINY:
                reached[ahead] = (here, edge, way)
                waiting.append(ahead)
    if _SINK not in reached:
        return None
    path = []
    step = reached[_SINK]
    while step is not None:
        here, edge, way = step
        path.append((edge, way))
        step = reached[here]
    return path


def _left_over(flow: dict[Edge, float]) -> list[tuple[tuple[int, ...], float]]:
    """Decompose what named routes do not account for into paths."""
    paths: list[tuple[tuple[int, ...], float]] = []
    while True:
        here, path = _SOURCE, []
        while here != _SINK:
            step = next((edge for edge, carried in flow.items() if edge[0] == here and carried > _TINY), None)
            if step is None:
                return paths
            path.append(step)
            here = step[1]
        carried = min(flow[step] for step in path)
        for step in path:
            flow[step] -= carried
        if carried > 1e-5:
            paths.append((tuple((a - 2) // 2 for a, b in path if b == a + 1 and a >= 2 and a % 2 == 0), carried))
