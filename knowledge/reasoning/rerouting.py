"""Which route of a function carries what, in one damage state: a flow that keeps to usual loads where it can.

Among all maximum flows the one shown uses headroom last: every element first carries up to its usual load at no
cost, and what goes beyond costs one, so the flow of least cost is the usual pattern as far as damage allows.
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass

import networkx as nx
import numpy as np
from numpy.typing import NDArray

from byway.knowledge.graph.networks import FunctionNetwork

__all__ = ["RouteFlow", "flow_graph", "route_flows"]

_SCALE = 1_000_000  # network simplex wants whole numbers


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

    @property
    def words(self) -> str:
        """One clause for a card.

        >>> RouteFlow("indirect", (), 0.4, 0.55).words
        'indirect carries 0.55 of the function (usually 0.40)'
        """
        if self.now < 0.005:
            return f"{self.key} carries nothing (usually {self.usual:.2f})"
        return f"{self.key} carries {self.now:.2f} of the function (usually {self.usual:.2f})"


def flow_graph(network: FunctionNetwork, damage: NDArray[np.floating], headroom: float) -> nx.DiGraph:
    """The node-split graph whose maximum flow from ``"source"`` to ``"sink"`` is the capacity before it is cut at 1.

    Parameters
    ----------
    damage : (n_elements,) float
        Damage in [0, 1] of the network's elements.
    headroom : float
        As in :mod:`~byway.knowledge.reasoning.capacity`.
    """
    graph = nx.DiGraph()
    for i, load in enumerate(network.element_loads):
        graph.add_edge(("in", i), ("out", i), capacity=load * (1.0 + headroom) * (1.0 - float(damage[i])))
    for (a, b), load in zip(network.links, network.link_loads, strict=True):
        graph.add_edge(("out", a), ("in", b), capacity=load * (1.0 + headroom))
    for i in network.sources:
        graph.add_edge("source", ("in", i), capacity=network.source_loads[i] * (1.0 + headroom))
    for i in network.sinks:
        graph.add_edge(("out", i), "sink", capacity=network.sink_loads[i] * (1.0 + headroom))
    return graph


def route_flows(network: FunctionNetwork, damage: NDArray[np.floating], headroom: float) -> tuple[RouteFlow, ...]:
    """What every route carries in one damage state, named routes first, then recombined paths that carry something.

    The ``now`` of all of them sum to the function's capacity (to 1e-4).
    """
    flow = _least_cost_flow(network, damage, headroom)
    found: list[RouteFlow] = []
    order = sorted(range(len(network.routes)), key=lambda r: -network.route_loads[r])
    named = dict.fromkeys(order, 0.0)
    for bound in (1.0, np.inf):  # first each route's usual load, then what is left on its steps
        for r in order:
            steps = _steps(network.routes[r])
            carried = min(network.route_loads[r] * bound * _SCALE if bound == 1.0 else bound,
                          *(flow.get(step, 0.0) for step in steps))  # fmt: skip
            for step in steps:
                flow[step] -= carried
            named[r] += carried / _SCALE
    for r, (key, route) in enumerate(zip(network.route_keys, network.routes, strict=True)):
        ids = tuple(network.elements[i] for i in route)
        found.append(RouteFlow(key, ids, network.route_loads[r], named[r]))
    found += [RouteFlow("recombined", tuple(network.elements[i] for i in path), 0.0, carried / _SCALE)
              for path, carried in _left_over(network, flow)]  # fmt: skip
    return tuple(found)


def _steps(route: tuple[int, ...]) -> list[tuple[object, object]]:
    """Edges of the split graph along a route."""
    nodes: list[object] = ["source"]
    for i in route:
        nodes += [("in", i), ("out", i)]
    nodes.append("sink")
    return list(itertools.pairwise(nodes))


def _least_cost_flow(
    network: FunctionNetwork, damage: NDArray[np.floating], headroom: float
) -> dict[tuple[object, object], float]:
    """A maximum flow, at most 1, that goes beyond usual loads as little as it can; edges of the split graph."""
    plain = flow_graph(network, damage, headroom)
    usual: dict[tuple[object, object], float] = {}
    for i, load in enumerate(network.element_loads):
        usual[("in", i), ("out", i)] = load
    for (a, b), load in zip(network.links, network.link_loads, strict=True):
        usual[("out", a), ("in", b)] = load
    usual |= {("source", ("in", i)): network.source_loads[i] for i in network.sources}
    usual |= {(("out", i), "sink"): network.sink_loads[i] for i in network.sinks}
    graph = nx.DiGraph()
    graph.add_edge("start", "source", capacity=_SCALE, weight=0)
    for a, b, data in plain.edges(data=True):
        capacity = round(data["capacity"] * _SCALE)
        within = min(capacity, round(usual[a, b] * _SCALE))
        graph.add_edge(a, b, capacity=within, weight=0)
        if capacity > within:  # a detour node stands for the headroom, because the graph holds one edge a pair
            graph.add_edge(a, ("beyond", a, b), capacity=capacity - within, weight=1)
            graph.add_edge(("beyond", a, b), b, capacity=capacity - within, weight=0)
    found = nx.max_flow_min_cost(graph, "start", "sink")
    return {
        (a, b): float(found[a].get(b, 0) + found[a].get(("beyond", a, b), 0)) for a, b in plain.edges
    }


def _left_over(
    network: FunctionNetwork, flow: dict[tuple[object, object], float]
) -> list[tuple[tuple[int, ...], float]]:
    """Decompose what named routes do not account for into paths."""
    graph = nx.DiGraph([edge for edge, carried in flow.items() if carried > 0.5])
    paths = []
    while graph.has_node("source") and graph.has_node("sink") and nx.has_path(graph, "source", "sink"):
        nodes = nx.shortest_path(graph, "source", "sink")
        edges = list(itertools.pairwise(nodes))
        carried = min(flow[edge] for edge in edges)
        for edge in edges:
            flow[edge] -= carried
            if flow[edge] <= 0.5:
                graph.remove_edge(*edge)
        if carried > 1e-5 * _SCALE:
            paths.append((tuple(node[1] for node in nodes if node[0] == "in"), carried))
    return paths
