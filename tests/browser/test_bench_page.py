"""The strip above the bench, its row of tabs, and what stands above the accounts, each on a bare page."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import pytest
from browser.bare import Bare
from browser.test_panels_page import toy_state
from toy_explanation import toy_explanation

from byway.knowledge.cases.case import Case
from byway.knowledge.cases.making import new_case
from byway.knowledge.words import section
from byway.widgets import AccountsPanel, BenchState
from byway.widgets.bench import DECK, BenchHead, _Tabs

REACHED = """() => [...document.querySelectorAll('.byway-tabs .bw-option')].filter((tab) => {
  const r = tab.getBoundingClientRect();
  return [r.left + 3, r.right - 3].every((x) => document.elementFromPoint(x, r.top + r.height / 2) === tab);
}).map((tab) => tab.dataset.key)"""


@pytest.mark.parametrize("width", [1000, 1200, 1600])
def test_every_tab_can_be_reached(page: Any, width: int) -> None:
    """At usual widths each tab is wholly in sight, Team too, and a click chooses it."""
    page.set_viewport_size({"width": width, "height": 800})
    tabs = _Tabs(words=section("bench"), names=list(DECK), shown=next(iter(DECK)))
    Bare(page, tabs, width=width - 40)
    assert page.evaluate(REACHED) == list(DECK)
    page.locator("[data-key=notes]").click()
    assert page.locator("[data-key=notes]").get_attribute("aria-checked") == "true"


@pytest.fixture
def case(tmp_path: Any) -> Case:
    """A new case without a title."""
    made: Case = new_case(tmp_path / "case")
    return made


def test_title_and_age_are_edited(page: Any, case: Case) -> None:
    """What is typed as title and chosen as age band reaches the case; an empty title is none."""
    state = BenchState(case)
    bare = Bare(page, BenchHead(state), width=1200)
    page.locator(".bw-case-input").fill("  Small infarct ")
    page.locator(".bw-case-input").blur()
    page.get_by_label("Age", exact=True).select_option("60-69")
    bare.carry()
    assert (state.case.spec.title, state.case.spec.person.age_band) == ("Small infarct", "60-69")
    page.get_by_label("Handedness").select_option("left")
    page.locator(".bw-case-input").fill("")
    page.locator(".bw-case-input").blur()
    bare.carry()
    assert state.case.spec.title is None
    assert (state.case.spec.person.age_band, state.case.spec.person.handedness) == ("60-69", "left")


def test_an_odd_age_band_is_kept(page: Any, case: Case) -> None:
    """A band that a file gives beside the ten-year ones is shown as it is."""
    person = {**case.spec.person.model_dump(), "age_band": "55-64"}
    Bare(page, BenchHead(BenchState(case.with_spec(person=person))), width=1200)
    assert page.get_by_label("Age", exact=True).input_value() == "55-64"


@dataclass(frozen=True)
class Remarking:
    """An explanation with remarks."""

    explanation: Any
    remarks: tuple[str, ...]

    def __getattr__(self, name: str) -> Any:
        return getattr(self.explanation, name)


def test_remarks_stand_above_the_accounts(page: Any) -> None:
    """Every remark is a note in words, as text; with findings entered, nothing says that there are none."""
    state = toy_state()
    state.explanation = Remarking(state.explanation, ("All weakness is on the lesion's own side.", "<b>two</b>"))
    Bare(page, AccountsPanel(state))
    assert page.locator(".bw-remarks .bw-remark").all_inner_texts() == list(state.explanation.remarks)
    assert page.locator("p.bw-remark", has_text="No finding is entered").is_hidden()


def test_without_findings_it_says_so(page: Any) -> None:
    """With no finding entered, the accounts say that they rest on the lesion alone."""
    state = toy_state()
    state.findings = ()
    state.explanation = toy_explanation(findings=())
    Bare(page, AccountsPanel(state))
    assert page.locator("p.bw-remark", has_text="No finding is entered").is_visible()
