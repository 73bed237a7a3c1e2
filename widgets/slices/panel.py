"""The kernel's half of the slices panel: strokes in, patches out."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any, ClassVar

import numpy as np
import traitlets as t

from byway.knowledge.faults import BywayError
from byway.knowledge.words import word
from byway.widgets.front import load_css, load_esm
from byway.widgets.panel import Panel
from byway.widgets.slices.uploads import MOST_BYTES, Uploads
from byway.widgets.state import BenchState
from byway.widgets.wire import plain, send

__all__ = ["SlicesPanel"]


class SlicesPanel(Panel):
    """Three linked planes and a projection, with tools to draw the lesion.

    Parameters
    ----------
    source : BenchState, optional
        The case to draw; an empty one where none is given.

    Notes
    -----
    Messages from the browser (``kind``): ``hello`` asks for the table, ``want`` for a volume, ``edit`` carries one
    record of :mod:`byway.widgets.state.edits` with the view's id and running number, ``hand`` tells that the pointer
    is down or up, ``upload`` carries a part of a file, ``path`` names one, ``save`` writes the masks. Every change
    goes to all views as a ``patch`` with a revision; a view that misses one asks for the drawing again.
    """

    _esm = load_esm("slices/view.js")
    _css = load_css("front/panel.css", "slices/view.css")
    sections: ClassVar[tuple[str, ...]] = ("slices",)

    _notice: Any = None

    radiological = t.Bool(True).tag(sync=True)
    cursor_mm = t.List(t.Float(), default_value=[0.0, 0.0, 0.0]).tag(sync=True)
    notice = t.Unicode("").tag(sync=True)

    def __init__(self, source: BenchState | None = None, **traits: Any) -> None:
        self.revision = 0
        self._uploads = Uploads()
        self._handlers: dict[str, Callable[[dict[str, Any], list[Any]], None]] = {
            "hello": self._on_hello,
            "want": self._on_want,
            "edit": self._on_edit,
            "hand": lambda message, _: self.state.hand(bool(message["down"])),
            "upload": self._on_upload,
            "path": self._on_path,
            "save": lambda message, _: self._tell("saved", files=self.state.save_masks()),
        }
        super().__init__(source if source is not None else BenchState(), **traits)
        self.cursor_mm = list(self.state.cursor_mm)
        self.observe(lambda change: setattr(self.state, "cursor_mm", tuple(change.new)), "cursor_mm")
        self._notice = t.dlink((self.state, "notice"), (self, "notice"))
        self.when(["lesion_seq"], self._show_change)
        self.when(["damage_seq"], self._show_shares)
        self.when(["accounts_seq"], self._show_chances)
        self.when(["graph_seq"], lambda: self._tell("places", elements=self.state.geometry is not None))
        self.when(["scans_seq"], lambda: self._tell("scans", scans=self._scans()))
        self.when(["cursor_mm"], lambda: setattr(self, "cursor_mm", list(self.state.cursor_mm)))

    def close(self) -> None:
        """Stop watching the state, and leave the screen."""
        if self._notice is not None:  # a widget is closed once more when it is collected
            self._notice.unlink()
            self._notice = None
            super().close()

    # -- what the state announces -----------------------------------------------------------------------------------

    def _show_change(self) -> None:
        change = self.state.last_change
        if change is None:  # another case
            self._send_table()
            return
        self.revision += 1
        i0, i1, j0, j1, k0, k1 = change.box
        patch = self.state.drawing.bits[i0:i1, j0:j1, k0:k1]
        more = {"styles": self._styles(), "graded": self._graded()} if change.settings else {}
        self._tell("patch", {"bits": patch}, revision=self.revision, box=change.box, label=change.label,
                   origin=dict(self.state.last_origin), **self._counts(), **more)  # fmt: skip

    def _show_shares(self) -> None:
        damage = self.state.damage
        if damage is not None:
            self._tell("shares", {"share": np.asarray(damage.share, np.float32)})

    def _show_chances(self) -> None:
        ensemble = self.state.ensemble
        if ensemble is not None:
            self._tell("chances", {"chance": ensemble.hit_probability()})

    # -- what the browser asks --------------------------------------------------------------------------------------

    def on_message(self, content: dict[str, Any], buffers: list[Any]) -> None:
        """Act on a message of a view; a fault is told to all views and changes nothing."""
        handler = self._handlers.get(str(content.get("kind")))
        if handler is None:
            return
        try:
            handler(content, buffers)
        except BywayError as error:
            self._tell("fault", text=str(error), origin=content.get("origin", {}))
            raise

    def _on_hello(self, message: dict[str, Any], _: list[Any]) -> None:
        self._send_table()
        self._show_shares()
        self._show_chances()

    def _on_want(self, message: dict[str, Any], _: list[Any]) -> None:
        name = str(message["volume"])
        kind, _colon, key = name.partition(":")
        state, settings = self.state, self.state.drawing.settings
        if kind == "scan":
            self._tell("volume", {"data": state.scans[key].stored}, volume=name)
        elif kind == "bits":
            self._tell("volume", {"data": state.drawing.bits}, volume=name, revision=self.revision)
        elif kind == "graded" and settings.effect_volume is not None:
            self._tell("volume", {"data": np.rint(settings.effect_volume * 255).astype(np.uint8)}, volume=name)
        elif kind == "elements" and (elements := state.elements) is not None:
            arrays = {"codes": elements.codes, "offsets": elements.offsets, "members": elements.members}
            self._tell("elements", arrays, ids=elements.element_ids, names=dict(state.science.names))
        elif (volume := state.map_of(kind)) is not None:
            self._tell("volume", {"data": volume}, volume=name)
        else:
            self._tell("absent", volume=name)

    def _on_edit(self, message: dict[str, Any], _: list[Any]) -> None:
        origin = message.get("origin", {})
        self.state.hand(False)
        try:
            change = self.state.edit(message["edit"], origin)
        except Exception:
            # The browser may have painted what is refused here: give it back what holds.
            self._tell(
                "volume", {"data": self.state.drawing.bits}, volume="bits", revision=self.revision, origin=origin
            )
            raise
        if change is None:
            self._tell("nothing", origin=origin, op=message["edit"].get("op"))

    def _on_upload(self, message: dict[str, Any], buffers: list[Any]) -> None:
        lent = self._uploads.add(message, buffers)
        self._tell("taken", upload=message["upload"], part=message["part"])
        if lent is not None:
            with lent as path:
                self._load(path, message)

    def _on_path(self, message: dict[str, Any], _: list[Any]) -> None:
        self._load(Path(str(message["path"])).expanduser(), message)

    def _load(self, path: Path, message: Mapping[str, Any]) -> None:
        note = self.state.load_file(path, str(message["use"]), **message.get("options", {}))
        self._tell("loaded", name=path.name, note=note)

    # -- messages ---------------------------------------------------------------------------------------------------

    def _tell(self, kind: str, arrays: Mapping[str, Any] | None = None, **fields: Any) -> None:
        message, buffers = send(kind, arrays, **fields)
        self.send(message, buffers)

    def _send_table(self) -> None:
        self.revision += 1
        grid = self.state.drawing.grid
        self._tell(
            "table",
            shape=grid.shape,
            affine=grid.affine,
            space=grid.space,
            revision=self.revision,
            styles=self._styles(),
            scans=self._scans(),
            elements=self.state.geometry is not None,
            most_bytes=MOST_BYTES,
            graded=self._graded(),
            notes=self.state.drawing.settings.notes,
            **self._counts(),
        )

    def _styles(self) -> list[dict[str, Any]]:
        return [dict(plain(vars(style))) for style in self.state.drawing.styles]

    def _graded(self) -> str | None:
        """What the graded map's values mean, or None where there is none."""
        settings = self.state.drawing.settings
        return None if settings.effect_volume is None else settings.scale or word("slices.effect")

    def _counts(self) -> dict[str, Any]:
        drawing = self.state.drawing
        return {
            "ml": [n * drawing.grid.voxel_ml for n in drawing.counts()],
            "steps": [len(drawing.history.done), len(drawing.history.undone)],
        }

    def _scans(self) -> list[dict[str, Any]]:
        return [
            {"key": s.key, "name": s.name, "sequence": s.sequence, "slope": s.slope, "intercept": s.intercept,
             "window": s.window, "unit": s.unit, "notes": s.notes}
            for s in self.state.scans
        ]  # fmt: skip
