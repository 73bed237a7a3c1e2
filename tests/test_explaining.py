"""The whole way on the curated graph: from a lesion and findings to ranked accounts."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from byway.knowledge import Explanation, Template, explain, open_case
from byway.knowledge.cases.case import Case
from byway.knowledge.cases.model import CaseFile
from byway.knowledge.lesion.images import write_mask

DEMO = Path(__file__).parents[1] / "notebooks" / "cases" / "first_case"
LANGUAGE = ("repetition_deficit", "nonfluent_speech", "phonemic_paraphasia", "apraxia_of_speech")
BODY = ("facial_weakness_central", "arm_weakness", "leg_weakness")


def case_of(shapes: list[dict[str, Any]], findings: list[tuple[str, str, str]] = [], **fields: Any) -> Case:  # noqa: B006
    """A case with one core compartment drawn from ellipsoids (centre, radii)."""
    spec = {
        "person": {"handedness": "right"},
        "stage": "acute",
        "cause": "infarct",
        "lesion": {"compartments": [{"name": "core", "kind": "core", "effect": 1.0, "shapes": shapes}]},
        "findings": [{"sign": sign, "side": side, "grade": grade} for sign, side, grade in findings],
    }
    return Case(CaseFile.model_validate({**spec, **fields}), Path("."))


def ellipsoid(centre: tuple[float, ...], radii: tuple[float, ...]) -> dict[str, Any]:
    """A shape of case.yaml."""
    return {"shape": "ellipsoid", "centre_mm": centre, "radii_mm": radii}


@pytest.fixture(scope="module")
def demo() -> Explanation:
    """The first demo case, explained."""
    return explain(open_case(DEMO))


def expected(explanation: Explanation, sign: str, side: str = "none") -> float:
    """P(sign) under the full model."""
    return float(explanation.signs.set_index(["sign", "side"]).loc[(sign, side), "expected"])


def test_an_oedema_that_reaches_the_arcuate_is_disconnection(demo: Explanation) -> None:
    """Repetition and articulation impaired, comprehension spared, inferior frontal cortex untouched: disconnection
    of arcuate segments ranks above the plain cortical reading, and the plain reading is on the ledger."""
    share = demo.damage.set_index("element")["share"]
    assert share["ifg_opercularis@left"] < 0.05
    assert min(share["arcuate_fasciculus.long_ventral@left"], share["arcuate_fasciculus.anterior_indirect@left"]) > 0.3
    first = demo.accounts[0]
    assert first.kind == "segment_disconnection"
    assert {"arcuate_fasciculus.long_ventral@left", "arcuate_fasciculus.anterior_indirect@left"} <= set(first.elements)
    plain = next(account for account in demo.accounts if account.is_plain)
    assert first.posterior > plain.posterior
    assert first.odds_vs_cortical == pytest.approx(first.posterior / plain.posterior, rel=1e-6)


def test_the_plain_reading_wins_where_cortex_is_hit_and_segments_are_spared(tmp_path: Path, template: Template) -> None:
    """A lesion of just the hand area's cortex with weakness of that hand alone: what blames the cortex ranks above
    every account that blames cut segments alone, and so does the plain cortical reading."""
    write_mask(tmp_path / "hand.nii.gz", template.parcel("precentral_hand", "left"))
    findings = [("hand_weakness", "right", "severe"), ("leg_weakness", "right", "absent"),
                ("facial_weakness_central", "right", "absent"), ("hemihypoesthesia", "right", "absent")]  # fmt: skip
    spec = case_of([ellipsoid((0, 0, 0), (1, 1, 1))], findings).spec
    lesion = {"compartments": [{"name": "core", "kind": "core", "effect": 1.0, "file": "hand.nii.gz"}]}
    explanation = explain(Case(spec, tmp_path).with_spec(lesion=lesion))
    first, plain = explanation.accounts[0], next(a for a in explanation.accounts if a.is_plain)
    assert first.kind in ("cortical_damage", "both")
    assert "precentral_hand@left" in first.elements
    assert plain.elements == ("precentral_hand@left",)
    disconnection = [a.posterior for a in explanation.accounts if a.kind == "segment_disconnection"]
    assert plain.posterior > max(disconnection, default=0.0)


def test_an_insular_lesion_moves_with_its_extension() -> None:
    """Extended ventrally it adds the contralateral visual field, medially the contralateral face, arm and leg,
    dorsally language (common practice, no source)."""
    insula = ellipsoid((-38, 2, 2), (6, 14, 10))
    base = explain(case_of([insula]))
    ventral = explain(case_of([insula, ellipsoid((-37, -10, -13), (7, 14, 9))]))
    medial = explain(case_of([insula, ellipsoid((-26, -10, 10), (8, 12, 10))]))
    dorsal = explain(case_of([insula, ellipsoid((-39, 0, 24), (9, 18, 9))]))

    field = ("homonymous_superior_quadrantanopia", "right")
    assert expected(ventral, *field) > expected(base, *field) + 0.1
    assert expected(ventral, *field) > max(expected(medial, *field), expected(dorsal, *field))
    for sign in BODY:
        assert expected(medial, sign, "right") > expected(base, sign, "right") + 0.3
        assert expected(medial, sign, "left") < 0.1
    for sign in LANGUAGE:
        assert expected(dorsal, sign) > expected(base, sign) + 0.3
        assert expected(dorsal, sign) > expected(ventral, sign)


def test_a_mirrored_case_mirrors_its_result() -> None:
    """A capsular lesion on the other side, in somebody with mirrored dominance odds set aside, mirrors the signs of
    the body exactly and the damage to a few hundredths (the template is symmetric, its streamlines are mirrored)."""
    left = explain(case_of([ellipsoid((-24, -14, 10), (5, 7, 7))]))
    right = explain(case_of([ellipsoid((24, -14, 10), (5, 7, 7))]))
    a, b = (e.damage.set_index("element")["share"] for e in (left, right))
    for element, share in a.items():
        mirrored = str(element).replace("@left", "@x").replace("@right", "@left").replace("@x", "@right")
        assert b[mirrored] == pytest.approx(share, abs=0.05), element
    for sign in BODY:
        assert expected(left, sign, "right") == pytest.approx(expected(right, sign, "left"), abs=0.05)


def test_posteriors_sum_to_one_and_no_account_is_certain(demo: Explanation) -> None:
    """Posteriors with the rest sum to 1; none is 0 or 1; each ledger's sum gives its odds."""
    assert sum(a.posterior for a in demo.accounts) + demo.other_posterior == pytest.approx(1.0, abs=1e-9)
    for account in demo.accounts:
        assert 0.0 < account.posterior < 1.0
        assert np.exp(account.ledger["vs_cortical"].sum()) == pytest.approx(account.odds_vs_cortical, rel=1e-6)


def test_every_account_can_print_its_claims_and_sources(demo: Explanation) -> None:
    """An account that blames elements names claims for it, and each claim's sources are in the graph."""
    graph = demo.reckoning.prepared.graph
    for account in demo.accounts:
        if account.elements:
            assert account.claims_for
        assert all(graph.sources_of(claim) for claim in account.claims_for)
        assert set(account.sources) <= set(graph.sources)


def test_json_has_the_same_names_and_numbers(demo: Explanation) -> None:
    """What to_json writes equals what Python says, by the same names."""
    data = json.loads(demo.to_json())
    assert [a["posterior"] for a in data["accounts"]] == pytest.approx([a.posterior for a in demo.accounts])
    assert data["accounts"][0]["elements"] == list(demo.accounts[0].elements)
    assert data["uncharted_share"] == pytest.approx(demo.uncharted_share)
    assert {row["sign"] for row in data["signs"]} == set(demo.signs["sign"])
    assert set(data["signs"][0]) == set(demo.signs.columns)


def test_the_order_of_findings_changes_nothing(demo: Explanation) -> None:
    """Findings in another order give the same posterior."""
    case = open_case(DEMO)
    turned = explain(case.with_spec(findings=tuple(reversed(case.spec.findings))))
    assert [a.posterior for a in turned.accounts] == pytest.approx([a.posterior for a in demo.accounts], rel=1e-5)


def test_priors_of_the_case_take_the_place_of_the_graph(demo: Explanation) -> None:
    """A case that holds an outside cause likely gives that account a larger posterior."""
    case = open_case(DEMO)
    other = explain(case.with_spec(priors={"scenario_prior_outside": 0.5}))

    def outside(explanation: Explanation) -> float:
        reckoning = explanation.reckoning
        return float(reckoning.priors["outside"]["yes"])

    assert outside(other) > outside(demo)
