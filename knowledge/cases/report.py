"""The report of a case: one self-contained HTML page that reads without byway, also on grey paper."""

from __future__ import annotations

from importlib.resources import files
from pathlib import Path
from typing import Any

import jinja2
from markdown_it import MarkdownIt
from nh3 import clean

from byway.knowledge.atomic import write_text
from byway.knowledge.cases.case import Case
from byway.knowledge.cases.report_facts import clearance, facts_of, odds, posterior, share, signed
from byway.knowledge.reasoning.explain import Explanation
from byway.knowledge.words import section

__all__ = ["MARKDOWN_TAGS", "markdown_html", "report_html", "write_report"]

MARKDOWN_TAGS = frozenset({"p", "em", "strong", "ul", "ol", "li", "code", "pre", "blockquote", "br", "hr", "table",
                           "thead", "tbody", "tr", "th", "td", "h1", "h2", "h3", "h4"})  # fmt: skip
"""All that markdown may become; none of them carries an attribute."""


def markdown_html(text: str) -> str:
    """Markdown as HTML without scripts, styles, frames or foreign addresses: raw HTML is shown as text.

    >>> markdown_html("**so** <b>not</b>")
    '<p><strong>so</strong> &lt;b&gt;not&lt;/b&gt;</p>\\n'
    """
    html = MarkdownIt("commonmark", {"html": False}).enable("table").render(text)
    return clean(html, tags=set(MARKDOWN_TAGS), attributes={})


def report_html(case: Case, explanation: Explanation, **choices: Any) -> str:
    """The report as HTML text.

    Parameters
    ----------
    case, explanation
        The case, and what :func:`~byway.knowledge.cases.explaining.explain` says of it.
    **choices
        ``notes`` and ``full``, as for :func:`~byway.knowledge.cases.report_facts.facts_of`.

    Notes
    -----
    Every number stands in a node with its name in the API (``data-name``) and its unrounded value (``data-value``).
    """
    facts = facts_of(case, explanation, **choices)
    environment = jinja2.Environment(
        loader=jinja2.FunctionLoader(lambda name: files("byway.knowledge.cases").joinpath(name).read_text("utf-8")),
        autoescape=True, undefined=jinja2.StrictUndefined, trim_blocks=True, lstrip_blocks=True,
    )  # fmt: skip
    environment.filters.update(share=share, posterior=posterior, odds=odds, signed=signed, clearance=clearance,
                               markdown=markdown_html)  # fmt: skip
    return environment.get_template("report.html").render(w=section("report"), f=facts, spec=case.spec)


def write_report(case: Case, explanation: Explanation, path: Path, **choices: Any) -> Path:
    """Write the report to ``path``; see :func:`report_html` for the choices."""
    write_text(path, report_html(case, explanation, **choices))
    return path
