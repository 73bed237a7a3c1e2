"""Building from an earlier build: the same geometry as without it, and only what changed is made."""

from __future__ import annotations

import numpy as np
import pytest

from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.loading import load_graph
from byway.knowledge.graph.records import Segment
from byway.knowledge.space import build
from byway.knowledge.space.atlas import Template, spread_by_key
from byway.knowledge.space.build import build_geometry, geometry_hash, sketch_segment
from byway.knowledge.space.geometry import Geometry
from byway.knowledge.space.reuse import Earlier


@pytest.fixture(scope="module")
def graph() -> Graph:
    """The curated graph."""
    return load_graph()


@pytest.fixture
def made(monkeypatch: pytest.MonkeyPatch) -> list[str]:
    """Keys of the segments that a build makes."""
    keys: list[str] = []
    make = build._both_sides

    def told(segment: Segment, *more: object) -> object:
        keys.append(segment.key)
        return make(segment, *more)  # type: ignore[arg-type]

    monkeypatch.setattr(build, "_both_sides", told)
    return keys


def earlier_of(graph: Graph, template: Template) -> Earlier:
    """The curated build."""
    return Earlier(graph.regions, graph.segments, template.geometry, template.core_lines)


def built(graph: Graph, segments: dict[str, Segment], earlier: Earlier | None) -> Geometry:
    """Geometry of all curated regions and some segments."""
    spread = dict.fromkeys((*graph.regions, *segments), 1.0)
    return build_geometry(graph.regions, segments, spread, progress=False, earlier=earlier)[0]


def new_segment(graph: Graph) -> Segment:
    """A second way from Wernicke's region to ventral premotor cortex."""
    like = graph.segments["arcuate_fasciculus.long_ventral"]
    points = ((-58.0, -38.0, 10.0), (-36.0, -24.0, 32.0), (-50.0, 4.0, 24.0))
    return like.model_copy(update={"key": "arcuate_fasciculus.another", "to_place": "premotor_ventral",
                                   "waypoints_mni": points})  # fmt: skip


def test_nothing_is_made_where_nothing_changed(graph: Graph, template: Template, made: list[str]) -> None:
    """The same records give the same arrays, without making a single bundle."""
    geometry, lines = build_geometry(graph.regions, graph.segments, spread_by_key(graph), progress=False,
                                     earlier=earlier_of(graph, template))  # fmt: skip
    assert made == []
    assert geometry.content_hash == template.geometry.content_hash
    for name in ("region_voxels", "points_mm", "streamline_offsets", "segment_offsets", "core", "spread_mm"):
        np.testing.assert_array_equal(getattr(geometry, name), getattr(template.geometry, name))
    for element, line in lines.items():
        np.testing.assert_array_equal(line, template.core_lines[element])


def test_a_new_segment_alone_is_made(graph: Graph, template: Template, made: list[str]) -> None:
    """One segment more: it is made, all others are lent, and it is what a build without loans makes of it."""
    new = new_segment(graph)
    segments = {**graph.segments, new.key: new}
    geometry = built(graph, segments, earlier_of(graph, template))
    assert made == [new.key]
    assert geometry.segment_ids[-2:] == (f"{new.key}@left", f"{new.key}@right")
    made.clear()
    pathway = {key: segment for key, segment in segments.items() if segment.pathway == new.pathway}
    plain = built(graph, pathway, None)
    assert made == list(pathway)
    for element in plain.segment_ids:
        ours = geometry.streamlines(geometry.segment_ids.index(element))
        theirs = plain.streamlines(plain.segment_ids.index(element))
        for one, other in zip(ours, theirs, strict=True):
            np.testing.assert_allclose(one, other, atol=1e-3)


def test_a_moved_segment_moves_those_that_it_hands_over_to(graph: Graph, template: Template, made: list[str]) -> None:
    """A changed waypoint makes the segment anew and those of its pathway that meet it, and no others."""
    key = "arcuate_fasciculus.posterior_indirect"
    old = graph.segments[key]
    points = [*old.waypoints_mni]
    middle = len(points) // 2
    points[middle] = (points[middle][0] + 2, points[middle][1], points[middle][2])
    moved = old.model_copy(update={"waypoints_mni": tuple(points)})
    built(graph, {**graph.segments, key: moved}, earlier_of(graph, template))
    assert key in made
    assert {each.partition(".")[0] for each in made} == {"arcuate_fasciculus"}


def test_words_and_spreads_make_nothing(graph: Graph, template: Template, made: list[str]) -> None:
    """A name or a spread is no geometry: nothing is made, and the hash tells a changed spread."""
    key = next(iter(graph.segments))
    renamed = {**graph.segments, key: graph.segments[key].model_copy(update={"name": "Another"})}
    spread = {**spread_by_key(graph), key: 9.0}
    geometry, _ = build_geometry(graph.regions, renamed, spread, progress=False, earlier=earlier_of(graph, template))
    assert made == []
    assert geometry.content_hash == geometry_hash(graph.regions, renamed, spread)
    assert geometry.content_hash != template.geometry.content_hash


def test_a_sketch_follows_its_waypoints(graph: Graph, template: Template) -> None:
    """A segment by itself: the core line that a build gives, a thin bundle where asked, ends in its regions."""
    new = new_segment(graph)
    geometry = template.geometry
    parcels = {element: geometry.parcel_voxels(i) for i, element in enumerate(geometry.region_ids)}
    line, bundle = sketch_segment(new, parcels, streamlines=20)
    assert bundle is not None
    assert len(bundle.streamlines) == 20
    np.testing.assert_allclose(line[[0, -1]], np.array(new.waypoints_mni)[[0, -1]], atol=1e-6)
    alone, none = sketch_segment(new, {}, streamlines=0)
    assert none is None
    np.testing.assert_array_equal(alone, line)
