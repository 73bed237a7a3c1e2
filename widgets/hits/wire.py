"""Damage as one small buffer: five float32 numbers an element, in the order of the geometry."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["elements_of", "values_of"]


def values_of(
    damage: Any, interval: tuple[NDArray[np.floating], NDArray[np.floating]] | None = None
) -> NDArray[np.float32]:
    """(E, 5) float32: share, low, high, overlap in ml, clearance in mm; NaN where not known yet.

    Parameters
    ----------
    damage : Damage
        Point estimates.
    interval : pair of (E,) arrays, optional
        Bounds of the share.
    """
    values = np.full((len(damage.share), 5), np.nan, np.float32)
    values[:, 0] = damage.share
    if interval is not None:
        values[:, 1], values[:, 2] = interval
    values[:, 3] = damage.overlap_ml
    values[:, 4] = damage.clearance_mm
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
