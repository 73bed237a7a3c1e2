"""A function's network in one damage state, as plain values for the browser. All numbers come from reasoning."""

from __future__ import annotations

from typing import Any

import numpy as np

from byway.knowledge.graph.references import split_reference
from byway.knowledge.reasoning.rerouting import route_flows
from byway.knowledge.reasoning.scenarios import Scenario
from byway.widgets.panel import claims_of, element_words
from byway.widgets.wire import plain

__all__ = ["choices_of", "network_of"]

HELD = 0.95


def choices_of(explanation: Any, words: dict[str, str]) -> list[dict[str, Any]]:
    """Function copies to choose from, those that are held back first."""
    if explanation is None:
        return []
    rows = []
    for row in explanation.functions.itertuples(index=False):
        side = split_reference(row.function)[1]
        name = row.name if side in ("bilateral", "dominant") else f"{row.name}, {words.get(f'copy_{side}', side)}"
        held = row.capacity < HELD
        rows.append({"id": row.function, "name": name, "capacity": float(row.capacity),
                     "group": words["held_back"] if held else words[f"domain_{row.domain}"]})  # fmt: skip
    rows.sort(key=lambda row: (row["capacity"] >= HELD, row["capacity"] if row["capacity"] < HELD else 0.0))
    return rows


def network_of(
    explanation: Any, graph: Any, copy: str, account: int | None = None, *, recombined: str = "recombined"
) -> dict[str, Any]:
    """The network of a function copy with what its routes usually carry and carry now.

    Parameters
    ----------
    explanation : Explanation
    graph : Graph
    copy : str
        Function copy id.
    account : int, optional
        Rank of the account whose scenario is meant; as drawn with typical organisation where None.
    recombined : str
        What to call a path that takes pieces of several routes.

    Returns
    -------
    dict
        ``copy``, ``capacity`` (at the mean damage; what all routes carry now), ``words``, ``nodes`` and ``routes``.
    """
    reckoning = explanation.reckoning
    scenario = Scenario() if account is None else explanation.accounts[account].scenario
    table = reckoning.prepared.tables[scenario.dominance, scenario.reliance][copy]
    network = table.cuts.network
    damage = np.asarray(reckoning.damage_of(scenario)[:, table.rows].mean(axis=0))
    flows = route_flows(network, damage, reckoning.headroom)
    least, held = table.cuts.bottleneck(damage, reckoning.headroom)
    number = {element: i for i, element in enumerate(network.elements)}
    function = graph.functions[network.function]
    names = {route.key: route.name for route in function.routes}
    marked = set(held) if least < HELD else set()
    routes = []
    for flow in flows:
        if not flow.elements:
            continue
        key, side = split_reference(flow.key)
        name = names.get(key, recombined) + (f", {side}" if side else "")
        routes.append({"key": flow.key, "name": name, "usual": flow.usual, "now": flow.now,
                       "path": [number[element] for element in flow.elements]})  # fmt: skip
    nodes = [
        {
            **element_words(graph, element),
            "z": _height_mm(graph, element),
            "load": network.element_loads[i],
            "damage": float(damage[i]),
            "held": i in marked,
            "claims": claims_of(graph.claims_about(element, network.function), graph),
        }
        for i, element in enumerate(network.elements)
    ]
    capacity = min(1.0, sum(route["now"] for route in routes))
    return dict(plain({"copy": copy, "name": function.name, "capacity": capacity, "held": bool(marked),
                       "nodes": nodes, "routes": routes}))  # fmt: skip


def _height_mm(graph: Any, element: str) -> float:
    """Mean height of a place, MNI z in mm."""
    place = graph.place(element)
    points = getattr(place, "seeds_mni", None) or place.waypoints_mni
    return float(np.mean([point[2] for point in points]))
