"""Point estimates: lost share, severed share, overlap and clearance of every element."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from byway.knowledge.damage.clearance import clearance_mm
from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.damage.rows import gather_rows, stretches
from byway.knowledge.damage.tables import damage_frame
from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.lesion.lesion import Lesion

__all__ = ["Damage", "effect_voxels", "point_damage"]


@dataclass(frozen=True, eq=False)
class Damage:
    """Damage of every element by one lesion, regions first, then segments.

    Parameters
    ----------
    index : DamageIndex
        The geometry that it was reckoned on.
    voxels, effects : (L,) int64, (L,) float32
        The lesion: C-order indices of voxels with D > 0 (ascending) and D there.
    share : (E,) float32
        Lost share of regions and severed share of segments, in [0, 1].
    overlap_ml : (E,) float32
        Volume of the lesion (D > 0) within the parcel, or within voxels that the bundle passes, ml.
    """

    index: DamageIndex
    voxels: NDArray[np.int64] = field(repr=False)
    effects: NDArray[np.float32] = field(repr=False)
    share: NDArray[np.float32] = field(repr=False)
    overlap_ml: NDArray[np.float32] = field(repr=False)

    @property
    def element_ids(self) -> tuple[str, ...]:
        """Element ids ``key@side``, in the order of the arrays."""
        return self.index.geometry.element_ids

    @cached_property
    def clearance_mm(self) -> NDArray[np.float32]:
        """(E,) signed distance in mm from the lesion's edge to the nearest core streamline, or parcel voxel.

        Reckoned when first asked for. Negative inside; NaN where there is no lesion or the element has no core.
        """
        return clearance_mm(self.voxels, self.index)

    def of(self, element: str) -> float:
        """Share of one element, by id ``key@side``."""
        return float(self.share[self.index.geometry.index_of[element]])

    def table(
        self,
        interval: tuple[NDArray[np.floating], NDArray[np.floating]] | None = None,
        *,
        names: Mapping[str, str] | None = None,
        clearance: bool = True,
    ) -> pd.DataFrame:
        """One row an element, most damaged first; see :func:`byway.knowledge.damage.tables.damage_frame`.

        Without ``clearance`` its column is NaN unless it was reckoned before, which spares tens of milliseconds.
        """
        geometry = self.index.geometry
        known = clearance or "clearance_mm" in self.__dict__
        distance = self.clearance_mm if known else np.full(len(self.share), np.nan, np.float32)
        return damage_frame(geometry, self.share, self.overlap_ml, distance, interval, names)


def effect_voxels(lesion: Lesion | NDArray[np.floating]) -> tuple[NDArray[np.int64], NDArray[np.float32]]:
    """Voxels with D > 0 (C order, ascending) of a lesion or of an effect map, and D there."""
    if isinstance(lesion, Lesion):
        return lesion.effect_voxels
    flat = np.asarray(lesion).reshape(-1)
    voxels = np.flatnonzero(flat)
    return voxels, flat[voxels].astype(np.float32)


def point_damage(lesion: Lesion | NDArray[np.floating], index: DamageIndex) -> Damage:
    """Damage of every element by a lesion.

    Parameters
    ----------
    lesion : Lesion, or float array in [0, 1] of the grid's shape
        The lesion or its effect map D.
    index : DamageIndex
        Inverted geometry.

    Returns
    -------
    Damage

    Raises
    ------
    BywayError
        An effect map that does not fit the grid or leaves [0, 1].

    Notes
    -----
    The severed share of segment g is ``sum_s w_s max_{x in s} D(x) / sum_s w_s`` over its streamlines s; the lost
    share of region r is ``sum_x p_x D(x) / sum_x p_x`` over its parcel with memberships p. Both are read at the voxel
    that holds the point. Cost follows the lesion's size, not the brain's.
    """
    geometry = index.geometry
    if not isinstance(lesion, Lesion) and np.asarray(lesion).shape != geometry.grid.shape:
        raise BywayError(Fault("effect-map", "lesion", f"an effect map of shape {np.asarray(lesion).shape}",
                               f"shape {geometry.grid.shape}"))  # fmt: skip
    voxels, effects = effect_voxels(lesion)
    if len(effects) and not (effects.min() >= 0 and effects.max() <= 1):
        raise BywayError(Fault("effect-map", "lesion", f"effects from {effects.min():g} to {effects.max():g}",
                               "effects between 0 and 1"))  # fmt: skip
    rows = index.row_of_voxel[voxels]
    known = rows >= 0
    rows, values = rows[known], effects[known]
    uniform = len(values) > 0 and index.members.weights is None and values.min() == values.max()
    sums, volumes, cut = _uniform(rows, values[0], index) if uniform else _graded(rows, values, index)
    share = np.concatenate([_ratio(sums, index.region_weight), index.severed(cut)])
    overlap = volumes[: len(geometry.element_ids)] * index.voxel_ml
    return Damage(index, voxels, effects, np.minimum(share, 1).astype(np.float32), overlap.astype(np.float32))


_Sums = tuple[NDArray[Any], NDArray[Any], NDArray[Any]]


def _uniform(rows: NDArray[np.int32], value: np.float32, index: DamageIndex) -> _Sums:
    """As :func:`_graded` for one value of D and parcels without grades: counting is enough."""
    n_regions, n_elements = len(index.geometry.region_ids), len(index.geometry.element_ids)
    members = index.members.members[stretches(index.members.offsets, rows)]
    counts = np.bincount(members, minlength=n_elements + len(index.geometry.core))
    return counts[:n_regions] * np.float64(value), counts[:n_elements], (counts[n_elements:] > 0) * value


def _graded(rows: NDArray[np.int32], values: NDArray[np.float32], index: DamageIndex) -> _Sums:
    """Sums of D over each parcel, volumes of the lesion in each element (voxels), largest D along each streamline."""
    n_regions, n_elements = len(index.geometry.region_ids), len(index.geometry.element_ids)
    if len(values) and values.min() != values.max():
        # Where several values land on one streamline the last one written stays, so the largest must come last.
        order = np.argsort(values, kind="stable")
        rows, values = rows[order], values[order]
    at, count = gather_rows(index.members, rows)
    members, effect = index.members.members[at], np.repeat(values, count)
    weight = None if index.members.weights is None else index.members.weights[at]
    largest = np.zeros(n_elements + len(index.geometry.core), np.float32)
    largest[members] = effect
    in_element = members < n_elements
    members, effect = members[in_element], effect[in_element]
    weight = None if weight is None else weight[in_element]
    weighted = effect if weight is None else effect * weight
    sums = np.bincount(members, weighted, minlength=n_elements)
    return sums[:n_regions], np.bincount(members, weight, minlength=n_elements), largest[n_elements:]


def _ratio(part: NDArray[Any], whole: NDArray[np.float64]) -> NDArray[np.float64]:
    """part / whole; 0 where there is nothing to be damaged."""
    return np.asarray(np.divide(part, whole, out=np.zeros(len(whole)), where=whole > 0))
