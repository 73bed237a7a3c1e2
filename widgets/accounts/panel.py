"""Accounts: rival explanations of the findings, and what would tell them apart."""

from __future__ import annotations

from typing import Any, ClassVar

import traitlets as t

from byway.widgets.accounts.wire import told_of
from byway.widgets.front import load_css, load_esm
from byway.widgets.panel import Panel

__all__ = ["AccountsPanel"]


class AccountsPanel(Panel):
    """Accounts as cards: posterior, what each explains and leaves, bottleneck, ledger, evidence, next tests."""

    _esm = load_esm("accounts/view.js")
    _css = load_css("front/panel.css", "accounts/view.css")
    sections: ClassVar[tuple[str, ...]] = ("evidence", "findings", "accounts")

    told = t.Dict().tag(sync=True)
    busy = t.Bool(False).tag(sync=True)

    def __init__(self, source: Any) -> None:
        super().__init__(source)
        self.show_accounts()
        self.when(["accounts_seq", "case_seq"], self.show_accounts)
        self.when(["busy"], self.show_busy)
        self.show_busy()

    def show_accounts(self) -> None:
        """The accounts as they stand."""
        with self.hold_sync():
            self.told = told_of(self.state.explanation, self.graph)
            self.stamp += 1

    def show_busy(self) -> None:
        """Whether accounts are being weighed anew."""
        self.busy = self.state.busy
