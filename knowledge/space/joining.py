"""Whole streamlines of a pathway: segments joined end to end where one hands over to the next."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree

__all__ = ["joined_streamlines"]

Streamlines = Sequence[NDArray[np.floating]]


def joined_streamlines(parts: Sequence[Streamlines], gap_mm: float = 3.0) -> list[NDArray[np.float32]]:
    """Join the streamlines of consecutive segments into whole ones.

    Parameters
    ----------
    parts : sequence of bundles
        Streamlines of each segment in order, each (n, 3) in mm, running from the segment's first place to its second.
    gap_mm : float
        Largest gap that is bridged; a streamline whose end has no successor within it (because it ends in a region)
        is left out.

    Returns
    -------
    list of (n, 3) float32
        Streamlines that run through all the segments.

    Examples
    --------
    >>> lower = [np.array([[0.0, 0, 0], [0, 0, 1]])]
    >>> upper = [np.array([[0.0, 0, 1], [0, 0, 2]]), np.array([[9.0, 0, 1], [9, 0, 2]])]
    >>> joined_streamlines([lower, upper])[0][:, 2].tolist()
    [0.0, 1.0, 1.0, 2.0]
    """
    whole = [np.asarray(line, np.float32) for line in parts[0]]
    for following in parts[1:]:
        if not whole:
            break
        starts = cKDTree(np.array([line[0] for line in following]))
        gaps, successors = starts.query(np.array([line[-1] for line in whole]))
        whole = [
            np.concatenate([line, np.asarray(following[successor], np.float32)])
            for line, gap, successor in zip(whole, gaps, successors, strict=True)
            if gap <= gap_mm
        ]
    return whole
