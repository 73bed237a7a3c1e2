"""Along the course: where along a segment the damage sits, in mm from each of its ends."""

from __future__ import annotations

from typing import Any, ClassVar

import pandas as pd
import traitlets as t

from byway.knowledge.damage.profile import PROFILE_COLUMNS, profile_facts
from byway.knowledge.words import word
from byway.widgets.front import load_css, load_esm
from byway.widgets.panel import Panel, element_words
from byway.widgets.wire import plain

__all__ = ["AlongPanel"]

MOST_CHOICES = 30


class AlongPanel(Panel):
    """The along-course profile of the segment that is pointed out, else of the one that is severed most.

    ``profile`` is the table that is shown (:func:`~byway.knowledge.damage.profile.course_profile`), or None; where the
    segment rests on own anatomy, the template's profile is drawn behind it.
    """

    _esm = load_esm("anatomy/along.js")
    _css = load_css("front/panel.css", "anatomy/view.css")
    sections: ClassVar[tuple[str, ...]] = ("along",)

    choices: Any = t.List().tag(sync=True)
    course = t.Dict().tag(sync=True)

    def __init__(self, source: Any) -> None:
        super().__init__(source)
        self.profile: pd.DataFrame | None = None
        self.show_course()
        self.when(["accounts_seq", "case_seq", "graph_seq", "selected"], self.show_course)

    def show_course(self) -> None:
        """The profile of the chosen segment, by the lesion as it stands."""
        with self.hold_sync():
            self.choices = self._choices()
            self.profile, self.course = self._course()
            self.stamp += 1

    def _choices(self) -> list[dict[str, Any]]:
        """Segments that are hit, most severed first."""
        damage = self.state.damage
        if damage is None:
            return []
        first = len(damage.index.geometry.region_ids)
        order = sorted(range(first, len(damage.share)), key=lambda i: -float(damage.share[i]))
        return [{**element_words(self.graph, damage.element_ids[i]), "share": float(damage.share[i])}
                for i in order[:MOST_CHOICES] if damage.share[i] > 0]  # fmt: skip

    def _course(self) -> tuple[pd.DataFrame | None, dict[str, Any]]:
        damage, ask = self.state.damage, getattr(self.state.science, "profile", None)
        if damage is None or ask is None:
            return None, {}
        geometry, chosen = damage.index.geometry, self.state.selected
        if chosen not in geometry.segment_ids:
            chosen = self.choices[0]["id"] if self.choices else ""
        if not chosen:
            return None, {}
        table, usual = ask(self.state.lesion, chosen)
        told = {
            **element_words(self.graph, chosen),
            "anatomy": geometry.anatomy[geometry.index_of[chosen]],
            "ends": self._ends(chosen),
            "facts": profile_facts(table),
            "bins": {column: table[column].to_list() for column in PROFILE_COLUMNS},
        }
        if usual is not None:
            told["usual"] = {name: usual[name].to_list() for name in ("from_start_mm", "share_hit")}
            told["usual"]["length_mm"] = float(usual.attrs["length_mm"])
        return table, plain(told)

    def _ends(self, element: str) -> list[str]:
        """Names of the places that a segment joins."""
        graph, key = self.graph, element.partition("@")[0]
        segment = graph.segments.get(key) if graph is not None else None
        if segment is None:
            return [word("along.first_end"), word("along.last_end")]
        names = []
        for place in (segment.from_place, segment.to_place):
            kind, _, junction = place.partition(":")
            bare = place.partition("@")[0]
            if kind == "wm" and junction:
                names.append(word("along.junction", name=junction.replace("_", " ")))
            else:
                names.append(graph.name_of(bare) if bare in graph.regions else bare)
        return names
