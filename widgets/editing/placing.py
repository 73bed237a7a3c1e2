"""Which field of a form a fault belongs to, so that it is shown beside it."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from typing import Any

from byway.knowledge.faults import Fault

__all__ = ["faults_told", "field_of"]

# What a fault's first words point to, where its place does not end with a field.
_BY_WORDS = (
    (r"source ", "sources"), (r"subject ", "subject"), (r"object ", "object"), (r"region ", "from"),
    (r"it begins ", "from"), (r"it ends ", "to"), (r"function ", "depends"), (r"thresholds ", "depends"),
    (r".* seeds?\b", "seeds_mni"), (r".*(waypoint|course|midline)", "waypoints_mni"), (r"key ", "key"),
    (r"adds a ", "key"), (r"pathway ", "key"), (r".*shares its key", "key"),
)  # fmt: skip
_BY_RULE = {
    "no-reason": "reason", "load-sum": "routes", "chain-order": "routes", "route-join": "routes", "cycle": "routes",
    "no-route": "routes", "unclaimed-route": "routes", "repeated": "sources", "thresholds": "depends",
    "side-rule": "side_rule", "unclaimed-sign": "depends", "spelling": "key", "duplicate": "key",
}  # fmt: skip


def field_of(fault: Fault, key: str, body: Mapping[str, Any], known: Iterable[str]) -> str | None:
    """Name of the field that a fault speaks of; ``""`` for the record as a whole, None for another record.

    Parameters
    ----------
    fault : Fault
        From a trial of an edit.
    key : str
        Key of the record that is edited.
    body : mapping
        Its block.
    known : iterable of str
        Fields of the form.
    """
    names = {*known, "key", "reason"}
    if not re.search(rf"(^|\s){re.escape(key)}(:|$)", fault.where):
        return None
    ending = fault.where.rpartition(f"{key}: ")[2] if f"{key}: " in fault.where else ""
    first = ending.partition(".")[0]
    if first in names:
        return first
    quoted = re.match(r"region '([^']*)'", fault.found)
    if quoted and str(body.get("to", "")).partition("@")[0] == quoted[1]:
        return "to"
    guesses = [_BY_RULE.get(fault.rule), *(field for words, field in _BY_WORDS if re.match(words, fault.found))]
    for guess in guesses:
        if guess in names:
            return guess
    return ""


def faults_told(
    faults: Iterable[Fault], key: str, body: Mapping[str, Any], known: Iterable[str]
) -> list[dict[str, Any]]:
    """Faults with their fields, for the browser; those of other records say where."""
    fields = tuple(known)
    rows = []
    for fault in faults:
        field = field_of(fault, key, body, fields)
        text = "; ".join(part for part in (fault.found, f"expected {fault.expected}" if fault.expected else "",
                                           fault.remedy) if part)  # fmt: skip
        if field is None:
            text = f"{fault.where}: {text}"
        rows.append({"field": field or "", "rule": fault.rule, "text": text, "grave": fault.grave})
    return rows
