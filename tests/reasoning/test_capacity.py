"""Capacity by minimal cuts against maximum flow, and the laws that it must obey."""

from __future__ import annotations

import itertools

import networkx as nx
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from toy_graph import toy_graph

from byway.knowledge.faults import GraphError
from byway.knowledge.graph.loading import load_graph
from byway.knowledge.graph.networks import FunctionNetwork, function_networks
from byway.knowledge.reasoning.capacity import capacities, cut_table
from byway.knowledge.reasoning.rerouting import flow_graph, route_flows


def network(routes: dict[str, tuple[float, str]]) -> FunctionNetwork:
    """A network from route key to (load, elements as a word of letters)."""
    order = sorted({letter for _, chain in routes.values() for letter in chain})
    at = {letter: i for i, letter in enumerate(order)}
    numbered = tuple(tuple(at[letter] for letter in chain) for _, chain in routes.values())
    links = tuple(sorted({pair for route in numbered for pair in itertools.pairwise(route)}))
    ends = frozenset(r[0] for r in numbered), frozenset(r[-1] for r in numbered)
    bare = FunctionNetwork("toy@dominant", "toy", tuple(order), tuple(routes), numbered, (), *ends, links, (), ())
    return bare.with_loads([load for load, _ in routes.values()])


NETWORKS = {
    "one": network({"a": (1.0, "abc")}),
    "two": network({"a": (0.6, "abz"), "b": (0.4, "acdez")}),
    "recombined": network({"a": (0.5, "amx"), "b": (0.5, "bmy")}),
    "shared_link": network({"a": (0.3, "amnx"), "b": (0.3, "bmny"), "c": (0.4, "apny")}),
    "bypass": network({"a": (0.7, "abcd"), "b": (0.3, "acd")}),
    "early_end": network({"a": (0.5, "abc"), "b": (0.5, "ab")}),
    "late_start": network({"a": (0.5, "abc"), "b": (0.5, "bc")}),
    "two_hemispheres": network({"a": (0.3, "abc"), "b": (0.2, "adc"), "x": (0.3, "xyz"), "y": (0.2, "xwz")}),
    "idle": network({"a": (1.0, "ab"), "b": (0.0, "cb")}),
    "web": network({"a": (0.25, "aceg"), "b": (0.25, "bcfg"), "c": (0.3, "adeh"), "d": (0.2, "bdfh")}),
}


def by_flow(net: FunctionNetwork, damage: np.ndarray, headroom: float) -> float:
    """Capacity as networkx's maximum flow gives it."""
    return min(1.0, nx.maximum_flow_value(flow_graph(net, damage, headroom), "source", "sink"))


@pytest.mark.parametrize("name", NETWORKS)
@pytest.mark.parametrize("headroom", [0.0, 0.35])
def test_equals_maximum_flow(name: str, headroom: float) -> None:
    """On 500 random damage states, many of them with whole elements lost, cuts and maximum flow agree."""
    net = NETWORKS[name]
    rng = np.random.default_rng(1)
    damage = rng.random((500, len(net.elements))).astype(np.float32)
    damage[rng.random(damage.shape) < 0.4] = 0.0
    damage[rng.random(damage.shape) < 0.15] = 1.0
    expected = [by_flow(net, state, headroom) for state in damage]
    np.testing.assert_allclose(capacities(net, damage, headroom), expected, atol=2e-6)


@pytest.mark.parametrize("name", NETWORKS)
def test_evaluate_names_the_cut_that_attains_the_minimum(name: str) -> None:
    """The summed capacities of the named cuts equal the capacity."""
    net = NETWORKS[name]
    table = cut_table(net)
    damage = np.random.default_rng(2).random((50, len(net.elements))).astype(np.float32)
    value, chosen = table.evaluate(damage, 0.2)
    carried = table.run_capacities(damage, 0.2)
    total = np.zeros(50)
    for b, block in enumerate(table.blocks):
        total += (block.run_cuts[chosen[:, b]] * carried.T).sum(axis=1) + block.link_loads[chosen[:, b]] * 1.2
    np.testing.assert_allclose(value, np.minimum(total, 1), atol=1e-6)
    np.testing.assert_allclose(value, table.capacity(damage, 0.2), atol=1e-6)


def test_undamaged_is_whole() -> None:
    """Without damage every function has capacity 1, with or without headroom."""
    for net in NETWORKS.values():
        for headroom in (0.0, 0.5):
            assert capacities(net, np.zeros((1, len(net.elements))), headroom)[0] == pytest.approx(1.0)


def test_bottleneck_names_the_segments_that_hold_it_back() -> None:
    """With both middle parts damaged, the bottleneck is the two of them together (0.6 * 0.5 + 0.4 * 0.2 = 0.38)."""
    net = NETWORKS["two"]
    damage = np.zeros(len(net.elements), np.float32)
    damage[net.elements.index("b")] = 0.5
    damage[net.elements.index("d")] = 0.8
    value, named = cut_table(net).bottleneck(damage, 0.0)
    assert value == pytest.approx(0.38, abs=1e-6)
    assert [net.elements[i] for i in named] == ["b", "d"]


def test_runs_and_dominated_links_keep_cuts_few() -> None:
    """Six parallel chains of seven elements have 7**6 minimal cuts, but one of runs."""
    routes = {str(r): (1 / 6, "".join(chr(97 + 7 * r + i) for i in range(7))) for r in range(6)}
    assert cut_table(network(routes)).n_cuts == 6


def test_too_many_cuts_are_refused() -> None:
    """A web with more minimal cuts than the limit is a fault, not a hang."""
    layers = [[chr(200 + 20 * layer + i) for i in range(18)] for layer in range(2)]
    routes = {f"{a}{b}": (1 / 324, a + b) for a in layers[0] for b in layers[1]}
    with pytest.raises(GraphError, match=r"more than 20000 (minimal cuts|paths)"):
        cut_table(network(routes))


@settings(max_examples=60, deadline=None)
@given(st.sampled_from(sorted(NETWORKS)), st.integers(0, 10_000), st.floats(0, 1))
def test_more_damage_never_raises_capacity(name: str, seed: int, more: float) -> None:
    """Adding damage to one element leaves the capacity equal or lower."""
    net = NETWORKS[name]
    rng = np.random.default_rng(seed)
    damage = rng.random((1, len(net.elements))).astype(np.float32)
    worse = damage.copy()
    element = rng.integers(len(net.elements))
    worse[0, element] = max(worse[0, element], more)
    assert capacities(net, worse, 0.3)[0] <= capacities(net, damage, 0.3)[0] + 1e-6


def test_route_flows_sum_to_the_capacity() -> None:
    """What the routes carry adds up to the capacity, and nothing carries more than its elements let through."""
    rng = np.random.default_rng(3)
    for net in NETWORKS.values():
        for _ in range(10):
            damage = rng.random(len(net.elements)) * (rng.random(len(net.elements)) < 0.5)
            flows = route_flows(net, damage, 0.35)
            assert sum(flow.now for flow in flows) == pytest.approx(by_flow(net, damage, 0.35), abs=1e-4)
            assert all(flow.now >= -1e-9 for flow in flows)


def test_spared_route_takes_over_with_headroom() -> None:
    """The direct route cut, the indirect one carries its 0.4 times 1.35."""
    net = NETWORKS["two"]
    damage = np.zeros(len(net.elements))
    damage[net.elements.index("b")] = 1.0
    direct, indirect = route_flows(net, damage, 0.35)
    assert (direct.now, indirect.now) == (pytest.approx(0.0), pytest.approx(0.54, abs=1e-4))
    assert indirect.words("The other way") == "The other way carries 0.54 of the function (usually 0.40)"
    assert indirect.words() == "b carries 0.54 of the function (usually 0.40)"


def test_undamaged_routes_carry_their_usual_loads() -> None:
    """Headroom is used only where damage asks for it."""
    for name in ("two", "bypass", "two_hemispheres"):
        for flow in route_flows(NETWORKS[name], np.zeros(len(NETWORKS[name].elements)), 0.5):
            assert flow.now == pytest.approx(flow.usual, abs=1e-4)


def test_networks_of_a_graph_are_exact() -> None:
    """Function networks of a graph go through the same path, also the bilateral one with its two blocks."""
    rng = np.random.default_rng(4)
    for net in function_networks(toy_graph(), "left").values():
        damage = rng.random((20, len(net.elements)))
        expected = [by_flow(net, state, 0.15) for state in damage]
        np.testing.assert_allclose(capacities(net, damage, 0.15), expected, atol=2e-6)


def test_every_curated_function_is_exact() -> None:
    """On random damage, every function of the curated graph, on both dominances, equals maximum flow; few cuts each."""
    rng = np.random.default_rng(5)
    graph = load_graph()
    for dominance in ("left", "right"):
        for net in function_networks(graph, dominance).values():
            table = cut_table(net)
            assert table.n_cuts <= 200
            damage = rng.random((3, len(net.elements))).astype(np.float32)
            damage[rng.random(damage.shape) < 0.5] = 0.0
            expected = [by_flow(net, state, 0.15) for state in damage]
            np.testing.assert_allclose(table.capacity(damage, 0.15), expected, atol=2e-6)
