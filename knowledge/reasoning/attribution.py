"""Which damaged element an account rests on: how the signs would change were one of them intact, or alone damaged."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from byway.knowledge.graph.networks import FunctionNetwork
from byway.knowledge.reasoning.posterior import Reckoning
from byway.knowledge.reasoning.prepared import CopyTable
from byway.knowledge.reasoning.scenarios import Scenario, setting_of
from byway.knowledge.reasoning.signs import LossCache

__all__ = ["LEAST_SHARE", "Attribution", "Bottleneck", "attribute", "bottlenecks"]

Array = NDArray[np.float32]

LEAST_SHARE = 0.02
"""An element that accounts for less than this share of what an account explains is not named."""

_DAMAGED = 0.02  # mean damage from which an element is asked about
_NAMED = 0.1  # mean damage from which an element is named in a bottleneck


@dataclass(frozen=True, eq=False)
class Attribution:
    """Contribution of every damaged element to some signs, in one scenario.

    Parameters
    ----------
    elements, signs : tuple of str
        Damaged element ids and sign ids.
    expected, intact : (n_signs,) float
        P(sign) as it stands, and with all these elements intact; means over the draws.
    restored, alone : (n_elements, n_signs) float
        P(sign) with one element made intact, and with that element alone damaged.
    """

    elements: tuple[str, ...]
    signs: tuple[str, ...]
    expected: NDArray[np.float64]
    intact: NDArray[np.float64]
    restored: NDArray[np.float64]
    alone: NDArray[np.float64]

    @property
    def change(self) -> NDArray[np.float64]:
        """How P(sign) would change were one element intact, (n_elements, n_signs); negative: less likely."""
        return self.restored - self.expected

    @property
    def contribution(self) -> NDArray[np.float64]:
        """Mean of what an element adds first (alone) and last (on top of all others), never below 0."""
        added: NDArray[np.float64] = ((self.alone - self.intact) + (self.expected - self.restored)) / 2
        return np.maximum(added, 0.0)

    def ordered(self, signs: list[str], least: float = LEAST_SHARE) -> list[tuple[str, float]]:
        """Elements with their share of the contribution to some signs, largest first."""
        columns = [self.signs.index(sign) for sign in signs if sign in self.signs]
        total = self.contribution[:, columns].sum(axis=1)
        if not columns or total.sum() < 0.02:
            return []
        shares = total / total.sum()
        order = sorted(range(len(self.elements)), key=lambda i: (-shares[i], self.elements[i]))
        return [(self.elements[i], float(shares[i])) for i in order if shares[i] >= least]

    def table(self, signs: list[str], least: float = 0.02) -> pd.DataFrame:
        """``element``, ``sign``, ``side``, ``change`` for some signs, changes below ``least`` left out."""
        rows = []
        for sign in signs:
            if sign not in self.signs:
                continue
            column = self.signs.index(sign)
            rows += [(element, sign.rpartition("@")[0], sign.rpartition("@")[2], float(self.change[i, column]))
                     for i, element in enumerate(self.elements) if abs(self.change[i, column]) >= least]  # fmt: skip
        rows.sort(key=lambda row: row[3])
        return pd.DataFrame(rows, columns=["element", "sign", "side", "change"])


@dataclass(frozen=True)
class Bottleneck:
    """What holds one function back in one scenario.

    Parameters
    ----------
    copy_id : str
        Function copy.
    network : FunctionNetwork
        Its network in that scenario.
    capacity : float
        Mean capacity over the draws, in [0, 1].
    elements : tuple of str
        The damaged elements of the cut that attains the minimum, at the mean damage.
    damage : (n_elements,) float32
        Mean damage of the network's own elements.
    """

    copy_id: str
    network: FunctionNetwork
    capacity: float
    elements: tuple[str, ...]
    damage: Array


def attribute(reckoning: Reckoning, scenario: Scenario, signs: tuple[str, ...]) -> Attribution:
    """Contributions of all damaged elements to some signs.

    Elements whose mean damage is below 0.02 count as intact ones that are not asked about.
    """
    setting = setting_of(scenario)
    tables = reckoning.prepared.tables[scenario.dominance, scenario.reliance]
    models = [reckoning.model(setting, sign) for sign in signs]
    copies = dict.fromkeys(copy for model in models for copy in model.copies)
    damage = reckoning.damage_of(scenario)
    mean = damage.mean(axis=0)
    asked = sorted({int(row) for copy in copies for row in tables[copy].rows if mean[row] >= _DAMAGED})
    at = {row: i for i, row in enumerate(asked)}
    base: dict[str, Array] = {}
    restored: dict[str, Array] = {}
    alone: dict[str, Array] = {}
    for copy in copies:
        table = tables[copy]
        own = damage[:, table.rows]
        if not own.any():
            continue
        base[copy] = table.cuts.capacity(own, reckoning.headroom)
        restored[copy], alone[copy] = _one_by_one(table, own, base[copy], at, reckoning.headroom)
    if not base:
        leaks = np.array([model.tail(0, LossCache({})) for model in models])
        nothing = np.zeros((0, len(signs)))
        return Attribution((), signs, leaks, leaks, nothing, nothing)
    rate = reckoning.outside_rates[0] if scenario.outside == "yes" else 0.0

    def presence(capacities: dict[str, Array]) -> NDArray[np.float64]:
        losses = LossCache(capacities)
        columns = [np.broadcast_to(np.atleast_1d(model.tail(0, losses)).mean(axis=-1), shape) for model in models]
        return 1.0 - (1.0 - np.stack(columns, axis=-1).astype(float)) * (1.0 - rate)

    shape: tuple[int, ...] = ()
    expected, intact = presence(base), presence({})
    shape = (len(asked),)
    elements = tuple(reckoning.prepared.element_ids[row] for row in asked)
    return Attribution(elements, signs, expected, intact, presence(restored), presence(alone))


def bottlenecks(reckoning: Reckoning, scenario: Scenario, copies: list[str], below: float = 0.95) -> list[Bottleneck]:
    """What holds each of some function copies back, least capacity first; copies that keep ``below`` are left out."""
    tables = reckoning.prepared.tables[scenario.dominance, scenario.reliance]
    damage = reckoning.damage_of(scenario)
    found = []
    for copy in copies:
        table = tables[copy]
        own = damage[:, table.rows]
        if not own.any():
            continue
        capacity = float(table.cuts.capacity(own, reckoning.headroom).mean())
        if capacity >= below:
            continue
        mean = own.mean(axis=0)
        _, named = table.cuts.bottleneck(mean, reckoning.headroom)
        network = table.cuts.network
        elements = tuple(network.elements[i] for i in named if mean[i] >= _NAMED)
        found.append(Bottleneck(copy, network, capacity, elements, mean))
    return sorted(found, key=lambda each: each.capacity)


def _one_by_one(
    table: CopyTable, own: Array, base: Array, at: dict[int, int], headroom: float
) -> tuple[Array, Array]:
    """Capacity of a copy, (n_asked, M), with each asked element made intact, and with it alone damaged."""
    n_draws = own.shape[0]
    columns = [(column, at[int(row)]) for column, row in enumerate(table.rows) if int(row) in at]
    restored = np.tile(base, (len(at), 1))
    alone = np.ones((len(at), n_draws), np.float32)
    if columns:
        states = np.tile(own, (len(columns), 1, 1))
        single = np.zeros_like(states)
        for i, (column, _) in enumerate(columns):
            states[i, :, column] = 0.0
            single[i, :, column] = own[:, column]
        asked = [row for _, row in columns]
        shape = (len(columns), n_draws)
        restored[asked] = table.cuts.capacity(states.reshape(-1, own.shape[1]), headroom).reshape(shape)
        alone[asked] = table.cuts.capacity(single.reshape(-1, own.shape[1]), headroom).reshape(shape)
    return restored, alone
