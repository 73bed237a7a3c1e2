"""The graph as tables: nodes, edges, claims, and which sign hangs on which segment by way of which function."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import pandas as pd

from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.records import Claim, Route, Sign
from byway.knowledge.graph.references import split_reference

__all__ = ["claim_table", "edge_table", "node_table", "segment_text", "sign_by_segment"]

SHOWN_ON = {
    "contralateral": "other side",
    "ipsilateral": "same side",
    "dominant": "language-dominant hemisphere",
    "nondominant": "other than language-dominant hemisphere",
    "either": "either hemisphere",
    "bilateral": "both hemispheres together",
}


def node_table(graph: Graph) -> pd.DataFrame:
    """All nodes of ``graph.network``: id, kind, key, name, side."""
    rows = [{"id": node, **values} for node, values in graph.network.nodes(data=True)]
    return pd.DataFrame(rows, columns=["id", "kind", "key", "name", "side"])


def edge_table(graph: Graph) -> pd.DataFrame:
    """All edges of ``graph.network``: first, second, relation, and route, load, weight, end where they apply."""
    rows = [{"first": a, "second": b, **values} for a, b, values in graph.network.edges(data=True)]
    return pd.DataFrame(rows, columns=["first", "second", "relation", "route", "load", "weight", "end"])


def claim_table(graph: Graph) -> pd.DataFrame:
    """All claims, a row each, with their sources, how these were checked, the layer, and disputes by overlays."""
    rows: list[dict[str, Any]] = []
    for claim in graph.claims.values():
        sources = graph.sources_of(claim)
        origin = graph.origins.get(("claim", claim.key))
        rows.append(
            {
                "claim": claim.key,
                "says": claim.says,
                "subject": claim.subject,
                "relation": claim.relation,
                "object": claim.object,
                "grade": claim.grade,
                "kind": claim.kind,
                "population": claim.population,
                "stance": claim.stance,
                "sources": ", ".join(claim.sources),
                "read": sum(source.checked == "read" for source in sources),
                "memory": sum(source.checked == "memory" for source in sources),
                "disputed": "; ".join(dispute.reason for dispute in graph.disputes.get(("claim", claim.key), ())),
                "layer": origin.layer if origin else "",
            }
        )
    return pd.DataFrame(rows)


def sign_by_segment(graph: Graph) -> pd.DataFrame:
    """Which sign hangs on which segment.

    Returns
    -------
    DataFrame
        One row for each segment, function, route through it and sign: segment, pathway, studied, function, route,
        load (usual share of the function on this route), sign, shown_on, weight (probability of the sign when the
        function is gone), claims (keys of the claims that the segment serves the function, disputing ones with a
        leading minus) and sources.
    """
    signs_of: dict[str, list[tuple[Sign, float]]] = {}
    for sign in graph.signs.values():
        for dependence in sign.depends:
            signs_of.setdefault(dependence.function, []).append((sign, dependence.weight))
    routes = _routes_by_segment(graph)
    columns = [
        "segment",
        "pathway",
        "studied",
        "function",
        "route",
        "load",
        "sign",
        "shown_on",
        "weight",
        "claims",
        "sources",
    ]
    rows: list[dict[str, Any]] = []
    for segment in graph.segments.values():
        for function, route in routes.get(segment.key, ()):
            claims = [claim for claim in graph.claims_about(segment.key, function) if claim.relation == "serves"]
            for sign, weight in signs_of.get(function, ()):
                values = (segment.key, segment.pathway, segment.studied, function, route.key, route.usual_load)
                told = (_keys(claims), ", ".join(_source_keys(claims)))
                row = (*values, sign.key, SHOWN_ON[sign.side_rule], weight, *told)
                rows.append(dict(zip(columns, row, strict=True)))
    return pd.DataFrame(rows, columns=columns)


def segment_text(graph: Graph) -> str:
    """The sign-by-segment table to be read from top to bottom: a paragraph a segment, a line a function."""
    signs_of: dict[str, list[str]] = {}
    for sign in graph.signs.values():
        for dependence in sign.depends:
            told = f"{sign.key} ({SHOWN_ON[sign.side_rule]}, {dependence.weight:g})"
            signs_of.setdefault(dependence.function, []).append(told)
    routes = _routes_by_segment(graph)
    lines: list[str] = []
    for pathway in graph.pathways.values():
        lines += ["", f"{pathway.name}  [{pathway.kind}]"]
        if pathway.disputed:
            lines.append(f"  disputed: {pathway.disputed}")
        for key in pathway.segments:
            segment = graph.segments[key]
            lines.append(
                f"  {key}: {segment.name} ({segment.from_place} to {segment.to_place}), {_studied(segment.studied)}"
            )
            by_function: dict[str, list[Route]] = {}
            for function, route in routes.get(key, ()):
                by_function.setdefault(function, []).append(route)
            for function, through in by_function.items():
                share = sum(route.usual_load for route in through)
                claims = [claim for claim in graph.claims_about(key, function) if claim.relation == "serves"]
                lines.append(f"    {function} {share:.2f} of it by {', '.join(route.key for route in through)}")
                lines.append(f"      signs: {'; '.join(signs_of.get(function, ['none']))}")
                lines.append(f"      claims: {_evidence(graph, claims)}")
            if not by_function:
                lines.append("    on no route")
    return "\n".join(lines).lstrip("\n")


def _routes_by_segment(graph: Graph) -> dict[str, list[tuple[str, Route]]]:
    routes: dict[str, list[tuple[str, Route]]] = {}
    for function in graph.functions.values():
        for route in function.routes:
            for key in dict.fromkeys(split_reference(reference)[0] for reference in route.chain):
                if key in graph.segments:
                    routes.setdefault(key, []).append((function.key, route))
    return routes


def _keys(claims: Iterable[Claim]) -> str:
    return ", ".join(f"-{claim.key}" if claim.stance == "disputes" else claim.key for claim in claims)


def _source_keys(claims: Iterable[Claim]) -> tuple[str, ...]:
    return tuple(dict.fromkeys(source for claim in claims for source in claim.sources))


def _evidence(graph: Graph, claims: Iterable[Claim]) -> str:
    told = []
    for claim in claims:
        stance = "disputes, " if claim.stance == "disputes" else ""
        sources = ", ".join(f"{source.key} [{source.checked}]" for source in graph.sources_of(claim))
        told.append(f"{claim.key} ({stance}{claim.grade}, {claim.kind}, {claim.population}: {sources})")
    return "; ".join(told) or "none"


def _studied(studied: str) -> str:
    if studied == "hardly":
        return "hardly studied (absence of evidence is not evidence of absence)"
    return f"{studied} studied"
