"""The ensemble's sample."""

from __future__ import annotations

import numpy as np
import pytest
from toy_space import toy_geometry

from byway.knowledge.damage.sample import Sample


def test_a_full_sample_holds_every_point():
    """All streamlines, all points, all voxels."""
    geometry = toy_geometry(2, 7)
    sample = Sample.build(geometry, streamlines=None, step=1, voxels=None)
    assert len(sample.voxels) == len(geometry.points_mm) + len(geometry.region_voxels)
    assert len(sample.group_element) == len(geometry.core) + len(geometry.region_voxels)


@pytest.mark.parametrize("step", [1, 2, 5])
def test_weights_sum_to_one_and_ends_are_kept(step):
    """Whatever is left out, an element's weights sum to 1, and a streamline's first and last point stay."""
    geometry = toy_geometry(2, 9)
    sample = Sample.build(geometry, streamlines=4, step=step, voxels=50)
    sums = np.bincount(sample.group_element, sample.group_weight, minlength=len(geometry.element_ids))
    np.testing.assert_allclose(sums, 1, atol=1e-5)
    n_regions = len(geometry.region_ids)
    lines = np.flatnonzero(sample.group_element == n_regions)
    assert len(lines) == 4
    ends = {tuple(np.rint(geometry.grid.to_voxel(line[[0, -1]])).astype(int).ravel()) for line in
            geometry.streamlines(0)}  # fmt: skip
    for group in lines:
        low, high = sample.group_offsets[group : group + 2]
        assert tuple(sample.voxels[[low, high - 1]].ravel()) in ends


def test_partners_are_on_the_other_side():
    """Left and right point at each other; an element without partner at itself."""
    geometry = toy_geometry(2, 3)
    sample = Sample.build(geometry)
    for i, partner in enumerate(sample.partner):
        key, side = geometry.element_ids[i].split("@")
        other, other_side = geometry.element_ids[partner].split("@")
        assert key == other
        assert side != other_side


def test_points_that_move_together_share_element_and_cell():
    """Every point lies within half a cell of its mover's centre and belongs to its element."""
    sample = Sample.build(toy_geometry(3, 20))
    element = np.repeat(sample.group_element, np.diff(sample.group_offsets))
    np.testing.assert_array_equal(sample.mover_element[sample.mover], element)
    assert np.abs(sample.voxels - sample.mover_centre[sample.mover]).max() <= 4
