"""From scenarios to accounts: scenarios that predict the same for every sign are one account, of one kind."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, get_args

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.reasoning.posterior import SCENARIOS, SLIP, Reckoning
from byway.knowledge.reasoning.scenarios import Scenario, setting_of
from byway.knowledge.reasoning.signs import combined_capacity
from byway.knowledge.reasoning.states import state_number

__all__ = ["KINDS", "SAME", "AccountKind", "Group", "Grouping", "grey_share", "group_scenarios", "kind_of"]

AccountKind = Literal[
    "cortical_damage", "segment_disconnection", "both", "remote_effect", "atypical_dominance",
    "spared_alternate_route", "perilesional_effect", "boundary_error", "outside_lesion",
]  # fmt: skip
KINDS: tuple[AccountKind, ...] = get_args(AccountKind)

SAME = 0.02
"""Scenarios whose sign probabilities differ by less than this, sign by sign, count as predicting the same."""

PLAIN = Scenario(speaks="cortical")
MATERIAL = 0.1
"""Share of the lost capacity from which regions, or segments, count as part of the cause."""

_KIND_BY_DEPARTURE: tuple[tuple[str, AccountKind], ...] = (
    ("outside", "outside_lesion"),
    ("dominance", "atypical_dominance"),
    ("remote", "remote_effect"),
    ("reliance", "spared_alternate_route"),
    ("perilesional", "perilesional_effect"),
    ("boundary", "boundary_error"),
)


@dataclass(frozen=True)
class Group:
    """Scenarios that make one account.

    Parameters
    ----------
    first : int
        Number of the scenario that stands for it: the one with fewest departures.
    members : tuple of int
        Numbers of all its scenarios, ``first`` included.
    """

    first: int
    members: tuple[int, ...]

    @property
    def scenario(self) -> Scenario:
        """The scenario that stands for the group."""
        return SCENARIOS[self.first]


@dataclass(frozen=True, eq=False)
class Grouping:
    """All groups of one reckoning, with what is known of each.

    Parameters
    ----------
    groups : tuple of Group
        Best first.
    prior, posterior : (n_groups,) float
        Sums over the scenarios of each group.
    loglik : (n_groups,) float
        Log-likelihood of all findings together, slip included: ``posterior = prior * exp(loglik) / evidence``.
    log_evidence : float
        Logarithm of the evidence.
    plain : int
        The group that holds the plain cortical reading.
    """

    groups: tuple[Group, ...]
    prior: NDArray[np.float64]
    posterior: NDArray[np.float64]
    loglik: NDArray[np.float64]
    log_evidence: float
    plain: int

    def membership(self) -> NDArray[np.float64]:
        """One where a scenario (column) belongs to a group (row)."""
        matrix = np.zeros((len(self.groups), len(SCENARIOS)))
        for row, group in enumerate(self.groups):
            matrix[row, list(group.members)] = 1.0
        return matrix


def group_scenarios(reckoning: Reckoning) -> Grouping:
    """Gather scenarios into accounts and order them by posterior.

    Scenarios are taken from the fewest departures up, likelier ones first; each joins the first account that predicts
    the same (within :data:`SAME`) for every sign, at least mild and severe.
    """
    predictions = _predictions(reckoning)
    order = sorted(range(len(SCENARIOS)), key=lambda s: (len(SCENARIOS[s].departures), -reckoning.prior[s], s))
    firsts: list[int] = []
    members: dict[int, list[int]] = {}
    for s in order:
        if firsts:
            gaps = np.abs(predictions[firsts] - predictions[s]).max(axis=1)
            near = int(np.argmax(gaps < SAME)) if (gaps < SAME).any() else None
        else:
            near = None
        if near is None:
            firsts.append(s)
            members[s] = [s]
        else:
            members[firsts[near]].append(s)
    return regroup(reckoning, [Group(first, tuple(members[first])) for first in firsts])


def regroup(reckoning: Reckoning, groups: list[Group] | tuple[Group, ...]) -> Grouping:
    """The same groups weighed by another reckoning (other findings or priors), ordered anew."""
    top = float(reckoning.loglik.max())
    weighted = reckoning.prior * np.exp(reckoning.loglik - top)
    evidence = float(weighted.sum())
    prior = np.array([reckoning.prior[list(group.members)].sum() for group in groups])
    told = np.array([weighted[list(group.members)].sum() for group in groups]) / prior
    loglik = np.log((1.0 - SLIP) * told + SLIP * evidence) + top
    posterior = prior * ((1.0 - SLIP) * told + SLIP * evidence) / evidence
    order = sorted(range(len(groups)), key=lambda i: (-posterior[i], len(groups[i].scenario.departures), i))
    ordered = tuple(groups[i] for i in order)
    plain = next(i for i, group in enumerate(ordered) if SCENARIOS.index(PLAIN) in group.members)
    return Grouping(ordered, prior[order], posterior[order], loglik[order], float(np.log(evidence)) + top, plain)


def grey_share(reckoning: Reckoning, sign_ids: list[str], scenario: Scenario) -> float | None:
    """Share of the lost capacity behind some signs that damage of regions accounts for; segments have the rest.

    With L(all), L(regions), L(segments) the lost capacity, summed over the functions of the signs with their weights,
    when all damage speaks or only one kind: the mean of what regions add first, L(regions), and last,
    L(all) - L(segments); likewise for segments (Shapley's value for two). Segments alone means what is cut outside
    the regions at their ends. None where neither adds anything.
    """
    setting = setting_of(scenario)
    states = [state_number(Scenario(**{**vars(scenario), "speaks": speaks}))
              for speaks in ("both", "cortical", "segments")]  # fmt: skip
    lost = np.zeros(3)
    for sign_id in sign_ids:
        for term in reckoning.model(setting, sign_id).terms:
            capacity = combined_capacity(reckoning.capacities[setting], term.copies)
            if capacity is not None:
                lost += term.weight * (1.0 - capacity[states].mean(axis=1))
    whole, regions, segments = lost
    grey = max(0.0, regions + (whole - segments)) / 2
    cut = max(0.0, segments + (whole - regions)) / 2
    return float(grey / (grey + cut)) if grey + cut > 1e-3 else None


def kind_of(reckoning: Reckoning, group: Group) -> AccountKind:
    """Kind of an account: its weightiest departure; without one, what the lost capacity rests on.

    Where the plain cortical reading predicts the same as all damage together, nothing else is needed and the kind is
    cortical damage; where segments alone do, it is disconnection. Otherwise each side must account for a tenth of the
    lost capacity for the kind to be both.
    """
    scenario = group.scenario
    departures = dict(scenario.departures)
    for axis, kind in _KIND_BY_DEPARTURE:
        if axis in departures:
            return kind
    if scenario.speaks == "cortical" or SCENARIOS.index(PLAIN) in group.members:
        return "cortical_damage"
    if scenario.speaks == "segments" or SCENARIOS.index(Scenario(speaks="segments")) in group.members:
        return "segment_disconnection"
    found = [finding.sign_id for finding in reckoning.findings if finding.present]
    share = grey_share(reckoning, found, scenario)
    if share is None:
        share = grey_share(reckoning, list(reckoning.affected_signs), scenario)
    if share is None or share >= 1.0 - MATERIAL:
        return "cortical_damage"
    return "segment_disconnection" if share <= MATERIAL else "both"


def _predictions(reckoning: Reckoning) -> NDArray[np.float64]:
    """P(at least mild) and P(severe) of every affected sign in every scenario, and whether a cause lies outside."""
    columns = [np.array([float(scenario.outside == "yes") for scenario in SCENARIOS])]
    for sign_id in reckoning.affected_signs:
        columns += [reckoning.expected(sign_id, 0), reckoning.expected(sign_id, 2)]
    return np.stack(columns, axis=1)
