"""The user's own account, scored on the same ledger as the others, and any two accounts compared finding by finding."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace

import numpy as np
import pandas as pd

from byway.knowledge.faults import BywayError, Fault, nearest
from byway.knowledge.reasoning.accounts import LIKELY, Account, FoundSign
from byway.knowledge.reasoning.explanation import Explanation
from byway.knowledge.reasoning.ledger import LEDGER_COLUMNS, ledgers
from byway.knowledge.reasoning.posterior import SCENARIOS, SLIP, Reckoning, reckon
from byway.knowledge.reasoning.scenarios import Scenario
from byway.knowledge.reasoning.wording import DEPARTURE_WORDS, in_words, join

__all__ = ["OwnAccount", "ScoredAccount", "compare", "score"]


@dataclass(frozen=True)
class OwnAccount:
    """An account that a user wrote.

    Parameters
    ----------
    title, text, by : str
        Its name, the argument in free text, and who wrote it.
    elements : mapping of str to (float or None)
        The elements that it rests on: None takes the damage as drawn, a number from 0 to 1 sets it. Every other
        element counts as intact. Empty means: all damage as drawn.
    scenario : Scenario
        Settings of the seven axes.
    """

    title: str
    elements: Mapping[str, float | None] = field(default_factory=dict)
    scenario: Scenario = SCENARIOS[0]
    text: str = ""
    by: str = ""


@dataclass(frozen=True, eq=False)
class ScoredAccount:
    """A user's account on the ledger.

    Parameters
    ----------
    own : OwnAccount
        The account.
    ledger : DataFrame
        As for the others; its sum is ``log(prior * likelihood)``.
    prior : float
        Prior of its scenario.
    loglik : float
        Log-likelihood of all findings.
    posterior_beside : float
        Its posterior if it stood beside all other accounts.
    odds_vs_cortical : float
        Odds against the plain cortical reading.
    words : str
        ``posterior_beside`` on the verbal scale.
    explains, leaves, predicts_absent : tuple of FoundSign
        As for other accounts.
    """

    own: OwnAccount
    ledger: pd.DataFrame
    prior: float
    loglik: float
    posterior_beside: float
    odds_vs_cortical: float
    words: str
    explains: tuple[FoundSign, ...]
    leaves: tuple[FoundSign, ...]
    predicts_absent: tuple[FoundSign, ...]

    @property
    def title(self) -> str:
        """Its title."""
        return self.own.title

    @property
    def departures(self) -> str:
        """Its settings in words; empty for as drawn, typical organisation."""
        return join([DEPARTURE_WORDS[each] for each in self.own.scenario.departures])


def score(explanation: Explanation, own: OwnAccount) -> ScoredAccount:
    """Score a user's account on the findings of an explanation.

    Raises
    ------
    BywayError
        An unknown element, or damage outside [0, 1].
    """
    reckoning = _own_reckoning(explanation.reckoning, own)
    graph, grouping = reckoning.prepared.graph, explanation.grouping
    s = SCENARIOS.index(own.scenario)
    books = ledgers(explanation.reckoning, grouping)
    plain = books.table(grouping.plain)
    finding = np.log(np.exp(reckoning.finding_logs[:, s]).mean(axis=1, dtype=np.float64))
    evidence = grouping.log_evidence
    top = max(float(reckoning.loglik[s]), evidence)
    loglik = top + float(np.log((1 - SLIP) * np.exp(reckoning.loglik[s] - top) + SLIP * np.exp(evidence - top)))
    prior = float(reckoning.prior[s])
    presence = [float(reckoning.expected(each.sign_id)[s]) for each in reckoning.findings]
    told = [*finding.tolist(), loglik - float(finding.sum())]
    rows = [("prior", "prior", plain["name"].iloc[0], "none", "", np.nan, np.log(prior))]
    rows += [("finding", each.sign, graph.signs[each.sign].name, each.side, each.grade, p, value)
             for each, p, value in zip(reckoning.findings, presence, told, strict=False)]  # fmt: skip
    rows += [("together", "together", plain["name"].iloc[-1], "none", "", np.nan, told[-1])]
    ledger = pd.DataFrame(rows, columns=LEDGER_COLUMNS[:-1])
    ledger["vs_cortical"] = ledger["loglik"] - plain["loglik"].to_numpy()
    found = [FoundSign(each.sign, each.side, graph.signs[each.sign].name, each.grade, p)
             for each, p in zip(reckoning.findings, presence, strict=True)]  # fmt: skip
    log_odds = float(np.clip(np.log(prior) + loglik - evidence, -700, 700))
    beside = float(1.0 / (1.0 + np.exp(-log_odds)))
    return ScoredAccount(
        own, ledger, prior, loglik, beside, float(np.exp(np.clip(ledger["vs_cortical"].sum(), -700, 700))),
        in_words(beside),
        tuple(each for each in found if each.found != "absent" and each.p_sign >= LIKELY),
        tuple(each for each in found if each.found != "absent" and each.p_sign < LIKELY),
        tuple(each for each in found if each.found == "absent" and each.p_sign >= LIKELY),
    )  # fmt: skip


def compare(first: Account | ScoredAccount, second: Account | ScoredAccount) -> pd.DataFrame:
    """What tells two accounts apart, row by row of the ledger, most telling first.

    Returns
    -------
    DataFrame
        ``row``, ``sign``, ``name``, ``side``, ``found``, ``p_first``, ``p_second``, ``loglik_first``,
        ``loglik_second``, ``for_first`` (difference of log-likelihoods; its sum is the log-odds of the first account
        against the second), ``words``.

    Raises
    ------
    ValueError
        The two ledgers hold other findings.
    """
    a, b = first.ledger, second.ledger
    if list(a["sign"] + "@" + a["side"]) != list(b["sign"] + "@" + b["side"]):
        raise ValueError("the two ledgers hold different findings")
    table = a[["row", "sign", "name", "side", "found"]].copy()
    table["p_first"], table["p_second"] = a["p_sign"], b["p_sign"]
    table["loglik_first"], table["loglik_second"] = a["loglik"], b["loglik"]
    table["for_first"] = a["loglik"] - b["loglik"]
    table["words"] = [_balance(float(value)) for value in table["for_first"]]
    order = table["for_first"].abs().sort_values(ascending=False, kind="stable").index
    return table.loc[order].reset_index(drop=True)


def _own_reckoning(reckoning: Reckoning, own: OwnAccount) -> Reckoning:
    """The reckoning with damage as the user's account has it."""
    if not own.elements:
        return replace(reckoning)
    prepared = reckoning.prepared
    for element, value in own.elements.items():
        if element not in prepared.number:
            raise BywayError(Fault("unknown-element", element, "no such element", "key@side",
                                   nearest(element, prepared.element_ids)))  # fmt: skip
        if value is not None and not 0.0 <= value <= 1.0:
            raise BywayError(Fault("damage-range", element, f"damage {value}", "a number from 0 to 1"))
    draws = {}
    for variant, array in reckoning.draws.items():
        mine = np.zeros(array.shape, np.float32)
        for element, value in own.elements.items():
            column = prepared.number[element]
            mine[:, column] = array[:, column] if value is None else value
        draws[variant] = mine
    return reckon(prepared, draws, reckoning.findings, headroom=reckoning.headroom, priors=reckoning.priors)


def _balance(value: float) -> str:
    """How far one row speaks for the first account.

    >>> _balance(1.2), _balance(-0.05)
    ('speaks for the first (3.3 to 1)', 'tells nothing')
    """
    if abs(value) < 0.1:
        return "tells nothing"
    odds = float(np.exp(min(abs(value), 700.0)))
    return f"speaks for the {'first' if value > 0 else 'second'} ({odds:.1f} to 1)"
