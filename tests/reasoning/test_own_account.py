"""The user's own account on the same ledger, and two accounts compared."""

from __future__ import annotations

import numpy as np
import pytest
from toy_reckoning import absent, found, toy_explanation

from byway.knowledge.faults import BywayError
from byway.knowledge.reasoning.own_account import OwnAccount, compare, score
from byway.knowledge.reasoning.posterior import SCENARIOS, SLIP
from byway.knowledge.reasoning.scenarios import Scenario

DAMAGE = {"arc.long@left": 0.9, "frontal@left": 0.3}
FINDINGS = [found("repetition_loss"), absent("comprehension_loss"), found("hand_weakness", "right")]
EXPLANATION = toy_explanation(DAMAGE, FINDINGS)


def test_the_undeparted_account_scores_as_the_tool_does() -> None:
    """With no elements chosen and usual settings, the ledger equals that of the scenario itself."""
    scored = score(EXPLANATION, OwnAccount("as drawn"))
    reckoning = EXPLANATION.reckoning
    assert scored.loglik == pytest.approx(float(reckoning.loglik[0]), abs=1e-3)
    assert scored.prior == pytest.approx(float(reckoning.prior[0]))
    total = float(scored.ledger["loglik"].sum())
    assert total == pytest.approx(np.log(scored.prior) + scored.loglik)
    posterior = np.exp(total - EXPLANATION.grouping.log_evidence)
    assert posterior == pytest.approx(float(reckoning.posterior[0]), rel=1e-3 + SLIP)


def test_chosen_elements_alone_count() -> None:
    """An account that adds the capsule explains the weak hand, and one of the frontal region alone explains nothing."""
    with_capsule = score(EXPLANATION, OwnAccount("mine", {"arc.long@left": None, "motor.capsule@left": 1.0}))
    frontal = score(EXPLANATION, OwnAccount("frontal", {"frontal@left": None}))
    assert {each.sign for each in with_capsule.explains} >= {"hand_weakness"}
    assert not frontal.explains
    assert with_capsule.loglik > frontal.loglik
    assert with_capsule.odds_vs_cortical > 10


def test_settings_and_words() -> None:
    """The scenario's departures are said in words and its prior is that scenario's."""
    own = OwnAccount("right", scenario=Scenario(dominance="right"), text="left-handed parents", by="a reader")
    scored = score(EXPLANATION, own)
    assert scored.departures == "language is led by the right hemisphere"
    assert scored.prior == pytest.approx(float(EXPLANATION.reckoning.prior[SCENARIOS.index(own.scenario)]))
    assert scored.title == "right"
    assert 0.0 < scored.posterior_beside < 1.0
    assert scored.words


def test_comparison_adds_up() -> None:
    """Row by row, the differences sum to the log-odds of the two accounts, most telling first."""
    scored = score(EXPLANATION, OwnAccount("mine", {"motor.capsule@left": 1.0}))
    first = EXPLANATION.accounts[0]
    table = compare(scored, first)
    difference = float(scored.ledger["loglik"].sum() - first.ledger["loglik"].sum())
    assert float(table["for_first"].sum()) == pytest.approx(difference)
    assert table["for_first"].abs().is_monotonic_decreasing
    assert table.set_index("sign").loc["hand_weakness", "words"].startswith("speaks for the first")


def test_ledgers_of_other_findings_cannot_be_compared() -> None:
    """Different findings are refused."""
    other = toy_explanation(DAMAGE, FINDINGS[:1])
    with pytest.raises(ValueError, match="different findings"):
        compare(EXPLANATION.accounts[0], other.accounts[0])


@pytest.mark.parametrize(("element", "value", "message"), [("arc.lon@left", None, "did you mean"),
                                                           ("arc.long@left", 1.5, "from 0 to 1")])  # fmt: skip
def test_bad_elements_are_refused(element: str, value: float | None, message: str) -> None:
    """Unknown elements and damage out of range name what would do."""
    with pytest.raises(BywayError, match=message):
        score(EXPLANATION, OwnAccount("bad", {element: value}))
