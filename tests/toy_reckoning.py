"""Reckonings and explanations on the toy graph, and a slow, obvious twin of the posterior."""

from __future__ import annotations

from collections.abc import Sequence
from types import SimpleNamespace
from typing import Any

import networkx as nx
import numpy as np
from toy_graph import toy_draws, toy_graph

from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.networks import function_networks
from byway.knowledge.reasoning.explain import Explanation, explain_findings
from byway.knowledge.reasoning.findings import GRADES, Finding, reading_matrix
from byway.knowledge.reasoning.posterior import Reckoning, reckon
from byway.knowledge.reasoning.prepared import prepare
from byway.knowledge.reasoning.rerouting import flow_graph
from byway.knowledge.reasoning.scenarios import Scenario, axis_priors, headroom_of, leaning
from byway.knowledge.reasoning.signs import LEAK_BY_GRADE, WIDTH

__all__ = ["absent", "found", "slow_likelihood", "toy_explanation", "toy_reckoning"]

HANDEDNESS, STAGE, CAUSE = "right", "acute", "infarct"


def found(sign: str, side: str = "none", grade: str = "moderate") -> Finding:
    """A finding in few words."""
    return Finding(sign, side, grade)  # type: ignore[arg-type]


def absent(sign: str, side: str = "none") -> Finding:
    """A sign that was looked for and not found."""
    return found(sign, side, "absent")


def toy_reckoning(
    damage: dict[str, float],
    findings: Sequence[Finding] = (),
    *,
    graph: Graph | None = None,
    stage: str = STAGE,
    handedness: str = HANDEDNESS,
    priors: Any = None,
    **draws: Any,
) -> Reckoning:
    """A reckoning on the toy graph."""
    graph = graph or toy_graph()
    ids, drawn, _ = toy_draws(graph, damage, **draws)
    return reckon(prepare(graph, ids), drawn, findings, headroom=headroom_of(graph, stage, CAUSE),
                  priors=axis_priors(graph, handedness, stage, CAUSE, priors))  # fmt: skip


def toy_explanation(
    damage: dict[str, float],
    findings: Sequence[Finding] = (),
    *,
    graph: Graph | None = None,
    stage: str = STAGE,
    cause: str = CAUSE,
    handedness: str = HANDEDNESS,
    priors: Any = None,
    **draws: Any,
) -> Explanation:
    """An explanation on the toy graph."""
    graph = graph or toy_graph()
    ids, drawn, share = toy_draws(graph, damage, **draws)
    return explain_findings(graph, SimpleNamespace(draws=drawn), SimpleNamespace(element_ids=ids, share=share),
                            SimpleNamespace(handedness=handedness), stage, cause, findings, priors=priors)  # fmt: skip


def slow_likelihood(reckoning: Reckoning, scenario: Scenario, finding: Finding, draw: int) -> float:
    """P(finding | scenario, draw) from scratch: plain loops, networkx's maximum flow, formulas as they are written."""
    graph, ids = reckoning.prepared.graph, reckoning.prepared.element_ids
    damage = _slow_damage(reckoning, scenario, draw)
    networks = function_networks(graph, scenario.dominance)
    sign = graph.signs[finding.sign]
    absent_by_grade = [1.0 - sign.leak * share for share in LEAK_BY_GRADE]
    for dependence, copies in graph.sign_dependences(finding.sign_id, scenario.dominance):
        hemispheres = [_side_of(copy, scenario.dominance) for copy in copies]
        if sign.side_rule == "contralateral" and hemispheres[0] == finding.side:
            continue
        groups = [copies] if sign.side_rule == "bilateral" else [(copy,) for copy in copies]
        for group in groups:
            capacity = max(_slow_capacity(networks[copy], damage, ids, reckoning, scenario) for copy in group)
            weight = dependence.weight
            if dependence.weight_dominant is not None and _side_of(group[0], scenario.dominance) == scenario.dominance:
                weight = dependence.weight_dominant
            for grade, threshold in enumerate(dependence.thresholds):
                absent_by_grade[grade] *= 1.0 - weight * _slow_loss(capacity, threshold)
    tails = [1.0 - each for each in absent_by_grade]
    if scenario.outside == "yes":
        tails = [1.0 - (1.0 - t) * (1.0 - rate) for t, rate in zip(tails, reckoning.outside_rates, strict=True)]
    true = [1.0 - tails[0], tails[0] - tails[1], tails[1] - tails[2], tails[2]]
    column = reading_matrix(sign.sensitivity, sign.specificity)[:, GRADES.index(finding.grade)]
    told = sum(p * q for p, q in zip(true, column, strict=True))
    return (1.0 - reckoning.lapse) * told + reckoning.lapse * (0.5 if finding.grade == "absent" else 1 / 6)


def _slow_damage(reckoning: Reckoning, scenario: Scenario, draw: int) -> dict[str, float]:
    graph, ids = reckoning.prepared.graph, reckoning.prepared.element_ids
    damage = dict(zip(ids, reckoning.draws[scenario.boundary][draw].tolist(), strict=True))
    if scenario.perilesional == "yes":
        rim = dict(zip(ids, reckoning.draws["perilesional"][draw].tolist(), strict=True))
        damage = {element: max(value, rim[element]) for element, value in damage.items()}
    if scenario.speaks != "both":
        whole = dict(damage)
        for element in ids:
            key, _, side = element.partition("@")
            if key in graph.regions:
                damage[element] = whole[element] if scenario.speaks == "cortical" else 0.0
            elif scenario.speaks == "cortical":
                damage[element] = 0.0
            else:
                left = 1.0
                for place in (graph.segments[key].from_place, graph.segments[key].to_place):
                    left *= 1.0 - whole.get(f"{place}@{side}", 0.0)
                damage[element] = min(1.0, max(0.0, 1.0 - (1.0 - whole[element]) / max(left, 1e-6)))
    if scenario.remote == "yes":
        damage = _slow_silenced(reckoning, damage)
    return damage


def _slow_silenced(reckoning: Reckoning, damage: dict[str, float]) -> dict[str, float]:
    graph = reckoning.prepared.graph
    threshold, effect = graph.norm("remote_input_loss_threshold"), graph.norm("remote_effect_size")
    total: dict[str, float] = {}
    lost: dict[str, float] = {}
    ids = reckoning.prepared.element_ids
    for link in reckoning.prepared.remote.connections:  # the connections themselves are tested beside their module
        region = ids[link.region]
        passed = 1.0
        for part in (*link.segments, *(() if link.far is None else (link.far,))):
            passed *= 1.0 - damage[ids[part]]
        total[region] = total.get(region, 0.0) + link.weight
        lost[region] = lost.get(region, 0.0) + link.weight * (1.0 - passed)
    silenced = dict(damage)
    for region, weight in total.items():
        share = lost[region] / weight
        if share >= threshold - 1e-7:
            silenced[region] = max(damage[region], effect * share)
    return silenced


def _slow_capacity(
    network: Any, damage: dict[str, float], ids: tuple[str, ...], reckoning: Reckoning, scenario: Scenario
) -> float:
    if scenario.reliance == "second":
        network = leaning(network, reckoning.prepared.graph.norm("reliance_second_load")) or network
    own = np.array([damage[element] for element in network.elements])
    return min(1.0, nx.maximum_flow_value(flow_graph(network, own, reckoning.headroom), "source", "sink"))


def _slow_loss(capacity: float, threshold: float) -> float:
    def logistic(at: float) -> float:
        return float(1.0 / (1.0 + np.exp((at - threshold) / WIDTH)))

    return min(1.0, max(0.0, (logistic(capacity) - logistic(1.0)) / (logistic(0.0) - logistic(1.0))))


def _side_of(copy: str, dominance: str) -> str:
    side = copy.partition("@")[2]
    other = "right" if dominance == "left" else "left"
    return {"dominant": dominance, "nondominant": other}.get(side, side)
