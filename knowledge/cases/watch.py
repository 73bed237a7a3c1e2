"""Watching a case folder: what somebody else writes there is noticed within a second, on any file system.

Polling, not notification: shared drives often send no events. One look costs a ``stat`` a file.
"""

from __future__ import annotations

import contextlib
import os
import threading
from collections.abc import Callable
from pathlib import Path

__all__ = ["PERIOD_S", "CaseWatch", "look"]

PERIOD_S = 0.5
"""Seconds between two looks; a change is told at most one period and one look later."""

WATCHED = ("", "notes", "accounts", "standing")
ENDINGS = (".yaml", ".json", ".nii", ".nii.gz")

Look = dict[str, tuple[int, int, int]]


def look(folder: Path) -> Look:
    """Every file of a case that matters to a reader: name below the folder to time (ns), size in bytes and inode.

    A file that an atomic write has replaced has another inode, so that even a change within one tick of the clock and
    of equal length shows. Journals are left out: they are their writer's own.
    """
    seen: Look = {}
    for place in WATCHED:
        with contextlib.suppress(OSError), os.scandir(folder / place) as entries:
            for entry in entries:
                if entry.name.endswith(ENDINGS) and not entry.name.startswith("."):
                    with contextlib.suppress(OSError):  # gone between listing and asking
                        stat = entry.stat()
                        name = f"{place}/{entry.name}" if place else entry.name
                        seen[name] = (stat.st_mtime_ns, stat.st_size, stat.st_ino)
    return seen


class CaseWatch:
    """Tells which files of a case folder changed.

    Parameters
    ----------
    folder : Path
        The case folder.
    heard : callable
        Called with the set of names that are new, changed or gone; on the watching thread, or by :meth:`poll` on the
        caller's.
    period_s : float
        Seconds between looks.
    """

    def __init__(self, folder: Path, heard: Callable[[set[str]], None], *, period_s: float = PERIOD_S) -> None:
        self.folder, self.period_s = folder, period_s
        self._heard = heard
        self._seen = look(folder)
        self._stop = threading.Event()
        self._thread: threading.Thread | None = None
        self._lock = threading.Lock()

    def start(self) -> CaseWatch:
        """Watch from a thread of its own, which ends with the process or with :meth:`close`."""
        if self._thread is None:
            self._thread = threading.Thread(target=self._work, name="byway-watch", daemon=True)
            self._thread.start()
        return self

    def poll(self) -> set[str]:
        """Look once; tell and return the names that changed since the last look."""
        with self._lock:
            now = look(self.folder)
            changed = {name for name in now.keys() | self._seen.keys() if now.get(name) != self._seen.get(name)}
            self._seen = now
        if changed:
            self._heard(changed)
        return changed

    def close(self) -> None:
        """Stop watching."""
        self._stop.set()

    def _work(self) -> None:
        while not self._stop.wait(self.period_s):
            self.poll()
