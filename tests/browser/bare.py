"""A panel of `byway.widgets.panel` on a bare page: its real traits, its real ES module, no notebook and no network."""

from __future__ import annotations

import base64
import json
from typing import Any

__all__ = ["Bare"]

# The theme variables of JupyterLab that panels lean on, in a dark theme.
_DARK = (
    "--jp-ui-font-color1: rgba(255,255,255,.87); --jp-ui-font-color2: rgba(255,255,255,.6);"
    " --jp-layout-color1: #1c1c1e; background: #111"
)

_MODEL = """
window.outbox = [];
window.heard = {};
const bytes = (text) => new DataView(Uint8Array.from(atob(text), (c) => c.charCodeAt(0)).buffer);
const thaw = (v) => (v && v.$bytes !== undefined ? bytes(v.$bytes) : v);
window.start = async (source, state) => {
  const traits = Object.fromEntries(Object.entries(state).map(([k, v]) => [k, thaw(v)]));
  let changed = new Set();
  const fire = (event, ...more) => { for (const call of [...(heard[event] || [])]) call(...more); };
  window.model = {
    get: (name) => traits[name],
    set: (name, value) => { traits[name] = value; changed.add(name); fire(`change:${name}`); },
    save_changes: () => {
      for (const name of changed) outbox.push({ trait: name, value: traits[name] });
      changed = new Set();
    },
    send: (content) => outbox.push({ content }),
    on: (event, call) => { (heard[event] ||= new Set()).add(call); },
    off: (event, call) => { heard[event]?.delete(call); },
  };
  window.put = (now) => {
    for (const [name, value] of Object.entries(now)) traits[name] = thaw(value);
    for (const name of Object.keys(now)) fire(`change:${name}`);
  };
  const url = URL.createObjectURL(new Blob([source], { type: 'text/javascript' }));
  window.stop = await (await import(url)).default.render({ model, el: document.getElementById('here') });
};
"""


def _frozen(value: Any) -> Any:
    return {"$bytes": base64.b64encode(value).decode()} if isinstance(value, bytes) else value


class Bare:
    """One panel on a page; ``window.model`` is its model, ``window.stop()`` takes the view away.

    Parameters
    ----------
    page : playwright page
    panel : Panel
        A real panel; what it sends reaches the page at once, what the page says reaches it with :meth:`carry`.
    width : int
        Width of the place that the panel fills, px.
    dark : bool
        Whether the page has a dark theme.
    """

    def __init__(self, page: Any, panel: Any, *, width: int = 860, dark: bool = False) -> None:
        self.page, self.panel = page, panel
        self.errors: list[str] = []
        page.on("pageerror", lambda error: self.errors.append(str(error)))
        page.set_content(
            f'<!doctype html><html lang="en"><meta charset="utf-8"><title>byway</title><style>{panel._css}</style>'
            f'<body data-jp-theme-light="{"false" if dark else "true"}" style="margin: 16px; {_DARK if dark else ""}">'
            f'<main id="here" style="width: {width}px"></main></body></html>'
        )
        page.add_script_tag(content=_MODEL)
        names = [n for n in panel.keys if not n.startswith("_") and n not in ("layout", "tabbable", "tooltip")]
        state = {name: _frozen(getattr(panel, name)) for name in names}
        panel.observe(lambda change: self.put(**{change.name: change.new}), names)
        page.evaluate("([source, state]) => start(source, state)", [str(panel._esm), json.loads(json.dumps(state))])

    def put(self, **traits: Any) -> None:
        """Change traits on the page, as the kernel would."""
        self.page.evaluate("(now) => put(now)", {name: _frozen(value) for name, value in traits.items()})

    def carry(self) -> list[dict[str, Any]]:
        """Carry what the page said to the panel; returns it."""
        said = list(self.page.evaluate("() => outbox.splice(0)"))
        for item in said:
            if "trait" in item:
                setattr(self.panel, item["trait"], item["value"])
            else:
                self.panel._heard(self.panel, item["content"], [])
        return said
