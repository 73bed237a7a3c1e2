"""Why a sign that the damage would lead one to fear is not there: unexpected sparing, explained as fully as deficit."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.reasoning.findings import Finding
from byway.knowledge.reasoning.posterior import Reckoning
from byway.knowledge.reasoning.rerouting import route_flows
from byway.knowledge.reasoning.scenarios import Scenario, setting_of
from byway.knowledge.reasoning.signs import LossCache, SignModel
from byway.knowledge.reasoning.wording import join, list_names, route_name

__all__ = ["Sparing", "explain_sparing"]

Array = NDArray[np.float32]

_HIT = 0.25  # mean damage from which a sign's absence asks for a reason
_KEEPS = 0.05  # share of a function that counts as kept by a route or by headroom


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
            words = f"{name}{side} is absent although it might be feared: {join(list(reasons.values()))}"
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
    for copy in dict.fromkeys((*model.copies, *usual.copies)):
        name = graph.functions[copy.partition("@")[0]].name.lower()
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
            clauses = [flow.words(route_name(graph, network.function, flow.key)) for flow in kept]
            reasons["spared_route"] = f"of {name}, {join(clauses)}"
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
    if model.sensitivity < 0.8:
        reasons["test_misses"] = f"the bedside test misses {1 - model.sensitivity:.0%} of people who have the sign"
    return reasons


def _feared(reckoning: Reckoning, model: SignModel, damage: Array) -> float:
    """P(sign) if every element that is hit as drawn were lost altogether and nothing could re-route."""
    lost = np.where(damage >= _HIT, 1.0, damage).astype(np.float32)
    tables = reckoning.prepared.tables["left", "usual"]
    capacities = {copy: tables[copy].cuts.capacity(lost[None, tables[copy].rows], 0.0) for copy in model.copies}
    return float(np.max(model.tail(0, LossCache(capacities))))
