"""Every number on the bench by its name: what a screen shows is what Python says.

A panel marks each number that it shows with a name such as ``damage/ifg_opercularis@left/share`` or
``accounts/0/posterior``; :func:`number_named` finds the same number in an explanation.
"""

from __future__ import annotations

from typing import Any

import pandas as pd

from byway.knowledge.damage.profile import profile_facts
from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.reasoning.rerouting import route_flows
from byway.knowledge.reasoning.scenarios import Scenario

__all__ = ["number_named"]


def number_named(
    explanation: Any,
    name: str,
    *,
    account: int | None = None,
    what_if: Any = None,
    own: Any = None,
    steady: Any = None,
    along: Any = None,
    anatomies: Any = None,
) -> float:
    """The number that a panel shows under a name.

    Parameters
    ----------
    explanation : Explanation
        What the panel shows.
    name : str
        ``uncharted_share``, ``other_posterior``, ``damage/<element>/<column>``, ``signs/<sign>@<side>/<column>``,
        ``functions/<copy>/<column>``, ``next_tests/<sign>@<side>/<column>``, ``next_images/<element>/<column>``,
        ``next_axes/<axis>/bits``, ``remote/<region>/<column>``, ``accounts/<rank from 0>/posterior`` and likewise
        ``prior`` and ``odds_vs_cortical``, ``accounts/<rank>/ledger/<sign>@<side>/<column>``,
        ``accounts/<rank>/ledger_sum/<column>``, ``accounts/<rank>/bottlenecks/<copy>/capacity``,
        ``accounts/<rank>/counterfactuals/<row>/change``, ``routes/<copy>/capacity``,
        ``routes/<copy>/<route>/usual`` or ``now``, ``routes/<copy>/elements/<element>/damage``,
        ``graph/signs/<sign>/sensitivity`` or ``specificity``, ``what_if/signs/<sign>@<side>/before`` or ``after``,
        ``what_if/functions/<copy>/before`` or ``after``.
    account : int, optional
        For ``routes``: the rank of the account under which they are shown; as drawn where None.
    what_if : WhatIf, optional
        For ``what_if``: what the panel of that name shows (its ``result``).
    own : ScoredAccount, optional
        For ``own``, which has ``posterior_beside``, ``odds_vs_cortical`` and a ledger: what that panel shows.

    steady : Sensitivity, optional
        For ``steady/<row>/<column>``: what that panel shows.
    along : DataFrame, optional
        For ``along/<element>/<fact>`` and ``along/<element>/bins/<row>/<column>``: the course profile of the element.
    anatomies : DataFrame, optional
        For ``anatomies/<element>/<column>``: template and own anatomy side by side.

    Raises
    ------
    BywayError
        Nothing has that name.
    """
    first, *rest = name.split("/")
    try:
        match first:
            case "uncharted_share" | "other_posterior" if not rest:
                return float(getattr(explanation, first))
            case "accounts":
                return _of_account(explanation.accounts[int(rest[0])], rest[1:])
            case "routes":
                return _of_routes(explanation, rest, account)
            case "what_if" if rest[0] in ("signs", "functions"):
                return _cell(getattr(what_if, rest[0]), rest[1], rest[2])
            case "steady":
                return float(steady.table[rest[1]].iloc[int(rest[0])])
            case "along" if along.attrs["element"] == rest[0]:
                return _of_course(along, rest[1:])
            case "anatomies":
                return _cell(anatomies, rest[0], rest[1])
            case "own":
                return float(own.posterior_beside) if rest == ["posterior_beside"] else _of_account(own, rest)
            case "graph":
                return float(getattr(explanation.reckoning.prepared.graph.signs[rest[1]], rest[2]))
            case "damage" | "signs" | "functions" | "next_tests" | "next_images" | "next_axes" | "remote":
                return _cell(getattr(explanation, first), rest[0], rest[1])
    except (KeyError, IndexError, ValueError, AttributeError):
        pass
    raise BywayError(Fault("number", name, "no number has this name"))


def _cell(table: pd.DataFrame, row: str, column: str) -> float:
    """One number of a table whose rows are named by their first column, with its side where signs have one."""
    names = table.iloc[:, 0].astype(str)
    if "sign" in table.columns and "side" in table.columns:
        names = table["sign"].astype(str) + "@" + table["side"].astype(str)
    found = table.loc[names == row, column]
    if len(found) != 1:
        raise KeyError(row)
    return float(found.iloc[0])


def _of_course(profile: pd.DataFrame, rest: list[str]) -> float:
    if rest[0] == "bins":
        return float(profile[rest[2]].iloc[int(rest[1])])
    return profile_facts(profile)[rest[0]]


def _of_account(account: Any, rest: list[str]) -> float:
    match rest:
        case ["posterior" | "prior" | "odds_vs_cortical"]:
            return float(getattr(account, rest[0]))
        case ["ledger", row, column]:
            return _cell(account.ledger[account.ledger.columns.drop("row")], row, column)
        case ["ledger_sum", column]:
            return float(account.ledger[column].sum())
        case ["bottlenecks", copy, "capacity"]:
            return _cell(account.bottlenecks, copy, "capacity")
        case ["counterfactuals", row, "change"]:
            return float(account.counterfactuals["change"].iloc[int(row)])
    raise KeyError("/".join(rest))


def _of_routes(explanation: Any, rest: list[str], account: int | None) -> float:
    """Flows and damage of one function copy at the mean damage."""
    reckoning = explanation.reckoning
    scenario = Scenario() if account is None else explanation.accounts[account].scenario
    table = reckoning.prepared.tables[scenario.dominance, scenario.reliance][rest[0]]
    damage = reckoning.damage_of(scenario)[:, table.rows].mean(axis=0)
    network = table.cuts.network
    if rest[1:2] == ["elements"]:
        return float(damage[network.elements.index(rest[2])])
    flows = route_flows(network, damage, reckoning.headroom)
    if rest[1:] == ["capacity"]:
        return min(1.0, sum(flow.now for flow in flows))
    (flow,) = (flow for flow in flows if flow.key == rest[1])
    return float(getattr(flow, rest[2]))
