"""An invented case on the small graph, for the editing of it: no geometry, no reasoning."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from small_graph import CLAIM, SMALL

from byway.knowledge.cases.case import open_case
from byway.knowledge.graph.files import read_curated
from byway.knowledge.graph.graph import Graph, graph_from
from byway.widgets.editing import EditingPanel
from byway.widgets.state import BenchState

__all__ = ["BASE", "CLAIM", "QuietScience", "editing_panel", "new_case"]

BASE = read_curated(SMALL)


class QuietScience:
    """Gives a graph, and reasons about nothing."""

    geometry = None
    index = None
    names: dict[str, str] = {}  # noqa: RUF012 - nothing writes to it

    def __init__(self, graph: Graph) -> None:
        self.graph = graph

    def with_graph(self, graph: Graph) -> QuietScience:
        """Another graph."""
        return QuietScience(graph)

    def damage(self, lesion: object) -> None:
        """Nothing."""

    def explain(self, *_: object) -> tuple[None, None]:
        """Nothing."""
        return None, None

    def map_of(self, kind: str) -> None:
        """Nothing."""


def new_case(folder: Path) -> Any:
    """A case without lesion or findings."""
    folder.mkdir(parents=True, exist_ok=True)
    (folder / "case.yaml").write_text("# invented\nstage: acute\ninvented: true\n")
    return open_case(folder)


def editing_panel(folder: Path, author: str = "A. Reader") -> EditingPanel:
    """The panel on such a case."""
    state = BenchState(new_case(folder), QuietScience(graph_from(BASE)))
    return EditingPanel(state, author, BASE)
