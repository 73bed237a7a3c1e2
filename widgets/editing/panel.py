"""The kernel's half of the editing panel: forms in; faults, effects, differences and files out."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any, ClassVar

import numpy as np
import traitlets as t
from pydantic import ValidationError

from byway.knowledge.cases.layers import read_models
from byway.knowledge.faults import BywayError, CaseError, Fault, GraphError
from byway.knowledge.graph.content import KINDS, Content, Kind
from byway.knowledge.graph.edits import Edit, Trial, make_edit, use_draft, withdraw
from byway.knowledge.graph.grammar import to_block
from byway.knowledge.graph.overlays import ACTIONS, Action, Slot, overlay_text
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.words import word
from byway.widgets.editing.effects import Effects
from byway.widgets.editing.forms import EDITABLE, fields_told, new_block
from byway.widgets.editing.placing import faults_told
from byway.widgets.editing.rivals import Rivals
from byway.widgets.editing.session import Session
from byway.widgets.editing.sketch import SLICE_STEP, course_sketch, slices_volume
from byway.widgets.editing.visits import Incoming
from byway.widgets.editing.wire import catalogue_of, changes_told, coverage_told, entries_told, picture_of
from byway.widgets.front import load_css, load_esm
from byway.widgets.panel import Panel
from byway.widgets.wire import plain, send

__all__ = ["EditingPanel"]


class EditingPanel(Panel):
    """Change, retire and dispute what the graph says; review, export and import edits; compare rival models.

    Parameters
    ----------
    source : BenchState or Explanation
    author : str, optional
        Whose overlay is edited; the bench's initials by default, to be changed on the panel.
    base : Content, optional
        What overlays lie on; the curated text where None.

    Notes
    -----
    Messages from the browser (``kind``): ``author``; ``open`` a record in a form; ``try``, ``keep`` or ``draft`` an
    edit; ``undo``, ``redo``; ``reject`` or ``use`` an entry; ``differ`` two states; ``export``; ``import`` a text,
    then ``accept``, ``accept_all``, ``lay`` or ``drop`` it; ``model`` names a set of overlays, ``switch`` uses one,
    ``compare`` two; ``coverage``; ``slices`` and ``sketch`` for waypoints; ``look`` moves the crosshair.
    """

    _esm = load_esm("editing/view.js")
    _css = load_css("front/panel.css", "editing/view.css")
    sections: ClassVar[tuple[str, ...]] = ("evidence", "findings", "editing")

    told = t.Dict().tag(sync=True)
    fields = t.Dict().tag(sync=True)
    catalogue = t.Dict().tag(sync=True)
    form = t.Dict().tag(sync=True)
    trial = t.Dict().tag(sync=True)
    effect = t.Dict().tag(sync=True)
    differing = t.Dict().tag(sync=True)
    incoming = t.Dict().tag(sync=True)
    models = t.Dict().tag(sync=True)
    coverage = t.Dict().tag(sync=True)
    crosshair = t.List(t.Float(), default_value=[0.0, 0.0, 0.0]).tag(sync=True)

    def __init__(self, source: Any, author: str = "", base: Content | None = None) -> None:
        self.session: Session | None = None
        self._base = base
        super().__init__(source)
        # Never the computer's login name, which could say who somebody is.
        self._author = author or str(getattr(self.state, "author", "")) or word("editing.unsigned")
        self.fields = dict(plain(fields_told()))
        self.effects = Effects(self.state, self._show_effect)
        self.visit = Incoming()
        self.rivals = Rivals(self.state)
        self._handlers: dict[str, Callable[[dict[str, Any]], None]] = {
            "author": lambda message: self.start(str(message["name"])),
            "reload": lambda message: self.start(self._author),
            "open": self._on_open, "try": self._on_try, "keep": self._on_keep, "draft": self._on_keep,
            "undo": lambda message: self._step("undo"), "redo": lambda message: self._step("redo"),
            "reject": lambda message: self._use(withdraw(self._overlay, _slot(message["slot"]))),
            "use": lambda message: self._use(use_draft(self._overlay, _slot(message["slot"]))),
            "differ": self._on_differ, "export": self._on_export,
            "import": self._on_import, "accept": self._on_accept, "accept_all": self._on_accept, "lay": self._on_lay,
            "drop": self._on_drop, "model": self._on_model, "switch": self._on_switch, "compare": self._on_compare,
            "coverage": lambda message: self._show_coverage(), "slices": self._on_slices, "sketch": self._on_sketch,
            "look": lambda message: setattr(self.state, "cursor_mm", tuple(float(x) for x in message["mm"])),
        }  # fmt: skip
        self.start(self._author)
        self.crosshair = list(self.state.cursor_mm)
        self.when(["cursor_mm"], lambda: setattr(self, "crosshair", list(self.state.cursor_mm)))
        self.when(["graph_seq"], self.show_session)
        self.when(["case_seq"], self._case_moved)

    def close(self) -> None:
        """Stop the work in the background, and leave the screen."""
        self.effects.close()
        super().close()

    @property
    def _open(self) -> Session:
        if self.session is None:
            raise BywayError(Fault("session", "editing", "no graph to edit", "", "open a case, or say who edits"))
        return self.session

    @property
    def _overlay(self) -> Any:
        return self._open.editing.overlay

    # -- showing ----------------------------------------------------------------------------------------------------

    def start(self, author: str) -> None:
        """Edit in the name of an author, on the case as it stands."""
        if self.state.science.graph is None:
            return
        try:
            self.session, self._author = Session(self.state, author, self._base), author.strip()
        except (GraphError, CaseError) as error:
            self.state.tell(error)
        self.show_session()

    def _case_moved(self) -> None:
        """Begin anew where another case, or other overlays, came in; not where only the person's facts changed."""
        session, case = self.session, self.state.case
        if session is None or case is None or session.started_on != (case.folder, case.spec.overlays):
            self.start(self._author)

    def show_session(self) -> None:
        """What the overlay holds, and what there is to pick from."""
        session = self.session
        with self.hold_sync():
            if session is None:
                self.told = {}
                return
            editing, case = session.editing, session.case
            self.told = {
                "author": session.author, "overlay": editing.overlay.name,
                "path": session.path if case is not None else "", "undo": editing.can_undo, "redo": editing.can_redo,
                "entries": entries_told(editing.overlay), "states": [name for name, _ in session.contents()],
                "layers": [{"path": path, "name": overlay.name} for path, overlay in session.below],
                "standing": faults_told(editing.report, "", {}, ()), "folder": case is not None,
            }  # fmt: skip
            self.catalogue = catalogue_of(editing.graph)
            self._show_models()
            if self.coverage:
                self._show_coverage()
            self.stamp += 1

    def _show_models(self, **more: Any) -> None:
        case = self._open.case
        listed = read_models(case.folder) if case is not None else []
        used = list(case.spec.overlays) if case is not None else []
        files = sorted({*used, *(path for model in listed for path in model.overlays)}) if case is not None else []
        self.models = {"models": [{"name": model.name, "overlays": list(model.overlays)} for model in listed],
                       "used": used, "files": files, **more}  # fmt: skip

    def _show_coverage(self) -> None:
        self.coverage = coverage_told(self._open.editing.graph)

    def _show_effect(self, told: dict[str, Any]) -> None:
        self.effect = told

    def on_message(self, content: dict[str, Any], buffers: list[Any]) -> None:
        """Act on a message; a fault becomes a notice and changes nothing."""
        handler = self._handlers.get(str(content.get("kind")))
        if handler is None:
            return
        try:
            handler(content)
        except BywayError as error:
            self._tell("fault", text=str(error), of=content.get("kind"))
            raise
        except (LookupError, ValidationError) as error:
            raise ValueError(f"{content.get('kind')}: {error}") from error

    def _tell(self, kind: str, arrays: Mapping[str, Any] | None = None, **fields: Any) -> None:
        message, buffers = send(kind, arrays, **fields)
        self.send(message, buffers)

    # -- the form ---------------------------------------------------------------------------------------------------

    def _on_open(self, message: dict[str, Any]) -> None:
        kind, key = _kind(message["of"]), str(message.get("key", ""))
        if not key:
            self.form = {"of": kind, "key": "", "action": "add", "block": new_block(kind), "n": message["n"]}
            return
        record = self._open.editing.graph.records(kind).get(key)
        drafts = {entry.key: entry for entry in self._overlay.drafts if entry.kind == kind}
        if record is None and key not in drafts:
            raise GraphError(Fault("unknown-key", f"{kind} {key}", "it is not in the graph in use"))
        block = to_block(record) if record is not None else dict(drafts[key].body)
        self.form = dict(plain({"of": kind, "key": key, "action": "change" if record is not None else "add",
                                "block": block, "n": message["n"]}))  # fmt: skip

    def _edit_of(self, message: Mapping[str, Any]) -> Edit:
        action = str(message["action"])
        if action not in ACTIONS:
            raise GraphError(Fault("edit", "editing", f"action {action!r}", ", ".join(ACTIONS)))
        chosen: Action = action
        kind, key = _kind(message["of"]), str(message["key"])
        body = dict(message.get("body") or {})
        return make_edit(self._overlay, chosen, kind, key, body, reason=str(message.get("reason", "")).strip(),
                         author=self._open.author)  # fmt: skip

    def _told_of(self, trial: Trial, message: Mapping[str, Any]) -> dict[str, Any]:
        session = self._open
        names = [field["name"] for field in self.fields.get(str(message["of"]), [])]
        body = dict(message.get("body") or {})
        newer = trial.graph if trial.graph is not None else session.editing.graph
        return {
            "n": message["n"], "usable": trial.usable,
            "faults": faults_told(trial.report, str(message["key"]), body, names),
            "changes": changes_told(trial.changes),
            "picture": picture_of(trial.changes, session.editing.graph, newer),
        }  # fmt: skip

    def _on_try(self, message: dict[str, Any]) -> None:
        try:
            trial = self._open.editing.try_edit(self._edit_of(message))
        except GraphError as error:  # no reason given yet, say
            faults = faults_told(error.faults, str(message["key"]), {}, ("reason",))
            self.trial = {"n": message["n"], "usable": False, "changes": [], "picture": {},
                          "faults": [{**fault, "field": "reason" if fault["rule"] == "no-reason" else fault["field"]}
                                     for fault in faults]}  # fmt: skip
            self.effects.forget()
            return
        self.trial = dict(plain(self._told_of(trial, message)))
        self.effects.ask(message["n"], trial.graph, self._open.science_for)

    def _on_keep(self, message: dict[str, Any]) -> None:
        draft = message["kind"] == "draft"
        trial = self._open.keep(self._edit_of(message), draft=draft)
        self.effects.forget()
        self.show_session()
        self._tell("kept", draft=draft, words=[change.words for change in trial.changes] or [trial.edit.words],
                   of=message["of"], key=message["key"])  # fmt: skip

    def _use(self, edit: Edit) -> None:
        self._open.keep(edit)
        self.show_session()
        self._tell("kept", draft=False, words=[edit.words], of="", key="")

    def _step(self, name: str) -> None:
        edit = getattr(self._open, name)()
        self.effects.forget()
        self.show_session()
        self._tell(name, words=edit.words if edit is not None else "")

    # -- waypoints --------------------------------------------------------------------------------------------------

    def _on_slices(self, message: dict[str, Any]) -> None:
        low = TEMPLATE_GRID.to_mm(np.zeros((1, 3)))[0]
        volume = slices_volume()
        self._tell("slices", {"data": volume}, shape=volume.shape, low_mm=low, step_mm=SLICE_STEP)

    def _on_sketch(self, message: dict[str, Any]) -> None:
        try:
            arrays = course_sketch(message["body"], self.state.geometry, streamlines=int(message.get("lines", 40)))
        except BywayError as error:
            self._tell("sketch", n=message["n"], fault=str(error))
            return
        self._tell("sketch", arrays, n=message["n"], fault="")

    # -- review -----------------------------------------------------------------------------------------------------

    def _on_differ(self, message: dict[str, Any]) -> None:
        self.differing = self.rivals.differing(self._open, int(message["older"]), int(message["newer"]))

    def _on_export(self, message: dict[str, Any]) -> None:
        self._tell("file", name=self._open.path.rpartition("/")[2], text=overlay_text(self._overlay))

    def _on_import(self, message: dict[str, Any]) -> None:
        self.visit.read(str(message["text"]), str(message.get("name", "overlay")))
        self.incoming = self.visit.told(self._open)

    def _on_accept(self, message: dict[str, Any]) -> None:
        slots = [_slot(message["slot"])] if message["kind"] == "accept" else self.visit.peaceful(self._open)
        for edit in self.visit.edits(self._open, slots):
            self._open.keep(edit)
        self.show_session()
        self.incoming = self.visit.told(self._open)

    def _on_lay(self, message: dict[str, Any]) -> None:
        self._open.lay(self.visit.overlay_or_raise)
        self._on_drop(message)
        self.show_session()

    def _on_drop(self, message: dict[str, Any]) -> None:
        self.visit.drop()
        self.incoming = {}

    # -- rival models -----------------------------------------------------------------------------------------------

    def _on_model(self, message: dict[str, Any]) -> None:
        self.rivals.name(self._open, str(message["name"]), [str(path) for path in message["overlays"]])
        self._show_models()

    def _on_switch(self, message: dict[str, Any]) -> None:
        self._open.choose(self.rivals.overlays_of(self._open, str(message["name"])))
        self.show_session()

    def _on_compare(self, message: dict[str, Any]) -> None:
        told = self.rivals.compared(self._open, str(message["first"]), str(message["second"]))
        self._show_models(compared=told)


def _kind(word: Any) -> Kind:
    if word not in KINDS or word not in EDITABLE:
        raise GraphError(Fault("kind", "editing", f"{word!r}", ", ".join(EDITABLE)))
    kind: Kind = word
    return kind


def _slot(words: Any) -> Slot:
    action, kind, key = words
    if action not in ACTIONS or kind not in KINDS:
        raise GraphError(Fault("edit", "editing", f"{words!r}", "an action, a kind and a key"))
    return (action, kind, str(key))
