"""The editing panel in a real browser: everything with the mouse alone, everything with the keyboard alone."""

from __future__ import annotations

import shutil
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import nbformat
import pytest
from browser.bare_page import BarePage
from browser.notebook_page import open_and_run
from browser.notebook_server import NotebookServer
from browser.strings import INJECTIONS
from editing_case import CLAIM, editing_panel

from byway.knowledge.cases.case import open_case
from byway.knowledge.cases.desk import desk_for
from byway.knowledge.graph.overlay_files import read_overlay
from byway.knowledge.graph.overlays import Entry, Overlay, overlay_text
from byway.widgets.editing import EditingPanel
from byway.widgets.graph import GraphPanel
from byway.widgets.state import BenchState
from byway.widgets.state.live import LiveScience

FIRST_CASE = Path(__file__).resolve().parents[2] / "notebooks" / "cases" / "first_case"
FROM, TO = "Superior temporal gyrus, posterior", "Ventral premotor cortex"
REPETITION = "Repetition of heard speech"
HANDLERS = """() => [...document.querySelectorAll('main *')].flatMap((n) => n.getAttributeNames())
  .filter((name) => name.startsWith('on'))"""
NAMELESS = """() => [...document.querySelectorAll('button, input, select, textarea, [role=radiogroup]')]
  .filter((e) => { const label = e.labels?.[0]?.textContent || e.getAttribute('aria-label') || e.title || e.textContent;
  return !label || !label.trim(); }).map((e) => e.outerHTML)"""


POSTERIORS = """() => [...document.querySelectorAll('.bw-card')].map((card) =>
  [card.dataset.account, card.querySelector('.bw-card-posterior [data-value]').dataset.value])"""
# The first place of a fine grid at which each node of the whole graph shows its name.
FOUND = """() => { const canvas = document.querySelector('.bw-wheel'); const box = canvas.getBoundingClientRect();
  const tip = document.querySelector('.bw-wheel-tip'); const found = {};
  for (let y = 4; y < box.height; y += 6) for (let x = 4; x < box.width; x += 6) {
    const at = { clientX: box.left + x, clientY: box.top + y, bubbles: true };
    canvas.dispatchEvent(new PointerEvent('pointermove', at));
    if (!tip.hidden && !(tip.textContent in found)) found[tip.textContent] = [x, y];
  }
  return found; }"""


class Desk:
    """The panel on a page, with the first case open on the curated graph."""

    def __init__(self, page: Any, folder: Path, dark: bool = False) -> None:
        shutil.copytree(FIRST_CASE, folder)
        self.state = BenchState(open_case(folder), LiveScience(desk_for(progress=False), draws=60))
        self.state.settle()
        self.panel = EditingPanel(self.state, "A. Reader")
        self.page, self.folder = page, folder
        self.errors: list[str] = []
        page.on("pageerror", lambda error: self.errors.append(str(error)))
        self.bare = BarePage(page, self.panel, dark=dark)
        self.bare.show()
        self.rest()

    @property
    def file(self) -> Path:
        """The author's overlay."""
        return self.folder / "overlays" / "a_reader.yaml"

    def rest(self) -> None:
        """Let the form rest until checks and effect are there."""
        self.bare.settle(0.45)
        self.panel.effects.settle()
        self.bare.settle(0.15)

    def entries(self, count: int) -> None:
        """Wait until the overlay has so many entries."""
        self.rest()
        assert self.page.locator(f"section[data-entries='{count}']").count() == 1, self.state.notice

    def ranking(self) -> dict[str, float]:
        """Posterior of every account that the bench shows."""
        self.state.settle()
        return {account.key: account.posterior for account in self.state.explanation.accounts}


@pytest.fixture
def desk(page: Any, tmp_path: Path) -> Iterator[Callable[..., Desk]]:
    """Opens the desk; closed at the end."""
    opened: list[Desk] = []

    def start(**more: Any) -> Desk:
        opened.append(Desk(page, tmp_path / "case", **more))
        return opened[-1]

    yield start
    for each in opened:
        each.panel.close()
        each.state.close()


def check_kept(desk: Desk, before: dict[str, float]) -> None:
    """Segment, claim and route stand in the file with author and date, and the ranking is another one."""
    overlay = read_overlay(desk.file)
    assert [entry.slot[:2] for entry in overlay.entries] == [
        ("add", "segment"), ("add", "claim"), ("change", "function"),
    ]  # fmt: skip
    segment, claim, _ = overlay.entries
    assert len(segment.body["waypoints_mni"]) == 3
    assert claim.body["subject"] == segment.key
    assert len(claim.body["sources"]) == 1
    assert overlay.author == "A. Reader"
    assert overlay.date
    now = desk.ranking()
    assert max(abs(now.get(key, 0.0) - before.get(key, 0.0)) for key in {*now, *before}) > 0.005


def test_with_the_mouse_alone(page: Any, desk: Callable[..., Desk], artefacts: Path) -> None:
    """Clicks and drags alone add a segment with three waypoints, a claim with a source and a route, and undo them."""
    work = desk()
    before = work.ranking()

    def pick(label: str, text: str, within: Any = None) -> None:
        place = within if within is not None else page
        place.get_by_role("combobox", name=label, exact=True).click()
        page.locator("[role=listbox]:visible [role=option]").filter(has_text=text).first.click()
        work.rest()

    pick("Pathway", "Arcuate fasciculus")
    pick("From", FROM)
    pick("To", TO)
    assert page.locator(".be-points tbody tr").count() == 2
    film = page.locator("canvas[data-plane=sagittal]")
    box = film.bounding_box()
    scale = float(film.get_attribute("data-scale"))
    x, y = box["x"] + box["width"] * 0.5, box["y"] + box["height"] * 0.42
    page.mouse.click(x, y)
    work.rest()
    assert page.locator(".be-points tbody tr").count() == 3
    old = page.locator(".be-points tbody tr.be-row-chosen input").nth(2).input_value()
    page.mouse.move(x, y)
    page.mouse.down()
    for step in range(1, 7):
        page.mouse.move(x, y - step * scale)
        work.bare.settle(0.05)
    page.mouse.up()
    work.rest()
    new = page.locator(".be-points tbody tr.be-row-chosen input").nth(2).input_value()
    assert float(new) - float(old) == pytest.approx(6, abs=1.01)
    assert "core line" in page.locator(".be-course").text_content()
    page.screenshot(path=artefacts / "editing_segment.png", full_page=True)
    page.get_by_role("button", name="Keep", exact=True).click()
    work.entries(1)

    page.get_by_role("radio", name="Claim", exact=True).click()
    work.rest()
    pick("Subject", "Arcuate fasciculus (superior temporal")
    pick("Object", REPETITION)
    pick("Sources: Add", "")
    page.screenshot(path=artefacts / "editing_claim.png", full_page=True)
    page.get_by_role("button", name="Keep", exact=True).click()
    work.entries(2)

    page.get_by_role("radio", name="Function and routes").click()
    work.rest()
    pick("Record", REPETITION)
    page.get_by_role("button", name="Add one like this").first.click()
    card = page.locator(".be-route").nth(1)
    card.locator(".be-link .be-off").nth(1).click()
    card.locator(".be-link-name").first.click()
    pick("Put a place into the chain", "Arcuate fasciculus (superior temporal", card)
    page.get_by_role("button", name="Share out").click()
    work.rest()
    assert page.locator(".be-effect[data-stage=done] tbody tr.be-moved").count() > 0
    assert work.ranking() == pytest.approx(before, abs=0.005)  # nothing is kept yet but the segment by itself
    page.screenshot(path=artefacts / "editing_effect.png", full_page=True)
    page.get_by_role("button", name="Keep", exact=True).click()
    work.entries(3)
    check_kept(work, before)

    page.get_by_role("radio", name="Review").click()
    work.rest()
    page.screenshot(path=artefacts / "editing_review.png", full_page=True)
    for left in (2, 1, 0):
        page.get_by_role("button", name="Undo").click()
        work.entries(left)
    assert read_overlay(work.file).entries == ()
    assert work.ranking() == pytest.approx(before)
    assert work.errors == []
    assert page.strays == []


def test_with_the_keyboard_alone(page: Any, desk: Callable[..., Desk], artefacts: Path) -> None:
    """Keys alone do the same: Tab reaches every control, arrows place a waypoint, Ctrl+Z is not even needed."""
    work = desk()
    before = work.ranking()
    keys = page.keyboard

    def reach(selector: str, back: bool = False) -> None:
        """Tab until the control has the focus."""
        for _ in range(400):
            if page.evaluate("(s) => document.activeElement && document.activeElement.matches(s)", selector):
                return
            keys.press("Shift+Tab" if back else "Tab")
        raise AssertionError(f"no Tab leads to {selector}")

    def pick(label: str, text: str) -> None:
        reach(f'[role=combobox][aria-label="{label}"]')
        keys.type(text)
        keys.press("Enter")
        work.rest()

    def press(selector: str, back: bool = False) -> None:
        reach(selector, back)
        keys.press("Enter")
        work.rest()

    def kind(steps: int) -> None:
        reach('[role=radiogroup][aria-label="Kind of record"] [role=radio]', back=True)
        for _ in range(steps):
            keys.press("ArrowRight")
        work.rest()

    pick("Pathway", "arcuate")
    pick("From", FROM.lower())
    pick("To", TO.lower())
    reach("canvas[data-plane=axial]")
    keys.press("n")
    keys.press("i")
    for _ in range(3):
        keys.press("Shift+ArrowLeft")  # towards the person's right, which lies on the left of the picture
    for _ in range(4):
        keys.press("PageUp")
    work.rest()
    assert page.locator(".be-points tbody tr").count() == 3
    assert page.locator("[data-state=usable]").count() == 1
    press(".be-keep:not(:disabled)")
    work.entries(1)

    kind(1)
    pick("Subject", "arcuate fasciculus (superior temporal")
    pick("Object", REPETITION.lower())
    pick("Sources: Add", "catani 2005")
    press(".be-keep:not(:disabled)")
    work.entries(2)

    kind(1)
    pick("Record", REPETITION.lower())
    press(".be-like")
    second = ".be-route:nth-child(2)"
    press(f"{second} .be-link:nth-child(2) .be-off")
    press(f"{second} .be-link:nth-child(1) .be-link-name", back=True)
    reach(f"{second} [role=combobox]")
    keys.type("arcuate fasciculus (superior temporal")
    keys.press("Enter")
    press(".be-share")
    assert page.locator(".be-effect[data-stage=done] tbody tr.be-moved").count() > 0
    page.screenshot(path=artefacts / "editing_keyboard.png", full_page=True)
    press(".be-keep:not(:disabled)")
    work.entries(3)
    check_kept(work, before)
    text = work.file.read_text()

    for left in (2, 1, 0):
        press(".be-undo", back=True)
        work.entries(left)
    assert work.ranking() == pytest.approx(before)
    for count in (1, 2, 3):
        press(".be-redo")
        work.entries(count)
    assert work.file.read_text() == text
    assert work.errors == []


def test_injected_text_stays_text(page: Any, tmp_path: Path) -> None:
    """A hundred script-injection strings in every field that takes text stay text: nothing runs, no handler appears."""
    panel = editing_panel(tmp_path / "case", INJECTIONS[0])
    entries = [Entry("add", "source", f"source_{n}", {"authors": text, "year": 2020, "title": text, "container": text,
                                                      "checked": "memory", "note": text})
               for n, text in enumerate(INJECTIONS)]  # fmt: skip
    entries += [Entry("add", "claim", f"claim_{n}", {**CLAIM, "says": text, "note": text, "sources": [f"source_{n}"]},
                      reason=text) for n, text in enumerate(INJECTIONS)]  # fmt: skip
    entries += [Entry("dispute", "claim", key, {}, INJECTIONS[n]) for n, key in enumerate(panel.session.base.claims)]
    theirs = Overlay(INJECTIONS[1], INJECTIONS[2], "2026-12-01", tuple(entries))
    bare = BarePage(page, panel)
    errors: list[str] = []
    page.on("pageerror", lambda error: errors.append(str(error)))
    bare.show()
    bare.settle(0.3)
    page.get_by_role("radio", name="Review").click()
    panel._heard(panel, {"kind": "import", "text": overlay_text(theirs), "name": INJECTIONS[3]}, [])
    bare.settle(0.3)
    panel._heard(panel, {"kind": "accept_all"}, [])
    panel._heard(panel, {"kind": "model", "name": INJECTIONS[4], "overlays": []}, [])
    bare.settle(0.5)
    shown = set(page.locator(".be-diff li").all_text_contents())
    assert all(any(text in line for line in shown) for text in INJECTIONS[:60])
    for tab in ("Rival models", "Coverage", "Edit"):
        page.get_by_role("radio", name=tab).click()
        bare.settle(0.3)
    for number in range(0, 100, 9):
        bare.page.evaluate("() => 0")
        page.get_by_role("radio", name="Source", exact=True).click()
        bare.settle(0.1)
        record = page.get_by_role("combobox", name="Record", exact=True)
        record.fill(f"source_{number}")
        page.keyboard.press("Enter")
        bare.settle(0.1)
        note = page.locator("[data-field=note] textarea")
        assert note.input_value() == INJECTIONS[number]
        note.fill(INJECTIONS[number] + " ")
        bare.settle(0.4)
    panel._heard(panel, {"kind": "keep", "of": "source", "key": "source_0", "action": "change", "n": 1,
                         "body": {"year": INJECTIONS[5]}}, [])  # fmt: skip
    bare.settle(0.3)
    assert page.evaluate("() => window.ran") is None
    assert page.evaluate(HANDLERS) == []
    assert errors == []
    panel.close()


@pytest.mark.parametrize("dark", [False, True], ids=["light", "dark"])
def test_every_page_draws(page: Any, tmp_path: Path, artefacts: Path, dark: bool) -> None:
    """Every page of the panel draws in both themes, every control can be named, and the caution stands below."""
    panel = editing_panel(tmp_path / "case")
    panel._heard(panel, {"kind": "keep", "of": "claim", "key": "bow_two", "action": "add", "n": 1, "body": CLAIM}, [])
    theirs = "name: Other\nauthor: B\ndate: 2026-12-01\nadd: {claims: {bow_two: {says: No, subject: bow.long}}}\n"
    panel._heard(panel, {"kind": "import", "text": theirs, "name": "other.yaml"}, [])
    bare = BarePage(page, panel, dark=dark)
    errors: list[str] = []
    page.on("pageerror", lambda error: errors.append(str(error)))
    bare.show()
    bare.settle(0.4)
    for tab in ("Edit", "Review", "Rival models", "Coverage"):
        page.get_by_role("radio", name=tab, exact=True).click()
        bare.settle(0.4)
        assert page.evaluate(NAMELESS) == []
        assert page.locator(".bw-caution").is_visible()
        name = f"editing_{tab.lower().replace(' ', '_')}_{'dark' if dark else 'light'}.png"
        page.screenshot(path=artefacts / name, full_page=True)
    assert errors == []
    panel.close()


def test_the_whole_graph_keeps_its_places(page: Any, tmp_path: Path) -> None:
    """After a function and a sign were added, every node of the whole graph is found where it was before."""
    panel = editing_panel(tmp_path / "case")
    graph = GraphPanel(panel.state)
    bare = BarePage(page, graph)
    bare.show()
    page.get_by_role("radio", name="Whole graph").click()
    bare.settle(0.3)
    before = page.evaluate(FOUND)
    assert len(before) > 5
    routes = {"alone": {"name": "Alone", "usual_load": 1.0, "chain": [next(iter(panel.session.base.regions))]}}
    body = {"name": "A new function", "domain": "motor", "laterality": "each_side", "routes": routes, "description": ""}
    edit = {"kind": "keep", "of": "function", "key": "newly_made", "action": "add", "n": 1, "body": body}
    panel._heard(panel, edit, [])
    bare.settle(0.4)
    assert "newly_made" in panel.state.science.graph.functions, panel.state.notice
    after = page.evaluate(FOUND)
    assert {name: after.get(name) for name in before} == before
    panel.close()


def test_on_the_bench(
    page: Any, notebook_server: Callable[[str], NotebookServer], artefacts: Path, tmp_path: Path
) -> None:
    """In Voila, a route edited on the bench is weighed before it is kept, changes the accounts, and can be undone."""
    server = notebook_server("voila")
    shutil.copytree(FIRST_CASE, server.root / "edited_case")
    made = nbformat.v4.new_notebook(
        cells=[nbformat.v4.new_code_cell('from byway.widgets import bench\n\nbench("edited_case", draws=60)')]
    )
    made.metadata["kernelspec"] = {"name": "python3", "display_name": "Python 3", "language": "python"}
    nbformat.write(made, server.root / "edited.ipynb")
    open_and_run(page, server, "edited.ipynb")
    page.wait_for_selector(".byway-accounts .bw-card", timeout=120_000)
    before = page.evaluate(POSTERIORS)
    page.get_by_role("radio", name="Editing", exact=True).click()
    panel = page.locator(".byway-editing")
    panel.get_by_role("radio", name="Function and routes").click()
    panel.get_by_role("combobox", name="Record", exact=True).fill(REPETITION)
    page.keyboard.press("Enter")
    panel.locator(".be-load").first.wait_for(timeout=60_000)
    panel.locator(".be-load").nth(2).fill("1.6")
    panel.get_by_role("button", name="Share out").click()
    panel.locator(".be-effect[data-stage=done] tr.be-moved").first.wait_for(timeout=60_000)
    page.screenshot(path=artefacts / "editing_bench.png", full_page=True)
    panel.get_by_role("button", name="Keep", exact=True).click()
    now = f"JSON.stringify(({POSTERIORS})())"
    page.wait_for_function(f"(old) => {now} !== JSON.stringify(old)", arg=before, timeout=60_000)
    file = server.root / "edited_case" / "overlays"
    assert [entry.slot for path in file.glob("*.yaml") for entry in read_overlay(path).entries] == [
        ("change", "function", "repetition")
    ]
    panel.get_by_role("button", name="Undo").click()
    page.wait_for_function(f"(old) => {now} === JSON.stringify(old)", arg=before, timeout=60_000)
