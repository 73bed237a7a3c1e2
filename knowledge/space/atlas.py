"""The template's geometry by key and side, loaded from the cache or built once."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import BywayError, Fault, nearest
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.loading import load_graph
from byway.knowledge.space.build import build_geometry, geometry_hash
from byway.knowledge.space.cache import load_entry, store_entry
from byway.knowledge.space.geometry import Geometry
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.space.reuse import Earlier

__all__ = ["Template", "load_template", "spread_by_key"]

_ARRAYS = (
    "region_voxels",
    "region_weights",
    "region_offsets",
    "points_mm",
    "streamline_offsets",
    "segment_offsets",
    "core",
    "streamline_weights",
    "spread_mm",
)


@dataclass(frozen=True)
class Template:
    """Geometry with look-ups by key and side.

    Parameters
    ----------
    geometry : Geometry
        Parcels and bundles of all elements.
    core_lines : mapping of element id to (n, 3) float32 array
        Core line of each segment, MNI mm, from its first place to its second.
    """

    geometry: Geometry
    core_lines: Mapping[str, NDArray[np.float32]]

    @cached_property
    def region_keys(self) -> tuple[str, ...]:
        """Keys of all regions, in order."""
        return tuple(dict.fromkeys(element.partition("@")[0] for element in self.geometry.region_ids))

    @cached_property
    def segment_keys(self) -> tuple[str, ...]:
        """Keys of all segments, in order."""
        return tuple(dict.fromkeys(element.partition("@")[0] for element in self.geometry.segment_ids))

    @cached_property
    def _sides(self) -> dict[str, tuple[str, ...]]:
        sides: dict[str, tuple[str, ...]] = {}
        for element in self.geometry.element_ids:
            key, _, side = element.partition("@")
            sides[key] = (*sides.get(key, ()), side)
        return sides

    def sides(self, key: str) -> tuple[str, ...]:
        """Sides of a region or segment: ``("left", "right")`` or ``("midline",)``.

        Raises
        ------
        BywayError
            No region or segment has this key.
        """
        if key not in self._sides:
            raise BywayError(Fault("unknown-key", key, "no such region or segment", remedy=nearest(key, self._sides)))
        return self._sides[key]

    def element(self, key: str, side: str | None = None) -> str:
        """Element id of a key and side; the side may be left out only on the midline.

        Raises
        ------
        BywayError
            Unknown key, or a side that the element does not have.
        """
        key, _, given = key.partition("@")
        side = side or given or None
        sides = self.sides(key)
        if side is None and sides == ("midline",):
            side = "midline"
        if side not in sides:
            raise BywayError(Fault("side", key, f"side {side}", " or ".join(sides)))
        return f"{key}@{side}"

    def streamlines(self, key: str, side: str | None = None) -> list[NDArray[np.float32]]:
        """Streamlines of a segment, each (n, 3) in MNI mm, from its first place to its second."""
        return self.geometry.streamlines(self.geometry.segment_ids.index(self._segment(key, side)))

    def core_line(self, key: str, side: str | None = None) -> NDArray[np.float32]:
        """Core line of a segment, (n, 3) in MNI mm."""
        return self.core_lines[self._segment(key, side)]

    def parcel(self, key: str, side: str | None = None) -> NDArray[np.bool_]:
        """Parcel of a region as a boolean volume on the template grid."""
        element = self.element(key, side)
        if element not in self.geometry.region_ids:
            raise BywayError(Fault("kind", key, "a segment", "a region"))
        volume = np.zeros(self.geometry.grid.shape, bool)
        volume.flat[self.geometry.parcel_voxels(self.geometry.region_ids.index(element))] = True
        return volume

    def _segment(self, key: str, side: str | None) -> str:
        element = self.element(key, side)
        if element in self.geometry.region_ids:
            raise BywayError(Fault("kind", key, "a region", "a segment"))
        return element


def spread_by_key(graph: Graph) -> dict[str, float]:
    """Between-subject spread (mm) of every region by its tissue, and segment by its pathway's kind and variability."""
    spread = {key: graph.norm("spread_mm", region.tissue) for key, region in graph.regions.items()}
    for key, segment in graph.segments.items():
        kind = graph.pathways[segment.pathway].kind
        spread[key] = graph.norm("spread_mm", f"{kind}_{segment.variability}")
    return spread


def load_template(
    graph: Graph | None = None, *, near: tuple[Graph, Template] | None = None, store: bool = True, progress: bool = True
) -> Template:
    """Geometry of the template for a graph, from the cache where the same was built before.

    Parameters
    ----------
    graph : Graph, optional
        Where regions, segments and spreads come from; the curated graph if left out.
    near : pair of Graph and Template, optional
        A graph that differs little, and its template: what has not changed is taken from there. By default the
        curated graph's, where the cache holds it.
    store : bool
        Whether to put what is built into the cache.
    progress : bool
        Whether a build shows a progress bar.

    Notes
    -----
    The cache lies in ``$BYWAY_CACHE`` or the user's cache folder and may be deleted at any time.
    """
    graph = graph or load_graph()
    spread = spread_by_key(graph)
    digest = geometry_hash(graph.regions, graph.segments, spread)
    template = _stored(digest)
    if template is None:
        geometry, core_lines = build_geometry(
            graph.regions, graph.segments, spread, progress=progress, earlier=_earlier(*(near or _curated()))
        )
        if store:
            store_entry(f"geometry-{digest}", *_packed(geometry, core_lines))
        template = Template(geometry, core_lines)
    return template


def _stored(digest: str) -> Template | None:
    stored = load_entry(f"geometry-{digest}")
    return _unpack(*stored, digest) if stored else None


def _curated() -> tuple[Graph, Template | None]:
    graph = load_graph()
    return graph, _stored(geometry_hash(graph.regions, graph.segments, spread_by_key(graph)))


def _earlier(graph: Graph, template: Template | None) -> Earlier | None:
    """What a template can lend: nothing where a part of it is not the template's own."""
    if template is None or set(template.geometry.anatomy) - {"template"}:
        return None
    return Earlier(graph.regions, graph.segments, template.geometry, template.core_lines)


def _packed(
    geometry: Geometry, core_lines: Mapping[str, NDArray[np.float32]]
) -> tuple[dict[str, NDArray[Any]], dict[str, Any]]:
    arrays = {field: getattr(geometry, field) for field in _ARRAYS}
    arrays["core_points_mm"] = np.concatenate([core_lines[element] for element in geometry.segment_ids])
    arrays["core_offsets"] = np.cumsum([0, *(len(core_lines[element]) for element in geometry.segment_ids)])
    facts = {field: list(getattr(geometry, field)) for field in ("region_ids", "segment_ids", "anatomy")}
    return arrays, facts


def _unpack(arrays: dict[str, NDArray[Any]], facts: dict[str, Any], digest: str) -> Template | None:
    try:
        core, bounds = arrays["core_points_mm"], arrays["core_offsets"]
        ids = tuple(facts["segment_ids"])
        geometry = Geometry(
            grid=TEMPLATE_GRID,
            region_ids=tuple(facts["region_ids"]),
            segment_ids=ids,
            anatomy=tuple(facts["anatomy"]),
            content_hash=digest,
            **{field: arrays[field] for field in _ARRAYS},
        )
        lines = {ids[i]: core[bounds[i] : bounds[i + 1]] for i in range(len(ids))}
    except (KeyError, IndexError, TypeError):
        return None
    return Template(geometry, lines)
