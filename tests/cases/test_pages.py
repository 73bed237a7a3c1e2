"""Notes, own accounts and standings: one immutable page each, and nothing lost when two write at once."""

from __future__ import annotations

import multiprocessing
import os
import random
import signal
import time
from pathlib import Path

import pytest

from byway.knowledge.cases.journal import Journal, read_journal
from byway.knowledge.cases.pages import Anchor, Note, OwnAccount, Pages, Resolution, Standing, new_id, thread
from byway.knowledge.faults import CaseError


def test_round_trip(tmp_path: Path) -> None:
    """A page read back equals the page written, of each kind."""
    pages = Pages(tmp_path)
    note = Note(author="AB", text="edge uncertain, @CD", anchor=Anchor(kind="voxel", mm=(-40.0, 10.0, 12.0)))
    others = [
        Resolution(author="CD", note=note.id),
        OwnAccount(author="AB", title="Spared long segment", elements=("ifg_opercularis@left",)),
        Standing(author="AB", account="segment_disconnection", stands="doubted", reason="comprehension spared"),
    ]
    for page in (note, *others):
        pages.put(page)
    assert {page.id: page for page in pages.all()} == {page.id: page for page in (note, *others)}
    assert pages.settled() == {note.id: True}
    assert pages.standings()["segment_disconnection"]["AB"].stands == "doubted"


def test_a_page_is_never_overwritten(tmp_path: Path) -> None:
    """Writing the same id twice raises and leaves the first text."""
    pages, note = Pages(tmp_path), Note(author="AB", text="first")
    path = pages.put(note)
    before = path.read_bytes()
    with pytest.raises(CaseError, match="nothing was written"):
        pages.put(note.model_copy(update={"text": "second"}))
    assert path.read_bytes() == before


def test_two_edits_of_one_page_both_stand(tmp_path: Path) -> None:
    """Two people who edit one account at once leave two current pages, offered side by side."""
    pages = Pages(tmp_path)
    first = OwnAccount(author="AB", title="one")
    pages.put(first)
    left = OwnAccount(author="AB", title="one, longer", replaces=first.id)
    right = OwnAccount(author="CD", title="one, other", replaces=first.id)
    pages.put(left)
    pages.put(right)
    assert {page.id for page in pages.current("account")} == {left.id, right.id}
    assert [{page.id for page in group} for group in pages.rivals("account")] == [{left.id, right.id}]


def test_a_broken_page_is_listed_and_left_alone(tmp_path: Path) -> None:
    """A torn or foreign file is named in ``unreadable``; the others are read; the file stays."""
    pages = Pages(tmp_path)
    pages.put(Note(author="AB", text="whole"))
    torn = tmp_path / "notes" / f"{new_id()}.note.json"
    torn.write_text('{"id": "')
    assert [page.text for page in pages.all("note") if isinstance(page, Note)] == ["whole"]
    assert len(pages.unreadable) == 1
    assert torn.exists()


def test_threads() -> None:
    """Answers stand below what they answer; an answer to a lost note stands at the top."""
    a = Note(author="AB", text="a")
    b = Note(author="CD", text="b", reply_to=a.id)
    lost = Note(author="EF", text="c", reply_to="000000000000-0000000000")
    assert {(depth, note.text) for depth, note in thread([b, a, lost])} == {(0, "a"), (1, "b"), (0, "c")}


def test_rivals_are_settled_by_a_page_that_replaces_both(tmp_path: Path) -> None:
    """Keeping one of two versions leaves one current page with its words; all three files are still there."""
    pages, first = Pages(tmp_path), Note(author="AB", text="one")
    pages.put(first)
    left, right = Note(author="AB", text="left", replaces=first.id), Note(author="CD", text="right", replaces=first.id)
    pages.put(left)
    pages.put(right)
    kept = pages.settle_rivals(right, "EF")
    assert [(page.id, page.text) for page in pages.current("note") if isinstance(page, Note)] == [(kept.id, "right")]
    assert pages.rivals("note") == []
    assert len(pages.all("note")) == 4
    with pytest.raises(CaseError, match="no other version"):
        pages.settle_rivals(kept, "EF")


def test_an_edited_note_keeps_its_place_and_its_answers(tmp_path: Path) -> None:
    """Answers and resolutions that name the first version hold for the edited one; the thread keeps its order."""
    pages = Pages(tmp_path)
    first, later = Note(author="AB", text="one"), Note(author="AB", text="two")
    answer = Note(author="CD", text="answer", reply_to=first.id)
    for page in (first, later, answer, Resolution(author="CD", note=first.id)):
        pages.put(page)
    edited = Note(author="AB", text="one, better", replaces=first.id)
    pages.put(edited)
    origins = pages.origins("note")
    notes = [page for page in pages.current("note") if isinstance(page, Note)]
    texts = [(depth, note.text) for depth, note in thread(notes, origins)]
    assert texts.index((1, "answer")) == texts.index((0, "one, better")) + 1
    assert set(texts) == {(0, "one, better"), (1, "answer"), (0, "two")}
    assert pages.settled() == {origins[edited.id]: True}


def _write_many(folder: str, author: str, notes: int, changes: int) -> None:
    pages = Pages(Path(folder))
    for i in range(notes):
        pages.put(Note(author=author, text=f"note {i}"))
    for i in range(changes):
        pages.put(OwnAccount(author=author, title=f"account {i}"))


def test_two_processes_write_one_case(tmp_path: Path) -> None:
    """Two processes each write 500 notes and 100 accounts to one case: all 1,200 are there, none broken."""
    context = multiprocessing.get_context("fork")
    writers = [context.Process(target=_write_many, args=(str(tmp_path), name, 500, 100)) for name in ("AB", "CD")]
    for writer in writers:
        writer.start()
    for writer in writers:
        writer.join()
    pages = Pages(tmp_path)
    assert [len(pages.all("note")), len(pages.all("account")), len(pages.unreadable)] == [1000, 200, 0]


def _write_until_killed(folder: str, acknowledged: str) -> None:
    """Write notes, accounts and journal entries for ever; each id is acknowledged once its write has returned."""
    pages, journal = Pages(Path(folder)), Journal(Path(folder), "AB")
    handle = os.open(acknowledged, os.O_WRONLY | os.O_APPEND | os.O_CREAT)
    while True:
        note = Note(author="AB", text="x" * random.randint(1, 4000))
        pages.put(note)
        os.write(handle, f"note {note.id}\n".encode())
        account = OwnAccount(author="AB", title="y")
        pages.put(account)
        os.write(handle, f"account {account.id}\n".encode())
        number = journal.append({"kind": "stroke", "points": [1, 2, 3]})
        os.write(handle, f"stroke {journal.writer}/{number}\n".encode())


def kill_and_read(folder: Path, times: int, seed: int = 0) -> int:
    """Kill a writer at a random moment, ``times`` over; return how many acknowledged writes were checked.

    A command for the full count: ``python tests/cases/test_pages.py 1000``.
    """
    rng, context, checked = random.Random(seed), multiprocessing.get_context("fork"), 0
    for i in range(times):
        case, acknowledged = folder / f"case{i}", folder / f"acknowledged{i}"
        case.mkdir()
        writer = context.Process(target=_write_until_killed, args=(str(case), str(acknowledged)))
        writer.start()
        while not acknowledged.exists():
            time.sleep(0.001)
        time.sleep(rng.uniform(0.0, 0.05))
        os.kill(writer.pid or 0, signal.SIGKILL)
        writer.join()
        pages = Pages(case)
        there = {f"note {p.id}" for p in pages.all("note")} | {f"account {p.id}" for p in pages.all("account")}
        there |= {f"stroke {entry['writer']}/{entry['n']}" for entry in read_journal(case)}
        lines = [line for line in acknowledged.read_text().splitlines(keepends=True) if line.endswith("\n")]
        missing = [line for line in lines if line.strip() not in there]
        assert not missing, missing
        assert len(pages.unreadable) == 0
        checked += len(lines)
    return checked


def test_a_kill_loses_no_acknowledged_write(tmp_path: Path) -> None:
    """After a kill -9 at a random moment the case opens and every acknowledged write is there."""
    assert kill_and_read(tmp_path, 15) > 0


if __name__ == "__main__":
    import sys
    import tempfile

    with tempfile.TemporaryDirectory() as scratch:
        print(kill_and_read(Path(scratch), int(sys.argv[1])), "acknowledged writes, none lost")
