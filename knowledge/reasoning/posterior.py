"""The posterior over all scenarios, averaged over the damage ensemble.

``P(scenario | findings)`` is proportional to ``prior(scenario) * mean_m prod_f P(finding f | scenario, draw m)``.
Averaging the product, not each factor, keeps findings together that one virtual anatomy explains together.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.reasoning.findings import Finding
from byway.knowledge.reasoning.prepared import Prepared
from byway.knowledge.reasoning.scenarios import AXES, AxisPriors, Scenario, enumerate_scenarios, prior_vector
from byway.knowledge.reasoning.signs import LossCache, SignModel, outside_tails
from byway.knowledge.reasoning.states import STATES, DamageStates, damage_states

__all__ = ["SLIP", "Reckoning", "log_mean", "reckon", "weigh", "with_findings", "without_finding"]

Array = NDArray[np.float32]

SCENARIOS = enumerate_scenarios()
SLIP = 1e-6
"""Probability that the whole reckoning says nothing: keeps every posterior above 0 and below 1."""

_SETTINGS = len(AXES["dominance"]) * len(AXES["reliance"])
_OUTSIDE = len(AXES["outside"])


@dataclass(frozen=True, eq=False)
class Reckoning:
    """Everything that follows from one lesion, one person and a list of findings.

    Scenario arrays are ordered as :func:`~byway.knowledge.reasoning.scenarios.enumerate_scenarios`.

    Parameters
    ----------
    prepared : Prepared
        The graph, made ready.
    draws : mapping
        The damage ensemble by variant, as it was given.
    states : DamageStates
        Damage in every state and draw.
    headroom : float
        Share by which intact elements can carry more than usual.
    priors : AxisPriors
        Prior by axis.
    findings : tuple of Finding
        What was found.
    lapse : float
        Probability that a finding says nothing.
    outside_rates : tuple of three float
        Rate at which a cause outside the lesion adds a sign: mild, moderate, severe or worse.
    capacities : list of dict
        For each setting (dominance, reliance): damaged function copies and their capacity, (36, M).
    finding_logs : (F, 288, M) float32
        Log-likelihood of each finding in each scenario and draw.
    """

    prepared: Prepared
    draws: Mapping[str, NDArray[np.floating]] = field(repr=False)
    states: DamageStates
    headroom: float
    priors: AxisPriors
    findings: tuple[Finding, ...]
    lapse: float
    outside_rates: tuple[float, float, float]
    capacities: list[dict[str, Array]]
    finding_logs: Array = field(repr=False)
    _losses: list[LossCache] = field(repr=False)

    @cached_property
    def prior(self) -> NDArray[np.float64]:
        """Prior of every scenario, (288,)."""
        return prior_vector(self.priors)

    @cached_property
    def joint_logs(self) -> NDArray[np.float64]:
        """Log-likelihood of all findings together in each scenario and draw, (288, M)."""
        joint: NDArray[np.float64] = self.finding_logs.sum(axis=0, dtype=np.float64)
        return joint

    @cached_property
    def loglik(self) -> NDArray[np.float64]:
        """Log-likelihood of all findings in each scenario, averaged over draws, (288,)."""
        return log_mean(self.joint_logs)

    @cached_property
    def posterior(self) -> NDArray[np.float64]:
        """Posterior of every scenario, (288,); sums to 1, each above 0 and below 1."""
        return weigh(self.prior, self.loglik)

    @cached_property
    def draw_weights(self) -> Array:
        """How the findings weigh the draws within each scenario, (288, M); rows sum to 1."""
        raw = np.exp(self.joint_logs - self.joint_logs.max(axis=1, keepdims=True))
        weights: Array = (raw / raw.sum(axis=1, keepdims=True)).astype(np.float32)
        return weights

    @cached_property
    def affected_signs(self) -> tuple[str, ...]:
        """Signs that depend on a function which is damaged in some state."""
        damaged = {copy for capacities in self.capacities for copy in capacities}
        return tuple(
            sign_id for sign_id in self.prepared.models["left"]
            if any(damaged.intersection(self.prepared.models[d][sign_id].copies) for d in AXES["dominance"])
        )  # fmt: skip

    def model(self, setting: int, sign_id: str) -> SignModel:
        """Model of a sign in a setting (dominance, reliance)."""
        return self.prepared.models[AXES["dominance"][setting // len(AXES["reliance"])]][sign_id]

    def tail(self, setting: int, sign_id: str, grade: int) -> Array | float:
        """P(sign at ``grade`` or worse) with no cause outside, (36, M) or one number; 0 is mild."""
        return self.model(setting, sign_id).tail(grade, self._losses[setting])

    def expected(self, sign_id: str, grade: int = 0) -> NDArray[np.float64]:
        """P(sign at ``grade`` or worse) in every scenario, mean over the draws as they stand, (288,)."""
        return self._over_scenarios(sign_id, grade, None)

    def expected_given_findings(self, sign_id: str, grade: int = 0) -> NDArray[np.float64]:
        """P(sign at ``grade`` or worse) in every scenario, draws weighed by the findings, (288,)."""
        return self._over_scenarios(sign_id, grade, self.draw_weights)

    def _over_scenarios(self, sign_id: str, grade: int, weights: Array | None) -> NDArray[np.float64]:
        rate = self.outside_rates[grade]
        out = np.empty((_SETTINGS, _OUTSIDE, len(STATES)))
        shaped = None if weights is None else weights.reshape(_SETTINGS, _OUTSIDE, len(STATES), -1)
        for setting in range(_SETTINGS):
            tail = self.tail(setting, sign_id, grade)
            for outside in range(_OUTSIDE):
                mean: NDArray[np.floating] | float
                if isinstance(tail, float):
                    mean = tail
                elif shaped is None:
                    mean = tail.mean(axis=1)
                else:
                    mean = np.einsum("sm,sm->s", tail, shaped[setting, outside])
                out[setting, outside] = 1.0 - (1.0 - mean) * (1.0 - rate) if outside else mean
        return out.ravel()

    def damage_of(self, scenario: Scenario) -> Array:
        """Damage of all elements in a scenario, (M, n_elements)."""
        return self.states.of_scenario(scenario, len(self.prepared.element_ids))


def reckon(
    prepared: Prepared,
    draws: Mapping[str, NDArray[np.floating]],
    findings: Sequence[Finding],
    *,
    headroom: float,
    priors: AxisPriors,
) -> Reckoning:
    """Capacities, signs and likelihoods of every scenario.

    Parameters
    ----------
    draws : mapping
        As for :func:`~byway.knowledge.reasoning.states.damage_states`.
    findings : sequence of Finding
        Checked findings; their order changes nothing.
    headroom : float
        As in :mod:`~byway.knowledge.reasoning.capacity`.
    """
    graph = prepared.graph
    states = damage_states(prepared, draws)
    rates = graph.norm("outside_sign_rate", "mild"), graph.norm("outside_sign_rate", "moderate"), graph.norm(
        "outside_sign_rate", "severe")  # fmt: skip
    capacities = _capacities(prepared, states, headroom)
    known: dict[tuple[tuple[int, ...], float], Array] = {}
    losses = [LossCache(each, known) for each in capacities]
    kept = tuple(findings)
    bare = Reckoning(prepared, draws, states, headroom, priors, kept, graph.norm("finding_lapse"), rates, capacities,
                     np.zeros((0, len(SCENARIOS), states.n_draws), np.float32), losses)  # fmt: skip
    return with_findings(bare, kept)


def with_findings(reckoning: Reckoning, findings: Sequence[Finding]) -> Reckoning:
    """The same lesion and person with other findings; nothing but their likelihood is reckoned again."""
    logs = np.empty((len(findings), _SETTINGS, _OUTSIDE, len(STATES), reckoning.states.n_draws), np.float32)
    for f, finding in enumerate(findings):
        for setting in range(_SETTINGS):
            model = reckoning.model(setting, finding.sign_id)
            tails = tuple(reckoning.tail(setting, finding.sign_id, grade) for grade in range(3))
            for outside in range(_OUTSIDE):
                seen = outside_tails(tails, reckoning.outside_rates) if outside else tails
                logs[f, setting, outside] = np.log(model.likelihood(finding, seen, reckoning.lapse))
    shape = (len(findings), len(SCENARIOS), reckoning.states.n_draws)
    return replace(reckoning, findings=tuple(findings), finding_logs=logs.reshape(shape))


def without_finding(reckoning: Reckoning, number: int) -> Reckoning:
    """The same reckoning with one finding left out."""
    kept = [f for f in range(len(reckoning.findings)) if f != number]
    return replace(reckoning, findings=tuple(reckoning.findings[f] for f in kept),
                   finding_logs=reckoning.finding_logs[kept])  # fmt: skip


def log_mean(logs: NDArray[np.float64]) -> NDArray[np.float64]:
    """Logarithm of the mean of ``exp(logs)`` over the last axis.

    >>> float(log_mean(np.log([[0.2, 0.4]]))[0].round(4)) == float(np.log(0.3).round(4))
    True
    """
    top = logs.max(axis=-1)
    mean: NDArray[np.float64] = top + np.log(np.exp(logs - top[..., None]).mean(axis=-1))
    return mean


def weigh(prior: NDArray[np.float64], loglik: NDArray[np.float64]) -> NDArray[np.float64]:
    """Bayes' rule with :data:`SLIP`: ``(1 - SLIP) * prior * likelihood / evidence + SLIP * prior``."""
    scaled = prior * np.exp(loglik - loglik.max())
    posterior: NDArray[np.float64] = (1.0 - SLIP) * scaled / scaled.sum() + SLIP * prior
    return posterior


def _capacities(prepared: Prepared, states: DamageStates, headroom: float) -> list[dict[str, Array]]:
    """Capacity of every damaged function copy, by setting; equal tables are evaluated once."""
    known: dict[int, Array | None] = {}
    settings = []
    for setting in prepared.settings():
        damaged: dict[str, Array] = {}
        for copy_id, table in prepared.tables[setting].items():
            if id(table) not in known:
                damage = states.of_copy(table)
                known[id(table)] = (
                    None if damage is None
                    else table.cuts.capacity(damage, headroom).reshape(len(STATES), states.n_draws)
                )  # fmt: skip
            capacity = known[id(table)]
            if capacity is not None:
                damaged[copy_id] = capacity
        settings.append(damaged)
    return settings
