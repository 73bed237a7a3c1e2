"""Two graphs, or rival models of one function, on the same case: which fits which finding, and by how much."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pandas as pd

from byway.knowledge.reasoning.explanation import Explanation
from byway.knowledge.reasoning.posterior import log_mean
from byway.knowledge.reasoning.wording import join

__all__ = ["ModelComparison", "compare_models"]


@dataclass(frozen=True, eq=False)
class ModelComparison:
    """How well each model foresees each finding.

    Parameters
    ----------
    table : DataFrame
        ``row`` (finding or together), ``sign``, ``name``, ``side``, ``found``, one column of log-probability a model,
        ``fits`` (the model that foresees it best, or empty where they agree), ``by`` (log-odds of the best against
        the next).
    evidence : Series
        Log-probability of all findings together, by model; the columns of the table sum to it.
    words : str
        One or two sentences.
    """

    table: pd.DataFrame
    evidence: pd.Series
    words: str

    def odds(self, first: str, second: str) -> float:
        """Odds that the findings give one model against another, where both were as likely before."""
        return float(np.exp(np.clip(self.evidence[first] - self.evidence[second], -700, 700)))


def compare_models(explanations: Mapping[str, Explanation]) -> ModelComparison:
    """Compare models that were each asked to explain the same findings.

    A finding's log-probability is averaged over scenarios (by their priors) and draws; the row ``together`` holds
    what the joint probability has beyond the sum.

    Raises
    ------
    ValueError
        Fewer than two models, or other findings in one of them.
    """
    names = list(explanations)
    if len(names) < 2:
        raise ValueError("two models or more are wanted")
    first = explanations[names[0]].reckoning
    if any(each.reckoning.findings != first.findings for each in explanations.values()):
        raise ValueError("the models were asked about different findings")
    columns: dict[str, list[float]] = {}
    evidence: dict[str, float] = {}
    for name, explanation in explanations.items():
        reckoning = explanation.reckoning
        prior = np.log(reckoning.prior)
        marginal = [float(np.logaddexp.reduce(prior + log_mean(logs.astype(np.float64))))
                    for logs in reckoning.finding_logs]  # fmt: skip
        evidence[name] = float(np.logaddexp.reduce(prior + reckoning.loglik))
        columns[name] = [*marginal, evidence[name] - sum(marginal)]
    signs = first.prepared.graph.signs
    rows: list[tuple[str, str, str, str, str]] = [
        ("finding", each.sign, signs[each.sign].name, each.side, each.grade) for each in first.findings
    ]
    rows.append(("together", "together", "How the findings hang together", "none", ""))
    table = pd.DataFrame(rows, columns=["row", "sign", "name", "side", "found"])
    for name in names:
        table[name] = columns[name]
    values = np.array([columns[name] for name in names])
    ranked = np.sort(values, axis=0)
    gap = ranked[-1] - ranked[-2]
    best = values.argmax(axis=0)
    table["fits"] = [names[b] if g >= 0.05 else "" for b, g in zip(best, gap, strict=True)]
    table["by"] = gap
    total = pd.Series(evidence)
    return ModelComparison(table, total, _words(table, total))


def _words(table: pd.DataFrame, evidence: pd.Series) -> str:
    ranked = evidence.sort_values(ascending=False)
    ahead = float(ranked.iloc[0] - ranked.iloc[1])
    if ahead < 0.1:
        return "These findings do not tell the models apart."
    told = table[(table["row"] == "finding") & (table["fits"] == ranked.index[0])].sort_values("by", ascending=False)
    said = join([str(name) for name in told["name"].head(3)])
    odds = float(np.exp(min(ahead, 700.0)))
    text = f"The findings speak for {ranked.index[0]} against {ranked.index[1]}, {odds:.1f} to 1"
    return text + (f", most of all {said}." if said else ".")
