"""The whole way from damage and findings to accounts: ranking, ledgers that add up, tables, and JSON."""

from __future__ import annotations

import json

import numpy as np
import pytest
from hypothesis import given, settings
from strategies import damage_maps, finding_lists
from toy_graph import toy_graph
from toy_reckoning import absent, found, toy_explanation

from byway.knowledge.faults import BywayError
from byway.knowledge.reasoning.explain import Explanation
from byway.knowledge.reasoning.grouping import KINDS
from byway.knowledge.reasoning.posterior import SCENARIOS
from byway.knowledge.reasoning.scenarios import Scenario

GRAPH = toy_graph()
DISCONNECTED = {"arc.long@left": 0.95, "arc.anterior@left": 0.9}
APHASIA = [found("repetition_loss"), absent("comprehension_loss"), absent("hand_weakness", "right")]


def account(explanation: Explanation, kind: str):
    """The best account of a kind."""
    return next(each for each in explanation.accounts if each.kind == kind)


def test_oedema_on_segments_with_spared_cortex_is_a_disconnection() -> None:
    """Repetition lost, comprehension spared, both arcuate segments cut: disconnection leads the cortical reading."""
    explanation = toy_explanation(DISCONNECTED, APHASIA, cause="tumour")
    first = explanation.accounts[0]
    assert first.kind == "segment_disconnection"
    assert first.odds_vs_cortical > 10
    assert first.elements[:2] == ("arc.long@left", "arc.anterior@left")
    assert [each.sign for each in first.explains] == ["repetition_loss"]
    assert not account(explanation, "cortical_damage").explains


def test_cortical_damage_with_spared_segments_is_plain() -> None:
    """Cortex hit and segments spared: the plain reading is first."""
    explanation = toy_explanation({"frontal@left": 0.95}, [found("halting_speech"), absent("comprehension_loss")])
    first = explanation.accounts[0]
    assert first.is_plain
    assert first.kind == "cortical_damage"
    assert first.elements == ("frontal@left",)
    assert first.odds_vs_cortical == pytest.approx(1.0)


def test_both_when_each_is_needed() -> None:
    """Cortex and a segment of another route are lost together: neither alone takes the function."""
    damage = {"arc.long@left": 0.95, "parietal@left": 0.95}
    explanation = toy_explanation(damage, [found("repetition_loss", grade="severe"), absent("comprehension_loss")])
    assert explanation.accounts[0].kind == "both"
    assert set(explanation.accounts[0].elements) == {"arc.long@left", "parietal@left"}


def test_a_sign_that_the_lesion_cannot_cause_lies_outside() -> None:
    """Weakness of the side of the lesion, and a field loss with nothing near: the cause outside leads."""
    findings = [found("hand_weakness", "left"), found("hemianopia", "left"), found("amnesia"),
                absent("repetition_loss")]  # fmt: skip
    explanation = toy_explanation({"arc.long@left": 0.3}, findings)
    assert explanation.accounts[0].kind == "outside_lesion"
    assert any("rate, not a mechanism" in text for text in explanation.accounts[0].cautions)


def test_spared_language_with_a_left_lesion_speaks_for_right_dominance() -> None:
    """Unexpected sparing is explained: right dominance comes first, above its prior of 0.27, and is said in words."""
    damage = {"temporal@left": 0.95, "frontal@left": 0.95, "arc.long@left": 0.95}
    findings = [absent("repetition_loss"), absent("comprehension_loss"), absent("halting_speech")]
    explanation = toy_explanation(damage, findings, handedness="left")
    atypical = account(explanation, "atypical_dominance")
    assert atypical is explanation.accounts[0]
    assert atypical.posterior > 1.5 * 0.27
    assert {reason for each in atypical.sparing for reason in each.reasons} == {"other_side"}
    assert "lies in the other hemisphere" in atypical.sparing[0].words


def test_sparing_by_a_spared_route_and_headroom() -> None:
    """The direct route cut in the chronic stage: the indirect route and re-routing are named."""
    explanation = toy_explanation({"arc.long@left": 0.9}, [absent("repetition_loss")], stage="chronic", spread=0.02)
    drawn = next(each for each in explanation.accounts if each.key == "as_drawn")
    reasons = {reason for each in drawn.sparing for reason in each.reasons}
    assert {"spared_route", "rerouting"} <= reasons


@settings(max_examples=15, deadline=None)
@given(damage_maps(GRAPH), finding_lists(GRAPH))
def test_ledgers_add_up_to_posteriors(damage: dict[str, float], findings: list) -> None:
    """exp(sum of a ledger - log evidence) is the account's posterior, and exp(sum of vs_cortical) its odds."""
    explanation = toy_explanation(damage, findings, graph=GRAPH, draws=6)
    plain = next(each for each in explanation.accounts if each.is_plain)
    for each in explanation.accounts:
        total = float(each.ledger["loglik"].sum())
        assert np.exp(total - explanation.grouping.log_evidence) == pytest.approx(each.posterior, rel=1e-6)
        assert np.exp(each.ledger["vs_cortical"].sum()) == pytest.approx(each.odds_vs_cortical, rel=1e-6)
        assert each.posterior / plain.posterior == pytest.approx(each.odds_vs_cortical, rel=1e-6)
        assert 0.0 < each.posterior < 1.0
    shown = sum(each.posterior for each in explanation.accounts)
    assert shown + explanation.other_posterior == pytest.approx(1.0)
    assert [each.kind in KINDS for each in explanation.accounts]
    ranks = [each.posterior for each in explanation.accounts]
    assert ranks == sorted(ranks, reverse=True) or plain is explanation.accounts[-1]


def test_every_scenario_belongs_to_one_account() -> None:
    """Groups part the 288 scenarios; what predicts the same is one account, what does not is not."""
    explanation = toy_explanation(DISCONNECTED, APHASIA)
    members = sorted(s for group in explanation.grouping.groups for s in group.members)
    assert members == list(range(len(SCENARIOS)))
    only_segments = toy_explanation({"motor.capsule@left": 0.9}, [found("hand_weakness", "right")])
    first = only_segments.grouping.groups[0]
    assert SCENARIOS.index(Scenario(speaks="segments")) in first.members
    assert only_segments.accounts[0].kind == "segment_disconnection"


def test_a_silent_lesion_is_plain() -> None:
    """Nothing damaged that matters, nothing found: one plain account takes nearly all."""
    explanation = toy_explanation({"face@right": 0.1}, [absent("repetition_loss"), absent("neglect", "left")])
    assert explanation.accounts[0].kind == "cortical_damage"
    assert explanation.accounts[0].is_plain
    assert any("Nothing was found" in text for text in explanation.accounts[0].cautions)


def test_sign_table() -> None:
    """Every sign on every side once; untested stays None; the cortical reading expects less of cut segments."""
    table = toy_explanation(DISCONNECTED, APHASIA).signs
    assert list(table["sign"] + "@" + table["side"]) == list(GRAPH.sign_ids())
    row = table[table["sign"] == "repetition_loss"].iloc[0]
    assert row["expected_cortical"] < 0.1 < 0.5 < row["expected"] < row["expected_given_findings"]
    assert row["low"] <= row["high"]
    assert row["found"] == "moderate"
    assert table[table["sign"] == "amnesia"].iloc[0]["found"] is None
    neglect = table[(table["sign"] == "neglect") & (table["side"] == "left")].iloc[0]
    assert neglect["expected_cortical"] == pytest.approx(0.02)


def test_function_table() -> None:
    """Capacity with its interval, and what limits it; the right hemisphere's copies are whole."""
    table = toy_explanation(DISCONNECTED, APHASIA).functions.set_index("function")
    row = table.loc["repetition@dominant"]
    assert row["capacity"] < 0.2
    assert row["capacity_cortical"] > 0.9
    assert set(row["limited_by"]) >= {"arc.long@left", "arc.anterior@left"}
    assert table.loc["hand_use@right", "capacity"] == 1.0


def test_bottleneck_and_counterfactual_of_the_first_account() -> None:
    """The bottleneck names both segments together; restoring either lowers the sign, the long one more."""
    first = toy_explanation(DISCONNECTED, APHASIA, spread=0.02).accounts[0]
    neck = first.bottlenecks.set_index("function").loc["repetition@dominant"]
    assert set(neck["elements"]) == {"arc.long@left", "arc.anterior@left"}
    assert neck["words"].startswith("Repetition is held back by")
    assert "together" in neck["words"]
    change = first.counterfactuals.set_index("element")["change"]
    assert change["arc.long@left"] < -0.2
    assert change["arc.long@left"] < change["arc.anterior@left"] < 0.05


def test_claims_and_sources_stand_on_the_card() -> None:
    """Claims that tie the elements to the explained sign are for it, the disputing one against it, all with sources."""
    first = toy_explanation(DISCONNECTED, APHASIA).accounts[0]
    assert {"arc_long_serves_repetition", "repetition_shows_as_repetition_loss"} <= {c.key for c in first.claims_for}
    assert [claim.key for claim in first.claims_against] == ["long_disputed"]
    assert first.sources == ("toy_1900",)


def test_what_is_left_and_predicted_in_vain() -> None:
    """An account leaves the sign that it does not foresee, and predicts in vain the one that was not found."""
    findings = [found("amnesia"), absent("repetition_loss")]
    explanation = toy_explanation(DISCONNECTED, findings, spread=0.02)
    drawn = next(each for each in explanation.accounts if each.key == "as_drawn")
    assert [each.sign for each in drawn.leaves] == ["amnesia"]
    assert [each.sign for each in drawn.predicts_absent] == ["repetition_loss"]


def test_json_has_the_same_names_and_no_nan() -> None:
    """to_json can be read back; accounts carry the names of the attributes."""
    explanation = toy_explanation(DISCONNECTED, APHASIA)
    plain = json.loads(explanation.to_json())
    assert "NaN" not in explanation.to_json()
    first = plain["accounts"][0]
    for name in ("title", "kind", "posterior", "odds_vs_cortical", "elements", "ledger", "bottlenecks", "claims_for",
                 "sources", "cautions", "counterfactuals", "words"):  # fmt: skip
        assert name in first
    assert first["posterior"] == explanation.accounts[0].posterior
    assert len(plain["signs"]) == len(GRAPH.sign_ids())
    assert plain["uncharted_share"] is None
    assert "no diagnosis" in plain["caution"]


def test_an_unknown_sign_is_refused() -> None:
    """Findings are checked against the graph first."""
    with pytest.raises(BywayError, match="no sign has this key"):
        toy_explanation(DISCONNECTED, [found("wobble")])


def test_graded_damage_goes_the_same_way() -> None:
    """Slight damage everywhere (atrophy) in a slowly progressive cause lowers capacity less than acute damage."""
    damage = {"temporal@left": 0.4, "arc.long@left": 0.4, "frontal@left": 0.4}
    slow = toy_explanation(damage, APHASIA, cause="degeneration", stage="chronic")
    acute = toy_explanation(damage, APHASIA)
    at = "repetition@dominant"
    assert slow.functions.set_index("function").loc[at, "capacity"] > acute.functions.set_index("function").loc[
        at, "capacity"]  # fmt: skip


def test_no_damage_at_all() -> None:
    """Without a lesion only a cause outside can explain anything, and nothing breaks."""
    explanation = toy_explanation({}, [found("amnesia"), found("hand_weakness", "left")])
    assert explanation.accounts[0].kind == "outside_lesion"
    assert explanation.accounts[0].elements == ()
    assert explanation.next_tests.empty
    assert explanation.next_images.empty
    assert len(json.loads(explanation.to_json())["accounts"]) == 2


def test_no_damage_and_no_findings() -> None:
    """An empty case leaves the priors."""
    explanation = toy_explanation({})
    assert explanation.accounts[0].is_plain
    assert explanation.accounts[0].posterior == pytest.approx(0.92)
