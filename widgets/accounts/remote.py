"""Remote effects: regions that the lesion spares and cuts off, why each is named, and what the network lost there."""

from __future__ import annotations

from typing import Any, ClassVar

import traitlets as t

from byway.widgets.front import load_css, load_esm
from byway.widgets.panel import Panel
from byway.widgets.wire import plain

__all__ = ["RemotePanel"]


class RemotePanel(Panel):
    """Regions that lost input, most first, with the standard measures of the network before and after."""

    _esm = load_esm("accounts/remote.js")
    _css = load_css("front/panel.css", "accounts/remote.css")
    sections: ClassVar[tuple[str, ...]] = ("remote",)

    rows: Any = t.List().tag(sync=True)

    def __init__(self, source: Any) -> None:
        super().__init__(source)
        self.show_regions()
        self.when(["accounts_seq"], self.show_regions)

    def show_regions(self) -> None:
        """The regions as they stand."""
        explanation = self.state.explanation
        with self.hold_sync():
            self.rows = [] if explanation is None else plain(explanation.remote.to_dict("records"))
            self.stamp += 1
