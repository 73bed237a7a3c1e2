"""Next tests and images: information in bits against direct enumeration."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from strategies import damage_maps, finding_lists
from toy_graph import toy_graph
from toy_reckoning import absent, found, toy_explanation

from byway.knowledge.reasoning.grouping import regroup
from byway.knowledge.reasoning.next_tests import entropy_bits, next_axes, next_images
from byway.knowledge.reasoning.posterior import SCENARIOS, with_findings

GRAPH = toy_graph()
DAMAGE = {"arc.long@left": 0.6, "frontal@left": 0.5, "thalamus@left": 0.6, "motor.capsule@left": 0.5}
FINDINGS = [found("repetition_loss"), absent("comprehension_loss")]


def enumerated_bits(explanation, sign_id: str) -> float:
    """Information of one test: every outcome is added as a finding and weighed by its probability."""
    key, _, side = sign_id.rpartition("@")
    before = explanation.grouping
    outcomes = {}
    for grade in ("absent", "mild", "moderate", "severe"):
        reckoning = with_findings(explanation.reckoning, [*explanation.reckoning.findings, found(key, side, grade)])
        after = regroup(reckoning, before.groups)
        order = [after.groups.index(group) for group in before.groups]
        outcomes[grade] = (np.exp(after.log_evidence - before.log_evidence), after.posterior[order])
    p_absent, given_absent = outcomes["absent"]
    present = [outcomes[grade] for grade in ("mild", "moderate", "severe")]
    p_present = sum(p for p, _ in present)
    given_present = sum(p * posterior for p, posterior in present) / p_present
    assert p_absent + p_present == pytest.approx(1.0, abs=1e-4)
    return float(entropy_bits(before.posterior) - p_absent * entropy_bits(given_absent)
                 - p_present * entropy_bits(given_present))  # fmt: skip


def test_bits_equal_direct_enumeration() -> None:
    """Every untested sign's information equals that of enumerating its outcomes, to 1e-4 bits."""
    explanation = toy_explanation(DAMAGE, FINDINGS, draws=8)
    table = explanation.next_tests
    assert len(table) >= 4
    for row in table.to_dict("records"):
        expected = enumerated_bits(explanation, f"{row['sign']}@{row['side']}")
        assert row["bits"] == pytest.approx(max(0.0, expected), abs=1e-4)


@settings(max_examples=15, deadline=None)
@given(damage_maps(GRAPH), finding_lists(GRAPH))
def test_information_is_never_negative_nor_more_than_there_is(damage: dict[str, float], findings: list) -> None:
    """0 <= bits <= entropy of the accounts, and at most one bit from a yes or no."""
    explanation = toy_explanation(damage, findings, graph=GRAPH, draws=5)
    whole = float(entropy_bits(explanation.grouping.posterior))
    for bits in explanation.outlook.bits:
        assert 0.0 <= bits <= min(1.0, whole) + 1e-9
    assert (explanation.next_images["bits"] <= whole + 1e-9).all()
    assert (explanation.next_axes["bits"] <= whole + 1e-9).all()


def test_tested_signs_are_not_asked_again() -> None:
    """Signs with a finding, and signs that nothing damaged serves, are left out; the list is sorted."""
    table = toy_explanation(DAMAGE, FINDINGS).next_tests
    asked = set(table["sign"] + "@" + table["side"])
    assert "repetition_loss@none" not in asked
    assert "hand_weakness@left" not in {s for s in asked if s.endswith("left")}
    assert table["bits"].is_monotonic_decreasing
    assert table["bits_per_minute"].tolist() == pytest.approx((table["bits"] / table["minutes"]).tolist())


def test_ranking_for_each_outcome() -> None:
    """What the ranking becomes if the sign is found equals adding the outcome; the first names the table's account."""
    explanation = toy_explanation(DAMAGE, FINDINGS)
    row = explanation.next_tests.iloc[0]
    then = explanation.ranking_if(row["sign"], row["side"], True)
    assert then["then"].sum() == pytest.approx(1.0)
    assert then["account"].iloc[0] == row["if_present"]
    assert then["then"].iloc[0] == pytest.approx(row["p_if_present"])
    with pytest.raises(KeyError):
        explanation.ranking_if("repetition_loss", "none", True)


def test_outcomes_average_to_the_present_ranking() -> None:
    """P(found) * posterior if found + P(not) * posterior if not = posterior now."""
    explanation = toy_explanation(DAMAGE, FINDINGS)
    ahead = explanation.outlook
    mixed = ahead.p_found[:, None] * ahead.if_present + (1 - ahead.p_found)[:, None] * ahead.if_absent
    np.testing.assert_allclose(mixed, np.broadcast_to(explanation.grouping.posterior, mixed.shape), atol=1e-6)


def test_images_name_wide_intervals() -> None:
    """Only elements with a wide interval are listed, with the image that would narrow it."""
    explanation = toy_explanation({**DAMAGE, "hippocampus@left": 0.5}, FINDINGS, spread=0.2)
    table = next_images(explanation.reckoning, explanation.grouping)
    assert ((table["high"] - table["low"]) >= 0.15).all()
    assert set(table["element"]) <= {*DAMAGE, "hippocampus@left"}
    assert table.set_index("element").loc["arc.long@left", "image"].startswith("tractography")
    narrow = toy_explanation(DAMAGE, FINDINGS, spread=0.0)
    assert next_images(narrow.reckoning, narrow.grouping).empty


def test_images_equal_direct_enumeration() -> None:
    """Parting the draws by an element's damage and weighing each part gives the same bits."""
    explanation = toy_explanation(DAMAGE, FINDINGS, draws=20, spread=0.2)
    reckoning, grouping = explanation.reckoning, explanation.grouping
    element = "arc.long@left"
    values = reckoning.damage_of(SCENARIOS[0])[:, reckoning.prepared.number[element]]
    ranks = np.argsort(np.argsort(values, kind="stable"), kind="stable")
    weight = reckoning.prior[:, None] * np.exp(reckoning.joint_logs)
    total = np.zeros(len(grouping.groups))
    after = 0.0
    for part in range(4):
        draws = ranks * 4 // len(values) == part
        joint = np.array([weight[list(group.members)][:, draws].sum() for group in grouping.groups])
        total += joint
        after += joint.sum() * float(entropy_bits(joint / joint.sum()))
    bits = float(entropy_bits(total / total.sum())) - after / total.sum()
    table = next_images(reckoning, grouping).set_index("element")
    assert table.loc[element, "bits"] == pytest.approx(bits, abs=1e-6)


def test_axes() -> None:
    """Every axis that a scan or test could settle is listed with the posterior of its values."""
    explanation = toy_explanation(DAMAGE, FINDINGS)
    table = next_axes(explanation.reckoning, explanation.grouping).set_index("axis")
    assert set(table.index) == {"dominance", "boundary", "perilesional", "remote", "outside"}
    assert sum(table.loc["boundary", "values"].values()) == pytest.approx(1.0)


def test_entropy_by_hand() -> None:
    """Four equal accounts hold two bits; a certain one none."""
    assert entropy_bits(np.full(4, 0.25)) == pytest.approx(2.0)
    assert entropy_bits(np.array([1.0, 0.0])) == pytest.approx(0.0)
