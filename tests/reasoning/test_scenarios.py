"""Scenarios: every combination, priors from norms or from the case, headroom, and leaning on a second route."""

from __future__ import annotations

import numpy as np
import pytest
from toy_graph import FUNCTIONS, toy_graph

from byway.knowledge.faults import BywayError, GraphError
from byway.knowledge.graph.networks import function_networks
from byway.knowledge.reasoning.posterior import SCENARIOS
from byway.knowledge.reasoning.prepared import prepare
from byway.knowledge.reasoning.scenarios import (
    AXES,
    Scenario,
    axis_priors,
    enumerate_scenarios,
    headroom_of,
    leaning,
    prior_vector,
    setting_of,
)

GRAPH = toy_graph()


def test_every_combination_once() -> None:
    """2 * 2 * 2 * 3 * 2 * 2 * 3 = 288 different scenarios, the undeparted first."""
    every = enumerate_scenarios()
    assert len(set(every)) == 288
    assert every[0].departures == ()
    assert every == SCENARIOS


def test_prior_is_the_product_over_axes() -> None:
    """The vector follows the order of the scenarios and sums to 1."""
    priors = axis_priors(GRAPH, "left", "subacute", "tumour")
    vector = prior_vector(priors)
    assert vector.sum() == pytest.approx(1.0)
    for s in (0, 17, 200, 287):
        expected = np.prod([priors[axis][getattr(SCENARIOS[s], axis)] for axis in AXES])
        assert vector[s] == pytest.approx(expected)


@pytest.mark.parametrize(("handedness", "expected"), [("right", 0.04), ("ambidextrous", 0.15), ("left", 0.27)])
def test_dominance_follows_handedness(handedness: str, expected: float) -> None:
    """4 %, 15 % and 27 % (Knecht et al. 2000, Brain 123:2512)."""
    assert axis_priors(GRAPH, handedness, "acute", "infarct")["dominance"]["right"] == pytest.approx(expected)


def test_swelling_passes_but_a_tumour_stays() -> None:
    """The perilesional prior of an infarct falls from acute to chronic, that of a tumour does not."""
    infarct = [axis_priors(GRAPH, "right", stage, "infarct")["perilesional"]["yes"] for stage in ("acute", "chronic")]
    tumour = [axis_priors(GRAPH, "right", stage, "tumour")["perilesional"]["yes"] for stage in ("acute", "chronic")]
    assert infarct == pytest.approx([0.15, 0.045])
    assert tumour[0] == tumour[1]


def test_a_cause_without_its_own_norm_is_other() -> None:
    """An unlisted cause takes the member ``other``."""
    assert axis_priors(GRAPH, "right", "acute", "abscess")["perilesional"]["yes"] == pytest.approx(0.2)


def test_a_case_sets_its_own_priors() -> None:
    """A number sets the departure of a two-valued axis, a mapping sets values; what is left out keeps its weight."""
    priors = axis_priors(GRAPH, "right", "acute", "infarct",
                         {"outside": 0.3, "scenario_prior_speaks": {"segments": 0.5}})  # fmt: skip
    assert priors["outside"] == pytest.approx({"no": 0.7, "yes": 0.3})
    assert priors["speaks"] == pytest.approx({"both": 0.6 / 1.35, "cortical": 0.25 / 1.35, "segments": 0.5 / 1.35})


@pytest.mark.parametrize(
    ("overrides", "message"),
    [
        ({"dominanse": 0.5}, "no such axis"),
        ({"dominance": {"up": 0.5}}, "up; expected left, right"),
        ({"speaks": 0.5}, "a number for each of both, cortical, segments"),
        ({"outside": 0.0}, "nothing is ruled out"),
        ({"outside": 1.0}, "nothing is ruled out"),
    ],
)
def test_bad_priors_are_refused(overrides: dict, message: str) -> None:
    """Unknown axes and values, a lone number for three values, and certainty are faults that say what would do."""
    with pytest.raises(BywayError, match=message):
        axis_priors(GRAPH, "right", "acute", "infarct", overrides)


def test_a_missing_norm_is_told() -> None:
    """Without its norm nothing is assumed."""
    with pytest.raises(GraphError, match="nobody"):
        axis_priors(GRAPH, "nobody", "acute", "infarct")


def test_headroom_grows_with_time_and_slow_growth() -> None:
    """None when acute, more when chronic, most for a slowly growing tumour unless it presents acutely."""
    assert [headroom_of(GRAPH, stage, "infarct") for stage in ("acute", "subacute", "chronic")] == [0.0, 0.15, 0.35]
    assert headroom_of(GRAPH, "chronic", "low_grade_tumour") == 0.6
    assert headroom_of(GRAPH, "acute", "low_grade_tumour") == 0.0


def test_leaning_on_the_second_route() -> None:
    """The second route of repetition then carries 0.8, the first the rest; a function with one route has none."""
    networks = function_networks(GRAPH, "left")
    leans = leaning(networks["repetition@dominant"], 0.8)
    assert leans is not None
    loads = dict(zip(leans.route_keys, leans.route_loads, strict=True))
    assert loads == pytest.approx({"direct": 0.2, "indirect": 0.8})
    assert leaning(networks["speech@dominant"], 0.8) is None
    assert leaning(networks["memory@bilateral"], 0.8) is None


def test_settings_are_numbered_as_scenarios_are() -> None:
    """Dominance runs slower than reliance."""
    assert [setting_of(Scenario(dominance=d, reliance=r)) for d in ("left", "right") for r in ("usual", "second")] == [
        0, 1, 2, 3,
    ]  # fmt: skip


def test_primary_functions_do_not_lean() -> None:
    """Routes of a function that each side has for itself are parts, not ways: the table is the same for both."""
    parts = FUNCTIONS[6].model_copy(update={"routes": FUNCTIONS[0].routes, "laterality": "each_side"})
    graph = toy_graph(functions=(*FUNCTIONS[:6], parts, *FUNCTIONS[7:]))
    tables = prepare(graph, graph.all_element_ids).tables
    assert tables["left", "second"]["field@left"] is tables["left", "usual"]["field@left"]
    assert tables["left", "second"]["repetition@dominant"] is not tables["left", "usual"]["repetition@dominant"]
