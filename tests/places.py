"""Small geometry for tests: values of a volume along points, crossings of a plane, the middle of a course."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import map_coordinates

from byway.knowledge.space.grid import TEMPLATE_GRID

__all__ = ["crossings", "middle", "values_at"]


def values_at(volume: NDArray[np.floating], points_mm: NDArray[np.floating]) -> NDArray[np.floating]:
    """Linear interpolation of a template volume at (n, 3) points."""
    return map_coordinates(volume, TEMPLATE_GRID.to_voxel(points_mm).T, order=1)


def crossings(lines: Iterable[NDArray[np.floating]], axis: int, at_mm: float) -> NDArray[np.floating]:
    """First point, on each line that has one, at which a coordinate takes a value."""
    found = []
    for line in lines:
        side = line[:, axis] - at_mm
        for i in np.flatnonzero((side[:-1] < 0) != (side[1:] < 0))[:1]:
            found.append(line[i] + side[i] / (side[i] - side[i + 1]) * (line[i + 1] - line[i]))
    return np.array(found)


def middle(line: NDArray[np.floating], share: float = 0.8) -> NDArray[np.floating]:
    """The middle part of an evenly spaced line."""
    along = np.linspace(0.0, 1.0, len(line))
    return line[np.abs(along - 0.5) <= share / 2 + 1e-9]
