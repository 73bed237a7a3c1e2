"""Whose anatomy: the template's and a case's own side by side, with what each says of the lesion."""

from __future__ import annotations

from functools import lru_cache

import pandas as pd

from byway.knowledge.cases.case import Case
from byway.knowledge.cases.desk import Desk
from byway.knowledge.cases.explaining import desk_of, element_names
from byway.knowledge.damage.comparison import COMPARISON_COLUMNS, compared
from byway.knowledge.damage.point import Damage, point_damage
from byway.knowledge.faults import CaseError, Fault
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.space.own import compare_anatomies

__all__ = ["ANATOMIES_COLUMNS", "anatomies_of", "anatomies_of_case"]

ANATOMIES_COLUMNS = (*COMPARISON_COLUMNS[:2], "name", "side", *COMPARISON_COLUMNS[2:], "template_size", "own_size",
                     "apart_mm")  # fmt: skip


def anatomies_of(lesion: Lesion, desk: Desk, own: Damage | None = None) -> pd.DataFrame:
    """What a lesion does to each element of own anatomy, by the template and by the own.

    Parameters
    ----------
    lesion : Lesion
        The lesion.
    desk : Desk
        With own anatomy; without any the table is empty.
    own : Damage, optional
        Of that lesion on that desk, where it is known already.

    Returns
    -------
    DataFrame
        The columns of :func:`~byway.knowledge.damage.comparison.compared`, ``name`` and ``side``, and those of
        :func:`~byway.knowledge.space.own.compare_anatomies`: ``template_size`` and ``own_size`` (median length of
        streamlines in mm, or parcel in ml), ``apart_mm`` (median distance of the own from the template's). The
        largest difference in share comes first.
    """
    if desk.usual is None:
        return pd.DataFrame(columns=list(ANATOMIES_COLUMNS))
    own = own if own is not None else point_damage(lesion, desk.index)
    table = compared(point_damage(lesion, desk.usual.index), own)
    table = table.merge(_shapes(desk), on="element", validate="one_to_one")
    names = element_names(desk.graph)
    parts = table["element"].str.partition("@")
    table = table.assign(name=parts[0].map(names), side=parts[2])
    return table[list(ANATOMIES_COLUMNS)]


@lru_cache(maxsize=4)
def _shapes(desk: Desk) -> pd.DataFrame:
    """How the own elements lie against the template's: the same for every lesion."""
    assert desk.usual is not None
    table = compare_anatomies(desk.usual.template, desk.template)
    return table[["element", "template_size", "own_size", "apart_mm"]]


def anatomies_of_case(case: Case, *, desk: Desk | None = None) -> pd.DataFrame:
    """The comparison for a case's own anatomy and its lesion; see :func:`anatomies_of`.

    Raises
    ------
    CaseError
        The case brings no anatomy of its own.
    """
    if not case.spec.anatomy:
        raise CaseError(Fault("no-anatomy", str(case.path), "no anatomy of its own", "`anatomy:` with a name, a kind "
                              "and a folder each", "add it to case.yaml; the README says how"))  # fmt: skip
    return anatomies_of(case.lesion, desk or desk_of(case))
