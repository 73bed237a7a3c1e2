"""Signs from capacities: the noisy-OR by hand, side rules, and order of the grades."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from toy_graph import toy_graph
from toy_reckoning import found

from byway.knowledge.reasoning.signs import LossCache, loss, outside_tails, sign_models

MODELS = sign_models(toy_graph(), "left")


def tail(sign: str, grade: int = 0, **capacities: float) -> float:
    """P(sign at grade or worse) at given capacities; ``__`` stands for ``@``."""
    known = {copy.replace("__", "@"): np.array([value], np.float32) for copy, value in capacities.items()}
    value = MODELS[sign].tail(grade, LossCache(known))
    return float(np.ravel(value)[0])


def test_loss_by_hand() -> None:
    """Nothing at capacity 1, all at 0, and half-way at the threshold but for the stretch: (0.5 - a) / (b - a)."""
    low, high = 1 / (1 + np.exp(0.3 / 0.08)), 1 / (1 + np.exp(-0.7 / 0.08))
    values = loss(np.array([1.0, 0.7, 0.0]), 0.7)
    np.testing.assert_allclose(values, [0.0, (0.5 - low) / (high - low), 1.0], atol=1e-6)


def test_noisy_or_by_hand() -> None:
    """Both functions gone: 1 - (1 - 0.02) (1 - 0.9) (1 - 0.3) = 0.9314; none gone: the leak, 0.02."""
    both = tail("halting_speech@none", speech__dominant=0.0, repetition__dominant=0.0)
    assert both == pytest.approx(0.9314, abs=1e-4)
    assert tail("halting_speech@none") == pytest.approx(0.02)
    assert tail("halting_speech@none", 2) == pytest.approx(0.02 * 0.2)


@given(st.floats(0, 1))
def test_worse_grades_are_never_likelier(capacity: float) -> None:
    """P(severe) <= P(moderate or worse) <= P(mild or worse) at every capacity."""
    mild, moderate, severe = (tail("repetition_loss@none", g, repetition__dominant=capacity) for g in range(3))
    assert mild >= moderate >= severe


@given(st.floats(0, 1), st.floats(0, 1))
def test_less_capacity_never_lowers_a_sign(one: float, other: float) -> None:
    """The sign of the lower capacity is at least as likely."""
    low, high = sorted((one, other))
    worse, better = (tail("repetition_loss@none", 1, repetition__dominant=c) for c in (low, high))
    assert worse >= better - 1e-6


def test_side_rules() -> None:
    """Contralateral crosses, either takes both copies apart, bilateral needs both lost."""
    assert MODELS["hand_weakness@right"].copies == ("hand_use@left",)
    assert MODELS["hand_weakness@left"].copies == ("hand_use@right",)
    assert [term.copies for term in MODELS["slurred_speech@none"].terms] == [("face_use@left",), ("face_use@right",)]
    assert [term.copies for term in MODELS["trouble_swallowing@none"].terms] == [("face_use@left", "face_use@right")]
    assert tail("trouble_swallowing@none", face_use__left=0.0) == pytest.approx(0.02)
    assert tail("trouble_swallowing@none", face_use__left=0.0, face_use__right=0.0) > 0.85


def test_weight_of_the_dominant_copy() -> None:
    """The dominant hemisphere's copy has its own weight, and that follows dominance."""
    assert [term.weight for term in MODELS["slurred_speech@none"].terms] == [0.7, 0.5]
    right = sign_models(toy_graph(), "right")["slurred_speech@none"]
    assert [term.weight for term in right.terms] == [0.5, 0.7]


def test_a_function_of_one_hemisphere_shows_only_on_the_other_side() -> None:
    """Nondominant attention, in the right hemisphere, shows as neglect of the left only."""
    assert MODELS["neglect@left"].copies == ("attention@nondominant",)
    assert MODELS["neglect@right"].copies == ()
    assert sign_models(toy_graph(), "right")["neglect@right"].copies == ("attention@nondominant",)


def test_likelihood_by_hand() -> None:
    """P(absent | tails 0.5, 0.3, 0.1), sensitivity 0.9, specificity 0.95, lapse 0.05: 0.95 (0.475 + 0.05) + 0.025."""
    model = MODELS["hand_weakness@right"]
    tails = (0.5, 0.3, 0.1)
    absent = float(model.likelihood(found("hand_weakness", "right", "absent"), tails, 0.05))
    assert absent == pytest.approx(0.95 * (0.5 * 0.95 + 0.5 * 0.1) + 0.05 * 0.5, abs=1e-6)
    every = [float(model.likelihood(found("hand_weakness", "right", grade), tails, 0.05))
             for grade in ("absent", "mild", "moderate", "severe")]  # fmt: skip
    assert sum(every) == pytest.approx(1.0, abs=1e-6)


def test_a_cause_outside_adds_at_its_own_rate() -> None:
    """1 - (1 - 0.5) (1 - 0.2) = 0.6."""
    assert outside_tails((0.5,), (0.2,)) == pytest.approx((0.6,))
