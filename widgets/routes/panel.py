"""Routes: a function's network, what its routes usually carry and what still flows."""

from __future__ import annotations

from typing import Any, ClassVar

import traitlets as t

from byway.knowledge.faults import BywayError, Fault
from byway.widgets.front import load_css, load_esm
from byway.widgets.panel import Panel
from byway.widgets.routes.wire import choices_of, network_of

__all__ = ["RoutesPanel"]


class RoutesPanel(Panel):
    """The network of a function, laid out from first to last region, under the damage as drawn or under an account.

    Parameters
    ----------
    source : BenchState or Explanation
    function : str, optional
        Function copy id to begin with; by default the one that is held back most.
    """

    _esm = load_esm("routes/view.js")
    _css = load_css("front/panel.css", "routes/view.css")
    sections: ClassVar[tuple[str, ...]] = ("evidence", "findings", "routes")

    choices: Any = t.List().tag(sync=True)
    chosen = t.Unicode("").tag(sync=True)
    accounts: Any = t.List().tag(sync=True)
    account = t.Int(-1).tag(sync=True)
    net = t.Dict().tag(sync=True)

    def __init__(self, source: Any, function: str = "") -> None:
        super().__init__(source, chosen=function)
        self.show_choices()
        self.when(["accounts_seq"], self.show_choices)
        self.observe(lambda _: self.show_network(), ["chosen", "account"])

    def show_choices(self) -> None:
        """Functions, accounts and the chosen network, as they stand."""
        explanation = self.state.explanation
        with self.hold_sync():
            self.choices = choices_of(explanation, self.words)
            self.accounts = [account.title for account in explanation.accounts] if explanation is not None else []
            if self.account >= len(self.accounts):
                self.account = -1
            if self.chosen not in {choice["id"] for choice in self.choices}:
                self.chosen = self._first_choice()
            self.show_network()

    def _first_choice(self) -> str:
        """What the leading account names first as held back; else whatever is held back most."""
        offered = [choice["id"] for choice in self.choices]
        for account in self.state.explanation.accounts[:1] if self.state.explanation is not None else ():
            named = [copy for copy in account.bottlenecks["function"] if copy in offered]
            if named:
                return str(named[0])
        return offered[0] if offered else ""

    def show_network(self) -> None:
        """The chosen function's network."""
        explanation, graph = self.state.explanation, self.graph
        with self.hold_sync():
            if explanation is None or graph is None or not self.chosen:
                self.net = {}
            else:
                self._check()
                account = self.account if self.account >= 0 else None
                self.net = network_of(explanation, graph, self.chosen, account, recombined=self.words["recombined"])
            self.stamp += 1

    def _check(self) -> None:
        if self.chosen not in {choice["id"] for choice in self.choices} or not -1 <= self.account < len(self.accounts):
            raise BywayError(Fault("function", "routes", self.chosen, "one of the functions offered"))
