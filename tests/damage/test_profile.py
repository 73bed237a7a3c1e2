"""Along-course profiles."""

from __future__ import annotations

import numpy as np
import pytest

from byway.knowledge.damage.profile import PROFILE_COLUMNS, PROFILE_FACTS, course_profile, profile_facts
from byway.knowledge.faults import BywayError
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.lesion.shapes import sphere_mask
from byway.knowledge.space.geometry import Geometry
from byway.knowledge.space.grid import TEMPLATE_GRID


def straight() -> Geometry:
    """Ten straight streamlines of 60 mm along y, 1 mm apart along z, from y = -30 to 30 at x = -40."""
    y = np.arange(-30.0, 30.5, 0.5)
    lines = [np.stack([np.full_like(y, -40), y, np.full_like(y, z)], axis=1) for z in range(10)]
    n = len(y)
    return Geometry(
        grid=TEMPLATE_GRID,
        region_ids=(),
        segment_ids=("line.whole@left",),
        region_voxels=np.empty(0, np.int32),
        region_weights=np.empty(0, np.float32),
        region_offsets=np.zeros(1, np.int64),
        points_mm=np.concatenate(lines).astype(np.float32),
        streamline_offsets=np.arange(11) * n,
        segment_offsets=np.array([0, 10]),
        core=np.ones(10, bool),
        streamline_weights=np.ones(10, np.float32),
        spread_mm=np.ones(1, np.float32),
        anatomy=("template",),
        content_hash="by hand",
    )


def test_damage_is_told_where_it_sits():
    """A slab over y = 10 to 14 and the lower four lines: 40 to 44 mm from the start, a share of 0.4."""
    mask = np.zeros(TEMPLATE_GRID.shape, bool)
    mask[55:62, 134 + 10 : 134 + 15, 72:76] = True
    profile = course_profile(Lesion.from_mask(mask, effect=0.5), straight(), "line.whole", "left", bin_mm=1.0)
    assert tuple(profile.columns) == PROFILE_COLUMNS
    hit = profile[profile.share_hit > 0]
    assert hit.share_hit.max() == pytest.approx(0.4)
    assert hit.mean_effect.max() == pytest.approx(0.2)
    # Voxels reach half a millimetre beyond their centres: y from 9.5 to 14.5, bins from 39 to 45 mm.
    assert hit.from_start_mm.min() == pytest.approx(39.5, abs=0.51)
    assert hit.from_start_mm.max() == pytest.approx(44.5, abs=0.51)
    np.testing.assert_allclose(profile.from_start_mm + profile.from_end_mm, 60)
    assert profile.attrs == {"element": "line.whole@left", "length_mm": 60.0}


def test_an_unhurt_course_is_flat():
    """All shares are 0, and every bin holds every streamline."""
    profile = course_profile(Lesion(), straight(), "line.whole@left")
    assert not profile.share_hit.any()
    assert (profile.streamlines == 10).all()
    assert len(profile) == 60


def test_a_profile_on_the_template_peaks_under_the_lesion(template):
    """A ball on the middle of a core line hits most where the line runs, and nothing at the ends."""
    key = "arcuate_fasciculus.long_ventral"
    line = template.core_line(key, side="left")
    lesion = Lesion.from_mask(sphere_mask(line[len(line) // 2], 6))
    profile = course_profile(lesion, template, key, "left")
    at = profile.share_hit.idxmax()
    assert profile.share_hit[at] > 0.5
    assert 0.25 < profile.from_start_mm[at] / profile.attrs["length_mm"] < 0.75
    assert profile.share_hit.iloc[0] == 0
    assert profile.share_hit.iloc[-1] == 0


def test_unknown_segments_and_bins_are_refused():
    """The nearest key is suggested."""
    with pytest.raises(BywayError, match=r"did you mean line.whole@left"):
        course_profile(Lesion(), straight(), "line.hole", "left")
    with pytest.raises(BywayError, match="more than 0 mm"):
        course_profile(Lesion(), straight(), "line.whole@left", bin_mm=0)


def test_a_profile_in_seven_numbers():
    """The slab of the first test: hit from 39 to 45 mm of 60, at most 0.4 of the lines; an unhurt course has none."""
    mask = np.zeros(TEMPLATE_GRID.shape, bool)
    mask[55:62, 134 + 10 : 134 + 15, 72:76] = True
    facts = profile_facts(course_profile(Lesion.from_mask(mask), straight(), "line.whole@left"))
    assert tuple(facts) == PROFILE_FACTS
    assert facts["length_mm"] == 60
    assert facts["hit_from_start_mm"] == pytest.approx(39, abs=1.01)
    assert facts["hit_from_end_mm"] == pytest.approx(15, abs=1.01)
    assert facts["hit_from_start_mm"] + facts["hit_length_mm"] + facts["hit_from_end_mm"] == pytest.approx(60)
    assert facts["peak_share"] == pytest.approx(0.4)
    assert facts["peak_from_start_mm"] + facts["peak_from_end_mm"] == pytest.approx(60)
    none = profile_facts(course_profile(Lesion(), straight(), "line.whole@left"))
    assert none["peak_share"] == 0
    assert np.isnan(none["hit_length_mm"])
