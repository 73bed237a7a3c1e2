"""The course of a case: what changed between its visits in damage, signs and accounts."""

from __future__ import annotations

from collections.abc import Sequence

import pandas as pd

from byway.knowledge.reasoning.explanation import Explanation

__all__ = ["course_of_accounts", "course_of_damage", "course_of_findings"]


def course_of_damage(visits: Sequence[tuple[str, Explanation]], least: float = 0.02) -> pd.DataFrame:
    """Share of every element that any visit damages: a row an element, a column a visit, and the ``change``.

    Parameters
    ----------
    visits : sequence of (date, Explanation)
        In order of time.
    least : float
        Elements whose share never reaches this are left out.
    """
    table = pd.DataFrame({date: one.damage.set_index("element")["share"] for date, one in visits}).fillna(0.0)
    table = table[table.max(axis=1) >= least]
    return _with_change(table)


def course_of_findings(visits: Sequence[tuple[str, Explanation]]) -> pd.DataFrame:
    """What was found at each visit, and how likely the full model held it: a row a sign and side.

    A sign without a finding at a visit reads "not tested" there, which is not "absent".
    """
    columns: dict[str, pd.Series] = {}
    for date, one in visits:
        signs = one.signs.set_index(["sign", "side"])
        columns[f"{date} found"] = signs["found"].fillna("not tested")
        columns[f"{date} expected"] = signs["expected"]
    table = pd.DataFrame(columns)
    tested = [f"{date} found" for date, _ in visits]
    return table[(table[tested] != "not tested").any(axis=1)]


def course_of_accounts(visits: Sequence[tuple[str, Explanation]]) -> pd.DataFrame:
    """Posterior of every account at each visit, by title; 0 where an account does not arise."""
    table = pd.DataFrame({date: {a.title: a.posterior for a in one.accounts} for date, one in visits}).fillna(0.0)
    return _with_change(table)


def _with_change(table: pd.DataFrame) -> pd.DataFrame:
    if table.shape[1] > 1:
        table = table.assign(change=table.iloc[:, -1] - table.iloc[:, 0])
        return table.reindex(table["change"].abs().sort_values(ascending=False, kind="stable").index)
    return table
