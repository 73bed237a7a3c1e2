"""The course of a case: what changed between its visits in damage, capacity, signs and accounts."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import pandas as pd

from byway.knowledge.cases.case import Case
from byway.knowledge.cases.desk import Desk
from byway.knowledge.cases.explaining import desk_of, explain
from byway.knowledge.reasoning.explain import Explanation

__all__ = ["Course", "course_of_accounts", "course_of_case", "course_of_damage", "course_of_findings",
           "course_of_functions"]  # fmt: skip

FIRST = "first"
"""Name of the first time point where its findings carry no date, or several."""


@dataclass(frozen=True, eq=False)
class Course:
    """A case over its visits; every table has one column a visit, named by its date, oldest first.

    Parameters
    ----------
    visits : tuple of str
        Dates, in the order of case.yaml: the first time point, then each visit.
    stages : tuple of str
        Stage at each.
    volumes_ml : tuple of float
        Volume of the lesion at each.
    explanations : tuple of Explanation
        The explanation at each.
    damage, functions, findings, accounts : DataFrame
        See :func:`course_of_damage` and its neighbours.
    """

    visits: tuple[str, ...]
    stages: tuple[str, ...]
    volumes_ml: tuple[float, ...]
    explanations: tuple[Explanation, ...] = field(repr=False)
    damage: pd.DataFrame = field(repr=False)
    functions: pd.DataFrame = field(repr=False)
    findings: pd.DataFrame = field(repr=False)
    accounts: pd.DataFrame = field(repr=False)

    def number(self, name: str) -> float:
        """A number by the name that a screen shows it under.

        Parameters
        ----------
        name : str
            ``course/<damage|functions|accounts>/<key>/<visit>``, or ``course/signs/<sign>@<side>/<visit>`` for what
            the full model expects.

        Raises
        ------
        KeyError
            Nothing has that name.
        """
        _, table, key, visit = name.split("/")
        if table == "signs":
            sign, _, side = key.rpartition("@")
            return float(self.findings[f"{visit} expected"].to_dict()[sign, side])
        tables = {"damage": self.damage, "functions": self.functions, "accounts": self.accounts}
        return float(tables[table][visit].to_dict()[key])


def course_of_case(case: Case, *, desk: Desk | None = None, draws: int = 200, seed: int = 0) -> Course:
    """Explain a case at each of its time points, and set the results side by side.

    Parameters
    ----------
    case : Case
        With or without ``visits``; a visit without a lesion of its own has the first one.
    desk, draws, seed
        As for :func:`~byway.knowledge.cases.explaining.explain`; the same at every visit, so that differences are
        the case's, not the sample's.

    Raises
    ------
    CaseError, ImageError
        As for ``explain``.
    """
    desk = desk or desk_of(case)
    points = [case.with_spec(visits=()), *(case.at_visit(i) for i in range(len(case.spec.visits)))]
    names = _names([_first_date(case), *(visit.date for visit in case.spec.visits)])
    explained = [explain(point, desk=desk, draws=draws, seed=seed) for point in points]
    pairs = list(zip(names, explained, strict=True))
    return Course(
        tuple(names), tuple(p.spec.stage for p in points), tuple(p.lesion.volume_ml for p in points), tuple(explained),
        course_of_damage(pairs), course_of_functions(pairs), course_of_findings(pairs), course_of_accounts(pairs),
    )  # fmt: skip


def _first_date(case: Case) -> str:
    dates = {finding.date for finding in case.spec.findings if finding.date}
    return dates.pop() if len(dates) == 1 else FIRST


def _names(dates: Sequence[str]) -> list[str]:
    """Dates as column names; a date that stands twice is numbered.

    >>> _names(["2026-11-03", "2026-12-01", "2026-12-01"])
    ['2026-11-03', '2026-12-01', '2026-12-01 (2)']
    """
    names: list[str] = []
    for date in dates:
        count = sum(name.partition(" (")[0] == date for name in names)
        names.append(f"{date} ({count + 1})" if count else date)
    return names


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
    return _with_change(table[table.max(axis=1) >= least])


def course_of_functions(visits: Sequence[tuple[str, Explanation]], most: float = 0.995) -> pd.DataFrame:
    """Capacity of every function copy that falls below ``most`` at any visit, as drawn, and the ``change``."""
    table = pd.DataFrame({date: one.functions.set_index("function")["capacity"] for date, one in visits}).fillna(1.0)
    return _with_change(table[table.min(axis=1) < most])


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
    """Posterior of every account at each visit, by its key; 0 where it does not arise or is too unlikely to show.

    ``title`` is the account's title at the last visit that shows it: titles name what is damaged then.
    """
    table = pd.DataFrame({date: {a.key: a.posterior for a in one.accounts} for date, one in visits}).fillna(0.0)
    titles = {account.key: account.title for _, one in visits for account in one.accounts}
    table = _with_change(table)
    table.insert(0, "title", [titles[key] for key in table.index])
    return table.rename_axis("account")


def _with_change(table: pd.DataFrame) -> pd.DataFrame:
    if table.shape[1] > 1:
        table = table.assign(change=table.iloc[:, -1] - table.iloc[:, 0])
        return table.reindex(table["change"].abs().sort_values(ascending=False, kind="stable").index)
    return table.copy()
