"""What the state asks of byway.knowledge, in one narrow place, so that a test can put a small stand-in there."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.space.geometry import Geometry

__all__ = ["NoScience", "Science"]


class Science(Protocol):
    """The questions; answers are the values of ``byway.knowledge``, passed on as they are."""

    @property
    def graph(self) -> Any:
        """The typed graph, or None."""

    @property
    def geometry(self) -> Geometry | None:
        """Geometry of all elements, or None."""

    @property
    def index(self) -> DamageIndex | None:
        """The damage index, or None."""

    @property
    def names(self) -> dict[str, str]:
        """Names of regions, segments, functions and signs by bare key."""

    def damage(self, lesion: Lesion) -> Any:
        """Point damage, at once; None without geometry."""

    def explain(
        self, lesion: Lesion, damage: Any, case: Any, findings: Any, check: Callable[[], None]
    ) -> tuple[Any, Any]:
        """The ensemble and the explanation; calls ``check`` between parts, which may raise to stop it."""

    def map_of(self, kind: str) -> NDArray[np.uint8] | None:
        """A map over the grid, 0 to 255: ``uncharted`` white matter; None where it is not known."""

    def for_case(self, case: Any) -> Science:
        """What answers for a case: the graph with its overlays, on its own anatomy where it brings any."""


class NoScience:
    """Draws without reasoning: no geometry, no graph."""

    graph: Any = None
    geometry: Geometry | None = None
    index: DamageIndex | None = None
    names: dict[str, str] = {}  # noqa: RUF012 - nothing writes to it

    def damage(self, lesion: Lesion) -> Any:
        """Nothing is known."""
        return None

    def explain(
        self, lesion: Lesion, damage: Any, case: Any, findings: Any, check: Callable[[], None]
    ) -> tuple[Any, Any]:
        """Nothing is known."""
        return None, None

    def map_of(self, kind: str) -> NDArray[np.uint8] | None:
        """Nothing is known."""
        return None

    def for_case(self, case: Any) -> Science:
        """The same nothing."""
        return self
