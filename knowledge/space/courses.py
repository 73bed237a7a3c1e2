"""Courses: a smooth core line for each segment, pulled through the template's white matter.

The curated waypoints are joined by the cheapest path through a tube of voxels about them, where white matter is
cheap and straying from the waypoints is dear; the path is then smoothed.
"""

from __future__ import annotations

import itertools

import numpy as np
from numpy.typing import NDArray
from scipy.sparse.csgraph import dijkstra
from scipy.spatial import cKDTree

from byway.knowledge.space.curves import resample, smooth, spline_through
from byway.knowledge.space.front import VoxelGraph, voxel_graph
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.space.template import template_volume

__all__ = ["is_mirror_image_of_itself", "pull_course"]

_TUBE_MM = 6.0
_GREY_PRICE = 8.0
_STRAY_MM = 4.0
_SMOOTHING_MM = 3.0
_FINE_MM = 0.5


def is_mirror_image_of_itself(waypoints_mm: NDArray[np.floating]) -> bool:
    """Whether a chain of waypoints read backwards is its own mirror image about x = 0 (a symmetric commissure).

    >>> is_mirror_image_of_itself(np.array([[-5.0, 1, 2], [0, 1, 3], [5, 1, 2]]))
    True
    """
    points = np.asarray(waypoints_mm, float)
    return bool(np.allclose(points[::-1] * [-1.0, 1.0, 1.0], points))


def pull_course(waypoints_mm: NDArray[np.floating], spacing_mm: float = 0.9) -> NDArray[np.float64]:
    """Core line of a segment.

    Parameters
    ----------
    waypoints_mm : (n, 3) float
        Ordered waypoints, MNI mm.
    spacing_mm : float
        Distance between points of the result.

    Returns
    -------
    (m, 3) float
        Smooth curve from the first waypoint to the last. A symmetric chain gives a symmetric curve.
    """
    points = np.asarray(waypoints_mm, float)
    if is_mirror_image_of_itself(points) and len(points) % 2:
        half = _cheapest_path(points[: len(points) // 2 + 1])
        fine = np.concatenate([half, half[-2::-1] * [-1.0, 1.0, 1.0]])
        curve = smooth(fine, _SMOOTHING_MM / _FINE_MM)
        curve = 0.5 * (curve + curve[::-1] * [-1.0, 1.0, 1.0])
    else:
        curve = smooth(_cheapest_path(points), _SMOOTHING_MM / _FINE_MM)
    return resample(curve, spacing_mm)


def _cheapest_path(points: NDArray[np.float64]) -> NDArray[np.float64]:
    guide = spline_through(points)
    graph, corner = _tube(guide)
    nodes = graph.node_of[tuple((np.rint(TEMPLATE_GRID.to_voxel(points)).astype(int) - corner).T)]
    voxel_of = np.argwhere(graph.node_of >= 0)
    matrix = graph.matrix()
    path = [points[0]]
    for start, end in itertools.pairwise(nodes):
        _, before = dijkstra(matrix, indices=int(start), return_predecessors=True)
        step, chain = int(end), []
        while step != start and step >= 0:
            chain.append(step)
            step = int(before[step])
        path.extend(TEMPLATE_GRID.to_mm(voxel_of[chain[::-1]] + corner))
    path[-1] = points[-1]
    return resample(np.array(path), _FINE_MM)


def _tube(guide: NDArray[np.float64]) -> tuple[VoxelGraph, NDArray[np.int64]]:
    low = np.floor(TEMPLATE_GRID.to_voxel(guide.min(0)[None] - _TUBE_MM))[0].astype(int).clip(0)
    high = np.ceil(TEMPLATE_GRID.to_voxel(guide.max(0)[None] + _TUBE_MM))[0].astype(int) + 1
    high = np.minimum(high, TEMPLATE_GRID.shape)
    box = tuple(slice(int(a), int(b)) for a, b in zip(low, high, strict=True))
    white = template_volume("wm")[box]
    centres = TEMPLATE_GRID.to_mm(np.argwhere(np.ones(white.shape, bool)) + low)
    stray = cKDTree(guide).query(centres, distance_upper_bound=_TUBE_MM)[0].reshape(white.shape)
    inside = np.isfinite(stray)
    cost = 1.0 + _GREY_PRICE * (1.0 - white) ** 2 + (np.where(inside, stray, 0.0) / _STRAY_MM) ** 2
    return voxel_graph(inside, cost), low
