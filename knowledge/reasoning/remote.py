"""Remote effects: undamaged regions that lost much of their input, and what that would silence.

The network is that of regions joined by segments; a segment weighs as its cross-section (``radius_mm`` squared). Two
segments that meet at a junction inside white matter pass input on. A region's lost input is the weighted share of its
connections that is cut on the way, or whose far region is gone; only charted connections count, and a region with few
of them loses a large share easily. Where it reaches the norm
``remote_input_loss_threshold``, the region may be silenced in proportion (diaschisis: von Monakow 1914, from memory).
Diaschisis is described for cortex, thalamus, basal ganglia and cerebellum; regions of the brainstem and of white matter
pass input on but are never silenced from afar (common practice, no source).
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import networkx as nx
import numpy as np
import pandas as pd
from numpy.typing import NDArray

from byway.knowledge.graph.graph import Graph

__all__ = [
    "LEAST_SILENCED", "NEVER_SILENT", "Connection", "RemoteModel", "blamed_regions", "named_regions", "remote_model",
    "remote_table", "segment_ends",
]  # fmt: skip

Array = NDArray[np.float32]

_OWN_DAMAGE = 0.5  # a region with more damage of its own is damaged, not silenced from afar

NEVER_SILENT = frozenset({"brainstem", "white_matter"})
"""Tissues for which no diaschisis is described. Common practice, no source."""

LEAST_SILENCED = 0.1
"""Share of the draws in which a region must be silenced for an account to name it without resting on it."""


@dataclass(frozen=True)
class Connection:
    """A chain of segments from one region to another, by element number; ``weight`` is that of its thinnest part."""

    region: int
    segments: tuple[int, ...]
    far: int | None
    weight: float


@dataclass(frozen=True, eq=False)
class RemoteModel:
    """Which region gets input from where.

    Parameters
    ----------
    element_ids : tuple of str
        The elements that the numbers in ``connections`` refer to.
    connections : tuple of Connection
        Every connection of every region; a connection between two regions stands twice, once for each.
    threshold : float
        Share of lost input from which a region may be silenced.
    effect : float
        Damage of a silenced region that lost all input.
    exempt : frozenset of int
        Regions that are never silenced from afar, by the tissue that they are made of.
    """

    element_ids: tuple[str, ...]
    connections: tuple[Connection, ...]
    threshold: float
    effect: float
    exempt: frozenset[int] = frozenset()

    def input_loss(self, damage: Array) -> dict[int, Array]:
        """Share of input lost by each region that lost any and is not exempt.

        Parameters
        ----------
        damage : (n_elements, n_states) float32
            Damage of all elements, element-major.

        Returns
        -------
        dict
            Region number to (n_states,) share in [0, 1].
        """
        hit = damage.max(axis=1) > 0.0
        total: dict[int, float] = {}
        lost: dict[int, Array] = {}
        for link in self.connections:
            if link.region in self.exempt:
                continue
            total[link.region] = total.get(link.region, 0.0) + link.weight
            parts = [*link.segments, *(() if link.far is None else (link.far,))]
            reached = [part for part in parts if hit[part]]
            if not reached:
                continue
            passed = np.float32(1.0) - damage[reached[0]]
            for part in reached[1:]:
                passed = passed * (np.float32(1.0) - damage[part])
            gone = np.float32(link.weight) * (np.float32(1.0) - passed)
            lost[link.region] = lost[link.region] + gone if link.region in lost else gone
        return {region: share / np.float32(total[region]) for region, share in lost.items()}

    def silenced(self, damage: Array) -> dict[int, Array]:
        """Damage of each region once it is silenced, (n_states,), where that differs from its own damage."""
        extended = {}
        for region, share in self.input_loss(damage).items():
            if float(share.max()) < self.threshold:
                continue
            extra = np.where(share >= self.threshold, np.float32(self.effect) * share, np.float32(0.0))
            extended[region] = np.maximum(damage[region], extra).astype(np.float32)
        return extended

    def silenced_shares(self, damage: Array) -> dict[int, float]:
        """Share of the states in which each region is silenced and not much damaged itself; regions above 0 only."""
        shares = {}
        for region, lost in self.input_loss(damage).items():
            share = float(((lost >= self.threshold) & (damage[region] < _OWN_DAMAGE)).mean())
            if share > 0.0:
                shares[region] = share
        return shares


def remote_model(graph: Graph, element_ids: tuple[str, ...]) -> RemoteModel:
    """Build the connections of every region from the ends of the segments.

    Elements of the graph that have no geometry (not among ``element_ids``) are left out.
    """
    number = {element: i for i, element in enumerate(element_ids)}
    connections: list[Connection] = []
    ends = segment_ends(graph)
    at_place: dict[str, list[str]] = {}
    for element, places in ends.items():
        for place in places:
            at_place.setdefault(place, []).append(element)

    def follow(region: str, place: str, passed: tuple[str, ...], weight: float) -> None:
        """Walk on from ``place``; a junction passes on to every other segment that starts there."""
        if not place.startswith("wm:"):
            if place != region:
                known = tuple(number[each] for each in passed if each in number)
                far = number.get(place)
                if known:
                    connections.append(Connection(number[region], known, far, weight))
            return
        onward = [each for each in at_place[place] if each not in passed]
        if not onward or len(passed) > 5:
            known = tuple(number[each] for each in passed if each in number)
            if known:
                connections.append(Connection(number[region], known, None, weight))
            return
        for element in onward:
            start, end = ends[element]
            ahead = end if start == place else start
            follow(region, ahead, (*passed, element), min(weight, _weight(graph, element) / len(onward)))

    for element, (start, end) in ends.items():
        for here, there in ((start, end), (end, start)):
            if here in number:
                follow(here, there, (element,), _weight(graph, element))
    return RemoteModel(
        element_ids,
        tuple(connections),
        graph.norm("remote_input_loss_threshold"),
        graph.norm("remote_effect_size"),
        frozenset(i for element, i in number.items() if _tissue(graph, element) in NEVER_SILENT),
    )


def remote_table(
    model: RemoteModel,
    graph: Graph,
    share: NDArray[np.floating],
    *,
    silenced: Mapping[int, float] | None = None,
    least: float = 0.1,
) -> pd.DataFrame:
    """Regions that lost input, most first, with standard measures of the network before and after the damage.

    Parameters
    ----------
    share : (n_elements,) float
        Damage of the elements of ``model``: of one point, or the mean of an ensemble.
    silenced : mapping, optional
        Region number to the largest share of draws in which an account has it silenced, for every region that an
        account names; all of these are listed. By default as :meth:`RemoteModel.silenced` reads ``share`` alone.
    least : float
        Other regions that lost a smaller share of their input are left out.

    Returns
    -------
    DataFrame
        ``element``, ``name``, ``own_damage``, ``lost_input`` (share), ``strength_before``, ``strength_after``
        (weighted degree), ``communicability_kept`` (summed communicability with all regions, after over before;
        Estrada and Hatano 2008, on weights scaled by strength as in Crofts and Higham 2009), ``path_before``,
        ``path_after`` (mean shortest route to the regions that it reached before, length 1/weight; infinite where
        one is cut off), ``silenced_share`` (as in ``silenced``, else 0), ``named`` (whether it is in ``silenced``),
        ``words``. Named regions come first.
    """
    damage = np.ascontiguousarray(share, np.float32)[:, None]
    losses = {region: float(value[0]) for region, value in model.input_loss(damage).items()}
    silent = model.silenced_shares(damage) if silenced is None else silenced
    listed = sorted({region for region, value in losses.items() if value >= least} | set(silent),
                    key=lambda r: (r not in silent, -losses.get(r, 0.0), r))  # fmt: skip
    columns = ["element", "name", "own_damage", "lost_input", "strength_before", "strength_after",
               "communicability_kept", "path_before", "path_after", "silenced_share", "named",
               "words"]  # fmt: skip
    if not listed:
        return pd.DataFrame(columns=columns)
    before, after = _region_graph(model, None), _region_graph(model, damage[:, 0])
    talk_before, talk_after = _communicability(before), _communicability(after)
    rows = []
    for region in listed:
        element = model.element_ids[region]
        reached = nx.single_source_dijkstra_path_length(before, region, weight="length")
        still = nx.single_source_dijkstra_path_length(after, region, weight="length")
        others = [other for other in reached if other != region]
        strength = float(before.degree(region, weight="weight")), float(after.degree(region, weight="weight"))
        lost, part = losses.get(region, 0.0), silent.get(region, 0.0)
        rows.append([
            element, graph.name_of(element), float(share[region]), lost, *strength,
            talk_after[region] / talk_before[region] if talk_before[region] > 0 else 1.0,
            float(np.mean([reached[o] for o in others])) if others else 0.0,
            float(np.mean([still.get(o, np.inf) for o in others])) if others else 0.0,
            part, region in silent, _sentence(model, graph, damage[:, 0], region, lost, part, "up to "),
        ])  # fmt: skip
    return pd.DataFrame(rows, columns=columns)


def blamed_regions(model: RemoteModel, draws: NDArray[np.floating], elements: Sequence[str] = ()) -> dict[int, float]:
    """Regions that an account with silenced regions names, each with the share of draws in which it is silenced.

    Parameters
    ----------
    draws : (n_draws, n_elements) float
        Damage of the elements of ``model`` before anything is silenced.
    elements : sequence of str
        Element ids that the account rests on: named however seldom they are silenced, and before all others.
    """
    shares = model.silenced_shares(np.ascontiguousarray(draws.T, np.float32))
    rank = {element: i for i, element in enumerate(elements)}
    ids = model.element_ids
    kept = [region for region, part in shares.items() if part >= LEAST_SILENCED or ids[region] in rank]
    kept.sort(key=lambda region: (rank.get(ids[region], len(rank)), -shares[region], region))
    return {region: shares[region] for region in kept}


def named_regions(
    model: RemoteModel, graph: Graph, draws: NDArray[np.floating], elements: Sequence[str] = ()
) -> list[str]:
    """Why each region of :func:`blamed_regions` is named, in a sentence without its full stop."""
    mean = np.ascontiguousarray(draws.mean(axis=0), np.float32)
    losses = model.input_loss(mean[:, None])
    return [
        _sentence(model, graph, mean, region, float(losses[region][0]) if region in losses else 0.0, share, "")
        for region, share in blamed_regions(model, draws, elements).items()
    ]


def segment_ends(graph: Graph) -> dict[str, tuple[str, str]]:
    """Places (region element ids, or junctions with a side) at the two ends of every segment element."""
    ends = {}
    for key, segment in graph.segments.items():
        for side in graph.sides_of(key):
            own = "right" if side == "right" else "left"
            places = []
            for place in (segment.from_place, segment.to_place):
                if place.startswith("wm:"):
                    places.append(f"{place}@{side}")
                else:
                    places.append(graph.resolve(place, "right" if own == "right" else "left"))
            ends[f"{key}@{side}"] = (places[0], places[1])
    return ends


def _tissue(graph: Graph, element: str) -> str:
    """What a region is made of; empty for a segment."""
    region = graph.regions.get(element.partition("@")[0])
    return "" if region is None else region.tissue


def _weight(graph: Graph, element: str) -> float:
    """Cross-section of a segment, mm2 up to a constant."""
    return graph.segments[element.partition("@")[0]].radius_mm ** 2


def _region_graph(model: RemoteModel, damage: NDArray[np.floating] | None) -> nx.Graph:
    """Regions joined by what is left of their connections."""
    graph = nx.Graph()
    graph.add_nodes_from(link.region for link in model.connections)
    for link in model.connections:
        if link.far is None or link.region > link.far:
            continue
        kept = 1.0
        if damage is not None:
            for part in (*link.segments, link.far, link.region):
                kept *= 1.0 - float(damage[part])
        weight = link.weight * kept
        if weight <= 1e-6:
            continue
        if graph.has_edge(link.region, link.far):
            weight += graph.edges[link.region, link.far]["weight"]
        graph.add_edge(link.region, link.far, weight=weight, length=1.0 / weight)
    return graph


def _communicability(graph: nx.Graph) -> dict[int, float]:
    """Summed communicability of every node with all others, on weights scaled by the strengths of both ends."""
    scaled = nx.Graph()
    scaled.add_nodes_from(graph)
    strength = dict(graph.degree(weight="weight"))
    nodes = list(graph)
    matrix = np.zeros((len(nodes), len(nodes)))
    at = {node: i for i, node in enumerate(nodes)}
    for a, b, weight in graph.edges(data="weight"):
        matrix[at[a], at[b]] = matrix[at[b], at[a]] = weight / np.sqrt(strength[a] * strength[b])
    values, vectors = np.linalg.eigh(matrix)
    talk = (vectors * np.exp(values)) @ vectors.T
    np.fill_diagonal(talk, 0.0)
    return {node: float(talk[at[node]].sum()) for node in nodes}


def _worst_input(model: RemoteModel, damage: NDArray[np.floating], region: int) -> list[int]:
    """Damaged parts of the region's connections, those that cost most input first; three at most."""
    cost: dict[int, float] = {}
    for link in model.connections:
        if link.region != region:
            continue
        for part in (*link.segments, *(() if link.far is None else (link.far,))):
            if damage[part] > 0.05:
                cost[part] = cost.get(part, 0.0) + link.weight * float(damage[part])
    return sorted(cost, key=lambda part: -cost[part])[:3]


def _sentence(
    model: RemoteModel, graph: Graph, damage: NDArray[np.floating], region: int, lost: float, silent: float, upto: str
) -> str:
    """Why a region is named, or why not; ``silent`` is the share of draws in which it is silenced, 0 if not named."""
    own = float(damage[region])
    through = ", ".join(graph.name_of(model.element_ids[part]) for part in _worst_input(model, damage, region))
    start = f"{graph.name_of(model.element_ids[region])} lost {lost:.0%} of its charted input"
    start += f" through {through}" if through else ""
    if silent > 0.0:
        itself = "untouched" if own < 0.02 else f"{'only ' if own < 0.35 else ''}{own:.0%} damaged"
        return f"{start}; it is itself {itself} and may fall silent (in {upto}{silent:.0%} of the virtual anatomies)"
    if own >= _OWN_DAMAGE:
        return f"{start}; it is itself damaged"
    return f"{start}; too little to silence it"
