"""What can be edited: for every kind of record its fields, how each is entered, and what a new record begins with."""

from __future__ import annotations

import types
from collections.abc import Mapping
from typing import Any, Literal, NamedTuple, Union, get_args, get_origin

from byway.knowledge.graph.content import Kind
from byway.knowledge.graph.grammar import MODELS
from byway.knowledge.graph.records import Dependence

__all__ = ["EDITABLE", "Field", "fields_told", "new_block"]

EDITABLE: tuple[Kind, ...] = ("segment", "claim", "function", "source", "region", "sign", "pathway")


class Field(NamedTuple):
    """One field of a form.

    Parameters
    ----------
    name : str
        Name in the record's block.
    entry : str
        How it is entered: ``word``, ``text``, ``number``, ``share``, ``whole``, ``choice``, ``key`` (of one of
        ``kinds``), ``keys``, ``place`` (a region with a side, or a junction), ``points``, ``routes``, ``depends``.
    kinds : tuple of kinds
        Kinds whose keys may stand in it.
    needed : bool
        Whether a new record must have it.
    """

    name: str
    entry: str
    kinds: tuple[str, ...] = ()
    needed: bool = True


_SOURCES = Field("sources", "keys", ("source",))
_NOTE = Field("note", "text", needed=False)
_WHAT: dict[str, tuple[str, ...]] = {
    "subject": ("region", "segment", "pathway", "function"),
    "object": ("function", "sign", "region", "segment", "pathway"),
}

_FIELDS: dict[Kind, tuple[Field, ...]] = {
    "region": (
        Field("name", "word"), Field("sides", "choice"), Field("tissue", "choice"), Field("seeds_mni", "points"),
        Field("volume_ml", "number"), Field("serves_in_words", "text"), _SOURCES, _NOTE,
    ),
    "pathway": (Field("name", "word"), Field("kind", "choice"), Field("disputed", "text", needed=False)),
    "segment": (
        Field("name", "word"), Field("sides", "choice"), Field("from", "place", ("region",)),
        Field("to", "place", ("region",)), Field("waypoints_mni", "points"), Field("radius_mm", "number"),
        Field("variability", "choice"), Field("studied", "choice"), Field("fit", "fit"), Field("crossing", "word"),
        Field("course", "text"), Field("serves_in_words", "text"), _SOURCES, _NOTE,
    ),
    "function": (
        Field("name", "word"), Field("domain", "choice"), Field("laterality", "choice"), Field("routes", "routes"),
        Field("description", "text"), _NOTE,
    ),
    "sign": (
        Field("name", "word"), Field("domain", "choice"), Field("side_rule", "choice"), Field("depends", "depends"),
        Field("examination", "text"), Field("minutes", "number"), Field("sensitivity", "share"),
        Field("specificity", "share"), Field("accuracy_source", "key", ("source",)),
        Field("leak", "share", needed=False),
        _NOTE,
    ),
    "claim": (
        Field("subject", "key", _WHAT["subject"]), Field("relation", "choice"), Field("object", "key", _WHAT["object"]),
        Field("says", "text"), Field("grade", "choice"), Field("kind", "choice"), Field("population", "choice"),
        Field("stance", "choice"), _SOURCES, _NOTE,
    ),
    "source": (
        Field("authors", "word"), Field("year", "whole"), Field("title", "word", needed=False),
        Field("container", "word"), Field("doi", "word", needed=False), Field("checked", "choice"), _NOTE,
    ),
}  # fmt: skip
_FITS = ("fits", "revised", "histology_partial", "thin_partial_volume", "template_limited", "does_not_fit")
_START: dict[Kind, Mapping[str, Any]] = {
    "region": {"sides": "paired", "tissue": "cortex", "seeds_mni": [], "volume_ml": 2.0, "sources": []},
    "pathway": {"kind": "association"},
    "segment": {
        "sides": "paired", "waypoints_mni": [], "radius_mm": 3.0, "variability": "moderate", "studied": "hardly",
        "fit": "fits", "crossing": "none", "sources": [],
    },
    "function": {"domain": "language", "laterality": "dominant", "routes": {}},
    "sign": {
        "domain": "language", "side_rule": "dominant", "depends": [], "minutes": 2.0, "sensitivity": 0.8,
        "specificity": 0.9, "accuracy_source": "memory",
    },
    "claim": {
        "relation": "serves", "grade": "weak", "kind": "lesion_study", "population": "patients", "stance": "supports",
        "sources": [],
    },
    "source": {"checked": "memory"},
}  # fmt: skip


def new_block(kind: Kind) -> dict[str, Any]:
    """What a new record's form begins with."""
    return dict(_START[kind])


def fields_told() -> dict[str, list[dict[str, Any]]]:
    """The fields of every kind, for the browser."""
    told: dict[str, list[dict[str, Any]]] = {}
    for kind in EDITABLE:
        rows = []
        for field in _FIELDS[kind]:
            row: dict[str, Any] = {**field._asdict(), "kinds": list(field.kinds)}
            if field.entry == "choice":
                row["options"] = _options(kind, field.name)
            elif field.entry == "fit":
                row |= {"entry": "choice", "options": list(_FITS)}
            rows.append(row)
        told[kind] = rows
    weight = Dependence.model_fields["weight"].default
    thresholds = list(Dependence.model_fields["thresholds"].default)
    told["depends"] = [{"name": "weight", "entry": "share", "start": weight},
                       {"name": "thresholds", "entry": "shares", "start": thresholds}]  # fmt: skip
    return told


def _options(kind: Kind, name: str) -> list[str]:
    """Words of a Literal field, also of one that may be missing."""
    annotation: Any = MODELS[kind].model_fields[name].annotation
    if get_origin(annotation) in (Union, types.UnionType):
        annotation = next(each for each in get_args(annotation) if get_origin(each) is Literal)
    return [str(word) for word in get_args(annotation)]
