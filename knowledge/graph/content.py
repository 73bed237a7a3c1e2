"""The effective records of all layers together, and where each came from. Values only: nothing is read or checked."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any, Literal, Self, cast, get_args

from byway.knowledge.graph.records import (
    Claim,
    Function,
    Norm,
    Pathway,
    Record,
    Region,
    Segment,
    Sign,
    Source,
)

__all__ = ["KINDS", "PLURALS", "Content", "Dispute", "Kind", "Origin", "Retirement", "kind_from"]

Kind = Literal["region", "pathway", "segment", "function", "sign", "claim", "source", "norm"]
KINDS: tuple[Kind, ...] = get_args(Kind)
PLURALS: dict[Kind, str] = {kind: f"{kind}s" for kind in KINDS}


def kind_from(word: str) -> Kind | None:
    """The kind that a word names, singular or plural; None if it names none.

    >>> kind_from("claims"), kind_from("sign"), kind_from("thing")
    ('claim', 'sign', None)
    """
    singular = word.removesuffix("s")
    return singular if singular in KINDS else None


@dataclass(frozen=True)
class Origin:
    """Which layer, file and line (from 1; 0 if the record was never in a file) a record came from."""

    layer: str
    file: str
    line: int

    def __str__(self) -> str:
        return f"{self.layer}, {self.file}:{self.line}" if self.line else self.layer


@dataclass(frozen=True)
class Dispute:
    """One layer's objection to a record, which stays in use and is shown as disputed."""

    reason: str
    author: str
    date: str
    sources: tuple[str, ...]
    origin: Origin


@dataclass(frozen=True)
class Retirement:
    """Why and by whom a record was taken out of use."""

    reason: str
    author: str
    date: str
    origin: Origin


@dataclass(frozen=True)
class Content:
    """Records by kind and key, in the order of the curated text, with origins and disputes.

    ``origins``, ``disputes`` and ``retired`` are keyed by ``(kind, key)``. ``layers`` names the layers from the base
    upward.
    """

    regions: Mapping[str, Region]
    pathways: Mapping[str, Pathway]
    segments: Mapping[str, Segment]
    functions: Mapping[str, Function]
    signs: Mapping[str, Sign]
    claims: Mapping[str, Claim]
    sources: Mapping[str, Source]
    norms: Mapping[str, Norm]
    origins: Mapping[tuple[Kind, str], Origin] = field(default_factory=dict)
    disputes: Mapping[tuple[Kind, str], tuple[Dispute, ...]] = field(default_factory=dict)
    layers: tuple[str, ...] = ("base",)
    retired: Mapping[tuple[Kind, str], Retirement] = field(default_factory=dict)

    @classmethod
    def of(
        cls,
        records: Mapping[Kind, Mapping[str, Record]],
        origins: Mapping[tuple[Kind, str], Origin],
        disputes: Mapping[tuple[Kind, str], tuple[Dispute, ...]] | None = None,
        layers: tuple[str, ...] = ("base",),
        retired: Mapping[tuple[Kind, str], Retirement] | None = None,
    ) -> Self:
        """Content of records held by kind and key; each must be a record of its kind."""
        values: dict[str, Any] = {PLURALS[kind]: found for kind, found in records.items()}
        return cls(**values, origins=origins, disputes=disputes or {}, layers=layers, retired=retired or {})

    def records(self, kind: Kind) -> Mapping[str, Record]:
        """All records of a kind, by key."""
        return cast(Mapping[str, Record], getattr(self, PLURALS[kind]))

    def every_record(self) -> Iterator[tuple[Kind, str, Record]]:
        """Kind, key and record, kind by kind."""
        for kind in KINDS:
            for key, record in self.records(kind).items():
                yield kind, key, record

    def where(self, kind: Kind, key: str) -> str:
        """File, line and key of a record, as faults name them."""
        origin = self.origins.get((kind, key))
        if origin is None:
            return f"{kind} {key}"
        return f"{origin.file}:{origin.line} {key}" if origin.line else f"{origin.file} {key}"

    def counts(self) -> dict[str, int]:
        """Number of records of each kind, and of routes."""
        counts = {PLURALS[kind]: len(self.records(kind)) for kind in KINDS}
        counts["routes"] = sum(len(function.routes) for function in self.functions.values())
        return counts
