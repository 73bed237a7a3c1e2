"""How long reasoning takes on the whole graph with 200 draws; run with ``--benchmark-only``.

A large invented lesion of the left hemisphere is used, so that many functions are damaged. Times are printed, not
asserted; the aims are at most 0.3 s for the posterior, 0.5 s for the next tests, 3 s for the sensitivity table.
"""

from __future__ import annotations

import numpy as np
import pytest

from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.loading import load_graph
from byway.knowledge.reasoning.capacity import cut_table
from byway.knowledge.reasoning.explain import explain_findings
from byway.knowledge.reasoning.findings import Finding
from byway.knowledge.reasoning.grouping import group_scenarios
from byway.knowledge.reasoning.next_tests import outlook
from byway.knowledge.reasoning.posterior import Reckoning, reckon
from byway.knowledge.reasoning.prepared import Prepared, prepare
from byway.knowledge.reasoning.scenarios import axis_priors
from byway.knowledge.reasoning.sensitivity import sensitivity

pytestmark = pytest.mark.benchmark(group="reasoning")


class _Given:
    """Draws and point damage as the damage room hands them over."""

    def __init__(self, element_ids: tuple[str, ...], draws: dict[str, np.ndarray]) -> None:
        self.element_ids, self.draws = element_ids, draws
        self.share = draws["as_drawn"].mean(axis=0)
        self.handedness = "right"


@pytest.fixture(scope="module")
def graph() -> Graph:
    """The curated graph."""
    return load_graph()


@pytest.fixture(scope="module")
def given(graph: Graph) -> _Given:
    """A fifth of the left hemisphere damaged, 200 draws."""
    rng = np.random.default_rng(0)
    ids = graph.all_element_ids
    centre = np.where([i % 5 == 0 and element.endswith("@left") for i, element in enumerate(ids)],
                      rng.uniform(0.3, 0.9, len(ids)), 0.0)  # fmt: skip
    noise = rng.normal(0, 0.2, (200, len(ids)))
    shifts = {"as_drawn": 0.0, "too_small": 0.15, "too_large": -0.15, "perilesional": 0.1}
    draws = {name: np.where(centre > 0, np.clip(centre + noise + shift, 0, 1), 0).astype(np.float32)
             for name, shift in shifts.items()}  # fmt: skip
    return _Given(ids, draws)


def findings_of(graph: Graph, count: int) -> list[Finding]:
    """Some findings, half of them absent."""
    ids = list(graph.sign_ids())[:: max(1, len(graph.sign_ids()) // count)][:count]
    return [Finding(sign.rpartition("@")[0], sign.rpartition("@")[2], "moderate" if i % 2 else "absent")  # type: ignore[arg-type]
            for i, sign in enumerate(ids)]  # fmt: skip


def posterior(prepared: Prepared, given: _Given, findings: list[Finding]) -> Reckoning:
    """The full posterior."""
    priors = axis_priors(prepared.graph, "right", "subacute", "infarct")
    reckoning = reckon(prepared, given.draws, findings, headroom=0.15, priors=priors)
    assert reckoning.posterior.sum() == pytest.approx(1.0)
    return reckoning


def test_cuts_of_all_functions(benchmark, graph: Graph) -> None:
    """Minimal cuts of every function, both dominances and ways of leaning: at most a second."""
    prepared = prepare(graph, graph.all_element_ids)
    networks = {id(table): table.cuts.network for tables in prepared.tables.values() for table in tables.values()}
    tables = benchmark(lambda: [cut_table(network) for network in networks.values()])
    assert max(table.n_cuts for table in tables) < 1000


@pytest.mark.parametrize("count", [5, 10, 20, 40])
def test_full_posterior(benchmark, graph: Graph, given: _Given, count: int) -> None:
    """All scenarios, functions and draws, by number of findings."""
    prepared = prepare(graph, given.element_ids)
    benchmark(posterior, prepared, given, findings_of(graph, count))


@pytest.mark.parametrize("part", [4, 2, 1])
def test_posterior_by_number_of_functions(benchmark, graph: Graph, given: _Given, part: int) -> None:
    """A quarter, half and all of the functions, each with the signs that depend on them alone."""
    kept = dict(list(graph.functions.items())[::part])
    signs = {key: sign for key, sign in graph.signs.items() if all(each.function in kept for each in sign.depends)}
    fields = {name: getattr(graph, name) for name in ("regions", "pathways", "segments", "claims", "sources", "norms")}
    smaller = Graph(**fields, functions=kept, signs=signs)
    benchmark.extra_info.update(functions=len(kept), signs=len(signs))
    benchmark(posterior, prepare(smaller, given.element_ids), given, findings_of(smaller, 10))


def test_accounts_of_the_posterior(benchmark, graph: Graph, given: _Given) -> None:
    """Grouping of scenarios into accounts."""
    reckoning = posterior(prepare(graph, given.element_ids), given, findings_of(graph, 10))
    benchmark(group_scenarios, reckoning)


def test_next_tests(benchmark, graph: Graph, given: _Given) -> None:
    """Information of every untested sign."""
    reckoning = posterior(prepare(graph, given.element_ids), given, findings_of(graph, 10))
    grouping = group_scenarios(reckoning)
    assert len(benchmark(outlook, reckoning, grouping).signs) > 20


def test_explanation(benchmark, graph: Graph, given: _Given) -> None:
    """Everything: accounts written out, tables, next tests."""
    findings = findings_of(graph, 10)
    explanation = benchmark(explain_findings, graph, given, given, given, "subacute", "infarct", findings)
    assert explanation.accounts


def test_sensitivity_table(benchmark, graph: Graph, given: _Given) -> None:
    """Priors halved and doubled, findings left out, masks changed."""
    explanation = explain_findings(graph, given, given, given, "subacute", "infarct", findings_of(graph, 10))
    result = benchmark.pedantic(sensitivity, (explanation,), rounds=3)
    assert len(result.table) == 30
