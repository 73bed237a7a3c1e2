"""Accounts as cards: standing, what each explains, leaves and predicts in vain, and the evidence for and against."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.records import Claim
from byway.knowledge.graph.references import split_reference
from byway.knowledge.reasoning.attribution import Attribution, Bottleneck, attribute, bottlenecks
from byway.knowledge.reasoning.grouping import AccountKind, Group, Grouping, kind_of
from byway.knowledge.reasoning.ledger import Ledgers
from byway.knowledge.reasoning.posterior import Reckoning
from byway.knowledge.reasoning.remote import named_regions
from byway.knowledge.reasoning.rerouting import route_flows
from byway.knowledge.reasoning.scenarios import Scenario, setting_of
from byway.knowledge.reasoning.sparing import Sparing, explain_sparing
from byway.knowledge.reasoning.wording import DEPARTURE_WORDS, in_words, join, list_names, route_name

__all__ = ["LIKELY", "Account", "FoundSign", "build_account", "title_elements", "title_of"]

LIKELY = 0.5
"""P(sign) from which an account is said to explain a finding, or to predict a sign that was not found."""

MOST_SILENT = 3  # silenced regions that a card writes out

_MOVED = 0.05  # change of what a route carries from which a card says so
_WEIGHTY = 0.05  # share of the explained loss from which an element may stand in the title


@dataclass(frozen=True)
class FoundSign:
    """A sign as a card lists it, with its probability under the account."""

    sign: str
    side: str
    name: str
    found: str
    p_sign: float


@dataclass(frozen=True, eq=False)
class Account:
    """One way to explain the findings.

    Parameters
    ----------
    key : str
        Stable name: its departures, joined by ``+``, or ``as_drawn``.
    title : str
        One line.
    kind : str
        One of the nine kinds.
    scenario : Scenario
        The scenario that stands for it.
    departures : tuple of (axis, value)
        Where it departs from as drawn, typical organisation.
    merged : int
        Number of scenarios that predict the same and are counted with it.
    prior, posterior : float
        In (0, 1).
    words : str
        The posterior on the fixed verbal scale.
    odds_vs_cortical : float
        Posterior odds against the plain cortical reading.
    is_plain : bool
        Whether it contains that reading.
    elements : tuple of str
        Element ids that account for what it explains, most first.
    shares : tuple of float
        Share of the explained loss that each of ``elements`` accounts for.
    ledger : DataFrame
        See :mod:`~byway.knowledge.reasoning.ledger`.
    bottlenecks : DataFrame
        ``function`` (copy id), ``name``, ``elements`` (tuple of ids), ``capacity``, ``words``.
    counterfactuals : DataFrame
        ``element``, ``sign``, ``side``, ``change`` in P(sign) were the element intact.
    explains, leaves, predicts_absent : tuple of FoundSign
        Findings it makes likely; findings it does not; signs it makes likely that were looked for and not found.
    sparing : tuple of Sparing
        Why feared signs may be absent.
    claims_for, claims_against : tuple of Claim
        Claims of the graph that it rests on, and that dispute them.
    sources : tuple of str
        Source keys of those claims.
    cautions : tuple of str
        Sentences to read before using it.
    differs : str
        How it differs from an earlier account that names the same elements; empty where none does. Also the first of
        ``cautions``.
    """

    key: str
    title: str
    kind: AccountKind
    scenario: Scenario
    departures: tuple[tuple[str, str], ...]
    merged: int
    prior: float
    posterior: float
    words: str
    odds_vs_cortical: float
    is_plain: bool
    elements: tuple[str, ...]
    shares: tuple[float, ...]
    ledger: pd.DataFrame
    bottlenecks: pd.DataFrame
    counterfactuals: pd.DataFrame
    explains: tuple[FoundSign, ...]
    leaves: tuple[FoundSign, ...]
    predicts_absent: tuple[FoundSign, ...]
    sparing: tuple[Sparing, ...]
    claims_for: tuple[Claim, ...]
    claims_against: tuple[Claim, ...]
    sources: tuple[str, ...]
    cautions: tuple[str, ...]
    differs: str = ""

    def to_dict(self) -> dict[str, Any]:
        """Plain values, by the same names."""
        plain: dict[str, Any] = {
            name: getattr(self, name)
            for name in ("key", "title", "kind", "merged", "prior", "posterior", "words", "odds_vs_cortical",
                         "is_plain", "differs")
        }  # fmt: skip
        plain["scenario"] = vars(self.scenario).copy()
        for name in ("departures", "elements", "shares", "sources", "cautions"):
            plain[name] = [list(each) if isinstance(each, tuple) else each for each in getattr(self, name)]
        for name in ("ledger", "bottlenecks", "counterfactuals"):
            plain[name] = getattr(self, name).to_dict("records")
        for name in ("explains", "leaves", "predicts_absent", "sparing"):
            plain[name] = [vars(each).copy() for each in getattr(self, name)]
        for name in ("claims_for", "claims_against"):
            plain[name] = [claim.key for claim in getattr(self, name)]
        return plain


def build_account(reckoning: Reckoning, grouping: Grouping, books: Ledgers, index: int) -> Account:
    """The card of one group of scenarios."""
    graph = reckoning.prepared.graph
    group = grouping.groups[index]
    scenario = group.scenario
    found = [finding.sign_id for finding in reckoning.findings if finding.present]
    attribution = attribute(reckoning, scenario, tuple(found))
    named = attribution.ordered(found)
    if not named:  # it accounts for none of the findings: say what it would lead one to expect
        attribution = attribute(reckoning, scenario, reckoning.affected_signs)
        named = attribution.ordered(list(attribution.signs))
    necks = _necks(reckoning, scenario, found, attribution)
    shares = dict(named)
    for neck in necks:
        for element in neck.elements:
            shares.setdefault(element, 0.0)
    kind = kind_of(reckoning, group)
    kept = list(shares)
    told = [
        FoundSign(each.sign, each.side, graph.signs[each.sign].name, each.grade, float(books.p_sign[index, f]))
        for f, each in enumerate(reckoning.findings)
    ]
    explains = tuple(each for each in told if each.found != "absent" and each.p_sign >= LIKELY)
    pro, con = _claims(graph, reckoning, scenario, kept, [f"{e.sign}@{e.side}" for e in explains] or found)
    odds = float(np.exp(np.clip(books.log_odds(index), -700, 700)))
    posterior = float(grouping.posterior[index])
    return Account(
        key="+".join(f"{axis}.{value}" for axis, value in scenario.departures) or "as_drawn",
        title=title_of(graph, scenario, kind, [element for element in kept if shares[element] >= _WEIGHTY]),
        kind=kind,
        scenario=scenario,
        departures=scenario.departures,
        merged=len(group.members),
        prior=float(grouping.prior[index]),
        posterior=posterior,
        words=in_words(posterior),
        odds_vs_cortical=odds,
        is_plain=index == grouping.plain,
        elements=tuple(kept),
        shares=tuple(shares[element] for element in kept),
        ledger=books.table(index),
        bottlenecks=_neck_table(reckoning, necks),
        counterfactuals=attribution.table(list(attribution.signs)),
        explains=explains,
        leaves=tuple(each for each in told if each.found != "absent" and each.p_sign < LIKELY),
        predicts_absent=tuple(each for each in told if each.found == "absent" and each.p_sign >= LIKELY),
        sparing=explain_sparing(reckoning, scenario),
        claims_for=pro,
        claims_against=con,
        sources=tuple(dict.fromkeys(source for claim in (*pro, *con) for source in claim.sources)),
        cautions=_cautions(reckoning, group, kept, told),
    )


def title_of(graph: Graph, scenario: Scenario, kind: AccountKind, elements: list[str] | tuple[str, ...]) -> str:
    """One line: what is damaged, and how the account departs from as drawn, typical organisation."""
    regions, segments = _most_telling(graph, elements)
    grey, cut = list_names(graph, regions), list_names(graph, segments)
    parts = [f"damage of {grey}" if grey else "", f"disconnection through {cut}" if cut else ""]
    if kind == "cortical_damage":
        parts = parts[:1]
    elif kind == "segment_disconnection":
        parts = parts[1:]
    lead = " with ".join(part for part in parts if part) or "damage as drawn"
    departures = [DEPARTURE_WORDS[each] for each in scenario.departures]
    said = f"{join(departures)}{': ' if elements else ''}{lead if elements else ''}" if departures else lead
    return f"{said[0].upper()}{said[1:]}"


def title_elements(graph: Graph, account: Account) -> tuple[str, ...]:
    """Element ids from which the title of an account is made."""
    weighty = [element for element, share in zip(account.elements, account.shares, strict=True) if share >= _WEIGHTY]
    regions, segments = _most_telling(graph, weighty)
    return (*regions, *segments)


def _most_telling(graph: Graph, elements: list[str] | tuple[str, ...]) -> tuple[list[str], list[str]]:
    """The first two regions and the first two segments."""
    regions = [element for element in elements if split_reference(element)[0] in graph.regions]
    segments = [element for element in elements if element not in regions]
    return regions[:2], segments[:2]


def _necks(
    reckoning: Reckoning, scenario: Scenario, found: list[str], attribution: Attribution
) -> list[Bottleneck]:
    """Bottlenecks of the functions behind the findings, or behind all affected signs where nothing was found."""
    setting = setting_of(scenario)
    signs = found or list(attribution.signs)
    copies = dict.fromkeys(copy for sign in signs for copy in reckoning.model(setting, sign).copies)
    return bottlenecks(reckoning, scenario, list(copies))


def _neck_table(reckoning: Reckoning, necks: list[Bottleneck]) -> pd.DataFrame:
    """Bottlenecks with a sentence each."""
    graph = reckoning.prepared.graph
    rows = []
    for neck in necks:
        name = graph.functions[split_reference(neck.copy_id)[0]].name
        many = len(neck.network.routes) > 1
        flows = route_flows(neck.network, neck.damage, reckoning.headroom) if many else ()
        moved = sorted((flow for flow in flows if abs(flow.now - flow.usual) >= _MOVED),
                       key=lambda flow: -abs(flow.now - flow.usual))  # fmt: skip
        carried = [flow.words(route_name(graph, neck.network.function, flow.key)) for flow in moved[:3]]
        held = list_names(graph, neck.elements, 4) or "the lowered load of its routes"
        words = f"{name} is held back by {held}{' together' if len(neck.elements) > 1 else ''}"
        if carried:
            words += f"; {join(carried)}"
        rows.append((neck.copy_id, name, neck.elements, neck.capacity, words))
    return pd.DataFrame(rows, columns=["function", "name", "elements", "capacity", "words"])


def _claims(
    graph: Graph, reckoning: Reckoning, scenario: Scenario, elements: list[str], signs: list[str]
) -> tuple[tuple[Claim, ...], tuple[Claim, ...]]:
    """Claims that tie the named elements to the explained signs, and claims that dispute one of those ties."""
    setting = setting_of(scenario)
    pro: dict[str, Claim] = {}
    con: dict[str, Claim] = {}
    for sign_id in dict.fromkeys(signs):
        sign = split_reference(sign_id)[0]
        for copy in reckoning.model(setting, sign_id).copies:
            function = split_reference(copy)[0]
            tied = [claim for element in elements for claim in graph.claims_about(element, function)]
            shown = list(graph.claims_about(function, sign)) if tied else []
            for claim in (*tied, *shown):
                (pro if claim.stance == "supports" else con)[claim.key] = claim
    return tuple(pro.values()), tuple(con.values())


def _cautions(
    reckoning: Reckoning, group: Group, elements: list[str], told: list[FoundSign]
) -> tuple[str, ...]:
    """Sentences to read before using the account."""
    graph = reckoning.prepared.graph
    scenario = group.scenario
    said = []
    if elements and "outside" not in dict(scenario.departures):
        damage = reckoning.damage_of(scenario)
        at = reckoning.prepared.number[elements[0]]
        low, high = np.quantile(damage[:, at], [0.05, 0.95])
        if high - low > 0.4:
            said.append(f"Damage of {list_names(graph, elements[:1])} is uncertain: {low:.0%} to {high:.0%} over the "
                        "virtual anatomies.")  # fmt: skip
    segments = [graph.segments.get(split_reference(element)[0]) for element in elements]
    pathways = [graph.pathways[key] for key in dict.fromkeys(each.pathway for each in segments if each)]
    said += [f"{pathway.name}: {pathway.disputed}" for pathway in pathways[:3] if pathway.disputed]
    if scenario.outside == "yes":
        said.append("A cause outside the lesion is a rate, not a mechanism: look for it.")
    if scenario.remote == "yes":
        before = reckoning.damage_of(Scenario(**{**vars(scenario), "remote": "no"}))
        silent = named_regions(reckoning.prepared.remote, graph, before, tuple(elements))
        said += [f"{words}." for words in silent[:MOST_SILENT]]
        if len(silent) > MOST_SILENT:
            more = len(silent) - MOST_SILENT
            said.append(f"{more} more region{'s' * (more > 1)} may fall silent: see the regions that lost their input.")
    if told and not any(each.found != "absent" for each in told):
        said.append("Nothing was found: the account says what the damage would lead one to fear, not what is there.")
    return tuple(said)
