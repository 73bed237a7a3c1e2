"""One author's overlay on the open case: tried, kept, undone, written, and put to use by every panel at once."""

from __future__ import annotations

import datetime
from collections.abc import Sequence
from pathlib import Path
from typing import Any

from byway.knowledge.atomic import fingerprint
from byway.knowledge.cases.case import Case
from byway.knowledge.cases.files import inside
from byway.knowledge.cases.layers import mention_overlay, overlay_path
from byway.knowledge.faults import Fault, GraphError
from byway.knowledge.graph.content import Content
from byway.knowledge.graph.edits import Edit, Editing, Trial
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.layers import apply_overlays
from byway.knowledge.graph.loading import base_content
from byway.knowledge.graph.overlay_files import read_overlay, save_overlay
from byway.knowledge.graph.overlays import Overlay
from byway.knowledge.words import word
from byway.widgets.state import BenchState

__all__ = ["Session"]

_REMEMBERED = 3


class Session:
    """Editing of the graph as the open case uses it.

    Parameters
    ----------
    state : BenchState
        What is kept here is used there at once.
    author : str
        Who edits; the overlay is this author's own.
    base : Content, optional
        What the overlays lie on; the curated text where None.

    Raises
    ------
    GraphError, CaseError
        An overlay of the case cannot be read or used.
    """

    def __init__(self, state: BenchState, author: str, base: Content | None = None) -> None:
        if not author.strip():
            raise GraphError(Fault("author", "overlay", "no author", "a name or initials", "say who edits"))
        self.state = state
        self.author = author.strip()
        self.base = base if base is not None else base_content()
        self.path = overlay_path(self.author)
        self.opened: Graph | None = None
        self._seen: str | None = None
        self._case_folder: Path | None = None
        self._listed = False
        self._ready: dict[Any, Any] = {}
        self.below: list[tuple[str, Overlay]] = []
        self.editing = self._begin()

    @property
    def started_on(self) -> tuple[Path, tuple[str, ...]] | None:
        """Case folder and overlays that are edited here."""
        if self._case_folder is None:
            return None
        listed = [name for name, _ in self.below]
        return self._case_folder, (*listed, self.path) if self._listed else tuple(listed)

    # -- files ------------------------------------------------------------------------------------------------------

    @property
    def case(self) -> Case | None:
        """The open case, if there is one."""
        case: Case | None = self.state.case
        return case

    @property
    def file(self) -> Path | None:
        """Where the overlay is written; None without a case folder."""
        case = self.case
        return inside(case.folder, self.path) if case is not None else None

    def _begin(self) -> Editing:
        case, file = self.case, self.file
        self._case_folder = case.folder if case is not None else None
        self._listed = case is not None and self.path in case.spec.overlays
        self._seen = fingerprint(file) if file is not None else None
        own = Overlay(word("editing.overlay_name", author=self.author), self.author, datetime.date.today().isoformat())
        used = case.spec.overlays if case is not None else ()
        if file is not None and self._seen is not None:
            own = read_overlay(file)
        others = [name for name in used if name != self.path]
        self.below = [(name, read_overlay(inside(case.folder, name))) for name in others] if case is not None else []
        editing = Editing(self.base, own, [overlay for _, overlay in self.below])
        self.opened = editing.graph
        return editing

    def reload(self) -> None:
        """Read everything anew; what could be undone is forgotten."""
        self.editing = self._begin()

    def contents(self) -> list[tuple[str, Content]]:
        """The states that can be compared: the base, each overlay on top of it, and as it was when this began."""
        states: list[tuple[str, Content]] = [("base", self.base)]
        for n in range(len(self.below)):
            overlays = [overlay for _, overlay in self.below[: n + 1]]
            states.append((overlays[-1].name, apply_overlays(self.base, overlays)))
        if self.opened is not None:
            states.append(("opened", self.opened))
        states.append(("now", self.editing.graph))
        return states

    # -- edits ------------------------------------------------------------------------------------------------------

    def keep(self, edit: Edit, *, draft: bool = False) -> Trial:
        """Put an edit to use, or keep it as a draft, and write the overlay.

        Raises
        ------
        GraphError
            The edit brings a grave fault (and is no draft), or somebody else has written the file since.
        """
        self._check_file()
        trial = self.editing.keep_draft(edit) if draft else self.editing.keep(edit)
        self._write()
        return trial

    def undo(self) -> Edit | None:
        """Take the latest edit back, also in the file."""
        self._check_file()
        edit = self.editing.undo()
        if edit is not None:
            self._write()
        return edit

    def redo(self) -> Edit | None:
        """Do again what was taken back last."""
        self._check_file()
        edit = self.editing.redo()
        if edit is not None:
            self._write()
        return edit

    def _check_file(self) -> None:
        file = self.file
        if file is not None and fingerprint(file) != self._seen:
            raise GraphError(Fault("changed-meanwhile", self.path, "somebody else has written this file", "",
                                   "nothing was kept; read it again first"))  # fmt: skip

    def _write(self) -> None:
        file, case = self.file, self.case
        if file is None or case is None:
            self.use(self.editing.graph)
            return
        save_overlay(self.editing.overlay, file)
        self._seen = fingerprint(file)
        self._listed = True
        listed = [name for name, _ in self.below] + [self.path]
        if tuple(listed) != tuple(case.spec.overlays):
            case = mention_overlay(case, listed)
        self.use(self.editing.graph, case)

    def use(self, graph: Graph, case: Case | None = None) -> None:
        """Let every panel reason on a graph."""
        before = self.state.science.graph
        if before is not None and before.content_hash == graph.content_hash and before.disputes == graph.disputes:
            if case is not None:
                self.state.case = case
            return
        self.state.use_science(self.science_for(graph), case)

    def science_for(self, graph: Graph) -> Any:
        """What answers from a graph; the latest few are remembered: what was tried, and what undo brings back."""
        key = _whole(graph)
        if key not in self._ready:
            now: Any = self.state.science
            self._ready.setdefault(_whole(now.graph), now)
            # One with the same places lends its geometry; undo then builds nothing.
            same = (each for each in self._ready.values() if each.graph.anatomy_hash == graph.anatomy_hash)
            self._ready[key] = next(same, now).with_graph(graph)
        self._ready[key] = self._ready.pop(key)
        for old in list(self._ready)[:-_REMEMBERED]:
            del self._ready[old]
        return self._ready[key]

    def lay(self, overlay: Overlay) -> None:
        """Take an overlay of another department in as a layer of its own, below one's own edits.

        Raises
        ------
        GraphError
            It cannot be used together with what lies there, or its name is taken.
        """
        case = self.case
        if case is None:
            raise GraphError(Fault("no-case", overlay.name, "no case folder to keep it in", "an open case"))
        path = overlay_path(overlay.name)
        file = inside(case.folder, path)
        if path == self.path or path in case.spec.overlays or file.exists():
            raise GraphError(Fault("overlay-form", overlay.name, "an overlay of this name is there", "another name"))
        others = [each for _, each in self.below]
        Editing(self.base, self.editing.overlay, [*others, overlay])  # raises where they do not go together
        save_overlay(overlay, file)
        self.choose([*(name for name, _ in self.below), path])

    def choose(self, paths: Sequence[str], *, write: bool = True) -> None:
        """Use these overlays of the case, in this order; one's own lies above them where it has entries.

        Raises
        ------
        GraphError, CaseError
            They cannot be used together; what was in use stays.
        """
        case = self.case
        if case is None:
            raise GraphError(Fault("no-case", "overlays", "no open case", "an open case"))
        own = [self.path] if self.editing.overlay.entries else []
        listed = [*(path for path in paths if path != self.path), *own]
        before = case
        try:
            self.state.case = case.with_spec(overlays=tuple(listed))
            self.reload()
        except Exception:
            self.state.case = before
            self.reload()
            raise
        self.use(self.editing.graph, mention_overlay(before, listed) if write else self.state.case)


def _whole(graph: Graph) -> tuple[Any, ...]:
    """All that tells one graph from another: records, disputes, and the layers that they came from."""
    return graph.content_hash, graph.layers, tuple(graph.disputes.items())
