"""Two anatomies side by side: what a lesion severs by the template's bundles, and by a site's or a person's own."""

from __future__ import annotations

import numpy as np
import pandas as pd

from byway.knowledge.damage.point import Damage
from byway.knowledge.faults import BywayError, Fault

__all__ = ["COMPARISON_COLUMNS", "compared"]

COMPARISON_COLUMNS = (
    "element",
    "kind",
    "anatomy",
    "share",
    "clearance_mm",
    "own_anatomy",
    "own_share",
    "own_clearance_mm",
    "difference",
)


def compared(template: Damage, own: Damage) -> pd.DataFrame:
    """Damage by two geometries of the same lesion.

    Parameters
    ----------
    template, own : Damage
        Of one lesion, by the usual geometry and by another.

    Returns
    -------
    DataFrame
        One row for each element that both have and whose anatomy differs, the largest difference first:
        ``element``, ``kind``, ``anatomy`` and ``own_anatomy`` (whose), the shares and clearances of both, and
        ``difference`` (own less usual). Elements that rest on the same anatomy in both are left out.

    Raises
    ------
    BywayError
        The two are not by the same lesion.
    """
    if not (np.array_equal(template.voxels, own.voxels) and np.array_equal(template.effects, own.effects)):
        raise BywayError(Fault("compared-lesions", "compared", "damage by two lesions", "one lesion on two anatomies"))
    columns = ["element", "kind", "anatomy", "share", "clearance_mm"]
    usual, other = template.table()[columns], own.table()[columns].drop(columns="kind")
    other = other.rename(columns={name: f"own_{name}" for name in columns[2:]})
    both = usual.merge(other, on="element", validate="one_to_one")
    both = both[both["anatomy"] != both["own_anatomy"]]
    both = both.assign(difference=both["own_share"] - both["share"])
    order = both["difference"].abs().sort_values(ascending=False, kind="stable").index
    return both.loc[order, list(COMPARISON_COLUMNS)].reset_index(drop=True)
