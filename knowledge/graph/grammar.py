"""Blocks of curated text to records and back: where the text's shape differs from the record's.

A block is what stands under a key. It differs from the record in three ways: the key is not repeated inside, a
segment's places are called ``from`` and ``to`` and its pathway stands in its key, and the routes of a function are
a mapping.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from pydantic import BaseModel, ValidationError

from byway.knowledge.faults import Fault, nearest
from byway.knowledge.graph.content import Kind
from byway.knowledge.graph.records import (
    Claim,
    Function,
    Norm,
    Pathway,
    Record,
    Region,
    Route,
    Segment,
    Sign,
    Source,
)

__all__ = ["MODELS", "Place", "fields_of", "record_faults", "to_block", "to_record"]

Place = tuple[Any, ...]

MODELS: dict[Kind, type[Record]] = {
    "region": Region,
    "pathway": Pathway,
    "segment": Segment,
    "function": Function,
    "sign": Sign,
    "claim": Claim,
    "source": Source,
    "norm": Norm,
}
# Fields of the record that the block does not hold under the same name.
RENAMED: dict[Kind, dict[str, str]] = {"segment": {"from_place": "from", "to_place": "to"}}
IMPLIED: dict[Kind, tuple[str, ...]] = {"segment": ("pathway",), "pathway": ("segments",)}
# Pydantic's error types and the rule that each one breaks; all others break "type".
RULES = {
    "missing": "missing-field",
    "extra_forbidden": "unknown-field",
    "literal_error": "unknown-word",
    "greater_than": "out-of-range",
    "greater_than_equal": "out-of-range",
    "less_than": "out-of-range",
    "less_than_equal": "out-of-range",
    "finite_number": "out-of-range",
    "too_short": "too-few",
}


def fields_of(kind: Kind) -> tuple[str, ...]:
    """Names that a block of this kind may hold.

    >>> fields_of("pathway")
    ('name', 'kind', 'disputed')
    """
    renamed = RENAMED.get(kind, {})
    left_out = ("key", *IMPLIED.get(kind, ()))
    return tuple(renamed.get(name, name) for name in MODELS[kind].model_fields if name not in left_out)


def to_record(kind: Kind, key: str, block: Mapping[str, Any]) -> Record:
    """The record of a block.

    Parameters
    ----------
    kind : str
        Singular kind.
    key : str
        Key of the block; of a segment, ``pathway.segment``.
    block : mapping
        What stands under the key. A pathway's block may hold ``segments`` (a list of their keys).

    Raises
    ------
    pydantic.ValidationError
        The block breaks the record's types or ranges; see :func:`record_faults`.
    """
    values = dict(block)
    if kind == "segment":
        for field, word in RENAMED["segment"].items():
            if word in values:
                values[field] = values.pop(word)
        values["pathway"] = key.partition(".")[0]
    elif kind == "pathway":
        values.setdefault("segments", ())
    elif kind == "function" and isinstance(values.get("routes"), Mapping):
        values["routes"] = [
            {"key": str(route), **body} if isinstance(body, Mapping) else body
            for route, body in values["routes"].items()
        ]
    return MODELS[kind].model_validate({**values, "key": key})


def to_block(record: Record) -> dict[str, Any]:
    """The block of a record: plain values, fields at their defaults left out, in the order of the record.

    A pathway's block does not hold its segments, which are blocks of their own.

    >>> to_block(Pathway(key="fornix", name="Fornix", kind="limbic", segments=("fornix.body",)))
    {'name': 'Fornix', 'kind': 'limbic'}
    """
    kind = next(kind for kind, model in MODELS.items() if type(record) is model)
    values = record.model_dump(mode="json", exclude_defaults=True)
    for implied in ("key", *IMPLIED.get(kind, ())):
        values.pop(implied, None)
    for field, word in RENAMED.get(kind, {}).items():
        values = {word if name == field else name: value for name, value in values.items()}
    if isinstance(record, Function):
        values["routes"] = {route.key: _route_block(route) for route in record.routes}
    return values


def record_faults(error: ValidationError, kind: Kind, block: Mapping[str, Any]) -> list[tuple[Place, Fault]]:
    """Every fault of a block, with its place in the block; ``where`` of the fault is the place in words."""
    faults = []
    for item in error.errors(include_url=False):
        place = _place_in_block(kind, tuple(item["loc"]), block)
        rule = RULES.get(item["type"], "type")
        name = str(place[-1]) if place else ""
        if rule == "missing-field":
            fault = Fault(rule, ".".join(map(str, place)), f"no field {name!r}", "every required field", "add it")
        elif rule == "unknown-field":
            hint = nearest(name, fields_of(kind)) or f"known: {', '.join(fields_of(kind))}"
            fault = Fault(rule, ".".join(map(str, place)), f"field {name!r} is not known here", remedy=hint)
        else:
            fault = Fault(rule, ".".join(map(str, place)), f"{item['input']!r:.60}", _expected(item["msg"]))
        faults.append((place, fault))
    return faults


def _route_block(route: Route) -> dict[str, Any]:
    values: dict[str, Any] = BaseModel.model_dump(route, mode="json", exclude_defaults=True)
    del values["key"]
    return values


def _expected(message: str) -> str:
    """Pydantic's sentence as the second half of ours."""
    words = message.removeprefix("Input should be ").removeprefix("Value error, ").removeprefix("Tuple should have ")
    words = words.partition(" after validation")[0]
    return words[:1].lower() + words[1:]


def _place_in_block(kind: Kind, loc: Place, block: Mapping[str, Any]) -> Place:
    """Pydantic's location in the record as a place in the block."""
    if not loc:
        return ()
    first = RENAMED.get(kind, {}).get(loc[0], loc[0])
    rest = loc[1:]
    routes = block.get("routes")
    if kind == "function" and first == "routes" and rest and isinstance(routes, Mapping):
        rest = (list(routes)[rest[0]], *rest[1:])
    # A union in the record adds the names of its members to the location; the text knows no such names.
    rest = tuple(part for part in rest if part not in ("float", "dict[str,float]"))
    return (first, *rest)
