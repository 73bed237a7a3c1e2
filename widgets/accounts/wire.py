"""Accounts, next tests and next images as plain values for the browser. Nothing is reckoned here but sums and names."""

from __future__ import annotations

from typing import Any

import pandas as pd

from byway.widgets.panel import claims_of, element_words
from byway.widgets.wire import plain

__all__ = ["profile_rows", "scored_told", "told_of"]

MOST_ELEMENTS = 8
MOST_CHANGES = 12
MOST_NEXT = 8
LEAST_BITS = 0.005


def told_of(explanation: Any, graph: Any) -> dict[str, Any]:
    """Everything the accounts panel draws.

    Parameters
    ----------
    explanation : Explanation or None
    graph : Graph or None
        Gives names; keys stand in without it.
    """
    if explanation is None:
        return {}
    accounts = [_account(account, i, graph) for i, account in enumerate(explanation.accounts)]
    return {
        "accounts": plain(accounts),
        "unfound": not any(row["row"] == "finding" for a in accounts[:1] for row in a["ledger"]),
        "remarks": [str(line) for line in getattr(explanation, "remarks", ())],
        "other_posterior": plain(explanation.other_posterior),
        "next_tests": plain(_next_tests(explanation)),
        "next_images": plain(_next_images(explanation.next_images, graph)),
        "next_axes": plain(
            [
                {name: row[name] for name in ("axis", "bits", "image")}
                for row in _rows(explanation.next_axes)
                if row["bits"] >= LEAST_BITS
            ]
        ),
        "uncharted_share": plain(explanation.uncharted_share),
    }


def _account(account: Any, index: int, graph: Any) -> dict[str, Any]:
    ledger = _rows(account.ledger)
    return {
        "key": account.key,
        "index": index,
        "title": account.title,
        "kind": account.kind,
        "is_plain": account.is_plain,
        "prior": account.prior,
        "posterior": account.posterior,
        "words": account.words,
        "odds_vs_cortical": account.odds_vs_cortical,
        "elements": [element_words(graph, element) for element in account.elements[:MOST_ELEMENTS]],
        "explains": [dict(vars(sign)) for sign in account.explains],
        "leaves": [dict(vars(sign)) for sign in account.leaves],
        "predicts_absent": [dict(vars(sign)) for sign in account.predicts_absent],
        "sparing": [sparing.words for sparing in account.sparing],
        "ledger": ledger,
        "ledger_sum": {name: sum(row[name] for row in ledger) for name in ("loglik", "vs_cortical")},
        "bottlenecks": [
            {name: row[name] for name in ("function", "capacity", "words")} for row in _rows(account.bottlenecks)
        ],
        "counterfactuals": _changes(account.counterfactuals, graph),
        "claims_for": claims_of(account.claims_for, graph),
        "claims_against": claims_of(account.claims_against, graph),
        "cautions": list(account.cautions),
    }


def _rows(table: pd.DataFrame) -> list[dict[str, Any]]:
    return [dict(zip(table.columns, row, strict=True)) for row in table.itertuples(index=False, name=None)]


def _sign_name(sign: str, graph: Any) -> str:
    return str(graph.signs[sign].name) if graph is not None and sign in graph.signs else sign


def _changes(table: pd.DataFrame, graph: Any) -> list[dict[str, Any]]:
    rows = []
    for row in _rows(table)[:MOST_CHANGES]:
        rows.append({"element": element_words(graph, row["element"]), "sign": row["sign"], "side": row["side"],
                     "name": _sign_name(row["sign"], graph), "change": row["change"]})  # fmt: skip
    return rows


def _next_tests(explanation: Any) -> list[dict[str, Any]]:
    """Tests that tell something, with the rank of the account that would lead after each outcome."""
    rank = {account.title: i for i, account in reversed(list(enumerate(explanation.accounts)))}
    table = explanation.next_tests
    rows = _rows(table[table["bits"] >= LEAST_BITS].head(MOST_NEXT))
    return [{**row, "rank_if_present": rank.get(row["if_present"]), "rank_if_absent": rank.get(row["if_absent"]),
             **_rankings(explanation, f"{row['sign']}@{row['side']}")} for row in rows]  # fmt: skip


def _rankings(explanation: Any, sign_id: str) -> dict[str, list[float]]:
    """Posterior of every account shown, were the sign found and were it not."""
    ahead = explanation.outlook
    row = ahead.signs.index(sign_id)
    place = {group.scenario: i for i, group in enumerate(explanation.grouping.groups)}
    order = [place[account.scenario] for account in explanation.accounts]
    return {"then_present": ahead.if_present[row, order].tolist(), "then_absent": ahead.if_absent[row, order].tolist()}


def _next_images(table: pd.DataFrame, graph: Any) -> list[dict[str, Any]]:
    return [{**row, "element": element_words(graph, row["element"])} for row in _rows(table.head(MOST_NEXT))]


def profile_rows(explanation: Any, graph: Any) -> list[dict[str, Any]]:
    """Signs with what is expected of them and what was found, grouped under the function each depends on most."""
    if explanation is None:
        return []
    rows = []
    for row in _rows(explanation.signs):
        found = row["found"] if isinstance(row["found"], str) and row["found"] != "not_tested" else None
        rows.append({
            "id": f"{row['sign']}@{row['side']}", "name": row["name"], "side": row["side"],
            "group": _function_name(row["sign"], graph), "found": found or None,
            "expected": row["expected"], "expected_cortical": row["expected_cortical"],
            "low": row["low"], "high": row["high"],
        })  # fmt: skip
    rows.sort(key=lambda row: (row["found"] is None, -abs(row["expected"] - row["expected_cortical"])))
    return list(plain(rows))


def _function_name(sign: str, graph: Any) -> str:
    depends = graph.signs[sign].depends if graph is not None and sign in graph.signs else ()
    if not depends:
        return ""
    most = max(depends, key=lambda dependence: dependence.weight)
    return str(graph.functions[most.function].name)


def scored_told(scored: Any) -> dict[str, Any]:
    """A user's account with its standing beside the others."""
    ledger = _rows(scored.ledger)
    told = {
        "posterior_beside": scored.posterior_beside,
        "words": scored.words,
        "odds_vs_cortical": scored.odds_vs_cortical,
        "explains": [dict(vars(sign)) for sign in scored.explains],
        "leaves": [dict(vars(sign)) for sign in scored.leaves],
        "predicts_absent": [dict(vars(sign)) for sign in scored.predicts_absent],
        "ledger": ledger,
        "ledger_sum": {name: sum(row[name] for row in ledger) for name in ("loglik", "vs_cortical")},
    }
    return dict(plain(told))
