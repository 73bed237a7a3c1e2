"""Reserve: the homologue on the other side, spared routes, measured asymmetry; in careful words, never a promise."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import pandas as pd

from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.references import split_reference
from byway.knowledge.reasoning.explanation import Explanation
from byway.knowledge.reasoning.posterior import SCENARIOS
from byway.knowledge.reasoning.rerouting import route_flows
from byway.knowledge.reasoning.wording import join, route_name, share_words

__all__ = ["NO_PROMISE", "asymmetry_words", "reserve"]

NO_PROMISE = "What is spared may help; no one can promise from anatomy alone that it will."

_DAMAGED = 0.25
_NORM_OF = (
    ("arcuate_fasciculus.long", "arcuate_long_lateralisation"),
    ("arcuate_fasciculus.anterior", "arcuate_anterior_lateralisation"),
    ("slf_", "slf_lateralisation"),
)


def reserve(explanation: Explanation, asymmetries: Mapping[str, float] | None = None) -> pd.DataFrame:
    """What is left for the functions that are held back, one row for each damaged element that holds one back.

    Parameters
    ----------
    asymmetries : mapping, optional
        Segment key to measured index (right - left) / (right + left), from -1 to 1.

    Returns
    -------
    DataFrame
        ``function`` (copy id), ``name``, ``element``, ``damage`` (mean, as drawn), ``homologue`` (element id, or
        empty for the midline), ``homologue_damage``, ``spared_routes`` (tuple of words), ``carried`` (share of the
        function that still flows), ``asymmetry`` (NaN where not measured), ``asymmetry_words``, ``claims`` (keys of
        claims that say the homologue or a spared element compensates), ``words``.
    """
    reckoning = explanation.reckoning
    prepared, graph = reckoning.prepared, reckoning.prepared.graph
    drawn = SCENARIOS[0]
    mean = reckoning.damage_of(drawn).mean(axis=0)
    tables = prepared.tables[drawn.dominance, drawn.reliance]
    measured = asymmetries or {}
    rows = []
    for function in explanation.functions.to_dict("records"):
        if function["capacity"] > 0.9:
            continue
        copy = str(function["function"])
        network = tables[copy].cuts.network
        own = mean[tables[copy].rows]
        flows = route_flows(network, own, reckoning.headroom) if len(network.routes) > 1 else ()
        spared = tuple(flow.words(route_name(graph, network.function, flow.key)) for flow in flows if flow.now >= 0.05)
        for element in function["limited_by"]:
            damage = float(mean[prepared.number[element]])
            if damage < _DAMAGED:
                continue
            other = _homologue(element)
            key = split_reference(element)[0]
            index = float(measured.get(key, np.nan))
            claims = tuple(claim.key for claim in graph.claims_about(key, str(function["key"]))
                           if claim.relation == "compensates")  # fmt: skip
            other_damage = float(mean[prepared.number[other]]) if other in prepared.number else np.nan
            said = asymmetry_words(graph, key, index)
            rows.append((copy, function["name"], element, damage, other, other_damage, spared,
                         float(sum(flow.now for flow in flows)) if flows else float(function["capacity"]), index, said,
                         claims, _words(graph, element, damage, other, other_damage, spared, said)))  # fmt: skip
    return pd.DataFrame(rows, columns=[
        "function", "name", "element", "damage", "homologue", "homologue_damage", "spared_routes", "carried",
        "asymmetry", "asymmetry_words", "claims", "words",
    ])  # fmt: skip


def asymmetry_words(graph: Graph, segment: str, index: float) -> str:
    """A measured asymmetry beside the norm of people in general; empty where it was not measured.

    Parameters
    ----------
    index : float
        (right - left) / (right + left), from -1 to 1; NaN where not measured.
    """
    if not np.isfinite(index):
        return ""
    lean = "about equal on both sides" if abs(index) < 0.05 else f"larger on the {'right' if index > 0 else 'left'}"
    said = f"measured {lean} ({index:+.2f})"
    norm_key = next((norm for prefix, norm in _NORM_OF if segment.startswith(prefix)), None)
    norm = graph.norms.get(norm_key) if norm_key else None
    if norm is None:
        return f"{said}; no norm in the graph"
    if isinstance(norm.value, dict):
        parts = [f"{name.replace('_', ' ')} {value:g}" for name, value in norm.value.items()]
        basis = {"read": "", "memory": ", from memory", "judgement": ", our judgement"}[norm.basis]
        return f"{said}; people in general: {join(parts)} ({norm.unit}{basis})"
    return f"{said}; people in general: {norm.value:g} {norm.unit}"


def _homologue(element: str) -> str:
    """The same element on the other side; empty for the midline.

    >>> _homologue("arcuate_fasciculus.long_ventral@left"), _homologue("corpus_callosum.genu@midline")
    ('arcuate_fasciculus.long_ventral@right', '')
    """
    key, side = split_reference(element)
    return "" if side == "midline" else f"{key}@{'right' if side == 'left' else 'left'}"


def _words(
    graph: Graph, element: str, damage: float, other: str, other_damage: float, spared: tuple[str, ...], asymmetry: str
) -> str:
    parts = [f"{graph.name_of(element)} is {share_words(damage)}"]
    if other and np.isfinite(other_damage):
        state = "untouched" if other_damage < 0.02 else share_words(other_damage)
        parts.append(f"its counterpart on the other side is {state}" + (f" and {asymmetry}" if asymmetry else ""))
    if spared:
        parts.append(f"of the routes, {join(list(spared))}")
    return f"{'; '.join(parts)}. {NO_PROMISE}"
