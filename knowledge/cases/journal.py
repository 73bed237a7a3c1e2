"""The journal of a case: every stroke and change, written as it happens, so that a crash loses at most one.

Each writer (a kernel, a process) appends to a file of its own, so that two never share one. A line is a JSON object
with a running number and a checksum; a line torn by a crash is recognised and passed over, never guessed.
"""

from __future__ import annotations

import json
import os
import zlib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from byway.knowledge.atomic import append_line
from byway.knowledge.cases.pages import new_id, now

__all__ = ["Journal", "read_journal"]


def _checksum(body: str) -> str:
    return f"{zlib.crc32(body.encode('utf-8')):08x}"


class Journal:
    """One writer's journal in a case folder.

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

    def append(self, entry: dict[str, Any]) -> int:
        """Write one entry durably and return its number in this journal; it holds when this returns."""
        self.count += 1
        head = {"n": self.count, "time": now(), "author": self.author, "process": os.getpid()}
        body = json.dumps({**head, **entry}, separators=(",", ":"), ensure_ascii=False, allow_nan=False)
        append_line(self.path, f"{_checksum(body)} {body}")
        return self.count


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
