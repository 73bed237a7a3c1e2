"""A bare page with a stand-in model: a panel's front end without notebook, kernel or network."""

from __future__ import annotations

import base64
import json
from typing import Any

from byway.widgets.front import load_css, load_esm

__all__ = ["DARK", "changed", "mount", "sent"]

# The theme variables of JupyterLab that panels lean on, in a dark theme.
DARK = (
    "body { --jp-ui-font-color1: rgba(255,255,255,.87); --jp-ui-font-color2: rgba(255,255,255,.6);"
    " --jp-layout-color0: #111; --jp-layout-color1: #1c1c1e; --jp-layout-color2: #424242; --jp-border-color2: #424242;"
    " background: #111; }"
)

_MODEL = """
class Model {
  constructor(state) { this.state = state; this.heard = {}; this.sent = []; this.saved = []; this.dirty = {}; }
  get(name) { return this.state[name]; }
  set(name, value) { this.state[name] = value; this.dirty[name] = value; this.fire(`change:${name}`); }
  save_changes() { this.saved.push(this.dirty); this.dirty = {}; }
  on(event, call) { (this.heard[event] ||= new Set()).add(call); }
  off(event, call) { this.heard[event]?.delete(call); }
  fire(event, ...more) { for (const call of [...(this.heard[event] || [])]) call(...more); }
  send(message) { this.sent.push(message); }
}
const thaw = (state) => Object.fromEntries(Object.entries(state).map(([k, v]) =>
  [k, v && v.$bytes !== undefined ? new DataView(Uint8Array.from(atob(v.$bytes), (c) => c.charCodeAt(0)).buffer) : v]));
"""


def _frozen(state: dict[str, Any]) -> str:
    plain = {k: {"$bytes": base64.b64encode(v).decode()} if isinstance(v, bytes) else v for k, v in state.items()}
    return json.dumps(plain).replace("<", "\\u003c")


def mount(page: Any, entry: str, css: tuple[str, ...], state: dict[str, Any], *, width: int = 820,
          dark: bool = False) -> None:  # fmt: skip
    """Show a panel on an empty page; afterwards ``window.model`` is its model and ``window.close_view`` removes it."""
    theme = DARK if dark else "body { background: #fff; }"
    page.set_content(
        f'<!doctype html><meta charset="utf-8"><style>{theme} body {{ margin: 16px; }} #here {{ width: {width}px; }}'
        f"{load_css(*css)}</style><body data-jp-theme-light={'false' if dark else 'true'}><div id=here></div>"
    )
    esm = load_esm(entry).replace("export default", "const panel =")
    page.add_script_tag(type="module", content=f"{esm}{_MODEL}\nwindow.thaw = thaw;"
                        f"window.model = new Model(thaw({_frozen(state)}));"
                        "window.close_view = await panel.render({ model: window.model, el: document.querySelector('#here') });"
                        "document.body.dataset.ready = 'yes';")  # fmt: skip
    page.wait_for_selector("body[data-ready=yes]", state="attached")


def changed(page: Any, **state: Any) -> None:
    """Change traits as the kernel would, all before any listener hears of it."""
    page.evaluate(
        f"() => {{ const now = thaw({_frozen(state)}); Object.assign(model.state, now);"
        " for (const name of Object.keys(now)) model.fire(`change:${name}`); }"
    )


def sent(page: Any) -> list[Any]:
    """Messages that the panel sent to the kernel."""
    return list(page.evaluate("() => model.sent"))
