"""Profile, reserve and rival models: what a screen shows beside the accounts."""

from __future__ import annotations

import numpy as np
import pytest
from toy_graph import FUNCTIONS, toy_graph
from toy_reckoning import absent, found, toy_explanation

from byway.knowledge.reasoning.models import compare_models
from byway.knowledge.reasoning.profile_view import profile
from byway.knowledge.reasoning.reserve import NO_PROMISE, asymmetry_words, reserve

DAMAGE = {"arc.long@left": 0.9, "temporal@left": 0.6}
FINDINGS = [found("repetition_loss", grade="severe"), absent("comprehension_loss"), found("amnesia")]


def test_profile_shows_the_mismatch() -> None:
    """Deficit nobody expected is positive, sparing nobody expected negative; an untested function has no mismatch."""
    view = profile(toy_explanation({**DAMAGE, "motor.capsule@left": 0.7}, FINDINGS)).set_index("function")
    assert view.loc["memory@bilateral", "mismatch"] > 0.8
    assert view.loc["comprehension@dominant", "mismatch"] < -0.1
    assert view.loc["comprehension@dominant", "found"] == "absent"
    assert view.loc["repetition@dominant", "found"] == "severe"
    assert view.loc["hand_use@left", "found"] is None
    assert np.isnan(view.loc["hand_use@left", "mismatch"])
    assert "hand_use@right" not in view.index
    assert view.loc["repetition@dominant", "capacity_cortical"] > view.loc["repetition@dominant", "capacity"]


def test_reserve_names_homologue_routes_and_promises_nothing() -> None:
    """The cut long segment: its counterpart is untouched, the indirect route carries on, and nothing is promised."""
    table = reserve(toy_explanation({"arc.long@left": 0.9}, FINDINGS, spread=0.02), {"arc.long": -0.3})
    row = table.set_index("element").loc["arc.long@left"]
    assert row["homologue"] == "arc.long@right"
    assert row["homologue_damage"] == pytest.approx(0.0)
    assert any("indirect" in words for words in row["spared_routes"])
    assert "untouched" in row["words"]
    assert row["words"].endswith(NO_PROMISE)
    assert "larger on the left (-0.30)" in row["asymmetry_words"]


def test_asymmetry_beside_its_norm() -> None:
    """A measured asymmetry of the arcuate's long segment is put beside the norm, with its basis."""
    graph = toy_graph()
    words = asymmetry_words(graph, "arcuate_fasciculus.long_ventral", 0.02)
    assert words.startswith("measured about equal on both sides (+0.02); people in general: strongly left 0.625")
    assert "our judgement" in words
    assert asymmetry_words(graph, "arc.long", float("nan")) == ""
    assert asymmetry_words(graph, "arc.long", 0.4).endswith("no norm in the graph")


def rival(load: float):
    """The toy graph with the direct route of repetition carrying a given load."""
    first, second = FUNCTIONS[0].routes
    routes = (first.model_copy(update={"usual_load": load}), second.model_copy(update={"usual_load": 1 - load}))
    changed = FUNCTIONS[0].model_copy(update={"routes": routes})
    return toy_graph(functions=(changed, *FUNCTIONS[1:]))


DIRECT, INDIRECT = rival(0.9), rival(0.1)
CASES = {
    "anterior segment": ("arc.anterior@left", "indirect decisive"),
    "posterior segment": ("arc.posterior@left", "indirect decisive"),
    "parietal region": ("parietal@left", "indirect decisive"),
    "direct segment": ("arc.long@left", "direct decisive"),
}


@pytest.mark.parametrize("case", CASES)
def test_rival_models_of_repetition(case: str) -> None:
    """Repetition lost after damage of one route speaks for the model in which that route is decisive."""
    element, expected = CASES[case]
    findings = [found("repetition_loss"), absent("comprehension_loss")]
    result = compare_models({
        "direct decisive": toy_explanation({element: 0.95}, findings, graph=DIRECT),
        "indirect decisive": toy_explanation({element: 0.95}, findings, graph=INDIRECT),
    })
    other = "direct decisive" if expected == "indirect decisive" else "indirect decisive"
    row = result.table.set_index("sign").loc["repetition_loss"]
    assert row["fits"] == expected
    assert result.odds(expected, other) > 2.0
    assert result.words.startswith(f"The findings speak for {expected}")
    assert result.table[expected].sum() == pytest.approx(result.evidence[expected])


def test_shared_parts_do_not_tell_rivals_apart() -> None:
    """Frontal damage takes both routes: the models agree."""
    findings = [found("repetition_loss")]
    result = compare_models({name: toy_explanation({"frontal@left": 0.95}, findings, graph=graph)
                             for name, graph in (("direct", DIRECT), ("indirect", INDIRECT))})  # fmt: skip
    assert result.words == "These findings do not tell the models apart."
    assert (result.table["fits"] == "").all()


def test_models_need_the_same_findings() -> None:
    """Fewer than two models, or other findings, are refused."""
    one = toy_explanation(DAMAGE, FINDINGS)
    with pytest.raises(ValueError, match="two models"):
        compare_models({"one": one})
    with pytest.raises(ValueError, match="different findings"):
        compare_models({"one": one, "two": toy_explanation(DAMAGE, FINDINGS[:1])})
