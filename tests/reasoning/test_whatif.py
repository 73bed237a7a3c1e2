"""What if: stage, single elements, another lesion."""

from __future__ import annotations

import pytest
from toy_graph import toy_draws, toy_graph
from toy_reckoning import absent, found, toy_explanation

from byway.knowledge.faults import BywayError
from byway.knowledge.reasoning.whatif import Change, what_if

DAMAGE = {"arc.long@left": 0.9, "arc.anterior@left": 0.5}
EXPLANATION = toy_explanation(DAMAGE, [found("repetition_loss"), absent("comprehension_loss")])


def change_of(table, key: str, value: str) -> float:
    """Change of one row."""
    return float(table.set_index(key).loc[value, "change"])


def test_no_change_changes_nothing() -> None:
    """An empty change gives equal columns."""
    result = what_if(EXPLANATION, Change())
    assert result.signs["change"].abs().max() == pytest.approx(0.0)
    assert result.functions["change"].abs().max() == pytest.approx(0.0)


def test_restoring_a_segment_lowers_its_sign() -> None:
    """Repetition comes back when the long segment is intact; the largest change stands first."""
    result = what_if(EXPLANATION, Change(restored=("arc.long@left",)))
    assert result.signs.iloc[0]["sign"] == "repetition_loss"
    assert change_of(result.signs, "sign", "repetition_loss") < -0.2
    assert change_of(result.functions, "function", "repetition@dominant") > 0.2


def test_severing_a_segment_raises_its_sign() -> None:
    """Cutting the capsule brings weakness of the other side only."""
    signs = what_if(EXPLANATION, Change(severed=("motor.capsule@left",))).signs
    weak = signs[signs["sign"] == "hand_weakness"].set_index("side")["change"]
    assert weak["right"] > 0.4
    assert weak["left"] == pytest.approx(0.0, abs=1e-6)


def test_time_brings_headroom() -> None:
    """From acute to chronic, capacity rises and the sign becomes less likely."""
    result = what_if(EXPLANATION, Change(stage="chronic"))
    assert change_of(result.functions, "function", "repetition@dominant") > 0.05
    assert change_of(result.signs, "sign", "repetition_loss") < 0.0


def test_another_lesion_is_taken_whole() -> None:
    """Draws of a shrunk lesion replace the old ones; the findings stay."""
    _, draws, _ = toy_draws(toy_graph(), {"arc.long@left": 0.1})
    result = what_if(EXPLANATION, Change(draws=draws), given_findings=True)
    assert change_of(result.signs, "sign", "repetition_loss") < -0.3
    assert result.reckoning.findings == EXPLANATION.reckoning.findings


def test_an_unknown_element_is_refused() -> None:
    """The nearest element is suggested."""
    with pytest.raises(BywayError, match=r"did you mean arc\.long@left"):
        what_if(EXPLANATION, Change(severed=("arc.lon@left",)))
