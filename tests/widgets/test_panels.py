"""The panels' Python halves: what they send, and what they do with what they hear."""

from __future__ import annotations

import json
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest
from toy_explanation import TOY_FINDINGS, toy_explanation
from toy_graph import toy_graph

from byway.knowledge.cases.pages import Pages
from byway.knowledge.faults import BywayError
from byway.knowledge.reasoning.explain import Explanation
from byway.knowledge.reasoning.findings import Finding
from byway.widgets import AccountsPanel, FindingsPanel, GraphPanel, HitsPanel, ProfilePanel, RoutesPanel, number_named
from byway.widgets.accounts.own import OwnAccountPanel
from byway.widgets.accounts.remote import RemotePanel
from byway.widgets.accounts.steady import SteadyPanel
from byway.widgets.accounts.whatif import NOTHING, WhatIfPanel
from byway.widgets.panel import Panel, state_of
from byway.widgets.state import BenchState

PANELS = (HitsPanel, FindingsPanel, AccountsPanel, ProfilePanel, RoutesPanel, GraphPanel, WhatIfPanel, OwnAccountPanel,
          SteadyPanel, RemotePanel)  # fmt: skip


@pytest.fixture(scope="module")
def explanation() -> Explanation:
    """A toy case, explained."""
    return toy_explanation()


class ToyScience:
    """Answers with the toy graph, and with an explanation of whatever findings there are."""

    def __init__(self) -> None:
        self.graph = toy_graph()
        self.geometry = None
        self.names: dict[str, str] = {}

    def damage(self, lesion: object) -> None:
        """None: the toy has no geometry."""

    def explain(self, lesion: object, damage: object, case: object, findings: object, check: object) -> tuple:
        """Not asked where there is no damage."""
        return None, None


def state_with(explanation: Explanation) -> BenchState:
    """A state that holds the toy case."""
    state = BenchState(science=ToyScience())
    state.findings = TOY_FINDINGS
    state.explanation = explanation
    return state


@pytest.mark.parametrize("panel", PANELS)
def test_each_panel_stands_alone_on_an_explanation(panel: type[Panel], explanation: Explanation) -> None:
    """Given what `explain` returns, every panel shows something, with its labels and the caution."""
    made = panel(explanation)
    assert made.stamp >= 1
    assert "no diagnosis" in made.words["caution"]
    made.close()


@pytest.mark.parametrize("panel", PANELS)
def test_each_panel_opens_on_an_empty_state(panel: type[Panel]) -> None:
    """With no case, no graph and no explanation, a panel opens and shows nothing."""
    panel(BenchState()).close()


@pytest.mark.parametrize("panel", PANELS)
def test_what_is_sent_is_plain_json(panel: type[Panel], explanation: Explanation) -> None:
    """Every trait but the binary ones is JSON without NaN, so that any browser can read it."""
    made = panel(state_with(explanation))
    for name in made.keys:
        value = getattr(made, name)
        if not name.startswith("_") and name not in ("layout", "tabbable", "tooltip") and not isinstance(value, bytes):
            json.dumps(value, allow_nan=False)
    made.close()


def test_a_panel_takes_nothing_else() -> None:
    """A path or a number is refused by name."""
    with pytest.raises(TypeError, match="not int"):
        state_of(3)


def test_a_closed_panel_listens_no_more(explanation: Explanation) -> None:
    """After close, a change of the state leaves the panel as it was."""
    state = state_with(explanation)
    panel = AccountsPanel(state)
    panel.close()
    stamp = panel.stamp
    state.accounts_seq += 1
    assert panel.stamp == stamp


def test_selection_is_shared(explanation: Explanation) -> None:
    """An element selected on one panel is selected on the others."""
    state = state_with(explanation)
    hits, routes = HitsPanel(state), RoutesPanel(state)
    hits.selected = "arc.long@left"
    assert routes.selected == state.selected == "arc.long@left"


def test_hits_send_five_numbers_an_element(explanation: Explanation) -> None:
    """The buffer holds float32 rows in the order of the element list, equal to the damage table."""
    panel = HitsPanel(explanation)
    values = np.frombuffer(panel.values, "<f4").reshape(-1, 5)
    wanted = explanation.damage[["share", "low", "high", "overlap_ml", "clearance_mm"]].to_numpy(np.float32)
    np.testing.assert_array_equal(values, wanted)
    assert [row[0] for row in panel.elements] == list(explanation.damage["element"])


def test_hits_wait_for_intervals_after_an_edit() -> None:
    """Right after an edit the shares are there and the intervals are not known, rather than old."""
    state = BenchState(science=ToyScience())
    panel = HitsPanel(state)
    geometry = SimpleNamespace(element_ids=("a@left", "b.c@left"), region_ids=("a@left",), anatomy=("template",) * 2)
    state.damage = SimpleNamespace(index=SimpleNamespace(geometry=geometry), share=np.array([0.5, 0.0], np.float32),
                                   overlap_ml=np.array([1.0, 0.0]), clearance_mm=np.array([-2.0, 7.0]))  # fmt: skip
    state.damage_seq += 1
    values = np.frombuffer(panel.values, "<f4").reshape(-1, 5)
    assert values[0, 0] == 0.5
    assert np.isnan(values[:, 1:3]).all()
    assert panel.elements[1][1] == "segment"


class TestFindings:
    """The findings panel records; absent, present and not tested stay three different things."""

    @pytest.fixture
    def state(self, explanation: Explanation) -> BenchState:
        """A state with the toy's findings."""
        return state_with(explanation)

    def test_every_sign_and_side_is_offered(self, state: BenchState) -> None:
        """The list holds all sign ids of the graph."""
        panel = FindingsPanel(state)
        offered = {f"{sign['key']}@{side}" for sign in panel.signs for side in sign["sides"]}
        assert offered == set(state.science.graph.sign_ids())

    def test_a_grade_is_recorded(self, state: BenchState) -> None:
        """A grade chosen in the browser becomes a finding of the state, and no other changes."""
        panel = FindingsPanel(state)
        panel._heard(None, {"kind": "finding", "sign": "hand_weakness", "side": "right", "grade": "severe"}, [])
        assert panel.findings["hand_weakness@right"]["grade"] == "severe"
        assert len(state.findings) == 3

    def test_not_tested_removes(self, state: BenchState) -> None:
        """Not tested takes the finding away; it is no grade."""
        panel = FindingsPanel(state)
        panel._heard(None, {"kind": "finding", "sign": "hand_weakness", "side": "right", "grade": "not_tested"}, [])
        assert "hand_weakness@right" not in panel.findings

    def test_test_date_and_author_survive_a_new_grade(self, state: BenchState) -> None:
        """Changing the grade keeps how, when and by whom."""
        state.findings = (Finding("amnesia", "none", "mild", "word list", "2026-11-03", "AB"),)
        panel = FindingsPanel(state)
        panel._heard(None, {"kind": "finding", "sign": "amnesia", "side": "none", "grade": "severe"}, [])
        assert state.findings[0].date == "2026-11-03"

    def test_how_when_and_by_whom(self, state: BenchState) -> None:
        """Test, date and author can be given; an empty one is none."""
        panel = FindingsPanel(state)
        told = {"kind": "finding", "sign": "repetition_loss", "side": "none", "grade": "moderate"}
        panel._heard(None, {**told, "test": "sentences", "date": "2026-11-03", "by": ""}, [])
        (finding,) = (f for f in state.findings if f.sign == "repetition_loss")
        assert (finding.test, finding.date, finding.by) == ("sentences", "2026-11-03", None)

    @pytest.mark.parametrize("bad", [{"grade": "huge"}, {"side": "up"}, {"grade": None}])
    def test_a_bad_message_changes_nothing(self, state: BenchState, bad: dict[str, str]) -> None:
        """A grade or side that does not exist becomes a notice; the findings hold."""
        panel = FindingsPanel(state)
        panel._heard(None, {"kind": "finding", "sign": "amnesia", "side": "none", "grade": "mild"} | bad, [])
        assert state.findings == TOY_FINDINGS
        assert state.notice
        assert set(panel.findings) == {f.sign_id for f in TOY_FINDINGS}


class TestAccounts:
    """The cards say what the API says."""

    def test_ledgers_sum_to_the_odds(self, explanation: Explanation) -> None:
        """The last column of each card's ledger sums to the logarithm of its odds against the plain reading."""
        for account in AccountsPanel(explanation).told["accounts"]:
            assert account["ledger_sum"]["vs_cortical"] == pytest.approx(np.log(account["odds_vs_cortical"]), abs=1e-6)

    def test_posteriors_and_the_rest_sum_to_one(self, explanation: Explanation) -> None:
        """What is shown and what is left to others make 1."""
        told = AccountsPanel(explanation).told
        assert sum(a["posterior"] for a in told["accounts"]) + told["other_posterior"] == pytest.approx(1.0)

    def test_every_finding_is_explained_or_left(self, explanation: Explanation) -> None:
        """Each present finding stands in exactly one of the two lists of each card."""
        for account in AccountsPanel(explanation).told["accounts"]:
            listed = [sign["sign"] for sign in (*account["explains"], *account["leaves"])]
            assert sorted(listed) == ["repetition_loss"]

    def test_disputes_are_shown_with_their_sources(self, explanation: Explanation) -> None:
        """A claim against has its sources, and whether they were read."""
        against = [c for a in AccountsPanel(explanation).told["accounts"] for c in a["claims_against"]]
        assert against
        assert against[0]["sources"][0]["checked"] == "memory"


class TestRoutes:
    """The network of a function under the damage as drawn and under an account."""

    def test_flows_sum_to_the_capacity(self, explanation: Explanation) -> None:
        """What the routes carry now adds up to the capacity shown."""
        net = RoutesPanel(explanation, "repetition@dominant").net
        assert sum(route["now"] for route in net["routes"]) == pytest.approx(net["capacity"], abs=1e-3)

    def test_the_cut_is_ringed(self, explanation: Explanation) -> None:
        """The two cut segments hold repetition back, and nothing else is marked."""
        net = RoutesPanel(explanation, "repetition@dominant").net
        assert {node["id"] for node in net["nodes"] if node["held"]} == {"arc.long@left", "arc.anterior@left"}

    def test_an_unknown_function_is_replaced(self, explanation: Explanation) -> None:
        """A function that the graph does not have gives way to the one that is held back most."""
        panel = RoutesPanel(explanation, "juggling@left")
        assert panel.chosen == panel.choices[0]["id"]


class TestNumbers:
    """Numbers by name."""

    def test_numbers_are_found(self, explanation: Explanation) -> None:
        """A name leads to the number of the API."""
        assert number_named(explanation, "accounts/0/posterior") == explanation.accounts[0].posterior
        share = explanation.damage.set_index("element").loc["arc.long@left", "share"]
        assert number_named(explanation, "damage/arc.long@left/share") == share

    @pytest.mark.parametrize(
        "name", ["", "damage", "accounts/99/posterior", "damage/none@left/share", "signs/repetition_loss@none/hue",
                 "reckoning", "accounts/0/__class__"],
    )  # fmt: skip
    def test_no_other_name_is(self, explanation: Explanation, name: str) -> None:
        """A name that nothing has raises and says so."""
        with pytest.raises(BywayError, match="no number has this name"):
            number_named(explanation, name)


class TestWhatIf:
    """Before and after an imagined change."""

    def test_nothing_changed_shows_nothing(self, explanation: Explanation) -> None:
        """As it is, there is no result."""
        assert WhatIfPanel(explanation).result is None

    def test_a_segment_made_whole_brings_repetition_back(self, explanation: Explanation) -> None:
        """With both cut segments whole, the expected loss of repetition falls."""
        panel = WhatIfPanel(explanation)
        panel.settings = {**NOTHING, "restored": ["arc.long@left", "arc.anterior@left"]}
        (row,) = (row for row in panel.told["signs"] if row["id"] == "repetition_loss@none")
        assert row["after"] < row["before"] - 0.3
        named = number_named(explanation, "what_if/signs/repetition_loss@none/after", what_if=panel.result)
        assert named == row["after"]

    def test_chronic_is_not_acute(self, explanation: Explanation) -> None:
        """Another stage changes what the routes can carry."""
        panel = WhatIfPanel(explanation)
        panel.settings = {**NOTHING, "stage": "chronic"}
        assert panel.told["functions"]

    @pytest.mark.parametrize("bad", [{"growth_mm": 99}, {"stage": "eternal"}, {"severed": ["nowhere@left"]}])
    def test_what_cannot_be_is_refused(self, explanation: Explanation, bad: dict[str, object]) -> None:
        """A change that makes no sense becomes a notice and shows nothing."""
        panel = WhatIfPanel(explanation)
        panel.settings = {**NOTHING, **bad}
        assert panel.told == {}
        assert panel.state.notice


class TestOwnAccount:
    """The user's own account on the same ledger."""

    def test_all_damage_as_drawn_is_scored_as_the_tool_scores_it(self, explanation: Explanation) -> None:
        """An own account that supposes what an account of the tool supposes has the same odds."""
        panel = OwnAccountPanel(explanation)
        panel.draft = {"title": "x", "text": "", "elements": [], "scenario": {"speaks": "segments"}}
        (same,) = (a for a in explanation.accounts if a.key == "speaks.segments")
        ledger_of_findings = [row for row in panel.told["ledger"] if row["row"] == "finding"]
        assert [row["loglik"] for row in ledger_of_findings] == pytest.approx(
            same.ledger.loc[same.ledger["row"] == "finding", "loglik"].tolist(), abs=0.05
        )

    def test_a_setting_that_is_none_is_refused(self, explanation: Explanation) -> None:
        """An axis or value that does not exist becomes a notice."""
        panel = OwnAccountPanel(explanation)
        panel.draft = {"title": "x", "text": "", "elements": [], "scenario": {"weather": "wet"}}
        assert panel.told == {}
        assert "weather" in panel.state.notice

    def test_it_is_kept_as_a_page(self, explanation: Explanation, tmp_path: Path) -> None:
        """Kept in the case, it is a page of its own with its author, and the list shows it."""
        state = state_with(explanation)
        state.case = SimpleNamespace(folder=tmp_path, spec=SimpleNamespace(asymmetries=()))
        panel = OwnAccountPanel(state)
        panel.author = "KL"
        panel.draft = {"title": "Only the long one", "text": "why", "elements": ["arc.long@left"], "scenario": {}}
        panel._heard(None, {"kind": "keep"}, [])
        (page,) = Pages(tmp_path).current("account")
        assert (page.author, page.title, page.elements) == ("KL", "Only the long one", ("arc.long@left",))
        assert panel.kept[0]["title"] == "Only the long one"

    def test_without_an_author_nothing_is_written(self, explanation: Explanation, tmp_path: Path) -> None:
        """No author, no page."""
        state = state_with(explanation)
        state.case = SimpleNamespace(folder=tmp_path, spec=SimpleNamespace(asymmetries=()))
        panel = OwnAccountPanel(state)
        panel.draft = {"title": "x", "text": "", "elements": ["arc.long@left"], "scenario": {}}
        panel._heard(None, {"kind": "keep"}, [])
        assert list(tmp_path.iterdir()) == []
        assert state.notice


def test_the_ranking_is_examined_when_asked(explanation: Explanation) -> None:
    """Nothing is examined by itself; asked, every row says who would lead and with which posterior."""
    panel = SteadyPanel(explanation)
    assert panel.told == {}
    panel._heard(None, {"kind": "examine"}, [])
    for i, row in enumerate(panel.told["rows"]):
        assert number_named(explanation, f"steady/{i}/p_usual_first", steady=panel.result) == row["p_usual_first"]


def test_graph_edges_carry_their_claims() -> None:
    """Every claim that joins two places stands on the edge between them; a dispute too."""
    panel = GraphPanel(state_with(toy_explanation()))
    told = panel.told
    spoken = {i for *_, claims in told["edges"] for i in claims}
    assert len(spoken) == len(told["claims"])
    (edge,) = (e for e in told["edges"] if e[:2] == ["arc.long", "repetition"])
    assert {told["claims"][i]["stance"] for i in edge[3]} == {"supports", "disputes"}
