"""Element references: how a key with a side, or without one, names a place in the brain."""

from __future__ import annotations

from typing import Literal

from byway.knowledge.faults import Fault, GraphError, nearest
from byway.knowledge.graph.content import Content
from byway.knowledge.graph.records import Function, Region, Segment

__all__ = ["Hemisphere", "copy_sides", "other_side", "resolve_reference", "resolved_chains", "split_reference"]

Hemisphere = Literal["left", "right"]


def other_side(side: Hemisphere) -> Hemisphere:
    """The opposite hemisphere.

    >>> other_side("left")
    'right'
    """
    return "right" if side == "left" else "left"


def split_reference(reference: str) -> tuple[str, str]:
    """Key and side word of a reference; the side word is empty where none is written.

    >>> split_reference("precentral_hand@other")
    ('precentral_hand', 'other')
    """
    key, _, word = reference.partition("@")
    return key, word


def resolve_reference(content: Content, reference: str, side: Hemisphere) -> str:
    """The element id (``key@left``, ``key@right`` or ``key@midline``) that a reference means on one side.

    Parameters
    ----------
    content : Content
        Records that the key must be among (regions or segments).
    reference : str
        ``key`` (the own side, or the midline), ``key@other``, ``key@left``, ``key@right`` or ``key@midline``.
    side : "left" or "right"
        The own side.

    Raises
    ------
    GraphError
        Unknown key, a side word that is none, or a side that the element does not have.
    """
    key, word = split_reference(reference)
    place: Region | Segment | None = content.regions.get(key) or content.segments.get(key)
    if place is None:
        known = [*content.regions, *content.segments]
        raise GraphError(Fault("unknown-key", reference, "no such region or segment", remedy=nearest(key, known)))
    if word not in ("", "other", "left", "right", "midline"):
        raise GraphError(
            Fault("side", reference, f"side word {word!r}", "no side word, @other, @left, @right or @midline")
        )
    if place.sides == "midline":
        if word not in ("", "midline"):
            raise GraphError(Fault("side", reference, f"{key} lies in the midline", "no side word"))
        return f"{key}@midline"
    if word == "midline":
        raise GraphError(Fault("side", reference, f"{key} is paired", "@left, @right, @other or no side word"))
    resolved = {"": side, "other": other_side(side)}.get(word, word)
    return f"{key}@{resolved}"


def copy_sides(function: Function, dominance: Hemisphere = "left") -> dict[str, tuple[Hemisphere, ...]]:
    """Copies of a function and the side or sides on which each copy's routes are written out.

    >>> from byway.knowledge.graph.records import Route
    >>> gait = Function(key="gait", name="Gait", domain="motor", laterality="bilateral", description="", routes=())
    >>> copy_sides(gait)
    {'gait@bilateral': ('left', 'right')}
    """
    match function.laterality:
        case "each_side":
            return {f"{function.key}@left": ("left",), f"{function.key}@right": ("right",)}
        case "bilateral":
            return {f"{function.key}@bilateral": ("left", "right")}
        case "dominant":
            return {f"{function.key}@dominant": (dominance,)}
        case "nondominant":
            return {f"{function.key}@nondominant": (other_side(dominance),)}
        case "left":
            return {f"{function.key}@left": ("left",)}
        case "right":
            return {f"{function.key}@right": ("right",)}


def resolved_chains(
    content: Content, function: Function, sides: tuple[Hemisphere, ...]
) -> list[tuple[str, float, tuple[str, ...]]]:
    """Route key, usual load and element ids of every route of one copy.

    A copy with two sides (a bilateral function) has each route once a side, with half its load. A route that is the
    same on both sides (midline and fixed elements alone), or whose mirror is its own reverse (a commissural route from
    a region to its counterpart), is one route and stays whole.

    Raises
    ------
    GraphError
        A reference that does not resolve.
    """
    chains: list[tuple[str, float, tuple[str, ...]]] = []
    for route in function.routes:
        versions: dict[tuple[str, ...], list[Hemisphere]] = {}
        for side in sides:
            ids = tuple(resolve_reference(content, reference, side) for reference in route.chain)
            same = ids[::-1] if ids[::-1] in versions else ids
            versions.setdefault(same, []).append(side)
        for ids, written_on in versions.items():
            key = route.key if len(versions) == 1 else f"{route.key}@{written_on[0]}"
            chains.append((key, route.usual_load * len(written_on) / len(sides), ids))
    return chains
