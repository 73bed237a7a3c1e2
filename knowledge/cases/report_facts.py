"""What a report says, once, for every form in which it is written: HTML, PDF, tables."""

from __future__ import annotations

import platform
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import UTC, datetime
from importlib.metadata import PackageNotFoundError, version
from typing import Any

import numpy as np
import pandas as pd

from byway.knowledge.cases.anatomies import anatomies_of
from byway.knowledge.cases.case import Case
from byway.knowledge.cases.explaining import desk_of
from byway.knowledge.cases.pages import Note, Pages, thread
from byway.knowledge.cases.pictures import SliceView, slice_views
from byway.knowledge.cases.standing import team_standing
from byway.knowledge.cases.wording import anatomy_words
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.records import Claim, Source
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.reasoning.accounts import Account
from byway.knowledge.reasoning.explain import Explanation
from byway.knowledge.space.template import template_volume
from byway.knowledge.words import word

__all__ = ["AccountFacts", "ReportFacts", "Row", "clearance", "facts_of", "odds", "posterior", "share", "signed",
           "versions"]  # fmt: skip

Row = dict[str, Any]

SHOWN_ACCOUNTS = {True: 6, False: 3}
SHOWN_HITS = {True: 40, False: 6}
SHOWN_TESTS = {True: 10, False: 3}
SHOWN_PROFILE = {True: 60, False: 8}
LEAST_SHARE = 0.01
LIBRARIES = ("byway", "numpy", "scipy", "pandas", "networkx", "nibabel", "nilearn")


@dataclass(frozen=True, eq=False)
class AccountFacts:
    """One account as the report prints it; ``rank`` counts from 0 in the explanation's order."""

    rank: int
    it: Account
    ledger: list[Row]
    ledger_sum: Row
    bottlenecks: list[Row]
    counterfactuals: list[Row]
    elements: list[tuple[str, str, float]]
    claims_for: list[tuple[Claim, list[Source]]]
    claims_against: list[tuple[Claim, list[Source]]]
    standing: Row


@dataclass(frozen=True, eq=False)
class ReportFacts:
    """All that a report prints, in order; rows are plain mappings with the names of the API."""

    case: Case
    lesion: Lesion
    explanation: Explanation
    full: bool
    title: str
    views: list[SliceView]
    legend: str
    hit: list[Row]
    profile: list[Row]
    accounts: list[AccountFacts]
    rest_posterior: float
    next_tests: list[Row]
    next_images: list[Row]
    next_axes: list[Row]
    no_findings: bool
    remarks: tuple[str, ...]
    sources: list[Source]
    notes: list[tuple[int, Note, bool]]
    standing: list[Row]
    reasons: list[tuple[str, str, str, str]]
    anatomy: str
    anatomies: list[Row]
    remote: list[Row]
    made: str
    versions: dict[str, str]
    graph_hash: str


def facts_of(
    case: Case,
    explanation: Explanation,
    *,
    notes: Iterable[Note] | None = None,
    full: bool = True,
    lesion: Lesion | None = None,
) -> ReportFacts:
    """Gather what a report says.

    Parameters
    ----------
    case : Case
        The case; its notes and standings are read from its folder.
    explanation : Explanation
        From :func:`~byway.knowledge.cases.explaining.explain` on the same case.
    notes : iterable of Note, optional
        Notes to print, in threads; all current ones by default.
    full : bool
        False gives the one-page summary: lesion, profile, leading accounts, next tests; notes only where chosen.
    lesion : Lesion, optional
        The lesion to draw, where it is not the saved one.
    """
    lesion = lesion if lesion is not None else case.lesion
    graph = explanation.reckoning.prepared.graph
    pages = Pages(case.folder)
    if notes is None:
        notes = [page for page in pages.current("note") if isinstance(page, Note)] if full else []
    settled, origins = pages.settled(), pages.origins("note")
    standings = pages.standings()
    team = rows_of(team_standing(standings, explanation))
    by_key = {row["account"]: row for row in team}
    accounts = [_account(graph, rank, account, by_key[account.key])
                for rank, account in enumerate(explanation.accounts[: SHOWN_ACCOUNTS[full]])]  # fmt: skip
    titles = {row["account"]: row["title"] for row in team}
    return ReportFacts(
        case=case,
        lesion=lesion,
        explanation=explanation,
        full=full,
        title=case.spec.title or case.folder.name,
        views=slice_views(template_volume("t1"), lesion, extra=2 if full else 0),
        legend=_legend(lesion),
        hit=rows_of(explanation.damage[explanation.damage["share"] >= LEAST_SHARE].head(SHOWN_HITS[full])),
        profile=rows_of(_profile(explanation).head(SHOWN_PROFILE[full])),
        accounts=accounts,
        rest_posterior=max(0.0, 1.0 - sum(card.it.posterior for card in accounts)),
        next_tests=rows_of(explanation.next_tests.head(SHOWN_TESTS[full])),
        next_images=rows_of(explanation.next_images.head(6)) if full else [],
        next_axes=[{**row, "question": word(f"accounts.axis_{row['axis']}")} for row in rows_of(explanation.next_axes)]
        if full else [],
        no_findings=not explanation.reckoning.findings,
        remarks=explanation.remarks,
        sources=_sources(graph, accounts),
        notes=[(depth, note, settled.get(origins.get(note.id, note.id), False))
               for depth, note in thread(notes, origins)],
        standing=[row for row in team if row["held"] or row["doubted"] or row["ruled_out"]],
        reasons=[(titles[account], author, said.stands, said.reason) for account, people in standings.items()
                 for author, said in sorted(people.items())],
        anatomy=anatomy_words(explanation),
        anatomies=rows_of(anatomies_of(lesion, desk_of(case))) if case.spec.anatomy else [],
        remote=rows_of(explanation.remote[explanation.remote["named"].astype(bool)].head(6)) if full else [],
        made=datetime.now(UTC).date().isoformat(),
        versions=versions(),
        graph_hash=graph.content_hash[:12],
    )  # fmt: skip


def versions() -> dict[str, str]:
    """Versions of byway, of Python and of the libraries that the numbers come from."""
    found = {}
    for name in LIBRARIES:
        try:
            found[name] = version(name)
        except PackageNotFoundError:
            found[name] = "not installed"
    return {**found, "python": platform.python_version()}


def rows_of(table: pd.DataFrame) -> list[Row]:
    """A table's rows as plain mappings."""
    return [{str(key): value for key, value in row.items()} for row in table.to_dict("records")]


def _legend(lesion: Lesion) -> str:
    """What the patterns on the slices stand for: those that are there, and how the slices are turned."""
    drawn = {compartment.kind for compartment in lesion.compartments if compartment.mask.any()}
    names: list[str] = [kind for kind in ("core", "oedema", "other") if kind in drawn]
    names += ["graded"] if lesion.effect_volume is not None else []
    return " ".join([word("report.display"), *(word(f"report.legend_{name}") for name in names)])


def _profile(explanation: Explanation) -> pd.DataFrame:
    """Signs that were looked for, present ones first, then untested ones that the full model holds likely."""
    signs = explanation.signs
    telling = signs[signs["found"].notna() | (signs["expected"] >= 0.3)]
    order = telling["found"].map({"severe": 0, "moderate": 1, "mild": 2, "absent": 3}).fillna(4)
    return telling.assign(order=order).sort_values(["order", "expected"], ascending=[True, False], kind="stable").drop(
        columns="order")  # fmt: skip


def _account(graph: Graph, rank: int, account: Account, standing: Row) -> AccountFacts:
    return AccountFacts(
        rank,
        account,
        rows_of(account.ledger),
        {column: float(account.ledger[column].sum()) for column in ("loglik", "vs_cortical")},
        rows_of(account.bottlenecks.head(5)),
        rows_of(account.counterfactuals.head(6)),
        [(element, graph.name_of(element), share)
         for element, share in list(zip(account.elements, account.shares, strict=True))[:12]],
        [(claim, list(graph.sources_of(claim))) for claim in account.claims_for[:12]],
        [(claim, list(graph.sources_of(claim))) for claim in account.claims_against[:12]],
        standing,
    )  # fmt: skip


def _sources(graph: Graph, accounts: Iterable[AccountFacts]) -> list[Source]:
    keys = {key for account in accounts for key in account.it.sources}
    return sorted((graph.sources[key] for key in keys), key=lambda source: (source.authors, source.year))


def share(value: float | None) -> str:
    """A share or probability with two decimals; a dash where it is not known."""
    return "–" if value is None or not np.isfinite(value) else f"{value:.2f}"


def clearance(value: float) -> tuple[str, str]:
    """A clearance in mm without its sign, and the word for one that lies inside the lesion.

    >>> clearance(-6.63), clearance(3.2), clearance(float("nan"))
    (('6.6', 'inside'), ('3.2', ''), ('–', ''))
    """
    if not np.isfinite(value):
        return "–", ""
    return f"{abs(value):.1f}", word("report.inside") if value < 0 else ""


def posterior(value: float) -> str:
    """A posterior with three decimals."""
    return f"{value:.3f}"


def odds(value: float) -> str:
    """Odds with two significant figures, written out.

    >>> odds(148.2), odds(0.0123), odds(2.34e9)
    ('150', '0.012', '2.3e+09')
    """
    short = f"{value:.2g}"
    return f"{float(short):.0f}" if 100 <= value < 1e6 else short


def signed(value: float | None) -> str:
    """A log-likelihood with its sign and two decimals; nothing where it is not known."""
    return "" if value is None or not np.isfinite(value) else f"{value:+.2f}"
