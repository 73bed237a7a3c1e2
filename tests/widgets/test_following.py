"""Two kernels on one case stay in step, and a lost kernel loses at most the stroke in hand."""

from __future__ import annotations

import multiprocessing
import os
import random
import signal
import sys
import time
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from toy_graph import toy_graph

from byway.knowledge.cases.case import open_case
from byway.knowledge.cases.files import write_case
from byway.knowledge.cases.model import CaseFile
from byway.knowledge.cases.pages import Note, Pages
from byway.knowledge.cases.versions import beside_versions
from byway.knowledge.faults import CaseError
from byway.knowledge.reasoning.findings import Finding
from byway.widgets.state import BenchState
from byway.widgets.state.following import Following
from byway.widgets.state.science import NoScience

STROKE = {"op": "stroke", "plane": 2, "index": 70, "points": [60.0, 60.0, 80.0, 75.0], "radius": 4, "compartment": 0}
ABSENT = Finding("amnesia", "none", "absent")
MILD = Finding("amnesia", "none", "mild")
pytestmark = pytest.mark.skipif(sys.platform == "win32", reason="file locks are POSIX's here")


class GraphOnly(NoScience):
    """Knows the toy graph, and reasons about nothing."""

    def __init__(self) -> None:
        self.graph = toy_graph()


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """A small case on disk."""
    spec = {"stage": "acute", "lesion": {"compartments": [
        {"name": "core", "kind": "core", "effect": 1.0,
         "shapes": [{"shape": "sphere", "centre_mm": [-40, -20, 26], "radii_mm": [6]}]}]}}  # fmt: skip
    write_case(tmp_path / "case.yaml", CaseFile.model_validate(spec), None)
    return tmp_path


def sit(folder: Path, author: str = "AB") -> BenchState:
    """Somebody opens the case."""
    state = BenchState(open_case(folder), GraphOnly())
    state.author = author
    Following(state)
    return state


@pytest.fixture
def two(folder: Path) -> Iterator[tuple[BenchState, BenchState]]:
    """Two kernels with the case open."""
    states = sit(folder), sit(folder, "CD")
    yield states
    for state in states:
        state.close()


def changed(state: BenchState, **fields: Any) -> None:
    """Change the case on one screen, unsaved."""
    state.set_case(state.case.with_spec(**fields))


def test_a_note_of_one_is_news_to_the_other(two: tuple[BenchState, BenchState], folder: Path) -> None:
    """A page written by one moves the other's ``pages_seq``."""
    _, there = two
    before = there.pages_seq
    Pages(folder).put(Note(author="AB", text="one"))
    there.following.poll()
    assert there.pages_seq == before + 1


def test_a_change_appears_by_itself(folder: Path) -> None:
    """With the watching thread at work, what one saves reaches the other without anybody asking."""
    here, there = sit(folder), sit(folder, "CD")
    there.following.start()
    here.set_findings([MILD])
    start = time.monotonic()
    here.save_case()
    while there.following._waiting.empty() and time.monotonic() - start < 20.0:
        time.sleep(0.02)
    there.following._take_in()  # in a kernel the event loop does it
    assert there.findings == (MILD,)
    here.close()
    there.close()


def test_saved_changes_reach_the_other(two: tuple[BenchState, BenchState]) -> None:
    """Findings and stage that one saves show on the other's screen; its unsaved drawing stays."""
    here, there = two
    there.edit(STROKE)
    drawn = there.drawing.bits.copy()
    here.set_findings([MILD])
    changed(here, stage="chronic")
    here.save_case()
    there.following.poll()
    assert there.findings == (MILD,)
    assert there.case.spec.stage == "chronic"
    assert np.array_equal(there.drawing.bits, drawn)
    there.save_case()  # nothing stands in the way of saving


def test_overlays_that_somebody_names_are_reasoned_with(two: tuple[BenchState, BenchState], folder: Path) -> None:
    """When one names an overlay in case.yaml, the other's questions go to the graph and geometry of that case."""
    asked: list[tuple[str, ...]] = []
    one, other = two
    after = GraphOnly()

    def for_case(case: Any) -> GraphOnly:
        asked.append(case.spec.overlays)
        return after

    other.science.for_case = for_case  # type: ignore[method-assign]
    (folder / "opinion.yaml").write_text("name: opinion\nauthor: AB\ndate: 2026-11-03\n")
    one.set_case(one.case.with_spec(overlays=("opinion.yaml",)))
    one.save_case()
    other.following.poll()
    assert asked == [("opinion.yaml",)]
    assert other.science is after
    assert other.case.spec.overlays == ("opinion.yaml",)


def test_changes_of_different_fields_both_hold(two: tuple[BenchState, BenchState]) -> None:
    """One changes the stage and saves, the other has changed findings: it keeps them, takes the stage, and can save."""
    here, there = two
    there.set_findings([ABSENT])
    changed(here, stage="chronic")
    here.save_case()
    there.following.poll()
    assert (there.case.spec.stage, there.findings) == ("chronic", (ABSENT,))
    there.save_case()
    here.following.poll()
    assert here.findings == (ABSENT,)


def test_changes_of_one_field_are_offered_side_by_side(two: tuple[BenchState, BenchState], folder: Path) -> None:
    """Both change the stage: the second keeps its own on the screen, is told, and saving leaves both versions; whoever
    settles decides, and both screens agree."""
    here, there = two
    changed(here, stage="chronic")
    changed(there, stage="subacute")
    here.save_case()
    there.following.poll()
    assert there.case.spec.stage == "subacute"
    assert "stage" in there.notice
    with pytest.raises(CaseError, match="yours is kept"):
        there.save_case()
    (waiting,) = beside_versions(folder)
    assert open_case(folder).spec.stage == "chronic"
    assert open_case(folder / waiting).spec.stage == "subacute"
    there.following.settle(waiting, "beside")
    here.following.poll()
    assert here.case.spec.stage == there.case.spec.stage == "subacute"


def test_a_lesion_that_somebody_saves_is_drawn_anew(two: tuple[BenchState, BenchState]) -> None:
    """A saved drawing appears on a screen without strokes of its own, and does not wipe out one that has some."""
    here, there = two
    here.edit(STROKE)
    here.save_masks()
    there.following.poll()
    assert np.array_equal(there.drawing.bits > 0, here.drawing.bits > 0)
    there.edit({**STROKE, "index": 90})
    drawn = there.drawing.bits.copy()
    here.edit({**STROKE, "index": 50})
    here.save_masks()
    there.following.poll()
    assert np.array_equal(there.drawing.bits, drawn)


def test_a_lost_kernel_is_taken_over_by_its_author(folder: Path) -> None:
    """Strokes, an undo and findings that were not saved come back once, for the same author, as steps to undo."""
    lost = sit(folder)
    lost.edit(STROKE)
    lost.edit({**STROKE, "index": 80})
    lost.undo()
    lost.set_findings([MILD])
    lost.following.journal.close()  # as the system does when a process dies
    other = sit(folder, "CD")
    assert other.following.recover() == 0
    found = sit(folder)
    assert found.following.recover() == 4
    assert np.array_equal(found.drawing.bits, lost.drawing.bits)
    assert found.findings == (MILD,)
    assert "4 changes" in found.notice
    found.following.journal.close()  # and lost again, before saving
    again = sit(folder)
    assert again.following.recover() == 4
    assert np.array_equal(again.drawing.bits, lost.drawing.bits)


def test_what_was_saved_is_not_brought_back(folder: Path) -> None:
    """Only what came after the last saving returns; an undo of a saved stroke returns as what it did."""
    lost = sit(folder)
    lost.edit(STROKE)
    lost.save_masks()
    lost.undo()
    lost.following.journal.close()
    found = sit(folder)
    assert found.following.recover() == 1
    assert np.array_equal(found.drawing.bits > 0, lost.drawing.bits > 0)


def _draw_until_killed(folder: str, acknowledged: str) -> None:
    """Draw for ever; each stroke is acknowledged once the state has taken it."""
    state, rng = sit(Path(folder)), random.Random(os.getpid())
    handle = os.open(acknowledged, os.O_WRONLY | os.O_APPEND | os.O_CREAT)
    for number in range(1, 10_000):
        state.edit({**STROKE, "index": rng.randint(40, 120), "points": [rng.uniform(40, 120) for _ in range(4)]})
        os.write(handle, f"{number} {int(state.drawing.bits.sum())}\n".encode())


def kill_and_recover(folder: Path, times: int, seed: int = 0) -> int:
    """Kill somebody who draws at a random moment, ``times`` over; return how many strokes were checked.

    A command for the full count: ``PYTHONPATH=tests python tests/widgets/test_following.py 1000``.
    """
    rng, context, checked = random.Random(seed), multiprocessing.get_context("fork"), 0
    for i in range(times):
        case, acknowledged = folder / f"case{i}", folder / f"acknowledged{i}"
        write_case(case / "case.yaml", CaseFile(stage="acute"), None)
        writer = context.Process(target=_draw_until_killed, args=(str(case), str(acknowledged)))
        writer.start()
        while not acknowledged.exists():
            time.sleep(0.001)
        time.sleep(rng.uniform(0.0, 0.3))
        os.kill(writer.pid or 0, signal.SIGKILL)
        writer.join()
        lines = [line for line in acknowledged.read_text().splitlines(keepends=True) if line.endswith("\n")]
        strokes, filled = map(int, lines[-1].split()) if lines else (0, 0)
        state = sit(case)
        recovered = state.following.recover()
        assert strokes <= recovered <= strokes + 1, "at most the stroke in hand"
        if recovered > strokes:
            state.undo()
        assert int(state.drawing.bits.sum()) == filled
        state.close()
        checked += strokes
    return checked


def test_a_kill_loses_at_most_the_stroke_in_hand(tmp_path: Path) -> None:
    """After a kill -9 at a random moment, every acknowledged stroke comes back, and the drawing is as it was."""
    assert kill_and_recover(tmp_path, 6) > 0


if __name__ == "__main__":
    import tempfile

    with tempfile.TemporaryDirectory() as scratch:
        print(kill_and_recover(Path(scratch), int(sys.argv[1])), "acknowledged strokes, none lost")
