"""Functions as small networks: the routes of each function copy, resolved to elements with sides, with usual loads.

This is the shape that capacity is reckoned on. It holds no damage and no geometry.

Shape
-----
``function_networks(graph, dominance)`` returns ``{copy_id: FunctionNetwork}``. Copy ids are ``function@left`` and
``function@right`` (functions with laterality each_side, left, right), ``function@dominant``,
``function@nondominant``, ``function@bilateral``. ``dominance`` decides on which side the dominant and nondominant
copies lie; all other copies are the same for both values.

A :class:`FunctionNetwork` numbers its elements from 0. ``elements[i]`` is an element id (``key@left``, ``key@right``,
``key@midline``): regions and segments alike are *nodes*; ``links`` join consecutive nodes of a route. Elements stand
in topological order, so every link ``(i, j)`` has ``i < j``. Each of ``routes`` is a tuple of element numbers from
its source to its sink.

An element may be where one route ends (a region that serves the function by itself, say) and be passed by another.
What can leave there is then only the load of the routes that end there: ``sink_loads``, and ``source_loads`` for what
can enter, are usual loads of the way in and the way out, to be reckoned with like those of links. Without them a
region's own small share would let the whole function bypass a cut further on.
"""

from __future__ import annotations

import graphlib
import itertools
import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace

from byway.knowledge.faults import Fault, GraphError
from byway.knowledge.graph.content import Content
from byway.knowledge.graph.records import Function
from byway.knowledge.graph.references import Hemisphere, copy_sides, resolved_chains

__all__ = ["FunctionNetwork", "function_network", "function_networks"]


@dataclass(frozen=True)
class FunctionNetwork:
    """The directed network of one function copy: a DAG whose nodes are elements.

    Parameters
    ----------
    copy_id, function : str
        ``repetition@dominant`` and ``repetition``.
    elements : tuple of str
        Element ids in topological order; all numbers below index this tuple.
    route_keys : tuple of str
        Key of each route; ``key@left`` and ``key@right`` where a bilateral function writes it out on both sides.
    routes : tuple of tuple of int
        Element numbers of each route, ascending, source first.
    route_loads : tuple of float
        Usual share of the function that each route carries; they sum to 1.
    sources, sinks : frozenset of int
        First elements of routes and last elements of routes (one element may be both, and may be passed by
        other routes).
    links : tuple of (int, int)
        Distinct consecutive pairs of the routes, ``i < j``.
    element_loads, link_loads : tuple of float
        Sum of the loads of the routes through each element and each link, in [0, 1].
    source_loads, sink_loads : tuple of float
        For every element, sum of the loads of the routes that start there, and that end there; 0 elsewhere.
    """

    copy_id: str
    function: str
    elements: tuple[str, ...]
    route_keys: tuple[str, ...]
    routes: tuple[tuple[int, ...], ...]
    route_loads: tuple[float, ...]
    sources: frozenset[int]
    sinks: frozenset[int]
    links: tuple[tuple[int, int], ...]
    element_loads: tuple[float, ...]
    link_loads: tuple[float, ...]
    source_loads: tuple[float, ...] = ()
    sink_loads: tuple[float, ...] = ()

    def with_loads(self, route_loads: Sequence[float]) -> FunctionNetwork:
        """The same network for a person who leans on its routes differently.

        Parameters
        ----------
        route_loads : sequence of float
            One load a route, none negative, summing to 1.

        Raises
        ------
        GraphError
            Wrong number of loads, a negative one, or a sum that is not 1.
        """
        loads = tuple(float(load) for load in route_loads)
        if len(loads) != len(self.routes) or min(loads) < 0 or not math.isclose(sum(loads), 1.0, abs_tol=1e-6):
            raise GraphError(
                Fault("load-sum", self.copy_id, f"route loads {loads}", f"{len(self.routes)} loads that sum to 1")
            )
        through, enters, leaves = ([0.0] * len(self.elements) for _ in range(3))
        link_loads = dict.fromkeys(self.links, 0.0)
        for route, load in zip(self.routes, loads, strict=True):
            enters[route[0]] += load
            leaves[route[-1]] += load
            for element in route:
                through[element] += load
            for link in itertools.pairwise(route):
                link_loads[link] += load
        return replace(
            self,
            route_loads=loads,
            element_loads=tuple(through),
            link_loads=tuple(link_loads.values()),
            source_loads=tuple(enters),
            sink_loads=tuple(leaves),
        )


def function_network(
    content: Content, function: Function, copy_id: str, sides: tuple[Hemisphere, ...]
) -> FunctionNetwork:
    """Build the network of one copy whose routes are written out on the given side or sides.

    Raises
    ------
    GraphError
        A reference that does not resolve, or routes that together form a cycle.
    """
    chains = resolved_chains(content, function, sides)
    order = _topological_order(copy_id, [ids for _, _, ids in chains])
    number = {element: i for i, element in enumerate(order)}
    routes = tuple(tuple(number[element] for element in ids) for _, _, ids in chains)
    links = tuple(sorted({link for route in routes for link in itertools.pairwise(route)}))
    bare = FunctionNetwork(
        copy_id=copy_id,
        function=function.key,
        elements=tuple(order),
        route_keys=tuple(key for key, _, _ in chains),
        routes=routes,
        route_loads=(),
        sources=frozenset(route[0] for route in routes),
        sinks=frozenset(route[-1] for route in routes),
        links=links,
        element_loads=(),
        link_loads=(),
    )
    return bare.with_loads([load for _, load, _ in chains])


def function_networks(graph: Content, dominance: Hemisphere) -> dict[str, FunctionNetwork]:
    """Networks of all function copies, for a person whose language dominance lies on the given side.

    Raises
    ------
    GraphError
        As :func:`function_network`; a graph that passed its checks raises nothing.
    """
    return {
        copy_id: function_network(graph, function, copy_id, sides)
        for function in graph.functions.values()
        for copy_id, sides in copy_sides(function, dominance).items()
    }


def _topological_order(copy_id: str, chains: Iterable[tuple[str, ...]]) -> list[str]:
    """Elements so that every chain ascends; ties keep the order in which the routes name them."""
    before: dict[str, list[str]] = {}
    for chain in chains:
        for i, element in enumerate(chain):
            before.setdefault(element, []).extend(chain[max(i - 1, 0) : i])
    try:
        return list(graphlib.TopologicalSorter(before).static_order())
    except graphlib.CycleError as error:
        raise GraphError(Fault("cycle", copy_id, f"routes form a cycle: {' > '.join(error.args[1])}")) from error
