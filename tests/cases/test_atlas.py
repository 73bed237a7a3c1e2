"""The printable atlas: a page a pathway, everything on it escaped."""

from __future__ import annotations

import re

import numpy as np
import pytest
from small_graph import SMALL

from byway.knowledge.cases.atlas import atlas_html
from byway.knowledge.cases.atlas_pictures import course_views
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.loading import load_graph
from byway.knowledge.graph.overlays import parse_overlay

HEAD = "name: Ward\nauthor: A. Reader\ndate: 2026-12-01\n"


@pytest.fixture(scope="module")
def graph() -> Graph:
    """The small graph."""
    return load_graph(folder=SMALL)


def courses(graph: Graph) -> dict[str, np.ndarray]:
    """Waypoints in place of core lines, mirrored to the right."""
    lines = {}
    for key, segment in graph.segments.items():
        for element in graph.element_ids(key):
            lines[element] = np.array(segment.waypoints_mni) * ([-1, 1, 1] if element.endswith("right") else [1, 1, 1])
    return lines


def test_one_page_a_pathway(graph: Graph) -> None:
    """Every pathway, segment, function on a route and claim about it stands on the pathway's page, with sources."""
    html = atlas_html(graph, courses(graph))
    assert re.findall(r'data-pathway="(\w+)"', html) == list(graph.pathways)
    assert set(re.findall(r'data-segment="([\w.]+)"', html)) == set(graph.segments)
    page = html.partition('data-pathway="bow"')[2].partition("</section>")[0]
    assert "The bow does not serve the echo." in page
    assert 'class="against"' in page
    assert 'data-function="echo"' in page
    assert "absence of evidence is not evidence of absence" in page
    assert "no diagnosis" in html
    assert "Anatomy: template." in html


def test_course_on_three_slices(graph: Graph) -> None:
    """Three planes; the mirrored copy lies as far from the right edge as the left copy from the left."""
    views = course_views(courses(graph), graph.pathways["bow"].segments)
    assert [view.plane for view in views] == ["sagittal", "coronal", "axial"]
    axial = views[2]
    across = [[float(pair.split(",")[0]) for pair in line.points.split()] for line in axial.lines if line.width < 1]
    assert np.allclose(np.array(across[0]), axial.width - np.array(across[1]), atol=0.11)
    assert all(line.segment == "bow.long" for view in views for line in view.lines)


def test_nothing_is_fetched_and_nothing_runs(graph: Graph) -> None:
    """No address, no script; text from an overlay is shown as text."""
    evil = "<script>alert(1)</script><img src=x onerror=alert(1)>"
    overlay = parse_overlay(
        HEAD + f"change: {{claims: {{bow_not_for_echo: {{says: '{evil}'}}}}}}\n"
        f"dispute: {{segments: {{bow.long: {{reason: '{evil}'}}}}}}\n"
    )
    html = atlas_html(load_graph([overlay], folder=SMALL), courses(graph))
    assert "<script" not in html
    assert "<img" not in html
    assert html.count("&lt;script&gt;") == 2
    assert not re.search(r'(?:href|src)="(?!#|data:image/png)', html)
    assert "(Ward)" in html


def test_segment_without_course_is_still_printed(graph: Graph) -> None:
    """Where no course is known there is no picture, and the rest of the page stands."""
    html = atlas_html(graph, {})
    assert "<figure>" not in html
    assert set(re.findall(r'data-segment="([\w.]+)"', html)) == set(graph.segments)
