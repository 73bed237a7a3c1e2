"""Notes, standings, versions and the course of a case: the team's side of the bench."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, ClassVar

import numpy as np
import traitlets as t

from byway.knowledge.cases.course import course_of_case
from byway.knowledge.cases.pages import Anchor, Note, Page, Pages, Resolution, Standing
from byway.knowledge.cases.pdf import write_pdf
from byway.knowledge.cases.report import write_report
from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.graph.references import split_reference
from byway.knowledge.words import word
from byway.widgets.front import load_css, load_esm
from byway.widgets.notes.wire import course_told, notes_told, places_of, standing_told, versions_told
from byway.widgets.panel import Panel
from byway.widgets.wire import plain

__all__ = ["NotesPanel"]

Message = dict[str, Any]


class NotesPanel(Panel):
    """What the team writes about a case.

    On a state whose case lies in a folder it reads and writes; elsewhere it says that notes need a folder.

    Notes
    -----
    Messages from the browser (``kind``): ``author``, ``write``, ``settle``, ``stand``, ``open`` (an anchor), ``keep``
    (one of several versions of a page), ``version`` (one of two of case.yaml), ``course``, ``report``.
    """

    _esm = load_esm("notes/view.js")
    _css = load_css("front/panel.css", "notes/view.css")
    sections: ClassVar[tuple[str, ...]] = ("bench", "notes")

    told = t.Dict().tag(sync=True)
    places: Any = t.List().tag(sync=True)
    here = t.Dict().tag(sync=True)
    course = t.Dict().tag(sync=True)
    author = t.Unicode("").tag(sync=True)
    done = t.Dict().tag(sync=True)

    def __init__(self, source: Any) -> None:
        super().__init__(source)
        self._pages: Pages | None = None
        self._handlers: dict[str, Callable[[Message], None]] = {
            "author": self._on_author,
            "write": self._on_write,
            "settle": self._on_settle,
            "stand": self._on_stand,
            "open": self._on_open,
            "keep": self._on_keep,
            "version": self._on_version,
            "course": self._on_course,
            "report": self._on_report,
        }
        self.author = self.state.author
        self.show_all()
        self.when(["case_seq"], self.show_all)
        self.when(["pages_seq", "accounts_seq"], self.show_pages)
        self.when(["graph_seq", "accounts_seq"], self.show_places)
        self.when(["cursor_mm", "selected"], self.show_here)
        self.when(["author"], self._take_author)

    @property
    def pages(self) -> Pages | None:
        """The pages of the case, or None where it lies in no folder."""
        case = self.state.case
        if case is None or not case.path.is_file():
            return None
        if self._pages is None or self._pages.folder != case.folder:
            self._pages = Pages(case.folder)
        return self._pages

    # -- what is shown ----------------------------------------------------------------------------------------------

    def show_all(self) -> None:
        """Pages, places and where the crosshair is."""
        self.course = {}
        self.show_places()
        self.show_here()
        self.show_pages()

    def show_pages(self) -> None:
        """What lies in the case folder now."""
        pages, explanation = self.pages, self.state.explanation
        with self.hold_sync():
            if pages is None:
                self.told = {"folder": False}
            else:
                titles = {a.key: a.title for a in explanation.accounts} if explanation is not None else {}
                self.told = plain({
                    "folder": True,
                    **notes_told(pages, self.graph, titles),
                    "standing": standing_told(pages.standings(), explanation),
                    "versions": versions_told(pages.folder),
                    "visits": len(self.state.case.spec.visits),
                })  # fmt: skip
            self.stamp += 1

    def show_places(self) -> None:
        """What a note can be anchored to."""
        self.places = places_of(self.graph, self.state.explanation)

    def show_here(self) -> None:
        """The voxel under the crosshair, and the element that is selected."""
        selected = self.state.selected
        label = next((row[2] for row in self.places if row[1] == selected), selected)
        kind = "segment" if "." in split_reference(selected)[0] else "region"
        self.here = {"mm": [float(v) for v in self.state.cursor_mm], "key": selected, "kind": kind, "label": label}

    def _take_author(self) -> None:
        self.author = self.state.author

    # -- what the browser asks --------------------------------------------------------------------------------------

    def on_message(self, content: Message, buffers: list[Any]) -> None:
        """Act on a message; ``done`` then tells which one was carried out, by the number that it came with."""
        handler = self._handlers.get(str(content.get("kind")))
        if handler is None:
            return
        handler(content)
        self.done = {"kind": content["kind"], "number": content.get("number")}

    def on_refused(self) -> None:
        """Show what holds."""
        self.show_pages()

    def _put(self, page: Page) -> None:
        pages = self.pages
        if pages is None:
            raise BywayError(Fault("no-case", "notes", "a case without a folder", "", "save it to a folder first"))
        pages.put(page)
        self.state.pages_seq += 1

    def _name(self) -> str:
        name = self.state.author.strip()
        if not name:
            raise BywayError(Fault("no-author", "notes", "no name of yours", "", "write your initials in the panel"))
        return name

    def _on_author(self, message: Message) -> None:
        self.state.author = str(message["name"]).strip()[:80]

    def _on_write(self, message: Message) -> None:
        anchor = dict(message.get("anchor") or {"kind": "case"})
        if anchor.get("kind") == "voxel" and not anchor.get("mm"):
            anchor["mm"] = self.state.cursor_mm
        tags = tuple(dict.fromkeys(tag.strip()[:40] for tag in message.get("tags", []) if tag.strip()))
        self._put(Note(author=self._name(), text=str(message["text"]).strip(), anchor=Anchor(**anchor), tags=tags,
                       reply_to=message.get("reply_to"), replaces=message.get("replaces")))  # fmt: skip

    def _on_settle(self, message: Message) -> None:
        self._put(Resolution(author=self._name(), note=str(message["note"]), settled=bool(message["settled"])))

    def _on_stand(self, message: Message) -> None:
        self._put(Standing(author=self._name(), account=str(message["account"]), stands=message["stands"],
                           reason=str(message.get("reason", "")).strip()))  # fmt: skip

    def _on_keep(self, message: Message) -> None:
        pages = self.pages
        page = next((p for p in pages.all() if p.id == message["page"]), None) if pages is not None else None
        if pages is None or page is None:
            raise BywayError(Fault("no-page", "notes", f"no page {message['page']!r}"))
        pages.settle_rivals(page, self._name())
        self.state.pages_seq += 1

    def _on_version(self, message: Message) -> None:
        following = self.state.following
        if following is None:
            raise BywayError(Fault("no-case", "notes", "a case that is not followed", "", "open it with bench(folder)"))
        following.settle(str(message["name"]), message["keep"])

    def _on_open(self, message: Message) -> None:
        anchor = Anchor(**{key: message["anchor"].get(key) for key in ("kind", "key", "mm")})
        if anchor.kind == "voxel" and anchor.mm is not None:
            self.state.cursor_mm = anchor.mm
        elif anchor.kind in ("region", "segment") and anchor.key:
            middle = self._middle_of(anchor.key)
            if middle is not None:
                self.state.cursor_mm = middle
            self.state.selected = anchor.key
        elif anchor.kind in ("sign", "function", "claim") and anchor.key:
            bare = split_reference(anchor.key)[0]
            graph = self.graph
            if anchor.kind == "claim" and graph is not None and bare in graph.claims:
                bare = graph.claims[bare].subject
            self.state.place = ""
            self.state.place = bare

    def _middle_of(self, element: str) -> tuple[float, float, float] | None:
        """The point of an element nearest its mean, MNI mm; None without geometry."""
        geometry = self.state.geometry
        if geometry is None or element not in geometry.index_of:
            return None
        position = geometry.index_of[element]
        n_regions = len(geometry.region_ids)
        if position < n_regions:
            voxels = np.unravel_index(geometry.parcel_voxels(position), geometry.grid.shape)
            points = geometry.grid.to_mm(np.stack(voxels, axis=1))
        else:
            points = np.concatenate(geometry.streamlines(position - n_regions))
        x, y, z = points[np.square(points - points.mean(axis=0)).sum(axis=1).argmin()]
        return (float(x), float(y), float(z))

    def _on_course(self, message: Message) -> None:
        science = self.state.science
        desk, draws = getattr(science, "desk", None), getattr(science, "draws", 200)
        self.course = plain(course_told(course_of_case(self.state.case, desk=desk, draws=draws)))

    def _on_report(self, message: Message) -> None:
        case, explanation, pages = self.state.case, self.state.explanation, self.pages
        if pages is None or explanation is None:
            raise BywayError(Fault("no-case", "report", "no explained case in a folder", "", "save the case first"))
        wanted = set(message["notes"])
        notes = [p for p in pages.current("note") if isinstance(p, Note) and p.id in wanted]
        folder = case.folder / "report"
        lesion = self.state.lesion  # as it is on the screen, saved or not
        write_report(case, explanation, folder / "report.html", notes=notes, lesion=lesion)
        write_pdf(case, explanation, folder / "report.pdf", notes=notes, lesion=lesion)
        write_pdf(case, explanation, folder / "summary.pdf", notes=[], lesion=lesion, full=False)
        self.state.tell(word("notes.report_written", folder=str(folder)))

