"""Work that waits until the hand rests: one thread, the newest job only, results given back on the kernel's thread."""

from __future__ import annotations

import asyncio
import contextlib
import queue
import threading
import time
from collections.abc import Callable
from functools import partial
from typing import Any

__all__ = ["Resting", "Stopped"]


_LONGEST_STROKE_S = 20.0


class Stopped(Exception):  # noqa: N818 - no error: the job was overtaken
    """Raised inside a job that a newer one has overtaken."""


class Resting:
    """Runs the newest job after a pause.

    Parameters
    ----------
    pause_s : float
        How long nothing must have been asked before a job starts.

    Notes
    -----
    A job is a function of ``check``, which raises :class:`Stopped` once the job is out of date; its result goes to
    ``done`` on the event loop that was running when the job was asked for (a kernel's), or, where none was, when
    :meth:`settle` is called.
    """

    def __init__(self, pause_s: float = 0.35) -> None:
        self.pause_s = pause_s
        self._wake = threading.Condition()
        self._job: tuple[int, float, Callable[[Callable[[], None]], Any], Callable[[Any], None]] | None = None
        self._number = 0
        self._held_until = 0.0
        self._busy = False
        self._thread: threading.Thread | None = None
        self._loop: asyncio.AbstractEventLoop | None = None
        self._results: queue.SimpleQueue[Callable[[], None]] = queue.SimpleQueue()
        self._closed = False

    def ask(self, job: Callable[[Callable[[], None]], Any], done: Callable[[Any], None]) -> None:
        """Replace any job that waits or runs by this one."""
        with contextlib.suppress(RuntimeError):
            self._loop = asyncio.get_running_loop()
        with self._wake:
            self._number += 1
            self._job = (self._number, time.monotonic() + self.pause_s, job, done)
            if self._thread is None:
                self._thread = threading.Thread(target=self._work, name="byway-resting", daemon=True)
                self._thread.start()
            self._wake.notify_all()

    def hold(self, held: bool) -> None:
        """Let nothing start (and stop what runs, to be begun again) while the hand is down.

        A hand that is not heard of again (a page that was closed in mid-stroke) is taken to be up after a while.
        """
        with self._wake:
            self._held_until = time.monotonic() + _LONGEST_STROKE_S if held else 0.0
            self._wake.notify_all()

    @property
    def _held(self) -> bool:
        return time.monotonic() < self._held_until

    def close(self) -> None:
        """Stop for good."""
        with self._wake:
            self._closed, self._job = True, None
            self._number += 1
            self._wake.notify_all()

    @property
    def busy(self) -> bool:
        """Whether a job waits or runs."""
        with self._wake:
            return self._busy or self._job is not None

    def settle(self, timeout_s: float = 120.0) -> None:
        """Wait until no job waits or runs, and hand over the results here.

        Raises
        ------
        TimeoutError
            If that takes too long.
        """
        end = time.monotonic() + timeout_s
        with self._wake:
            if self._job is not None:
                number, _, job, done = self._job
                self._job = (number, 0.0, job, done)
                self._wake.notify_all()
            while self._busy or self._job is not None:
                if not self._wake.wait(max(0.0, end - time.monotonic())):
                    raise TimeoutError("the work in the background has not ended")
        self._hand_over()

    def _hand_over(self) -> None:
        while True:
            try:
                give = self._results.get_nowait()
            except queue.Empty:
                return
            give()

    def _work(self) -> None:
        while True:
            with self._wake:
                while not self._due():
                    if self._closed:
                        return
                    self._wake.wait(self._delay())
                assert self._job is not None
                current = self._job
                self._job, self._busy = None, True
            number, _, job, done = current
            try:
                self._finish(number, done, job(partial(self._check, number)))
            except Stopped:
                with self._wake:
                    if self._held and self._job is None and not self._closed:
                        self._job = (number, time.monotonic() + self.pause_s, job, done)  # begun again when up
            except Exception as error:  # told on the kernel's thread; this thread must live on
                self._finish(number, done, error)
            with self._wake:
                self._busy = False
                self._wake.notify_all()

    def _due(self) -> bool:
        return self._job is not None and not self._held and time.monotonic() >= self._job[1]

    def _delay(self) -> float | None:
        if self._job is None:
            return None
        return max(0.0, max(self._job[1], self._held_until) - time.monotonic())

    def _check(self, number: int) -> None:
        with self._wake:
            if number != self._number or self._held or self._closed:
                raise Stopped

    def _finish(self, number: int, done: Callable[[Any], None], result: Any) -> None:
        def give() -> None:
            if number == self._number:
                done(result)

        self._results.put(give)
        loop = self._loop
        if loop is not None and not loop.is_closed():
            with contextlib.suppress(RuntimeError):
                loop.call_soon_threadsafe(self._hand_over)
