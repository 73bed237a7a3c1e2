"""Watching a case folder: every change is told once, from whichever process it came."""

from __future__ import annotations

import threading
from pathlib import Path

from byway.knowledge.atomic import write_text
from byway.knowledge.cases.journal import Journal
from byway.knowledge.cases.pages import Note, Pages
from byway.knowledge.cases.watch import PERIOD_S, CaseWatch


def test_new_changed_and_gone(tmp_path: Path) -> None:
    """A new note, a changed case.yaml and a removed file are each told by name, once."""
    (tmp_path / "case.yaml").write_text("stage: acute\n")
    (tmp_path / "old.yaml").write_text("x\n")
    heard: list[set[str]] = []
    watch = CaseWatch(tmp_path, heard.append)
    assert watch.poll() == set()
    path = Pages(tmp_path).put(Note(author="AB", text="one"))
    write_text(tmp_path / "case.yaml", "stage: other\n")  # as long as before
    (tmp_path / "old.yaml").unlink()
    assert watch.poll() == {f"notes/{path.name}", "case.yaml", "old.yaml"}
    assert watch.poll() == set()
    assert len(heard) == 1


def test_half_written_files_and_journals_are_not_told(tmp_path: Path) -> None:
    """Hidden files, other endings and journals are nobody's news."""
    watch = CaseWatch(tmp_path, lambda _: None)
    (tmp_path / ".case.yaml.1.part").write_text("x")
    (tmp_path / "notes").mkdir()
    (tmp_path / "notes" / "x.tmp").write_text("x")
    Journal(tmp_path, "AB").append({"kind": "saved"})
    assert watch.poll() == set()


def test_a_thread_tells(tmp_path: Path) -> None:
    """A note is told by itself; the period leaves time within two seconds for a look and for drawing."""
    told = threading.Event()
    watch = CaseWatch(tmp_path, lambda _: told.set()).start()
    assert PERIOD_S <= 1.0
    Pages(tmp_path).put(Note(author="AB", text="one"))
    assert told.wait(20.0)
    watch.close()
