"""Bounded exact distances and moved edges."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import ndimage
from strategies import small_masks

from byway.knowledge.lesion.distance import LevelSet, shifted, squared_distance


@settings(deadline=None)
@given(small_masks, st.integers(0, 12))
def test_squared_distance_equals_the_full_transform_within_reach(mask, reach):
    """scipy's Euclidean transform is the slow twin; beyond reach the value is only known to be larger."""
    found = squared_distance(mask, reach)
    if not mask.any():
        assert (found > reach**2).all()
        return
    exact = np.rint(ndimage.distance_transform_edt(~mask) ** 2)
    near = exact <= reach**2
    np.testing.assert_array_equal(found[near], exact[near])
    assert (found[~near] > reach**2).all()


@settings(deadline=None)
@given(small_masks, st.floats(-4, 4), st.floats(0, 2))
def test_moving_the_edge_farther_out_never_loses_a_voxel(mask, by, more):
    """The moved masks are nested, and no move is no change."""
    assert not (shifted(mask, by) & ~shifted(mask, by + more)).any()
    np.testing.assert_array_equal(shifted(mask, 0.0), mask)


def test_half_a_voxel_is_the_edge():
    """A single voxel gains its faces from 0.5 on; a plate three thick keeps its middle until 1.5."""
    one = np.zeros((5, 5, 5), bool)
    one[2, 2, 2] = True
    assert [int(shifted(one, by).sum()) for by in (0.4, 0.5, 0.91, 0.92)] == [1, 7, 7, 19]
    plate = np.pad(np.ones((3, 9, 9), bool), 2)
    assert shifted(plate, -1.5)[3, 6, 6]
    assert not shifted(plate, -1.6).any()


def test_the_array_has_an_edge_too():
    """What lies beyond the array counts as outside, so that a full array shrinks."""
    assert int(shifted(np.ones((5, 5, 5), bool), -1.0).sum()) == 27


def test_a_lesion_can_be_kept_from_vanishing():
    """The deepest voxels stay where that is asked for."""
    plate = np.pad(np.ones((3, 3, 3), bool), 2)
    level = LevelSet(plate, 0, 5)
    assert not level.moved(-4).any()
    assert np.argwhere(level.moved(-4, keep_some=True)).tolist() == [[3, 3, 3]]


def test_reach_is_bounded():
    """Sixteen bits hold squared distances up to a reach of 70."""
    with pytest.raises(ValueError, match="0 to 70"):
        squared_distance(np.zeros((2, 2, 2), bool), 71)
