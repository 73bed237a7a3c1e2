"""Damage as one small buffer: five float32 numbers an element, in the order of the geometry."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["elements_of", "values_of"]


def values_of(damage: Any, clearance_mm: NDArray[np.float32] | None = None) -> NDArray[np.float32]:
    """(E, 5) float32: share, low, high, overlap in ml, clearance in mm; the interval is NaN: not known yet.

    Parameters
    ----------
    damage : Damage
        Point estimates.
    clearance_mm : (E,) float32, optional
        Shown in place of the damage's own clearance, which takes as long to reckon as all else together.
    """
    values = np.full((len(damage.share), 5), np.nan, np.float32)
    values[:, 0] = damage.share
    values[:, 3] = damage.overlap_ml
    values[:, 4] = damage.clearance_mm if clearance_mm is None else clearance_mm
    return values


def elements_of(geometry: Any, names: Mapping[str, str]) -> list[list[str]]:
    """Id, kind, name, side and anatomy of every element, in the order of the geometry."""
    n_regions = len(geometry.region_ids)
    rows = []
    for i, element in enumerate(geometry.element_ids):
        key, _, side = element.rpartition("@")
        kind = "region" if i < n_regions else "segment"
        rows.append([element, kind, names.get(key, key), side, geometry.anatomy[i]])
    return rows
