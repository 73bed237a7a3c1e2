"""Look-ups of the typed graph."""

from __future__ import annotations

from dataclasses import FrozenInstanceError

import pytest
from small_graph import SMALL

from byway.knowledge.faults import GraphError
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.loading import load_graph
from byway.knowledge.graph.references import resolve_reference


@pytest.fixture(scope="module")
def graph() -> Graph:
    """The small graph."""
    return load_graph(folder=SMALL)


@pytest.mark.parametrize(
    ("reference", "side", "element"),
    [
        ("motor_hand", "left", "motor_hand@left"),
        ("motor_hand@other", "left", "motor_hand@right"),
        ("motor_hand@other", "right", "motor_hand@left"),
        ("motor_hand@left", "right", "motor_hand@left"),
        ("worm", "right", "worm@midline"),
        ("bow.long", "right", "bow.long@right"),
    ],
)
def test_references_resolve(graph: Graph, reference: str, side: str, element: str) -> None:
    """Own side, other side, fixed side and midline."""
    assert graph.resolve(reference, "left" if side == "left" else "right") == element


@pytest.mark.parametrize(
    ("reference", "message"),
    [
        ("motor_hend", "did you mean motor_hand"),
        ("worm@left", "lies in the midline"),
        ("motor_hand@midline", "is paired"),
        ("motor_hand@up", "side word 'up'"),
        ("echo", "no such region or segment"),
    ],
)
def test_bad_references_are_refused(graph: Graph, reference: str, message: str) -> None:
    """Unknown keys and sides that an element does not have raise, naming the reference."""
    with pytest.raises(GraphError, match=message):
        resolve_reference(graph, reference, "left")


def test_ids(graph: Graph) -> None:
    """Elements, signs and copies by side; a pathway answers with its segments."""
    assert graph.element_ids("motor_hand") == ("motor_hand@left", "motor_hand@right")
    assert graph.element_ids("descending")[:2] == ("descending.corona@left", "descending.corona@right")
    assert graph.sign_ids("weak_hand") == ("weak_hand@left", "weak_hand@right")
    assert graph.sign_ids("poor_echo") == ("poor_echo@none",)
    assert graph.function_copies("hand_movement") == ("hand_movement@left", "hand_movement@right")
    assert graph.function_copies("echo") == ("echo@dominant",)
    assert len(graph.all_element_ids) == 9 + 7


def test_sign_dependences(graph: Graph) -> None:
    """A weak right hand rests on the left copy; a sign of either side rests on both copies."""
    assert graph.sign_dependences("weak_hand@right")[0][1] == ("hand_movement@left",)
    assert graph.sign_dependences("clumsy_pair@none")[1][1] == ("hand_movement@left", "hand_movement@right")
    with pytest.raises(GraphError, match="poor_echo@none"):
        graph.sign_dependences("poor_echo@left")


def test_kinds_and_names(graph: Graph) -> None:
    """Keys and ids answer with kind and readable name; unknown ones with the nearest."""
    assert graph.kind_of("bow.long@left") == "segment"
    assert graph.name_of("bow.long@left") == "Bow, left"
    assert graph.name_of("poor_echo@none") == "Poor echo"
    assert graph.name_of("first_2001") == "First A 2001"
    with pytest.raises(GraphError, match="did you mean bow_exists"):
        graph.kind_of("bow_exsists")


def test_claims_and_sources(graph: Graph) -> None:
    """Claims are found by subject, object or both, and the dispute stands beside what it disputes."""
    about = graph.claims_about("bow.long@left", "echo@dominant")
    assert [claim.stance for claim in about] == ["supports", "disputes"]
    assert [source.key for source in graph.sources_of("worm_serves_balance")] == ["first_2001", "second_2002"]
    assert len(graph.claims_about()) == len(graph.claims)
    assert {claim.relation for claim in graph.claims_about(object="poor_echo")} == {"shows_as"}


def test_norms(graph: Graph) -> None:
    """Numbers and members of mappings; a missing member is an error and never 1 or 0."""
    assert graph.norm("headroom", "chronic") == 0.35
    assert graph.norm("perilesional_rim_mm") == 6
    for key, member in (("headroom", None), ("headroom", "never"), ("finding_lapse", "acute"), ("nonsense", None)):
        with pytest.raises(GraphError):
            graph.norm(key, member)


def test_origin_names_file_and_line(graph: Graph) -> None:
    """Every record knows its layer, file and line."""
    origin = graph.origin("claim", "bow_exists")
    assert (origin.layer, origin.file) == ("base", "claims/all.yaml")
    text = (SMALL / origin.file).read_text().splitlines()
    assert text[origin.line - 1] == "bow_exists:"
    assert set(graph.origins) == {(kind, key) for kind, key, _ in graph.every_record()}


def test_frozen(graph: Graph) -> None:
    """Neither graph nor records can be changed."""
    with pytest.raises(FrozenInstanceError):
        graph.regions = {}  # type: ignore[misc]
    with pytest.raises(ValueError, match="frozen"):
        graph.regions["worm"].name = "x"


def test_network_holds_everything(graph: Graph) -> None:
    """Nodes of all kinds; edges joins, serves, shows_as, about, cites; loads of a function's sources sum to 1."""
    network = graph.network
    assert network.nodes["bow.long@left"]["kind"] == "segment"
    relations = {relation for _, _, relation in network.edges(data="relation")}
    assert relations == {"joins", "serves", "shows_as", "about", "cites"}
    load = sum(data["load"] for _, _, data in network.edges(data=True) if data.get("route") == "direct")
    assert load == pytest.approx(3 * 0.7)
    joined = {b for _, b, data in network.out_edges("bridge.main@midline", data=True) if data["relation"] == "joins"}
    assert joined == {"motor_hand@left", "motor_hand@right"}


def test_hashes_speak_of_content_alone(tmp_path: object) -> None:
    """Equal content has equal hashes; the anatomy's hash ignores claims."""
    first, second = load_graph(folder=SMALL), load_graph(folder=SMALL)
    assert first.content_hash == second.content_hash != first.anatomy_hash == second.anatomy_hash
