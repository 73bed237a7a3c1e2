"""Template and own anatomy side by side: how the damage of each element changes with whose anatomy it rests on."""

from __future__ import annotations

import numpy as np
import pandas as pd

from byway.knowledge.damage.point import Damage
from byway.knowledge.faults import BywayError, Fault

__all__ = ["COMPARE_COLUMNS", "compare_damage"]

COMPARE_COLUMNS = (
    "element",
    "kind",
    "anatomy",
    "template_share",
    "own_share",
    "difference",
    "template_overlap_ml",
    "own_overlap_ml",
)


def compare_damage(template: Damage, own: Damage) -> pd.DataFrame:
    """Damage by one lesion on the template and on own anatomy, for every element whose anatomy differs.

    Parameters
    ----------
    template, own : Damage
        Damage by the same lesion, on the template and on a template with own elements.

    Returns
    -------
    DataFrame
        One row an element, the largest difference first: ``element``, ``kind``, ``anatomy`` (whose the own one is),
        ``template_share`` and ``own_share`` (lost or severed share in [0, 1]), ``difference`` (own less template),
        ``template_overlap_ml`` and ``own_overlap_ml``.

    Raises
    ------
    BywayError
        If the two are not by the same lesion, or not of the same elements.
    """
    if not (np.array_equal(template.voxels, own.voxels) and np.array_equal(template.effects, own.effects)):
        raise BywayError(Fault("compare-lesion", "compare_damage", "damage by two lesions", "the same lesion twice"))
    if template.element_ids != own.element_ids:
        raise BywayError(
            Fault("compare-elements", "compare_damage", "two sets of elements", "own elements on the same graph")
        )
    base, mine = template.index.geometry, own.index.geometry
    differs = np.array([a != b for a, b in zip(base.anatomy, mine.anatomy, strict=True)], bool)
    which = np.flatnonzero(differs)
    frame = pd.DataFrame(
        {
            "element": [own.element_ids[i] for i in which],
            "kind": ["region" if i < len(base.region_ids) else "segment" for i in which],
            "anatomy": [mine.anatomy[i] for i in which],
            "template_share": template.share[which].astype(float),
            "own_share": own.share[which].astype(float),
            "difference": own.share[which].astype(float) - template.share[which],
            "template_overlap_ml": template.overlap_ml[which].astype(float),
            "own_overlap_ml": own.overlap_ml[which].astype(float),
        },
        columns=list(COMPARE_COLUMNS),
    )
    order = np.argsort(-frame["difference"].abs().to_numpy(), kind="stable")
    return frame.iloc[order].reset_index(drop=True)
