"""An overlay from another department, in the hand: what it holds, what clashes, and what is accepted of it."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

from byway.knowledge.faults import BywayError, Fault, GraphError
from byway.knowledge.graph.edits import Edit, take_over
from byway.knowledge.graph.layers import clashes
from byway.knowledge.graph.overlays import Overlay, Slot, parse_overlay
from byway.widgets.editing.session import Session
from byway.widgets.editing.wire import conflicts_told, entries_told

__all__ = ["Incoming"]

_MOST_BYTES = 5_000_000


class Incoming:
    """The overlay that was imported and not yet decided on."""

    def __init__(self) -> None:
        self.overlay: Overlay | None = None

    @property
    def overlay_or_raise(self) -> Overlay:
        """The overlay.

        Raises
        ------
        BywayError
            None was imported.
        """
        if self.overlay is None:
            raise BywayError(Fault("import", "overlay", "nothing was imported", "", "choose a file first"))
        return self.overlay

    def read(self, text: str, name: str) -> None:
        """Take an overlay's text in hand.

        Raises
        ------
        GraphError
            It is no overlay; the one in hand stays.
        """
        if len(text.encode("utf-8", "replace")) > _MOST_BYTES:
            raise GraphError(Fault("overlay-form", name, "more than 5 MB", "an overlay"))
        self.overlay = parse_overlay(text, name)

    def drop(self) -> None:
        """Put it away."""
        self.overlay = None

    def told(self, session: Session) -> dict[str, Any]:
        """Its entries (accepted, fitting, or with a reason why not), and conflicts side by side."""
        overlay = self.overlay_or_raise
        mine = session.editing.overlay
        conflicts = [clash for each in (*(o for _, o in session.below), mine) for clash in clashes(each, overlay)]
        rows = []
        for row, entry in zip(entries_told(overlay), overlay.entries, strict=True):
            edit = take_over(mine, entry, overlay)
            accepted = all(step.before == step.after for step in edit.steps)
            trial = None if accepted else session.editing.try_edit(edit)
            why = "; ".join(str(fault) for fault in trial.report.grave) if trial is not None else ""
            rows.append({**row, "accepted": accepted, "fits": accepted or (trial is not None and trial.usable),
                         "why": why})  # fmt: skip
        return {"name": overlay.name, "author": overlay.author, "date": overlay.date, "entries": rows,
                "conflicts": conflicts_told(conflicts)}  # fmt: skip

    def peaceful(self, session: Session) -> list[Slot]:
        """Entries without a conflict, sources first, since others cite them."""
        overlay = self.overlay_or_raise
        layers = (*(o for _, o in session.below), session.editing.overlay)
        held = {(clash.kind, clash.key) for each in layers for clash in clashes(each, overlay)}
        order = ("source", "region", "pathway", "segment", "function", "sign", "claim", "norm")
        free = [entry.slot for entry in overlay.entries if (entry.kind, entry.key) not in held]
        return sorted(free, key=lambda slot: (order.index(slot[1]), slot))

    def edits(self, session: Session, slots: Iterable[Slot]) -> list[Edit]:
        """The edit that accepts some of its entries, all in one, so that entries which lean on one another fit.

        Raises
        ------
        BywayError
            It has no such entry.
        """
        overlay, mine = self.overlay_or_raise, session.editing.overlay
        steps = []
        for slot in slots:
            entry = overlay.entry(slot)
            if entry is None:
                raise BywayError(Fault("import", overlay.name, " ".join(slot), "an entry of it"))
            steps += [step for step in take_over(mine, entry, overlay).steps if step.before != step.after]
        return [Edit(tuple(steps))] if steps else []
