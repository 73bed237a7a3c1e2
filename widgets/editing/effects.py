"""What an edit would do to the ranking of the open case: reckoned in the background, the newest question only."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from byway.knowledge.graph.graph import Graph
from byway.knowledge.reasoning.ranking import ranking_change, ranking_words
from byway.widgets.editing.wire import rows_told
from byway.widgets.state import BenchState
from byway.widgets.state.resting import Resting

__all__ = ["Effects"]


class Effects:
    """Rankings before and after.

    Parameters
    ----------
    state : BenchState
        The open case.
    show : callable
        Takes what to tell the browser: ``n`` (of the question), ``stage`` (waits, done, none), ``words``, ``rows``.
    pause_s : float
        How long the form must rest.
    """

    def __init__(self, state: BenchState, show: Callable[[dict[str, Any]], None], pause_s: float = 0.3) -> None:
        self.state, self.show = state, show
        self.resting = Resting(pause_s)

    def ask(self, n: int, graph: Graph | None, science_for: Callable[[Graph], Any]) -> None:
        """Ask for the effect of using a graph; an earlier question is dropped."""
        state = self.state
        before, case, lesion = state.explanation, state.case, state.lesion
        if graph is None or before is None or case is None:
            self.forget(n)
            return
        findings = state.findings

        def job(check: Callable[[], None]) -> Any:
            science = science_for(graph)
            check()
            damage = science.damage(lesion)
            return science.explain(lesion, damage, case, findings, check)[1]

        def done(after: Any) -> None:
            if isinstance(after, Exception):
                self.show({"n": n, "stage": "none", "words": str(after), "rows": []})
                return
            table = ranking_change(before, after)
            self.show({"n": n, "stage": "done", "words": ranking_words(table), "rows": rows_told(table.head(8))})

        self.show({"n": n, "stage": "waits", "words": "", "rows": []})
        self.resting.ask(job, done)

    def forget(self, n: int = 0) -> None:
        """Nothing is asked any more."""
        self.resting.ask(lambda check: None, lambda result: None)
        self.show({"n": n, "stage": "none", "words": "", "rows": []})

    def settle(self, timeout_s: float = 120.0) -> None:
        """Wait until the answer is there."""
        self.resting.settle(timeout_s)

    def close(self) -> None:
        """Stop for good."""
        self.resting.close()
