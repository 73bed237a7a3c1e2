"""The atlas of the graph: one HTML file, one page a pathway, to be printed and argued with."""

from __future__ import annotations

from collections.abc import Hashable, Mapping
from importlib.metadata import version
from importlib.resources import files
from pathlib import Path
from typing import Any

import jinja2
import numpy as np
from numpy.typing import NDArray

from byway.knowledge.atomic import write_text
from byway.knowledge.cases.atlas_pictures import INKS, course_views
from byway.knowledge.cases.desk import Desk
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.records import Claim, Pathway, Segment
from byway.knowledge.graph.references import split_reference
from byway.knowledge.graph.rivals import coverage_of_pathways
from byway.knowledge.graph.tables import SHOWN_ON
from byway.knowledge.words import section, word

__all__ = ["atlas_html", "write_atlas"]

Courses = Mapping[str, NDArray[np.floating]]


def atlas_html(graph: Graph, courses: Courses, anatomy: str = "template") -> str:
    """The atlas as HTML text that needs nothing beside itself.

    Parameters
    ----------
    graph : Graph
        What is printed; whatever an overlay added, changed or disputes says so.
    courses : mapping of element id to (n, 3) array
        Core line of each segment, MNI mm; a segment without one is printed without its course.
    anatomy : str
        Whose anatomy the courses rest on.
    """
    environment = jinja2.Environment(
        loader=jinja2.FunctionLoader(lambda name: files("byway.knowledge.cases").joinpath(name).read_text("utf-8")),
        autoescape=True,
        undefined=jinja2.StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    coverage = {str(row["pathway"]): row for row in coverage_of_pathways(graph).to_dict("records")}
    pages = [_page(graph, pathway, courses, coverage[pathway.key]) for pathway in graph.pathways.values()]
    cited = {key for _, _, record in graph.every_record() for key in getattr(record, "sources", ())}
    sources = sorted(
        (source for key, source in graph.sources.items() if key in cited), key=lambda s: (s.authors, s.year)
    )
    return environment.get_template("atlas.html").render(
        w=section("atlas"),
        pages=pages,
        sources=sources,
        counts=graph.counts(),
        layers=graph.layers,
        caution=word("command.caution"),
        anatomy=word("command.template_anatomy", whose=anatomy),
        version=version("byway"),
        graph_hash=graph.content_hash[:12],
    )


def write_atlas(desk: Desk, to: Path) -> Path:
    """Write the atlas of a desk's graph to a file, or to ``atlas.html`` in a folder that is there."""
    path = to / "atlas.html" if to.is_dir() else to
    anatomy = ", ".join(sorted(set(desk.template.geometry.anatomy)))
    write_text(path, atlas_html(desk.graph, desk.template.core_lines, anatomy))
    return path


def _page(graph: Graph, pathway: Pathway, courses: Courses, coverage: Mapping[Hashable, Any]) -> dict[str, Any]:
    keys = (pathway.key, *pathway.segments)
    claims = {claim.key: claim for key in keys for claim in (*graph.claims_about(key), *graph.claims_about(object=key))}
    return {
        "pathway": pathway,
        "layer": graph.origin("pathway", pathway.key).layer,
        "views": course_views(courses, pathway.segments),
        "segments": [_segment(graph, graph.segments[key], i, courses) for i, key in enumerate(pathway.segments)],
        "functions": _functions(graph, pathway),
        "claims": [_claim(graph, claim) for claim in claims.values()],
        "coverage": coverage,
    }


def _segment(graph: Graph, segment: Segment, number: int, courses: Courses) -> dict[str, Any]:
    ink, dash = INKS[number % len(INKS)]
    element = next((each for each in graph.element_ids(segment.key) if each in courses), None)
    length = float(np.linalg.norm(np.diff(courses[element], axis=0), axis=1).sum()) if element else None
    return {
        "it": segment,
        "ink": ink,
        "dash": dash,
        "length": length,
        "from": _place(graph, segment.from_place),
        "to": _place(graph, segment.to_place),
        "layer": graph.origin("segment", segment.key).layer,
        "disputes": graph.disputes.get(("segment", segment.key), ()),
    }


def _place(graph: Graph, reference: str) -> str:
    if reference.startswith("wm:"):
        return reference.removeprefix("wm:").replace("_", " ")
    key, side = split_reference(reference)
    return graph.name_of(key) + (f" ({side})" if side else "")


def _functions(graph: Graph, pathway: Pathway) -> list[dict[str, Any]]:
    rows: list[dict[str, Any]] = []
    for function in graph.functions.values():
        through = []
        for route in function.routes:
            met = [key for key in pathway.segments if key in {split_reference(each)[0] for each in route.chain}]
            if met:
                through.append((route, [graph.segments[key].name for key in met]))
        if through:
            signs = [
                (sign, dependence.weight, SHOWN_ON[sign.side_rule])
                for sign in graph.signs.values()
                for dependence in sign.depends
                if dependence.function == function.key
            ]
            rows.append({"it": function, "routes": through, "signs": signs})
    return rows


def _claim(graph: Graph, claim: Claim) -> dict[str, Any]:
    return {
        "it": claim,
        "sources": graph.sources_of(claim),
        "layer": graph.origin("claim", claim.key).layer,
        "disputes": graph.disputes.get(("claim", claim.key), ()),
    }
