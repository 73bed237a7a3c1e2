"""Case files on disk: reading case.yaml with line numbers, writing it so that nobody's change is lost."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import yaml

from byway.knowledge.atomic import fingerprint, write_text
from byway.knowledge.cases.model import SCHEMA_VERSION, CaseFile
from byway.knowledge.cases.pages import new_id
from byway.knowledge.faults import CaseError, Fault
from byway.knowledge.yamltext import Lined, read_yaml, validate

__all__ = ["MIGRATIONS", "case_path", "dump_case", "inside", "read_case", "write_case"]

MIGRATIONS: dict[int, Callable[[dict[str, Any]], dict[str, Any]]] = {}
"""From schema version n to n + 1: a function of the plain mapping. Version 1 is the first, so there is none yet.

A case is migrated in memory when it is read; the file stays as it is until somebody saves."""


EXPECTED = {"age_band": "an age band such as 60-69 or 80+, or unknown"}
"""What fields hold whose pattern says little to a reader."""


def case_path(path: str | Path) -> Path:
    """The case.yaml that a folder or a file names.

    Raises
    ------
    CaseError
        Where there is neither.
    """
    given = Path(path)
    if given.is_dir():
        given = given / "case.yaml"
    if not given.is_file():
        raise CaseError(Fault("no-case", str(given), "no such file", "a case folder, or a case.yaml", "check the path"))
    return given


def read_case(path: Path) -> tuple[CaseFile, Lined]:
    """Read case.yaml.

    Raises
    ------
    CaseError
        With file and line: not YAML, an unknown field, a wrong type, or a schema newer than this byway.
    """
    read = read_yaml(path, CaseError)
    if not isinstance(read.value, dict):
        raise CaseError(
            Fault("type", read.where(()), "no mapping", "person, stage, lesion, findings", "see the README")
        )
    version = read.value.get("schema_version", 1)
    if isinstance(version, int) and version > SCHEMA_VERSION:
        raise CaseError(Fault("version", read.where(("schema_version",)), f"schema {version}",
                              f"at most {SCHEMA_VERSION}", "open it with a newer byway"))  # fmt: skip
    value = read.value
    while isinstance(version, int) and not isinstance(version, bool) and version < SCHEMA_VERSION:
        if version not in MIGRATIONS:
            raise CaseError(Fault("version", read.where(("schema_version",)), f"schema {version}",
                                  f"{min(MIGRATIONS, default=SCHEMA_VERSION)} to {SCHEMA_VERSION}",
                                  "no way leads from there; the file is as it was"))  # fmt: skip
        value = {**MIGRATIONS[version](value), "schema_version": version + 1}
        version += 1
    return validate(CaseFile, Lined(value, read.lines, read.name), CaseError, EXPECTED), read


def inside(folder: Path, name: str) -> Path:
    """A file of the case folder by its relative name.

    Raises
    ------
    CaseError
        Where the name leads out of the folder.
    """
    path = (folder / name).resolve()
    if not path.is_relative_to(folder.resolve()):
        raise CaseError(Fault("outside", "case.yaml", f"the file name {name!r}", "a file inside the case folder",
                              "copy it there"))  # fmt: skip
    return path


def _plain(value: Any) -> Any:
    if isinstance(value, dict):
        return {key: _plain(item) for key, item in value.items() if item not in (None, {}, [], ())}
    if isinstance(value, list | tuple):
        return [_plain(item) for item in value]
    return value


def dump_case(case: CaseFile) -> str:
    """case.yaml as text; equal cases give equal text."""
    head = "# A byway case. Its format: the README, and case.schema.json in byway.knowledge.cases.\n"
    body = _plain(case.model_dump(mode="python"))
    return head + str(yaml.safe_dump(body, sort_keys=False, allow_unicode=True, width=110, default_flow_style=None))


def write_case(path: Path, case: CaseFile, seen: str | None) -> str:
    """Write case.yaml, unless it changed since it was read.

    Parameters
    ----------
    path : Path
        case.yaml.
    case : CaseFile
        What to write.
    seen : str or None
        Fingerprint of the file when it was read (None: there was none).

    Returns
    -------
    str
        The new fingerprint.

    Raises
    ------
    CaseError
        Where somebody else wrote it in between. Both versions are kept: theirs in place, ours beside it.
    """
    text = dump_case(case)
    current = fingerprint(path)
    if current != seen:
        beside = path.with_name(f"case.{new_id()}.yaml")
        write_text(beside, text)
        raise CaseError(Fault("changed-under-you", str(path), "a version that somebody wrote since you read it",
                              "", f"theirs is in place, yours is kept as {beside.name}; compare them"))  # fmt: skip
    write_text(path, text)
    return fingerprint(path) or ""
