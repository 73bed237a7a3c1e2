"""Courses: a smooth core line for each segment, pulled through the template's white matter.

The curated waypoints are joined by the cheapest path through a tube of voxels about them, where white matter is
cheap and straying from the waypoints is dear; the path is then smoothed.
"""

from __future__ import annotations

import itertools
from functools import cache

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import gaussian_filter, map_coordinates
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
_SMOOTHING_SHARE = 14.0
_FINE_MM = 0.5
_DRIFT_ROUNDS = 12
_DRIFT_MM = 1.5
_STEP_PRICE = 0.08
_STEPS = np.array([step for step in itertools.product(range(-2, 3), repeat=3) if sum(d * d for d in step) <= 4])
_MIRROR = np.array([-1.0, 1.0, 1.0])


def is_mirror_image_of_itself(waypoints_mm: NDArray[np.floating]) -> bool:
    """Whether a chain of waypoints read backwards is its own mirror image about x = 0 (a symmetric commissure).

    >>> is_mirror_image_of_itself(np.array([[-5.0, 1, 2], [0, 1, 3], [5, 1, 2]]))
    True
    """
    points = np.asarray(waypoints_mm, float)
    return bool(np.allclose(points[::-1] * [-1.0, 1.0, 1.0], points))


def pull_course(
    waypoints_mm: NDArray[np.floating], *, pulled: bool = True, spacing_mm: float = 0.9
) -> NDArray[np.float64]:
    """Core line of a segment.

    Parameters
    ----------
    waypoints_mm : (n, 3) float
        Ordered waypoints, MNI mm.
    pulled : bool
        Whether white matter pulls the course. Thin tracts, and those where the template shows no white matter, stay
        on a smooth curve through their waypoints instead: the pull would lead them astray.
    spacing_mm : float
        Distance between points of the result.

    Returns
    -------
    (m, 3) float
        Smooth curve from the first waypoint to the last. A symmetric chain gives a symmetric curve.
    """
    points = np.asarray(waypoints_mm, float)
    if not pulled:
        return resample(spline_through(points), spacing_mm)
    symmetric = is_mirror_image_of_itself(points) and len(points) % 2 == 1
    if symmetric:
        half = _cheapest_path(_settled(points)[: len(points) // 2 + 1])
        curve = np.concatenate([half, half[-2::-1] * _MIRROR])
    else:
        curve = _cheapest_path(_settled(points))
    curve = _relaxed(curve)
    if symmetric:
        curve = 0.5 * (curve + curve[::-1] * _MIRROR)
    return resample(curve, spacing_mm)


@cache
def _soft_white() -> NDArray[np.float32]:
    soft: NDArray[np.float32] = gaussian_filter(template_volume("wm"), 1.0)
    return soft


def _settled(points: NDArray[np.float64]) -> NDArray[np.float64]:
    """Inner waypoints moved, by at most 2 mm, to the best white matter about them; on the midline x stays 0."""
    settled = points.copy()
    for i in range(1, len(points) - 1):
        steps = _STEPS[_STEPS[:, 0] == 0] if points[i, 0] == 0 else _STEPS
        at = np.rint(points[i]) + steps
        worth = _soft_white()[tuple(np.rint(TEMPLATE_GRID.to_voxel(at)).astype(int).T)]
        settled[i] = at[np.argmax(worth - _STEP_PRICE * np.linalg.norm(steps, axis=1))]
    return settled


def _relaxed(curve: NDArray[np.float64]) -> NDArray[np.float64]:
    """Smooth the path, then let it drift sideways into better white matter without losing its smoothness."""
    length = (len(curve) - 1) * _FINE_MM
    sigma = min(_SMOOTHING_MM, length / _SMOOTHING_SHARE) / _FINE_MM
    curve = smooth(curve, sigma)
    slope = _white_slope()
    for _ in range(_DRIFT_ROUNDS):
        tangent = np.gradient(curve, axis=0)
        tangent /= np.maximum(np.linalg.norm(tangent, axis=1, keepdims=True), 1e-9)
        voxels = TEMPLATE_GRID.to_voxel(curve).T
        pull = np.column_stack([map_coordinates(part, voxels, order=1, mode="nearest") for part in slope])
        pull -= (pull * tangent).sum(1, keepdims=True) * tangent
        pull[[0, -1]] = 0.0
        curve = smooth(curve + _DRIFT_MM * pull, sigma / 3)
    return curve


@cache
def _white_slope() -> tuple[NDArray[np.float32], ...]:
    return tuple(np.gradient(gaussian_filter(template_volume("wm"), 1.5)))


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
