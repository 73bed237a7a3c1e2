"""The typed graph: frozen records of all layers with fast look-ups by side, claim and source."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, fields
from functools import cached_property
from typing import TypeVar

import networkx as nx

from byway.knowledge.faults import Fault, GraphError, nearest
from byway.knowledge.graph.content import KINDS, Content, Kind, Origin, kind_from
from byway.knowledge.graph.records import Claim, Dependence, Record, Region, Segment, Side, Source
from byway.knowledge.graph.references import (
    Hemisphere,
    copy_sides,
    other_side,
    resolve_reference,
    resolved_chains,
    split_reference,
)

__all__ = ["Graph", "graph_from"]

_R = TypeVar("_R", bound=Record)


@dataclass(frozen=True)
class Graph(Content):
    """Effective records with look-ups. Element ids are ``key@side``; claims use bare keys.

    Made by :func:`~byway.knowledge.graph.loading.load_graph`. Nothing in it changes; an edit makes a new graph.
    """

    def resolve(self, reference: str, side: Hemisphere) -> str:
        """Element id of a reference, read on one side (see :func:`resolve_reference`)."""
        return resolve_reference(self, reference, side)

    def kind_of(self, key: str) -> Kind:
        """Kind of a key, or of an element, function-copy or sign id.

        Raises
        ------
        GraphError
            No record has the key.
        """
        bare = split_reference(key)[0]
        for kind in KINDS:
            if bare in self.records(kind):
                return kind
        known = [key for _, key, _ in self.every_record()]
        raise GraphError(Fault("unknown-key", key, "no such key in the graph", remedy=nearest(bare, known)))

    def name_of(self, key: str) -> str:
        """Readable name of a key or id, with its side where it has one.

        Sources answer with authors and year, claims with what they say.
        """
        bare, side = split_reference(key)
        record = self.records(self.kind_of(key))[bare]
        if isinstance(record, Segment):
            pathway = self.pathways[record.pathway]
            alone = len(pathway.segments) == 1
            name = pathway.name if alone else f"{pathway.name} ({_within_a_name(record.name)})"
        elif isinstance(record, Claim):
            name = record.says
        elif isinstance(record, Source):
            name = f"{record.authors} {record.year}"
        else:
            name = str(getattr(record, "name", bare))
        return f"{name}, {side}" if side and side != "none" else name

    def place(self, element: str) -> Region | Segment:
        """Region or segment of a key or element id.

        Raises
        ------
        GraphError
            No region or segment has the key.
        """
        key = split_reference(element)[0]
        place: Region | Segment | None = self.regions.get(key) or self.segments.get(key)
        if place is None:
            known = [*self.regions, *self.segments]
            raise GraphError(Fault("unknown-key", element, "no such region or segment", remedy=nearest(key, known)))
        return place

    def sides_of(self, key: str) -> tuple[Side, ...]:
        """Sides of a region or segment: ``("left", "right")`` or ``("midline",)``."""
        return ("left", "right") if self.place(key).sides == "paired" else ("midline",)

    def element_ids(self, key: str) -> tuple[str, ...]:
        """Element ids of a region, of a segment, or of all segments of a pathway."""
        pathway = self.pathways.get(key)
        if pathway is not None:
            return tuple(element for segment in pathway.segments for element in self.element_ids(segment))
        return tuple(f"{key}@{side}" for side in self.sides_of(key))

    @cached_property
    def all_element_ids(self) -> tuple[str, ...]:
        """Every element id: regions first, then segments, each in the order of the curated text."""
        return tuple(element for key in (*self.regions, *self.segments) for element in self.element_ids(key))

    def function_copies(self, key: str) -> tuple[str, ...]:
        """Ids of the copies of a function.

        Raises
        ------
        GraphError
            No function has the key.
        """
        return tuple(copy_sides(self._record(self.functions, key, "function")))

    def sign_ids(self, key: str | None = None) -> tuple[str, ...]:
        """Ids of one sign, or of all: ``key@left`` and ``key@right`` where it has a side, else ``key@none``.

        The side is the side of the body or field on which the sign is seen.
        """
        if key is None:
            return tuple(sign_id for each in self.signs for sign_id in self.sign_ids(each))
        sign = self._record(self.signs, key, "sign")
        if sign.side_rule in ("contralateral", "ipsilateral"):
            return (f"{key}@left", f"{key}@right")
        return (f"{key}@none",)

    def sign_dependences(
        self, sign_id: str, dominance: Hemisphere = "left"
    ) -> tuple[tuple[Dependence, tuple[str, ...]], ...]:
        """Dependences of a sign on one side, each with the function copies that it rests on.

        One copy: the sign follows that copy. Two copies: with side rule ``either`` the loss of either shows; with
        ``bilateral`` both must be lost, so the larger of the two capacities counts.

        Parameters
        ----------
        sign_id : str
            ``key@left``, ``key@right`` or ``key@none``.
        dominance : "left" or "right"
            Hemisphere dominant for language: decides which copy of an ``each_side`` function a ``dominant`` or
            ``nondominant`` sign rests on.
        """
        key, side = split_reference(sign_id)
        sign = self._record(self.signs, key, "sign")
        if sign_id not in self.sign_ids(key):
            raise GraphError(Fault("side", sign_id, f"side {side!r}", f"one of {', '.join(self.sign_ids(key))}"))
        pairs = []
        for dependence in sign.depends:
            copies = self.function_copies(dependence.function)
            if len(copies) == 2:
                match sign.side_rule:
                    case "contralateral":
                        copies = (f"{dependence.function}@{'right' if side == 'left' else 'left'}",)
                    case "ipsilateral":
                        copies = (f"{dependence.function}@{side}",)
                    case "dominant":
                        copies = (f"{dependence.function}@{dominance}",)
                    case "nondominant":
                        copies = (f"{dependence.function}@{other_side(dominance)}",)
            pairs.append((dependence, copies))
        return tuple(pairs)

    def claims_about(self, subject: str | None = None, object: str | None = None) -> tuple[Claim, ...]:
        """Claims with the given subject, object or both, in the order of the text; sides in ids are ignored."""
        claims: Iterable[Claim]
        if subject is not None:
            claims = self._claims_by_subject.get(split_reference(subject)[0], ())
            if object is not None:
                bare = split_reference(object)[0]
                claims = (claim for claim in claims if claim.object == bare)
        elif object is not None:
            claims = self._claims_by_object.get(split_reference(object)[0], ())
        else:
            claims = self.claims.values()
        return tuple(claims)

    def sources_of(self, claim: str | Claim) -> tuple[Source, ...]:
        """Sources of a claim."""
        record = self._record(self.claims, claim, "claim") if isinstance(claim, str) else claim
        return tuple(self._record(self.sources, key, "source") for key in record.sources)

    def origin(self, kind: str, key: str) -> Origin:
        """Layer, file and line of a record.

        Raises
        ------
        GraphError
            No such record.
        """
        known = kind_from(kind)
        origin = self.origins.get((known, key)) if known else None
        if origin is None:
            raise GraphError(Fault("unknown-key", f"{kind} {key}", "no such record"))
        return origin

    def norm(self, key: str, member: str | None = None) -> float:
        """Value of a norm, or of one member of a norm that is a mapping.

        Raises
        ------
        GraphError
            Unknown norm or member, a missing member, or a member asked of a single number.
        """
        norm = self._record(self.norms, key, "norm")
        if isinstance(norm.value, dict):
            if member not in norm.value:
                raise GraphError(
                    Fault("unknown-key", f"norm {key}", f"member {member!r}", f"one of {', '.join(norm.value)}")
                )
            return norm.value[member]
        if member is not None:
            raise GraphError(Fault("unknown-key", f"norm {key}", f"member {member!r}", "no member: it is one number"))
        return norm.value

    @cached_property
    def content_hash(self) -> str:
        """Hash of every record (not of where it came from)."""
        return self._hash(KINDS)

    @cached_property
    def anatomy_hash(self) -> str:
        """Hash of the regions and segments alone: what geometry is built from."""
        return self._hash(("region", "segment"))

    @cached_property
    def network(self) -> nx.MultiDiGraph:
        """Everything as one networkx graph.

        Nodes are element ids, function copies, sign ids, ``claim:key`` and ``source:key``, with attributes ``kind``,
        ``key``, ``name`` and ``side``. Edges carry ``relation``: ``joins`` (segment to region), ``serves`` (element
        to function copy, with ``route`` and ``load``), ``shows_as`` (function copy to sign, with ``weight``),
        ``about`` (claim to all that it speaks of) and ``cites`` (claim to source).
        """
        network = nx.MultiDiGraph()
        self._add_nodes(network)
        for key, segment in self.segments.items():
            for side in self.sides_of(key):
                for place, end in ((segment.from_place, "from"), (segment.to_place, "to")):
                    if not place.startswith("wm:"):
                        region = self.resolve(place, "right" if side == "right" else "left")
                        network.add_edge(f"{key}@{side}", region, relation="joins", end=end)
        for function in self.functions.values():
            for copy_id, sides in copy_sides(function).items():
                for route, load, ids in resolved_chains(self, function, sides):
                    for element in ids:
                        network.add_edge(element, copy_id, relation="serves", route=route, load=load)
        for sign_id in self.sign_ids():
            for dependence, copies in self.sign_dependences(sign_id):
                for copy_id in copies:
                    network.add_edge(copy_id, sign_id, relation="shows_as", weight=dependence.weight)
        ids_of: dict[str, list[str]] = {}
        for node, bare in network.nodes(data="key"):
            ids_of.setdefault(bare, []).append(node)
        for claim in self.claims.values():
            for end in ("subject", "object"):
                for node in ids_of.get(getattr(claim, end), ()):
                    network.add_edge(f"claim:{claim.key}", node, relation="about", end=end)
            for source in claim.sources:
                network.add_edge(f"claim:{claim.key}", f"source:{source}", relation="cites")
        return network

    def _add_nodes(self, network: nx.MultiDiGraph) -> None:
        copies = (copy_id for key in self.functions for copy_id in self.function_copies(key))
        for node in (*self.all_element_ids, *copies, *self.sign_ids()):
            bare, side = split_reference(node)
            network.add_node(node, kind=self.kind_of(bare), key=bare, name=self.name_of(bare), side=side)
        for claim in self.claims.values():
            network.add_node(f"claim:{claim.key}", kind="claim", key=claim.key, name=claim.says, side="")
        for source in self.sources.values():
            name = self.name_of(source.key)
            network.add_node(f"source:{source.key}", kind="source", key=source.key, name=name, side="")

    def _record(self, records: Mapping[str, _R], key: str, kind: str) -> _R:
        record = records.get(key)
        if record is None:
            raise GraphError(
                Fault("unknown-key", f"{kind} {key}", f"no {kind} has this key", remedy=nearest(key, records))
            )
        return record

    def _hash(self, kinds: Iterable[Kind]) -> str:
        digest = hashlib.sha256()
        for kind in kinds:
            for key, record in sorted(self.records(kind).items()):
                text = json.dumps(record.model_dump(mode="json"), sort_keys=True, ensure_ascii=False)
                digest.update(f"{kind}\0{key}\0{text}\0".encode())
        return digest.hexdigest()

    @cached_property
    def _claims_by_subject(self) -> dict[str, list[Claim]]:
        index: dict[str, list[Claim]] = {}
        for claim in self.claims.values():
            index.setdefault(claim.subject, []).append(claim)
        return index

    @cached_property
    def _claims_by_object(self) -> dict[str, list[Claim]]:
        index: dict[str, list[Claim]] = {}
        for claim in self.claims.values():
            index.setdefault(claim.object, []).append(claim)
        return index


def graph_from(content: Content) -> Graph:
    """The typed graph of some content."""
    return Graph(**{each.name: getattr(content, each.name) for each in fields(content)})


def _within_a_name(name: str) -> str:
    """A name as the second part of a longer one: its first letter small, unless it begins a letter word."""
    return name[:1].lower() + name[1:] if name[1:2].islower() else name
