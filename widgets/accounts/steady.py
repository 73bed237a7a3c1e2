"""How steady the ranking is, and what is left for the functions that are held back."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, ClassVar

import traitlets as t

from byway.knowledge.reasoning.reserve import NO_PROMISE, reserve
from byway.knowledge.reasoning.sensitivity import Sensitivity, sensitivity
from byway.widgets.accounts.imagined import imagined
from byway.widgets.front import load_css, load_esm
from byway.widgets.panel import Panel, claims_of, element_words
from byway.widgets.wire import plain

__all__ = ["SteadyPanel"]

EDGE_MM = 2.0


class SteadyPanel(Panel):
    """Priors halved and doubled, findings left out, the mask 2 mm larger and smaller; and the reserve.

    The examination takes seconds, so it waits until it is asked for. ``result`` is the
    :class:`~byway.knowledge.reasoning.sensitivity.Sensitivity` that is shown, or None.
    """

    _esm = load_esm("accounts/steady.js")
    _css = load_css("front/panel.css", "accounts/view.css", "accounts/steady.css")
    sections: ClassVar[tuple[str, ...]] = ("evidence", "findings", "accounts", "steady")

    told = t.Dict().tag(sync=True)
    spared: Any = t.List().tag(sync=True)
    careful = t.Unicode(NO_PROMISE).tag(sync=True)
    progress = t.Float(0.0).tag(sync=True)
    ready = t.Bool(False).tag(sync=True)

    def __init__(self, source: Any) -> None:
        super().__init__(source)
        self.result: Sensitivity | None = None
        self.show_case()
        self.when(["accounts_seq"], self.show_case)

    def show_case(self) -> None:
        """The reserve; an examination of an older state is put away."""
        explanation, case = self.state.explanation, self.state.case
        self.result = None
        measured = {a.segment: a.index for a in case.spec.asymmetries} if case is not None else {}
        with self.hold_sync():
            self.ready = explanation is not None
            self.told = {}
            self.progress = 0.0
            rows = reserve(explanation, measured).to_dict("records") if explanation is not None else []
            asked = _asked_about(explanation) if explanation is not None else set()
            self.spared = [{**self._spared(row), "asked": row["function"] in asked} for row in rows]
            self.stamp += 1

    def _spared(self, row: Mapping[Any, Any]) -> dict[str, Any]:
        graph = self.graph
        claims = [graph.claims[key] for key in row["claims"]]
        return {"function": row["name"], "element": element_words(graph, row["element"]), "words": row["words"],
                "claims": plain(claims_of(claims, graph))}  # fmt: skip

    def on_message(self, content: dict[str, Any], buffers: list[Any]) -> None:
        """Examine, when asked."""
        if content.get("kind") == "examine":
            self.examine()

    def examine(self) -> Sensitivity | None:
        """Change priors, findings and mask one at a time; returns the result that is then shown."""
        explanation = self.state.explanation
        if explanation is None:
            return None
        edges = {"mask_larger": EDGE_MM, "mask_smaller": -EDGE_MM}
        drawn = {self.words[name]: self.draws_of(imagined(self.state.lesion, by)) for name, by in edges.items()}
        masks = drawn if None not in drawn.values() else None
        self.result = sensitivity(explanation, masks=masks, progress=self._moved)
        table = self.result.table
        with self.hold_sync():
            self.told = dict(plain({"words": self.result.words, "easily": self.result.flips_easily,
                                    "rows": table.to_dict("records"), "flips": int(table["flips"].sum())}))  # fmt: skip
            self.progress = 0.0
            self.stamp += 1
        return self.result

    def _moved(self, done: int, total: int) -> bool:
        if done % 4 == 0:
            self.progress = done / total
        return True


def _asked_about(explanation: Any) -> set[str]:
    """Function copies that the leading account names as held back: those behind the findings."""
    return {str(copy) for account in explanation.accounts[:1] for copy in account.bottlenecks["function"]}
