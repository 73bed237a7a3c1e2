"""Sentences to read before the accounts: signs on the lesion's own side, tests that tell little, accounts alike."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import pandas as pd

from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.references import split_reference
from byway.knowledge.reasoning.accounts import LIKELY, Account, title_elements
from byway.knowledge.reasoning.posterior import SCENARIOS, Reckoning
from byway.knowledge.reasoning.wording import departure_words, in_a_sentence, join

__all__ = ["LEAST_BITS", "ONE_SIDED", "few_bits", "lesion_side", "own_side", "tell_apart"]

ONE_SIDED = 0.95
"""Share of the damage of paired elements that one hemisphere must hold for the lesion to count as one-sided."""

LEAST_BITS = 0.04
"""Expected information below which no bedside test is said to tell the accounts well apart."""


def lesion_side(reckoning: Reckoning) -> str | None:
    """Hemisphere that holds nearly all damage of what functions rest on, as drawn; None where both share in it."""
    prepared = reckoning.prepared
    bearing = np.unique(np.concatenate([table.rows for table in prepared.tables["left", "usual"].values()]))
    damage = reckoning.damage_of(SCENARIOS[0]).mean(axis=0)
    lost = {"left": 0.0, "right": 0.0}
    for row in bearing.tolist():
        side = split_reference(prepared.element_ids[row])[1]
        if side in lost:
            lost[side] += float(damage[row])
    total = sum(lost.values())
    return next((side for side, part in lost.items() if total > 0.0 and part > ONE_SIDED * total), None)


def own_side(reckoning: Reckoning) -> tuple[str, ...]:
    """An alarm where signs that should lie opposite to a one-sided lesion were found on its own side.

    A sign that the lesion as drawn makes likely (because what it rests on crosses) raises none.
    """
    side = lesion_side(reckoning)
    graph = reckoning.prepared.graph
    odd = [
        finding.sign for finding in reckoning.findings
        if finding.present and side is not None and finding.side == side
        and graph.signs[finding.sign].side_rule == "contralateral"
        and float(reckoning.expected(finding.sign_id)[0]) < LIKELY
    ]  # fmt: skip
    if not odd:
        return ()
    names = join([in_a_sentence(graph.signs[sign].name) for sign in odd])
    verb, it = ("is", "finding") if len(odd) == 1 else ("are", "findings")
    return (f"{names[0].upper()}{names[1:]} {verb} on the same side as the lesion ({side}): check the side of the {it} "
            "and the left-right orientation of the mask.",)  # fmt: skip


def few_bits(next_tests: pd.DataFrame) -> tuple[str, ...]:
    """A line where the best of the next tests would tell little."""
    best = float(next_tests["bits"].max()) if len(next_tests) else 0.0
    if best >= LEAST_BITS:
        return ()
    return ("No bedside test here would tell the accounts well apart; see which scans would.",)


def tell_apart(graph: Graph, accounts: Sequence[Account]) -> tuple[Account, ...]:
    """The same accounts; one that names what an earlier one names says in a line how it differs from that."""
    first: dict[frozenset[str], int] = {}
    told = []
    for number, account in enumerate(accounts):
        named = frozenset(title_elements(graph, account))
        earlier = first.setdefault(named, number)
        if earlier == number:
            told.append(account)
            continue
        words = join(departure_words(accounts[earlier].scenario, account.scenario))
        differs = f"As account {earlier + 1}, but here {words}." if words else ""
        cautions = (differs, *account.cautions) if differs else account.cautions
        told.append(replace(account, differs=differs, cautions=cautions))
    return tuple(told)
