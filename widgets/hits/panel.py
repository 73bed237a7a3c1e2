"""What is hit: shares with their intervals, overlap, clearance, and whose anatomy, most damaged first."""

from __future__ import annotations

import asyncio
from typing import Any, ClassVar

import numpy as np
import traitlets as t
from numpy.typing import NDArray

from byway.widgets.front import load_css, load_esm
from byway.widgets.hits.wire import elements_of, values_of
from byway.widgets.panel import Panel

__all__ = ["HitsPanel"]

FOLLOWS_S = 0.15
"""How long after a stroke its clearance is reckoned, where no further stroke has come."""


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
    clearance_waits = t.Bool(False).tag(sync=True)

    def __init__(self, source: Any) -> None:
        super().__init__(source)
        self._clearance_mm: NDArray[np.float32] | None = None
        self.show_settled()
        self.when(["damage_seq"], self.show_damage)
        self.when(["accounts_seq"], self.show_settled)

    def show_damage(self) -> None:
        """Point estimates of the lesion as it is drawn now; intervals are awaited.

        In a running kernel the clearance follows a moment later: until then the last one stands, marked as old.
        """
        damage = self.state.damage
        if damage is None:
            return
        elements = elements_of(damage.index.geometry, self.state.science.names)
        old = self._clearance_mm
        try:
            loop = asyncio.get_running_loop()
        except RuntimeError:
            old = None
        if old is None or len(old) != len(elements):
            self._show_point(damage, elements)
            return
        self._show_rows(values_of(damage, old), elements, None, waits=True)
        loop.call_later(FOLLOWS_S, self._follow, damage, elements)

    def _follow(self, damage: Any, elements: list[list[str]]) -> None:
        """The clearance of a lesion that is still the one at hand and not settled meanwhile."""
        if self.state.damage is damage and self.clearance_waits:
            self._show_point(damage, elements)

    def _show_point(self, damage: Any, elements: list[list[str]]) -> None:
        self._clearance_mm = np.asarray(damage.clearance_mm, np.float32)
        self._show_rows(values_of(damage), elements, None)

    def show_settled(self) -> None:
        """Estimates with their intervals, once the hand rests."""
        explanation = self.state.explanation
        if explanation is None:
            self.show_damage()
            return
        table = explanation.damage
        if self.state.damage is not None:  # in the order of the geometry, as after a stroke: the list is sent once
            table = table.set_index("element").loc[list(self.state.damage.element_ids)].reset_index()
        elements = [list(row) for row in table[["element", "kind", "name", "side", "anatomy"]].itertuples(index=False)]
        values = table[["share", "low", "high", "overlap_ml", "clearance_mm"]].to_numpy(np.float32)
        self._clearance_mm = values[:, 4]
        self._show_rows(values, elements, explanation.uncharted_share)

    def _show_rows(
        self, values: NDArray[np.float32], elements: list[list[str]], uncharted: float | None, *, waits: bool = False
    ) -> None:
        with self.hold_sync():
            self.clearance_waits = waits
            if elements != self.elements:
                self.elements = elements
            self.values = values.astype("<f4").tobytes()
            self.uncharted_share = uncharted
            self.stamp += 1
