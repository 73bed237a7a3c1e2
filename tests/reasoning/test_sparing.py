"""Words for unexpected sparing: what a function lost, what takes over, and what goes on as usual."""

from __future__ import annotations

from toy_graph import toy_graph
from toy_reckoning import absent, toy_explanation

from byway.knowledge.reasoning.rerouting import RouteFlow
from byway.knowledge.reasoning.sparing import _functions_in_words, _routes_in_words

FUNCTION = toy_graph().functions["repetition"]
KEYS = [route.key for route in FUNCTION.routes]


def flows(*now: float) -> list[RouteFlow]:
    """Named routes that usually carry 0.5 and 0.4, and a detour."""
    keys = [*KEYS[:2], "recombined"]
    return [RouteFlow(key, (), usual, each) for key, usual, each in zip(keys, (0.5, 0.4, 0.0), now, strict=True)]


def test_lost_and_taking_over_are_told_apart() -> None:
    """A route that carries clearly less is lost, one that carries more takes over."""
    words = _routes_in_words(toy_graph(), "repetition", flows(0.1, 0.7, 0.0))
    lost, _, takes = words.partition("; takes over: ")
    assert lost.startswith("repetition is carried clearly less by ")
    assert lost.endswith("(0.10 instead of 0.50)")
    assert takes.endswith("(0.70 instead of 0.40)")
    assert "as much as usual" not in words


def test_untouched_routes_are_said_once() -> None:
    """A route that carries what it usually does is counted, without numbers."""
    words = _routes_in_words(toy_graph(), "repetition", flows(0.0, 0.41, 0.2))
    assert "(nothing instead of 0.50)" in words
    assert "takes over: a detour (0.20 instead of nothing)" in words
    assert words.endswith("; the other route carries as much as usual")
    assert _routes_in_words(toy_graph(), "repetition", flows(0.5, 0.4, 0.0)).endswith("about as usual")


def test_several_functions_make_one_clause() -> None:
    """The function that lost most is told in full, the other by name."""
    graph = toy_graph()
    other = next(key for key in graph.functions if key != "repetition")
    words = _functions_in_words(graph, {other: (), "repetition": tuple(flows(0.1, 0.7, 0.0))})
    assert words.startswith("repetition is carried clearly less by ")
    assert "; spared routes also carry " in words


def test_the_sentence_on_the_card() -> None:
    """One sentence with the sign's name, and the reasons parted by semicolons."""
    explanation = toy_explanation({"arc.long@left": 0.9}, [absent("repetition_loss")], stage="chronic", spread=0.02)
    drawn = next(each for each in explanation.accounts if each.key == "as_drawn")
    words = drawn.sparing[0].words
    assert "is absent although it might be feared: repetition is carried clearly less by " in words
