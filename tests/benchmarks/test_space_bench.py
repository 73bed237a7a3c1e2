"""How long geometry takes: a build beside a load, profiles, and damage as segments multiply. Prints; asserts no time.

Run alone for figures worth quoting: ``python -m pytest tests/benchmarks/test_space_bench.py -s``.
"""

from __future__ import annotations

import sys
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from ratios import note, seconds

from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.damage.point import point_damage
from byway.knowledge.damage.profile import course_profile
from byway.knowledge.graph.loading import load_graph
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.lesion.shapes import sphere_mask
from byway.knowledge.space.atlas import Template, load_template
from byway.knowledge.space.geometry import Geometry


def with_segments(geometry: Geometry, count: int) -> Geometry:
    """The first segments, repeated under other ids until there are ``count``."""
    lines, core, bounds, ids = [], [], [0], []
    for number in range(count):
        source = number % len(geometry.segment_ids)
        own = geometry.streamlines(source)[:50]
        first = geometry.segment_offsets[source]
        lines += own
        core.append(geometry.core[first : first + len(own)])
        bounds.append(bounds[-1] + len(own))
        ids.append(f"copy.{number}@left")
    return replace(
        geometry,
        segment_ids=tuple(ids),
        points_mm=np.concatenate(lines),
        streamline_offsets=np.concatenate([[0], np.cumsum([len(line) for line in lines])]),
        segment_offsets=np.array(bounds),
        core=np.concatenate(core),
        streamline_weights=np.ones(len(lines), np.float32),
        spread_mm=np.ones(len(geometry.region_ids) + count, np.float32),
        anatomy=("copy",) * (len(geometry.region_ids) + count),
    )


@pytest.mark.skipif("test_space_bench" not in " ".join(sys.argv), reason="half a minute; run this file by itself")
def test_building_beside_loading(benchmark, capsys, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Seconds of one build (the aim is below 60 on two cores) and of a load (below 0.7), and their ratio."""
    graph = load_graph()
    monkeypatch.setenv("BYWAY_CACHE", str(tmp_path))
    build = seconds(lambda: load_template(graph, progress=False), 1)
    load = seconds(lambda: load_template(graph, progress=False))
    benchmark.pedantic(lambda: load_template(graph, progress=False), rounds=3)
    note(benchmark, capsys, "geometry, seconds", build=build, load=load, ratio=build / load)


def test_damage_of_a_thousand_segments_beside_a_hundred(benchmark, capsys, template: Template) -> None:
    """Ten times the segments take at most about ten times as long: the ratio of times over the ratio of segments."""
    lesion = Lesion.from_mask(sphere_mask((-35, -10, 25), 19.3))
    times = {}
    for count in (100, 1000):
        index = DamageIndex.build(with_segments(template.geometry, count))
        point_damage(lesion, index)
        times[count] = seconds(lambda index=index: point_damage(lesion, index).share, 5)
    benchmark.pedantic(lambda: point_damage(lesion, index).share, rounds=3)
    growth = times[1000] / times[100]
    note(benchmark, capsys, "damage", ms_100=1e3 * times[100], ms_1000=1e3 * times[1000], growth_over_10=growth / 10)


def test_along_course_profile(benchmark, capsys, template: Template) -> None:
    """Milliseconds of the profile of the longest association segment."""
    lesion = Lesion.from_mask(sphere_mask((-35, -10, 25), 19.3))
    key = "inferior_fronto_occipital.ventral_deep"
    best = seconds(lambda: course_profile(lesion, template, key, "left"))
    benchmark.pedantic(lambda: course_profile(lesion, template, key, "left"), rounds=3)
    note(benchmark, capsys, "profile", ms=1e3 * best)
