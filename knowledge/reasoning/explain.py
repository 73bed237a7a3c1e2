"""The whole way from damage and findings to ranked accounts, as one frozen value."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any, Protocol

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.references import split_reference
from byway.knowledge.reasoning.accounts import Account, build_account, title_of
from byway.knowledge.reasoning.findings import Finding, check_findings
from byway.knowledge.reasoning.grouping import PLAIN, Grouping, group_scenarios, kind_of
from byway.knowledge.reasoning.ledger import ledgers
from byway.knowledge.reasoning.next_tests import Outlook, next_axes, next_images, outlook
from byway.knowledge.reasoning.posterior import SCENARIOS, Reckoning, reckon
from byway.knowledge.reasoning.prepared import prepare
from byway.knowledge.reasoning.remote import remote_table
from byway.knowledge.reasoning.scenarios import Priors, Scenario, axis_priors, headroom_of, setting_of
from byway.knowledge.reasoning.wording import CAUTION

__all__ = ["Explanation", "Person", "Situation", "explain_findings", "function_table", "sign_table"]

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


@dataclass(frozen=True)
class Situation:
    """The person and the disease, as far as reasoning asks."""

    handedness: str
    stage: str
    cause: str
    priors: Priors | None = None


@dataclass(frozen=True, eq=False)
class Explanation:
    """What one lesion and some findings come to.

    Parameters
    ----------
    damage : DataFrame
        Damage by element with its interval, as the damage room gives it.
    functions : DataFrame
        ``function`` (copy id), ``key``, ``name``, ``domain``, ``capacity`` with ``low`` and ``high`` (5-95 % over
        draws; as drawn, typical organisation), ``capacity_cortical`` (regions alone), ``limited_by`` (element ids).
    signs : DataFrame
        ``sign``, ``side``, ``name``, ``domain``, ``expected_cortical`` (plain cortical reading), ``expected`` (all
        scenarios by their priors), ``low``, ``high`` (5-95 % over draws, as drawn), ``expected_given_findings``,
        ``found`` (grade, absent, or None where not tested).
    accounts : tuple of Account
        Best first; the plain cortical reading is always among them.
    other_posterior : float
        Posterior of accounts too unlikely to be shown.
    next_tests, next_images, next_axes : DataFrame
        See :mod:`~byway.knowledge.reasoning.next_tests`.
    remote : DataFrame
        Regions that lost input; see :mod:`~byway.knowledge.reasoning.remote`.
    uncharted_share : float
        Share of the lesion's white matter that lies in no segment of the graph; NaN where not reckoned.
    caution : str
        One line that goes with every display.
    situation : Situation
        Handedness, stage, cause and the case's own priors.
    reckoning, grouping, outlook
        The reckoning behind it, for sensitivity, what-if and the user's own account.
    """

    damage: pd.DataFrame
    functions: pd.DataFrame
    signs: pd.DataFrame
    accounts: tuple[Account, ...]
    other_posterior: float
    next_tests: pd.DataFrame
    next_images: pd.DataFrame
    next_axes: pd.DataFrame
    remote: pd.DataFrame
    uncharted_share: float
    caution: str
    situation: Situation
    reckoning: Reckoning = field(repr=False)
    grouping: Grouping = field(repr=False)
    outlook: Outlook = field(repr=False)

    @cached_property
    def titles(self) -> list[str]:
        """Title of every account in the order of the grouping, shown or not."""
        shown = {account.scenario: account.title for account in self.accounts}
        graph = self.reckoning.prepared.graph
        return [
            shown.get(group.scenario) or title_of(graph, group.scenario, kind_of(self.reckoning, group), ())
            for group in self.grouping.groups
        ]

    def ranking_if(self, sign: str, side: str, found: bool) -> pd.DataFrame:
        """What the ranking would become if an untested sign were found, or not: ``account``, ``now``, ``then``.

        Raises
        ------
        KeyError
            The sign was tested, or depends on nothing that is damaged.
        """
        if f"{sign}@{side}" not in self.outlook.signs:
            raise KeyError(f"{sign}@{side}")
        row = self.outlook.signs.index(f"{sign}@{side}")
        then = (self.outlook.if_present if found else self.outlook.if_absent)[row]
        table = pd.DataFrame({"account": self.titles, "now": self.grouping.posterior, "then": then})
        return table.sort_values("then", ascending=False, kind="stable").reset_index(drop=True)

    def to_json(self, *, indent: int | None = None) -> str:
        """Everything as JSON, by the same names; NaN becomes null."""
        plain = {
            "caution": self.caution,
            "accounts": [account.to_dict() for account in self.accounts],
            "other_posterior": self.other_posterior,
            "uncharted_share": self.uncharted_share,
            "situation": vars(self.situation).copy(),
        }
        for name in ("damage", "functions", "signs", "next_tests", "next_images", "next_axes", "remote"):
            plain[name] = getattr(self, name).to_dict("records")
        return json.dumps(_plain(plain), indent=indent, ensure_ascii=False, allow_nan=False)


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
    accounts = tuple(build_account(reckoning, grouping, books, index) for index in shown)
    titles = {account.scenario: account.title for account in accounts}
    ahead = outlook(reckoning, grouping)
    every_title = [titles.get(group.scenario) or title_of(graph, group.scenario, kind_of(reckoning, group), ())
                   for group in grouping.groups]  # fmt: skip
    return Explanation(
        damage=_damage_table(reckoning, damage) if damage_table is None else damage_table,
        functions=function_table(reckoning),
        signs=sign_table(reckoning),
        accounts=accounts,
        other_posterior=max(0.0, float(1.0 - sum(account.posterior for account in accounts))),
        next_tests=ahead.table(reckoning, every_title),
        next_images=next_images(reckoning, grouping),
        next_axes=next_axes(reckoning, grouping),
        remote=remote_table(prepared.remote, graph, np.asarray(damage.share, np.float32)),
        uncharted_share=uncharted_share,
        caution=CAUTION,
        situation=Situation(person.handedness, stage, cause, priors),
        reckoning=reckoning,
        grouping=grouping,
        outlook=ahead,
    )


def function_table(reckoning: Reckoning, scenario: Scenario = SCENARIOS[0]) -> pd.DataFrame:
    """Capacity of every function copy in one scenario, beside the plain cortical reading; see :class:`Explanation`."""
    graph = reckoning.prepared.graph
    tables = reckoning.prepared.tables[scenario.dominance, scenario.reliance]
    cortical = Scenario(**{**vars(scenario), "speaks": "cortical"})
    here, grey = reckoning.damage_of(scenario), reckoning.damage_of(cortical)
    rows = []
    for copy, table in tables.items():
        function = graph.functions[split_reference(copy)[0]]
        own = here[:, table.rows]
        limited: tuple[str, ...] = ()
        capacity = np.ones(1, np.float32)
        if own.any():
            capacity = table.cuts.capacity(own, reckoning.headroom)
            _, named = table.cuts.bottleneck(own.mean(axis=0), reckoning.headroom)
            limited = tuple(table.cuts.network.elements[i] for i in named) if capacity.mean() < 0.995 else ()
        plain = float(table.cuts.capacity(grey[:, table.rows], reckoning.headroom).mean())
        low, high = np.quantile(capacity, [0.05, 0.95])
        rows.append((copy, function.key, function.name, function.domain, float(capacity.mean()), float(low),
                     float(high), plain, limited))  # fmt: skip
    columns = ["function", "key", "name", "domain", "capacity", "low", "high", "capacity_cortical", "limited_by"]
    return pd.DataFrame(rows, columns=columns)


def sign_table(reckoning: Reckoning) -> pd.DataFrame:
    """Expected and found signs; see :class:`Explanation`."""
    graph = reckoning.prepared.graph
    plain, drawn = SCENARIOS.index(PLAIN), SCENARIOS[0]
    found = {finding.sign_id: finding.grade for finding in reckoning.findings}
    affected = set(reckoning.affected_signs)
    rate, prior_out = reckoning.outside_rates[0], reckoning.priors["outside"]["yes"]
    posterior_out = float(reckoning.posterior[[each.outside == "yes" for each in SCENARIOS]].sum())
    rows = []
    for sign_id in graph.sign_ids():
        key, _, side = sign_id.rpartition("@")
        sign = graph.signs[key]
        if sign_id in affected:
            expected = reckoning.expected(sign_id)
            draws = np.atleast_1d(np.asarray(reckoning.tail(setting_of(drawn), sign_id, 0)))
            low, high = np.quantile(draws[0] if draws.ndim == 2 else draws, [0.05, 0.95])
            cortical, full = float(expected[plain]), float(expected @ reckoning.prior)
            given = float(reckoning.expected_given_findings(sign_id) @ reckoning.posterior)
        else:
            low = high = cortical = sign.leak
            full, given = (1.0 - (1.0 - sign.leak) * (1.0 - rate * p) for p in (prior_out, posterior_out))
        rows.append((key, side, sign.name, sign.domain, cortical, full, float(low), float(high), given,
                     found.get(sign_id)))  # fmt: skip
    columns = ["sign", "side", "name", "domain", "expected_cortical", "expected", "low", "high",
               "expected_given_findings", "found"]  # fmt: skip
    table = pd.DataFrame(rows, columns=columns)
    table["found"] = pd.Series([row[-1] for row in rows], dtype=object)  # None stays None: not tested
    return table


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


def _plain(value: Any) -> Any:
    """JSON values: numpy scalars become numbers, tuples lists, NaN and infinities None."""
    if isinstance(value, Mapping):
        return {str(key): _plain(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [_plain(item) for item in value]
    if isinstance(value, np.generic):
        value = value.item()
    if isinstance(value, float) and not np.isfinite(value):
        return None
    return value
