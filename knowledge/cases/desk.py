"""The desk: graph, geometry and damage index, read once and shared by every case that uses the same overlays.

Where a case brings its own anatomy, its desk rests on that, and keeps the usual desk beside it for comparison.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace
from functools import lru_cache
from pathlib import Path

from byway.knowledge.atomic import fingerprint
from byway.knowledge.cases.own import OwnLayer, laid_on
from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.loading import load_graph
from byway.knowledge.space.atlas import Template, load_template, spread_by_key

__all__ = ["Desk", "desk_for", "desk_own", "desk_with"]


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
    usual : Desk, optional
        The same graph on the template's anatomy alone, where ``template`` holds own anatomy.
    layers : tuple of OwnLayer
        The own anatomies, in order.
    notes : tuple of str
        What was left out of their files.
    """

    graph: Graph
    template: Template
    index: DamageIndex
    usual: Desk | None = None
    layers: tuple[OwnLayer, ...] = ()
    notes: tuple[str, ...] = ()


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


def desk_own(desk: Desk, layers: Iterable[OwnLayer]) -> Desk:
    """A desk that rests on own anatomy where it is given; read once, and again where a file has changed.

    Parameters
    ----------
    desk : Desk
        With the template's anatomy.
    layers : iterable of OwnLayer
        From :mod:`byway.knowledge.cases.own`; without any, the desk itself is returned.

    Raises
    ------
    ImageError, CaseError, BywayError
        A file that cannot be used; see :func:`~byway.knowledge.cases.own.laid_on`.
    """
    layers = tuple(layers)
    if not layers:
        return desk
    elements = desk.template.geometry.element_ids
    return _owned(desk, layers, tuple(layer.prints(elements) for layer in layers))


@lru_cache(maxsize=4)
def _owned(desk: Desk, layers: tuple[OwnLayer, ...], prints: tuple[tuple[tuple[str, int, int], ...], ...]) -> Desk:
    template, notes = laid_on(desk.template, layers)
    return Desk(desk.graph, template, DamageIndex.build(template.geometry), desk, layers, notes)


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
    same = old.anatomy_hash == graph.anatomy_hash and spread_by_key(old) == spread_by_key(graph)
    if desk.usual is not None:
        usual = desk_with(desk.usual, graph)
        return replace(desk, graph=graph, usual=usual) if same else desk_own(usual, desk.layers)
    if same:
        return Desk(graph, desk.template, desk.index)
    template = load_template(graph, near=(old, desk.template), store=False, progress=False)
    return Desk(graph, template, DamageIndex.build(template.geometry))


def _print_of(path: Path) -> str | None:
    if path.is_dir():
        return "".join(filter(None, (fingerprint(file) for file in sorted(path.rglob("*.yaml")))))
    return fingerprint(path)
