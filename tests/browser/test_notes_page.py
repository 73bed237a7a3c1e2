"""The team's panel in a real browser, on a bare page."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest
from browser.bare import Bare
from browser.strings import INJECTIONS
from toy_explanation import TOY_FINDINGS, toy_explanation
from toy_graph import toy_graph

from byway.knowledge.cases.case import open_case
from byway.knowledge.cases.files import write_case
from byway.knowledge.cases.model import CaseFile
from byway.knowledge.cases.pages import Anchor, Note, OwnAccount, Pages, Standing
from byway.widgets.notes import NotesPanel
from byway.widgets.state import BenchState
from byway.widgets.state.science import NoScience

HANDLERS = """() => [...document.querySelectorAll('main *')].flatMap((n) => n.getAttributeNames())
  .filter((name) => name.startsWith('on'))"""


class ToyScience(NoScience):
    """Knows the toy graph."""

    def __init__(self) -> None:
        self.graph = toy_graph()


@pytest.fixture
def state(tmp_path: Path) -> BenchState:
    """An explained toy case in a folder."""
    write_case(tmp_path / "case.yaml", CaseFile(stage="acute"), None)
    state = BenchState(open_case(tmp_path), ToyScience())
    state.findings, state.explanation, state.author = TOY_FINDINGS, toy_explanation(), "AB"
    return state


def test_a_note_is_written_answered_and_settled(page: Any, state: BenchState, artefacts: Path) -> None:
    """Typed in the browser, a note reaches the folder; its answer stands below; settled, the filter hides it."""
    bare = Bare(page, NotesPanel(state), width=1000)
    page.locator(".bw-note-text").fill("Does the **edge** hold?")
    page.get_by_role("button", name="Add note").click()
    bare.carry()
    assert page.locator(".bw-note strong").nth(1).inner_text() == "edge"
    page.get_by_role("button", name="Answer").click()
    page.locator(".bw-note .bw-note-text").fill("It does.")
    page.locator(".bw-note form").get_by_role("button", name="Answer").click()
    bare.carry()
    assert page.locator(".bw-note").count() == 2
    assert page.locator(".bw-note").nth(1).evaluate("(n) => n.style.getPropertyValue('--depth')") == "1"
    page.get_by_role("button", name="Settle").first.click()
    bare.carry()
    page.screenshot(path=artefacts / "notes.png", full_page=True)
    page.get_by_label("Open only").check()
    assert page.locator(".bw-note").count() == 1
    assert len(Pages(state.case.folder).all()) == 3
    assert bare.errors == []
    assert page.strays == []


def test_a_note_about_what_is_pointed_at(page: Any, state: BenchState) -> None:
    """The crosshair and any place of the graph can be chosen; a click on the anchor opens it again."""
    bare = Bare(page, NotesPanel(state), width=1000)
    state.cursor_mm = (-36.0, -31.0, 27.0)
    page.get_by_label("About", exact=True).select_option("voxel")
    page.locator(".bw-note-text").fill("here")
    page.get_by_role("button", name="Add note").click()
    page.get_by_label("About", exact=True).select_option("other")
    page.locator(".bw-note-find").fill(next(label for kind, _, label in bare.panel.places if kind == "segment"))
    page.locator(".bw-note-text").fill("there")
    page.get_by_role("button", name="Add note").click()
    bare.carry()
    state.cursor_mm = (0.0, 0.0, 0.0)
    for chip in page.locator(".bw-note-anchor").all():
        chip.click()
    bare.carry()
    assert state.cursor_mm == (-36.0, -31.0, 27.0)
    assert state.selected == next(key for kind, key, _ in bare.panel.places if kind == "segment")


def test_filters(page: Any, state: BenchState) -> None:
    """By author, tag and what a note is about; the count says how many are shown."""
    pages = Pages(state.case.folder)
    pages.put(Note(author="AB", text="one", tags=("edge",)))
    pages.put(Note(author="CD", text="two"))
    Bare(page, NotesPanel(state), width=1000)
    page.get_by_label("anybody").select_option("CD")
    assert page.locator(".bw-note").all_inner_texts()[0].count("two") == 1
    assert "1 of 2" in page.locator(".bw-notes-bar").inner_text()
    page.get_by_label("anybody").select_option("")
    page.get_by_label("any tag").select_option("edge")
    assert page.locator(".bw-note").count() == 1


def test_standing_is_chosen_by_keyboard(page: Any, state: BenchState) -> None:
    """An arrow key moves one's standing on an account, and the reason goes with it."""
    bare = Bare(page, NotesPanel(state), width=1000)
    page.click("[data-key=standing]")
    row = page.locator(".bw-stand").first
    row.get_by_label("Reason").fill("fits")
    row.locator("[data-key=held]").focus()
    page.keyboard.press("ArrowRight")
    bare.carry()
    (standing,) = (p for p in Pages(state.case.folder).all("standing") if isinstance(p, Standing))
    assert (standing.stands, standing.reason) == ("doubted", "fits")
    assert row.locator("[data-key=doubted]").get_attribute("aria-checked") == "true"
    shown = row.locator("[data-name]")
    assert float(shown.get_attribute("data-value") or 0) == state.explanation.accounts[0].posterior


def test_every_control_has_a_name(page: Any, state: BenchState) -> None:
    """Every button, input and list can be named by a screen reader, in every view."""
    Pages(state.case.folder).put(Note(author="AB", text="one"))
    Bare(page, NotesPanel(state), width=1000)
    for view in ("notes", "standing", "course", "versions"):
        page.click(f"[data-key={view}]")
        nameless = page.evaluate(
            """() => [...document.querySelectorAll('button, input, select, textarea, [role=radiogroup]')]
            .filter((e) => {
            const label = e.labels?.[0]?.textContent || e.getAttribute('aria-label') || e.title || e.textContent;
            return !label || !label.trim(); }).map((e) => e.outerHTML)"""
        )
        assert nameless == []


def test_a_view_that_goes_takes_its_listeners(page: Any, state: BenchState) -> None:
    """When the view is removed, the model has no listener left."""
    Bare(page, NotesPanel(state))
    page.evaluate("stop()")
    assert page.evaluate("Object.values(heard).reduce((n, calls) => n + calls.size, 0)") == 0


def test_a_hundred_injections_stay_inert(page: Any, state: BenchState) -> None:
    """A hundred script-injection strings as notes, authors, tags, anchors, reasons, accounts and versions are shown as
    text in every view and order: nothing runs, nothing loads, no handler and no foreign element is on the page."""
    assert len(set(INJECTIONS)) == 100
    pages = Pages(state.case.folder)
    for text in INJECTIONS:
        markdown = f"{text}\n\n[x](javascript:window.ran=1) ![x](x)\n\n    {text}"
        pages.put(Note(author=text[:80], text=markdown, tags=(text,), anchor=Anchor(kind="sign", key=text)))
        pages.put(Standing(author=text[:80], account=text, stands="held", reason=text))
    first = OwnAccount(author="AB", title="x")
    for page_of in (first, *(OwnAccount(author="AB", title=text, text=text, replaces=first.id) for text in INJECTIONS)):
        pages.put(page_of)
    with pytest.raises(Exception, match="yours is kept"):
        write_case(state.case.path, CaseFile(stage="acute", title=INJECTIONS[0]), "x")
    bare = Bare(page, NotesPanel(state), width=1000)
    page.get_by_label("Order").select_option("time")
    for view in ("standing", "versions", "notes"):
        page.click(f"[data-key={view}]")
    assert page.locator(".bw-note").count() == 100
    page.wait_for_timeout(200)
    assert page.evaluate("window.ran") is None
    for tag in ("img", "iframe", "object", "embed", "link", "style", "script", "a", "video", "marquee", "math"):
        assert page.locator(f"main {tag}").count() == 0, tag
    assert page.evaluate(HANDLERS) == []
    assert page.strays == []
    assert bare.errors == []
    assert page.locator(".bw-prose", has_text=INJECTIONS[0]).count() > 0
