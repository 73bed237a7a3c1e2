"""Work that waits until the hand rests."""

from __future__ import annotations

import asyncio
import threading
import time
from collections.abc import Callable

import pytest

from byway.widgets.state import resting
from byway.widgets.state.resting import Resting, Stopped


def test_only_the_newest_job_is_answered() -> None:
    """Of three jobs asked in a row, the last alone gives a result."""
    work, got = Resting(0.02), []
    for n in range(3):
        work.ask(lambda check, n=n: n, got.append)  # type: ignore[misc]
    work.settle(5)
    assert got == [2]
    work.close()


def test_a_running_job_is_stopped_by_a_newer_one() -> None:
    """A job that is overtaken stops at its next check and its result is not given."""
    work, got, began = Resting(0.0), [], threading.Event()

    def long(check: Callable[[], None]) -> str:
        began.set()
        for _ in range(500):
            time.sleep(0.01)
            check()
        return "long"

    work.ask(long, got.append)
    assert began.wait(5)
    work.ask(lambda check: "short", got.append)
    work.settle(5)
    assert got == ["short"]
    work.close()


def test_nothing_starts_while_the_hand_is_down() -> None:
    """A job asked for while the hand is down runs when it lifts; one that ran is begun again."""
    work, got, runs = Resting(0.0), [], []

    def job(check: Callable[[], None]) -> int:
        runs.append(1)
        for _ in range(20):
            time.sleep(0.005)
            check()
        return len(runs)

    work.hold(True)
    work.ask(job, got.append)
    time.sleep(0.05)
    assert runs == []
    work.hold(False)
    time.sleep(0.03)
    work.hold(True)  # in the middle of the job
    time.sleep(0.03)
    work.hold(False)
    work.settle(5)
    assert got == [2]
    work.close()


def test_a_hand_that_was_lost_does_not_hold_for_ever(monkeypatch: pytest.MonkeyPatch) -> None:
    """Where nobody says that the hand is up, work goes on after the longest stroke."""
    monkeypatch.setattr(resting, "_LONGEST_STROKE_S", 0.05)
    work, got = Resting(0.0), []
    work.hold(True)
    work.ask(lambda check: 1, got.append)
    work.settle(5)
    assert got == [1]
    work.close()


def test_results_come_on_the_event_loop() -> None:
    """Where an event loop runs (a kernel's), results are given on its thread, without being waited for.

    The loop gets a thread of its own here, since a browser test before may have left one running in this thread.
    """
    threads: list[threading.Thread] = []
    loops: list[threading.Thread] = []

    async def kernel() -> None:
        loops.append(threading.current_thread())
        work = Resting(0.0)
        work.ask(lambda check: 1, lambda result: threads.append(threading.current_thread()))
        for _ in range(200):
            await asyncio.sleep(0.01)
            if threads:
                break
        work.close()

    thread = threading.Thread(target=lambda: asyncio.run(kernel()))
    thread.start()
    thread.join()
    assert threads == loops


def test_a_fault_is_handed_over_and_the_thread_lives_on() -> None:
    """A job that raises gives its exception as the result; the next job runs."""
    work, got = Resting(0.0), []

    def broken(check: Callable[[], None]) -> None:
        raise ValueError("no")

    work.ask(broken, got.append)
    work.settle(5)
    work.ask(lambda check: 3, got.append)
    work.settle(5)
    assert isinstance(got[0], ValueError)
    assert got[1] == 3
    work.close()


def test_stopped_is_no_error() -> None:
    """Being overtaken is not a failure: it is no subclass of the errors that are shown."""
    assert not issubclass(Stopped, ValueError | OSError)
