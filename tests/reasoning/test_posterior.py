"""The posterior against brute force and against exact inference on a Bayesian network, and its laws."""

from __future__ import annotations

import logging

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from strategies import damage_maps, finding_lists
from toy_graph import toy_draws, toy_graph
from toy_reckoning import absent, found, slow_likelihood, toy_reckoning

from byway.knowledge.faults import BywayError
from byway.knowledge.reasoning.findings import GRADES
from byway.knowledge.reasoning.posterior import SCENARIOS, SLIP, log_mean, reckon, weigh, with_findings, without_finding
from byway.knowledge.reasoning.prepared import prepare
from byway.knowledge.reasoning.scenarios import axis_priors

GRAPH = toy_graph()
DAMAGE = {"arc.long@left": 0.8, "arc.anterior@left": 0.5, "frontal@left": 0.4, "thalamus@left": 0.9,
          "motor.capsule@left": 0.3}  # fmt: skip
FINDINGS = [found("repetition_loss"), absent("comprehension_loss"), found("hand_weakness", "right", "mild"),
            found("hemianopia", "right", "severe"), absent("neglect", "right"), absent("slurred_speech"),
            absent("amnesia"), absent("trouble_swallowing")]  # fmt: skip


def brute_force(reckoning) -> np.ndarray:
    """Posterior of every scenario by enumeration of scenarios, draws and findings."""
    likelihood = np.zeros(len(SCENARIOS))
    for s, scenario in enumerate(SCENARIOS):
        for draw in range(reckoning.states.n_draws):
            likelihood[s] += np.prod([slow_likelihood(reckoning, scenario, f, draw) for f in reckoning.findings])
    weighted = reckoning.prior * likelihood
    return (1 - SLIP) * weighted / weighted.sum() + SLIP * reckoning.prior


def test_equals_brute_force() -> None:
    """With three draws and eight findings, all 288 posteriors equal plain enumeration to 1e-5."""
    reckoning = toy_reckoning(DAMAGE, FINDINGS, draws=3, handedness="left")
    np.testing.assert_allclose(reckoning.posterior, brute_force(reckoning), rtol=2e-4, atol=1e-8)


def test_equals_brute_force_when_chronic() -> None:
    """Headroom goes through the same path."""
    reckoning = toy_reckoning(DAMAGE, FINDINGS[:3], draws=2, stage="chronic")
    assert reckoning.headroom == 0.35
    np.testing.assert_allclose(reckoning.posterior, brute_force(reckoning), rtol=2e-4, atol=1e-8)


def test_equals_exact_inference_of_a_bayesian_network() -> None:
    """Variable elimination of pgmpy on the network scenario, draw -> findings gives the same posterior."""
    logging.getLogger("pgmpy").setLevel(logging.ERROR)
    factors = pytest.importorskip("pgmpy.factors.discrete")
    inference = pytest.importorskip("pgmpy.inference")
    models = pytest.importorskip("pgmpy.models")
    findings = FINDINGS[:4]
    reckoning = toy_reckoning(DAMAGE, findings, draws=2)
    make = getattr(models, "DiscreteBayesianNetwork", None) or models.BayesianNetwork
    names = [f"finding{i}" for i in range(len(findings))]
    model = make([(parent, name) for name in names for parent in ("scenario", "draw")])
    model.add_cpds(factors.TabularCPD("scenario", len(SCENARIOS), reckoning.prior[:, None]),
                   factors.TabularCPD("draw", 2, [[0.5], [0.5]]))  # fmt: skip
    for name, finding in zip(names, findings, strict=True):
        columns = [
            [slow_likelihood(reckoning, scenario, found(finding.sign, finding.side, grade), draw) for grade in GRADES]
            for scenario in SCENARIOS
            for draw in range(2)
        ]
        model.add_cpds(factors.TabularCPD(name, 4, np.array(columns).T, ["scenario", "draw"], [len(SCENARIOS), 2]))
    assert model.check_model()
    evidence = {name: GRADES.index(finding.grade) for name, finding in zip(names, findings, strict=True)}
    exact = inference.VariableElimination(model).query(["scenario"], evidence, show_progress=False).values
    np.testing.assert_allclose(reckoning.posterior, (1 - SLIP) * exact + SLIP * reckoning.prior, rtol=2e-4, atol=1e-8)


def test_readings_of_one_sign_sum_to_one() -> None:
    """Over its four grades, a finding's probabilities sum to 1 in every scenario and draw."""
    every = [found("hand_weakness", "right", grade) for grade in GRADES]
    logs = with_findings(toy_reckoning(DAMAGE, draws=4), every).finding_logs
    np.testing.assert_allclose(np.exp(logs).sum(axis=0), 1.0, atol=1e-5)


def test_without_findings_the_posterior_is_the_prior() -> None:
    """Nothing found, nothing learnt; an untested sign says nothing."""
    reckoning = toy_reckoning(DAMAGE)
    np.testing.assert_allclose(reckoning.posterior, reckoning.prior, rtol=1e-9)


def test_the_order_of_the_draws_and_the_findings_changes_nothing() -> None:
    """Permuted findings and permuted draws give the same posterior."""
    ids, drawn, _ = toy_draws(GRAPH, DAMAGE, draws=6)
    priors = axis_priors(GRAPH, "right", "acute", "infarct")
    order = np.array([3, 1, 5, 0, 2, 4])
    shuffled = {name: array[order] for name, array in drawn.items()}
    first = reckon(prepare(GRAPH, ids), drawn, FINDINGS, headroom=0.0, priors=priors)
    second = reckon(prepare(GRAPH, ids), shuffled, FINDINGS[::-1], headroom=0.0, priors=priors)
    np.testing.assert_allclose(first.posterior, second.posterior, rtol=1e-4)


@settings(max_examples=25, deadline=None)
@given(damage_maps(GRAPH), finding_lists(GRAPH, most=10), st.integers(0, 99))
def test_never_zero_or_one_whatever_was_found(damage: dict[str, float], findings: list, seed: int) -> None:
    """Contradictory findings leave every posterior strictly between 0 and 1, and their sum at 1."""
    posterior = toy_reckoning(damage, findings, graph=GRAPH, draws=5, seed=seed).posterior
    assert np.isfinite(posterior).all()
    assert posterior.sum() == pytest.approx(1.0)
    assert posterior.min() > 0.0
    assert posterior.max() < 1.0


@settings(max_examples=25, deadline=None)
@given(damage_maps(GRAPH), finding_lists(GRAPH), st.sampled_from(GRAPH.sign_ids()), st.sampled_from(GRADES))
def test_a_finding_favours_the_scenario_that_foresaw_it(
    damage: dict[str, float], findings: list, sign: str, grade: str
) -> None:
    """Adding a finding never lowers a scenario against one that gave the finding a lower probability."""
    before = toy_reckoning(damage, [f for f in findings if f.sign_id != sign], graph=GRAPH, draws=4)
    more = found(sign.partition("@")[0], sign.partition("@")[2], grade)
    after = with_findings(before, [*before.findings, more])
    foreseen = (np.exp(after.finding_logs[-1]) * before.draw_weights).sum(axis=1)
    gain = np.log(after.posterior) - np.log(before.posterior)
    order = np.argsort(foreseen)
    assert (np.diff(gain[order]) >= -2e-3).all()


def swap_sides(text: str) -> str:
    """An id on the other side."""
    return text.replace("@left", "@x").replace("@right", "@left").replace("@x", "@right")


@settings(max_examples=20, deadline=None)
@given(damage_maps(GRAPH), finding_lists(GRAPH))
def test_a_mirrored_case_gives_a_mirrored_result(damage: dict[str, float], findings: list) -> None:
    """Damage, findings and dominance mirrored: every scenario keeps its posterior with dominance mirrored."""
    ids, drawn, _ = toy_draws(GRAPH, damage, draws=4)
    columns = [ids.index(swap_sides(element)) for element in ids]
    mirrored = {name: array[:, columns] for name, array in drawn.items()}
    sides = {"left": "right", "right": "left", "none": "none"}
    findings_there = [found(f.sign, sides[f.side], f.grade) for f in findings]
    here = axis_priors(GRAPH, "right", "acute", "infarct", {"dominance": {"left": 0.9, "right": 0.1}})
    there = axis_priors(GRAPH, "right", "acute", "infarct", {"dominance": {"left": 0.1, "right": 0.9}})
    first = reckon(prepare(GRAPH, ids), drawn, findings, headroom=0.0, priors=here).posterior
    second = reckon(prepare(GRAPH, ids), mirrored, findings_there, headroom=0.0, priors=there).posterior
    np.testing.assert_allclose(first.reshape(2, -1), second.reshape(2, -1)[::-1], rtol=1e-4)


@settings(max_examples=20, deadline=None)
@given(damage_maps(GRAPH), st.sampled_from(GRAPH.all_element_ids), st.floats(0, 1, width=32))
def test_more_damage_never_makes_a_sign_less_likely(damage: dict[str, float], element: str, more: float) -> None:
    """Raising the damage of one element in every draw never lowers a sign, as drawn with all damage speaking."""
    ids, drawn, _ = toy_draws(GRAPH, damage, draws=4)
    worse = {name: array.copy() for name, array in drawn.items()}
    for array in worse.values():
        array[:, ids.index(element)] = np.maximum(array[:, ids.index(element)], more)
    priors = axis_priors(GRAPH, "right", "acute", "infarct")
    first, second = (reckon(prepare(GRAPH, ids), each, [], headroom=0.15, priors=priors) for each in (drawn, worse))
    speaking = [s for s, scenario in enumerate(SCENARIOS) if scenario.speaks != "segments"]
    for sign in GRAPH.sign_ids():
        assert (second.expected(sign)[speaking] >= first.expected(sign)[speaking] - 1e-5).all()


def test_left_out_finding_is_as_if_it_had_never_been() -> None:
    """Leaving a finding out equals reckoning without it."""
    whole = toy_reckoning(DAMAGE, FINDINGS, draws=5)
    rest = toy_reckoning(DAMAGE, FINDINGS[:2] + FINDINGS[3:], draws=5)
    np.testing.assert_allclose(without_finding(whole, 2).posterior, rest.posterior, rtol=1e-9)


def test_draws_of_a_wrong_shape_are_refused() -> None:
    """A missing variant, a wrong number of elements or shares above 1 name what was expected."""
    ids, drawn, _ = toy_draws(GRAPH, DAMAGE, draws=3)
    priors = axis_priors(GRAPH, "right", "acute", "infarct")

    def attempt(**changed: object) -> None:
        kept = {name: array for name, array in {**drawn, **changed}.items() if array is not None}
        reckon(prepare(GRAPH, ids), kept, [], headroom=0.0, priors=priors)

    with pytest.raises(BywayError, match="no variant perilesional"):
        attempt(perilesional=None)
    with pytest.raises(BywayError, match=r"too_small.*shape"):
        attempt(too_small=drawn["too_small"][:, :-1])
    with pytest.raises(BywayError, match="outside"):
        attempt(too_large=drawn["too_large"] + 2)


def test_weigh_and_log_mean_by_hand() -> None:
    """Prior 0.5 each, likelihood 0.2 and 0.6: posterior 0.25 and 0.75 before the slip; the mean of 0.2, 0.4 is 0.3."""
    posterior = weigh(np.array([0.5, 0.5]), np.log([0.2, 0.6]))
    np.testing.assert_allclose(posterior, [0.25, 0.75], atol=SLIP)
    assert log_mean(np.log([[0.2, 0.4]]))[0] == pytest.approx(np.log(0.3))
    assert log_mean(np.array([[-2000.0, -2000.0]]))[0] == pytest.approx(-2000.0)
