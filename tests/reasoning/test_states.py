"""Damage in every state: which damage speaks, perilesional tissue, remote effects and the boundary."""

from __future__ import annotations

import numpy as np
import pytest
from toy_graph import toy_draws, toy_graph

from byway.knowledge.reasoning.posterior import SCENARIOS
from byway.knowledge.reasoning.prepared import prepare
from byway.knowledge.reasoning.scenarios import Scenario
from byway.knowledge.reasoning.states import STATES, cut_outside_ends, damage_states, state_number

GRAPH = toy_graph()
IDS, DRAWN, _ = toy_draws(GRAPH, {"arc.long@left": 0.8, "frontal@left": 0.5, "thalamus@left": 0.3}, draws=5)
PREPARED = prepare(GRAPH, IDS)
DAMAGED = damage_states(PREPARED, DRAWN)


def of(scenario: Scenario) -> np.ndarray:
    """Damage of all elements in a scenario."""
    return DAMAGED.of_scenario(scenario, len(IDS))


def test_as_drawn_is_the_draws() -> None:
    """The undeparted scenario gives the draws back."""
    np.testing.assert_allclose(of(Scenario()), DRAWN["as_drawn"])


@pytest.mark.parametrize("boundary", ["as_drawn", "too_small", "too_large"])
def test_boundary_and_rim(boundary: str) -> None:
    """Each boundary takes its variant; a rim out of action is added by the larger of the two."""
    np.testing.assert_allclose(of(Scenario(boundary=boundary)), DRAWN[boundary])
    expected = np.maximum(DRAWN[boundary], DRAWN["perilesional"])
    np.testing.assert_allclose(of(Scenario(boundary=boundary, perilesional="yes")), expected)


def test_regions_alone_silence_no_segment() -> None:
    """Under the plain cortical reading segments are intact and regions as drawn."""
    grey = of(Scenario(speaks="cortical"))
    assert grey[:, ~PREPARED.is_region].max() == 0.0
    np.testing.assert_allclose(grey[:, PREPARED.is_region], DRAWN["as_drawn"][:, PREPARED.is_region])


def test_segments_alone_count_only_what_is_cut_outside_their_ends() -> None:
    """Severed 0.8 with an end that lost half: 1 - 0.2 / 0.5 = 0.6 is cut elsewhere; 0.4 would be nothing."""
    damage = np.zeros((len(IDS), 2), np.float32)
    damage[IDS.index("arc.long@left")] = [0.8, 0.4]
    damage[IDS.index("frontal@left")] = 0.5
    cut = cut_outside_ends(PREPARED, damage)
    np.testing.assert_allclose(cut[IDS.index("arc.long@left")], [0.6, 0.0], atol=1e-6)
    assert cut[PREPARED.is_region].max() == 0.0


def test_untouched_elements_have_no_row() -> None:
    """Only touched and silenced elements are carried along."""
    touched = {IDS[element] for element in DAMAGED.rows}
    assert {"arc.long@left", "frontal@left", "thalamus@left"} <= touched
    assert not any(element.endswith("@right") for element in touched)


def test_a_copy_without_touched_elements_is_skipped() -> None:
    """Functions of the other hemisphere give no damage."""
    tables = PREPARED.tables["left", "usual"]
    assert DAMAGED.of_copy(tables["hand_use@right"]) is None
    block = DAMAGED.of_copy(tables["repetition@dominant"])
    assert block is not None
    assert block.shape == (len(STATES) * 5, len(tables["repetition@dominant"].rows))


def test_states_are_numbered_as_scenarios_are() -> None:
    """Within a setting and outside value, scenarios run through the states in order."""
    assert [state_number(scenario) for scenario in SCENARIOS[:36]] == list(range(36))
