"""Every word a user can see, from one text table with its origin.

``words.yaml`` holds sections (one per panel, and ``shared``); a section holds keys; a key holds the text and its
origin: ``trade`` (a term of the clinic or of imaging), ``open standard`` (a term of a published standard) or ``ours``.
A panel hands its section to its front end as a trait, so that no label stands in the JavaScript.
"""

from __future__ import annotations

from collections.abc import Mapping
from functools import cache
from importlib.resources import files
from types import MappingProxyType
from typing import NamedTuple

import yaml

from byway.knowledge.faults import BywayError, Fault, nearest

__all__ = ["ORIGINS", "Word", "section", "word", "words"]

ORIGINS = ("trade", "open standard", "ours")


class Word(NamedTuple):
    """One label: what the user reads, and where the term comes from (one of :data:`ORIGINS`)."""

    text: str
    origin: str


@cache
def words() -> Mapping[str, Mapping[str, Word]]:
    """All words, by section and key. Frozen; read once.

    Raises
    ------
    BywayError
        If an entry has no text or an unknown origin.
    """
    loader = getattr(yaml, "CSafeLoader", yaml.SafeLoader)
    raw = yaml.load(
        files("byway.knowledge").joinpath("words.yaml").read_text("utf-8"), loader
    )  # safe loader either way
    table = {}
    for name, entries in raw.items():
        for key, entry in entries.items():
            _check(f"words.yaml {name}.{key}", entry)
        table[name] = MappingProxyType({key: Word(e["text"], e["origin"]) for key, e in entries.items()})
    return MappingProxyType(table)


def _check(where: str, entry: object) -> None:
    if not isinstance(entry, dict) or set(entry) != {"text", "origin"} or not isinstance(entry["text"], str):
        raise BywayError(Fault("word-form", where, f"{entry!r}", "{text: ..., origin: ...}"))
    if entry["origin"] not in ORIGINS:
        raise BywayError(Fault("word-origin", where, f"origin {entry['origin']!r}", f"one of {', '.join(ORIGINS)}"))


def word(key: str, /, **values: object) -> str:
    """The text of ``"section.key"``; ``{name}`` in it is filled from ``values``.

    >>> word("shared.left_letter")
    'L'

    Raises
    ------
    BywayError
        If there is no such word; the message suggests the nearest.
    """
    name, _, rest = key.partition(".")
    try:
        text = words()[name][rest].text
    except KeyError:
        known = [f"{s}.{k}" for s, entries in words().items() for k in entries]
        raise BywayError(Fault("unknown-word", "words.yaml", f"no word {key!r}", "", nearest(key, known))) from None
    return text.format(**values) if values else text


def section(*names: str) -> dict[str, str]:
    """Texts of one or more sections by key, fit for a trait; a later section wins where keys repeat.

    >>> section("shared")["right_letter"]
    'R'
    """
    return {key: entry.text for name in names for key, entry in words()[name].items()}
