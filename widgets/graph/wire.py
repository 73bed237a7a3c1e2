"""The graph by bare keys for the browser: places, what touches what, and every claim with its sources."""

from __future__ import annotations

from typing import Any

import numpy as np

from byway.knowledge.graph.references import split_reference
from byway.widgets.wire import plain

__all__ = ["graph_told"]


def graph_told(graph: Any) -> dict[str, Any]:
    """Nodes (regions, segments, functions, signs), edges between them with the claims on each, claims and sources."""
    claims = list(graph.claims)
    number = {key: i for i, key in enumerate(claims)}
    edges: dict[tuple[str, str, str], list[int]] = {}
    for key, segment in graph.segments.items():
        for place in (segment.from_place, segment.to_place):
            if not place.startswith("wm:"):
                edges.setdefault((split_reference(place)[0], key, "joins"), [])
    for function in graph.functions.values():
        for route in function.routes:
            for reference in route.chain:
                edges.setdefault((split_reference(reference)[0], function.key, "serves"), [])
    for sign in graph.signs.values():
        for dependence in sign.depends:
            edges.setdefault((dependence.function, sign.key, "shows_as"), [])
    for key, claim in graph.claims.items():
        for pair in ((claim.subject, claim.object), (claim.object, claim.subject)):
            for relation in ("joins", "serves", "shows_as"):
                if (*pair, relation) in edges:
                    edges[(*pair, relation)].append(number[key])
    domains = list(dict.fromkeys(record.domain for record in (*graph.functions.values(), *graph.signs.values())))
    told = {
        "nodes": [*_nodes(graph)],
        "edges": [[a, b, relation, spoken] for (a, b, relation), spoken in edges.items()],
        "claims": [_claim(graph, key) for key in claims],
        "sources": {key: {"text": _citation(source), "checked": source.checked}
                    for key, source in graph.sources.items()},
        "domains": domains,
    }  # fmt: skip
    return dict(plain(told))


def _nodes(graph: Any) -> list[dict[str, Any]]:
    nodes = []
    for kind, records in (("region", graph.regions), ("segment", graph.segments)):
        for key, record in records.items():
            points = np.array(record.seeds_mni if kind == "region" else record.waypoints_mni)
            caution = graph.pathways[record.pathway].disputed if kind == "segment" else None
            nodes.append({"key": key, "kind": kind, "name": graph.name_of(key), "text": record.serves_in_words,
                          "y": points[:, 1].mean(), "z": points[:, 2].mean(), "caution": caution,
                          "layer": _layer(graph, kind, key)})  # fmt: skip
    for kind, records, text in (("function", graph.functions, "description"), ("sign", graph.signs, "examination")):
        nodes += [{"key": key, "kind": kind, "name": record.name, "domain": record.domain,
                   "text": getattr(record, text), "layer": _layer(graph, kind, key)}
                  for key, record in records.items()]  # fmt: skip
    return nodes


def _layer(graph: Any, kind: str, key: str) -> str:
    """Name of the layer that a record came from; the lowest for one that was never in a file."""
    origin = graph.origins.get((kind, key))
    return str(origin.layer if origin is not None else graph.layers[0])


def _claim(graph: Any, key: str) -> dict[str, Any]:
    claim = graph.claims[key]
    return {"key": key, "says": claim.says, "grade": claim.grade, "kind": claim.kind, "stance": claim.stance,
            "population": claim.population, "sources": list(claim.sources), "note": claim.note,
            "layer": _layer(graph, "claim", key)}  # fmt: skip


def _citation(source: Any) -> str:
    title = f" {source.title}." if source.title else ""
    return f"{source.authors} ({source.year}){title} {source.container}"
