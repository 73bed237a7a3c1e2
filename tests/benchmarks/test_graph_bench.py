"""How long the graph takes; figures are printed with their share of the budget, and assert nothing."""

from __future__ import annotations

import pytest
from pytest_benchmark.fixture import BenchmarkFixture

from byway.knowledge.graph.checks import check_graph
from byway.knowledge.graph.edits import Editing, make_edit
from byway.knowledge.graph.files import read_curated
from byway.knowledge.graph.graph import graph_from
from byway.knowledge.graph.loading import base_content
from byway.knowledge.graph.networks import function_networks
from byway.knowledge.graph.overlays import Overlay


def tell(what: str, benchmark: BenchmarkFixture, budget_s: float) -> None:
    """Print the mean and its ratio to a budget."""
    if benchmark.stats is not None:
        mean = benchmark.stats.stats.mean
        print(f"\n{what}: {mean:.3f} s, {mean / budget_s:.2f} of {budget_s:g} s")


@pytest.mark.benchmark(group="graph")
def test_load(benchmark: BenchmarkFixture) -> None:
    """The whole curated text, read and typed, nothing cached: budget 0.5 s."""
    content = benchmark.pedantic(read_curated, rounds=5, warmup_rounds=1)
    tell("load", benchmark, 0.5)
    assert content.counts()["segments"] >= 90


@pytest.mark.benchmark(group="graph")
def test_check(benchmark: BenchmarkFixture) -> None:
    """Every rule over the whole graph: budget 0.2 s, so that an editor sees faults at once."""
    content = base_content()
    benchmark.pedantic(check_graph, args=(content,), rounds=5, warmup_rounds=1)
    tell("check", benchmark, 0.2)


@pytest.mark.benchmark(group="graph")
def test_trial_of_an_edit(benchmark: BenchmarkFixture) -> None:
    """What one edit would do, with faults and changes: budget 0.3 s."""
    editing = Editing(base_content(), Overlay("bench", "bench", "2026-12-01"))
    sign = next(iter(editing.graph.signs))
    edit = make_edit(editing.overlay, "change", "sign", sign, {"minutes": 7})
    trial = benchmark.pedantic(editing.try_edit, args=(edit,), rounds=5, warmup_rounds=1)
    tell("trial of an edit", benchmark, 0.3)
    assert trial.usable


@pytest.mark.benchmark(group="graph")
def test_networks(benchmark: BenchmarkFixture) -> None:
    """Networks of all function copies: budget 0.2 s."""
    graph = graph_from(base_content())
    benchmark.pedantic(function_networks, args=(graph, "left"), rounds=5, warmup_rounds=1)
    tell("function networks", benchmark, 0.2)


@pytest.mark.benchmark(group="graph")
def test_multigraph(benchmark: BenchmarkFixture) -> None:
    """Everything as one networkx graph: budget 0.3 s."""
    content = base_content()
    network = benchmark.pedantic(lambda: graph_from(content).network, rounds=5, warmup_rounds=1)
    tell(f"{len(network)} nodes, {network.size()} edges", benchmark, 0.3)
