"""Keeping a state and its case folder in step: journal what is done here, take in what others write there.

What one kernel writes shows in another within two seconds. Where both changed different fields of case.yaml, both
changes hold; where both changed the same field, nothing is taken over: the screen keeps ours, saving keeps both
versions (see :mod:`byway.knowledge.cases.versions`), and somebody decides.
"""

from __future__ import annotations

import asyncio
import contextlib
import os
import queue
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any

from byway.knowledge.atomic import fingerprint
from byway.knowledge.cases.case import Case, open_case
from byway.knowledge.cases.journal import Journal, lost_journals
from byway.knowledge.cases.model import CaseFile
from byway.knowledge.cases.versions import merged, settle_version
from byway.knowledge.cases.watch import PERIOD_S, CaseWatch
from byway.knowledge.faults import BywayError
from byway.knowledge.reasoning.findings import Finding
from byway.knowledge.words import word
from byway.widgets.state.bench_state import BenchState
from byway.widgets.state.casefiles import findings_spec
from byway.widgets.state.edits import bytes_edit
from byway.widgets.state.history import unpacked_indices

__all__ = ["UNNAMED", "Following", "unsaved"]

UNNAMED = "unnamed"


class Following:
    """Binds a state to its case folder until :meth:`close`.

    Parameters
    ----------
    state : BenchState
        With a case that lies on disk.
    period_s : float
        Seconds between two looks at the folder.

    Notes
    -----
    Every change is journalled before the reasoning begins, so that a lost kernel costs at most the stroke in hand.
    An undo or redo is journalled as the bytes that it gave: what is undone may lie before the last saving.
    """

    def __init__(self, state: BenchState, *, period_s: float = PERIOD_S) -> None:
        self.state = state
        self.folder: Path = state.case.folder
        self.journal = Journal(self.folder, state.author or UNNAMED)
        self.base: CaseFile = self._resolved(state.case)
        self.seen: str | None = state.case.seen
        self.unsaved = 0
        self._loop: asyncio.AbstractEventLoop | None = None
        self._waiting: queue.SimpleQueue[set[str]] = queue.SimpleQueue()
        self.watch = CaseWatch(self.folder, self._heard, period_s=period_s)
        state.journal = self.record
        state.following = self
        state.observe(self._case_moved, ["case_seq"])

    def start(self) -> Following:
        """Watch the folder from a thread; changes are taken in on the event loop that runs now, if one does."""
        with contextlib.suppress(RuntimeError):
            self._loop = asyncio.get_running_loop()
        self.watch.start()
        return self

    def close(self) -> None:
        """Stop watching and journalling."""
        self.watch.close()
        self.journal.close()
        self.state.unobserve(self._case_moved, ["case_seq"])
        self.state.journal = None
        self.state.following = None

    # -- what is done here ------------------------------------------------------------------------------------------

    def record(self, entry: Mapping[str, Any]) -> None:
        """Journal one change of the state; it holds when this returns."""
        kind = entry.get("kind")
        if kind == "edit":
            self.unsaved += 1
            entry = {**entry, "edit": self._exact(entry["edit"])}
        elif kind == "saved":
            self.unsaved = 0
        self.journal.append(dict(entry))

    def _exact(self, edit: Mapping[str, Any]) -> dict[str, Any]:
        drawing = self.state.drawing
        steps = {"undo": drawing.history.undone, "redo": drawing.history.done}.get(str(edit["op"]))
        if not steps:
            return dict(edit)
        indices = unpacked_indices(steps[-1].indices)
        change = self.state.last_change
        styles = drawing.styles if change is not None and change.settings else None
        return {**bytes_edit(indices, drawing.flat[indices], styles), "label": edit["op"]}

    def recover(self) -> int:
        """Bring back what a lost kernel of the same author had journalled and not saved; returns how many changes.

        The journals taken over are named in this one with all that they held, in one line, so that a kernel lost
        right afterwards loses nothing either.
        """
        count = 0
        for writer, entries in lost_journals(self.folder, self.journal.author).items():
            edits, findings = unsaved(entries)
            if not edits and findings is None:
                continue
            self.journal.append({"kind": "taken", "from": writer, "edits": edits, "findings": findings})
            self.state.journal = None  # they stand in the journal already
            try:
                entries_again = [{"author": "", "kind": "edit", "edit": edit} for edit in edits]
                count += self.state.recover(entries_again, "")
                if findings is not None:
                    self.state.set_findings([Finding(**finding) for finding in findings])
                    count += 1
            finally:
                self.state.journal = self.record
            self.unsaved += len(edits)
        if count:
            self.state.tell(word("slices.recovered", count=count))
        return count

    # -- what others do ---------------------------------------------------------------------------------------------

    def poll(self) -> None:
        """Look at the folder now, and take in what has changed."""
        self.watch.poll()
        self._take_in()

    def _heard(self, changed: set[str]) -> None:
        """On the watching thread: hand over to the kernel's."""
        self._waiting.put(changed)
        loop = self._loop
        if loop is not None and not loop.is_closed():
            with contextlib.suppress(RuntimeError):
                loop.call_soon_threadsafe(self._take_in)

    def _take_in(self) -> None:
        changed: set[str] = set()
        with contextlib.suppress(queue.Empty):
            while True:
                changed |= self._waiting.get_nowait()
        if not changed:
            return
        if "case.yaml" in changed:
            self._read_again()
        elif self._lesion_files() & changed and not self.unsaved:
            self.state.open(self._as_held())
        if any(os.sep in name or "/" in name or name.startswith("case.") for name in changed):
            self.state.pages_seq += 1

    def _resolved(self, case: Case) -> CaseFile:
        """What case.yaml says, with its signs by key, as a state holds them: then equal findings compare equal."""
        graph = self.state.science.graph
        if graph is None:
            return case.spec
        return case.with_spec(findings=findings_spec(case.findings(graph))).spec

    def _lesion_files(self) -> set[str]:
        spec = self.state.case.spec.lesion
        return {name for name in (*(c.file for c in spec.compartments), spec.effect_map) if name is not None}

    def _as_held(self) -> Case:
        """The case as the screen holds it: its case.yaml with the findings of the state; a new value, files unread."""
        case: Case = self.state.case
        spec = case.with_spec(findings=findings_spec(self.state.findings)).spec
        return Case(spec, self.folder, case.seen, case.where)

    def _read_again(self) -> None:
        if fingerprint(self.state.case.path) == self.state.case.seen:
            return  # our own writing
        try:
            theirs = open_case(self.folder)
        except (BywayError, OSError) as error:
            self.state.tell(error)
            return
        try:
            new = self._resolved(theirs)
        except BywayError as error:  # a sign that this graph does not know
            self.state.tell(error)
            return
        spec, clashing = merged(self.base, self._as_held().spec, new)
        if self.unsaved and new.lesion != self.base.lesion and "lesion" not in clashing:
            clashing = (*clashing, "lesion")
        if clashing:
            self.state.tell(word("notes.clash", fields=", ".join(clashing)))
            return
        self.base, self.seen = new, theirs.seen
        try:
            self.state.adopt(Case(spec, self.folder, theirs.seen, theirs.where))
        except BywayError as error:  # a volume that cannot be used
            self.state.tell(error)
            return
        self.state.tell(word("notes.reloaded"))

    def _case_moved(self, _: Any) -> None:
        case = self.state.case
        if case is not None and case.seen != self.seen:  # written here, or taken in
            self.base, self.seen = self._resolved(case), case.seen

    def settle(self, name: str, keep: Any) -> None:
        """Keep one of two versions of case.yaml, and show what is kept."""
        settle_version(self.folder, name, keep)
        case = open_case(self.folder)
        self.base, self.seen, self.unsaved = self._resolved(case), case.seen, 0
        self.state.open(case)
        self.record({"kind": "saved"})
        self.record({"kind": "saved_case"})
        self.state.pages_seq += 1


def unsaved(entries: Iterable[Mapping[str, Any]]) -> tuple[list[dict[str, Any]], list[dict[str, Any]] | None]:
    """Edits since the drawing was last saved, and findings since case.yaml was (None where none changed).

    >>> unsaved([{"kind": "edit", "edit": {"op": "mirror"}}, {"kind": "saved"},
    ...          {"kind": "edit", "edit": {"op": "clear"}}])
    ([{'op': 'clear'}], None)
    """
    edits: list[dict[str, Any]] = []
    findings: list[dict[str, Any]] | None = None
    for entry in entries:
        match entry.get("kind"):
            case "saved":
                edits.clear()
            case "saved_case":
                findings = None
            case "edit":
                edits.append(dict(entry["edit"]))
            case "findings":
                findings = list(entry["findings"])
            case "taken":
                edits += entry["edits"]
                findings = entry["findings"] if entry["findings"] is not None else findings
    return edits, findings
