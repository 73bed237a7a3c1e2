"""Every rule of the graph, each broken by a file of its own."""

from __future__ import annotations

import ast
from pathlib import Path

import numpy as np
import pytest
from small_graph import BREAKING, SMALL, faults_of, spoil

from byway.knowledge.faults import GraphError
from byway.knowledge.graph import checks, emit
from byway.knowledge.graph.checks import NORMS, RULES, check_graph
from byway.knowledge.graph.files import FILE_RULES, read_curated
from byway.knowledge.graph.loading import load_graph
from byway.knowledge.graph.overlays import OVERLAY_RULES

RECIPES = sorted(BREAKING.glob("*.yaml"))


def rule_of(recipe: Path) -> str:
    """Rule that a breaking file is named after."""
    return recipe.stem.partition("--")[0]


@pytest.mark.parametrize("recipe", RECIPES, ids=lambda recipe: recipe.stem)
def test_breaking_file_breaks_its_rule_alone(recipe: Path, tmp_path: Path) -> None:
    """The faults are all of one rule, and the message names file, line, key, what was found and what is expected."""
    folder = tmp_path / "graph"
    message = spoil(recipe, folder)
    faults = faults_of(recipe, folder)
    assert {fault.rule for fault in faults} == {rule_of(recipe)}
    assert message in [str(fault) for fault in faults]


def test_every_rule_has_a_breaking_file() -> None:
    """No rule of the checks or of reading goes without a file that breaks it, and no file breaks an unknown rule."""
    assert {rule_of(recipe) for recipe in RECIPES} == {*RULES, *FILE_RULES}


def test_every_rule_in_the_code_is_listed() -> None:
    """A rule named where a fault is made stands in one of the tables of rules."""
    room = Path(emit.__file__).parent
    used = set()
    for path in room.glob("*.py"):
        for node in ast.walk(ast.parse(path.read_text())):
            if isinstance(node, ast.Call) and node.args and isinstance(node.args[0], ast.Constant):
                name = node.func.attr if isinstance(node.func, ast.Attribute) else getattr(node.func, "id", "")
                adds = name == "add" and len(node.args) >= 3
                if (adds or name == "Fault") and isinstance(node.args[0].value, str):
                    used.add(node.args[0].value)
    assert used - {*RULES, *FILE_RULES, *OVERLAY_RULES} == set()


def test_small_graph_is_clean() -> None:
    """The invented graph breaks no rule, so that each breaking file breaks what it says."""
    assert list(check_graph(read_curated(SMALL))) == []


def test_all_faults_are_gathered(tmp_path: Path) -> None:
    """Two things spoilt in two files are told together."""
    folder = tmp_path / "graph"
    spoil(BREAKING / "load-sum.yaml", folder)
    signs = folder / "signs" / "all.yaml"
    signs.write_text(signs.read_text().replace("function: balance", "function: balanse"))
    rules = [fault.rule for fault in check_graph(read_curated(folder)) if fault.grave]
    assert rules == ["unknown-key", "load-sum"]


def test_grave_faults_raise_together(tmp_path: Path) -> None:
    """A report raises once, with the first fault in the message and the others counted and attached."""
    folder = tmp_path / "graph"
    spoil(BREAKING / "no-route.yaml", folder)
    report = check_graph(read_curated(folder))
    with pytest.raises(GraphError, match=r"functions/all\.yaml:27 balance: no route") as caught:
        report.raise_if_grave(GraphError)
    assert len(caught.value.faults) == len(report.grave) == 1


def test_given_geometry_replaces_seeds(tmp_path: Path) -> None:
    """A parcel far from the segment's end breaks a route that seeds alone would join."""
    content = read_curated(SMALL)
    far = {"speech_front@left": np.array([[-50.0, 60.0, 14.0]]), "speech_back@left": np.array([[-60.0, -38.0, 8.0]])}
    rules = {fault.rule for fault in check_graph(content, far)}
    assert rules == {"route-join", "place-join"}
    near = {"speech_front@left": np.array([[-50.0, 60.0, 14.0], [-49.0, 11.0, 14.0]])}
    assert list(check_graph(content, near)) == []


def test_segments_hand_over_within_ten_mm() -> None:
    """Where one segment hands over to another, their ends may lie 10 mm apart, not 12."""
    content = read_curated(SMALL)
    ends = {"descending.corona@left": np.array([[-38.0, -22.0, 56.0], [-26.0, -21.0, 15.0 + 12.0]])}
    messages = [str(fault) for fault in check_graph(content, ends) if fault.rule == "route-join"]
    assert "route only: descending.corona@left lies 12 mm from descending.lower@left, at most 10 mm" in messages[0]
    ends["descending.corona@left"][1, 2] = 15.0 + 9.0
    assert list(check_graph(content, ends)) == []


def test_norms_that_the_code_asks_for_are_numbers() -> None:
    """Every norm of the list answers with a number for each of its members (small graph)."""
    graph = load_graph(folder=SMALL)
    for key, members in NORMS.items():
        for member in members:
            assert isinstance(graph.norm(key, member), float)


def test_commissural_route_is_kept_once() -> None:
    """A route from a region through the midline to its counterpart is its own mirror's reverse, and forms no cycle."""
    assert "cycle" not in {fault.rule for fault in checks.check_graph(read_curated(SMALL))}
