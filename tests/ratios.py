"""How benchmarks time a piece of work beside another, and say what they found."""

from __future__ import annotations

import time
from collections.abc import Callable

__all__ = ["note", "seconds"]


def seconds(work: Callable[[], object], rounds: int = 3) -> float:
    """Least time of some rounds."""
    times = []
    for _ in range(rounds):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return min(times)


def note(benchmark, capsys, words: str, **figures: float) -> None:
    """Print figures, and keep them with the benchmark."""
    benchmark.extra_info.update(figures)
    with capsys.disabled():
        print(f"\n{words}: " + ", ".join(f"{name} {value:.3g}" for name, value in figures.items()))
