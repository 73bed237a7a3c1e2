"""Textbook pairings of lesion and signs, end to end: what the accounts must name, and what must not be expected."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from byway.knowledge.cases.case import Case
from byway.knowledge.cases.desk import Desk, desk_for
from byway.knowledge.cases.explaining import explain
from byway.knowledge.cases.model import CaseFile
from byway.knowledge.reasoning.explanation import Explanation

VIGNETTES = json.loads((Path(__file__).parent / "data" / "vignettes.json").read_text())


@pytest.fixture(scope="module")
def desk() -> Desk:
    """Curated graph and template geometry."""
    return desk_for(progress=False)


@pytest.fixture(scope="module")
def explained(desk: Desk, tmp_path_factory: pytest.TempPathFactory) -> dict[str, Explanation]:
    """Explanation of every vignette, by id."""
    folder = tmp_path_factory.mktemp("vignettes")
    return {each["id"]: explain(Case(CaseFile.model_validate(each["case"]), folder), desk=desk) for each in VIGNETTES}


def named(explanation: Explanation) -> set[str]:
    """Elements of the first three accounts."""
    return {element for account in explanation.accounts[:3] for element in account.elements}


def test_expected_elements_are_named(explained: dict[str, Explanation]) -> None:
    """In at least 11 of 12, every expected place is among the elements of the first three accounts."""
    missed = {
        each["id"]: choices
        for each in VIGNETTES
        for choices in each["expect"]["any_of_elements_top3"]
        if not named(explained[each["id"]]).intersection(choices)
    }
    assert len(missed) <= 1, missed


def test_an_accepted_kind_comes_first(explained: dict[str, Explanation]) -> None:
    """In at least 8 of 12 the first account is of an accepted kind."""
    first = {each["id"]: explained[each["id"]].accounts[0].kind for each in VIGNETTES}
    right = [each["id"] for each in VIGNETTES if first[each["id"]] in each["expect"]["account_kinds"]]
    assert len(right) >= 8, first


def test_absent_signs_are_not_expected(explained: dict[str, Explanation]) -> None:
    """At least 90 % of the signs that a vignette lists as absent stay below 0.5 under the full model."""
    expected = {}
    for each in VIGNETTES:
        table = explained[each["id"]].signs.set_index(["sign", "side"])["expected"]
        for finding in each["case"]["findings"]:
            if finding["grade"] == "absent":
                expected[each["id"], finding["sign"], finding["side"]] = table[finding["sign"], finding["side"]]
    low = [key for key, value in expected.items() if value < 0.5]
    assert len(low) >= 0.9 * len(expected), {key: value for key, value in expected.items() if value >= 0.5}


def test_no_one_is_sure(explained: dict[str, Explanation]) -> None:
    """Posteriors stay within (0, 1) and sum to 1 with what is not shown."""
    for explanation in explained.values():
        total = sum(account.posterior for account in explanation.accounts) + explanation.other_posterior
        assert total == pytest.approx(1.0)
        assert all(0.0 < account.posterior < 1.0 for account in explanation.accounts)
