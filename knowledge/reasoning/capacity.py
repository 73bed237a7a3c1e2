"""Capacity of a function: the least minimal cut of its network, over thousands of damage states at once.

Every element and every link of a function's network can carry ``load * (1 + headroom)``, an element times one minus
its damage; so can the ways in and out, where a route starts or ends at an element that other routes pass. The
capacity of the function is ``min(1, maximum flow)``, which equals the least summed capacity over the minimal cuts
(Ford and Fulkerson 1956). Cuts depend on the network alone, so they are enumerated once.

Three steps keep the cuts few. Elements that follow each other with no branch between form a *run*, which carries
what its worst element lets through. A link is left out where an element at one of its ends carries the same load,
because that element is never the wider of the two. Parts of the network that share no link (the two hemispheres of a
bilateral function) are *blocks*, whose flows add up.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import Fault, GraphError
from byway.knowledge.graph.networks import FunctionNetwork

__all__ = ["MAX_CUTS", "Block", "CutTable", "capacities", "cut_table"]

MAX_CUTS = 20_000
"""A network with more minimal cuts than this, in one block, is refused rather than left to hang."""

_SAME_LOAD = 1e-9
_OUTSIDE = -1


@dataclass(frozen=True, eq=False)
class Block:
    """The minimal cuts of one connected part of a network.

    Parameters
    ----------
    run_cuts : (n_cuts, n_runs) float32
        One where a cut goes through a run, else zero; the runs are those of the whole table.
    link_loads : (n_cuts,) float32
        Summed usual load of the links that each cut goes through.
    links : tuple of tuple of (int, int)
        Those links, by element number, for each cut; -1 stands for outside the network (a way in or out).
    """

    run_cuts: NDArray[np.float32]
    link_loads: NDArray[np.float32]
    links: tuple[tuple[tuple[int, int], ...], ...]


@dataclass(frozen=True, eq=False)
class CutTable:
    """All minimal cuts of one function network, ready for many damage states.

    Parameters
    ----------
    network : FunctionNetwork
        The network; element numbers below are its own.
    runs : tuple of tuple of int
        Elements of each run, in order.
    run_loads : (n_runs,) float32
        Usual load of each run, in [0, 1].
    blocks : tuple of Block
        Parts whose flows add up.
    """

    network: FunctionNetwork
    runs: tuple[tuple[int, ...], ...]
    run_loads: NDArray[np.float32]
    blocks: tuple[Block, ...]

    @property
    def n_cuts(self) -> int:
        """Number of cuts that are weighed, summed over the blocks."""
        return sum(len(block.link_loads) for block in self.blocks)

    def run_capacities(self, damage: NDArray[np.float32], headroom: float) -> NDArray[np.float32]:
        """What each run can carry: (n_runs, n_states), for damage of shape (n_states, n_elements)."""
        carried = np.empty((len(self.runs), damage.shape[0]), np.float32)
        for i, run in enumerate(self.runs):
            worst = damage[:, run[0]]
            for element in run[1:]:
                worst = np.maximum(worst, damage[:, element])
            np.multiply(self.run_loads[i] * np.float32(1.0 + headroom), np.float32(1.0) - worst, out=carried[i])
        return carried

    def evaluate(
        self, damage: NDArray[np.float32], headroom: float
    ) -> tuple[NDArray[np.float32], NDArray[np.intp]]:
        """Capacity and attaining cut of every damage state.

        Parameters
        ----------
        damage : (n_states, n_elements) float32
            Damage in [0, 1] of the network's elements, in its order.
        headroom : float
            Share by which an intact element can carry more than its usual load, 0 or more.

        Returns
        -------
        capacity : (n_states,) float32
            In [0, 1].
        cuts : (n_states, n_blocks) int
            For each block, the number of the cut that attains the least sum.
        """
        carried = self.run_capacities(damage, headroom)
        total = np.zeros(damage.shape[0], np.float32)
        chosen = np.empty((damage.shape[0], len(self.blocks)), np.intp)
        for b, block in enumerate(self.blocks):
            sums = block.run_cuts @ carried
            sums += (block.link_loads * np.float32(1.0 + headroom))[:, None]
            chosen[:, b] = sums.argmin(axis=0)
            total += sums.min(axis=0)
        return np.minimum(total, np.float32(1.0)), chosen

    def capacity(self, damage: NDArray[np.float32], headroom: float) -> NDArray[np.float32]:
        """Capacity alone, as :meth:`evaluate` gives it, without looking for the cut that attains it."""
        carried = self.run_capacities(damage, headroom)
        total = np.zeros(damage.shape[0], np.float32)
        for block in self.blocks:
            if len(block.link_loads) == 1 and not block.links[0]:
                total += carried[block.run_cuts[0] > 0].sum(axis=0)
                continue
            sums = block.run_cuts @ carried
            sums += (block.link_loads * np.float32(1.0 + headroom))[:, None]
            total += sums.min(axis=0)
        return np.minimum(total, np.float32(1.0))

    def bottleneck(self, damage: NDArray[np.float32], headroom: float) -> tuple[float, tuple[int, ...]]:
        """Capacity of one damage state (n_elements,), and the worst elements of the runs in the cut that holds it.

        Runs of the cut without damage (a spared route that carries what it can) give no element. Where several
        elements of a run are equally damaged, all of them are named.
        """
        state = np.ascontiguousarray(damage, np.float32)[None, :]
        value, chosen = self.evaluate(state, headroom)
        named: list[int] = []
        for block, cut in zip(self.blocks, chosen[0], strict=True):
            for run in np.flatnonzero(block.run_cuts[cut]):
                shares = {element: float(state[0, element]) for element in self.runs[run]}
                worst = max(shares.values())
                if worst > 0.0:
                    named += [element for element, share in shares.items() if share >= worst - 1e-3]
        return float(value[0]), tuple(sorted(named))


def cut_table(network: FunctionNetwork) -> CutTable:
    """Enumerate the minimal cuts of a function network.

    Raises
    ------
    GraphError
        One block of the network has more than :data:`MAX_CUTS` minimal cuts, or as many paths.

    Notes
    -----
    The minimal cuts are the minimal sets that meet every path from a source to a sink, recombined paths included;
    they are grown path by path (Berge 1989).
    """
    runs, run_of = _runs(network)
    loads = np.array([network.element_loads[run[0]] for run in runs], np.float32)
    onward: dict[int, list[int]] = {i: [] for i in range(len(runs))}
    wide: dict[tuple[int, int], tuple[int, int, float]] = {}
    for (a, b), load in zip(network.links, network.link_loads, strict=True):
        i, j = run_of[a], run_of[b]
        if i == j:
            continue
        onward[i].append(j)
        if load < min(network.element_loads[a], network.element_loads[b]) - _SAME_LOAD:
            wide[i, j] = (a, b, load)
    for element, (enters, leaves) in enumerate(zip(network.source_loads, network.sink_loads, strict=True)):
        if element in network.sources and enters < network.element_loads[element] - _SAME_LOAD:
            wide[_OUTSIDE, run_of[element]] = (_OUTSIDE, element, enters)
        if element in network.sinks and leaves < network.element_loads[element] - _SAME_LOAD:
            wide[run_of[element], _OUTSIDE] = (element, _OUTSIDE, leaves)
    sources = sorted({run_of[element] for element in network.sources})
    sinks = {run_of[element] for element in network.sinks}
    link_items = {pair: len(runs) + n for n, pair in enumerate(wide)}
    blocks = []
    for part in _parts(len(runs), onward):
        starts = [i for i in sources if i in part]
        paths = _paths(network, starts, sinks, onward, link_items)
        cuts = _minimal_cuts(network, paths)
        blocks.append(_block(cuts, len(runs), list(wide.values())))
    return CutTable(network, runs, loads, tuple(blocks))


def capacities(
    network: FunctionNetwork, damage: NDArray[np.floating], headroom: float = 0.0
) -> NDArray[np.float32]:
    """Capacities of one network in many damage states, of shape (n_states, n_elements); see :class:`CutTable`."""
    return cut_table(network).capacity(np.asarray(damage, np.float32), headroom)


def _runs(network: FunctionNetwork) -> tuple[tuple[tuple[int, ...], ...], list[int]]:
    """Runs of elements with no branch between them, and the run of every element."""
    after: list[list[int]] = [[] for _ in network.elements]
    before: list[list[int]] = [[] for _ in network.elements]
    for a, b in network.links:
        after[a].append(b)
        before[b].append(a)
    run_of = [-1] * len(network.elements)
    runs: list[list[int]] = []
    for element in range(len(network.elements)):
        ahead = before[element]
        joined = (
            len(ahead) == 1
            and len(after[ahead[0]]) == 1
            and ahead[0] not in network.sinks
            and element not in network.sources
        )
        if joined:
            run_of[element] = run_of[ahead[0]]
            runs[run_of[element]].append(element)
        else:
            run_of[element] = len(runs)
            runs.append([element])
    return tuple(map(tuple, runs)), run_of


def _parts(count: int, onward: dict[int, list[int]]) -> list[set[int]]:
    """Connected parts of the runs."""
    part = list(range(count))

    def root(i: int) -> int:
        while part[i] != i:
            i = part[i]
        return i

    for i, ahead in onward.items():
        for j in ahead:
            part[root(j)] = root(i)
    groups: dict[int, set[int]] = {}
    for i in range(count):
        groups.setdefault(root(i), set()).add(i)
    return list(groups.values())


def _paths(
    network: FunctionNetwork,
    starts: list[int],
    sinks: set[int],
    onward: dict[int, list[int]],
    link_items: dict[tuple[int, int], int],
) -> list[int]:
    """Every path from a source to a sink, as a bit set of the runs and links that can be cut on it."""
    paths: set[int] = set()

    def link(here: int, ahead: int) -> int:
        """Bit of the link between two runs, or of a way in or out, if it can be the narrowest part."""
        item = link_items.get((here, ahead))
        return 0 if item is None else 1 << item

    stack = [(start, 1 << start | link(_OUTSIDE, start)) for start in starts]
    steps = 0
    while stack:
        here, met = stack.pop()
        steps += 1
        if steps > 20 * MAX_CUTS:
            _refuse(network, "paths")
        if here in sinks:
            paths.add(met | link(here, _OUTSIDE))
        stack += [(ahead, met | 1 << ahead | link(here, ahead)) for ahead in onward[here]]
    return _least(paths)


def _least(sets: set[int]) -> list[int]:
    """The bit sets that hold no other one of the collection, smallest first."""
    kept: list[int] = []
    for candidate in sorted(sets, key=int.bit_count):
        if not any(other & candidate == other for other in kept):
            kept.append(candidate)
    return kept


def _minimal_cuts(network: FunctionNetwork, paths: list[int]) -> list[int]:
    """The minimal bit sets that meet every path."""
    cuts = [0]
    for path in paths:
        items = [1 << i for i in range(path.bit_length()) if path >> i & 1]
        met = [cut for cut in cuts if cut & path]
        grown = {cut | item for cut in cuts if not cut & path for item in items}
        fresh = [cut for cut in grown if not any(other & cut == other for other in met)]
        cuts = _least({*met, *fresh}) if len(met) + len(fresh) <= 2000 else [*met, *fresh]
        if len(cuts) > MAX_CUTS:
            _refuse(network, "minimal cuts")
    return cuts


def _block(cuts: list[int], n_runs: int, wide: list[tuple[int, int, float]]) -> Block:
    """Cuts as arrays."""
    run_cuts = np.array([[cut >> i & 1 for i in range(n_runs)] for cut in cuts], np.float32)
    through = [[n for n in range(len(wide)) if cut >> (n_runs + n) & 1] for cut in cuts]
    loads = np.array([sum(wide[n][2] for n in links) for links in through], np.float32)
    return Block(run_cuts, loads, tuple(tuple(wide[n][:2] for n in links) for links in through))


def _refuse(network: FunctionNetwork, what: str) -> None:
    raise GraphError(
        Fault(
            "too-many-cuts",
            network.copy_id,
            f"more than {MAX_CUTS} {what} in one part of the network",
            "routes that share fewer elements",
            "split the function or shorten its routes",
        )
    )
