"""What every panel is: a widget that observes one state, takes its labels from the word table, and stands alone."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from typing import Any, ClassVar

import anywidget
import traitlets as t

from byway.knowledge.cases.wording import whose_words
from byway.knowledge.faults import BywayError
from byway.knowledge.graph.references import split_reference
from byway.knowledge.words import section
from byway.widgets.state import BenchState

__all__ = ["Panel", "claims_of", "element_words", "state_of", "whose_of"]


def state_of(source: Any) -> BenchState:
    """The state that a panel observes.

    Parameters
    ----------
    source : BenchState or Explanation
        A state is shared as it is; an explanation gets a state of its own that never changes.

    Raises
    ------
    TypeError
        Anything else.
    """
    if isinstance(source, BenchState):
        return source
    if hasattr(source, "accounts") and hasattr(source, "damage"):
        state = BenchState()
        state.explanation = source
        return state
    raise TypeError(f"a panel shows a BenchState or an Explanation, not {type(source).__name__}")


class Panel(anywidget.AnyWidget):
    """Base of the panels.

    Parameters
    ----------
    source : BenchState or Explanation
        What to show. A panel never changes an explanation; it changes a state only through the state's own methods.

    Notes
    -----
    ``stamp`` moves on when everything that belongs to one change has been sent, so that the browser draws once.
    """

    sections: ClassVar[tuple[str, ...]] = ()

    words = t.Dict().tag(sync=True)
    stamp = t.Int(0).tag(sync=True)
    selected = t.Unicode("").tag(sync=True)

    def __init__(self, source: Any, **traits: Any) -> None:
        self.state = state_of(source)
        self._watched: list[tuple[Callable[[Any], None], list[str]]] = []
        self._link: Any = None
        super().__init__(words=section("shared", "panel", *self.sections), selected=self.state.selected, **traits)
        self._link = t.link((self.state, "selected"), (self, "selected"))
        self.on_msg(self._heard)

    @property
    def graph(self) -> Any:
        """The graph in use, or None where the state has none."""
        graph = self.state.science.graph
        if graph is None and self.state.explanation is not None:
            graph = self.state.explanation.reckoning.prepared.graph
        return graph

    def draws_of(self, lesion: Any) -> Any:
        """The damage ensemble of another lesion, by variant; None where the state has no geometry."""
        ask = getattr(self.state.science, "draws_of", None)
        return ask(lesion) if ask is not None else None

    def when(self, names: list[str], call: Callable[[], None]) -> None:
        """Call when any named trait of the state moves, until the panel is closed."""

        def heard(_: Any) -> None:
            call()

        self.state.observe(heard, names)
        self._watched.append((heard, names))

    def close(self) -> None:
        """Stop observing and remove the widget."""
        for heard, names in self._watched:
            self.state.unobserve(heard, names)
        self._watched.clear()
        if self._link is not None:
            self._link.unlink()
            self._link = None
        super().close()

    def _heard(self, _: Any, content: Any, buffers: Any) -> None:
        """A message from the browser; a fault in it becomes a notice and changes nothing."""
        try:
            self.on_message(content, buffers)
        except (BywayError, KeyError, TypeError, ValueError) as error:
            self.state.tell(error)
            self.on_refused()

    def on_message(self, content: dict[str, Any], buffers: list[Any]) -> None:
        """Act on a message of the front end."""

    def on_refused(self) -> None:
        """Show again what holds, after a message that could not be acted on."""


def element_words(graph: Any, element: str) -> dict[str, str]:
    """Id, kind, name and side of an element, for a chip; the key stands in where the graph has no name."""
    key, side = split_reference(element)
    kind = "segment" if "." in key else "region"
    name = key
    if graph is not None and (key in graph.regions or key in graph.segments):
        name = graph.name_of(key)
    return {"id": element, "kind": kind, "name": name, "side": side or "midline"}


def whose_of(state: BenchState) -> str:
    """Whose anatomy the numbers of a state rest on, in words; nothing where no number is known."""
    if state.damage is not None:
        return whose_words(state.damage.index.geometry.anatomy)
    return whose_words(state.explanation.damage["anatomy"]) if state.explanation is not None else ""


def claims_of(claims: Iterable[Any], graph: Any) -> list[dict[str, Any]]:
    """Claims with their sources spelt out: authors, year, title, container, and whether the text was read."""
    rows = []
    for claim in claims:
        record = graph.claims[claim] if isinstance(claim, str) and graph is not None else claim
        sources = [_source(source, graph) for source in record.sources]
        rows.append({"key": record.key, "says": record.says, "grade": record.grade, "kind": record.kind,
                     "population": record.population, "stance": record.stance, "note": record.note,
                     "sources": sources})  # fmt: skip
    return rows


def _source(key: str, graph: Any) -> dict[str, Any]:
    record = graph.sources.get(key) if graph is not None else None
    if record is None:
        return {"key": key, "text": key, "doi": None, "checked": "memory"}
    title = f" {record.title}." if record.title else ""
    text = f"{record.authors} ({record.year}){title} {record.container}"
    return {"key": key, "text": text, "doi": record.doi, "checked": record.checked}
