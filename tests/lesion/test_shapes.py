"""Spheres and ellipsoids."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from byway.knowledge.faults import BywayError
from byway.knowledge.lesion.shapes import ellipsoid_mask, sphere_mask
from byway.knowledge.space.grid import TEMPLATE_GRID

COORDINATE = st.floats(-90, 90)
RADIUS = st.floats(0.5, 30)


@settings(max_examples=25, deadline=None)
@given(st.tuples(COORDINATE, COORDINATE, COORDINATE), st.tuples(RADIUS, RADIUS, RADIUS))
def test_a_voxel_belongs_when_its_centre_does(centre, radii):
    """The mask equals the plain formula over all voxel centres (ties of the surface aside)."""
    axes = [np.arange(n) + TEMPLATE_GRID.affine[a, 3] for a, n in enumerate(TEMPLATE_GRID.shape)]
    x, y, z = (((axis - c) / r) ** 2 for axis, c, r in zip(axes, centre, radii, strict=True))
    level = x[:, None, None] + y[:, None] + z
    mask = ellipsoid_mask(centre, radii)
    clear = np.abs(level - 1) > 1e-6
    np.testing.assert_array_equal(mask[clear], (level <= 1)[clear])


def test_a_shape_of_whole_millimetres_is_the_mirror_image_of_its_counterpart():
    """x to -x turns the mask round, bit for bit."""
    left, right = ellipsoid_mask((-37, 5, 21), (10, 7, 4)), ellipsoid_mask((37, 5, 21), (10, 7, 4))
    np.testing.assert_array_equal(left, right[::-1])


def test_volume_follows_the_formula():
    """4/3 pi r^3: a sphere of 20 mm holds 33.5 ml."""
    assert sphere_mask((0, -20, 20), 20).sum() / 1000 == pytest.approx(4 / 3 * np.pi * 8, rel=0.01)


def test_a_shape_off_the_grid_is_empty():
    """Nothing of it lies on the grid, and nothing wraps round."""
    assert not sphere_mask((300, 0, 0), 10).any()


@pytest.mark.parametrize(
    ("centre", "radii", "words"),
    [
        ((0, 0), (1, 1, 1), "three finite numbers"),
        ((0, 0, float("nan")), (1, 1, 1), "three finite numbers"),
        ((0, 0, 0), (1, 0, 1), "above 0 mm"),
        ((0, 0, 0), (1, -2, 1), "above 0 mm"),
    ],
)
def test_impossible_shapes_are_refused(centre, radii, words):
    """The error says what was found and what would do."""
    with pytest.raises(BywayError, match=words):
        ellipsoid_mask(centre, radii)
