"""Views of the data: tables, GraphML, rival models, coverage, and what the command prints."""

from __future__ import annotations

from pathlib import Path

import networkx as nx
import pandas as pd
import pytest
from small_graph import SMALL

from byway.knowledge.faults import GraphError
from byway.knowledge.graph import commands, loading
from byway.knowledge.graph.export import export_graph, graphml
from byway.knowledge.graph.files import read_curated
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.loading import load_graph
from byway.knowledge.graph.overlays import parse_overlay
from byway.knowledge.graph.rivals import compare_models, coverage_of_claims, coverage_of_pathways, model_from
from byway.knowledge.graph.tables import claim_table, edge_table, node_table, segment_text, sign_by_segment

HEAD = "name: Ward\nauthor: A. Reader\ndate: 2026-12-01\n"


@pytest.fixture(scope="module")
def graph() -> Graph:
    """The small graph."""
    return load_graph(folder=SMALL)


@pytest.fixture
def small_base(monkeypatch: pytest.MonkeyPatch) -> None:
    """Let the commands work on the small graph."""
    content = read_curated(SMALL)
    for module in (commands, loading):
        monkeypatch.setattr(module, "base_content", lambda: content)


def test_node_and_edge_tables_hold_the_network(graph: Graph) -> None:
    """One row a node and one a edge; every edge joins two nodes of the table."""
    nodes, edges = node_table(graph), edge_table(graph)
    assert len(nodes) == graph.network.number_of_nodes()
    assert len(edges) == graph.network.number_of_edges()
    assert nodes["id"].is_unique
    assert set(edges["first"]) | set(edges["second"]) <= set(nodes["id"])


def test_graphml_reads_back(graph: Graph, tmp_path: Path) -> None:
    """Another reader finds the same nodes and edges."""
    path = export_graph(graph, tmp_path / "g.graphml")[0]
    again = nx.read_graphml(path, force_multigraph=True)
    assert set(again.nodes) == set(graph.network.nodes)
    assert again.number_of_edges() == graph.network.number_of_edges()
    assert again.nodes["worm@midline"]["name"] == "Worm"


def test_graphml_survives_any_text() -> None:
    """Characters that XML cannot hold, and markup, do not break the file."""
    change = 'change: {signs: {weak_hand: {name: "<b>&\\u0001 \'x\' \\" ]]>"}}}\n'
    text = graphml(load_graph([parse_overlay(HEAD + change)], folder=SMALL))
    assert nx.parse_graphml(text).nodes["weak_hand@left"]["name"] == "<b>&\ufffd 'x' \" ]]>"


def test_export_folder(graph: Graph, tmp_path: Path) -> None:
    """A folder gets GraphML and four tables; a place that cannot be written is told."""
    written = export_graph(graph, tmp_path / "out")
    assert [path.name for path in written] == [
        "graph.graphml",
        "nodes.csv",
        "edges.csv",
        "claims.csv",
        "sign_by_segment.csv",
    ]
    assert len(pd.read_csv(tmp_path / "out" / "claims.csv")) == len(graph.claims)
    (tmp_path / "file").write_text("")
    with pytest.raises(GraphError, match="file"):
        export_graph(graph, tmp_path / "file" / "x")


def test_sign_by_segment_by_hand(graph: Graph) -> None:
    """The bow serves the echo, whose loss is a poor echo; support and dispute both stand."""
    table = sign_by_segment(graph).set_index(["segment", "sign"])
    row = table.loc[("bow.long", "poor_echo")]
    assert (row["function"], row["route"], row["load"], row["weight"]) == ("echo", "direct", 0.7, 0.9)
    assert row["claims"] == "bow_long_serves_echo, -bow_not_for_echo"
    assert row["sources"] == "first_2001, second_2002"
    assert ("bridge.main", "weak_hand") not in table.index


def test_segment_text_names_every_segment(graph: Graph) -> None:
    """Every segment has its paragraph; a hardly studied one says what that does not mean."""
    text = segment_text(graph)
    assert all(key in text for key in graph.segments)
    assert "hardly studied (absence of evidence is not evidence of absence)" in text
    assert "disputes, weak, lesion_study, patients: second_2002 [memory]" in text


def test_claim_table_keeps_stance_and_checks(graph: Graph) -> None:
    """A row a claim, with how many of its sources were read."""
    table = claim_table(graph).set_index("claim")
    assert table.loc["worm_serves_balance", ["read", "memory"]].tolist() == [1, 1]
    assert table.loc["bow_not_for_echo", "stance"] == "disputes"


def test_coverage(graph: Graph) -> None:
    """The bow is hardly studied, hence thin, with one disputing claim; one claim rests on memory alone."""
    pathways = coverage_of_pathways(graph).set_index("pathway")
    assert pathways.loc["bow", ["studied", "thin", "disputes", "claims"]].tolist() == ["hardly", True, 1, 3]
    claims = coverage_of_claims(graph).set_index("claim")
    assert claims["memory_only"].sum() == 1
    assert not claims.loc["worm_serves_balance", "one_source"]
    assert claims.loc["bow_exists", "one_source"]


def test_rival_models_are_compared_in_words() -> None:
    """Two models of one base differ by what their overlays say."""
    ward = parse_overlay(HEAD + "change: {functions: {balance: {name: Poise}}}\n")
    lab = parse_overlay(HEAD.replace("Ward", "Lab") + "change: {functions: {balance: {name: Footing}}}\n")
    base = read_curated(SMALL)
    changes = compare_models(model_from("ward", [ward]), model_from("lab", [lab]), base)
    assert [change.words for change in changes] == ['function balance changed: name from "Poise" to "Footing" (Lab)']
    assert compare_models(model_from("a"), model_from("b"), base) == []


def test_check_command(small_base: None, tmp_path: Path) -> None:
    """Counts and a verdict; a bad overlay's faults are printed and returned, not raised."""
    report, text = commands.check()
    assert len(report) == 0
    assert "segments       4" in text
    assert "50% of sources" in text
    assert text.endswith("rules hold")
    bad = tmp_path / "bad.yaml"
    bad.write_text(HEAD + "retire: {functions: {echo: {reason: x}}}\n")
    report, text = commands.check([bad])
    assert report.grave
    assert "fault  unknown-key" in text
    assert commands.check([tmp_path / "none.yaml"])[0].grave


def test_diff_command(small_base: None) -> None:
    """Changes, unused drafts and conflicts, a line each."""
    ward = parse_overlay(HEAD + "change: {signs: {weak_hand: {minutes: 3}}}\n")
    lab = parse_overlay(
        HEAD.replace("Ward", "Lab")
        + "change: {signs: {weak_hand: {minutes: 4}}}\ndrafts: {change: {signs: {poor_echo: {minutes: 9}}}}\n"
    )
    assert commands.diff([ward, lab]).splitlines() == [
        "sign weak_hand changed: minutes from 1.0 to 4.0 (Lab)",
        "draft, not used (Lab): changes sign poor_echo (minutes) [draft]",
        "conflict: sign weak_hand: minutes is 3 in Ward and 4 in Lab",
    ]
    assert commands.diff([]) == "no difference from the base"


def test_table_and_export_commands(small_base: None, tmp_path: Path) -> None:
    """The table is the text of the tables module; export says what it wrote."""
    assert commands.table().startswith("Descending tract")
    assert commands.export([], tmp_path / "g.graphml") == f"written: {tmp_path / 'g.graphml'}"
