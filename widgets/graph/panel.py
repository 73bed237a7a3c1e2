"""The graph: any place with all that touches it, filtered by evidence, and the whole at one glance."""

from __future__ import annotations

from typing import Any, ClassVar

import traitlets as t

from byway.knowledge.graph.references import split_reference
from byway.widgets.front import load_css, load_esm
from byway.widgets.graph.wire import graph_told
from byway.widgets.panel import Panel

__all__ = ["GraphPanel"]


class GraphPanel(Panel):
    """Regions, segments, functions and signs with the claims between them.

    Parameters
    ----------
    source : BenchState or Explanation
    centre : str, optional
        Key to begin at; by default the element that is selected, or the first segment.
    """

    _esm = load_esm("graph/view.js")
    _css = load_css("front/panel.css", "graph/view.css")
    sections: ClassVar[tuple[str, ...]] = ("evidence", "findings", "graph")

    told = t.Dict().tag(sync=True)
    centre = t.Unicode("").tag(sync=True)

    def __init__(self, source: Any, centre: str = "") -> None:
        super().__init__(source, centre=centre)
        self.show_graph()
        self.when(["case_seq", "graph_seq"], self.show_graph)
        self.when(["selected"], self.follow)
        if not self.centre:
            self.follow()

    def show_graph(self) -> None:
        """The graph in use."""
        graph = self.graph
        with self.hold_sync():
            self.told = graph_told(graph) if graph is not None else {}
            self.stamp += 1

    def follow(self) -> None:
        """Go to the element that is selected elsewhere on the bench."""
        graph = self.graph
        if graph is None:
            return
        key = split_reference(self.state.selected)[0] if self.state.selected else ""
        if key in graph.regions or key in graph.segments:
            self.centre = key
        elif not self.centre:
            self.centre = next(iter(graph.segments))
