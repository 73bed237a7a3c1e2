"""What the editing panel tells the browser: keys to pick from, entries, differences as a picture, ranking, coverage."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np
import pandas as pd

from byway.knowledge.graph.content import KINDS, Content, Kind
from byway.knowledge.graph.emit import emit_yaml
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.layers import Change, Conflict
from byway.knowledge.graph.overlays import Entry, Overlay
from byway.knowledge.graph.records import Claim, Record, Segment, Sign, Source
from byway.knowledge.graph.references import split_reference
from byway.knowledge.graph.rivals import coverage_of_claims, coverage_of_pathways
from byway.widgets.wire import plain

__all__ = ["catalogue_of", "changes_told", "conflicts_told", "coverage_told", "entries_told", "picture_of", "rows_told"]

_MOST_NODES = 60


def catalogue_of(graph: Graph) -> dict[str, list[list[Any]]]:
    """Key and name of every record by kind, what overlays brought first; regions with the middle of their seeds."""
    told: dict[str, list[list[Any]]] = {}
    base = graph.layers[0]
    for kind in KINDS:
        rows: list[list[Any]] = []
        origins = {key: graph.origins.get((kind, key)) for key in graph.records(kind)}
        listed = sorted(origins, key=lambda key: (origin := origins[key]) is None or origin.layer == base)
        for key in listed:
            record = graph.records(kind)[key]
            row: list[Any] = [key, graph.name_of(key) if kind != "norm" else key]
            if kind == "region":
                row.append([round(float(x), 1) for x in np.mean(record.seeds_mni, axis=0)])  # type: ignore[attr-defined]
            rows.append(row)
        told[kind] = rows
    return dict(plain(told))


def entries_told(overlay: Overlay) -> list[dict[str, Any]]:
    """Entries of an overlay, in its order, with their text."""
    return [
        {
            "slot": list(entry.slot),
            "words": entry.words,
            "author": entry.author or overlay.author,
            "date": entry.date or overlay.date,
            "draft": entry.draft,
            "text": _text(entry),
        }
        for entry in overlay.entries
    ]


def _text(entry: Entry) -> str:
    block = entry.block()
    return emit_yaml(block) if block else ""


def conflicts_told(conflicts: Iterable[Conflict]) -> list[dict[str, Any]]:
    """Conflicts side by side."""
    return [
        {"kind": each.kind, "key": each.key, "field": each.field, "words": each.words,
         "first": _side(each.first, each.field), "second": _side(each.second, each.field),
         "slot": list(each.second.slot)}
        for each in conflicts
    ]  # fmt: skip


def _side(entry: Entry, field: str) -> str:
    if field:
        return emit_yaml({field: entry.body[field]})
    return f"{entry.words}\n{_text(entry)}"


def changes_told(changes: Iterable[Change]) -> list[dict[str, Any]]:
    """Differences in words, each with its slot."""
    return [{"action": each.action, "kind": each.kind, "key": each.key, "words": each.words} for each in changes]


def picture_of(changes: Sequence[Change], older: Content, newer: Content) -> dict[str, Any]:
    """Changed records and what they touch, as nodes in columns by kind and edges between them.

    Returns
    -------
    dict
        ``nodes`` (key, kind, name, ``how``: added, changed, retired, disputed or same), ``edges`` (from, to, how) and
        ``more``, the number of changed records that were left out.
    """
    how: dict[tuple[str, str], str] = {}
    for change in changes:
        how[change.kind, change.key] = "disputed" if change.action == "undisputed" else change.action
    shown = list(how)[:_MOST_NODES]
    nodes: dict[tuple[str, str], dict[str, str]] = {}
    edges: dict[tuple[tuple[str, str], tuple[str, str]], str] = {}
    for place in shown:
        _node(nodes, place, how, older, newer)
        kind, key = place
        now = {*_touching(newer, kind, key)}
        then = {*_touching(older, kind, key)}
        for other in sorted(now | then):
            _node(nodes, other, how, older, newer)
            state = "same" if other in now and other in then else "added" if other in now else "retired"
            if (other, place) not in edges:
                edges[place, other] = state
    return {
        "nodes": list(nodes.values()),
        "edges": [{"from": ":".join(a), "to": ":".join(b), "how": state} for (a, b), state in edges.items()],
        "more": len(how) - len(shown),
    }


def _node(
    nodes: dict[tuple[str, str], dict[str, str]], place: tuple[str, str], how: dict[tuple[str, str], str],
    older: Content, newer: Content,
) -> None:  # fmt: skip
    if place not in nodes:
        kind, key = place
        nodes[place] = {"id": ":".join(place), "kind": kind, "key": key, "how": how.get(place, "same"),
                        "name": _name(newer if _get(newer, kind, key) else older, kind, key)}  # fmt: skip


def _get(content: Content, kind: str, key: str) -> Record | None:
    return content.records(kind).get(key) if kind in KINDS else None


def _name(content: Content, kind: str, key: str) -> str:
    record = _get(content, kind, key)
    match record:
        case None:
            return key
        case Claim():
            return record.says
        case Source():
            return f"{record.authors} {record.year}"
        case Segment() if record.pathway in content.pathways:
            return f"{content.pathways[record.pathway].name} ({record.name})"
    return str(getattr(record, "name", key))


def _touching(content: Content, kind: str, key: str) -> list[tuple[str, str]]:
    """Records that a record names."""
    record = _get(content, kind, key)
    named: list[str] = []
    match record:
        case None:
            return []
        case Claim():
            named = [record.subject, record.object]
        case Segment():
            named = [split_reference(end)[0] for end in (record.from_place, record.to_place)]
        case Sign():
            named = [each.function for each in record.depends]
        case _:
            for route in getattr(record, "routes", ()):
                named += [split_reference(each)[0] for each in route.chain]
    found = [(other, name) for name in dict.fromkeys(named) if (other := _kind_of(content, name))]
    return [*found, *(("source", source) for source in getattr(record, "sources", ()))]


def _kind_of(content: Content, key: str) -> Kind | None:
    kinds: tuple[Kind, ...] = ("region", "segment", "pathway", "function", "sign")
    return next((kind for kind in kinds if key in content.records(kind)), None)


def rows_told(table: pd.DataFrame) -> list[dict[str, Any]]:
    """Rows of a table, for the browser."""
    return list(plain(table.to_dict("records")))


def coverage_told(graph: Graph) -> dict[str, Any]:
    """How well each pathway is borne out, thinnest first, and the claims that rest on one source or on memory."""
    pathways = coverage_of_pathways(graph).sort_values(["sources", "claims"], kind="stable")
    claims = coverage_of_claims(graph)
    weak = claims[claims["one_source"] | claims["memory_only"]] if len(claims) else claims
    columns = ["claim", "says", "grade", "sources", "one_source", "memory_only"]
    return {
        "pathways": rows_told(pathways),
        "claims": rows_told(weak[columns]) if len(weak) else [],
        "counts": {
            "claims": len(claims),
            "one_source": int(claims["one_source"].sum()) if len(claims) else 0,
            "memory_only": int(claims["memory_only"].sum()) if len(claims) else 0,
            "thin": int(pathways["thin"].sum()),
            "pathways": len(pathways),
        },
    }
