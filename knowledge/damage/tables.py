"""Damage as tables: the columns that screens, reports and notebooks read."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from byway.knowledge.space.geometry import Geometry

__all__ = ["DAMAGE_COLUMNS", "damage_frame"]

DAMAGE_COLUMNS = (
    "element",
    "kind",
    "name",
    "side",
    "share",
    "low",
    "high",
    "overlap_ml",
    "clearance_mm",
    "anatomy",
)  # fmt: skip


def damage_frame(
    geometry: Geometry,
    share: NDArray[np.floating],
    overlap_ml: NDArray[np.floating],
    clearance_mm: NDArray[np.floating],
    interval: tuple[NDArray[np.floating], NDArray[np.floating]] | None = None,
    names: Mapping[str, str] | None = None,
) -> pd.DataFrame:
    """One row an element, most damaged first, then nearest first.

    Parameters
    ----------
    geometry : Geometry
        Gives the ids, and whose anatomy each rests on.
    share, overlap_ml, clearance_mm : (E,) arrays
        Lost or severed share in [0, 1], overlap in ml, clearance in mm.
    interval : pair of (E,) arrays, optional
        Lower and upper bound of the share; the columns are NaN without it.
    names : mapping of key to name, optional
        Names by bare key; the key stands in where there is none.

    Returns
    -------
    DataFrame
        Columns ``element`` (``key@side``), ``kind`` (region, segment), ``name``, ``side``, ``share``, ``low``,
        ``high``, ``overlap_ml``, ``clearance_mm``, ``anatomy`` (whose).
    """
    ids = geometry.element_ids
    unknown = np.full(len(ids), np.nan)
    low, high = (unknown, unknown) if interval is None else interval
    keys = [element.rsplit("@", 1) for element in ids]
    frame = pd.DataFrame(
        {
            "element": ids,
            "kind": ["region"] * len(geometry.region_ids) + ["segment"] * len(geometry.segment_ids),
            "name": [(names or {}).get(key, key) for key, _ in keys],
            "side": [side for _, side in keys],
            "share": np.asarray(share, float),
            "low": np.asarray(low, float),
            "high": np.asarray(high, float),
            "overlap_ml": np.asarray(overlap_ml, float),
            "clearance_mm": np.asarray(clearance_mm, float),
            "anatomy": geometry.anatomy,
        },
        columns=list(DAMAGE_COLUMNS),
    )
    return frame.sort_values(["share", "clearance_mm", "element"], ascending=[False, True, True], ignore_index=True)
