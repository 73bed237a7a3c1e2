"""A panel on a bare page: its real Python class on one side, its real ES module on the other, no Jupyter between."""

from __future__ import annotations

import base64
import json
import time
from typing import Any

__all__ = ["BarePage"]

PAGE = """<!doctype html><html lang="en"><head><meta charset="utf-8"><title>byway</title>
<style>body {{ margin: 0; padding: 24px; background: var(--jp-layout-color0, #f4f5f6); }} {css}</style></head>
<body data-jp-theme-light="{light}" style="{theme}"><main id="here"></main></body></html>"""

DARK = (
    "--jp-ui-font-color1: #e3e6ea; --jp-ui-font-color2: #a4abb3; "
    "--jp-layout-color1: #1b1e22; --jp-layout-color0: #121417;"
)

MODEL = """
window.outbox = [];
window.makeModel = (state) => {
  const calls = new Map();
  const changed = new Set();
  const model = {
    get: (name) => state[name],
    set: (name, value) => { state[name] = value; changed.add(name); emit('change:' + name); },
    save_changes: () => { for (const n of changed) outbox.push({ trait: n, value: state[n] }); changed.clear(); },
    send: (content, _, buffers) => outbox.push({ content, buffers: (buffers || []).map(toText) }),
    on: (name, call) => calls.set(name, [...(calls.get(name) || []), call]),
    off: (name, call) => calls.set(name, (calls.get(name) || []).filter((c) => c !== call)),
    hear: (content, buffers) => emit('msg:custom', content, buffers.map(toView)),
    put: (name, value) => { state[name] = value; emit('change:' + name); },
  };
  const emit = (name, ...values) => [...(calls.get(name) || [])].forEach((call) => call(...values));
  return model;
};
const toText = (buffer) => {
  let s = '';
  for (const b of new Uint8Array(buffer)) s += String.fromCharCode(b);
  return btoa(s);
};
const toView = (text) => new DataView(Uint8Array.from(atob(text), (c) => c.charCodeAt(0)).buffer);
window.mount = async (source, state) => {
  const url = URL.createObjectURL(new Blob([source], { type: 'text/javascript' }));
  const made = (await import(url)).default;
  window.widget = typeof made === 'function' ? await made() : made;
  window.model = makeModel(state);
  window.stops = [];
  if (widget.initialize) await widget.initialize({ model });
};
window.show = async () => {
  const el = document.createElement('div');
  document.getElementById('here').append(el);
  stops.push(await widget.render({ model, el }));
};
"""


class BarePage:
    """One panel on a page.

    Parameters
    ----------
    page : playwright page
        An empty page.
    panel : AnyWidget
        The panel's Python object.
    dark : bool
        Whether the page takes a dark theme's colours.

    Notes
    -----
    Messages are carried by :meth:`pump`, so that a test decides when the kernel listens: between two calls it is busy.
    """

    def __init__(self, page: Any, panel: Any, *, dark: bool = False) -> None:
        self.page, self.panel = page, panel
        self.sent: list[tuple[Any, list[bytes]]] = []
        self.heard: list[dict[str, Any]] = []
        panel.send = lambda content, buffers=None: self.sent.append((content, [bytes(b) for b in buffers or []]))
        theme = DARK if dark else ""
        page.set_content(PAGE.format(css=panel._css, light="false" if dark else "true", theme=theme))
        page.add_script_tag(content=MODEL)
        keys = [k for k in panel.keys if not k.startswith("_") and k not in ("layout", "tabbable", "tooltip")]
        state = {key: getattr(panel, key) for key in keys}
        panel.observe(self._changed, keys)
        page.evaluate("([source, state]) => mount(source, state)", [panel._esm, json.loads(json.dumps(state))])

    def _changed(self, change: Any) -> None:
        self.page.evaluate("([n, v]) => model.put(n, v)", [change.name, change.new])

    def show(self) -> None:
        """Show one more view."""
        self.page.evaluate("show()")
        self.pump()

    def pump(self) -> int:
        """Carry all messages both ways until none is left; returns how many the kernel heard."""
        count = 0
        while True:
            out = self.page.evaluate("outbox.splice(0)")
            for item in out:
                count += 1
                if "trait" in item:
                    setattr(self.panel, item["trait"], item["value"])
                    continue
                self.heard.append(item["content"])
                self.panel._heard(self.panel, item["content"], [base64.b64decode(b) for b in item["buffers"]])
            sent, self.sent = self.sent, []
            for content, buffers in sent:
                packed = [base64.b64encode(b).decode() for b in buffers]
                self.page.evaluate("([c, b]) => model.hear(c, b)", [content, packed])
            if not out and not sent:
                return count

    def settle(self, seconds: float = 0.3) -> None:
        """Pump until the page has drawn what it has."""
        end = time.monotonic() + seconds
        while time.monotonic() < end:
            self.pump()
            self.page.wait_for_timeout(30)
