"""The bench under axe-core, the accessibility checker (its script comes with the package axe-playwright-python)."""

from __future__ import annotations

import importlib.util
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from browser.notebook_page import open_and_run
from browser.notebook_server import NotebookServer
from browser.test_bench_notebook import BENCH, notebook

CHECK = """async () => {
  const found = await axe.run('.byway-bench');
  if (found.passes.length < 10) return ['nothing was looked at'];
  return found.violations
    .filter((v) => ['serious', 'critical'].includes(v.impact))
    .flatMap((v) => v.nodes.map((n) => `${v.id}: ${n.target.join(' ')} ${n.failureSummary || ''}`));
}"""


def axe_script() -> str:
    """The text of axe.min.js."""
    spec = importlib.util.find_spec("axe_playwright_python")
    if spec is None or spec.origin is None:
        pytest.skip("axe-core is not installed: pip install axe-playwright-python")
    return (Path(spec.origin).parent / "axe.min.js").read_text("utf-8")


def test_no_serious_accessibility_fault(page: Any, notebook_server: Callable[[str], NotebookServer]) -> None:
    """axe-core finds no serious or critical fault in any panel of the bench."""
    server = notebook_server("voila")
    name = notebook(server.root, "accessible.ipynb", BENCH)
    open_and_run(page, server, name)
    page.locator(".bw-card").first.wait_for(timeout=120_000)
    page.evaluate(axe_script())
    faults = page.evaluate(CHECK)
    assert faults == [], "\n".join(faults)
