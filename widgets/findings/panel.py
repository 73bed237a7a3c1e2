"""Findings: a searchable list of signs, each not tested, absent, or present at a grade, on its side."""

from __future__ import annotations

from typing import Any, ClassVar, get_args

import traitlets as t

from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.reasoning.findings import BodySide, Finding, FoundGrade
from byway.widgets.findings.everyday import EVERYDAY
from byway.widgets.findings.wire import expected_of, findings_of, signs_of
from byway.widgets.front import load_css, load_esm
from byway.widgets.panel import Panel

__all__ = ["FindingsPanel"]

NOT_TESTED = "not_tested"
CIRCUMSTANCES = ("test", "date", "by")
MOST_TEXT = 120


class FindingsPanel(Panel):
    """The findings of the case, and every sign that could be one.

    On an explanation it shows what was found; on a state it also records.
    """

    _esm = load_esm("findings/view.js")
    _css = load_css("front/panel.css", "findings/view.css")
    sections: ClassVar[tuple[str, ...]] = ("findings",)

    signs: Any = t.List().tag(sync=True)
    everyday = t.Dict().tag(sync=True)
    findings = t.Dict().tag(sync=True)
    expected = t.Dict().tag(sync=True)

    def __init__(self, source: Any) -> None:
        super().__init__(source, everyday={word: list(terms) for word, terms in EVERYDAY.items()})
        self.show_signs()
        self.when(["case_seq", "graph_seq"], self.show_signs)
        self.when(["findings_seq"], self.show_findings)
        self.when(["accounts_seq"], self.show_expected)

    def show_signs(self) -> None:
        """The signs of the graph in use."""
        graph = self.graph
        with self.hold_sync():
            self.signs = signs_of(graph) if graph is not None else []
            self.show_findings()
            self.show_expected()

    def show_findings(self) -> None:
        """What has been found."""
        with self.hold_sync():
            self.findings = findings_of(self.state.findings)
            self.stamp += 1

    def show_expected(self) -> None:
        """What the model expects of each sign."""
        with self.hold_sync():
            self.expected = expected_of(self.state.explanation)
            self.stamp += 1

    def on_message(self, content: dict[str, Any], buffers: list[Any]) -> None:
        """Record a finding, or set a sign back to not tested."""
        if content.get("kind") != "finding":
            return
        sign, side, grade = str(content["sign"]), content["side"], content["grade"]
        if grade == NOT_TESTED:
            self.state.drop_finding(sign, side)
            return
        if grade not in get_args(FoundGrade) or side not in get_args(BodySide):
            raise BywayError(Fault("finding", sign, f"grade {grade!r}, side {side!r}", "a grade and side of the list"))
        old = [f for f in self.state.findings if (f.sign, f.side) == (sign, side)]
        told: dict[str, str | None] = {name: getattr(old[-1], name) if old else None for name in CIRCUMSTANCES}
        for name in CIRCUMSTANCES:
            if name in content:
                told[name] = str(content[name])[:MOST_TEXT] if content[name] else None
        self.state.set_finding(Finding(sign, side, grade, **told))

    def on_refused(self) -> None:
        """Show the findings that hold."""
        self.findings = {}
        self.show_findings()
