"""The notebooks run as they stand, and read as pages for those who never run them."""

from __future__ import annotations

import shutil
from pathlib import Path

import nbformat
import pytest
from nbclient import NotebookClient

from byway.knowledge import open_case

NOTEBOOKS = Path(__file__).resolve().parents[1] / "notebooks"
NAMES = ("first_case", "atypical_tumour", "unexpected_sparing", "editing_the_graph", "team_case")
PAGES = NAMES[1:]
"""Notebooks whose outputs are kept in the file; the first one opens on the bench and is meant to be run."""


def test_every_notebook_is_listed() -> None:
    """No notebook goes untested."""
    assert {path.stem for path in NOTEBOOKS.glob("*.ipynb")} == set(NAMES)


@pytest.mark.parametrize("name", NAMES)
def test_a_notebook_runs(name: str, tmp_path: Path) -> None:
    """Every cell of a copy runs, without an error and without touching the original's case."""
    shutil.copytree(NOTEBOOKS, tmp_path / "notebooks", ignore=shutil.ignore_patterns(".ipynb_checkpoints"))
    notebook = nbformat.read(tmp_path / "notebooks" / f"{name}.ipynb", as_version=4)
    client = NotebookClient(notebook, timeout=240, kernel_name="python3",
                            resources={"metadata": {"path": str(tmp_path / "notebooks")}})  # fmt: skip
    client.execute()
    ran = [cell for cell in notebook.cells if cell.cell_type == "code"]
    assert all(output.output_type != "error" for cell in ran for output in cell.outputs)
    assert any("widget-view" in kind for cell in ran for output in cell.outputs for kind in output.get("data", {}))


@pytest.mark.parametrize("name", NAMES)
def test_it_says_that_it_is_invented(name: str) -> None:
    """The first words say that the data are invented and that it is no diagnosis; the case says so too."""
    notebook = nbformat.read(NOTEBOOKS / f"{name}.ipynb", as_version=4)
    first = next(cell.source for cell in notebook.cells if cell.cell_type == "markdown")
    assert "invented" in first
    assert "no diagnosis" in first
    assert open_case(NOTEBOOKS / "cases" / name).spec.invented


@pytest.mark.parametrize("name", PAGES)
def test_it_reads_without_being_run(name: str) -> None:
    """Tables, text and pictures are kept in the file, small; nothing in them is fetched; L and R stand on slices."""
    path = NOTEBOOKS / f"{name}.ipynb"
    notebook = nbformat.read(path, as_version=4)
    code = [cell for cell in notebook.cells if cell.cell_type == "code"]
    assert sum(bool(cell.outputs) for cell in code) >= len(code) - 3
    words = sum(len(cell.source.split()) for cell in notebook.cells if cell.cell_type == "markdown")
    assert words > 200
    assert path.stat().st_size < 250_000
    text = path.read_text("utf-8")
    assert "http://" not in text
    assert "https://" not in text
    assert ">L</span>" in text
    assert "Traceback" not in text
