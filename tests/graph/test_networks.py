"""Functions as networks: sides, halves, loads, order."""

from __future__ import annotations

import itertools

import pytest
from small_graph import SMALL

from byway.knowledge.faults import GraphError
from byway.knowledge.graph.loading import load_graph
from byway.knowledge.graph.networks import FunctionNetwork, function_networks
from byway.knowledge.graph.references import other_side


def networks(dominance: str = "left") -> dict[str, FunctionNetwork]:
    """Networks of the small graph."""
    return function_networks(load_graph(folder=SMALL), "left" if dominance == "left" else "right")


def test_copies_follow_laterality() -> None:
    """Each-side functions have two copies, bilateral and dominant ones one."""
    assert set(networks()) == {
        "hand_movement@left",
        "hand_movement@right",
        "echo@dominant",
        "two_hands@bilateral",
        "balance@bilateral",
    }


@pytest.mark.parametrize("dominance", ["left", "right"])
def test_dominant_copy_lies_on_the_dominant_side(dominance: str) -> None:
    """The dominant copy's elements carry the dominance side."""
    echo = networks(dominance)["echo@dominant"]
    assert {element.partition("@")[2] for element in echo.elements} == {dominance}


def test_loads_by_hand() -> None:
    """Echo: the back region carries 0.7 + 0.3, the bow 0.7; what may leave at the back is its own 0.3."""
    echo = networks()["echo@dominant"]
    back, bow, front = (echo.elements.index(f"{key}@left") for key in ("speech_back", "bow.long", "speech_front"))
    assert [echo.element_loads[i] for i in (back, bow, front)] == [1.0, 0.7, 0.7]
    assert [echo.sink_loads[i] for i in (back, bow, front)] == [0.3, 0.0, 0.7]
    assert [echo.source_loads[i] for i in (back, bow, front)] == [1.0, 0.0, 0.0]
    assert echo.link_loads == (0.7, 0.7)


def test_bilateral_routes_are_halved_and_the_crossing_kept_whole() -> None:
    """Two hands: the route across stays one (0.6), the other is written once a side with 0.2 each."""
    both = networks()["two_hands@bilateral"]
    assert dict(zip(both.route_keys, both.route_loads, strict=True)) == pytest.approx(
        {"across": 0.6, "within@left": 0.2, "within@right": 0.2}
    )


def test_every_network_is_ordered_and_sums_to_one() -> None:
    """Links ascend, routes are paths of links, loads sum to 1, and source and sink loads too."""
    for network in (*networks("left").values(), *networks("right").values()):
        assert all(i < j for i, j in network.links)
        for route in network.routes:
            assert set(itertools.pairwise(route)) <= set(network.links)
        for loads in (network.route_loads, network.source_loads, network.sink_loads):
            assert sum(loads) == pytest.approx(1.0)


def test_other_reliance() -> None:
    """Leaning wholly on the second route leaves the bow without load; loads that do not sum to 1 are refused."""
    echo = networks()["echo@dominant"]
    leaning = echo.with_loads([0.0, 1.0])
    assert leaning.element_loads[echo.elements.index("bow.long@left")] == 0.0
    assert leaning.routes == echo.routes
    with pytest.raises(GraphError, match="sum to 1"):
        echo.with_loads([0.5, 0.6])


def test_mirror() -> None:
    """The right copy of an each-side function is the left copy with sides exchanged."""
    both = networks()
    swapped = [
        f"{key}@{other_side('left' if side == 'left' else 'right')}"
        for key, _, side in (element.partition("@") for element in both["hand_movement@left"].elements)
    ]
    assert tuple(swapped) == both["hand_movement@right"].elements
