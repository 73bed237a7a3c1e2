"""Words that reasoning puts together: the verbal scale, titles, and sentences about bottlenecks and sparing."""

from __future__ import annotations

from collections.abc import Sequence

from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.references import split_reference
from byway.knowledge.reasoning.scenarios import AXES, Scenario

__all__ = [
    "CAUTION", "DEPARTURE_WORDS", "VERBAL_SCALE", "departure_words", "in_a_sentence", "in_words", "join", "list_names",
    "route_name", "share_words",
]  # fmt: skip

CAUTION = (
    "This supports reasoning and research; it is no diagnosis. Local protocols and licensed practice decide."
)

VERBAL_SCALE: tuple[tuple[float, str], ...] = (
    (0.02, "very unlikely"),
    (0.10, "unlikely"),
    (0.40, "possible"),
    (0.60, "about as likely as not"),
    (0.80, "likely"),
    (0.95, "very likely"),
    (1.00, "nearly certain, within what the model knows"),
)
"""Upper bounds of a probability and the words for it."""

DEPARTURE_WORDS: dict[tuple[str, str], str] = {
    ("dominance", "right"): "language is led by the right hemisphere",
    ("reliance", "second"): "the person leans on the second route",
    ("outside", "yes"): "part of the findings has a cause outside the lesion",
    ("speaks", "cortical"): "only the damage of grey matter shows",
    ("speaks", "segments"): "only the cut segments show",
    ("perilesional", "yes"): "tissue around the lesion is out of action",
    ("remote", "yes"): "regions that lost their input are silenced",
    ("boundary", "too_small"): "the true lesion is larger than drawn",
    ("boundary", "too_large"): "the true lesion is smaller than drawn",
}

_USUAL_WORDS = {
    "dominance": "language is led by the left hemisphere",
    "reliance": "the person leans on the usual routes",
    "outside": "no cause outside the lesion is supposed",
    "speaks": "all of the damage shows",
    "perilesional": "tissue around the lesion works",
    "remote": "no region is silenced from afar",
    "boundary": "the lesion is as large as drawn",
}


def departure_words(reference: Scenario, scenario: Scenario) -> list[str]:
    """What one scenario supposes otherwise than another, a clause for each axis.

    >>> departure_words(Scenario(remote="yes"), Scenario(reliance="second"))
    ['the person leans on the second route', 'no region is silenced from afar']
    """
    return [
        DEPARTURE_WORDS.get((axis, getattr(scenario, axis)), _USUAL_WORDS[axis])
        for axis in AXES if getattr(scenario, axis) != getattr(reference, axis)
    ]  # fmt: skip


def in_words(probability: float) -> str:
    """A probability on the fixed verbal scale.

    >>> in_words(0.5), in_words(0.97)
    ('about as likely as not', 'nearly certain, within what the model knows')
    """
    return next((words for bound, words in VERBAL_SCALE if probability < bound), VERBAL_SCALE[-1][1])


def join(parts: Sequence[str], last: str = "and") -> str:
    """Words as a list.

    >>> join(["a", "b", "c"]), join(["a"])
    ('a, b and c', 'a')
    """
    if len(parts) < 2:
        return "".join(parts)
    return f"{', '.join(parts[:-1])} {last} {parts[-1]}"


def in_a_sentence(name: str) -> str:
    """A name as it stands within a sentence: its first letter small, unless it is somebody's or a letter word.

    >>> in_a_sentence("Arcuate fasciculus"), in_a_sentence("Heschl's gyrus"), in_a_sentence("MT")
    ('arcuate fasciculus', "Heschl's gyrus", 'MT')
    """
    first = name.partition(" ")[0]
    return name if first.endswith("'s") or not name[1:2].islower() else name[0].lower() + name[1:]


def list_names(graph: Graph, elements: Sequence[str], most: int = 3) -> str:
    """Names of elements; those of one side share the side word.

    Parameters
    ----------
    graph : Graph
        Gives the names.
    elements : sequence of str
        Element ids, most telling first.
    most : int
        How many to name; the others are counted.
    """
    shown = list(elements[:most])
    by_side: dict[str, list[str]] = {}
    for element in shown:
        key, side = split_reference(element)
        by_side.setdefault(side, []).append(in_a_sentence(graph.name_of(key)))
    parts = [("" if side == "midline" else f"{side} ") + join(names) for side, names in by_side.items()]
    more = len(elements) - len(shown)
    return join(parts) + (f" and {more} more" if more > 0 else "")


def route_name(graph: Graph, function: str, key: str) -> str:
    """Name of a route of a function within a sentence, with its side where it is written out on both."""
    bare, side = split_reference(key)
    name = next((route.name for route in graph.functions[function].routes if route.key == bare), "")
    return f"{in_a_sentence(name)} ({side})" if name and side else in_a_sentence(name) if name else ""


def share_words(share: float) -> str:
    """A damage share in words.

    >>> share_words(0.99), share_words(0.5), share_words(0.01)
    ('lost', 'half lost', 'hardly touched')
    """
    bounds = ((0.05, "hardly touched"), (0.35, "partly lost"), (0.65, "half lost"), (0.9, "mostly lost"))
    return next((words for bound, words in bounds if share < bound), "lost")
