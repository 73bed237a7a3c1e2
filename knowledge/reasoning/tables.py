"""Tables of functions and signs, as drawn and under the plain cortical reading."""

from __future__ import annotations

import numpy as np
import pandas as pd

from byway.knowledge.graph.references import split_reference
from byway.knowledge.reasoning.grouping import PLAIN
from byway.knowledge.reasoning.posterior import SCENARIOS, Reckoning
from byway.knowledge.reasoning.scenarios import Scenario, setting_of

__all__ = ["function_table", "sign_table"]


def function_table(reckoning: Reckoning, scenario: Scenario = SCENARIOS[0]) -> pd.DataFrame:
    """Capacity of every function copy in one scenario, beside the plain cortical reading; see :class:`Explanation`."""
    graph = reckoning.prepared.graph
    tables = reckoning.prepared.tables[scenario.dominance, scenario.reliance]
    cortical = Scenario(**{**vars(scenario), "speaks": "cortical"})
    here, grey = reckoning.damage_of(scenario), reckoning.damage_of(cortical)
    rows = []
    for copy, table in tables.items():
        function = graph.functions[split_reference(copy)[0]]
        own = here[:, table.rows]
        limited: tuple[str, ...] = ()
        capacity = np.ones(1, np.float32)
        if own.any():
            capacity = table.cuts.capacity(own, reckoning.headroom)
            _, named = table.cuts.bottleneck(own.mean(axis=0), reckoning.headroom)
            limited = tuple(table.cuts.network.elements[i] for i in named) if capacity.mean() < 0.995 else ()
        plain = float(table.cuts.capacity(grey[:, table.rows], reckoning.headroom).mean())
        low, high = np.quantile(capacity, [0.05, 0.95])
        rows.append((copy, function.key, function.name, function.domain, float(capacity.mean()), float(low),
                     float(high), plain, limited))  # fmt: skip
    columns = ["function", "key", "name", "domain", "capacity", "low", "high", "capacity_cortical", "limited_by"]
    return pd.DataFrame(rows, columns=columns)


def sign_table(reckoning: Reckoning) -> pd.DataFrame:
    """Expected and found signs; see :class:`Explanation`."""
    graph = reckoning.prepared.graph
    plain, drawn = SCENARIOS.index(PLAIN), SCENARIOS[0]
    found = {finding.sign_id: finding.grade for finding in reckoning.findings}
    affected = set(reckoning.affected_signs)
    rate, prior_out = reckoning.outside_rates[0], reckoning.priors["outside"]["yes"]
    posterior_out = float(reckoning.posterior[[each.outside == "yes" for each in SCENARIOS]].sum())
    rows = []
    for sign_id in graph.sign_ids():
        key, _, side = sign_id.rpartition("@")
        sign = graph.signs[key]
        if sign_id in affected:
            expected = reckoning.expected(sign_id)
            draws = np.atleast_1d(np.asarray(reckoning.tail(setting_of(drawn), sign_id, 0)))
            low, high = np.quantile(draws[0] if draws.ndim == 2 else draws, [0.05, 0.95])
            cortical, full = float(expected[plain]), float(expected @ reckoning.prior)
            given = float(reckoning.expected_given_findings(sign_id) @ reckoning.posterior)
        else:
            low = high = cortical = sign.leak
            full, given = (1.0 - (1.0 - sign.leak) * (1.0 - rate * p) for p in (prior_out, posterior_out))
        rows.append((key, side, sign.name, sign.domain, cortical, full, float(low), float(high), given,
                     found.get(sign_id)))  # fmt: skip
    columns = ["sign", "side", "name", "domain", "expected_cortical", "expected", "low", "high",
               "expected_given_findings", "found"]  # fmt: skip
    table = pd.DataFrame(rows, columns=columns)
    table["found"] = pd.Series([row[-1] for row in rows], dtype=object)  # None stays None: not tested
    return table
