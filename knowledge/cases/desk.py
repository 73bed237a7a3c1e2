"""The desk: graph, template and damage index, read once and shared by every case that uses the same overlays."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path

from byway.knowledge.atomic import fingerprint
from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.loading import load_graph
from byway.knowledge.space.atlas import Template, load_template, spread_by_key

__all__ = ["Desk", "desk_for", "desk_with"]


@dataclass(frozen=True, eq=False)
class Desk:
    """All that a case is reasoned on.

    Parameters
    ----------
    graph : Graph
        The graph in effect.
    template : Template
        Geometry of every element of that graph.
    index : DamageIndex
        The geometry prepared for damage.
    """

    graph: Graph
    template: Template
    index: DamageIndex


@lru_cache(maxsize=4)
def _desk(overlays: tuple[tuple[Path, str | None], ...], progress: bool) -> Desk:
    graph = load_graph([path for path, _ in overlays])
    template = load_template(graph, progress=progress)
    return Desk(graph, template, DamageIndex.build(template.geometry))


def desk_for(overlays: Iterable[Path] = (), *, progress: bool = True) -> Desk:
    """The desk for a set of overlays; built once, and again where an overlay file has changed.

    Parameters
    ----------
    overlays : iterable of Path
        Overlay files or folders laid on the base graph, the first lowest.
    progress : bool
        Whether to show the building of the template's geometry (about a minute, once a machine).
    """
    return _desk(tuple((path, _print_of(path)) for path in overlays), progress)


def desk_with(desk: Desk, graph: Graph) -> Desk:
    """A desk with another graph, built from one that differs little.

    Template and index are shared where both graphs have the same regions, segments and spreads; otherwise only what
    changed is built (about a second a segment, several where a parcel changes). Nothing goes into the cache.

    Parameters
    ----------
    desk : Desk
        Not touched.
    graph : Graph
        The other graph.
    """
    old = desk.graph
    if old.anatomy_hash == graph.anatomy_hash and spread_by_key(old) == spread_by_key(graph):
        return Desk(graph, desk.template, desk.index)
    template = load_template(graph, near=(old, desk.template), store=False, progress=False)
    return Desk(graph, template, DamageIndex.build(template.geometry))


def _print_of(path: Path) -> str | None:
    if path.is_dir():
        return "".join(filter(None, (fingerprint(file) for file in sorted(path.rglob("*.yaml")))))
    return fingerprint(path)
