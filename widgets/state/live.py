"""The answers of ``byway.knowledge`` for the state: one desk, read once, asked many times."""

from __future__ import annotations

from collections.abc import Callable
from functools import cached_property
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from byway.knowledge.cases.anatomies import anatomies_of
from byway.knowledge.cases.case import Case
from byway.knowledge.cases.desk import Desk, desk_for, desk_with
from byway.knowledge.cases.explaining import desk_of
from byway.knowledge.damage.coverage import uncharted_map, uncharted_share
from byway.knowledge.damage.ensemble import Ensemble, EnsembleSettings, ensemble
from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.damage.point import point_damage
from byway.knowledge.damage.profile import course_profile
from byway.knowledge.graph.graph import Graph
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.reasoning.explain import explain_findings
from byway.knowledge.space.geometry import Geometry

__all__ = ["LiveScience"]


class LiveScience:
    """Answers from a desk.

    Parameters
    ----------
    desk : Desk, optional
        Graph, template and damage index; the base graph's where None.
    draws : int
        Virtual anatomies of an ensemble.
    """

    def __init__(self, desk: Desk | None = None, *, draws: int = 200) -> None:
        self.desk = desk if desk is not None else desk_for()
        self.draws = draws
        self._drawn: tuple[Lesion, EnsembleSettings, Ensemble] | None = None

    @property
    def graph(self) -> Graph:
        """The graph in effect."""
        return self.desk.graph

    def with_graph(self, graph: Graph) -> LiveScience:
        """Answers from another graph; only what differs is built anew. Draws are shared where geometry is."""
        other = LiveScience(desk_with(self.desk, graph), draws=self.draws)
        if other.desk.index is self.desk.index:
            other._drawn = self._drawn
        return other

    def for_case(self, case: Case) -> LiveScience:
        """Answers on the desk of a case: the graph with its overlays, on its own anatomy where it brings any."""
        return LiveScience(desk_of(case, progress=False), draws=self.draws)

    @property
    def geometry(self) -> Geometry:
        """Geometry of all elements of that graph."""
        return self.desk.template.geometry

    @property
    def index(self) -> DamageIndex:
        """The damage index of that geometry."""
        return self.desk.index

    @cached_property
    def names(self) -> dict[str, str]:
        """Names of regions, segments, functions and signs by bare key."""
        graph = self.graph
        keys = (*graph.regions, *graph.segments, *graph.functions, *graph.signs)
        return {key: graph.name_of(key) for key in keys}

    def damage(self, lesion: Lesion) -> Any:
        """Point damage of every element."""
        return point_damage(lesion, self.desk.index)

    def map_of(self, kind: str) -> NDArray[np.uint8] | None:
        """A map over the grid, 0 to 255; see :class:`~byway.widgets.state.science.Science`."""
        return uncharted_map(self.desk.index).view(np.uint8) * np.uint8(255) if kind == "uncharted" else None

    def anatomies(self, lesion: Lesion, damage: Any = None) -> pd.DataFrame:
        """Template and own anatomy side by side for a lesion; no row where there is no own anatomy."""
        return anatomies_of(lesion, self.desk, damage)

    @property
    def anatomy_notes(self) -> tuple[str, ...]:
        """What was left out of the files of the own anatomy."""
        return self.desk.notes

    def profile(self, lesion: Lesion, element: str) -> tuple[pd.DataFrame, pd.DataFrame | None]:
        """Along-course profile of a segment, and the template's of it where the segment is the person's own."""
        usual = None
        if self.desk.usual is not None and self.geometry.anatomy[self.geometry.index_of[element]] != "template":
            usual = course_profile(lesion, self.desk.usual.template, element)
        return course_profile(lesion, self.desk.template, element), usual

    def draws_of(self, lesion: Lesion) -> Any:
        """The damage ensemble of another lesion, by variant."""
        settings = EnsembleSettings.from_norms(self.graph, lesion, draws=self.draws)
        return ensemble(lesion, self.desk.index, settings).draws

    def explain(
        self, lesion: Lesion, damage: Any, case: Any, findings: Any, check: Callable[[], None]
    ) -> tuple[Any, Any]:
        """The ensemble, and the explanation of the findings by it."""
        settings = EnsembleSettings.from_norms(self.graph, lesion, draws=self.draws)

        def heard(done: int, total: int) -> None:
            check()

        if self._drawn is not None and self._drawn[0] is lesion and self._drawn[1] == settings:
            drawn = self._drawn[2]
        else:
            drawn = ensemble(lesion, self.desk.index, settings, progress=heard)
            self._drawn = (lesion, settings, drawn)
        check()
        spec = case.spec
        explanation = explain_findings(
            self.graph, drawn, damage, spec.person, spec.stage, spec.cause, findings, priors=spec.priors or None,
            damage_table=damage.table(drawn.interval(), names=self.names),
            uncharted_share=uncharted_share(lesion, self.desk.index),
        )  # fmt: skip
        return drawn, explanation
