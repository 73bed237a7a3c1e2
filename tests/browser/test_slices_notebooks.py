"""The slices panel beside the hit list in real notebooks: a stroke changes the list; nothing leaves loopback."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import nbformat
import pytest
from browser.notebook_page import open_and_run
from browser.notebook_server import NotebookServer

SOURCE = """
import ipywidgets
from byway.widgets.hits import HitsPanel
from byway.widgets.slices import SlicesPanel
from byway.widgets.state import BenchState
from byway.widgets.state.live import LiveScience
state = BenchState(science=LiveScience())
state.edit({"op": "ellipsoid", "centre_mm": [-44, 8, 16], "radii_mm": [6, 8, 6], "compartment": 0})
state.cursor_mm = (-44.0, 8.0, 16.0)
ipywidgets.VBox([SlicesPanel(state), HitsPanel(state)])
"""
VIEW = "document.querySelector('.byway-slices').parentElement.byway"


def write_notebook(path: Path, *sources: str) -> None:
    """A notebook with a kernel named, so that no dialogue asks for one."""
    kernel = {"name": "python3", "display_name": "Python 3", "language": "python"}
    book = nbformat.v4.new_notebook(metadata={"kernelspec": kernel})
    book.cells = [nbformat.v4.new_code_cell(source.strip()) for source in sources]
    nbformat.write(book, path)


@pytest.mark.parametrize("kind", ["lab", "notebook", "voila"])
def test_a_stroke_changes_the_hit_list(
    kind: str, page: Any, notebook_server: Callable[[str], NotebookServer], artefacts: Path
) -> None:
    """Painting on the axial plane changes what is hit; undo gives the list back."""
    server = notebook_server(kind)
    write_notebook(server.root / "slices.ipynb", SOURCE)
    open_and_run(page, server, "slices.ipynb")
    page.wait_for_selector(".byway-slices", timeout=90_000)
    page.wait_for_function(f"{VIEW}.store.bits && {VIEW}.store.volumes.get('scan:template')", timeout=60_000)
    page.wait_for_selector(".byway-hits tbody tr", state="attached")
    before = page.locator(".byway-hits tbody").first.inner_text()

    page.evaluate(f"{VIEW}.look.set({{ tool: 'brush', radius: 5, ball: true }})")
    film = page.locator(".bs-film[data-plane=axial]")
    film.scroll_into_view_if_needed()
    box = film.bounding_box()
    page.mouse.move(box["x"] + 0.6 * box["width"], box["y"] + 0.45 * box["height"])
    page.mouse.down()
    page.mouse.move(box["x"] + 0.68 * box["width"], box["y"] + 0.6 * box["height"], steps=8)
    page.mouse.up()
    page.wait_for_function("(old) => document.querySelector('.byway-hits tbody').innerText !== old", arg=before)
    page.screenshot(path=artefacts / f"slices-in-{kind}.png")

    film.focus()
    page.keyboard.press("Control+z")
    page.wait_for_function("(old) => document.querySelector('.byway-hits tbody').innerText === old", arg=before)
    ours = [url for url in page.strays if "byway" in url]
    assert ours == []
    if kind != "voila":  # Voila's own page asks for a font from outside, whatever it shows
        assert page.strays == []
