"""Remote effects: lost input by hand, what is silenced, and the table that says why."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from toy_graph import toy_graph
from toy_reckoning import absent, found, toy_explanation

from byway.knowledge.reasoning.remote import blamed_regions, named_regions, remote_model, remote_table, segment_ends

GRAPH = toy_graph()
IDS = GRAPH.all_element_ids
MODEL = remote_model(GRAPH, IDS)


def share(**damage: float) -> np.ndarray:
    """Damage of the left side, (E,)."""
    values = np.zeros(len(IDS), np.float32)
    for key, value in damage.items():
        values[IDS.index(f"{key.replace('__', '.')}@left")] = value
    return values


def lost(region: str, **damage: float) -> float:
    """Input lost by a region."""
    losses = MODEL.input_loss(share(**damage)[:, None])
    return float(losses.get(IDS.index(f"{region}@left"), np.zeros(1))[0])


def test_lost_input_by_hand() -> None:
    """The visual region has one connection, to the thalamus: cut by 0.5 and the thalamus lost by 0.5, it lost 0.75."""
    assert lost("visual", radiation__back=0.5, thalamus=0.5) == pytest.approx(0.75)
    assert lost("visual", arc__long=1.0) == 0.0


def test_connections_are_weighed_by_cross_section() -> None:
    """The frontal region has three equal segments (long, anterior, front radiation): one cut is a third."""
    assert lost("frontal", arc__long=1.0) == pytest.approx(1 / 3)


def test_junctions_pass_input_on() -> None:
    """The hand region reaches the thalamus and the face region through the capsule's junction, half the weight each."""
    assert lost("hand", motor__capsule=1.0) == pytest.approx(0.5)
    assert lost("hand", motor__corona=1.0) == pytest.approx(1.0)
    assert segment_ends(GRAPH)["motor.corona@left"] == ("hand@left", "wm:capsule@left")


def test_silenced_from_the_threshold_on() -> None:
    """Below half the input nothing is silenced; above, the damage is 0.6 times the lost share, or the own if larger."""
    damage = np.stack([share(thalamus=0.4), share(thalamus=0.9), share(thalamus=0.9, visual=0.8)], axis=1)
    silenced = MODEL.silenced(damage)[IDS.index("visual@left")]
    np.testing.assert_allclose(silenced, [0.0, 0.54, 0.8], atol=1e-6)


def test_a_deep_infarct_silences_intact_cortex() -> None:
    """A thalamic lesion with a field defect but spared segments: the remote account names the visual cortex."""
    damage = {"thalamus@left": 0.95}
    findings = [found("halting_speech"), absent("hand_weakness", "right"), absent("comprehension_loss")]
    priors = {"remote": 0.5}
    explanation = toy_explanation(damage, findings, priors=priors)
    visual = explanation.remote.set_index("element").loc["visual@left"]
    assert bool(visual["named"])
    assert "lost" in visual["words"]
    assert "may fall silent" in visual["words"]


def test_standard_measures_fall_with_damage() -> None:
    """Strength, communicability and closeness go down for a region that lost input, and shortest routes get longer."""
    table = remote_table(MODEL, GRAPH, share(arc__long=0.9, radiation__front=0.5)).set_index("element")
    row = table.loc["frontal@left"]
    assert row["strength_after"] < row["strength_before"]
    assert row["communicability_kept"] < 1.0
    assert row["path_after"] > row["path_before"]


def test_no_damage_names_no_region() -> None:
    """An intact network gives an empty table with its columns."""
    table = remote_table(MODEL, GRAPH, share())
    assert table.empty
    assert "words" in table.columns
    assert named_regions(MODEL, GRAPH, share()[None]) == []


def test_brainstem_and_white_matter_are_never_silenced() -> None:
    """A region made of such tissue passes input on but is not silenced, not listed and not named."""
    regions = {**GRAPH.regions, "visual": GRAPH.regions["visual"].model_copy(update={"tissue": "brainstem"})}
    model = remote_model(replace(GRAPH, regions=regions), IDS)
    damage = share(thalamus=1.0)
    assert IDS.index("visual@left") in MODEL.silenced(damage[:, None])
    assert IDS.index("visual@left") not in model.silenced(damage[:, None])
    assert "visual@left" not in set(remote_table(model, GRAPH, damage)["element"])
    assert model.connections == MODEL.connections


def test_the_table_lists_what_accounts_blame() -> None:
    """Every region that a card calls silenced, or that an account with silenced regions rests on, is in the table,
    with the share of draws."""
    findings = [found("halting_speech"), absent("hand_weakness", "right"), absent("comprehension_loss")]
    explanation = toy_explanation({"thalamus@left": 0.95}, findings, priors={"remote": 0.5})
    table = explanation.remote.set_index("element")
    blaming = [each for each in explanation.accounts if each.scenario.remote == "yes"]
    assert table["named"].any()
    for each in blaming:
        before = explanation.reckoning.damage_of(replace(each.scenario, remote="no"))
        for region, part in blamed_regions(explanation.reckoning.prepared.remote, before, each.elements).items():
            row = table.loc[explanation.reckoning.prepared.element_ids[region]]
            assert bool(row["named"])
            assert row["silenced_share"] >= part > 0.0
