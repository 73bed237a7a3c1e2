"""Whose anatomy: the template's and the case's own side by side, element by element, for the lesion as it stands."""

from __future__ import annotations

from typing import Any, ClassVar

import pandas as pd
import traitlets as t

from byway.widgets.front import load_css, load_esm
from byway.widgets.panel import Panel, whose_of
from byway.widgets.wire import plain

__all__ = ["AnatomiesPanel"]


class AnatomiesPanel(Panel):
    """Template, own and their difference in share for every element of own anatomy.

    ``table`` is what is shown (:func:`~byway.knowledge.cases.anatomies.anatomies_of`), or None.
    """

    _esm = load_esm("anatomy/anatomies.js")
    _css = load_css("front/panel.css", "anatomy/view.css")
    sections: ClassVar[tuple[str, ...]] = ("anatomies",)

    rows: Any = t.List().tag(sync=True)
    whose = t.Unicode("").tag(sync=True)
    notes: Any = t.List().tag(sync=True)

    def __init__(self, source: Any) -> None:
        super().__init__(source)
        self.table: pd.DataFrame | None = None
        self.show_anatomies()
        self.when(["accounts_seq", "case_seq", "graph_seq"], self.show_anatomies)

    def show_anatomies(self) -> None:
        """The comparison as it stands."""
        ask = getattr(self.state.science, "anatomies", None)
        self.table = ask(self.state.lesion, self.state.damage) if ask is not None else None
        with self.hold_sync():
            self.rows = [] if self.table is None else plain(self.table.to_dict("records"))
            self.whose = whose_of(self.state)
            self.notes = list(getattr(self.state.science, "anatomy_notes", ()))
            self.stamp += 1
