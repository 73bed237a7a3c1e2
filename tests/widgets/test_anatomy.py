"""Along the course and whose anatomy: the panels' Python halves on an invented person's own bundles."""

from __future__ import annotations

import json
from types import SimpleNamespace

import numpy as np
import pytest
from own_case import LONG, MIDDLE, own_case
from toy_explanation import toy_explanation

from byway.knowledge.cases.explaining import desk_of
from byway.knowledge.damage.profile import course_profile
from byway.knowledge.faults import BywayError
from byway.knowledge.space.atlas import Template
from byway.widgets import BenchState, HitsPanel, number_named
from byway.widgets.anatomy import AlongPanel, AnatomiesPanel
from byway.widgets.bench import DECK, BenchHead
from byway.widgets.panel import whose_of
from byway.widgets.state.live import LiveScience


@pytest.fixture(scope="module")
def state(template: Template, tmp_path_factory: pytest.TempPathFactory) -> BenchState:
    """A bench state of the case with its own bundles, settled."""
    case = own_case(tmp_path_factory.mktemp("own") / "case", template)
    state = BenchState(case, LiveScience(desk_of(case, progress=False), draws=10))
    state.settle()
    yield state
    state.close()


def test_the_profile_is_that_of_the_api(state: BenchState) -> None:
    """The panel shows the segment that is pointed out, on the person's own bundle, the template's behind it."""
    state.selected = LONG
    panel = AlongPanel(state)
    wanted = course_profile(state.lesion, state.science.geometry, LONG)
    np.testing.assert_array_equal(panel.profile.to_numpy(), wanted.to_numpy())
    course = panel.course
    assert course["anatomy"] == "P-07"
    assert len(course["usual"]["share_hit"]) > 20
    assert max(course["usual"]["share_hit"]) > max(course["bins"]["share_hit"])
    for fact, value in course["facts"].items():
        assert number_named(None, f"along/{LONG}/{fact}", along=panel.profile) == pytest.approx(value)
    assert number_named(None, f"along/{LONG}/bins/3/share_hit", along=panel.profile) == wanted.share_hit[3]
    with pytest.raises(BywayError, match="no number has this name"):
        number_named(None, f"along/{MIDDLE}/length_mm", along=panel.profile)
    json.dumps(course, allow_nan=False)
    panel.close()


def test_a_region_leaves_the_most_severed_segment(state: BenchState) -> None:
    """Where a region is pointed out, the segment that is severed most is shown; its ends are named."""
    state.selected = "sma@left"
    panel = AlongPanel(state)
    geometry = state.damage.index.geometry
    first = len(geometry.region_ids)
    most = geometry.element_ids[first + int(np.argmax(state.damage.share[first:]))]
    assert panel.course["id"] == panel.choices[0]["id"] == most
    assert all(panel.course["ends"])
    assert "usual" not in panel.course or panel.course["anatomy"] != "template"
    panel.close()


def test_template_and_own_side_by_side(state: BenchState) -> None:
    """A row an own element, with the numbers of the API; whose anatomy stands above."""
    panel = AnatomiesPanel(state)
    assert {row["element"] for row in panel.rows} == {LONG, MIDDLE}
    assert panel.rows[0]["element"] == LONG
    assert panel.rows[0]["difference"] < -0.3
    assert "P-07 (2 elements)" in panel.whose
    name = f"anatomies/{LONG}/own_share"
    assert number_named(None, name, anatomies=panel.table) == panel.rows[0]["own_share"]
    share = state.damage.share[state.damage.index.geometry.index_of[LONG]]
    assert panel.rows[0]["own_share"] == pytest.approx(float(share))
    panel.close()


def test_the_hit_list_and_the_head_say_whose(state: BenchState) -> None:
    """Own elements carry the name in the hit list; the strip above names all anatomies in use."""
    hits = HitsPanel(state)
    whose = {row[0]: row[4] for row in hits.elements}
    assert whose[LONG] == "P-07"
    assert whose["sma@left"] == "template"
    head = BenchHead(state)
    assert head.told["whose"].startswith("P-07 (2 elements) and the template's, not this person's")
    hits.close()
    head.close()


@pytest.mark.parametrize("panel", [AlongPanel, AnatomiesPanel])
def test_nothing_to_show(panel: type) -> None:
    """On an empty state, and on an explanation without geometry, the panel opens and shows nothing."""
    for source in (BenchState(), toy_explanation()):
        made = panel(source)
        assert made.stamp == 1
        assert not getattr(made, "rows", None)
        assert not getattr(made, "course", None)
        made.close()


def test_whose_of_a_lone_explanation() -> None:
    """Without damage at hand, the explanation's own column tells; without either, nothing is said."""
    assert whose_of(BenchState()) == ""
    state = BenchState()
    state.explanation = toy_explanation()
    assert whose_of(state) == "the template's, not this person's"


def test_both_are_on_the_bench() -> None:
    """The deck offers both views."""
    assert {"along", "anatomies"} <= set(DECK)
    assert SimpleNamespace(**{name: panel for name, (_, panel) in DECK.items()}).along == "AlongPanel"
