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
from byway.knowledge.damage.rows import gather_rows
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
    n_regions, n_elements = len(geometry.region_ids), len(geometry.element_ids)
    voxel_ml = geometry.grid.voxel_ml
    rows = index.row_of_voxel[voxels]
    rows, values = rows[rows >= 0], effects[rows >= 0]
    share, overlap = np.zeros(n_elements, np.float32), np.zeros(n_elements, np.float32)

    at, count = gather_rows(index.regions, rows)
    region = index.regions.members[at]
    weight = index.regions.weights[at] if index.regions.weights is not None else np.ones(len(at), np.float32)
    lost = np.bincount(region, weight * np.repeat(values, count), minlength=n_regions)
    share[:n_regions] = _ratio(lost, index.region_weight)
    overlap[:n_regions] = np.bincount(region, weight, minlength=n_regions) * voxel_ml

    at, _ = gather_rows(index.segments, rows)
    overlap += np.bincount(index.segments.members[at], minlength=n_elements) * voxel_ml

    cut = streamline_maxima(rows, values, index)
    severed = np.bincount(
        index.segment_of_streamline, geometry.streamline_weights * cut, minlength=len(geometry.segment_ids)
    )
    share[n_regions:] = _ratio(severed, index.segment_weight)
    return Damage(index, voxels, effects, np.minimum(share, 1), overlap)


def streamline_maxima(rows: NDArray[np.int32], values: NDArray[np.float32], index: DamageIndex) -> NDArray[np.float32]:
    """The largest D along every streamline, given D at rows of the index."""
    cut = np.zeros(len(index.geometry.streamline_weights), np.float32)
    if len(values) and values.min() != values.max():
        # Where several values land on one streamline the last one written stays, so the largest must come last.
        order = np.argsort(values, kind="stable")
        rows, values = rows[order], values[order]
    at, count = gather_rows(index.streamlines, rows)
    cut[index.streamlines.members[at]] = np.repeat(values, count)
    return cut


def _ratio(part: NDArray[Any], whole: NDArray[np.float64]) -> NDArray[np.float64]:
    """part / whole; 0 where there is nothing to be damaged."""
    return np.asarray(np.divide(part, whole, out=np.zeros(len(whole)), where=whole > 0))
