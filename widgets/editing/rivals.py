"""Rival models on the open case: named, used, compared; and the difference of any two states."""

from __future__ import annotations

from typing import Any

from byway.knowledge.cases.layers import CaseModel, keep_model, read_models
from byway.knowledge.faults import BywayError, Fault, nearest
from byway.knowledge.graph.layers import apply_overlays, diff
from byway.knowledge.graph.loading import graph_with
from byway.knowledge.reasoning.models import compare_models
from byway.knowledge.reasoning.ranking import ranking_change, ranking_words
from byway.widgets.editing.session import Session
from byway.widgets.editing.wire import changes_told, picture_of, rows_told
from byway.widgets.state import BenchState
from byway.widgets.wire import plain

__all__ = ["Rivals"]


class Rivals:
    """Models of the open case.

    Parameters
    ----------
    state : BenchState
        The open case.
    """

    def __init__(self, state: BenchState) -> None:
        self.state = state

    def name(self, session: Session, name: str, overlays: list[str]) -> None:
        """Keep a set of overlays under a name.

        Raises
        ------
        BywayError
            No case folder, no name, a path outside the folder, or overlays that do not go together.
        """
        case = session.case
        if case is None:
            raise BywayError(Fault("no-case", "models", "no case folder to keep it in", "an open case"))
        model = CaseModel(name.strip(), tuple(overlays))
        graph_with(session.base, model.read(case.folder))
        keep_model(case.folder, model)

    def overlays_of(self, session: Session, name: str) -> tuple[str, ...]:
        """Paths of a model's overlays; of the base, none.

        Raises
        ------
        BywayError
            No model of that name.
        """
        case = session.case
        known = {model.name: model.overlays for model in read_models(case.folder)} if case is not None else {}
        if not name:
            return ()
        if name not in known:
            raise BywayError(Fault("model", name, "no such model", remedy=nearest(name, known)))
        return known[name]

    def compared(self, session: Session, first: str, second: str) -> dict[str, Any]:
        """Two models on the open case: evidence, finding by finding, and both rankings; the base's name is empty.

        Raises
        ------
        BywayError
            No findings to compare them on, a model is unknown or cannot be used, or both are the same.
        """
        case, state = session.case, self.state
        if case is None or state.case is None:
            raise BywayError(Fault("no-case", "models", "no open case", "an open case"))
        if first == second:
            raise BywayError(Fault("model", first or "base", "the same model twice", "two models"))
        explanations: dict[str, Any] = {}
        contents = []
        for name in (first, second):
            overlays = CaseModel(name, self.overlays_of(session, name)).read(case.folder)
            graph = graph_with(session.base, overlays)
            contents.append(apply_overlays(session.base, overlays))
            science: Any = state.science
            science = science.with_graph(graph)
            damage = science.damage(state.lesion)
            findings = tuple(finding for finding in state.findings if finding.sign in graph.signs)
            explanations[name or "base"] = science.explain(state.lesion, damage, case, findings, lambda: None)[1]
        names = list(explanations)
        told = compare_models(explanations)
        ranking = ranking_change(explanations[names[0]], explanations[names[1]])
        changes = diff(*contents)
        return dict(plain({
            "first": names[0], "second": names[1], "words": told.words,
            "findings": [{**row, "first": row[names[0]], "second": row[names[1]]} for row in rows_told(told.table)],
            "ranking": rows_told(ranking.head(8)), "ranking_words": ranking_words(ranking),
            "changes": changes_told(changes), "picture": picture_of(changes, *contents),
        }))  # fmt: skip

    def differing(self, session: Session, older: int, newer: int) -> dict[str, Any]:
        """The difference of two states of the session, in words and as a picture."""
        states = session.contents()
        first, second = states[older][1], states[newer][1]
        changes = diff(first, second)
        return dict(plain({"older": older, "newer": newer, "changes": changes_told(changes),
                           "picture": picture_of(changes, first, second)}))  # fmt: skip
