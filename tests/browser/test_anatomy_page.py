"""Along the course and whose anatomy, in a real browser, on an invented person's own bundles."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from browser.bare import Bare
from own_case import LONG, MIDDLE, own_case
from toy_explanation import toy_explanation

from byway.knowledge.cases.case import Case
from byway.knowledge.cases.explaining import desk_of
from byway.knowledge.space.atlas import Template
from byway.widgets import BenchState, HitsPanel, number_named
from byway.widgets.anatomy import AlongPanel, AnatomiesPanel
from byway.widgets.state.live import LiveScience

NUMBERS = "() => [...document.querySelectorAll('[data-name]')].map((n) => [n.dataset.name, Number(n.dataset.value)])"


@pytest.fixture(scope="module")
def case(template: Template, tmp_path_factory: pytest.TempPathFactory) -> Case:
    """The case with its own bundles."""
    return own_case(tmp_path_factory.mktemp("own") / "case", template)


@pytest.fixture
def state(case: Case) -> Iterator[BenchState]:
    """A settled state of the case, its long segment pointed out; a state each, for pages come and go."""
    state = BenchState(case, LiveScience(desk_of(case, progress=False), draws=10))
    state.settle()
    state.selected = LONG
    yield state
    state.close()


@pytest.mark.parametrize("dark", [False, True], ids=["light", "dark"])
@pytest.mark.parametrize("panel", [AlongPanel, AnatomiesPanel, HitsPanel])
def test_a_panel_draws(page: Any, state: BenchState, panel: Any, dark: bool, artefacts: Path) -> None:
    """Each draws without an error in both themes, with the caution, and asks for nothing from any network."""
    bare = Bare(page, panel(state), width=1000, dark=dark)
    assert page.locator(".bw-caution").is_visible()
    page.screenshot(path=artefacts / f"{panel.__name__}_own_{'dark' if dark else 'light'}.png", full_page=True)
    assert bare.errors == []
    assert page.strays == []


@pytest.mark.parametrize("panel", [AlongPanel, AnatomiesPanel])
def test_every_number_is_that_of_the_api(page: Any, state: BenchState, panel: Any) -> None:
    """Each number on the screen says its name, and Python gives the same number under it."""
    made = panel(state)
    Bare(page, made, width=1000)
    page.evaluate("() => { for (const d of document.querySelectorAll('details')) d.open = true; }")
    page.wait_for_timeout(50)
    shown = page.evaluate(NUMBERS)
    assert len(shown) > (50 if panel is AlongPanel else 14)
    for name, value in shown:
        known = number_named(state.explanation, name, along=getattr(made, "profile", None),
                             anatomies=getattr(made, "table", None))  # fmt: skip
        assert value == pytest.approx(known, rel=1e-6, abs=1e-6), name


def test_the_chart_draws_both_courses(page: Any, state: BenchState) -> None:
    """The own course is hatched, the template's dotted behind it; the sentence names both ends."""
    bare = Bare(page, AlongPanel(state), width=900)
    assert page.locator("svg.bw-along-chart polygon.bw-along-hit").count() == 1
    assert page.locator("svg.bw-along-chart polyline.bw-along-usual").count() == 1
    assert page.locator("svg.bw-along-chart polyline.bw-along-mean").count() == 1
    titles = " ".join(page.locator(".bw-along-axis").all_inner_texts())
    assert all(end in titles for end in bare.panel.course["ends"])
    assert "P-07" in page.locator(".byway-along").inner_text()


def test_choosing_a_segment_points_it_out(page: Any, state: BenchState) -> None:
    """The list selects for the whole bench, and the chart follows."""
    bare = Bare(page, AlongPanel(state), width=900)
    other = next(item["id"] for item in bare.panel.choices if item["id"] != LONG)
    page.select_option("select", other)
    bare.carry()
    assert state.selected == bare.panel.course["id"] == other


def test_a_click_in_the_comparison_points_out(page: Any, state: BenchState) -> None:
    """The element's name selects it for the whole bench."""
    bare = Bare(page, AnatomiesPanel(state), width=900)
    page.locator(f"[data-element='{MIDDLE}'] button").click()
    bare.carry()
    assert state.selected == MIDDLE


def test_own_elements_are_marked_where_the_column_is_folded(page: Any, state: BenchState) -> None:
    """In a narrow hit list, the name of the anatomy stands beside the element."""
    Bare(page, HitsPanel(state), width=520)
    page.fill(".bw-search", "arcuate ventral")
    row = page.locator(f".bw-hits-row[data-element='{LONG}']")
    assert row.locator(".bw-hits-own").inner_text() == "P-07"
    assert row.locator(".bw-hits-anatomy").is_hidden()


@pytest.mark.parametrize("panel", [AlongPanel, AnatomiesPanel])
def test_without_own_anatomy_it_says_so(page: Any, panel: Any) -> None:
    """On an explanation alone there is one sentence, and no empty table or chart."""
    bare = Bare(page, panel(toy_explanation()))
    assert page.locator(".bw-empty").is_visible()
    assert page.locator("table:visible, svg.bw-along-chart:visible").count() == 0
    assert bare.errors == []


@pytest.mark.parametrize("panel", [AlongPanel, AnatomiesPanel])
def test_a_view_that_goes_takes_its_listeners(page: Any, state: BenchState, panel: Any) -> None:
    """When the view is removed, the model has no listener left."""
    Bare(page, panel(state))
    page.evaluate("stop()")
    assert page.evaluate("Object.values(heard).reduce((n, calls) => n + calls.size, 0)") == 0
