"""The bench: all panels around one state."""

from __future__ import annotations

import importlib
import os
from pathlib import Path
from typing import Any, ClassVar, get_args

import anywidget
import ipywidgets
import numpy as np
import traitlets as t

from byway.knowledge.cases.case import Case, open_case
from byway.knowledge.cases.explaining import desk_of
from byway.knowledge.cases.model import CaseFile, PersonSpec
from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.words import section, word
from byway.widgets.accounts import AccountsPanel
from byway.widgets.findings import FindingsPanel
from byway.widgets.front import load_css, load_esm
from byway.widgets.hits import HitsPanel
from byway.widgets.panel import Panel, whose_of
from byway.widgets.slices import SlicesPanel
from byway.widgets.state import BenchState
from byway.widgets.state.following import Following
from byway.widgets.state.live import LiveScience

__all__ = ["Bench", "BenchHead", "bench"]

DECK = {
    "profile": ("byway.widgets.accounts.profile", "ProfilePanel"),
    "routes": ("byway.widgets.routes.panel", "RoutesPanel"),
    "whatif": ("byway.widgets.accounts.whatif", "WhatIfPanel"),
    "own": ("byway.widgets.accounts.own", "OwnAccountPanel"),
    "steady": ("byway.widgets.accounts.steady", "SteadyPanel"),
    "remote": ("byway.widgets.accounts.remote", "RemotePanel"),
    "graph": ("byway.widgets.graph.panel", "GraphPanel"),
    "editing": ("byway.widgets.editing.panel", "EditingPanel"),
    "along": ("byway.widgets.anatomy.along", "AlongPanel"),
    "anatomies": ("byway.widgets.anatomy.anatomies", "AnatomiesPanel"),
    "head": ("byway.widgets.head.panel", "HeadPanel"),
    "notes": ("byway.widgets.notes.panel", "NotesPanel"),
}
"""Panels below the main four, made when first asked for: some load a drawing library that takes a second."""


AGE_BANDS = ["unknown", *(f"{decade}-{decade + 9}" for decade in range(0, 90, 10)), "90+"]
MOST_TITLE = 200


class BenchHead(Panel):
    """The strip above the panels: title, person, stage, cause, caution, and the state's last remark."""

    _esm = load_esm("front/head.js")
    _css = load_css("front/panel.css", "front/bench.css")
    sections: ClassVar[tuple[str, ...]] = ("bench",)

    told = t.Dict().tag(sync=True)
    options = t.Dict().tag(sync=True)
    notice = t.Unicode("").tag(sync=True)

    def __init__(self, source: Any) -> None:
        super().__init__(source)
        self.options = {
            "age_band": AGE_BANDS,
            "handedness": list(get_args(PersonSpec.model_fields["handedness"].annotation)),
            "stage": list(get_args(CaseFile.model_fields["stage"].annotation)),
            "cause": list(get_args(CaseFile.model_fields["cause"].annotation)),
        }
        self.show_case()
        self.when(["case_seq", "graph_seq"], self.show_case)
        self._notices = t.dlink((self.state, "notice"), (self, "notice"))

    def show_case(self) -> None:
        """What the case says of itself."""
        case = self.state.case
        spec = case.spec if case is not None else None
        with self.hold_sync():
            self.told = {
                "open": spec is not None,
                "title": spec.title if spec else None,
                "invented": bool(spec and spec.invented),
                "handedness": spec.person.handedness if spec else "unknown",
                "age_band": spec.person.age_band if spec else "unknown",
                "stage": spec.stage if spec else "subacute",
                "cause": spec.cause if spec else "unknown",
                "folder": str(case.folder) if case is not None else None,
                "whose": whose_of(self.state),
            }
            self.stamp += 1

    def on_message(self, content: dict[str, Any], buffers: list[Any]) -> None:
        """Change what is known of the person, or save."""
        case = self.state.case
        if case is None:
            return
        if content.get("kind") == "save":
            self.save()
        elif content.get("kind") == "case":
            name, value = content["name"], content["value"]
            if name == "title":
                change: dict[str, Any] = {"title": str(value).strip()[:MOST_TITLE] or None}
            elif name not in self.options or value not in self.options[name]:
                raise BywayError(Fault("case", str(name), repr(value), "one of the values offered"))
            elif name in PersonSpec.model_fields:
                change = {"person": {**case.spec.person.model_dump(), name: value}}
            else:
                change = {name: value}
            self.state.set_case(case.with_spec(**change))

    def save(self) -> None:
        """Write the findings and what is known of the person to case.yaml."""
        self.state.save_case()
        self.state.tell(word("bench.saved", path=self.state.case.path.name))

    def on_refused(self) -> None:
        """Show what the case says."""
        self.told = {}
        self.show_case()


class _Tabs(anywidget.AnyWidget):
    """A row of names of which one is chosen."""

    _esm = load_esm("front/tabs.js")
    _css = load_css("front/panel.css", "front/bench.css")

    words = t.Dict().tag(sync=True)
    names: Any = t.List().tag(sync=True)
    shown = t.Unicode().tag(sync=True)


class Bench(ipywidgets.VBox):  # type: ignore[misc]
    """Slices, hits, findings and accounts, with further views below; each is an attribute.

    Parameters
    ----------
    state : BenchState
        The case under hands, shared by all panels.
    """

    def __init__(self, state: BenchState) -> None:
        self.state = state
        self.head = BenchHead(state)
        self.slices = SlicesPanel(state)
        self.hits = HitsPanel(state)
        self.findings = FindingsPanel(state)
        self.accounts = AccountsPanel(state)
        self.deck: dict[str, Any] = {}
        four = {"slices": self.slices, "hits": self.hits, "findings": self.findings, "accounts": self.accounts}
        for name, panel in four.items():
            panel.add_class(f"byway-at-{name}")
        columns = [ipywidgets.Box([self.slices, self.findings]), ipywidgets.Box([self.hits, self.accounts])]
        for column in columns:
            column.add_class("byway-column")
        grid = ipywidgets.Box(columns)
        grid.add_class("byway-grid")
        self.tabs = _Tabs(words=section("bench"), names=list(DECK), shown=next(iter(DECK)))
        self._place = ipywidgets.Box([])
        self._place.add_class("byway-deck")
        self.tabs.observe(lambda _: self.show(self.tabs.shown), "shown")
        super().__init__([self.head, grid, self.tabs, self._place])
        self.add_class("byway-bench")
        self.show(self.tabs.shown)
        self.state.observe(self._show_place, "place")

    def show(self, name: str) -> Any:
        """Show one of the further views, and return its panel.

        Parameters
        ----------
        name : str
            ``profile``, ``routes``, ``whatif``, ``own``, ``steady``, ``graph``, ``editing``, ``along``,
            ``anatomies``, ``head`` or ``notes``.
        """
        if name not in DECK:
            raise BywayError(Fault("view", "bench", name, ", ".join(DECK)))
        if name not in self.deck:
            module, panel = DECK[name]
            self.deck[name] = getattr(importlib.import_module(module), panel)(self.state)
        self.tabs.shown = name
        self._place.children = (self.deck[name],)
        return self.deck[name]

    def _show_place(self, _: Any) -> None:
        """Show the place of the graph that a panel asks for."""
        if self.state.place:
            self.show("graph").centre = self.state.place

    @property
    def explanation(self) -> Any:
        """What the accounts panel shows: the explanation of the case as it stands."""
        return self.state.explanation

    def close(self) -> None:
        """Close every panel and stop the work in the background."""
        self.state.unobserve(self._show_place, "place")
        for panel in (self.head, self.slices, self.hits, self.findings, self.accounts, *self.deck.values()):
            panel.close()
        self.state.close()
        super().close()


def middle_mm(lesion: Lesion) -> tuple[float, float, float]:
    """The lesion's voxel nearest its centre, MNI mm; the origin for an empty one."""
    voxels = lesion.effect_voxels[0]
    if len(voxels) == 0:
        return (0.0, 0.0, 0.0)
    points = TEMPLATE_GRID.to_mm(np.stack(np.unravel_index(voxels, TEMPLATE_GRID.shape), axis=1))
    x, y, z = points[np.square(points - points.mean(axis=0)).sum(axis=1).argmin()]
    return (float(x), float(y), float(z))


def bench(
    case: Case | str | Path, *, draws: int = 200, settle: bool = True, author: str | None = None, follow: bool = True
) -> Bench:
    """Open a case on the bench.

    Parameters
    ----------
    case : Case or path
        A case, or the path of a case folder or its case.yaml.
    draws : int
        Virtual anatomies that intervals and accounts are averaged over.
    settle : bool
        Whether to wait for the accounts, so that the bench opens already explained.
    author : str, optional
        Who sits here, as the team calls them (initials); by default the environment's ``BYWAY_AUTHOR``.
    follow : bool
        Whether to journal what is done, bring back what a lost kernel had not saved, and take in what others write to
        the case folder. Without it the folder is touched only by saving.

    Returns
    -------
    Bench
        A widget; show it as the last line of a cell.

    Raises
    ------
    CaseError, ImageError
        The case or one of its volumes cannot be used.
    """
    opened = case if isinstance(case, Case) else open_case(case)
    state = BenchState(opened, LiveScience(desk_of(opened), draws=draws))
    state.author = os.environ.get("BYWAY_AUTHOR", "") if author is None else author
    if follow and opened.path.is_file():
        Following(state).start().recover()
    state.cursor_mm = middle_mm(state.lesion)
    if settle:
        state.settle()
    return Bench(state)
