"""Layers: a base and any number of overlays on it, the records in effect, and the difference of two states in words.

An overlay never rewrites what lies below it. Each step makes new content; the base stays as it was.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from typing import Any

from pydantic import ValidationError

from byway.knowledge.faults import FaultReport, GraphError, nearest
from byway.knowledge.graph.content import KINDS, Content, Dispute, Kind, Origin, Retirement
from byway.knowledge.graph.emit import emit_yaml
from byway.knowledge.graph.grammar import record_faults, to_block, to_record
from byway.knowledge.graph.overlays import Entry, Overlay
from byway.knowledge.graph.records import Pathway, Record

__all__ = ["Change", "Conflict", "apply_overlays", "clashes", "diff"]

Records = dict[Kind, dict[str, Record]]


@dataclass(frozen=True)
class Change:
    """One difference between two states of a graph.

    ``action`` is added, changed, retired, disputed or undisputed; ``fields`` holds name, old and new value of each
    changed field; ``layer`` is the layer that speaks for the newer state.
    """

    action: str
    kind: Kind
    key: str
    words: str
    fields: tuple[tuple[str, Any, Any], ...] = ()
    layer: str = ""


@dataclass(frozen=True)
class Conflict:
    """Two overlays that cannot both have their way with one record. ``field`` is empty where it is the whole record."""

    kind: Kind
    key: str
    field: str
    first: Entry
    second: Entry
    words: str


def apply_overlays(base: Content, overlays: Iterable[Overlay]) -> Content:
    """The records in effect when overlays lie on a base, the first lowest. Drafts are left out.

    Parameters
    ----------
    base : Content
        Not touched.
    overlays : iterable of Overlay
        Their names must differ.

    Raises
    ------
    GraphError
        Holding every fault: an added key that already stands, a changed, retired or disputed key that does not, a
        block that is no record, two overlays of one name. Rules between records are the business of the checks.
    """
    report = FaultReport()
    records: Records = {kind: dict(base.records(kind)) for kind in KINDS}
    origins = dict(base.origins)
    disputes = dict(base.disputes)
    layers = list(base.layers)
    retired = dict(base.retired)
    for overlay in overlays:
        if overlay.name in layers:
            report.add("overlay-form", overlay.name, "two layers of this name", "a name for each layer")
        layers.append(overlay.name)
        for entry in overlay.used:
            _apply(entry, overlay, records, origins, disputes, retired, report)
    report.raise_if_grave(GraphError)
    _gather_segments(records)
    return Content.of(records, origins, disputes, tuple(layers), retired)


def diff(older: Content, newer: Content) -> list[Change]:
    """What changed between two states, kind by kind, in the order of the newer text."""
    changes: list[Change] = []
    for kind in KINDS:
        before, after = older.records(kind), newer.records(kind)
        for key, record in after.items():
            origin = newer.origins.get((kind, key))
            layer = origin.layer if origin else ""
            if key not in before:
                words = f"{kind} {key} added: {_title(record)}{_by(layer)}"
                changes.append(Change("added", kind, key, words, layer=layer))
            elif before[key] != record:
                changes.append(_changed(kind, key, before[key], record, layer))
            changes += _dispute_changes(kind, key, older, newer)
        for key, record in before.items():
            if key not in after:
                gone = newer.retired.get((kind, key))
                told = f", {gone.reason}{_by(gone.origin.layer)}" if gone else ""
                words = f"{kind} {key} retired: {_title(record)}{told}"
                changes.append(Change("retired", kind, key, words, layer=gone.origin.layer if gone else ""))
    # A pathway changes with the list of its segments; the segments' own lines already say it.
    return [change for change in changes if not (change.kind == "pathway" and _only_segments(change))]


def clashes(first: Overlay, second: Overlay) -> list[Conflict]:
    """Records on which two overlays cannot both have their way, side by side.

    Two additions of one key with different blocks, different new values of one field, and a change or dispute of
    what the other retires. Two disputes stand together. Drafts are looked at too.
    """
    conflicts: list[Conflict] = []
    theirs: dict[tuple[Kind, str], list[Entry]] = {}
    for entry in second.entries:
        theirs.setdefault((entry.kind, entry.key), []).append(entry)
    for mine in first.entries:
        for other in theirs.get((mine.kind, mine.key), ()):
            conflicts += _clash(mine, other, first.name, second.name)
    return conflicts


def _apply(
    entry: Entry,
    overlay: Overlay,
    records: Records,
    origins: dict[tuple[Kind, str], Origin],
    disputes: dict[tuple[Kind, str], tuple[Dispute, ...]],
    retired: dict[tuple[Kind, str], Retirement],
    report: FaultReport,
) -> None:
    place = (entry.kind, entry.key)
    origin = replace(entry.origin, layer=overlay.name, file=entry.origin.file or overlay.name)
    where = f"{origin.file}:{origin.line} {entry.key}" if origin.line else f"{origin.file} {entry.key}"
    known = records[entry.kind]
    if entry.action == "add" and entry.key in known:
        first = origins.get(place)
        there = f"it already stands in {first}" if first else "change it instead"
        report.add("duplicate", where, f"adds a {entry.kind} that is there", "a new key", there)
        return
    if entry.action != "add" and entry.key not in known:
        report.add(
            "unknown-key",
            where,
            f"wants to {entry.action} a {entry.kind} that is not there",
            remedy=nearest(entry.key, known) or "check the key",
        )
        return
    author, date = entry.author or overlay.author, entry.date or overlay.date
    match entry.action:
        case "retire":
            retired[place] = Retirement(entry.reason, author, date, origin)
            del known[entry.key]
            origins.pop(place, None)
            disputes.pop(place, None)
        case "dispute":
            dispute = Dispute(entry.reason, author, date, tuple(entry.body.get("sources", ())), origin)
            disputes[place] = (*disputes.get(place, ()), dispute)
        case "add" | "change":
            body = dict(entry.body)
            if entry.action == "change":
                body = {**to_block(known[entry.key]), **body}
            record = _record(entry, body, where, report)
            if record is not None:
                known[entry.key] = record
                origins[place] = origin
                retired.pop(place, None)


def _record(entry: Entry, body: Mapping[str, Any], where: str, report: FaultReport) -> Record | None:
    if entry.kind == "pathway" and "segments" in body:
        report.add(
            "unknown-field", where, "segments inside a pathway", "blocks under 'segments', keyed pathway.segment"
        )
        return None
    try:
        return to_record(entry.kind, entry.key, body)
    except ValidationError as error:
        for _, fault in record_faults(error, entry.kind, body):
            field = f": {fault.where}" if fault.where else ""
            report.add(fault.rule, where + field, fault.found, fault.expected, fault.remedy)
        return None


def _gather_segments(records: Records) -> None:
    """Let every pathway list the segments that name it, old ones in their old order."""
    keys: dict[str, list[str]] = {}
    for key in records["segment"]:
        keys.setdefault(key.partition(".")[0], []).append(key)
    for key, pathway in records["pathway"].items():
        found = tuple(keys.get(key, ()))
        if isinstance(pathway, Pathway) and pathway.segments != found:
            records["pathway"][key] = pathway.model_copy(update={"segments": found})


def _changed(kind: Kind, key: str, before: Record, after: Record, layer: str) -> Change:
    old, new = before.model_dump(mode="json"), after.model_dump(mode="json")
    fields = tuple((name, old[name], new[name]) for name in new if old[name] != new[name])
    told = "; ".join(_told(name, was, now) for name, was, now in fields)
    return Change("changed", kind, key, f"{kind} {key} changed: {told}{_by(layer)}", fields, layer)


def _told(name: str, was: Any, now: Any) -> str:
    """A changed field in words; of a list of routes or dependences, only what differs in it."""
    for each in ("key", "function"):
        if all(isinstance(part, list) and all(isinstance(i, dict) and each in i for i in part) for part in (was, now)):
            before, after = {i[each]: i for i in was}, {i[each]: i for i in now}
            parts = [f"{key} no longer there" for key in before if key not in after]
            parts += [f"{key} new" for key in after if key not in before]
            parts += [
                f"{key} {field} from {_short(before[key].get(field))} to {_short(value)}"
                for key, item in after.items()
                if key in before
                for field, value in item.items()
                if before[key].get(field) != value
            ]
            return f"{name}: {', '.join(parts) or 'in another order'}"
    return f"{name} from {_short(was)} to {_short(now)}"


def _dispute_changes(kind: Kind, key: str, older: Content, newer: Content) -> list[Change]:
    before, after = older.disputes.get((kind, key), ()), newer.disputes.get((kind, key), ())
    changes = []
    for dispute in after:
        if dispute not in before:
            words = f"{kind} {key} disputed by {dispute.author}: {dispute.reason}{_by(dispute.origin.layer)}"
            changes.append(Change("disputed", kind, key, words, layer=dispute.origin.layer))
    for dispute in before:
        if dispute not in after:
            words = f"{kind} {key} no longer disputed by {dispute.author}: {dispute.reason}"
            changes.append(Change("undisputed", kind, key, words))
    return changes


def _only_segments(change: Change) -> bool:
    return change.action == "changed" and all(name == "segments" for name, _, _ in change.fields)


def _clash(mine: Entry, other: Entry, first: str, second: str) -> list[Conflict]:
    actions = {mine.action, other.action}
    label = f"{mine.kind} {mine.key}"
    if actions == {"add"} and mine.body != other.body:
        return [
            Conflict(mine.kind, mine.key, "", mine, other, f"{label}: {first} and {second} both add it, differently")
        ]
    if actions == {"change"}:
        return [
            Conflict(
                mine.kind,
                mine.key,
                name,
                mine,
                other,
                f"{label}: {name} is {_short(mine.body[name])} in {first} and {_short(other.body[name])} in {second}",
            )
            for name in mine.body
            if name in other.body and mine.body[name] != other.body[name]
        ]
    if "retire" in actions and actions & {"change", "dispute"}:
        retiring, keeping = (first, second) if mine.action == "retire" else (second, first)
        verb = next(iter(actions - {"retire"}))
        words = f"{label}: {retiring} retires what {keeping} {verb}s"
        return [Conflict(mine.kind, mine.key, "", mine, other, words)]
    return []


def _title(record: Record) -> str:
    for name in ("says", "name", "authors"):
        text = getattr(record, name, None)
        if text:
            return f'"{text}"'
    return record.key


def _by(layer: str) -> str:
    return f" ({layer})" if layer and layer != "base" else ""


def _short(value: Any) -> str:
    if isinstance(value, str):
        return f'"{value}"'
    text = emit_yaml({"value": [value]}).strip()[len("value: [") : -1]
    return text if len(text) <= 80 else f"{text[:77]}..."
