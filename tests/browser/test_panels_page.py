"""The panels' front ends in a real browser, each on a bare page."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from browser.bare import Bare
from browser.strings import INJECTIONS
from toy_explanation import TOY_FINDINGS, toy_explanation
from toy_graph import FUNCTIONS, SIGNS, toy_graph

from byway.knowledge.graph.graph import Graph
from byway.knowledge.reasoning.explain import Explanation
from byway.widgets import (
    AccountsPanel,
    BenchState,
    FindingsPanel,
    GraphPanel,
    HitsPanel,
    ProfilePanel,
    RoutesPanel,
    number_named,
)
from byway.widgets.accounts.own import OwnAccountPanel
from byway.widgets.accounts.remote import RemotePanel
from byway.widgets.accounts.steady import SteadyPanel
from byway.widgets.accounts.whatif import NOTHING, WhatIfPanel

PANELS = (HitsPanel, FindingsPanel, AccountsPanel, ProfilePanel, RoutesPanel, GraphPanel, WhatIfPanel, OwnAccountPanel,
          SteadyPanel, RemotePanel)  # fmt: skip
NUMBERS = "() => [...document.querySelectorAll('[data-name]')].map((n) => [n.dataset.name, Number(n.dataset.value)])"
NAMELESS = """() => [...document.querySelectorAll('button, input, select, [role=radiogroup]')].filter((e) => {
  const label = e.labels?.[0]?.textContent || e.getAttribute('aria-label') || e.title || e.textContent
    || document.getElementById(e.getAttribute('aria-labelledby'))?.textContent;
  return !label || !label.trim(); }).map((e) => e.outerHTML)"""
LOOSE = r"""() => {
  const told = '[data-name], option, output, .bw-cautions, .bw-necks, .bw-plain-list, .bw-prof-key, thead,'
    + '.bw-route-facts, .bw-remarks';
  const out = [];
  const walk = document.createTreeWalker(document.querySelector('.bw-body'), NodeFilter.SHOW_TEXT);
  while (walk.nextNode()) {
    const text = walk.currentNode.textContent;
    if (/\d+ %/.test(text) && !walk.currentNode.parentElement.closest(told)) out.push(text);
  }
  return out; }"""
HANDLERS = """() => [...document.querySelectorAll('main *')].flatMap((n) => n.getAttributeNames())
  .filter((name) => name.startsWith('on'))"""
OPEN_ALL = """() => { for (const d of document.querySelectorAll('details')) d.open = true;
  for (const b of document.querySelectorAll('.bw-card-head[aria-expanded=false]')) b.click(); }"""


def filled(panel: Any) -> Any:
    """The panel with something asked of it, where it would else show little."""
    if isinstance(panel, WhatIfPanel):
        panel.settings = {**NOTHING, "severed": ["frontal@left"]}
    elif isinstance(panel, OwnAccountPanel):
        panel.draft = {"title": "Own", "text": "why", "elements": ["arc.long@left"], "scenario": {"remote": "yes"}}
    elif isinstance(panel, SteadyPanel):
        panel.examine()
    return panel


class GraphScience:
    """Gives a graph, and reasons about nothing."""

    geometry = None
    names: dict[str, str] = {}  # noqa: RUF012 - nothing writes to it

    def __init__(self, graph: Graph) -> None:
        self.graph = graph

    def damage(self, lesion: object) -> None:
        """Nothing."""

    def explain(self, *_: object) -> tuple[None, None]:
        """Nothing."""
        return None, None


def toy_state(graph: Graph | None = None) -> BenchState:
    """A state with an explained toy case."""
    graph = graph or toy_graph()
    state = BenchState(science=GraphScience(graph))
    state.findings = TOY_FINDINGS
    state.explanation = toy_explanation(graph)
    return state


@pytest.fixture(scope="module")
def explanation() -> Explanation:
    """The toy case, explained."""
    return toy_explanation()


@pytest.mark.parametrize("dark", [False, True], ids=["light", "dark"])
@pytest.mark.parametrize("panel", PANELS)
def test_a_panel_draws(page: Any, panel: Any, dark: bool, artefacts: Path) -> None:
    """Each panel draws without an error, in both themes, shows the caution, and asks for nothing from any network."""
    bare = Bare(page, filled(panel(toy_state())), width=1000, dark=dark)
    page.evaluate(OPEN_ALL)
    assert page.locator(".bw-caution").is_visible()
    page.screenshot(path=artefacts / f"{panel.__name__}_{'dark' if dark else 'light'}.png", full_page=True)
    assert bare.errors == []
    assert page.strays == []


@pytest.mark.parametrize("panel", PANELS)
def test_every_control_has_a_name(page: Any, panel: Any) -> None:
    """Every button, input and list can be named by a screen reader, and the panel is a named region."""
    Bare(page, filled(panel(toy_state())))
    page.evaluate(OPEN_ALL)
    nameless = page.evaluate(NAMELESS)
    assert nameless == []
    assert page.locator("section.byway-panel[aria-label]").count() == 1


@pytest.mark.parametrize("panel", [p for p in PANELS if p is not GraphPanel])
def test_every_number_is_that_of_the_api(page: Any, panel: Any) -> None:
    """Each number on the screen says its name, and Python gives the same number under it."""
    state = toy_state()
    made = filled(panel(state))
    Bare(page, made)
    page.evaluate(OPEN_ALL)
    shown = page.evaluate(NUMBERS)
    assert len(shown) > 5
    for name, value in shown:
        own = getattr(made, "result", None)
        known = number_named(state.explanation, name, what_if=own, own=own, steady=own)
        assert value == pytest.approx(known, rel=1e-6, abs=1e-6), name


@pytest.mark.parametrize("panel", [HitsPanel, AccountsPanel, ProfilePanel, RoutesPanel, WhatIfPanel, OwnAccountPanel])
def test_no_number_goes_without_a_name(page: Any, panel: Any) -> None:
    """Every percentage on a panel stands in a node that names it (labels of choices and pictures apart)."""
    Bare(page, filled(panel(toy_state())))
    page.evaluate(OPEN_ALL)
    loose = page.evaluate(LOOSE)
    assert loose == []


def test_a_stroke_changes_rows_in_place(page: Any, explanation: Explanation) -> None:
    """New numbers for the hit list move and change the rows that are there; none is made anew."""
    panel = HitsPanel(explanation)
    Bare(page, panel)
    page.evaluate("() => document.querySelectorAll('.bw-hits-row').forEach((row) => { row.kept = true; })")
    values = np.frombuffer(panel.values, "<f4").reshape(-1, 5).copy()
    first = [row[0] for row in panel.elements].index("parietal@left")
    values[first, 0] = 0.99
    with panel.hold_sync():
        panel.values = values.tobytes()
        panel.stamp += 1
    page.wait_for_selector("[data-stamp='2']")
    rows = page.locator(".bw-hits-row")
    assert rows.first.get_attribute("data-element") == "parietal@left"
    assert page.evaluate("() => [...document.querySelectorAll('.bw-hits-row')].every((row) => row.kept)")


def test_intervals_that_are_awaited_say_so(page: Any, explanation: Explanation) -> None:
    """Where the interval is not known yet, none is shown, and a mark says that it is coming."""
    panel = HitsPanel(explanation)
    Bare(page, panel)
    values = np.frombuffer(panel.values, "<f4").reshape(-1, 5).copy()
    values[:, 1:3] = np.nan
    panel.values = values.tobytes()
    row = page.locator(".bw-hits-row").first
    assert row.locator(".bw-waiting").is_visible()
    assert row.locator(".bw-bar-reach").is_hidden()


def test_selecting_an_element_reaches_python(page: Any) -> None:
    """A click on an element's name selects it for the whole bench."""
    state = toy_state()
    bare = Bare(page, HitsPanel(state))
    page.locator("[data-element='arc.anterior@left'] button").click()
    bare.carry()
    assert state.selected == "arc.anterior@left"
    assert page.locator("[aria-current=true]").get_attribute("data-element") == "arc.anterior@left"


def test_a_search_looks_through_all_elements(page: Any, explanation: Explanation) -> None:
    """A search finds elements that are neither hit nor near, and says when it finds none."""
    Bare(page, HitsPanel(explanation))
    page.fill(".bw-search", "visual right")
    assert page.locator(".bw-hits-row").count() == 1
    page.fill(".bw-search", "no such place")
    assert "no such place" in page.locator(".bw-empty").inner_text()


def test_findings_by_mouse(page: Any) -> None:
    """A click on a grade records it; not tested takes it back."""
    state = toy_state()
    bare = Bare(page, FindingsPanel(state))
    page.click("[data-key=all]")
    page.evaluate(OPEN_ALL)
    sign = page.locator("[data-sign=amnesia]")
    sign.locator("[data-key=severe]").click()
    bare.carry()
    assert [f.grade for f in state.findings if f.sign == "amnesia"] == ["severe"]
    sign.locator("[data-key=not_tested]").click()
    bare.carry()
    assert not [f for f in state.findings if f.sign == "amnesia"]


def test_findings_by_keyboard(page: Any) -> None:
    """Arrow keys move through the grades of a sign, and each is recorded."""
    state = toy_state()
    bare = Bare(page, FindingsPanel(state))
    page.locator("[data-sign=repetition_loss] [aria-checked=true]").focus()
    page.keyboard.press("ArrowRight")
    bare.carry()
    assert [f.grade for f in state.findings if f.sign == "repetition_loss"] == ["severe"]


def test_a_finding_has_a_date(page: Any) -> None:
    """A date typed under a recorded sign reaches its finding, and changes no grade."""
    state = toy_state()
    bare = Bare(page, FindingsPanel(state))
    page.evaluate(OPEN_ALL)
    page.locator("[data-sign=repetition_loss] input[type=date]").fill("2026-11-03")
    page.locator("[data-sign=repetition_loss] input[type=date]").blur()
    bare.carry()
    (finding,) = (f for f in state.findings if f.sign == "repetition_loss")
    assert (finding.date, finding.grade) == ("2026-11-03", "moderate")


def test_keys_stay_in_the_panel(page: Any) -> None:
    """Keys typed into a search do not reach the notebook's shortcuts."""
    Bare(page, FindingsPanel(toy_state()))
    page.evaluate("() => { window.reached = 0; document.body.addEventListener('keydown', () => { reached += 1; }); }")
    page.locator(".bw-search").first.press_sequentially("dd")
    assert page.evaluate("reached") == 0


def test_cards_keep_what_is_open(page: Any) -> None:
    """After the accounts are weighed anew, the card and the ledger that were open still are."""
    state = toy_state()
    panel = AccountsPanel(state)
    Bare(page, panel)
    page.locator(".bw-card [data-part=ledger] summary").first.click()
    state.explanation = toy_explanation(damage={"arc.long@left": 0.6, "arc.anterior@left": 0.9})
    state.accounts_seq += 1
    key = page.evaluate("() => document.querySelector('[data-part=ledger][open]')?.closest('.bw-card').dataset.account")
    assert key is not None
    assert page.locator(f"[data-account='{key}'] .bw-card-body").is_visible()


def test_two_accounts_are_compared(page: Any) -> None:
    """The comparison lists every finding, and its differences are those of the two ledgers."""
    Bare(page, AccountsPanel(toy_state()))
    page.click("[data-key=compare]")
    assert page.locator(".bw-compare tbody tr").count() == len(TOY_FINDINGS) + 2


def test_routes_name_the_bottleneck(page: Any) -> None:
    """The chosen function shows its routes as bands, with a ring around what holds it back."""
    Bare(page, RoutesPanel(toy_state(), "repetition@dominant"), width=1000)
    assert page.locator(".bw-route-live").count() == 2
    assert page.locator(".bw-route-ring").count() == 2


def test_neighbourhood_by_keyboard(page: Any) -> None:
    """Arrow keys move between shelves and Enter makes the place the centre; Back returns."""
    state = toy_state()
    bare = Bare(page, GraphPanel(state, "repetition"), width=1100)
    page.locator(".bw-shelf-item[data-key='arc.long']").focus()
    page.keyboard.press("Enter")
    bare.carry()
    assert bare.panel.centre == "arc.long"
    page.keyboard.press("ArrowLeft")
    assert page.evaluate("document.activeElement.closest('.bw-shelf').className").endswith("bw-shelf-region")
    page.get_by_role("button", name="Back").click()
    bare.carry()
    assert bare.panel.centre == "repetition"


def test_filter_by_stance(page: Any) -> None:
    """With only disputes shown, only the disputed edge of a function is left."""
    Bare(page, GraphPanel(toy_state(), "repetition"), width=1100)
    page.locator("select").nth(2).select_option("disputes")
    assert page.locator(".bw-wire").count() == 1
    assert page.locator(".bw-wire.bw-disputed").count() == 1


@pytest.mark.parametrize("panel", PANELS)
def test_a_view_that_goes_takes_its_listeners(page: Any, panel: Any) -> None:
    """When the view is removed, the model has no listener left."""
    Bare(page, panel(toy_state()))
    page.evaluate("stop()")
    assert page.evaluate("Object.values(heard).reduce((n, calls) => n + calls.size, 0)") == 0


def poisoned_graph() -> Graph:
    """The toy graph with script-injection strings in every text that a user could have typed."""
    supply = iter(INJECTIONS * 20)
    clean = toy_graph(
        functions=tuple(f.model_copy(update={"name": next(supply), "description": next(supply)}) for f in FUNCTIONS),
        signs=tuple(s.model_copy(update={"name": next(supply), "examination": next(supply), "note": next(supply),
                                         "accuracy_source": next(supply)}) for s in SIGNS),
    )  # fmt: skip
    changed: dict[str, Any] = {
        "regions": {k: r.model_copy(update={"name": next(supply), "serves_in_words": next(supply)})
                    for k, r in clean.regions.items()},
        "segments": {k: s.model_copy(update={"name": next(supply), "serves_in_words": next(supply)})
                     for k, s in clean.segments.items()},
        "pathways": {k: p.model_copy(update={"name": next(supply), "disputed": next(supply)})
                     for k, p in clean.pathways.items()},
        "claims": {k: c.model_copy(update={"says": next(supply), "note": next(supply)})
                   for k, c in clean.claims.items()},
        "sources": {k: s.model_copy(update={"authors": next(supply), "title": next(supply), "doi": next(supply),
                                            "container": next(supply)}) for k, s in clean.sources.items()},
    }  # fmt: skip
    fields = {name: changed.get(name, getattr(clean, name)) for name in
              ("regions", "pathways", "segments", "functions", "signs", "claims", "sources", "norms")}  # fmt: skip
    return Graph(**fields)


@pytest.mark.parametrize("panel", PANELS)
def test_injected_scripts_stay_inert(page: Any, panel: Any) -> None:
    """A hundred script-injection strings, as names, claims, notes and sources, are shown as text and run nothing."""
    assert len(set(INJECTIONS)) == 100
    bare = Bare(page, filled(panel(toy_state(poisoned_graph()))), width=1100)
    before = page.evaluate("document.querySelectorAll('script').length")
    page.evaluate(OPEN_ALL)
    for key in ("all", "next", "compare", "wheel"):
        if page.locator(f".bw-option[data-key={key}]").count():
            page.locator(f".bw-option[data-key={key}]").first.click()
    for search in page.locator("input[type=search]").all():
        for text in INJECTIONS[:10]:
            search.fill(text)
            search.press("Enter")
    page.wait_for_timeout(150)
    assert page.evaluate("window.ran") is None
    assert page.evaluate("document.querySelectorAll('script').length") == before
    assert page.locator("main img, main iframe, main object, main embed, main link, main style, main form").count() == 0
    handlers = page.evaluate(HANDLERS)
    assert handlers == []
    assert page.strays == []
    assert bare.errors == []
