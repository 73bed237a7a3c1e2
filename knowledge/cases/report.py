"""The report of a case: one self-contained HTML page that reads without byway, also on grey paper."""

from __future__ import annotations

from collections.abc import Iterable
from datetime import UTC, datetime
from importlib.metadata import version
from importlib.resources import files
from pathlib import Path
from typing import Any

import jinja2
import numpy as np
import pandas as pd
from markdown_it import MarkdownIt
from nh3 import clean

from byway.knowledge.atomic import write_text
from byway.knowledge.cases.case import Case
from byway.knowledge.cases.pages import Note, Pages, thread
from byway.knowledge.cases.pictures import slice_views
from byway.knowledge.cases.wording import anatomy_words
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.records import Source
from byway.knowledge.reasoning.explain import Explanation
from byway.knowledge.space.template import template_volume
from byway.knowledge.words import section

__all__ = ["markdown_html", "report_html", "write_report"]

SHOWN_ACCOUNTS = 6
LEAST_SHARE = 0.01


def markdown_html(text: str) -> str:
    """Markdown as HTML without scripts, styles, frames or foreign addresses: raw HTML is shown as text."""
    html = MarkdownIt("commonmark", {"html": False}).enable("table").render(text)
    return clean(html, tags={"p", "em", "strong", "ul", "ol", "li", "code", "pre", "blockquote", "br", "hr", "table",
                             "thead", "tbody", "tr", "th", "td", "h1", "h2", "h3", "h4"}, attributes={})  # fmt: skip


def report_html(case: Case, explanation: Explanation, *, notes: Iterable[Note] | None = None, full: bool = True) -> str:
    """The report as HTML text.

    Parameters
    ----------
    case : Case
        The case; its notes are read from its folder.
    explanation : Explanation
        From :func:`~byway.knowledge.cases.explaining.explain` on the same case.
    notes : iterable of Note, optional
        Notes to print, in threads; all current ones by default.
    full : bool
        False gives the one-page summary: lesion, profile and leading accounts.
    """
    graph = explanation.reckoning.prepared.graph
    pages = Pages(case.folder)
    chosen = [page for page in pages.current("note") if isinstance(page, Note)] if notes is None else list(notes)
    environment = jinja2.Environment(
        loader=jinja2.FunctionLoader(lambda name: files("byway.knowledge.cases").joinpath(name).read_text("utf-8")),
        autoescape=True, undefined=jinja2.StrictUndefined, trim_blocks=True, lstrip_blocks=True,
    )  # fmt: skip
    environment.filters.update(share=_share, posterior=_posterior, odds=_odds, signed=_signed)
    accounts = explanation.accounts[: SHOWN_ACCOUNTS if full else 3]
    return environment.get_template("report.html").render(
        w=section("report"),
        case=case,
        spec=case.spec,
        explanation=explanation,
        full=full,
        views=slice_views(template_volume("t1"), case.lesion),
        hit=_rows(explanation.damage[explanation.damage["share"] >= LEAST_SHARE].head(40 if full else 10)),
        profile=_rows(_profile(explanation)),
        accounts=[_account(graph, account) for account in accounts],
        next_tests=_rows(explanation.next_tests.head(10 if full else 3)),
        next_images=_rows(explanation.next_images.head(6)),
        sources=_sources(graph, explanation, accounts),
        notes=[(depth, note, markdown_html(note.text)) for depth, note in thread(chosen)],
        standings=pages.standings(),
        anatomy=anatomy_words(explanation),
        made=datetime.now(UTC).date().isoformat(),
        version=version("byway"),
        graph_hash=graph.content_hash[:12],
    )


def write_report(case: Case, explanation: Explanation, path: Path, **choices: Any) -> Path:
    """Write the report to ``path``; see :func:`report_html` for the choices."""
    write_text(path, report_html(case, explanation, **choices))
    return path


def _rows(table: pd.DataFrame) -> list[dict[str, Any]]:
    return [{str(key): value for key, value in row.items()} for row in table.to_dict("records")]


def _profile(explanation: Explanation) -> pd.DataFrame:
    signs = explanation.signs
    telling = signs["found"].notna() | (signs["expected"] >= 0.3)
    return signs[telling].sort_values(["found", "expected"], ascending=[True, False], na_position="last", kind="stable")


def _account(graph: Graph, account: Any) -> dict[str, Any]:
    return {
        "it": account,
        "ledger": _rows(account.ledger),
        "bottlenecks": _rows(account.bottlenecks.head(5)),
        "counterfactuals": _rows(account.counterfactuals.head(6)),
        "elements": [(element, graph.name_of(element), share)
                     for element, share in list(zip(account.elements, account.shares, strict=True))[:12]],
        "claims_for": [(claim, graph.sources_of(claim)) for claim in account.claims_for[:12]],
        "claims_against": [(claim, graph.sources_of(claim)) for claim in account.claims_against[:12]],
    }  # fmt: skip


def _sources(graph: Graph, explanation: Explanation, accounts: Iterable[Any]) -> list[Source]:
    keys = {key for account in accounts for key in account.sources}
    return sorted((graph.sources[key] for key in keys), key=lambda source: (source.authors, source.year))


def _share(value: float) -> str:
    return "–" if value is None or not np.isfinite(value) else f"{value:.2f}"


def _posterior(value: float) -> str:
    return f"{value:.3f}"


def _odds(value: float) -> str:
    return f"{value:.2g}"


def _signed(value: float) -> str:
    return "" if value is None or not np.isfinite(value) else f"{value:+.2f}"
