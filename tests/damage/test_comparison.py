"""Two anatomies side by side."""

from __future__ import annotations

import numpy as np
import pytest
from toy_space import toy_geometry

from byway.knowledge.damage.comparison import COMPARISON_COLUMNS, compared
from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.damage.point import point_damage
from byway.knowledge.faults import BywayError
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.lesion.shapes import sphere_mask
from byway.knowledge.space.geometry import Geometry


def test_only_elements_of_another_anatomy_are_compared(toy_index):
    """A bundle moved by 6 mm: its shares stand side by side, with the difference; all others are left out."""
    usual = toy_index.geometry
    fields = {k: v for k, v in toy_geometry().__dict__.items() if k in Geometry.__match_args__}
    points = usual.points_mm.copy()
    first, last = usual.streamline_offsets[usual.segment_offsets[:2]]
    points[first:last, 2] += 6
    at = usual.index_of[usual.segment_ids[0]]
    anatomy = tuple("P-07" if i == at else name for i, name in enumerate(usual.anatomy))
    own = DamageIndex.build(Geometry(**{**fields, "points_mm": points, "anatomy": anatomy}))
    middle = np.mean([line[len(line) // 2] for line in usual.streamlines(0)], axis=0)
    lesion = Lesion.from_mask(sphere_mask(middle - (0, 0, 6), 5))
    table = compared(point_damage(lesion, toy_index), point_damage(lesion, own))
    assert tuple(table.columns) == COMPARISON_COLUMNS
    assert table.element.tolist() == [usual.segment_ids[0]]
    row = table.iloc[0]
    assert (row.anatomy, row.own_anatomy) == ("template", "P-07")
    assert row.difference == row.own_share - row.share
    assert row.difference < 0
    assert row.own_clearance_mm > row.clearance_mm


def test_the_same_anatomy_has_nothing_to_compare(toy_index):
    """An empty table, with its columns."""
    damage = point_damage(Lesion.from_mask(sphere_mask((-40, -20, 15), 10)), toy_index)
    table = compared(damage, damage)
    assert table.empty
    assert tuple(table.columns) == COMPARISON_COLUMNS


def test_two_lesions_are_not_compared(toy_index):
    """Damage by another lesion is refused, since the difference would not be the anatomy's."""
    one, other = (point_damage(Lesion.from_mask(sphere_mask((-40, -20, 15), r)), toy_index) for r in (10, 8))
    with pytest.raises(BywayError, match="two lesions"):
        compared(one, other)
