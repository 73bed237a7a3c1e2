"""The 3-D head: brain, lesion, and bundles cut or spared. It loads plotly, so the bench makes it on demand."""

from __future__ import annotations

from typing import Any, ClassVar

import ipywidgets
import numpy as np
import plotly.graph_objects as go
import traitlets as t

from byway.knowledge.words import word
from byway.widgets.front import load_css, load_esm
from byway.widgets.head.surface import Surface
from byway.widgets.head.wire import brain_surface, bundle_lines, lesion_surfaces, parcel_surface
from byway.widgets.panel import Panel, element_words

__all__ = ["HeadPanel"]

MOST_CHOICES = 14
FIRST_SHOWN = 4
LEAST_SHARE = 0.02
TONES = {"core": "#d55e00", "oedema": "#56b4e9", "other": "#cc79a7"}
CUT, SPARED, PARCEL = "#e69f00", "#56b4e9", "#009e73"


class _HeadTools(Panel):
    """Heading, choices and caution of the head."""

    _esm = load_esm("head/view.js")
    _css = load_css("front/panel.css", "head/view.css")
    sections: ClassVar[tuple[str, ...]] = ("head",)

    choices: Any = t.List().tag(sync=True)
    shown: Any = t.List().tag(sync=True)
    parts = t.Dict({"brain": True, "lesion": True, "cut": True, "spared": True}).tag(sync=True)


class HeadPanel(ipywidgets.VBox):  # type: ignore[misc]
    """Brain, lesion and bundles in three dimensions.

    Parameters
    ----------
    source : BenchState
        The case; without geometry only the brain is shown.
    """

    def __init__(self, source: Any) -> None:
        self.tools = _HeadTools(source)
        self.state = self.tools.state
        self.figure = go.FigureWidget(layout=_layout())
        self.figure._config = {**self.figure._config, "responsive": True, "displaylogo": False}
        super().__init__([self.tools, self.figure])
        self.add_class("byway-head-box")
        self._touched = False
        self.draw()
        self.tools.when(["accounts_seq", "case_seq"], self.draw)
        self.tools.when(["selected"], self.redraw)
        self.tools.observe(self._chosen, ["shown", "parts"])

    def _chosen(self, change: Any) -> None:
        self._touched = self._touched or change.name == "shown"
        self.redraw()

    def draw(self) -> None:
        """Choices and picture anew, after the lesion has changed and the hand rests."""
        self.tools.choices = self._choices()
        known = {choice["id"] for choice in self.tools.choices}
        if not self._touched:
            self.tools.unobserve(self._chosen, ["shown", "parts"])
            self.tools.shown = [choice["id"] for choice in self.tools.choices[:FIRST_SHOWN]]
            self.tools.observe(self._chosen, ["shown", "parts"])
        else:
            self.tools.shown = [element for element in self.tools.shown if element in known]
        self.redraw()

    def _choices(self) -> list[dict[str, Any]]:
        damage = self.state.damage
        if damage is None:
            return []
        geometry = damage.index.geometry
        first = len(geometry.region_ids)
        order = sorted(range(first, len(damage.share)), key=lambda i: -float(damage.share[i]))
        return [{**element_words(self.tools.graph, damage.element_ids[i]), "share": float(damage.share[i])}
                for i in order[:MOST_CHOICES] if damage.share[i] >= LEAST_SHARE]  # fmt: skip

    def redraw(self) -> None:
        """The picture, with what is chosen now."""
        traces = [*self._brain(), *self._lesion(), *self._bundles(), *_letters()]
        with self.figure.batch_update():
            self.figure.data = ()
            self.figure.add_traces(traces)

    def _brain(self) -> list[Any]:
        if not self.tools.parts.get("brain"):
            return []
        return [_mesh(brain_surface(), "#b9bec6", 0.13, word("head.brain"))]

    def _lesion(self) -> list[Any]:
        if not self.tools.parts.get("lesion"):
            return []
        meshes = lesion_surfaces(self.state.lesion)
        return [_mesh(surface, TONES[kind], 0.55 if kind == "core" else 0.3, name) for name, kind, surface in meshes
                if len(surface.triangles)]  # fmt: skip

    def _bundles(self) -> list[Any]:
        damage = self.state.damage
        if damage is None:
            return []
        traces = []
        geometry, selected = damage.index.geometry, self.state.selected
        if selected in geometry.region_ids:
            traces.append(_mesh(parcel_surface(geometry, selected), PARCEL, 0.45, self._name(selected)))
        wanted = [*self.tools.shown, *([selected] if selected in geometry.segment_ids else [])]
        for element in dict.fromkeys(wanted):
            bundle = bundle_lines(damage, element)
            width = 5 if element == selected else 2.5
            for part, lines, tone in (("cut", bundle.cut_mm, CUT), ("spared", bundle.spared_mm, SPARED)):
                if self.tools.parts.get(part) and len(lines):
                    traces.append(_lines(lines, tone, width, f"{self._name(element)}, {word(f'head.{part}')}"))
        return traces

    def _name(self, element: str) -> str:
        words = element_words(self.tools.graph, element)
        return f"{words['name']}, {words['side']}"

    def close(self) -> None:
        """Close the tools and the figure."""
        self.tools.close()
        self.figure.close()
        super().close()


def _mesh(surface: Surface, tone: str, opacity: float, name: str) -> Any:
    x, y, z = surface.vertices_mm.T
    i, j, k = surface.triangles.T
    return go.Mesh3d(x=x, y=y, z=z, i=i, j=j, k=k, color=tone, opacity=opacity, name=_safe(name), hoverinfo="name",
                     flatshading=False, lighting={"ambient": 0.6, "diffuse": 0.7, "specular": 0.1})  # fmt: skip


def _lines(lines: np.ndarray[Any, Any], tone: str, width: float, name: str) -> Any:
    x, y, z = lines.T
    return go.Scatter3d(x=x, y=y, z=z, mode="lines", line={"color": tone, "width": width}, name=_safe(name),
                        hoverinfo="name", connectgaps=False)  # fmt: skip


def _letters() -> list[Any]:
    """L and R beside the head: MNI x grows to the right."""
    left, right = word("shared.left_letter"), word("shared.right_letter")
    return [go.Scatter3d(x=[-86, 86], y=[-18, -18], z=[-20, -20], mode="text", text=[left, right], hoverinfo="skip",
                         textfont={"size": 18, "color": "#7a828c"})]  # fmt: skip


def _safe(text: str) -> str:
    """Plotly reads a few tags in names; none is let through."""
    return text.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;")


def _layout() -> dict[str, Any]:
    axis = {"visible": False, "showbackground": False}
    camera = {"eye": {"x": -1.25, "y": 0.85, "z": 0.55}, "up": {"x": 0, "y": 0, "z": 1}}
    return {
        "height": 560,
        "margin": {"l": 0, "r": 0, "t": 0, "b": 0},
        "autosize": True,
        "modebar": {"bgcolor": "rgba(0,0,0,0)", "remove": ["orbitRotation", "resetCameraLastSave3d", "pan3d"]},
        "showlegend": False,
        "paper_bgcolor": "rgba(0,0,0,0)",
        "scene": {"xaxis": axis, "yaxis": axis, "zaxis": axis, "aspectmode": "data", "camera": camera},
        "uirevision": "keep",
    }
