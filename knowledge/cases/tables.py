"""The tables of a case as CSV files: unrounded numbers under the names of the API."""

from __future__ import annotations

from pathlib import Path

import pandas as pd

from byway.knowledge.atomic import write_text
from byway.knowledge.cases.anatomies import anatomies_of_case
from byway.knowledge.cases.case import Case
from byway.knowledge.cases.course import Course
from byway.knowledge.cases.pages import Note, Pages
from byway.knowledge.cases.report_facts import versions
from byway.knowledge.cases.standing import STANDS, team_standing
from byway.knowledge.cases.wording import anatomy_words
from byway.knowledge.reasoning.explain import Explanation

__all__ = ["case_tables", "course_tables", "safe_cells", "write_tables"]

FORMULA = ("=", "+", "-", "@", "\t", "\r")


def safe_cells(table: pd.DataFrame) -> pd.DataFrame:
    """The table with an apostrophe before every text that a spreadsheet would take for a formula.

    >>> safe_cells(pd.DataFrame({"text": ["=1+1", "plain"], "n": [-1, 2]}))["text"].tolist()
    ["'=1+1", 'plain']
    """
    safe = table.copy()
    for column in safe.columns:
        if safe[column].dtype.kind not in "biufc":
            safe[column] = [f"'{v}" if isinstance(v, str) and v.startswith(FORMULA) else v for v in safe[column]]
    return safe


def case_tables(case: Case, explanation: Explanation) -> dict[str, pd.DataFrame]:
    """Every table of an explained case by name: damage, functions, signs, accounts, ledger and the rest.

    ``ledger``, ``bottlenecks`` and ``counterfactuals`` hold all accounts, told apart by ``account`` (the key).
    """
    accounts = explanation.accounts
    pages = Pages(case.folder)
    settled, origins = pages.settled(), pages.origins("note")
    notes = [page for page in pages.current("note") if isinstance(page, Note)]
    columns = ["account", "kind", "title", "prior", "posterior", "words", "odds_vs_cortical", "is_plain", "elements"]
    team = team_standing(pages.standings(), explanation)
    for stands in STANDS:
        team[stands] = [" ".join(people) for people in team[stands]]
    return {
        "damage": explanation.damage,
        "functions": explanation.functions.assign(limited_by=explanation.functions["limited_by"].map(" ".join)),
        "signs": explanation.signs,
        "accounts": pd.DataFrame([(a.key, a.kind, a.title, a.prior, a.posterior, a.words, a.odds_vs_cortical,
                                   a.is_plain, " ".join(a.elements)) for a in accounts], columns=columns),
        "ledger": pd.concat([a.ledger.assign(account=a.key) for a in accounts], ignore_index=True),
        "bottlenecks": pd.concat([a.bottlenecks.assign(account=a.key, elements=a.bottlenecks["elements"].map(" ".join))
                                  for a in accounts], ignore_index=True),
        "counterfactuals": pd.concat([a.counterfactuals.assign(account=a.key) for a in accounts], ignore_index=True),
        "next_tests": explanation.next_tests,
        "next_images": explanation.next_images,
        "remote": explanation.remote,
        **({"anatomies": anatomies_of_case(case)} if case.spec.anatomy else {}),
        "standing": team,
        "notes": pd.DataFrame([(n.id, n.author, n.time, n.anchor.kind, n.anchor.key, n.reply_to, " ".join(n.tags),
                                settled.get(origins.get(n.id, n.id), False), n.text) for n in notes],
                              columns=["id", "author", "time", "anchor", "key", "reply_to", "tags", "settled", "text"]),
    }  # fmt: skip


def course_tables(course: Course) -> dict[str, pd.DataFrame]:
    """The tables of a course by name; a visit's column has its date."""
    visits = pd.DataFrame({"visit": course.visits, "stage": course.stages, "volume_ml": course.volumes_ml})
    return {"visits": visits, "course_damage": course.damage.reset_index(),
            "course_functions": course.functions.reset_index(), "course_signs": course.findings.reset_index(),
            "course_accounts": course.accounts.reset_index()}  # fmt: skip


def write_tables(
    case: Case, explanation: Explanation | None, folder: Path, course: Course | None = None
) -> list[Path]:  # fmt: skip
    """Write the tables into ``folder``, and ``about.txt`` with caution, anatomy and versions; returns the paths."""
    tables = case_tables(case, explanation) if explanation is not None else {}
    if course is not None:
        tables |= course_tables(course)
    last = explanation if explanation is not None else (course.explanations[-1] if course is not None else None)
    lines = [case.spec.title or case.folder.name, *(["Invented data."] if case.spec.invented else [])]
    if last is not None:
        lines += [last.caution, f"Anatomy: {anatomy_words(last)}."]
    lines.append(", ".join(f"{name} {number}" for name, number in versions().items()))
    written = []
    for name, table in tables.items():
        path = folder / f"{name}.csv"
        write_text(path, safe_cells(table).to_csv(index=False))
        written.append(path)
    about = folder / "about.txt"
    write_text(about, "\n".join(lines) + "\n")
    return [*written, about]
