"""An account of the user's own, scored on the same ledger as the others, and kept in the case for the team."""

from __future__ import annotations

from typing import Any, ClassVar

import traitlets as t

from byway.knowledge.cases.pages import OwnAccount as AccountPage
from byway.knowledge.cases.pages import Page, Pages
from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.reasoning.own_account import OwnAccount, ScoredAccount, score
from byway.knowledge.reasoning.scenarios import AXES, Scenario
from byway.widgets.accounts.wire import scored_told
from byway.widgets.front import load_css, load_esm
from byway.widgets.panel import Panel, element_words

__all__ = ["OwnAccountPanel"]

EMPTY: dict[str, Any] = {"title": "", "text": "", "elements": [], "scenario": {}}


class OwnAccountPanel(Panel):
    """Pick elements and settings, say why, and see how the account fares beside the others.

    ``result`` is the :class:`~byway.knowledge.reasoning.own_account.ScoredAccount` that is shown, or None.
    """

    _esm = load_esm("accounts/own.js")
    _css = load_css("front/panel.css", "accounts/view.css", "accounts/own.css")
    sections: ClassVar[tuple[str, ...]] = ("evidence", "findings", "accounts", "own")

    draft = t.Dict(EMPTY).tag(sync=True)
    author = t.Unicode("").tag(sync=True)
    axes = t.Dict({axis: list(values) for axis, values in AXES.items()}).tag(sync=True)
    offered: Any = t.List().tag(sync=True)
    kept: Any = t.List().tag(sync=True)
    can_keep = t.Bool(False).tag(sync=True)
    told = t.Dict().tag(sync=True)

    def __init__(self, source: Any) -> None:
        super().__init__(source)
        self.result: ScoredAccount | None = None
        self.show_case()
        self.when(["accounts_seq", "case_seq"], self.show_case)
        self.observe(lambda _: self.show_score(), ["draft"])

    def show_case(self) -> None:
        """What can be picked, what has been kept, and the score as it stands."""
        explanation, case = self.state.explanation, self.state.case
        with self.hold_sync():
            self.can_keep = case is not None
            if explanation is not None:
                hit = explanation.damage[explanation.damage["share"] >= 0.005]
                self.offered = [{**element_words(self.graph, row.element), "share": float(row.share)}
                                for row in hit.itertuples(index=False)]  # fmt: skip
            self.show_kept()
            self.show_score()

    def show_kept(self) -> None:
        """Accounts that the team has kept in the case."""
        case = self.state.case
        pages: list[Page] = Pages(case.folder).current("account") if case is not None else []
        self.kept = [page.model_dump(mode="json") for page in pages]

    def show_score(self) -> None:
        """Score the draft."""
        explanation = self.state.explanation
        self.result = None
        with self.hold_sync():
            if explanation is None or not (self.draft.get("elements") or self.draft.get("scenario")):
                self.told = {}
            else:
                try:
                    self.result = score(explanation, self._own())
                    self.told = scored_told(self.result)
                except BywayError as error:
                    self.state.tell(error)
                    self.told = {}
            self.stamp += 1

    def _own(self) -> OwnAccount:
        draft = {**EMPTY, **self.draft}
        for axis, value in draft["scenario"].items():
            if axis not in AXES or value not in AXES[axis]:
                raise BywayError(Fault("scenario", "own account", f"{axis} {value}", ", ".join(AXES)))
        elements: dict[str, float | None] = dict.fromkeys(map(str, draft["elements"]))
        return OwnAccount(str(draft["title"]), elements, Scenario(**draft["scenario"]), str(draft["text"]), self.author)

    def on_message(self, content: dict[str, Any], buffers: list[Any]) -> None:
        """Keep the draft in the case folder."""
        case = self.state.case
        if content.get("kind") != "keep" or case is None:
            return
        if not self.author.strip() or not str(self.draft.get("title", "")).strip():
            raise BywayError(Fault("own-account", "account", "no title or no author", "both", "fill them in"))
        own = self._own()
        scenario = dict(self.draft.get("scenario", {}))
        Pages(case.folder).put(AccountPage(author=self.author.strip(), title=own.title, elements=tuple(own.elements),
                                           scenario=scenario, text=own.text))  # fmt: skip
        self.show_kept()
