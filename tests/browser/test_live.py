"""Live: what another process writes to the case folder shows in an open notebook.

It should within two seconds. The folder is looked at every half second; the waits here are longer, since a test says
what happens, and ``tests/artefacts/live.txt`` how long it took.
"""

from __future__ import annotations

import importlib.util
import shutil
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import nbformat
import pytest
from browser.notebook_page import open_and_run
from browser.notebook_server import NotebookServer

from byway.knowledge.atomic import fingerprint
from byway.knowledge.cases.case import open_case
from byway.knowledge.cases.files import write_case
from byway.knowledge.cases.pages import Note, Pages

CASES = Path(__file__).resolve().parents[2] / "notebooks" / "cases"
CELL = 'from byway.widgets import bench\n\nb = bench("{name}", draws=20, author="AB")\nb.show("notes")\nb'


def notebook_for(server: NotebookServer, name: str) -> Path:
    """A notebook that opens the bench on a fresh copy of the team's case; returns the case folder."""
    folder = server.root / name
    shutil.copytree(CASES / "team_case", folder)
    made = nbformat.v4.new_notebook(cells=[nbformat.v4.new_code_cell(CELL.format(name=name))])
    made.metadata["kernelspec"] = {"name": "python3", "display_name": "Python 3", "language": "python"}
    nbformat.write(made, server.root / f"{name}.ipynb")
    return folder


def test_a_change_from_outside_shows(
    page: Any, notebook_server: Callable[[str], NotebookServer], artefacts: Path
) -> None:
    """A note, and then a saved stage, both written by this process, come onto the page of a kernel by themselves."""
    server = notebook_server("lab")
    folder = notebook_for(server, "live")
    open_and_run(page, server, "live.ipynb")
    page.wait_for_selector(".byway-notes .bw-note", timeout=90_000)
    before = page.locator(".bw-note").count()
    start = time.monotonic()
    Pages(folder).put(Note(author="KL", text="Written *elsewhere*."))
    page.wait_for_selector(".bw-note >> text=elsewhere", timeout=20_000)
    took = [time.monotonic() - start]
    assert page.locator(".bw-note").count() == before + 1
    case = open_case(folder)
    start = time.monotonic()
    write_case(folder / "case.yaml", case.with_spec(stage="chronic").spec, fingerprint(folder / "case.yaml"))
    chronic = "() => [...document.querySelectorAll('.byway-head select')].some((s) => s.value === 'chronic')"
    page.wait_for_function(chronic, timeout=20_000)
    took.append(time.monotonic() - start)
    (artefacts / "live.txt").write_text(f"note {took[0]:.2f} s, stage {took[1]:.2f} s\n")
    page.screenshot(path=artefacts / "live.png")
    assert page.strays == []


@pytest.mark.skipif(importlib.util.find_spec("jupyter_collaboration") is None,
                    reason="jupyter-collaboration is not installed: pip install -e '.[team]'")  # fmt: skip
def test_two_browsers_on_one_notebook(chromium: Any, notebook_server: Callable[[str], NotebookServer]) -> None:
    """With real-time collaboration, a note written in one browser shows in another that has the notebook open."""
    server = notebook_server("lab")
    notebook_for(server, "shared")
    contexts = [chromium.new_context(viewport={"width": 1500, "height": 1000}) for _ in range(2)]
    first, second = (context.new_page() for context in contexts)
    open_and_run(first, server, "shared.ipynb")
    first.wait_for_selector(".byway-notes .bw-note", timeout=90_000)
    second.goto(server.page("shared.ipynb"), wait_until="domcontentloaded")
    second.wait_for_selector(".byway-notes .bw-note", timeout=90_000)
    first.locator(".bw-note-text").first.fill("From the *first* browser.")
    first.get_by_role("button", name="Add note").click()
    for page in (first, second):
        page.wait_for_selector(".bw-note >> text=first", timeout=10_000)
    for context in contexts:
        context.close()
