"""Damage as a table."""

from __future__ import annotations

import numpy as np

from byway.knowledge.damage.ensemble import EnsembleSettings, ensemble
from byway.knowledge.damage.point import point_damage
from byway.knowledge.damage.tables import DAMAGE_COLUMNS
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.lesion.shapes import sphere_mask

LESION = Lesion.from_mask(sphere_mask((-40, -20, 15), 14))


def test_one_row_an_element_most_damaged_first(toy_index):
    """All elements, with the columns that screens read; bounds are NaN while they are not reckoned."""
    damage = point_damage(LESION, toy_index)
    table = damage.table(names={"ball_0": "A ball"})
    assert tuple(table.columns) == DAMAGE_COLUMNS
    assert sorted(table.element) == sorted(damage.element_ids)
    assert (np.diff(table.share) <= 0).all()
    assert table.low.isna().all()
    assert set(table.kind) == {"region", "segment"}
    assert set(table[table.element.str.startswith("ball_0")].name) == {"A ball"}
    assert (table.anatomy == "template").all()
    row = table[table.element == "tube.part_1@left"].iloc[0]
    assert row.side == "left"
    assert row.share == damage.of("tube.part_1@left")


def test_intervals_stand_beside_the_shares(toy_index):
    """Each bound belongs to its element."""
    found = ensemble(LESION, toy_index, EnsembleSettings(draws=20))
    low, high = found.interval()
    table = point_damage(LESION, toy_index).table(found.interval()).set_index("element")
    for i, element in enumerate(found.element_ids):
        assert table.low[element] == np.float64(low[i])
        assert table.high[element] == np.float64(high[i])


def test_clearance_can_wait(toy_index):
    """Without it the column is NaN, until it was reckoned once."""
    damage = point_damage(LESION, toy_index)
    assert damage.table(clearance=False).clearance_mm.isna().all()
    known = damage.table().clearance_mm
    np.testing.assert_array_equal(damage.table(clearance=False).clearance_mm, known)
