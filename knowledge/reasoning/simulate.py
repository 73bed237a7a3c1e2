"""Simulated truth: cases drawn from the model, or from a world that differs from it, and how well posteriors hold."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from byway.knowledge.reasoning.findings import GRADES, Finding, FoundGrade, reading_matrix
from byway.knowledge.reasoning.grouping import Grouping, group_scenarios
from byway.knowledge.reasoning.posterior import SCENARIOS, Reckoning, log_mean, weigh, with_findings
from byway.knowledge.reasoning.scenarios import setting_of
from byway.knowledge.reasoning.states import state_number

__all__ = ["Calibration", "calibration", "calibration_error", "simulate_case"]


@dataclass(frozen=True, eq=False)
class Calibration:
    """How posteriors of accounts compare with the truth, over simulated cases.

    Parameters
    ----------
    cases : int
        Number of cases.
    error : float
        Expected calibration error of the first account's posterior, over ten bins of equal width.
    error_all : float
        The same over all (case, account) pairs, weighted by posterior.
    first_right : float
        Share of cases in which the true account is first.
    first_expected : float
        Mean posterior of the first account: the share that Bayes' optimal classifier gets right in the model's world.
    bins : DataFrame
        ``predicted`` (mean posterior of the first account), ``observed`` (share in which it is true), ``count``.
    """

    cases: int
    error: float
    error_all: float
    first_right: float
    first_expected: float
    bins: pd.DataFrame


def simulate_case(
    reckoning: Reckoning,
    signs: Sequence[str],
    rng: np.random.Generator,
    *,
    world: Reckoning | None = None,
    accuracy_loss: float = 0.0,
) -> tuple[int, tuple[Finding, ...]]:
    """A true scenario from the priors, a true anatomy from the draws, and findings that follow from them.

    Parameters
    ----------
    signs : sequence of str
        Signs that are tested.
    world : Reckoning, optional
        Where the truth is drawn from; the model itself by default.
    accuracy_loss : float
        Taken from every test's sensitivity and specificity in the world (but not in the model).

    Returns
    -------
    int
        Number of the true scenario.
    tuple of Finding
        One a sign.
    """
    truth = world or reckoning
    scenario = int(rng.choice(len(SCENARIOS), p=truth.prior))
    setting, outside = setting_of(SCENARIOS[scenario]), SCENARIOS[scenario].outside == "yes"
    state = state_number(SCENARIOS[scenario])
    draw = int(rng.integers(truth.states.n_draws))
    findings = []
    for sign_id in signs:
        tails = []
        for grade in range(3):
            tail = truth.tail(setting, sign_id, grade)
            p = tail if isinstance(tail, float) else float(tail[state, draw])
            tails.append(1.0 - (1.0 - p) * (1.0 - truth.outside_rates[grade]) if outside else p)
        there = int(np.sum(rng.random() < np.array(tails)))
        model = truth.model(setting, sign_id)
        reading = reading_matrix(max(0.5, model.sensitivity - accuracy_loss),
                                 max(0.5, model.specificity - accuracy_loss))[there]  # fmt: skip
        if rng.random() < truth.lapse:
            reading = np.array([0.5, 1 / 6, 1 / 6, 1 / 6])
        grade_found: FoundGrade = GRADES[int(rng.choice(4, p=reading / reading.sum()))]
        key, _, side = sign_id.rpartition("@")
        findings.append(Finding(key, side, grade_found))  # type: ignore[arg-type]
    return scenario, tuple(findings)


def calibration(
    reckoning: Reckoning,
    signs: Sequence[str],
    *,
    cases: int = 2000,
    tested: int = 10,
    seed: int = 0,
    world: Reckoning | None = None,
    accuracy_loss: float = 0.0,
) -> Calibration:
    """Simulate cases on one lesion and weigh the posteriors of accounts against the known truth.

    Parameters
    ----------
    signs : sequence of str
        Signs to choose from; each case tests ``tested`` of them, chosen at random.
    world, accuracy_loss
        As for :func:`simulate_case`: a world that the model does not know about.
    """
    rng = np.random.default_rng(seed)
    grouping = group_scenarios(reckoning)
    account_of = _account_of(grouping)
    tables = _likelihood_tables(reckoning, signs)
    membership = grouping.membership()
    posteriors = np.empty((cases, len(grouping.groups)))
    truths = np.empty(cases, int)
    for case in range(cases):
        chosen = sorted(rng.choice(len(signs), min(tested, len(signs)), replace=False).tolist())
        picked = [signs[i] for i in chosen]
        scenario, findings = simulate_case(reckoning, picked, rng, world=world, accuracy_loss=accuracy_loss)
        joint = np.zeros(tables[0][0].shape)
        for i, finding in zip(chosen, findings, strict=True):
            joint += tables[i][GRADES.index(finding.grade)]
        posteriors[case] = membership @ weigh(reckoning.prior, log_mean(joint))
        truths[case] = account_of[scenario]
    first = posteriors.argmax(axis=1)
    confidence = posteriors[np.arange(cases), first]
    right = (first == truths).astype(float)
    observed = np.zeros_like(posteriors)
    observed[np.arange(cases), truths] = 1.0
    return Calibration(
        cases,
        calibration_error(confidence, right),
        calibration_error(posteriors.ravel(), observed.ravel(), weights=posteriors.ravel()),
        float(right.mean()),
        float(confidence.mean()),
        _bins(confidence, right),
    )


def calibration_error(
    predicted: NDArray[np.floating],
    observed: NDArray[np.floating],
    *,
    weights: NDArray[np.floating] | None = None,
    bins: int = 10,
) -> float:
    """Expected calibration error: mean gap between predicted and observed over equal-width bins, by weight.

    >>> calibration_error(np.array([0.05, 0.05, 0.95, 0.95]), np.array([0.0, 0.0, 1.0, 1.0])).__round__(2)
    0.05
    """
    weight = np.ones_like(predicted) if weights is None else np.asarray(weights, float)
    which = np.minimum((np.asarray(predicted) * bins).astype(int), bins - 1)
    error = 0.0
    for each in range(bins):
        inside = which == each
        total = float(weight[inside].sum())
        if total > 0:
            gap = float((weight[inside] * (predicted[inside] - observed[inside])).sum()) / total
            error += total * abs(gap)
    return error / float(weight.sum())


def _account_of(grouping: Grouping) -> NDArray[np.intp]:
    """Account of each scenario."""
    account = np.empty(len(SCENARIOS), np.intp)
    for number, group in enumerate(grouping.groups):
        account[list(group.members)] = number
    return account


def _likelihood_tables(reckoning: Reckoning, signs: Sequence[str]) -> list[list[NDArray[np.float64]]]:
    """Log-likelihood of every grade of every sign, in each scenario and draw."""
    tables = []
    for sign_id in signs:
        key, _, side = sign_id.rpartition("@")
        each = [Finding(key, side, grade) for grade in GRADES]  # type: ignore[arg-type]
        tables.append([logs.astype(np.float64) for logs in with_findings(reckoning, each).finding_logs])
    return tables


def _bins(confidence: NDArray[np.float64], right: NDArray[np.float64], bins: int = 10) -> pd.DataFrame:
    """Confidence of the first account against how often it is right."""
    which = np.minimum((confidence * bins).astype(int), bins - 1)
    rows = [(float(confidence[which == b].mean()), float(right[which == b].mean()), int((which == b).sum()))
            for b in range(bins) if (which == b).any()]  # fmt: skip
    return pd.DataFrame(rows, columns=["predicted", "observed", "count"])
