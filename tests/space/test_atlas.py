"""Look-ups by key and side, and loading from the cache."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from byway.knowledge.faults import BywayError
from byway.knowledge.graph.graph import Graph
from byway.knowledge.space import atlas
from byway.knowledge.space.atlas import Template, load_template
from byway.knowledge.space.cache import cache_folder


def test_look_ups_by_key_and_side(template: Template) -> None:
    """Sides, streamlines, core lines and parcels are found by key and side, or by a whole element id."""
    assert template.sides("corpus_callosum.rostrum") == ("midline",)
    assert template.sides("sma") == ("left", "right")
    assert template.element("slf_1.dorsal_medial@left") == "slf_1.dorsal_medial@left"
    assert template.core_line("slf_1.dorsal_medial", "left").shape[1] == 3
    assert len(template.streamlines("corpus_callosum.rostrum")) >= 200
    parcel = template.parcel("sma", "right")
    assert parcel.shape == template.geometry.grid.shape
    assert parcel.sum() == len(template.geometry.parcel_voxels(template.geometry.region_ids.index("sma@right")))


@pytest.mark.parametrize(
    ("ask", "message"),
    [
        (lambda t: t.sides("smaa"), "smaa: no such region or segment; did you mean sma"),
        (lambda t: t.streamlines("slf_1.dorsal_medial"), "side None; expected left or right"),
        (lambda t: t.streamlines("corpus_callosum.rostrum", "left"), "side left; expected midline"),
        (lambda t: t.streamlines("sma", "left"), "a region; expected a segment"),
        (lambda t: t.parcel("slf_1.dorsal_medial", "left"), "a segment; expected a region"),
    ],
)
def test_wrong_asks_are_told(template: Template, ask: object, message: str) -> None:
    """An unknown key, a side that is missing or not there, or the wrong kind raises and names what would be right."""
    with pytest.raises(BywayError, match=message):
        ask(template)  # type: ignore[operator]


def test_loading_again_reads_the_cache(template: Template, graph: Graph, monkeypatch: pytest.MonkeyPatch) -> None:
    """With the entry in place nothing is built, and the geometry is the same."""

    def never(*_: object, **__: object) -> None:
        raise AssertionError("built although it is cached")

    monkeypatch.setattr(atlas, "build_geometry", never)
    again = load_template(graph, progress=False)
    assert again.geometry.content_hash == template.geometry.content_hash
    np.testing.assert_array_equal(again.geometry.points_mm, template.geometry.points_mm)
    assert again.geometry.segment_ids == template.geometry.segment_ids


def test_the_cache_may_vanish_or_break_at_any_time(
    template: Template, graph: Graph, monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    """An empty cache builds; a cut entry builds again; a template in use survives the loss of its files."""
    built = []

    def instead(*_: object, **__: object) -> tuple[object, object]:
        built.append(True)
        return template.geometry, template.core_lines

    monkeypatch.setenv("BYWAY_CACHE", str(tmp_path))
    monkeypatch.setattr(atlas, "build_geometry", instead)
    load_template(graph, progress=False)
    loaded = load_template(graph, progress=False)
    assert len(built) == 1
    entry = next(cache_folder().iterdir())
    (entry / "core.npy").write_bytes(b"cut")
    load_template(graph, progress=False)
    assert len(built) == 2
    for file in entry.iterdir():
        file.unlink()
    np.testing.assert_array_equal(loaded.geometry.points_mm, template.geometry.points_mm)
