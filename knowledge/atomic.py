"""Writes that either happen whole or not at all, and that never overwrite what somebody else has written since.

A file is written beside its place, flushed to the disk, and moved over it in one step (POSIX ``rename``).
"""

from __future__ import annotations

import hashlib
import os
import secrets
from pathlib import Path

__all__ = ["append_line", "fingerprint", "write_bytes", "write_text"]


def fingerprint(path: Path) -> str | None:
    """SHA-256 of a file's bytes, or None where there is no file."""
    try:
        return hashlib.sha256(path.read_bytes()).hexdigest()
    except FileNotFoundError:
        return None


def _sync_folder(folder: Path) -> None:
    try:
        handle = os.open(folder, os.O_RDONLY)
    except OSError:
        return  # some systems cannot open a folder; the move itself still is atomic there
    try:
        os.fsync(handle)
    finally:
        os.close(handle)


def write_bytes(path: Path, data: bytes) -> None:
    """Write ``data`` to ``path`` atomically and durably; parents are made."""
    path.parent.mkdir(parents=True, exist_ok=True)
    beside = path.with_name(f".{path.name}.{os.getpid()}.{secrets.token_hex(4)}.part")
    try:
        with open(beside, "xb") as handle:
            handle.write(data)
            handle.flush()
            os.fsync(handle.fileno())
        os.replace(beside, path)
    except BaseException:
        beside.unlink(missing_ok=True)
        raise
    _sync_folder(path.parent)


def write_text(path: Path, text: str) -> None:
    """Write UTF-8 ``text`` to ``path`` atomically and durably."""
    write_bytes(path, text.encode("utf-8"))


def append_line(path: Path, line: str) -> None:
    """Append one line durably; a single ``write`` call, so that two writers' lines do not mix."""
    path.parent.mkdir(parents=True, exist_ok=True)
    new = not path.exists()
    handle = os.open(path, os.O_WRONLY | os.O_APPEND | os.O_CREAT, 0o644)
    try:
        os.write(handle, (line.rstrip("\n") + "\n").encode("utf-8"))
        os.fsync(handle)
    finally:
        os.close(handle)
    if new:
        _sync_folder(path.parent)
