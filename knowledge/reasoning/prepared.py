"""All that reasoning needs of a graph and a list of elements, made once: cut tables, signs, connections."""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import Fault, GraphError
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.networks import FunctionNetwork, function_networks
from byway.knowledge.graph.references import Hemisphere
from byway.knowledge.reasoning.capacity import CutTable, cut_table
from byway.knowledge.reasoning.remote import RemoteModel, remote_model, segment_ends
from byway.knowledge.reasoning.scenarios import AXES, leaning
from byway.knowledge.reasoning.signs import SignModel, sign_models

__all__ = ["CopyTable", "Prepared", "prepare"]

_KEPT = 4
_ONE_WAY = ("each_side", "left", "right")
"""Lateralities of primary functions: their routes are parts (face, arm, leg; quadrants), not ways to choose among."""

_cache: OrderedDict[tuple[int, int], Prepared] = OrderedDict()


@dataclass(frozen=True, eq=False)
class CopyTable:
    """The cuts of one function copy, and where its elements stand among all elements."""

    cuts: CutTable
    rows: NDArray[np.intp]


@dataclass(frozen=True, eq=False)
class Prepared:
    """What one graph says about one list of elements.

    Parameters
    ----------
    element_ids : tuple of str
        All elements that have geometry, in the order of the damage arrays.
    is_region : (E,) bool
        Whether each element is a region (else a segment).
    tables : dict
        Cut tables by language dominance and reliance, then by function copy; a copy that does not change with an
        axis is the same object in both.
    models : dict
        Sign models by language dominance, then by sign id.
    ends_of : dict
        Segment number to the numbers of the regions at its ends.
    remote : RemoteModel
        Which region gets input from where.
    """

    graph: Graph
    element_ids: tuple[str, ...]
    number: dict[str, int]
    is_region: NDArray[np.bool_]
    tables: dict[tuple[str, str], dict[str, CopyTable]]
    models: dict[str, dict[str, SignModel]]
    ends_of: dict[int, tuple[int, ...]]
    remote: RemoteModel

    def settings(self) -> Iterator[tuple[str, str]]:
        """Language dominance and reliance, in the order in which scenarios are numbered."""
        for dominance in AXES["dominance"]:
            for reliance in AXES["reliance"]:
                yield dominance, reliance


def prepare(graph: Graph, element_ids: tuple[str, ...]) -> Prepared:
    """Make, or take from a small cache, what reasoning needs of a graph.

    Raises
    ------
    GraphError
        A function needs an element that has no geometry, or has too many minimal cuts; all such faults together.
    """
    key = id(graph), hash(element_ids)
    kept = _cache.get(key)
    if kept is not None and kept.graph is graph and kept.element_ids == element_ids:
        _cache.move_to_end(key)
        return kept
    made = _prepare(graph, element_ids)
    _cache[key] = made
    while len(_cache) > _KEPT:
        _cache.popitem(last=False)
    return made


def _prepare(graph: Graph, element_ids: tuple[str, ...]) -> Prepared:
    number = {element: i for i, element in enumerate(element_ids)}
    is_region = np.array([element.partition("@")[0] in graph.regions for element in element_ids], bool)
    second_load = graph.norm("reliance_second_load")
    faults: list[Fault] = []
    tables: dict[tuple[str, str], dict[str, CopyTable]] = {}
    known: dict[tuple[object, ...], CopyTable] = {}
    hemispheres: tuple[Hemisphere, Hemisphere] = ("left", "right")
    for dominance in hemispheres:
        usual: dict[str, CopyTable] = {}
        second: dict[str, CopyTable] = {}
        for copy_id, network in function_networks(graph, dominance).items():
            missing = [element for element in network.elements if element not in number]
            if missing:
                faults.append(Fault("no-geometry", copy_id, f"no geometry for {', '.join(missing)}",
                                    "geometry for every element of a function"))  # fmt: skip
                continue
            try:
                usual[copy_id] = _table(network, number, known)
                one_way = graph.functions[network.function].laterality in _ONE_WAY
                leans = None if one_way else leaning(network, second_load)
                second[copy_id] = usual[copy_id] if leans is None else _table(leans, number, known)
            except GraphError as error:
                faults.extend(error.faults)
        tables[dominance, "usual"] = usual
        tables[dominance, "second"] = second
    if faults:
        raise GraphError(*dict.fromkeys(faults))
    models: dict[str, dict[str, SignModel]] = {each: sign_models(graph, each) for each in hemispheres}
    ends_of = {
        number[segment]: tuple(number[place] for place in places if place in number)
        for segment, places in segment_ends(graph).items() if segment in number
    }  # fmt: skip
    remote = remote_model(graph, element_ids)
    return Prepared(graph, element_ids, number, is_region, tables, models, ends_of, remote)


def _table(
    network: FunctionNetwork, number: dict[str, int], known: dict[tuple[object, ...], CopyTable]
) -> CopyTable:
    """Cut table of a network; one that was seen before under the same name is taken again."""
    key = network.copy_id, network.elements, network.routes, network.route_loads
    if key not in known:
        known[key] = CopyTable(cut_table(network), np.array([number[e] for e in network.elements], np.intp))
    return known[key]
