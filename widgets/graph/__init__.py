"""The graph panel: neighbourhoods, and the whole graph."""

from byway.widgets.graph.panel import GraphPanel

__all__ = ["GraphPanel"]
