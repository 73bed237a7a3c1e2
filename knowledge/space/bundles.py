"""Bundles: streamlines about a core line, a core and a fringe, with ends that fan into the parcels they join."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from byway.knowledge.space.curves import arc_length, frames, resample
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.space.template import template_volume
from numpy.typing import NDArray
from scipy.ndimage import gaussian_filter1d, map_coordinates, minimum_filter1d
from scipy.optimize import linear_sum_assignment
from scipy.spatial.distance import cdist

__all__ = ["STREAMLINES", "Bundle", "Ending", "make_bundle"]

STREAMLINES = 208
_GOLDEN_ANGLE = np.pi * (3.0 - np.sqrt(5.0))
_FRINGE = 1.6
_FAN_MM = 20.0
_NEAR_MM = 14.0


@dataclass(frozen=True)
class Ending:
    """How one end of a bundle finishes.

    Parameters
    ----------
    targets_mm : (n, 3) float
        Places where streamlines may end (voxel centres of a parcel, or ends of a bundle that hands over); empty when
        the bundle ends free inside white matter.
    core_fans : bool
        Whether core streamlines too go to the targets; otherwise only the fringe does, and the core runs on into
        the segment that takes over.
    """

    targets_mm: NDArray[np.float64]
    core_fans: bool = True


@dataclass(frozen=True)
class Bundle:
    """Streamlines of one segment on one side, and which belong to its core."""

    streamlines: list[NDArray[np.float32]]
    core: NDArray[np.bool_]


def make_bundle(
    core_line: NDArray[np.float64],
    radius_mm: float,
    endings: tuple[Ending, Ending],
    rng: np.random.Generator,
    count: int = STREAMLINES,
) -> Bundle:
    """Streamlines about a core line.

    Parameters
    ----------
    core_line : (m, 3) float
        Evenly spaced core line, MNI mm.
    radius_mm : float
        Radius of the core; the fringe reaches 1.6 times as far.
    endings : pair of Ending
        Where the streamlines end, at the first and at the last point of the core line.
    rng : numpy Generator
        Source of the small deterministic irregularities.
    count : int
        Number of streamlines.
    """
    distance = np.sqrt((np.arange(count) + 0.5) / count) * _FRINGE
    angle = np.arange(count) * _GOLDEN_ANGLE
    core = distance <= 1.0
    offsets = _offsets(core_line, distance * radius_mm, angle, rng)
    lines = core_line[None] + offsets * _room(core_line, offsets)[..., None]
    along = arc_length(core_line)
    reach = min(_FAN_MM, 0.4 * along[-1])
    for ending, from_end in ((endings[0], along), (endings[1], along[-1] - along)):
        end = int(np.argmin(from_end))
        blend = np.clip(1.0 - from_end / reach, 0.0, 1.0)
        blend = blend**2 * (3.0 - 2.0 * blend)
        shift = _shifts(lines[:, end], ending, core, rng)
        lines = lines + blend[None, :, None] * shift[:, None, :]
    return Bundle([resample(line).astype(np.float32) for line in lines], core)


def _offsets(
    core_line: NDArray[np.float64], distance_mm: NDArray[np.float64], angle: NDArray[np.float64],
    rng: np.random.Generator,
) -> NDArray[np.float64]:  # fmt: skip
    _, first, second = frames(core_line)
    knots = max(3, round(len(core_line) / 25) + 1)
    wobble = rng.normal(0.0, 0.15, (2, len(distance_mm), knots))
    at = np.linspace(0.0, knots - 1.0, len(core_line))
    grid = np.arange(knots)
    stretch = 1.0 + np.array([np.interp(at, grid, row) for row in wobble[0]])
    turn = 2.0 * np.array([np.interp(at, grid, row) for row in wobble[1]])
    radius = distance_mm[:, None] * stretch
    theta = angle[:, None] + turn
    return radius[..., None] * (np.cos(theta)[..., None] * first + np.sin(theta)[..., None] * second)


def _room(core_line: NDArray[np.float64], offsets: NDArray[np.float64]) -> NDArray[np.float64]:
    """Factor in [0, 1] that keeps each streamline in white matter about as good as the core's."""
    white = template_volume("wm")

    def probability(points: NDArray[np.float64]) -> NDArray[np.float64]:
        voxels = TEMPLATE_GRID.to_voxel(points.reshape(-1, 3)).T
        return np.asarray(map_coordinates(white, voxels, order=1, mode="nearest")).reshape(points.shape[:-1])

    wanted = np.minimum(0.7 * probability(core_line), 0.6)
    factor = np.full(offsets.shape[:2], 0.15)
    for trial in (0.4, 0.6, 0.8, 1.0):
        fits = probability(core_line[None] + trial * offsets) >= wanted
        factor = np.where(fits, trial, factor)
    factor = minimum_filter1d(factor, 5, axis=1, mode="nearest")
    return np.asarray(gaussian_filter1d(factor, 3.0, axis=1, mode="nearest"))


def _shifts(
    ends: NDArray[np.float64], ending: Ending, core: NDArray[np.bool_], rng: np.random.Generator
) -> NDArray[np.float64]:
    shift = np.zeros_like(ends)
    fans = np.ones(len(ends), bool) if ending.core_fans else ~core
    if not len(ending.targets_mm) or not fans.any():
        return shift
    centre = ends.mean(0)
    away = np.linalg.norm(ending.targets_mm - centre, axis=1)
    near = ending.targets_mm[away <= away.min() + _NEAR_MM]
    chosen = near[rng.choice(len(near), int(fans.sum()), replace=len(near) < fans.sum())]
    rows, columns = linear_sum_assignment(cdist(ends[fans], chosen, "sqeuclidean"))
    shift[np.flatnonzero(fans)[rows]] = chosen[columns] - ends[fans][rows]
    return shift
