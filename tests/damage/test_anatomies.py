"""Virtual anatomies."""

from __future__ import annotations

import numpy as np
import pytest

from byway.knowledge.damage.anatomies import Anatomies, normal_levels

SHAPE = (197, 233, 189)


def displacements(draws=400, spread=4.0, jitter_mm=0.0, jitter_deg=0.0, seed=0, x=(40.0, 156.0)):
    """Of two elements that are partners, at mirrored places."""
    centre = np.array([[x[0], 110.0, 90.0], [x[1], 110.0, 90.0]])
    anatomies = Anatomies(draws, seed, jitter_mm, jitter_deg)
    return anatomies.displacements(centre, np.array([0, 1]), np.full(2, spread), np.array([1, 0]), SHAPE)


def test_spread_is_the_standard_deviation():
    """4 mm along each axis, within the error of 400 draws and of cutting at 2.5 standard deviations."""
    move = displacements()
    assert move.std(axis=0) == pytest.approx(np.full((2, 3), 4.0), rel=0.12)
    assert np.abs(move.mean(axis=0)).max() < 0.7
    assert np.abs(move).max() <= 10


def test_no_spread_and_no_jitter_is_no_displacement():
    """Everyone has the template's anatomy."""
    assert not displacements(spread=0.0).any()


def test_jitter_moves_all_elements_alike():
    """A shift alone is the same everywhere; a turn grows with the distance from the middle."""
    move = displacements(spread=0.0, jitter_mm=2.0)
    np.testing.assert_array_equal(move[:, 0], move[:, 1])
    far = displacements(spread=0.0, jitter_deg=2.0, x=(8.0, 188.0))
    near = displacements(spread=0.0, jitter_deg=2.0, x=(90.0, 106.0))
    assert far.std() > 1.5 * near.std()


def test_the_second_half_mirrors_the_first():
    """What befalls the left element in a draw befalls the right one in its mirror image, x turned round."""
    move = displacements(draws=50, jitter_mm=1.0, jitter_deg=1.0)
    np.testing.assert_array_equal(move[25:, 1], move[:25, 0] * [-1, 1, 1])
    np.testing.assert_array_equal(move[25:, 0], move[:25, 1] * [-1, 1, 1])


def test_the_same_seed_gives_the_same_people():
    """And another seed gives others."""
    np.testing.assert_array_equal(displacements(seed=3), displacements(seed=3))
    assert (displacements(seed=3) != displacements(seed=4)).any()


def test_neighbours_move_together():
    """Half the variance is shared in one place: correlation about one half, and less at 60 mm."""
    anatomies = Anatomies(1000, 0, 0.0, 0.0)
    centre = np.array([[60.0, 60, 90], [60, 60, 90], [60, 120, 90]])
    move = anatomies.displacements(centre, np.arange(3), np.full(3, 4.0), np.arange(3), SHAPE)[:500]
    near = np.corrcoef(move[:, 0, 1], move[:, 1, 1])[0, 1]
    far = np.corrcoef(move[:, 0, 1], move[:, 2, 1])[0, 1]
    assert near == pytest.approx(0.5, abs=0.12)
    assert abs(far) < 0.2


@pytest.mark.parametrize("count", [1, 2, 3, 7, 12])
def test_levels_stand_for_a_normal_distribution(count):
    """Mean 0, standard deviation 1 (from two levels on), symmetric."""
    levels = normal_levels(count)
    np.testing.assert_allclose(levels, -levels[::-1], atol=1e-12)
    if count > 1:
        assert np.sqrt(np.mean(levels**2)) == pytest.approx(1)


def test_an_element_more_leaves_the_others_draws() -> None:
    """With labels of their own, elements move alike whatever stands before them; registration moves alike too."""
    anatomies = Anatomies(20, 0, 1.0, 1.0)
    centre = np.array([[60.0, 100.0, 90.0], [120.0, 80.0, 70.0]])
    two = anatomies.displacements(centre, np.array([0, 1]), np.full(2, 4.0), np.arange(2), SHAPE, np.array([7, 9]))
    three = anatomies.displacements(centre, np.array([1, 2]), np.full(2, 4.0), np.arange(3), SHAPE, np.array([5, 7, 9]))
    np.testing.assert_array_equal(two, three)
