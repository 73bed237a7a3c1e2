"""The journal of strokes: whole lines only, and a lost writer told from one at work."""

from __future__ import annotations

import multiprocessing
import os
import signal
import sys
import time
from pathlib import Path

import pytest

from byway.knowledge.cases.journal import Journal, lost_journals, read_journal


def test_a_torn_line_is_passed_over(tmp_path: Path) -> None:
    """A line cut short by a crash, and one whose checksum is wrong, are not entries; those around them are."""
    journal = Journal(tmp_path, "AB")
    journal.append({"kind": "edit", "edit": {"op": "clear"}})
    with journal.path.open("a") as handle:
        handle.write('00000000 {"n": 9}\n')
    journal.append({"kind": "saved"})
    with journal.path.open("a") as handle:
        handle.write('1234abcd {"n": 3, "kind": "ed')
    assert [(entry["n"], entry["kind"]) for entry in read_journal(tmp_path)] == [(1, "edit"), (2, "saved")]


@pytest.mark.skipif(sys.platform == "win32", reason="no file locks of this kind")
def test_a_writer_at_work_is_not_lost(tmp_path: Path) -> None:
    """A journal whose writer still holds it is nobody's to take over; once it lets go, it is its author's."""
    journal = Journal(tmp_path, "AB")
    journal.append({"kind": "edit", "edit": {"op": "clear"}})
    assert lost_journals(tmp_path, "AB") == {}
    journal.close()
    assert list(lost_journals(tmp_path, "AB")) == [journal.writer]
    assert lost_journals(tmp_path, "CD") == {}


def test_a_journal_is_taken_over_once(tmp_path: Path) -> None:
    """What another journal names as taken is not offered again."""
    old, new = Journal(tmp_path, "AB"), Journal(tmp_path, "AB")
    old.append({"kind": "edit", "edit": {"op": "clear"}})
    old.close()
    new.append({"kind": "taken", "from": old.writer})
    new.close()
    assert list(lost_journals(tmp_path, "AB")) == [new.writer]


def _hold(folder: str) -> None:
    Journal(Path(folder), "AB").append({"kind": "edit", "edit": {"op": "clear"}})
    journal = Journal(Path(folder), "AB")
    journal.append({"kind": "edit", "edit": {"op": "mirror"}})
    time.sleep(60)


@pytest.mark.skipif(sys.platform == "win32", reason="no file locks of this kind")
def test_a_killed_writer_is_lost(tmp_path: Path) -> None:
    """The system lets go of the lock when a process is killed."""
    writer = multiprocessing.get_context("fork").Process(target=_hold, args=(str(tmp_path),))
    writer.start()
    end = time.monotonic() + 20
    while len(read_journal(tmp_path)) < 2 and time.monotonic() < end:
        time.sleep(0.01)
    assert lost_journals(tmp_path, "AB") == {}
    os.kill(writer.pid or 0, signal.SIGKILL)
    writer.join()
    assert len(lost_journals(tmp_path, "AB")) == 2
