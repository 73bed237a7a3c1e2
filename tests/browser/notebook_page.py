"""Open a notebook and run all its cells, reliably, in JupyterLab, Notebook 7 or Voila."""

from __future__ import annotations

import json
from pathlib import Path
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from browser.notebook_server import NotebookServer

__all__ = ["CHROMIUM_FLAGS", "RUN_ALL", "open_and_run", "write_settings"]

CHROMIUM_FLAGS = [
    "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking",
    "--disable-component-update", "--disable-sync",
]  # fmt: skip

# The run is dropped when it is asked for before the kernel is ready, whatever the page says; so wait for the panel's
# context, session and a real answer of the kernel, then call the command, then wait for every cell.
RUN_ALL = """async () => {
  const sleep = ms => new Promise(r => setTimeout(r, ms));
  const end = Date.now() + 120000;
  const until = async (test, what) => { while (!test()) { if (Date.now() > end) throw Error(what); await sleep(50); } };
  const panel = () => { const w = window.jupyterapp?.shell.currentWidget;
                        return w?.content?.widgets && w.sessionContext ? w : null; };
  await until(panel, 'no notebook panel');
  const p = panel();
  await p.context.ready;
  await p.sessionContext.ready;
  await until(() => p.sessionContext.session?.kernel, 'no kernel');
  const k = p.sessionContext.session.kernel;
  await k.info;
  await until(() => k.connectionStatus === 'connected' && k.status === 'idle', 'kernel ' + k.status);
  await jupyterapp.commands.execute('notebook:run-all-cells');
  const cells = [...p.content.widgets].filter(c => c.model.type === 'code');
  const waiting = c => c.model.executionCount === null || c.model.executionState === 'running';
  await until(() => !cells.some(waiting), 'not run');
  const errors = cells.flatMap(c => c.model.outputs.toJSON()).filter(o => o.output_type === 'error');
  if (errors.length) throw Error(errors.map(o => o.ename + ': ' + o.evalue).join('; '));
  return true;
}"""


def write_settings(home: Path) -> None:
    """Write private JupyterLab settings: every cell in the DOM, no news, no autosave."""
    for name, value in {
        "@jupyterlab/notebook-extension/tracker": {"windowingMode": "none"},
        "@jupyterlab/apputils-extension/notification": {"fetchNews": "false", "checkForUpdates": False},
        "@jupyterlab/docmanager-extension/plugin": {"autosave": False},
    }.items():
        file = home / "labsettings" / f"{name}.jupyterlab-settings"
        file.parent.mkdir(parents=True, exist_ok=True)
        file.write_text(json.dumps(value))


def open_and_run(page: Any, server: NotebookServer, notebook: str) -> None:
    """Open a notebook below the server's root and run its cells; raises if one fails. Voila runs them by itself."""
    page.goto(server.page(notebook), wait_until="domcontentloaded")
    if server.kind == "voila":
        return
    page.wait_for_function("() => !!window.jupyterapp", timeout=60_000)
    page.evaluate(RUN_ALL)
