"""Two versions of case.yaml: what one writer left beside the other's, compared field by field, and settled.

Where two people change case.yaml at once, the first to write stays in place and the second is kept beside it as
``case.<id>.yaml`` (see :func:`~byway.knowledge.cases.files.write_case`). Settling moves what was not kept into the
``versions`` folder; nothing is ever deleted.
"""

from __future__ import annotations

import os
import re
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal

import yaml

from byway.knowledge.atomic import fingerprint, write_text
from byway.knowledge.cases.files import read_case, write_case
from byway.knowledge.cases.model import CaseFile
from byway.knowledge.cases.pages import new_id
from byway.knowledge.faults import CaseError, Fault

__all__ = ["Difference", "beside_versions", "differences", "merged", "settle_version", "told_differences"]

BESIDE = re.compile(r"^case\.[0-9a-f]{12}-[0-9a-f]{10}\.yaml$")


@dataclass(frozen=True)
class Difference:
    """One field of case.yaml that differs: its name, and what each version says, as text."""

    field: str
    one: str
    other: str


def beside_versions(folder: Path) -> list[str]:
    """Names of versions that wait beside case.yaml, oldest first."""
    return sorted(path.name for path in folder.glob("case.*.yaml") if BESIDE.match(path.name))


def differences(one: CaseFile, other: CaseFile) -> list[Difference]:
    """Fields that differ, in the order of case.yaml; lists are compared entry by entry.

    >>> [d.field for d in differences(CaseFile(stage="acute"), CaseFile(stage="chronic", invented=True))]
    ['invented', 'stage']
    """
    rows = []
    for name in CaseFile.model_fields:
        first, second = getattr(one, name), getattr(other, name)
        if first == second:
            continue
        if isinstance(first, tuple):
            mine, theirs = [_text(entry) for entry in first], [_text(entry) for entry in second]
            rows.append(Difference(name, "\n".join(e for e in mine if e not in theirs),
                                   "\n".join(e for e in theirs if e not in mine)))  # fmt: skip
        else:
            rows.append(Difference(name, _text(first), _text(second)))
    return rows


def _text(value: Any) -> str:
    plain = value.model_dump(mode="json", exclude_none=True) if hasattr(value, "model_dump") else value
    return str(yaml.safe_dump(plain, allow_unicode=True, default_flow_style=True, width=10_000)).strip(" \n.{}")


def merged(base: CaseFile, ours: CaseFile, theirs: CaseFile) -> tuple[CaseFile, tuple[str, ...]]:
    """Three-way merge by field: what only they changed is taken from them.

    Returns
    -------
    CaseFile
        Ours, with their changes to fields that we left alone.
    tuple of str
        Fields that both changed, and differently; these stay ours.
    """
    taken: dict[str, Any] = {}
    clashing = []
    for name in CaseFile.model_fields:
        before, mine, other = getattr(base, name), getattr(ours, name), getattr(theirs, name)
        if other in (before, mine):
            continue
        if mine == before:
            taken[name] = other
        else:
            clashing.append(name)
    return ours.model_copy(update=taken), tuple(clashing)


def settle_version(folder: Path, name: str, keep: Literal["in_place", "beside"]) -> str:
    """Keep one of two versions as case.yaml; the other moves to the ``versions`` folder.

    Parameters
    ----------
    folder : Path
        The case folder.
    name : str
        The version beside case.yaml, from :func:`beside_versions`.
    keep : {'in_place', 'beside'}
        Which one becomes case.yaml.

    Returns
    -------
    str
        Name of the version that was moved, below the case folder.

    Raises
    ------
    CaseError
        There is no such version, or the one to keep cannot be read.
    """
    beside = folder / name
    if not BESIDE.match(name) or not beside.is_file():
        waiting = ", ".join(beside_versions(folder)) or "none waits"
        raise CaseError(Fault("version-beside", name, "no such version beside case.yaml", waiting, "nothing changed"))
    kept = folder / "versions"
    kept.mkdir(exist_ok=True)
    if keep == "beside":
        spec, _ = read_case(beside)
        seen = fingerprint(folder / "case.yaml")
        old = kept / f"case.{new_id()}.yaml"
        write_text(old, (folder / "case.yaml").read_text("utf-8"))
        write_case(folder / "case.yaml", spec, seen)
        os.replace(beside, kept / f"taken.{name}")
        return old.relative_to(folder).as_posix()
    os.replace(beside, kept / name)
    return f"versions/{name}"


def told_differences(one: CaseFile, other: CaseFile) -> list[Mapping[str, str]]:
    """:func:`differences` as plain mappings: ``field``, ``one``, ``other``."""
    return [vars(row) for row in differences(one, other)]
