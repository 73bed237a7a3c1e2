"""How easily a ranking turns over."""

from __future__ import annotations

import pytest
from toy_reckoning import absent, found, toy_explanation, toy_reckoning

from byway.knowledge.reasoning.scenarios import axis_priors
from byway.knowledge.reasoning.sensitivity import sensitivity

CLEAR = {"arc.long@left": 0.95, "arc.anterior@left": 0.9}
FINDINGS = [found("repetition_loss"), absent("comprehension_loss"), absent("hand_weakness", "right")]


def test_every_change_is_made() -> None:
    """Nine departures halved and doubled, each finding left out, a larger and a smaller mask; progress is told."""
    told: list[tuple[int, int]] = []
    result = sensitivity(toy_explanation(CLEAR, FINDINGS), progress=lambda done, all_: told.append((done, all_)))
    assert result.table["kind"].value_counts().to_dict() == {"prior": 18, "finding": 3, "mask": 2}
    assert told[-1] == (23, 23)


def test_priors_are_changed_in_odds() -> None:
    """Doubling the odds of right dominance, 4 : 96, gives 8 : 96: the same as a case that sets 1/13."""
    explanation = toy_explanation(CLEAR, FINDINGS)
    row = sensitivity(explanation).table.set_index("change").loc[
        "twice as likely beforehand that language is led by the right hemisphere"
    ]
    again = toy_explanation(CLEAR, FINDINGS, priors={"dominance": 8 / 104})
    assert row["p_usual_first"] == pytest.approx(again.accounts[0].posterior, rel=1e-6)


def test_a_finding_left_out_equals_an_explanation_without_it() -> None:
    """The row's posterior is that of the same groups without the finding."""
    explanation = toy_explanation(CLEAR, FINDINGS)
    rows = sensitivity(explanation).table
    row = rows[rows["change"].str.startswith("without Comprehension")].iloc[0]
    rest = toy_explanation(CLEAR, [FINDINGS[0], FINDINGS[2]])
    assert row["p_usual_first"] == pytest.approx(rest.accounts[0].posterior, rel=1e-6)


def test_a_clear_ranking_stays() -> None:
    """A lesion that explains its findings well stays first, and the words say so."""
    result = sensitivity(toy_explanation({"motor.capsule@left": 0.95}, [found("hand_weakness", "right"),
                                                                        found("face_weakness", "right")]))  # fmt: skip
    assert not result.flips_easily
    assert "stays first under all" in result.words


def test_a_close_ranking_says_that_it_turns() -> None:
    """Right dominance a little ahead of silent cortex: one halved prior turns them over, and the words say so."""
    damage = {"temporal@left": 0.95, "frontal@left": 0.9}
    findings = [absent("repetition_loss"), absent("comprehension_loss")]
    close = toy_explanation(damage, findings, priors={"dominance": 0.3})
    result = sensitivity(close)
    assert set(result.table.loc[result.table["flips"], "kind"]) == {"prior"}
    assert result.flips_easily
    assert result.words.startswith("The ranking turns over easily: ")


def test_a_supplied_mask_is_used_and_progress_can_stop() -> None:
    """Ensembles of another mask are weighed under their own words; False from progress stops."""
    explanation = toy_explanation(CLEAR, FINDINGS)
    wiped = {name: array * 0 for name, array in explanation.reckoning.draws.items()}
    result = sensitivity(explanation, masks={"no lesion at all": wiped})
    assert result.table.set_index("change").loc["no lesion at all", "p_usual_first"] < explanation.accounts[0].posterior
    assert len(sensitivity(explanation, progress=lambda done, _: done < 2).table) == 2


def test_priors_of_the_reckoning_are_those_of_the_norms() -> None:
    """The reckoning carries the priors that sensitivity scales."""
    reckoning = toy_reckoning(CLEAR, FINDINGS)
    assert reckoning.priors == axis_priors(reckoning.prepared.graph, "right", "acute", "infarct")
