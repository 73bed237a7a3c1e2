"""The survey of an image's values."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from byway.knowledge.lesion.values import survey

SHAPES = st.tuples(*[st.integers(1, 5)] * 3)


@given(hnp.arrays(np.int16, SHAPES, elements=st.integers(-3, 3)))
def test_counts_equal_a_plain_count(stored):
    """Every value but 0, with its number of voxels, ascending."""
    found = survey(stored)
    values, counts = np.unique(stored[stored != 0], return_counts=True)
    assert found.counts == dict(zip(values.astype(float).tolist(), counts.tolist(), strict=True))
    assert list(found.counts) == sorted(found.counts)
    assert found.nonzero == np.count_nonzero(stored)
    assert (found.least, found.most) == (stored.min(), stored.max())
    assert found.whole


@given(hnp.arrays(np.float32, SHAPES, elements=st.sampled_from([0.0, 0.5, 2.0, np.nan, np.inf])))
def test_values_that_are_no_numbers_are_counted_apart(stored):
    """They count as broken and not as values."""
    found = survey(stored)
    finite = stored[np.isfinite(stored)]
    assert found.broken == stored.size - finite.size
    assert found.nonzero == np.count_nonzero(finite)
    if not found.broken:
        assert found.whole == (0.5 not in finite)


def test_single_precision_slopes_do_not_spoil_whole_numbers():
    """10 x 0.05 - 0.5 is 0, though the header's 0.05 is 0.0500000007."""
    found = survey(np.array([[[10, 30, 30]]], np.int16), np.float32(0.05), -0.5)
    assert found.counts == {1.0: 2}
    assert found.stored == {1.0: [30]}
    assert found.least == 0


def test_too_many_values_are_no_labels():
    """A scan's intensities are not listed."""
    found = survey(np.arange(20_000, dtype=np.float32).reshape(20, 20, 50))
    assert found.counts is None
    assert found.nonzero == 19_999


@pytest.mark.parametrize("dtype", [np.uint8, np.int16, np.float32, np.float64, ">i2"])
def test_all_stored_types_are_surveyed(dtype):
    """Also those of the other byte order."""
    assert survey(np.array([[[0, 1, 1]]], dtype)).counts == {1.0: 2}
