"""Edits of an overlay: made, tried against the graph, kept or kept as drafts, undone and done again.

An edit says what its slots held before and hold after, so its inverse is exact: an edit and its inverse leave an
overlay equal to what it was, byte by byte when written.
"""

from __future__ import annotations

import datetime
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

from byway.knowledge.faults import Fault, FaultReport, GraphError
from byway.knowledge.graph.checks import check_graph
from byway.knowledge.graph.content import Content, Kind, Origin
from byway.knowledge.graph.graph import Graph, graph_from
from byway.knowledge.graph.layers import Change, apply_overlays, diff
from byway.knowledge.graph.overlays import Action, Entry, Overlay, Slot

__all__ = ["Edit", "Editing", "Step", "Trial", "make_edit", "take_over", "use_draft", "withdraw"]


@dataclass(frozen=True)
class Step:
    """One slot of an overlay and what it holds before and after; None is empty."""

    slot: Slot
    before: Entry | None
    after: Entry | None


@dataclass(frozen=True)
class Edit:
    """One act of an editor: the slots that it changes."""

    steps: tuple[Step, ...]

    @property
    def inverse(self) -> Edit:
        """The edit that takes this one back."""
        return Edit(tuple(Step(step.slot, step.after, step.before) for step in reversed(self.steps)))

    @property
    def words(self) -> str:
        """What it does, in a few words."""
        told = []
        for step in self.steps:
            if step.after is not None:
                told.append(step.after.words)
            elif step.before is not None:
                told.append(f"takes back: {step.before.words}")
        return "; ".join(told)

    def apply(self, overlay: Overlay) -> Overlay:
        """The overlay after the edit.

        Raises
        ------
        GraphError
            The overlay does not hold what the edit expects to find.
        """
        for step in self.steps:
            if overlay.entry(step.slot) != step.before:
                where = f"{overlay.name}: {' '.join(step.slot)}"
                raise GraphError(Fault("edit", where, "the overlay has changed meanwhile", remedy="make the edit anew"))
            overlay = overlay.with_entry(step.slot, step.after)
        return overlay

    def as_draft(self) -> Edit:
        """The same edit, kept without being used."""
        return Edit(
            tuple(Step(s.slot, s.before, replace(s.after, draft=True) if s.after else None) for s in self.steps)
        )


def make_edit(
    overlay: Overlay,
    action: Action,
    kind: Kind,
    key: str,
    body: Mapping[str, Any] | None = None,
    *,
    reason: str = "",
    author: str = "",
    date: str = "",
) -> Edit:
    """The edit that does something to one record, as the overlay stands now.

    A change of what this overlay itself added or changed is folded into that entry; retiring what it added takes the
    addition back.

    Parameters
    ----------
    overlay : Overlay
        The overlay to be edited.
    action, kind, key : str
        What is done to which record.
    body : mapping, optional
        Block of an added record; fields with new values of a change; ``{"sources": [...]}`` of a dispute.
    reason : str
        Needed to retire or dispute.
    author, date : str
        Left out where they are the overlay's own; the date is an ISO date, by default today.

    Raises
    ------
    GraphError
        No reason for a retire or dispute.
    """
    date = date or datetime.date.today().isoformat()
    author = "" if author == overlay.author else author
    date = "" if date == overlay.date else date
    own = {each: overlay.entry((each, kind, key)) for each in ("add", "change", "retire", "dispute")}
    if action in ("retire", "dispute") and not reason:
        raise GraphError(Fault("no-reason", f"{kind} {key}", f"a {action} without a reason", "a reason in words"))
    if action == "retire":
        added = own["add"]
        steps = [_emptied(overlay, (each, kind, key)) for each in ("add", "change", "dispute") if own[each]]
        if added is None or added.draft:
            steps.append(_filled(overlay, Entry("retire", kind, key, {}, reason, author, date)))
        return Edit(tuple(steps))
    target: Action = action
    values = dict(body or {})
    if action == "change":
        target = "add" if own["add"] else "change"
        earlier = own[target]
        values = {**(earlier.body if earlier else {}), **values}
        reason = reason or (earlier.reason if earlier else "")
    return Edit((_filled(overlay, Entry(target, kind, key, values, reason, author, date)),))


def withdraw(overlay: Overlay, slot: Slot) -> Edit:
    """The edit that takes an entry, draft or not, out of an overlay (rejects it, in a review).

    Raises
    ------
    GraphError
        The slot is empty.
    """
    if overlay.entry(slot) is None:
        raise GraphError(Fault("edit", f"{overlay.name}: {' '.join(slot)}", "no such entry", remedy="check the key"))
    return Edit((_emptied(overlay, slot),))


def use_draft(overlay: Overlay, slot: Slot) -> Edit:
    """The edit that brings a draft into use.

    Raises
    ------
    GraphError
        The slot holds no draft.
    """
    entry = overlay.entry(slot)
    if entry is None or not entry.draft:
        raise GraphError(Fault("edit", f"{overlay.name}: {' '.join(slot)}", "no draft there", remedy="check the key"))
    return Edit((Step(slot, entry, replace(entry, draft=False)),))


def take_over(overlay: Overlay, entry: Entry, source: Overlay) -> Edit:
    """The edit that accepts an entry of another overlay into this one, with its own author and date.

    What this overlay holds in the same slot is replaced; :func:`~byway.knowledge.graph.layers.clashes` shows both.
    """
    author, date = entry.author or source.author, entry.date or source.date
    author = "" if author == overlay.author else author
    date = "" if date == overlay.date else date
    return Edit((_filled(overlay, replace(entry, author=author, date=date, origin=Origin("", "", 0))),))


@dataclass(frozen=True)
class Trial:
    """What an edit would do: the overlay after it, its faults, and the graph, which is None if it cannot be used.

    ``report`` holds the faults that the edit brings (grave ones forbid use; others say what is still missing);
    ``standing`` holds all that the overlay leaves incomplete after it; ``changes`` is the difference in effect, in
    words.
    """

    edit: Edit
    overlay: Overlay
    report: FaultReport
    standing: FaultReport
    graph: Graph | None
    changes: tuple[Change, ...]

    @property
    def usable(self) -> bool:
        """Whether the edit can be put to use."""
        return self.graph is not None


class Editing:
    """One overlay in an editor's hands, with undo. ``graph`` is always valid, whatever is tried.

    Parameters
    ----------
    base : Content
        What lies below; not touched.
    overlay : Overlay
        The overlay to be edited.
    below : sequence of Overlay
        Overlays between the base and this one.

    Raises
    ------
    GraphError
        The overlays cannot be used as they stand.
    """

    def __init__(self, base: Content, overlay: Overlay, below: Sequence[Overlay] = ()) -> None:
        self._below = apply_overlays(base, below)
        self._ground = {_identity(fault) for fault in check_graph(self._below)}
        self._done: list[tuple[Edit, _State]] = []
        self._undone: list[tuple[Edit, _State]] = []
        report, graph = self._effect(overlay)
        if graph is None:
            raise GraphError(*report.grave)
        self._state = _State(overlay, graph, report)

    @property
    def overlay(self) -> Overlay:
        """The overlay as it stands."""
        return self._state.overlay

    @property
    def graph(self) -> Graph:
        """The graph in effect."""
        return self._state.graph

    @property
    def report(self) -> FaultReport:
        """What this overlay leaves incomplete."""
        return self._state.report

    @property
    def can_undo(self) -> bool:
        """Whether an edit can be taken back."""
        return bool(self._done)

    @property
    def can_redo(self) -> bool:
        """Whether an edit that was taken back can be done again."""
        return bool(self._undone)

    def try_edit(self, edit: Edit) -> Trial:
        """What an edit would do; nothing is kept.

        Raises
        ------
        GraphError
            The edit was made for another state of the overlay.
        """
        overlay = edit.apply(self.overlay)
        standing, graph = self._effect(overlay)
        old = {_identity(fault) for fault in self.report}
        report = FaultReport([fault for fault in standing if _identity(fault) not in old])
        changes = tuple(diff(self.graph, graph)) if graph is not None else ()
        return Trial(edit, overlay, report, standing, graph, changes)

    def keep(self, edit: Edit) -> Trial:
        """Put an edit to use.

        Raises
        ------
        GraphError
            Holding every grave fault that it brings; overlay and graph stay as they were.
        """
        trial = self.try_edit(edit)
        if trial.graph is None:
            raise GraphError(*trial.report.grave)
        self._done.append((edit, self._state))
        self._undone.clear()
        self._state = _State(trial.overlay, trial.graph, trial.standing)
        return trial

    def keep_draft(self, edit: Edit) -> Trial:
        """Keep an edit as a draft: written with the overlay, not used."""
        return self.keep(edit.as_draft())

    def undo(self) -> Edit | None:
        """Take the latest edit back; None if there is none."""
        return self._step(self._done, self._undone)

    def redo(self) -> Edit | None:
        """Do the edit again that was taken back last; None if there is none."""
        return self._step(self._undone, self._done)

    def _step(self, here: list[tuple[Edit, _State]], there: list[tuple[Edit, _State]]) -> Edit | None:
        if not here:
            return None
        edit, state = here.pop()
        there.append((edit, self._state))
        self._state = state
        return edit

    def _effect(self, overlay: Overlay) -> tuple[FaultReport, Graph | None]:
        """Faults that an overlay brings to what lies below it, and the graph unless one is grave."""
        try:
            content = apply_overlays(self._below, [overlay])
        except GraphError as error:
            return FaultReport(list(error.faults)), None
        report = FaultReport([fault for fault in check_graph(content) if _identity(fault) not in self._ground])
        return report, None if report.grave else graph_from(content)


@dataclass(frozen=True)
class _State:
    overlay: Overlay
    graph: Graph
    report: FaultReport


def _identity(fault: Fault) -> tuple[str, str, str]:
    return fault.rule, fault.where, fault.found


def _filled(overlay: Overlay, entry: Entry) -> Step:
    before = overlay.entry(entry.slot)
    origin = before.origin if before else entry.origin
    return Step(entry.slot, before, replace(entry, origin=origin))


def _emptied(overlay: Overlay, slot: Slot) -> Step:
    return Step(slot, overlay.entry(slot), None)
