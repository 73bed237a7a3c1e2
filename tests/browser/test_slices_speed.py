"""How quick drawing is, in JupyterLab with the whole graph. Prints figures; asserts only that nothing was lost.

Run alone for figures worth quoting: ``python -m pytest tests/browser/test_slices_speed.py -s``.
"""

from __future__ import annotations

import json
import os
import statistics
from collections.abc import Callable
from typing import Any

import pytest
from browser.notebook_page import open_and_run
from browser.notebook_server import NotebookServer
from browser.test_slices_notebooks import SOURCE, VIEW, write_notebook

TIMED = """
import time
times = []
plain = state.edit
def timed(*args, **more):
    start = time.perf_counter()
    try:
        return plain(*args, **more)
    finally:
        times.append(1000 * (time.perf_counter() - start))
state.edit = timed
"""
WATCH = """() => {
  window.marks = []; window.lifted = 0;
  const film = document.querySelector('.bs-film[data-plane=axial]');
  film.addEventListener('pointerup', () => { lifted = performance.now(); }, true);
  new MutationObserver(() => { if (lifted) requestAnimationFrame(() => {
    if (lifted) { marks.push(performance.now() - lifted); lifted = 0; } }); })
    .observe(document.querySelector('.byway-hits'),
      { subtree: true, childList: true, characterData: true, attributes: true });
}"""
ASK = """async (code) => {
  const kernel = window.jupyterapp.shell.currentWidget.sessionContext.session.kernel;
  const future = kernel.requestExecute({ code });
  let text = ''; future.onIOPub = (m) => { if (m.header.msg_type === 'stream') text += m.content.text; };
  await future.done; return text;
}"""
FRAMES = """async () => {
  const film = document.querySelector('.bs-film[data-plane=axial]'); const box = film.getBoundingClientRect();
  const view = document.querySelector('.byway-slices').parentElement.byway;
  const send = (type, x, y) => film.dispatchEvent(new PointerEvent(type, { clientX: box.left + x * box.width,
    clientY: box.top + y * box.height, pointerId: 1, pointerType: 'mouse', button: 0, bubbles: true }));
  film.setPointerCapture = () => {};
  let drawn = 0; const draw = view.films[0].drawBase.bind(view.films[0]);
  view.films[0].drawBase = () => { drawn += 1; draw(); };
  const start = performance.now(); let frames = 0;
  send('pointerdown', 0.3, 0.3);
  while (performance.now() - start < 3000) {
    const t = (performance.now() - start) / 3000;
    send('pointermove', 0.3 + 0.4 * t, 0.5 + 0.2 * Math.sin(20 * t));
    await new Promise(requestAnimationFrame); frames += 1;
  }
  send('pointerup', 0.7, 0.5);
  return { seconds: (performance.now() - start) / 1000, frames, drawn };
}"""


@pytest.fixture
def lab(page: Any, notebook_server: Callable[[str], NotebookServer]) -> Any:
    """JupyterLab with slices and hit list, timed in the kernel."""
    server = notebook_server("lab")
    write_notebook(server.root / "speed.ipynb", SOURCE, TIMED)
    open_and_run(page, server, "speed.ipynb")
    page.wait_for_function(f"{VIEW}.store.bits && {VIEW}.store.volumes.get('scan:template')", timeout=60_000)
    page.locator(".bs-film[data-plane=axial]").scroll_into_view_if_needed()
    page.evaluate(f"{VIEW}.look.set({{ tool: 'brush', radius: 3 }})")
    page.wait_for_timeout(1500)
    return page


def test_from_pointer_up_to_the_hit_list(lab: Any, benchmark: Any, capsys: pytest.CaptureFixture[str]) -> None:
    """Time from pointer-up to the hit list redrawn, over many strokes, with the kernel's own share."""
    lab.evaluate(WATCH)
    box = lab.locator(".bs-film[data-plane=axial]").bounding_box()
    rounds = int(os.environ.get("BYWAY_STROKES", "40"))
    count = 0

    def stroke() -> None:
        nonlocal count
        x = box["x"] + box["width"] * (0.58 + 0.012 * (count % 9))
        y = box["y"] + box["height"] * (0.36 + 0.01 * (count % 13))
        count += 1
        seen = lab.evaluate("marks.length")
        lab.mouse.move(x, y)
        lab.mouse.down()
        lab.mouse.move(x + 18, y + 12, steps=5)
        lab.mouse.up()
        lab.wait_for_function("(n) => marks.length > n", arg=seen)
        lab.wait_for_timeout(60)

    benchmark.pedantic(stroke, rounds=rounds, iterations=1)
    marks = sorted(lab.evaluate("marks"))
    kernel = sorted(json.loads(lab.evaluate(ASK, "import json; print(json.dumps(times))")))
    assert len(kernel) == len(marks) == rounds

    def at(values: list[float], share: float) -> float:
        return values[min(len(values) - 1, int(share * len(values)))]

    figures = {"median_ms": statistics.median(marks), "p95_ms": at(marks, 0.95),
               "kernel_median_ms": statistics.median(kernel), "kernel_p95_ms": at(kernel, 0.95)}  # fmt: skip
    benchmark.extra_info.update(figures)
    with capsys.disabled():
        print("\npointer-up to hit list: " + ", ".join(f"{key} {value:.0f}" for key, value in figures.items()))


def test_frames_while_the_kernel_is_busy(lab: Any, capsys: pytest.CaptureFixture[str]) -> None:
    """Frames a second of local paint while a cell keeps the kernel busy; the stroke is worked in afterwards."""
    busy = "import time\nend = time.time() + 5\nwhile time.time() < end: sum(range(1000))"
    lab.evaluate(f"(code) => {{ ({ASK})(code); }}", busy)
    seen = lab.evaluate(FRAMES)
    lab.wait_for_function(f"{VIEW}.store.waiting === 0", timeout=30_000)
    with capsys.disabled():
        print(f"\nlocal paint, kernel busy: {seen['drawn'] / seen['seconds']:.0f} films a second "
              f"of {seen['frames'] / seen['seconds']:.0f} frames")  # fmt: skip
    assert seen["drawn"] > 0
