"""The ledger: every account against every finding, in numbers that add up to the posterior.

A finding's row is its own log-likelihood, averaged over the account's scenarios and draws. Findings that hang
together (one virtual anatomy explains both) make the joint likelihood differ from the product; the row ``together``
holds the difference. With the row ``prior``, a ledger's sum is ``log(posterior) + log(evidence)`` exactly.
"""

from __future__ import annotations

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from byway.knowledge.reasoning.grouping import Grouping
from byway.knowledge.reasoning.posterior import Reckoning

__all__ = ["LEDGER_COLUMNS", "Ledgers", "ledgers"]

LEDGER_COLUMNS = ["row", "sign", "name", "side", "found", "p_sign", "loglik", "vs_cortical"]


class Ledgers:
    """Ledgers of all accounts of one reckoning.

    Attributes
    ----------
    finding : (n_groups, F) float
        Log-likelihood of each finding under each account.
    p_sign : (n_groups, F) float
        P(sign at least mild) under each account, before the findings.
    together : (n_groups,) float
        What the joint log-likelihood has beyond the sum of the findings' own.
    log_prior : (n_groups,) float
    """

    def __init__(self, reckoning: Reckoning, grouping: Grouping) -> None:
        self._reckoning, self._grouping = reckoning, grouping
        weights = grouping.membership() * reckoning.prior
        weights /= weights.sum(axis=1, keepdims=True)
        likelihood = np.exp(reckoning.finding_logs).mean(axis=2, dtype=np.float64)  # (F, 288)
        self.finding: NDArray[np.float64] = np.log(weights @ likelihood.T)
        presence = [reckoning.expected(finding.sign_id) for finding in reckoning.findings]
        self.p_sign: NDArray[np.float64] = weights @ np.stack(presence, axis=1) if presence else np.zeros(
            (len(weights), 0))  # fmt: skip
        self.together: NDArray[np.float64] = grouping.loglik - self.finding.sum(axis=1)
        self.log_prior: NDArray[np.float64] = np.log(grouping.prior)

    def log_odds(self, account: int, against: int | None = None) -> float:
        """Posterior log-odds of one account against another (by default the plain cortical reading)."""
        other = self._grouping.plain if against is None else against
        return float(self._sums(account) - self._sums(other))

    def _sums(self, account: int) -> float:
        return float(self.log_prior[account] + self.finding[account].sum() + self.together[account])

    def table(self, account: int, against: int | None = None) -> pd.DataFrame:
        """One account's ledger: a row for its prior, one for each finding, one for how they hang together.

        Columns ``row`` (prior, finding, together), ``sign``, ``name``, ``side``, ``found``, ``p_sign``, ``loglik``,
        ``vs_cortical`` (difference from the plain cortical reading, or from account ``against``).
        """
        other = self._grouping.plain if against is None else against
        graph = self._reckoning.prepared.graph
        rows: list[tuple[object, ...]] = [
            ("prior", "prior", "How likely it was before the findings", "none", "", np.nan, self.log_prior[account],
             self.log_prior[account] - self.log_prior[other])
        ]  # fmt: skip
        for f, finding in enumerate(self._reckoning.findings):
            rows.append((
                "finding", finding.sign, graph.signs[finding.sign].name, finding.side, finding.grade,
                self.p_sign[account, f], self.finding[account, f],
                self.finding[account, f] - self.finding[other, f],
            ))  # fmt: skip
        rows.append(
            ("together", "together", "How the findings hang together", "none", "", np.nan, self.together[account],
             self.together[account] - self.together[other])
        )  # fmt: skip
        return pd.DataFrame(rows, columns=LEDGER_COLUMNS)


def ledgers(reckoning: Reckoning, grouping: Grouping) -> Ledgers:
    """The ledgers of all accounts."""
    return Ledgers(reckoning, grouping)
