"""Polylines: arc length, resampling, smoothing and frames."""

from __future__ import annotations

import itertools

import hypothesis.strategies as st
import numpy as np
from hypothesis import given, settings
from hypothesis.extra.numpy import arrays

from byway.knowledge.space.curves import arc_length, frames, resample, smooth, spline_through

curves = arrays(float, st.tuples(st.integers(3, 12), st.just(3)), elements=st.floats(-60, 60), unique=True)


def slow_arc_length(curve: np.ndarray) -> list[float]:
    """The obvious loop."""
    total, along = 0.0, [0.0]
    for a, b in itertools.pairwise(curve):
        total += float(np.sqrt(((b - a) ** 2).sum()))
        along.append(total)
    return along


@given(curves)
@settings(max_examples=40, deadline=None)
def test_arc_length_is_the_sum_of_steps(curve: np.ndarray) -> None:
    """Arc length equals a plain loop over the steps."""
    np.testing.assert_allclose(arc_length(curve), slow_arc_length(curve), rtol=1e-9, atol=1e-9)


@given(curves, st.floats(0.3, 5.0))
@settings(max_examples=40, deadline=None)
def test_resampling_keeps_ends_and_spacing(curve: np.ndarray, spacing: float) -> None:
    """Ends stay, no step is longer than asked, and the length never grows."""
    fine = resample(curve, spacing)
    np.testing.assert_allclose(fine[[0, -1]], curve[[0, -1]], atol=1e-9)
    assert np.linalg.norm(np.diff(fine, axis=0), axis=1).max() <= spacing + 1e-6
    assert arc_length(fine)[-1] <= arc_length(curve)[-1] + 1e-6


def test_a_spline_runs_through_its_points() -> None:
    """Every given point lies within 0.3 mm of the curve, and the ends are exact."""
    points = np.array([[0, 0, 0], [10, 5, 0], [20, 0, 5], [25, -10, 10], [20, -20, 12.0]])
    curve = spline_through(points)
    gaps = np.linalg.norm(points[:, None] - curve[None], axis=2).min(axis=1)
    assert gaps.max() < 0.3
    np.testing.assert_allclose(curve[[0, -1]], points[[0, -1]])


def test_smoothing_leaves_ends_and_straight_lines() -> None:
    """A straight line is unchanged, a zigzag is flattened, and ends never move."""
    line = np.column_stack([np.linspace(0, 50, 101), np.zeros(101), np.zeros(101)])
    np.testing.assert_allclose(smooth(line, 6.0), line, atol=1e-9)
    zigzag = line + np.column_stack([np.zeros(101), np.tile([1.0, -1.0], 51)[:101], np.zeros(101)])
    flat = smooth(zigzag, 6.0)
    np.testing.assert_allclose(flat[[0, -1]], zigzag[[0, -1]])
    assert np.abs(flat[20:-20, 1]).max() < 0.2


def test_frames_are_orthonormal_and_do_not_twist() -> None:
    """On a plane curve the second normal keeps to the plane's normal; vectors stay orthonormal."""
    angle = np.linspace(0, np.pi, 80)
    arc = 30 * np.column_stack([np.cos(angle), np.sin(angle), np.zeros(80)])
    tangent, first, second = frames(arc)
    for a, b in ((tangent, first), (tangent, second), (first, second)):
        assert np.abs((a * b).sum(axis=1)).max() < 0.05
    np.testing.assert_allclose(np.linalg.norm(first, axis=1), 1.0)
    turn = np.abs((first[:-1] * first[1:]).sum(axis=1))
    assert turn.min() > 0.99
