"""Damage on template and own anatomy side by side."""

from __future__ import annotations

import numpy as np
import pytest

from byway.knowledge.damage.compare import COMPARE_COLUMNS, compare_damage
from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.damage.point import point_damage
from byway.knowledge.faults import BywayError
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.lesion.shapes import sphere_mask
from byway.knowledge.space.atlas import Template
from byway.knowledge.space.own import with_own
from byway.knowledge.space.own_bundles import OwnSegment

SEGMENT = "slf_2.middle@left"


def test_a_bundle_moved_out_of_the_lesion_loses_its_damage(template: Template, index: DamageIndex) -> None:
    """One row, for the moved segment: severed on the template, spared on own anatomy, the difference their minus."""
    number = template.geometry.segment_ids.index(SEGMENT)
    lines = [line + np.float32([0, 0, -60]) for line in template.geometry.streamlines(number)]
    core = np.ones(len(lines), bool)
    moved = OwnSegment(lines, core, np.ones(len(lines), np.float32), lines[0])
    own = DamageIndex.build(with_own(template, {SEGMENT: moved}, "own tractogram").geometry)
    lesion = Lesion.from_mask(sphere_mask(tuple(template.core_lines[SEGMENT][40].tolist()), 9))
    table = compare_damage(point_damage(lesion, index), point_damage(lesion, own))
    assert tuple(table.columns) == COMPARE_COLUMNS
    assert table["element"].tolist() == [SEGMENT]
    row = table.iloc[0]
    assert row["template_share"] > 0.8
    assert row["own_share"] == 0
    assert row["difference"] == pytest.approx(-row["template_share"])
    assert row["anatomy"] == "own tractogram"
    other = point_damage(Lesion.from_mask(sphere_mask((30, 0, 30), 5)), own)
    with pytest.raises(BywayError, match="the same lesion twice"):
        compare_damage(point_damage(lesion, index), other)
