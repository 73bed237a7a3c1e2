"""Why a sign that the damage would lead one to fear is not there: unexpected sparing, explained as fully as deficit."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.graph.graph import Graph
from byway.knowledge.reasoning.findings import Finding
from byway.knowledge.reasoning.posterior import Reckoning
from byway.knowledge.reasoning.rerouting import RouteFlow, route_flows
from byway.knowledge.reasoning.scenarios import Scenario, setting_of
from byway.knowledge.reasoning.signs import LossCache, SignModel
from byway.knowledge.reasoning.wording import in_a_sentence, join, list_names, route_name

__all__ = ["Sparing", "explain_sparing"]

Array = NDArray[np.float32]

_HIT = 0.25  # mean damage from which a sign's absence asks for a reason
_KEEPS = 0.05  # share of a function that counts as kept by a route or by headroom
_CLEAR = 0.03  # change of the share of a function that a route carries from which it is told
_MOST = 3  # routes that are named before the others are counted

FEARED = 0.5
"""P(sign), were all that is hit lost altogether, from which its absence asks for a reason."""


@dataclass(frozen=True)
class Sparing:
    """Reasons why one absent sign may be absent although something that it depends on is damaged.

    Parameters
    ----------
    sign, side : str
        The sign.
    reasons : tuple of str
        ``spared_route``, ``other_side``, ``partial_severing``, ``rerouting``, ``test_misses``, ``spared_anatomy``.
    words : str
        One sentence.
    """

    sign: str
    side: str
    reasons: tuple[str, ...]
    words: str


def explain_sparing(reckoning: Reckoning, scenario: Scenario) -> tuple[Sparing, ...]:
    """Sparing of every sign that was looked for and not found, although its functions are damaged as drawn."""
    found = []
    for finding in reckoning.findings:
        if finding.present:
            continue
        reasons = _reasons(reckoning, scenario, finding)
        if reasons:
            name = reckoning.prepared.graph.signs[finding.sign].name
            side = "" if finding.side == "none" else f" ({finding.side})"
            words = f"{name}{side} is absent although it might be feared: {'; '.join(reasons.values())}"
            found.append(Sparing(finding.sign, finding.side, tuple(reasons), words))
    return tuple(found)


def _reasons(reckoning: Reckoning, scenario: Scenario, finding: Finding) -> dict[str, str]:
    """Reasons by name, each a clause; empty where nothing that the sign depends on is much damaged."""
    graph = reckoning.prepared.graph
    plain = Scenario()
    model = reckoning.model(setting_of(scenario), finding.sign_id)
    usual = reckoning.model(setting_of(plain), finding.sign_id)
    as_drawn = reckoning.damage_of(plain).mean(axis=0)
    if _feared(reckoning, usual, as_drawn) < FEARED:
        return {}
    here = reckoning.damage_of(scenario)
    reasons: dict[str, str] = {}
    moved: dict[str, tuple[RouteFlow, ...]] = {}
    for copy in dict.fromkeys((*model.copies, *usual.copies)):
        name = in_a_sentence(graph.functions[copy.partition("@")[0]].name)
        typical = reckoning.prepared.tables["left", "usual"].get(copy)
        hit = typical is not None and as_drawn[typical.rows].max(initial=0.0) >= _HIT
        if hit and scenario.dominance == "right" and "dominant" in copy.partition("@")[2]:
            reasons["other_side"] = f"{name} lies in the other hemisphere"
            continue
        table = reckoning.prepared.tables[scenario.dominance, scenario.reliance].get(copy)
        if table is None:
            continue
        own = here[:, table.rows]
        mean = own.mean(axis=0)
        worst = int(mean.argmax())
        if mean[worst] < _HIT:
            continue
        network = table.cuts.network
        flows = route_flows(network, mean, reckoning.headroom)
        kept = [flow for flow in flows if flow.now >= _KEEPS and not any(
            mean[network.elements.index(e)] >= _HIT for e in flow.elements)]  # fmt: skip
        if kept and len(flows) > 1:
            moved[network.function] = flows
        elif mean[worst] < 0.8:
            part = list_names(graph, [network.elements[worst]])
            reasons["partial_severing"] = f"{part} is only {mean[worst]:.0%} out of action"
        with_room = float(table.cuts.capacity(mean[None].astype(np.float32), reckoning.headroom)[0])
        without = float(table.cuts.capacity(mean[None].astype(np.float32), 0.0)[0])
        if with_room - without >= _KEEPS:
            reasons["rerouting"] = f"{name} had time to re-route (capacity {with_room:.0%} instead of {without:.0%})"
        spared = float((own[:, worst] < _HIT).mean())
        if 0.1 <= spared < 0.9:
            reasons["spared_anatomy"] = f"in {spared:.0%} of the virtual anatomies that part is spared"
    if moved:
        reasons = {"spared_route": _functions_in_words(graph, moved), **reasons}
    if model.sensitivity < 0.8:
        reasons["test_misses"] = f"the bedside test misses {1 - model.sensitivity:.0%} of people who have the sign"
    return reasons


def _functions_in_words(graph: Graph, moved: Mapping[str, Sequence[RouteFlow]]) -> str:
    """The function that lost most in full, the others by name."""
    def lost(function: str) -> float:
        return sum(max(0.0, flow.usual - flow.now) for flow in moved[function])

    first, *others = sorted(moved, key=lambda function: -lost(function))
    words = _routes_in_words(graph, first, moved[first])
    if not others:
        return words
    names = join([in_a_sentence(graph.functions[function].name) for function in others])
    return f"{words}; spared routes also carry {names}"


def _routes_in_words(graph: Graph, function: str, flows: Sequence[RouteFlow]) -> str:
    """What a function with a spared route lost, which routes take over, and that the others work as usual."""
    def told(moved: list[RouteFlow]) -> str:
        moved.sort(key=lambda flow: -abs(flow.now - flow.usual))
        parts = [f"{route_name(graph, function, flow.key) or 'a detour'} ({_number(flow.now)} instead of "
                 f"{_number(flow.usual)})" for flow in moved[:_MOST]]  # fmt: skip
        more = len(moved) - _MOST
        return join(parts + ([f"{more} more"] if more > 0 else []))

    lost = told([flow for flow in flows if flow.usual - flow.now >= _CLEAR])
    taken = told([flow for flow in flows if flow.now - flow.usual >= _CLEAR])
    same = sum(abs(flow.now - flow.usual) < _CLEAR for flow in flows if flow.key != "recombined")
    name = in_a_sentence(graph.functions[function].name)
    if not lost:
        return f"{name} is carried by its routes about as usual"
    words = f"{name} is carried clearly less by {lost}"
    words += f"; takes over: {taken}" if taken else ""
    others = "the other route carries" if same == 1 else "the other routes carry"
    return f"{words}; {others} as much as usual" if same else words


def _number(share: float) -> str:
    return f"{share:.2f}" if share >= 0.005 else "nothing"


def _feared(reckoning: Reckoning, model: SignModel, damage: Array) -> float:
    """P(sign) if every element that is hit as drawn were lost altogether and nothing could re-route."""
    lost = np.where(damage >= _HIT, 1.0, damage).astype(np.float32)
    tables = reckoning.prepared.tables["left", "usual"]
    capacities = {copy: tables[copy].cuts.capacity(lost[None, tables[copy].rows], 0.0) for copy in model.copies}
    return float(np.max(model.tail(0, LossCache(capacities))))
