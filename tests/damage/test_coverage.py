"""Coverage: what the graph does not chart."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import ndimage

from byway.knowledge.damage.coverage import uncharted_map, uncharted_share, white_matter
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.lesion.shapes import ellipsoid_mask, sphere_mask
from byway.knowledge.space.grid import TEMPLATE_GRID


def test_charted_is_near_a_streamline(toy_index):
    """Within 1.5 mm of a voxel that a streamline passes, by the full distance transform."""
    passed = np.zeros(TEMPLATE_GRID.size, bool)
    flat = TEMPLATE_GRID.flat_index(toy_index.geometry.points_mm)
    passed[flat[flat >= 0]] = True
    distance = ndimage.distance_transform_edt(~passed.reshape(TEMPLATE_GRID.shape))
    np.testing.assert_array_equal(toy_index.charted, distance <= 1.5)


def test_share_is_counted_over_the_lesions_white_matter(toy_index):
    """Grey matter and fluid in the lesion do not count."""
    mask = ellipsoid_mask((-35, -20, 20), (20, 40, 20))
    white = white_matter() & mask
    expected = np.count_nonzero(white & ~toy_index.charted) / np.count_nonzero(white)
    assert uncharted_share(Lesion.from_mask(mask), toy_index) == pytest.approx(expected)


def test_no_white_matter_is_not_a_share_of_zero(toy_index):
    """NaN: there is nothing of which a share could be taken."""
    assert np.isnan(uncharted_share(Lesion.from_mask(sphere_mask((-90, 60, 60), 5)), toy_index))
    assert np.isnan(uncharted_share(Lesion(), toy_index))


def test_the_map_is_white_matter_without_segments(toy_index):
    """And nothing else; without any segment all white matter would be on it."""
    found = uncharted_map(toy_index)
    np.testing.assert_array_equal(found, white_matter() & ~toy_index.charted)
    assert found.any()


def test_the_graph_charts_most_deep_white_matter(index):
    """More than half of the template's white matter lies in some segment; the rest is shown as uncharted."""
    assert uncharted_map(index).sum() < 0.5 * white_matter().sum()
