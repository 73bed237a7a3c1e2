"""The graph in use: the base text, overlays on it, and the checks that stand before anything reckons with them."""

from __future__ import annotations

from collections.abc import Iterable
from functools import lru_cache
from pathlib import Path

from byway.knowledge.faults import FaultReport, GraphError
from byway.knowledge.graph.checks import check_graph
from byway.knowledge.graph.content import Content
from byway.knowledge.graph.files import read_curated
from byway.knowledge.graph.graph import Graph, graph_from
from byway.knowledge.graph.layers import apply_overlays
from byway.knowledge.graph.overlay_files import read_overlay
from byway.knowledge.graph.overlays import Overlay

__all__ = ["base_content", "graph_with", "joint_faults", "load_graph"]


@lru_cache(maxsize=1)
def base_content() -> Content:
    """The base layer as read from the curated text that comes with the package; read once a process."""
    return read_curated()


def load_graph(overlays: Iterable[Overlay | Path | str] = (), *, folder: Path | None = None) -> Graph:
    """The graph in effect.

    Parameters
    ----------
    overlays : iterable of Overlay or path, optional
        Laid on the base in this order, the first lowest; a path leads to a YAML file or a folder.
    folder : Path, optional
        Another folder of curated text as base.

    Raises
    ------
    GraphError
        Holding every fault of the text, or of the graph once the overlays lie on it. The base is untouched.
    """
    base = base_content() if folder is None else read_curated(folder)
    layers = [each if isinstance(each, Overlay) else read_overlay(each) for each in overlays]
    return graph_with(base, layers) if layers else graph_from(base)


def graph_with(base: Content, overlays: Iterable[Overlay]) -> Graph:
    """The graph of a base with overlays on it, checked.

    Raises
    ------
    GraphError
        Holding every grave fault that the base does not have by itself.
    """
    content = apply_overlays(base, overlays)
    report = FaultReport([fault for fault in check_graph(content) if fault.grave])
    if report.grave:
        known = {(fault.rule, fault.where, fault.found) for fault in check_graph(base)}
        report = FaultReport([fault for fault in report if (fault.rule, fault.where, fault.found) not in known])
    report.raise_if_grave(GraphError)
    return graph_from(content)


def joint_faults(base: Content, first: Overlay, second: Overlay) -> FaultReport:
    """Grave faults that arise only when two overlays lie on a base together, the second above the first.

    One retires the source that the other's claim cites, both add the same key: each may be used, not both.

    Raises
    ------
    GraphError
        One of the two cannot be used by itself.
    """
    graph_with(base, [first])
    graph_with(base, [second])
    try:
        graph_with(base, [first, second])
    except GraphError as error:
        return FaultReport(list(error.faults))
    return FaultReport()
