"""The journal of a case: every stroke and change, written as it happens, so that a crash loses at most one.

Each writer (a kernel, a process) appends to a file of its own, so that two never share one. A line is a JSON object
with a running number and a checksum; a line torn by a crash is recognised and passed over, never guessed.
"""

from __future__ import annotations

import contextlib
import importlib
import importlib.util
import json
import os
import zlib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from byway.knowledge.atomic import append_line
from byway.knowledge.cases.pages import new_id, now

__all__ = ["Journal", "lost_journals", "read_journal"]

fcntl: Any = importlib.import_module("fcntl") if importlib.util.find_spec("fcntl") else None  # not on every system


def _checksum(body: str) -> str:
    return f"{zlib.crc32(body.encode('utf-8')):08x}"


class Journal:
    """One writer's journal in a case folder.

    The file is locked while its writer lives, so that another kernel can tell a lost writer from one at work.

    Parameters
    ----------
    folder : Path
        The case folder; the file lies in its ``journal`` folder and is made with the first entry.
    author : str
        Who writes.
    """

    def __init__(self, folder: Path, author: str) -> None:
        self.author = author
        self.writer = new_id()
        self.path = folder / "journal" / f"{self.writer}.jsonl"
        self.count = 0
        self._hold: int | None = None

    def close(self) -> None:
        """Let go of the file; the journal stays."""
        if self._hold is not None:
            os.close(self._hold)
            self._hold = None

    def append(self, entry: dict[str, Any]) -> int:
        """Write one entry durably and return its number in this journal; it holds when this returns."""
        self.count += 1
        head = {"n": self.count, "time": now(), "author": self.author, "process": os.getpid()}
        body = json.dumps({**head, **entry}, separators=(",", ":"), ensure_ascii=False, allow_nan=False)
        if self._hold is None:
            self._hold = _begun(self.path)  # held before anything stands in it, so that nobody takes it for lost
        append_line(self.path, f"{_checksum(body)} {body}")
        return self.count


def _begun(path: Path) -> int:
    """A new, locked, durable file; its handle."""
    path.parent.mkdir(parents=True, exist_ok=True)
    handle = os.open(path, os.O_RDWR | os.O_CREAT, 0o644)
    _lock(handle)
    with contextlib.suppress(OSError):  # some systems cannot open a folder
        folder = os.open(path.parent, os.O_RDONLY)
        try:
            os.fsync(folder)
        finally:
            os.close(folder)
    return handle


def _lock(handle: int) -> bool:
    """Take the lock that a writer holds; False where somebody has it. The system lets go when a process dies."""
    if fcntl is None:
        return True  # no such locks here: every journal but one's own counts as lost, and recovery asks by author
    try:
        fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError:
        return False
    return True


def lost_journals(folder: Path, author: str) -> dict[str, list[dict[str, Any]]]:
    """Journals of an author whose writer is gone and whose entries nobody has taken over, oldest first.

    Parameters
    ----------
    folder : Path
        The case folder.
    author : str
        Whose; another person's lost strokes are theirs to take up.

    Returns
    -------
    dict
        Writer to its whole entries. A journal that was taken over is named by an entry ``{"kind": "taken"}``.
    """
    entries = read_journal(folder)
    taken = {entry["from"] for entry in entries if entry.get("kind") == "taken"}
    lost: dict[str, list[dict[str, Any]]] = {}
    for path in sorted((folder / "journal").glob("*.jsonl")):
        if path.stem in taken:
            continue
        own = [entry for entry in entries if entry["writer"] == path.stem]
        if own and own[0]["author"] == author and _is_free(path):
            lost[path.stem] = own
    return lost


def _is_free(path: Path) -> bool:
    try:
        handle = os.open(path, os.O_RDWR)
    except OSError:
        return True  # a folder that cannot be written has no writer at work
    try:
        return _lock(handle)
    finally:
        os.close(handle)


def _lines(path: Path) -> Iterator[dict[str, Any]]:
    with open(path, encoding="utf-8", errors="replace") as handle:
        for line in handle:
            check, _, body = line.rstrip("\n").partition(" ")
            if body and check == _checksum(body):
                yield json.loads(body)


def read_journal(folder: Path, writer: str | None = None) -> list[dict[str, Any]]:
    """All whole entries of a case's journals, in order of time, then writer, then number.

    Parameters
    ----------
    folder : Path
        The case folder.
    writer : str, optional
        Read only this writer's journal.
    """
    entries = [{**entry, "writer": path.stem} for path in sorted((folder / "journal").glob("*.jsonl"))
               if writer is None or path.stem == writer for entry in _lines(path)]  # fmt: skip
    return sorted(entries, key=lambda entry: (entry["time"], entry["writer"], entry["n"]))
