"""Joining segments into whole streamlines."""

from __future__ import annotations

import numpy as np

from byway.knowledge.space.atlas import Template
from byway.knowledge.space.joining import joined_streamlines


def test_streamlines_that_end_in_a_region_are_left_out() -> None:
    """Only the streamline with a successor within 3 mm runs on."""
    lower = [np.array([[0.0, 0, 0], [0, 0, 1]]), np.array([[50.0, 0, 0], [50, 0, 1]])]
    upper = [np.array([[0.0, 0, 2], [0, 0, 9]])]
    whole = joined_streamlines([lower, upper])
    assert len(whole) == 1
    assert whole[0][:, 2].tolist() == [0.0, 1.0, 2.0, 9.0]


def test_the_corticospinal_tract_runs_whole_from_cortex_to_medulla(template: Template) -> None:
    """More than a hundred whole streamlines from the leg area to the pyramid, without a step above 3 mm."""
    names = ("corona_leg", "posterior_limb", "peduncle", "pons", "pyramid")
    whole = joined_streamlines([template.streamlines(f"corticospinal.{name}", "left") for name in names])
    assert len(whole) > 100
    for line in whole:
        assert np.linalg.norm(np.diff(line, axis=0), axis=1).max() < 3.0
        assert line[0, 2] > 45
        assert line[-1, 2] < -45
