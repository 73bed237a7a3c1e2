"""Remarks: signs on the lesion's own side, tests that tell little, and how accounts that look alike differ."""

from __future__ import annotations

import json

import pandas as pd
from toy_graph import toy_graph
from toy_reckoning import absent, found, toy_explanation

from byway.knowledge.reasoning.accounts import title_elements
from byway.knowledge.reasoning.remarks import LEAST_BITS, few_bits, lesion_side

CAPSULE = {"motor.capsule@left": 0.95}
ALARM = "the same side as the lesion (left): check the side of the finding and the left-right orientation of the mask."


def test_a_sign_on_the_lesions_own_side_raises_an_alarm() -> None:
    """A left capsular lesion with weakness of the left hand: said once for the case and on every card."""
    explanation = toy_explanation(CAPSULE, [found("hand_weakness", "left"), absent("repetition_loss")])
    assert lesion_side(explanation.reckoning) == "left"
    assert explanation.remarks[0].endswith(ALARM)
    assert all(each.cautions[0].endswith(ALARM) for each in explanation.accounts)
    assert json.loads(explanation.to_json())["remarks"] == list(explanation.remarks)


def test_no_alarm_on_the_usual_side_or_with_damage_on_both() -> None:
    """Weakness opposite to the lesion, absent weakness, and lesions of both hemispheres are no reason to ask."""
    usual = toy_explanation(CAPSULE, [found("hand_weakness", "right")])
    nothing = toy_explanation(CAPSULE, [absent("hand_weakness", "left")])
    both = toy_explanation({**CAPSULE, "visual@right": 0.5}, [found("hand_weakness", "left")])
    assert lesion_side(both.reckoning) is None
    for explanation in (usual, nothing, both):
        assert not any("same side" in text for text in explanation.remarks)


def test_a_line_where_no_test_tells_much() -> None:
    """Below LEAST_BITS the remark stands; from there on it does not."""
    assert "No bedside test" in few_bits(pd.DataFrame({"bits": [0.9 * LEAST_BITS, 0.01]}))[0]
    assert few_bits(pd.DataFrame({"bits": [LEAST_BITS, 0.01]})) == ()
    assert few_bits(pd.DataFrame({"bits": []})) != ()


def test_accounts_that_look_alike_say_how_they_differ() -> None:
    """A later account with the same elements in its title refers to the earlier by number; others say nothing."""
    explanation = toy_explanation(
        {"arc.long@left": 0.9, "temporal@left": 0.5}, [found("repetition_loss"), absent("comprehension_loss")]
    )
    graph = toy_graph()
    seen: dict[frozenset[str], int] = {}
    told = 0
    for number, account in enumerate(explanation.accounts, start=1):
        named = frozenset(title_elements(graph, account))
        earlier = seen.setdefault(named, number)
        if earlier == number:
            assert account.differs == ""
        else:
            told += 1
            assert account.differs.startswith(f"As account {earlier}, but here ")
            assert account.cautions[0] == account.differs
            assert account.to_dict()["differs"] == account.differs
    assert told > 0
