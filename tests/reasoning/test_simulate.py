"""Simulated truth: posteriors are calibrated in the model's own world, and degrade gracefully in another."""

from __future__ import annotations

import numpy as np
import pytest
from toy_graph import toy_graph
from toy_reckoning import toy_reckoning

from byway.knowledge.reasoning.simulate import calibration, calibration_error, simulate_case

GRAPH = toy_graph()
DAMAGE = {"arc.long@left": 0.7, "arc.anterior@left": 0.5, "frontal@left": 0.6, "temporal@left": 0.4,
          "motor.capsule@left": 0.6, "thalamus@left": 0.5}  # fmt: skip
RECKONING = toy_reckoning(DAMAGE, graph=GRAPH, draws=30)
SIGNS = GRAPH.sign_ids()


@pytest.fixture(scope="module")
def own_world():
    """2,000 cases drawn from the model itself."""
    return calibration(RECKONING, SIGNS, cases=2000, tested=8, seed=1)


def test_posteriors_are_calibrated(own_world) -> None:
    """Expected calibration error of the first account, and of all, at most 0.05 over 2,000 cases."""
    assert own_world.cases == 2000
    assert own_world.error <= 0.05
    assert own_world.error_all <= 0.05


def test_the_true_account_is_first_as_often_as_can_be(own_world) -> None:
    """Bayes' optimal classifier is right as often as its own mean confidence; ours is within sampling error of it."""
    spread = 3 * np.sqrt(own_world.first_expected * (1 - own_world.first_expected) / own_world.cases)
    assert abs(own_world.first_right - own_world.first_expected) <= spread


def test_a_misspecified_world_degrades_gracefully() -> None:
    """True damage a quarter less than drawn, and tests 10 points worse: worse, but never confidently wrong."""
    world = toy_reckoning({element: 0.75 * share for element, share in DAMAGE.items()}, graph=GRAPH, draws=30)
    result = calibration(RECKONING, SIGNS, cases=600, tested=8, seed=2, world=world, accuracy_loss=0.1)
    assert result.error <= 0.25
    assert result.first_right >= 0.5 * result.first_expected


def test_simulated_findings_follow_the_truth() -> None:
    """Over many cases the share of each sign found matches its expectation under the priors, within 4 %."""
    rng = np.random.default_rng(0)
    signs = ["repetition_loss@none", "amnesia@none"]
    seen = np.zeros(2)
    for _ in range(1500):
        _, findings = simulate_case(RECKONING, signs, rng)
        seen += [finding.present for finding in findings]
    for share, sign in zip(seen / 1500, signs, strict=True):
        model = RECKONING.model(0, sign)
        expected = float(model.found(RECKONING.expected(sign)) @ RECKONING.prior)
        expected = (1 - RECKONING.lapse) * expected + RECKONING.lapse * 0.5
        assert share == pytest.approx(expected, abs=0.04)


def test_calibration_error_by_hand() -> None:
    """Two bins: predicted 0.15 and 0.85, observed 0 and 0.5, half the cases each: (0.15 + 0.35) / 2 = 0.25."""
    error = calibration_error(np.array([0.15, 0.15, 0.85, 0.85]), np.array([0.0, 0.0, 1.0, 0.0]))
    assert error == pytest.approx(0.25)
