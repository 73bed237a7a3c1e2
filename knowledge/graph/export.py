"""The graph written for other programs: GraphML, and tables of nodes, edges, claims and signs by segment as CSV."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any

import networkx as nx

from byway.knowledge.faults import Fault, GraphError
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.tables import claim_table, edge_table, node_table, sign_by_segment

__all__ = ["export_graph", "graphml"]

# XML 1.0 has no way to write these at all, not even escaped.
UNWRITABLE = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\ud800-\udfff\ufffe\uffff]")


def graphml(graph: Graph) -> str:
    """``graph.network`` as GraphML text (http://graphml.graphdrawing.org), a standard that other programs read.

    Characters that XML cannot hold stand as U+FFFD.
    """
    clean = nx.MultiDiGraph()
    clean.add_nodes_from((node, _clean(values)) for node, values in graph.network.nodes(data=True))
    clean.add_edges_from((a, b, _clean(values)) for a, b, values in graph.network.edges(data=True))
    return "\n".join(nx.generate_graphml(clean, named_key_ids=True)) + "\n"


def export_graph(graph: Graph, to: Path | str) -> list[Path]:
    """Write the graph.

    Parameters
    ----------
    graph : Graph
        What to write.
    to : path
        A name ending in ``.graphml`` gets that one file; any other name is a folder, made where it is missing, that
        gets ``graph.graphml``, ``nodes.csv``, ``edges.csv``, ``claims.csv`` and ``sign_by_segment.csv``.

    Returns
    -------
    list of Path
        The files written.

    Raises
    ------
    GraphError
        The folder cannot be written.
    """
    to = Path(to)
    try:
        if to.suffix == ".graphml":
            to.write_text(graphml(graph), "utf-8")
            return [to]
        to.mkdir(parents=True, exist_ok=True)
        written = [to / "graph.graphml"]
        written[0].write_text(graphml(graph), "utf-8")
        tables = {"nodes": node_table, "edges": edge_table, "claims": claim_table, "sign_by_segment": sign_by_segment}
        for name, table in tables.items():
            table(graph).to_csv(to / f"{name}.csv", index=False)
            written.append(to / f"{name}.csv")
        return written
    except OSError as error:
        raise GraphError(Fault("unwritable", str(to), str(error.strerror), "a writable folder", "check it")) from error


def _clean(values: dict[str, Any]) -> dict[str, Any]:
    return {
        name: UNWRITABLE.sub("\ufffd", value) if isinstance(value, str) else value for name, value in values.items()
    }
