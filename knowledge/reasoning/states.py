"""Damage under every scenario: which damage speaks, perilesional tissue, remote effects, boundary."""

from __future__ import annotations

import itertools
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.reasoning.prepared import CopyTable, Prepared
from byway.knowledge.reasoning.scenarios import AXES, Scenario

__all__ = ["STATES", "STATE_AXES", "TOUCHED", "DamageStates", "cut_outside_ends", "damage_states", "state_number"]

Array = NDArray[np.float32]

STATE_AXES = ("speaks", "perilesional", "remote", "boundary")
STATES: tuple[tuple[str, ...], ...] = tuple(itertools.product(*(AXES[axis] for axis in STATE_AXES)))
"""The 36 ways to read the damage, in the order in which scenarios are numbered."""

TOUCHED = 1e-3
"""Elements whose damage stays below this in every draw of every variant count as untouched."""


@dataclass(frozen=True, eq=False)
class DamageStates:
    """Damage of the touched elements in every state and draw.

    Parameters
    ----------
    rows : dict
        Element number to its row in ``damage``; elements without a row are untouched.
    damage : (n_rows, 36, M) float32
        Damage in [0, 1].
    """

    rows: dict[int, int]
    damage: Array

    @property
    def n_draws(self) -> int:
        """Draws of the ensemble."""
        return int(self.damage.shape[2])

    def of_copy(self, table: CopyTable) -> Array | None:
        """Damage of a function copy's elements, (36 * M, n_elements); None where all are untouched."""
        found = [self.rows.get(int(element)) for element in table.rows]
        if all(row is None for row in found):
            return None
        block = np.zeros((len(found), self.damage.shape[1] * self.damage.shape[2]), np.float32)
        for i, row in enumerate(found):
            if row is not None:
                block[i] = self.damage[row].ravel()
        return block.T

    def of_scenario(self, scenario: Scenario, n_elements: int) -> Array:
        """Damage of all elements in one scenario: (M, n_elements)."""
        full = np.zeros((self.n_draws, n_elements), np.float32)
        state = state_number(scenario)
        for element, row in self.rows.items():
            full[:, element] = self.damage[row, state]
        return full


def state_number(scenario: Scenario) -> int:
    """Number of the state that a scenario reads the damage by.

    >>> state_number(Scenario()), state_number(Scenario(boundary="too_large"))
    (0, 2)
    """
    return STATES.index(tuple(getattr(scenario, axis) for axis in STATE_AXES))


def damage_states(prepared: Prepared, draws: Mapping[str, NDArray[np.floating]]) -> DamageStates:
    """Damage in all 36 states.

    Parameters
    ----------
    draws : mapping
        ``as_drawn``, ``too_small``, ``too_large`` and ``perilesional``: (M, n_elements) damage in [0, 1]; draw ``m``
        is the same virtual anatomy in all of them. ``too_small`` means that the drawing is too small: its damage is
        that of a larger lesion.

    Raises
    ------
    BywayError
        A variant is missing, or has another shape.
    """
    boundaries = _variants(prepared, draws)
    rim = boundaries.pop("perilesional")
    base = [np.maximum(boundaries[boundary], rim) if perilesional == "yes" else boundaries[boundary]
            for perilesional in AXES["perilesional"] for boundary in AXES["boundary"]]  # fmt: skip
    stacked = np.ascontiguousarray(np.stack(base).transpose(2, 0, 1))  # (elements, perilesional x boundary, draws)
    stacked[stacked.max(axis=(1, 2)) < TOUCHED] = 0.0
    n_elements, _, n_draws = stacked.shape
    spoken: dict[str, Array] = {"both": stacked}
    spoken["cortical"] = stacked * prepared.is_region[:, None, None]
    spoken["segments"] = cut_outside_ends(prepared, stacked)
    silenced = {value: prepared.remote.silenced(damage.reshape(n_elements, -1)) for value, damage in spoken.items()}
    touched = set(np.flatnonzero(stacked.any(axis=(1, 2))).tolist()).union(*silenced.values())
    rows = {int(element): row for row, element in enumerate(sorted(touched))}
    kept = sorted(touched)
    shape = tuple(len(AXES[axis]) for axis in STATE_AXES)
    damage = np.empty((len(rows), *shape, n_draws), np.float32)
    for s, value in enumerate(AXES["speaks"]):
        own = spoken[value][kept].reshape(len(kept), shape[1], shape[3], n_draws)
        damage[:, s, :, 0] = own
        damage[:, s, :, 1] = own
        for element, extended in silenced[value].items():
            damage[rows[element], s, :, 1] = extended.reshape(shape[1], shape[3], n_draws)
    return DamageStates(rows, damage.reshape(len(rows), len(STATES), n_draws))


def cut_outside_ends(prepared: Prepared, damage: Array) -> Array:
    """Damage of segments beyond what the loss of the regions at their ends implies; regions count as intact.

    Streamlines end inside the regions that they join, so a region that is partly lost takes about that share of them
    with it: that is damage of grey matter, not a cut. With ``a`` and ``b`` the lost shares of the two ends, what is
    cut elsewhere is ``1 - (1 - severed) / ((1 - a) * (1 - b))``, never below 0.

    Parameters
    ----------
    damage : (n_elements, ...) float32
        Damage of all elements in [0, 1], element-major.
    """
    outside = np.zeros_like(damage)
    for segment, ends in prepared.ends_of.items():
        severed = damage[segment]
        if not severed.any():
            continue
        left = np.ones_like(severed)
        for region in ends:
            left *= np.float32(1.0) - damage[region]
        kept = (np.float32(1.0) - severed) / np.maximum(left, np.float32(1e-6))
        outside[segment] = np.clip(np.float32(1.0) - kept, 0.0, 1.0)
    return outside


def _variants(prepared: Prepared, draws: Mapping[str, NDArray[np.floating]]) -> dict[str, Array]:
    """The four variants as float32 arrays, checked."""
    wanted = (*AXES["boundary"], "perilesional")
    missing = [name for name in wanted if name not in draws]
    if missing:
        raise BywayError(Fault("draws", "ensemble", f"no variant {', '.join(missing)}", ", ".join(wanted)))
    arrays = {name: np.asarray(draws[name], np.float32) for name in wanted}
    shape = arrays["as_drawn"].shape
    for name, array in arrays.items():
        if array.shape != shape or array.ndim != 2 or shape[1] != len(prepared.element_ids):
            expected = f"(draws, {len(prepared.element_ids)}) like as_drawn {shape}"
            raise BywayError(Fault("draws", f"ensemble variant {name}", f"shape {array.shape}", expected))
        if not np.isfinite(array).all() or array.min(initial=0.0) < 0.0 or array.max(initial=0.0) > 1.0 + 1e-5:
            raise BywayError(Fault("draws", f"ensemble variant {name}", "values outside [0, 1]", "shares"))
    return arrays
