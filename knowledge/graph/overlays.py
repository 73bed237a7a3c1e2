"""Overlays, as values and as text: what a department or a case adds to the base, changes, retires or disputes.

An overlay is one YAML file, or a folder of them::

    name: "Stroke unit"
    author: "A. Reader"
    date: 2026-12-01
    add:
      sources: {local_2026: {...}}
      claims: {naming_needs_uncinate: {...}}
    change:
      signs: {apathy: {minutes: 4}}            # the named fields get new values, the others stay
    retire:
      claims: {old_claim: {reason: "..."}}
    dispute:
      claims: {another_claim: {reason: "...", sources: [local_2026]}}
    drafts:
      add: {...}                               # kept, shown, and not used

The blocks follow the grammar of the curated folders; a segment is a block of its own under ``segments``, keyed
``pathway.segment``. Any block may carry ``author``, ``date`` and ``reason`` of its own. In a folder,
``overlay.yaml`` holds name, author and date, and any other ``*.yaml`` holds blocks.
"""

from __future__ import annotations

import datetime
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Any, Literal, get_args

from byway.knowledge.faults import FaultReport, GraphError, nearest
from byway.knowledge.graph.content import KINDS, PLURALS, Kind, Origin, kind_from
from byway.knowledge.graph.emit import emit_yaml
from byway.knowledge.graph.grammar import Place
from byway.knowledge.yamltext import Lined, parse_yaml

__all__ = [
    "ACTIONS",
    "OVERLAY_RULES",
    "Action",
    "Entry",
    "Overlay",
    "Slot",
    "blocks",
    "entries_in",
    "overlay_from",
    "overlay_text",
    "parse_overlay",
]

Action = Literal["add", "change", "retire", "dispute"]
ACTIONS: tuple[Action, ...] = get_args(Action)
# Rules of overlays beside those of reading and of the graph that they make.
OVERLAY_RULES: dict[str, str] = {
    "overlay-form": "an overlay has a name of its own, an author and ISO dates",
    "no-reason": "whoever retires or disputes says why",
    "edit": "an edit finds the overlay as it was made for",
    "unwritable": "the place for the overlay can be written",
}
Slot = tuple[Action, Kind, str]
META = ("author", "date", "reason")


@dataclass(frozen=True)
class Entry:
    """One thing that an overlay does to one record.

    Parameters
    ----------
    action : str
        ``add`` (a new record), ``change`` (new values of some fields), ``retire`` (out of use), ``dispute`` (in use,
        shown as disputed).
    kind, key : str
        The record.
    body : mapping
        Block of the new record; fields with their new values; ``{"sources": [...]}`` of a dispute; empty of a retire.
    reason, author, date : str
        Why, who, and the ISO date; author and date are empty where the overlay's own hold.
    draft : bool
        Whether the entry is kept without being used.
    origin : Origin
        Where it stands; no part of equality.
    """

    action: Action
    kind: Kind
    key: str
    body: Mapping[str, Any] = field(default_factory=dict)
    reason: str = ""
    author: str = ""
    date: str = ""
    draft: bool = False
    origin: Origin = field(default=Origin("", "", 0), compare=False)

    @property
    def slot(self) -> Slot:
        """Action, kind and key: an overlay holds one entry a slot."""
        return self.action, self.kind, self.key

    @property
    def words(self) -> str:
        """What the entry does, in a few words."""
        verb = {"add": "adds", "change": "changes", "retire": "retires", "dispute": "disputes"}[self.action]
        fields = f" ({', '.join(self.body)})" if self.action == "change" else ""
        reason = f": {self.reason}" if self.reason else ""
        return f"{verb} {self.kind} {self.key}{fields}{reason}{' [draft]' if self.draft else ''}"

    def block(self) -> dict[str, Any]:
        """The entry as it stands in the overlay's text."""
        return {**self.body, **{name: getattr(self, name) for name in META if getattr(self, name)}}


@dataclass(frozen=True)
class Overlay:
    """A named set of entries by one author (unless an entry says otherwise), in the order of their slots.

    ``texts`` remembers the files that it was read from (name to text), so that an overlay brought back to what it was
    is written back byte by byte, comments and all; no part of equality.
    """

    name: str
    author: str
    date: str
    entries: tuple[Entry, ...] = ()
    texts: Mapping[str, str] = field(default_factory=dict, compare=False, repr=False)

    def __post_init__(self) -> None:
        order = sorted(
            self.entries, key=lambda entry: (ACTIONS.index(entry.action), KINDS.index(entry.kind), entry.key)
        )
        object.__setattr__(self, "entries", tuple(order))

    def entry(self, slot: Slot) -> Entry | None:
        """The entry in a slot, draft or not; None if there is none."""
        return next((entry for entry in self.entries if entry.slot == slot), None)

    def with_entry(self, slot: Slot, entry: Entry | None) -> Overlay:
        """This overlay with one slot filled, refilled or (None) emptied."""
        kept = tuple(each for each in self.entries if each.slot != slot)
        return replace(self, entries=kept + ((entry,) if entry is not None else ()))

    @property
    def used(self) -> tuple[Entry, ...]:
        """Entries that are no drafts."""
        return tuple(entry for entry in self.entries if not entry.draft)

    @property
    def drafts(self) -> tuple[Entry, ...]:
        """Entries that are kept without being used."""
        return tuple(entry for entry in self.entries if entry.draft)


def overlay_text(overlay: Overlay) -> str:
    """The overlay as YAML; equal overlays give equal bytes, and reading it back gives an equal overlay."""
    return emit_yaml({"name": overlay.name, "author": overlay.author, "date": overlay.date, **blocks(overlay.entries)})


def parse_overlay(text: str, name: str = "overlay") -> Overlay:
    """An overlay from YAML text; ``name`` is what faults call the text.

    Raises
    ------
    GraphError
        Holding every fault of its form. Whether it fits a graph is seen when it is applied.
    """
    return overlay_from([parse_yaml(text, name, GraphError)])


def blocks(entries: Iterable[Entry]) -> dict[str, Any]:
    """Entries as nested mappings, as they stand in text: action, kind, key; drafts last."""
    entries = list(entries)
    nested = _nested(entry for entry in entries if not entry.draft)
    drafts = _nested(entry for entry in entries if entry.draft)
    return {**nested, **({"drafts": drafts} if drafts else {})}


def _nested(entries: Iterable[Entry]) -> dict[str, Any]:
    nested: dict[str, dict[str, dict[str, Any]]] = {}
    for entry in entries:
        nested.setdefault(entry.action, {}).setdefault(PLURALS[entry.kind], {})[entry.key] = entry.block()
    return nested


def overlay_from(texts: Sequence[Lined]) -> Overlay:
    """One overlay from its texts, the first of which holds name, author and date.

    Raises
    ------
    GraphError
        As :func:`parse_overlay`.
    """
    report = FaultReport()
    header = texts[0]
    values = header.value if isinstance(header.value, Mapping) else {}
    words = {}
    for name in ("name", "author", "date"):
        word = _word(values.get(name))
        if not word:
            report.add("overlay-form", header.where(()), f"no {name}", f"a line '{name}: ...'")
        words[name] = word
    if words["date"] and not _is_date(words["date"]):
        report.add("overlay-form", header.where(("date",)), words["date"], "a date such as 2026-12-01")
    if words["name"] == "base":
        report.add("overlay-form", header.where(("name",)), "the name 'base'", "a name of its own")
    entries: dict[Slot, Entry] = {}
    for read in texts:
        for entry in entries_in(read, words["name"], header is read, report):
            first = entries.get(entry.slot)
            if first is None:
                entries[entry.slot] = entry
                continue
            where = f"{entry.origin.file}:{entry.origin.line} {entry.key}"
            there = f"it already stands in {first.origin.file}:{first.origin.line}"
            report.add("duplicate", where, f"a second {entry.action} of this {entry.kind}", "each once", there)
    report.raise_if_grave(GraphError)
    return Overlay(words["name"], words["author"], words["date"], tuple(entries.values()))


def entries_in(read: Lined, layer: str, is_header: bool, report: FaultReport) -> list[Entry]:
    """Entries of one text; faults of form go to the report."""
    top = read.value if read.value is not None else {}
    if not isinstance(top, Mapping):
        report.add(
            "not-a-mapping", read.where(()), f"a {type(top).__name__} at the top", "name, author, date and blocks"
        )
        return []
    entries: list[Entry] = []
    known = (*ACTIONS, "drafts", *(("name", "author", "date") if is_header else ()))
    for word in top:
        if word not in known:
            hint = nearest(str(word), known) or f"known: {', '.join(known)}"
            report.add("unknown-field", read.where((word,)), f"{word!r} is not known here", remedy=hint)
    for drafts, place in ((False, ()), (True, ("drafts",))):
        actions = top.get("drafts", {}) if drafts else top
        if not isinstance(actions, Mapping):
            report.add(
                "not-a-mapping", read.where(place), f"a {type(actions).__name__}", "add, change, retire, dispute"
            )
            continue
        for word in actions if drafts else ():
            if word not in ACTIONS:
                report.add("unknown-field", read.where((*place, word)), f"{word!r}", f"one of {', '.join(ACTIONS)}")
        for action in ACTIONS:
            if action in actions:
                entries += _of_action(action, actions[action], read, (*place, action), layer, drafts, report)
    return entries


def _of_action(
    action: Action, kinds: Any, read: Lined, place: Place, layer: str, draft: bool, report: FaultReport
) -> list[Entry]:
    entries: list[Entry] = []
    if not isinstance(kinds, Mapping):
        report.add(
            "not-a-mapping", read.where(place), f"a {type(kinds).__name__}", "kinds, each with its keys under it"
        )
        return entries
    for word, blocks in kinds.items():
        kind = kind_from(str(word))
        if kind is None or word != PLURALS[kind]:
            hint = nearest(str(word), PLURALS.values()) or f"known: {', '.join(PLURALS.values())}"
            report.add("unknown-word", read.where((*place, word)), f"kind {word!r}", remedy=hint)
            continue
        if not isinstance(blocks, Mapping):
            report.add("not-a-mapping", read.where((*place, word)), f"a {type(blocks).__name__}", "keys and blocks")
            continue
        for key, body in blocks.items():
            here = (*place, word, key)
            if not isinstance(key, str) or not isinstance(body, Mapping) or not all(isinstance(x, str) for x in body):
                report.add("not-a-mapping", read.where(here), f"{body!r:.40}", "a key, and fields with values under it")
                continue
            entry = _entry(action, kind, key, body, read, here, report)
            if entry is not None:
                origin = Origin(layer, read.name, read.lines.get(here, 1))
                entries.append(Entry(*entry.slot, entry.body, entry.reason, entry.author, entry.date, draft, origin))
    return entries


def _entry(
    action: Action, kind: Kind, key: str, block: Mapping[str, Any], read: Lined, place: Place, report: FaultReport
) -> Entry | None:
    body = {name: value for name, value in block.items() if name not in META}
    reason, author, date = (_word(block.get(name)) for name in ("reason", "author", "date"))
    where = read.where(place).partition(" ")[0] + f" {key}"
    allowed = {"retire": (), "dispute": ("sources",)}.get(action)
    if allowed is not None:
        for name in body:
            if name not in allowed:
                report.add("unknown-field", where, f"field {name!r} in a {action} block", ", ".join((*META, *allowed)))
        if not reason:
            report.add("no-reason", where, f"a {action} without a reason", "reason: ...")
    elif not body:
        report.add("missing-field", where, f"nothing to {action}", "fields with values")
    if date and not _is_date(date):
        report.add("overlay-form", where, date, "a date such as 2026-12-01")
    sources = body.get("sources", [])
    if action == "dispute" and not (isinstance(sources, list) and all(isinstance(each, str) for each in sources)):
        report.add("type", where, f"sources {sources!r:.40}", "a list of source keys")
        return None
    return Entry(action, kind, key, body, reason, author, date)


def _word(value: Any) -> str:
    """Text of a header value; YAML hands an unquoted date over as a date."""
    if isinstance(value, datetime.date):
        return value.isoformat()
    return value if isinstance(value, str) else "" if value is None else str(value)


def _is_date(text: str) -> bool:
    try:
        return datetime.date.fromisoformat(text).isoformat() == text
    except ValueError:
        return False
