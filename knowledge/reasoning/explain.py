"""The whole way from damage and findings to ranked accounts."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Protocol

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from byway.knowledge.graph.graph import Graph
from byway.knowledge.reasoning.accounts import Account, build_account, title_of
from byway.knowledge.reasoning.explanation import Explanation, Situation
from byway.knowledge.reasoning.findings import Finding, check_findings
from byway.knowledge.reasoning.grouping import group_scenarios, kind_of
from byway.knowledge.reasoning.ledger import ledgers
from byway.knowledge.reasoning.next_tests import next_axes, next_images, outlook
from byway.knowledge.reasoning.posterior import SCENARIOS, Reckoning, reckon
from byway.knowledge.reasoning.prepared import prepare
from byway.knowledge.reasoning.remarks import few_bits, own_side, tell_apart
from byway.knowledge.reasoning.remote import blamed_regions, remote_table
from byway.knowledge.reasoning.scenarios import Priors, axis_priors, headroom_of
from byway.knowledge.reasoning.tables import function_table, sign_table
from byway.knowledge.reasoning.wording import CAUTION

__all__ = ["Explanation", "Person", "explain_findings"]

MOST_ACCOUNTS = 12


class Person(Protocol):
    """What reasoning needs of a person."""

    @property
    def handedness(self) -> str:
        """``right``, ``left``, ``ambidextrous`` or ``unknown``."""


class _Draws(Protocol):
    """The damage ensemble, by variant."""

    @property
    def draws(self) -> Mapping[str, NDArray[np.float32]]: ...


class _Damage(Protocol):
    """Point damage of every element."""

    @property
    def share(self) -> NDArray[np.float32]: ...

    @property
    def element_ids(self) -> tuple[str, ...]: ...


def explain_findings(
    graph: Graph,
    ensemble: _Draws,
    damage: _Damage,
    person: Person,
    stage: str,
    cause: str,
    findings: Sequence[Finding],
    *,
    priors: Priors | None = None,
    damage_table: pd.DataFrame | None = None,
    uncharted_share: float = float("nan"),
    most_accounts: int = MOST_ACCOUNTS,
) -> Explanation:
    """Explain findings by a lesion.

    Parameters
    ----------
    graph : Graph
        What is known.
    ensemble : has ``draws``
        Mapping from variant (``as_drawn``, ``too_small``, ``too_large``, ``perilesional``) to (M, E) damage.
    damage : has ``element_ids`` and ``share``
        Point damage, in the order of the ensemble's columns.
    person : has ``handedness``
    stage : {'acute', 'subacute', 'chronic'}
    cause : str
        A member of the norm ``scenario_prior_perilesional``, or anything else, which counts as ``other``.
    findings : sequence of Finding
        What was found; order changes nothing.
    priors : mapping, optional
        The case's own priors; see :func:`~byway.knowledge.reasoning.scenarios.axis_priors`.
    damage_table : DataFrame, optional
        Shown as ``.damage``; by default element, share and interval.
    uncharted_share : float, optional
        Passed through.
    most_accounts : int
        Number of accounts that are written out.

    Raises
    ------
    BywayError
        A finding that the graph does not know, a prior that is no probability, draws of a wrong shape.
    GraphError
        A norm is missing, or a function needs an element that has no geometry.
    """
    prepared = prepare(graph, tuple(damage.element_ids))
    reckoning = reckon(
        prepared,
        ensemble.draws,
        check_findings(graph, findings),
        headroom=headroom_of(graph, stage, cause),
        priors=axis_priors(graph, person.handedness, stage, cause, priors),
    )
    grouping = group_scenarios(reckoning)
    books = ledgers(reckoning, grouping)
    shown = list(range(min(most_accounts, len(grouping.groups))))
    if grouping.plain not in shown:
        shown[-1] = grouping.plain
    alarm = own_side(reckoning)
    built = tell_apart(graph, [build_account(reckoning, grouping, books, index) for index in shown])
    accounts = tuple(replace(account, cautions=(*alarm, *account.cautions)) for account in built)
    titles = {account.scenario: account.title for account in accounts}
    ahead = outlook(reckoning, grouping)
    every_title = [titles.get(group.scenario) or title_of(graph, group.scenario, kind_of(reckoning, group), ())
                   for group in grouping.groups]  # fmt: skip
    tests = ahead.table(reckoning, every_title)
    return Explanation(
        damage=_damage_table(reckoning, damage) if damage_table is None else damage_table,
        functions=function_table(reckoning),
        signs=sign_table(reckoning),
        accounts=accounts,
        other_posterior=max(0.0, float(1.0 - sum(account.posterior for account in accounts))),
        next_tests=tests,
        next_images=next_images(reckoning, grouping),
        next_axes=next_axes(reckoning, grouping),
        remote=_remote_table(reckoning, accounts),
        uncharted_share=uncharted_share,
        caution=CAUTION,
        remarks=(*alarm, *few_bits(tests)),
        situation=Situation(person.handedness, stage, cause, priors),
        reckoning=reckoning,
        grouping=grouping,
        outlook=ahead,
    )


def _remote_table(reckoning: Reckoning, accounts: Sequence[Account]) -> pd.DataFrame:
    """Regions that lost input as drawn, and every region that an account names as silenced."""
    remote = reckoning.prepared.remote
    silenced: dict[int, float] = {}
    drawn = reckoning.damage_of(SCENARIOS[0])
    pairs = [(drawn, ())] + [(reckoning.damage_of(replace(each.scenario, remote="no")), each.elements)
                             for each in accounts if each.scenario.remote == "yes"]  # fmt: skip
    for damage, elements in pairs:
        for region, share in blamed_regions(remote, damage, elements).items():
            silenced[region] = max(share, silenced.get(region, 0.0))
    return remote_table(remote, reckoning.prepared.graph, drawn.mean(axis=0), silenced=silenced)


def _damage_table(reckoning: Reckoning, damage: _Damage) -> pd.DataFrame:
    """Element, kind, name, side, share and interval: what can be said without geometry."""
    prepared = reckoning.prepared
    drawn = reckoning.damage_of(SCENARIOS[0])
    low, high = np.quantile(drawn, [0.05, 0.95], axis=0)
    rows = [
        (element, "region" if prepared.is_region[i] else "segment", prepared.graph.name_of(element),
         element.rpartition("@")[2], float(damage.share[i]), float(low[i]), float(high[i]))
        for i, element in enumerate(prepared.element_ids)
    ]  # fmt: skip
    table = pd.DataFrame(rows, columns=["element", "kind", "name", "side", "share", "low", "high"])
    return table.sort_values("share", ascending=False, kind="stable").reset_index(drop=True)
