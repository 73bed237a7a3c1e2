"""The ranking before and after: matched by departures, told in a sentence."""

from __future__ import annotations

from dataclasses import replace

import pytest
from toy_explanation import toy_explanation

from byway.knowledge.reasoning.explanation import Explanation
from byway.knowledge.reasoning.ranking import ranking_change, ranking_words


@pytest.fixture(scope="module")
def explained() -> Explanation:
    """The toy case, explained."""
    return toy_explanation()


def test_nothing_changes(explained: Explanation) -> None:
    """An explanation against itself: every rank and posterior the same, and the sentence says so."""
    table = ranking_change(explained, explained)
    assert table["account"].tolist() == [account.key for account in explained.accounts]
    assert (table["rank_before"] == table["rank_after"]).all()
    assert (table["change"] == 0).all()
    assert ranking_words(table) == "The ranking stays as it is."


def test_another_leads(explained: Explanation) -> None:
    """With the first two posteriors swapped, the sentence names the new leader; a gone account stays listed."""
    first, second, *rest = explained.accounts
    swapped = (replace(second, posterior=first.posterior), replace(first, posterior=second.posterior), *rest[:-1])
    table = ranking_change(explained, replace(explained, accounts=swapped))
    assert table.iloc[0]["account"] == second.key
    assert table.iloc[0]["rank_before"] == 2
    gone = table[table["account"] == rest[-1].key].iloc[0]
    assert gone["after"] != gone["after"]
    assert gone["change"] == -rest[-1].posterior
    assert table["change"].iloc[0] == pytest.approx(first.posterior - second.posterior)
    if first.posterior - second.posterior >= 0.005:
        assert ranking_words(table).startswith(f"Another account leads now: {second.title}.")
