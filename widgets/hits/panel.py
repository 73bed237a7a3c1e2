"""What is hit: shares with their intervals, overlap, clearance, and whose anatomy, most damaged first."""

from __future__ import annotations

from typing import Any, ClassVar

import numpy as np
import traitlets as t
from numpy.typing import NDArray

from byway.widgets.front import load_css, load_esm
from byway.widgets.hits.wire import elements_of, values_of
from byway.widgets.panel import Panel

__all__ = ["HitsPanel"]


class HitsPanel(Panel):
    """The hit list.

    After an edit, point estimates go out at once as one small buffer and the intervals are marked as awaited; they
    follow with the accounts.

    Examples
    --------
    >>> HitsPanel(explain(case))  # doctest: +SKIP
    """

    _esm = load_esm("hits/view.js")
    _css = load_css("front/panel.css", "hits/view.css")
    sections: ClassVar[tuple[str, ...]] = ("hits",)

    elements: Any = t.List().tag(sync=True)
    values = t.Bytes().tag(sync=True)
    uncharted_share = t.Float(None, allow_none=True).tag(sync=True)

    def __init__(self, source: Any) -> None:
        super().__init__(source)
        self.show_settled()
        self.when(["damage_seq"], self.show_damage)
        self.when(["accounts_seq"], self.show_settled)

    def show_damage(self) -> None:
        """Point estimates of the lesion as it is drawn now; intervals are awaited."""
        damage = self.state.damage
        if damage is None:
            return
        self._show_rows(values_of(damage), elements_of(damage.index.geometry, self.state.science.names), None)

    def show_settled(self) -> None:
        """Estimates with their intervals, once the hand rests."""
        explanation = self.state.explanation
        if explanation is None:
            self.show_damage()
            return
        table = explanation.damage
        elements = [list(row) for row in table[["element", "kind", "name", "side", "anatomy"]].itertuples(index=False)]
        columns = table[["share", "low", "high", "overlap_ml", "clearance_mm"]]
        self._show_rows(columns.to_numpy(np.float32), elements, explanation.uncharted_share)

    def _show_rows(self, values: NDArray[np.float32], elements: list[list[str]], uncharted: float | None) -> None:
        with self.hold_sync():
            if elements != self.elements:
                self.elements = elements
            self.values = values.astype("<f4").tobytes()
            self.uncharted_share = uncharted
            self.stamp += 1
