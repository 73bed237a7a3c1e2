"""Expected against found, sign by sign: the mismatch at one glance."""

from __future__ import annotations

from typing import Any, ClassVar

import traitlets as t

from byway.widgets.accounts.wire import profile_rows
from byway.widgets.front import load_css, load_esm
from byway.widgets.panel import Panel

__all__ = ["ProfilePanel"]


class ProfilePanel(Panel):
    """Every sign under its function: what the full model expects, what cortex alone would, and what was found."""

    _esm = load_esm("accounts/profile.js")
    _css = load_css("front/panel.css", "accounts/profile.css")
    sections: ClassVar[tuple[str, ...]] = ("evidence", "findings", "profile")

    rows: Any = t.List().tag(sync=True)

    def __init__(self, source: Any) -> None:
        super().__init__(source)
        self.show_profile()
        self.when(["accounts_seq"], self.show_profile)

    def show_profile(self) -> None:
        """The profile as it stands."""
        with self.hold_sync():
            self.rows = profile_rows(self.state.explanation, self.graph)
            self.stamp += 1
