"""The bench end to end: the first notebook in JupyterLab, and the bench in Voila."""

from __future__ import annotations

import json
import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import nbformat
import pytest
from browser.notebook_page import open_and_run
from browser.notebook_server import NotebookServer
from browser.test_bench_page import REACHED

from byway.widgets.bench import DECK

SHARES = """() => [...document.querySelectorAll('.bw-hits-row')].map((row) =>
  [row.dataset.element, row.querySelector('.bw-hits-share [data-value]').dataset.value])"""
POSTERIORS = """() => [...document.querySelectorAll('.bw-card')].map((card) =>
  [card.dataset.account, card.querySelector('.bw-card-posterior [data-value]').dataset.value])"""
NOTEBOOKS = Path(__file__).resolve().parents[2] / "notebooks"
PROBE = """import ipywidgets, json
from byway.widgets import number_named

box, out = ipywidgets.Textarea(), ipywidgets.Textarea()
box.add_class("probe-in")
out.add_class("probe-out")

def fits(name, value):
    try:
        along, anatomies = (b.deck.get(name) for name in ("along", "anatomies"))
        known = eval("b.state." + name) if name.startswith("lesion.") else number_named(
            b.explanation, name, along=along and along.profile, anatomies=anatomies and anatomies.table)
        return abs(known - value) <= 1e-6 * max(1, abs(value))
    except Exception:
        return False

def walk(change):
    out.value = "wrong: " + ", ".join(name for name, value in json.loads(change.new) if not fits(name, value))

box.observe(walk, "value")
ipywidgets.VBox([box, out])"""
BENCH = 'from byway.widgets import bench\n\nb = bench("cases/first_case")\nb'


def notebook(root: Path, name: str, *cells: str) -> str:
    """Write a notebook of code cells beside a copy of the demo cases; returns its name."""
    if not (root / "cases").exists():
        shutil.copytree(NOTEBOOKS / "cases", root / "cases")
    made = nbformat.v4.new_notebook(cells=[nbformat.v4.new_code_cell(cell) for cell in cells])
    made.metadata["kernelspec"] = {"name": "python3", "display_name": "Python 3", "language": "python"}
    nbformat.write(made, root / name)
    return name


def until_changed(page: Any, read: str, old: list[Any]) -> None:
    """Wait until what a script reads off the page is no longer what it was."""
    page.wait_for_function(f"(old) => JSON.stringify(({read})()) !== old", arg=json.dumps(old, separators=(",", ":")),
                           timeout=60_000)  # fmt: skip


def paint(page: Any) -> None:
    """Draw one stroke with the brush on the largest slice."""
    page.locator(".byway-slices").get_by_role("button", name="Brush").first.click()
    canvas = page.locator(".byway-slices canvas").first
    canvas.scroll_into_view_if_needed()
    box = canvas.bounding_box()
    x, y = box["x"] + box["width"] * 0.62, box["y"] + box["height"] * 0.55
    page.mouse.move(x, y)
    page.mouse.down()
    for step in range(12):
        page.mouse.move(x + step * 4, y + step * 3)
    page.mouse.up()


@pytest.mark.parametrize("kind", ["lab", "voila"])
def test_a_stroke_changes_hits_and_accounts(
    page: Any, notebook_server: Callable[[str], NotebookServer], artefacts: Path, kind: str
) -> None:
    """Painting on the demo case changes the hit list and then the accounts; no request of the page leaves loopback.

    (Voila itself asks a CDN for a font; that request is its own and is the only one let pass.)
    """
    server = notebook_server(kind)
    faults: list[str] = []
    page.on("pageerror", lambda error: faults.append(str(error)))
    open_and_run(page, server, notebook(server.root, "bench.ipynb", BENCH))
    page.wait_for_selector(".bw-card", timeout=90_000)
    page.wait_for_selector(".bw-hits-row")
    before = page.evaluate(SHARES), page.evaluate(POSTERIORS)
    page.screenshot(path=artefacts / f"bench_{kind}_before.png")
    paint(page)
    until_changed(page, SHARES, before[0])
    until_changed(page, POSTERIORS, before[1])
    page.wait_for_function("() => !document.querySelector('.bw-hits-row .bw-waiting:not([hidden])')", timeout=60_000)
    page.screenshot(path=artefacts / f"bench_{kind}_after.png")
    if kind == "lab":
        assert page.strays == []
        assert [fault for fault in faults if "byway" in fault] == []


def test_every_number_on_the_bench_is_that_of_the_api(
    page: Any, notebook_server: Callable[[str], NotebookServer]
) -> None:
    """Every number that the bench of the demo case shows, further views too, is walked back to the kernel."""
    server = notebook_server("lab")
    open_and_run(page, server, notebook(server.root, "walk.ipynb", BENCH, PROBE))
    page.wait_for_selector(".bw-card", timeout=90_000)
    page.evaluate("() => { for (const d of document.querySelectorAll('.byway-bench details')) d.open = true;"
                  " for (const b of document.querySelectorAll('.bw-card-head[aria-expanded=false]')) b.click(); }")
    shown: dict[str, float] = {}
    views = {"profile": ".bw-prof-row", "routes": ".bw-route-map", "remote": ".byway-remote tbody tr",
             "along": ".bw-along-chart"}  # fmt: skip
    for view, what in views.items():
        page.locator(f".byway-tabs [data-key={view}]").click()
        page.wait_for_selector(what, timeout=60_000)
        page.evaluate("() => { for (const d of document.querySelectorAll('.byway-deck details')) d.open = true; }")
        page.wait_for_timeout(100)
        found = page.evaluate("() => [...document.querySelectorAll('.byway-bench [data-name]')]"
                              ".map((n) => [n.dataset.name, Number(n.dataset.value)])")  # fmt: skip
        assert len(shown) < len(shown | dict(found)), view
        shown |= dict(found)
    assert len(shown) > 400
    page.locator(".probe-in textarea").fill(json.dumps(list(shown.items())))
    page.locator(".probe-in textarea").blur()
    page.wait_for_function("() => document.querySelector('.probe-out textarea').value", timeout=30_000)
    assert page.locator(".probe-out textarea").input_value() == "wrong: "


def test_the_first_notebook_runs(page: Any, notebook_server: Callable[[str], NotebookServer], artefacts: Path) -> None:
    """The notebook that users meet first runs as it stands and shows the bench, already explained."""
    server = notebook_server("lab")
    notebook(server.root, "unused.ipynb")
    shutil.copy(NOTEBOOKS / "first_case.ipynb", server.root / "first_case.ipynb")
    open_and_run(page, server, "first_case.ipynb")
    page.wait_for_selector(".byway-bench .bw-card", timeout=90_000)
    assert page.locator(".byway-head").inner_text().count("no diagnosis") == 1
    page.screenshot(path=artefacts / "first_case.png")
    assert page.strays == []


def test_further_views_open(page: Any, notebook_server: Callable[[str], NotebookServer], artefacts: Path) -> None:
    """Every view below the main four opens when asked for, the 3-D head included, and nothing is fetched for it."""
    server = notebook_server("lab")
    open_and_run(page, server, notebook(server.root, "views.ipynb", BENCH))
    page.wait_for_selector(".bw-card", timeout=90_000)
    shows = {"profile": ".byway-profile .bw-prof-row", "routes": ".bw-route-map", "whatif": ".byway-whatif input",
             "own": ".byway-own .bw-own-element", "steady": ".byway-steady .bw-reserve li", "graph": ".bw-shelf-item",
             "remote": ".byway-remote tbody tr", "along": ".bw-along-chart", "anatomies": ".byway-anatomies .bw-empty",
             "head": ".byway-head-box .gl-container canvas"}  # fmt: skip
    for name, what in shows.items():
        page.locator(f".byway-tabs [data-key={name}]").click()
        page.wait_for_selector(what, timeout=60_000)
    page.wait_for_timeout(2500)
    page.locator(".byway-head-box").screenshot(path=artefacts / "head.png")
    page.set_viewport_size({"width": 1200, "height": 1000})
    page.locator(".byway-tabs").scroll_into_view_if_needed()
    page.wait_for_timeout(300)
    assert page.evaluate(REACHED) == list(DECK)
    assert page.strays == []
