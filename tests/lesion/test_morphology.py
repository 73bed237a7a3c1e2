"""Growing, shrinking, mirroring, moving, scaling, growing from a click, and filling between slices."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import ndimage
from strategies import ellipsoids

from byway.knowledge.faults import BywayError
from byway.knowledge.lesion.morphology import (
    fill_between,
    grow_from_click,
    grow_mm,
    mirror,
    move_mm,
    scaled,
    shrink_mm,
    threshold,
)
from byway.knowledge.lesion.shapes import ellipsoid_mask, sphere_mask
from byway.knowledge.space.grid import TEMPLATE_GRID


def around(mask: np.ndarray, margin: int) -> tuple[slice, ...]:
    """The box of a mask, with a margin."""
    low, high = np.argwhere(mask).min(axis=0) - margin, np.argwhere(mask).max(axis=0) + margin + 1
    return tuple(slice(max(0, a), b) for a, b in zip(low, high, strict=True))


def dice(one: np.ndarray, other: np.ndarray) -> float:
    """Twice the shared voxels over the summed voxels."""
    return float(2 * (one & other).sum() / (one.sum() + other.sum()))


@settings(max_examples=15, deadline=None)
@given(ellipsoids(), st.floats(0, 12))
def test_growing_equals_the_distance_transform(mask, by_mm):
    """Everything within the distance of the edge, which lies half a voxel outside the outermost centres."""
    box = around(mask, 14)
    distance = ndimage.distance_transform_edt(~mask[box]) - 0.5
    grown = grow_mm(mask, by_mm)
    np.testing.assert_array_equal(grown[box], mask[box] | (distance <= by_mm + 1e-12))
    assert grown.sum() == grown[box].sum()


@settings(max_examples=15, deadline=None)
@given(ellipsoids(), st.floats(0.5, 12))
def test_shrinking_is_growing_the_outside(mask, by_mm):
    """A voxel stays when it is deeper than the distance; a mask can vanish."""
    box = around(mask, 2)
    depth = ndimage.distance_transform_edt(mask[box]) - 0.5
    shrunk = shrink_mm(mask, by_mm)
    np.testing.assert_array_equal(shrunk[box], mask[box] & (depth >= by_mm))
    assert shrunk.sum() == shrunk[box].sum()


@settings(max_examples=10, deadline=None)
@given(ellipsoids())
def test_mirroring_twice_is_no_change(mask):
    """x to -x and back."""
    assert not np.array_equal(mirror(mask), mask) or np.array_equal(mask, mask[::-1])
    np.testing.assert_array_equal(mirror(mirror(mask)), mask)


def test_mirroring_takes_a_voxel_to_its_counterpart():
    """(-37, 5, 21) becomes (37, 5, 21)."""
    mask = sphere_mask((-37, 5, 21), 0.5)
    np.testing.assert_array_equal(mirror(mask), sphere_mask((37, 5, 21), 0.5))


@settings(max_examples=15, deadline=None)
@given(st.tuples(*[st.integers(-30, 30)] * 3))
def test_moving_and_moving_back_is_no_change(by_mm):
    """As long as the mask stays on the grid."""
    mask = ellipsoid_mask((-30, -10, 20), (9, 12, 7))
    moved = move_mm(mask, by_mm)
    np.testing.assert_array_equal(moved, ellipsoid_mask(np.add((-30, -10, 20), by_mm), (9, 12, 7)))
    np.testing.assert_array_equal(move_mm(moved, [-b for b in by_mm]), mask)


def test_what_is_moved_off_the_grid_is_lost():
    """Nothing comes back on the other side."""
    assert not move_mm(sphere_mask((0, 0, 0), 5), (300, 0, 0)).any()


@pytest.mark.parametrize("factor", [0.5, 0.8, 1.3, 2.0])
def test_scaling_a_sphere_scales_its_radius(factor):
    """Against the sphere drawn with the scaled radius: Dice of at least 0.97 (voxels are 5 to 10 % of the radius)."""
    assert dice(scaled(sphere_mask((-30, -10, 20), 16), factor), sphere_mask((-30, -10, 20), 16 * factor)) >= 0.97


def test_scaling_along_one_axis_about_a_given_centre():
    """A sphere scaled twofold along y about its lowest point becomes an ellipsoid from there."""
    found = scaled(sphere_mask((-30, -10, 20), 12), (1, 2, 1), centre_mm=(-30, -22, 20))
    assert dice(found, ellipsoid_mask((-30, 2, 20), (12, 24, 12))) >= 0.97


@pytest.mark.parametrize("size", [(20, 16, 18), (30, 30, 30), (14, 22, 16)])
@pytest.mark.parametrize("axis", [0, 1, 2])
@pytest.mark.parametrize("first", [0, 2, 4])
def test_filling_between_every_fifth_slice_gives_the_ellipsoid_back(size, axis, first):
    """Dice of at least 0.95, wherever the drawn slices fall; the drawn slices stay as they were."""
    whole = ellipsoid_mask((-40, -10, 20), size)
    drawn = np.zeros_like(whole)
    slices = (slice(None),) * axis + (slice(first, None, 5),)
    drawn[slices] = whole[slices]
    filled = fill_between(drawn, axis)
    assert dice(filled, whole) >= 0.95
    np.testing.assert_array_equal(filled[slices], drawn[slices])


def test_filling_follows_a_lesion_that_runs_obliquely():
    """Discs that do not overlap from one drawn slice to the next are carried along the line between them."""
    drawn = np.zeros(TEMPLATE_GRID.shape, bool)
    for slice_, x in ((60, 60), (70, 80), (80, 100)):
        drawn[:, :, slice_] = sphere_mask((x - 98, 0, slice_ - 72), 6)[:, :, slice_]
    filled = fill_between(drawn, 2)
    assert filled[70, 134, 65]
    assert filled[90, 134, 75]
    areas = filled.sum(axis=(0, 1))[60:81]
    assert areas.min() >= 0.8 * areas[0]


def test_filling_between_two_slices_alone():
    """Two equal discs enclose a cylinder."""
    disc = sphere_mask((-30, 0, 10), 8)[:, :, 82]
    drawn = np.zeros(TEMPLATE_GRID.shape, bool)
    drawn[:, :, 82] = drawn[:, :, 90] = disc
    np.testing.assert_array_equal(fill_between(drawn, 2)[:, :, 82:91], np.repeat(disc[:, :, None], 9, axis=2))


def test_filling_needs_two_slices():
    """One slice has nothing to be filled to."""
    drawn = np.zeros(TEMPLATE_GRID.shape, bool)
    drawn[90, 90, 90] = True
    with pytest.raises(BywayError, match="1 drawn slices; expected at least two"):
        fill_between(drawn, 2)
    with pytest.raises(BywayError, match="axis 3"):
        fill_between(drawn, 3)


def test_growing_from_a_click_takes_the_like_and_joined():
    """A bright ball is taken whole; a second one, as bright, that does not touch it is not."""
    volume = np.random.default_rng(0).normal(0, 0.02, TEMPLATE_GRID.shape).astype(np.float32)
    ball, other = sphere_mask((-30, 0, 20), 8), sphere_mask((-30, 25, 20), 8)
    volume[ball | other] += 1
    grown = grow_from_click(volume, (-30, 0, 20), limits=(0.5, 1.5))
    np.testing.assert_array_equal(grown, ball)
    assert dice(grow_from_click(volume, (-30, 0, 20), tolerance=0.3), ball) > 0.99
    assert dice(grow_from_click(volume, (-30, 0, 20)), ball) > 0.9


def test_growing_from_a_click_stays_bounded():
    """In an even volume nothing farther than the bound is taken, nor anything outside the mask given."""
    volume = np.ones(TEMPLATE_GRID.shape, np.float32)
    np.testing.assert_array_equal(grow_from_click(volume, (0, 0, 0), most_mm=10), sphere_mask((0, 0, 0), 10))
    within = np.zeros(TEMPLATE_GRID.shape, bool)
    within[:98] = True
    assert not grow_from_click(volume, (-20, 0, 0), within=within)[98:].any()


def test_a_click_that_does_not_belong_gives_nothing():
    """Limits that leave out the click's own voxel give an empty mask; a click off the grid is refused."""
    volume = np.ones(TEMPLATE_GRID.shape, np.float32)
    assert not grow_from_click(volume, (0, 0, 0), limits=(2, 3)).any()
    with pytest.raises(BywayError, match="on the template grid"):
        grow_from_click(volume, (200, 0, 0))


def test_threshold_includes_its_limits():
    """Values from low to high, both counted, within a mask if there is one."""
    volume = np.arange(5.0).reshape(5, 1, 1)
    assert threshold(volume, 1, 3).ravel().tolist() == [False, True, True, True, False]
    within = np.array([0, 0, 1, 1, 1], bool).reshape(5, 1, 1)
    assert threshold(volume, 1, within=within).ravel().tolist() == [False, False, True, True, True]


@pytest.mark.parametrize("by_mm", [-1, 61, float("nan")])
def test_distances_are_bounded(by_mm):
    """0 to 60 mm."""
    with pytest.raises(BywayError, match="0 to 60 mm"):
        grow_mm(np.zeros(TEMPLATE_GRID.shape, bool), by_mm)
