"""Rival models and the coverage of knowledge: named sets of overlays, and how well each pathway is borne out."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pandas as pd

from byway.knowledge.graph.content import Content
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.layers import Change, diff
from byway.knowledge.graph.loading import base_content, graph_with
from byway.knowledge.graph.overlay_files import read_overlay
from byway.knowledge.graph.overlays import Overlay
from byway.knowledge.graph.records import Claim
from byway.knowledge.graph.tables import claim_table

__all__ = ["Model", "compare_models", "coverage_of_claims", "coverage_of_pathways", "model_from"]


@dataclass(frozen=True)
class Model:
    """A named way to see the graph: overlays in their order on the base."""

    name: str
    overlays: tuple[Overlay, ...] = ()

    def graph(self, base: Content | None = None) -> Graph:
        """The graph of this model, on the base that comes with the package or on another.

        Raises
        ------
        GraphError
            The overlays do not fit.
        """
        return graph_with(base or base_content(), self.overlays)


def model_from(name: str, overlays: Iterable[Overlay | Path | str] = ()) -> Model:
    """Name a set of overlays, given as values or as paths, as a model.

    Raises
    ------
    GraphError
        A path that is no overlay.
    """
    return Model(name, tuple(each if isinstance(each, Overlay) else read_overlay(each) for each in overlays))


def compare_models(first: Model, second: Model, base: Content | None = None) -> list[Change]:
    """What the second model says otherwise than the first, in words."""
    return diff(first.graph(base), second.graph(base))


def coverage_of_pathways(graph: Graph) -> pd.DataFrame:
    """How well each pathway is borne out.

    Returns
    -------
    DataFrame
        A row a pathway: pathway, name, kind, segments, studied (of its best studied segment), hardly (number of its
        segments that are hardly studied), claims (about the pathway or a segment of it), strong, moderate, weak
        (claims by grade), disputes (disputing claims and overlays' disputes), sources (different ones behind the
        claims), read_share (of those sources, NaN without any), one_source and memory_only (claims that rest on one
        source, on none that was read), thin (all of it hardly studied, or fewer than three sources), words.
    """
    rows: list[dict[str, Any]] = []
    order = ("well", "moderately", "hardly")
    for pathway in graph.pathways.values():
        keys = (pathway.key, *pathway.segments)
        claims = list({claim.key: claim for key in keys for claim in _about(graph, key)}.values())
        sources = {source.key: source for claim in claims for source in graph.sources_of(claim)}
        read = [source for source in sources.values() if source.checked == "read"]
        levels = [graph.segments[key].studied for key in pathway.segments]
        studied = min(levels, key=order.index, default="hardly")
        overlay_disputes = sum(len(graph.disputes.get(("claim", claim.key), ())) for claim in claims)
        thin = studied == "hardly" or len(sources) < 3
        rows.append(
            {
                "pathway": pathway.key,
                "name": pathway.name,
                "kind": pathway.kind,
                "segments": len(pathway.segments),
                "studied": studied,
                "hardly": levels.count("hardly"),
                "claims": len(claims),
                **{grade: sum(claim.grade == grade for claim in claims) for grade in ("strong", "moderate", "weak")},
                "disputes": sum(claim.stance == "disputes" for claim in claims) + overlay_disputes,
                "sources": len(sources),
                "read_share": len(read) / len(sources) if sources else float("nan"),
                "one_source": sum(len(claim.sources) == 1 for claim in claims),
                "memory_only": sum(all(s.checked == "memory" for s in graph.sources_of(claim)) for claim in claims),
                "thin": thin,
                "words": "thinly studied: absence of evidence is not evidence of absence" if thin else "",
            }
        )
    return pd.DataFrame(rows)


def coverage_of_claims(graph: Graph) -> pd.DataFrame:
    """The table of claims with two more columns: one_source, and memory_only (no source of it was read)."""
    table = claim_table(graph)
    if table.empty:
        return table.assign(one_source=[], memory_only=[])
    return table.assign(one_source=table["read"] + table["memory"] == 1, memory_only=table["read"] == 0)


def _about(graph: Graph, key: str) -> tuple[Claim, ...]:
    return (*graph.claims_about(key), *graph.claims_about(object=key))
