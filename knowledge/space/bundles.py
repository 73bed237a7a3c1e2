"""Bundles: streamlines about a core line, a core and a fringe, with ends that fan into the parcels they join."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import gaussian_filter1d, map_coordinates, minimum_filter1d
from scipy.optimize import linear_sum_assignment
from scipy.spatial.distance import cdist

from byway.knowledge.space.curves import arc_length, frames, resample
from byway.knowledge.space.fans import reach_from
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.space.template import template_volume

__all__ = ["STREAMLINES", "Bundle", "Ending", "make_bundle"]

STREAMLINES = 208
_GOLDEN_ANGLE = np.pi * (3.0 - np.sqrt(5.0))
_FRINGE = 1.6
_FAN_MM = 36.0
_FAN_SHARE = 0.38
_FAN_LEAST_MM = 4.0
_FAN_PER_SPREAD = 1.6
_STRAIGHT = 1.2
_NEAR_COST = 22.0
_BEND_MM = 20.0
_BEND_SHARE = 0.4
_NOWHERE = np.empty((0, 3))


@dataclass(frozen=True)
class Ending:
    """How one end of a bundle finishes.

    Parameters
    ----------
    targets_mm : (n, 3) float
        Voxel centres of the parcel that streamlines fan into; empty where the bundle ends inside white matter.
    hands_over : bool
        Whether another segment takes over here. Then the core runs on, and only the fringe fans into the parcel.
    through_mm : (n, 3) float
        Ends, at this place, of bundles that are already built and take over: the core meets them.
    """

    targets_mm: NDArray[np.float64] = field(default_factory=lambda: _NOWHERE)
    hands_over: bool = False
    through_mm: NDArray[np.float64] = field(default_factory=lambda: _NOWHERE)


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
        What happens at the first and at the last point of the core line.
    rng : numpy Generator
        Source of the small deterministic irregularities.
    count : int
        Number of streamlines.

    Returns
    -------
    Bundle
        Streamlines with points at most 1 mm apart, in the direction of the core line.
    """
    distance = np.sqrt((np.arange(count) + 0.5) / count) * _FRINGE
    core = distance <= 1.0
    offsets = _offsets(core_line, distance * radius_mm, np.arange(count) * _GOLDEN_ANGLE, rng)
    offsets = offsets * _room(core_line, offsets)[..., None]
    lines = core_line[None] + offsets
    tail = _finish(lines, core_line, endings[1], core, rng)
    # The same at the other end, seen from there: the reversed view shares its memory with the lines.
    head = _finish(lines[:, ::-1], core_line[::-1], endings[0], core, rng)
    streamlines = []
    for line, (drop_last, last), (drop_first, first) in zip(lines, tail, head, strict=True):
        whole = np.concatenate([first[::-1], line[drop_first : len(line) - drop_last], last])
        whole = _eased(whole, len(first)) if len(first) else whole
        whole = _eased(whole, len(whole) - len(last)) if len(last) else whole
        streamlines.append(resample(whole).astype(np.float32))
    return Bundle(streamlines, core)


def _offsets(
    core_line: NDArray[np.float64], distance_mm: NDArray[np.float64], angle: NDArray[np.float64],
    rng: np.random.Generator,
) -> NDArray[np.float64]:  # fmt: skip
    """Offset of each streamline from the core line: round the golden angle, drifting slowly along the course."""
    _, first, second = frames(core_line)
    knots = max(3, round(len(core_line) / 25) + 1)
    wobble = rng.normal(0.0, 0.15, (2, len(distance_mm), knots))
    at = np.linspace(0.0, knots - 1.0, len(core_line))
    grid = np.arange(knots)
    stretch = 1.0 + np.array([np.interp(at, grid, row) for row in wobble[0]])
    turn = 2.0 * np.array([np.interp(at, grid, row) for row in wobble[1]])
    radius = distance_mm[:, None] * stretch
    theta = angle[:, None] + turn
    return np.asarray(radius[..., None] * (np.cos(theta)[..., None] * first + np.sin(theta)[..., None] * second))


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


def _finish(
    lines: NDArray[np.float64],
    core_line: NDArray[np.float64],
    ending: Ending,
    core: NDArray[np.bool_],
    rng: np.random.Generator,
) -> list[tuple[int, NDArray[np.float64]]]:
    """Lead the last part of each line to its target: a parcel's voxel, or the end of a bundle that takes over.

    Lines that meet another bundle are bent in place. Of each line, returns how many points to drop at its end, and
    the points to put in their place.
    """
    fanning = len(ending.targets_mm) > 0
    through = ending.hands_over & (core | (not fanning))
    finished = [(0, _NOWHERE)] * len(lines)
    if len(ending.through_mm) and through.any():
        goals = _matched(lines[through, -1], _drawn(ending.through_mm, int(through.sum()), rng))
        lines[through] = _bent(lines[through], core_line, goals)
    if fanning and not through.all():
        fans = _fanned(lines[~through], core_line, ending.targets_mm, rng)
        for i, fan in zip(np.flatnonzero(~through), fans, strict=True):
            finished[i] = fan
    return finished


def _drawn(points: NDArray[np.float64], count: int, rng: np.random.Generator) -> NDArray[np.float64]:
    if len(points) >= count:
        return points[np.sort(rng.choice(len(points), count, replace=False))]
    return points[np.arange(count) % len(points)]


def _matched(ends: NDArray[np.float64], goals: NDArray[np.float64]) -> NDArray[np.float64]:
    """Goals in the order of the ends, paired so that the summed squared shift is least."""
    rows, columns = linear_sum_assignment(cdist(ends, goals, "sqeuclidean"))
    return np.asarray(goals[columns[np.argsort(rows)]])


def _bent(
    lines: NDArray[np.float64], core_line: NDArray[np.float64], goals: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Lines with their last 20 mm (at most 40 %) bent smoothly so that they end at the goals."""
    along = arc_length(core_line)
    reach = min(_BEND_MM, _BEND_SHARE * along[-1])
    share = np.clip(1.0 - (along[-1] - along) / reach, 0.0, 1.0)
    share = share**2 * (3.0 - 2.0 * share)
    return np.asarray(lines + share[None, :, None] * (goals - lines[:, -1])[:, None, :])


def _fanned(
    lines: NDArray[np.float64],
    core_line: NDArray[np.float64],
    targets_mm: NDArray[np.float64],
    rng: np.random.Generator,
) -> list[tuple[int, NDArray[np.float64]]]:
    leave = _fan_start(core_line, targets_mm)
    reach = reach_from(core_line[leave:])
    cost = reach.cost_to(targets_mm)
    near = cost <= cost.min() + _NEAR_COST if np.isfinite(cost).any() else np.ones(len(cost), bool)
    goals = targets_mm[near]
    goals = goals[rng.choice(len(goals), len(lines), replace=len(goals) < len(lines))]
    goals = _matched(lines[:, -1], goals)
    fans = []
    for line, goal in zip(lines, goals, strict=True):
        door, way = reach.way_to(goal)
        door += leave
        fade = np.linspace(1.0, 0.0, len(way))
        fade = fade**2 * (3.0 - 2.0 * fade)
        fans.append((len(line) - door, way + fade[:, None] * (line[door] - core_line[door])))
    return fans


def _fan_start(core_line: NDArray[np.float64], targets_mm: NDArray[np.float64]) -> int:
    """Point of the core line at which the fan may begin: farther from its end the wider the targets lie about it.

    Only the part of the course that leads straight at the end may fan: round a bend, ways to the targets would cut it
    short.
    """
    along = arc_length(core_line)
    to_end = along[-1] - along
    chord = np.linalg.norm(core_line - core_line[-1], axis=1)
    spread = float(np.median(np.linalg.norm(targets_mm - core_line[-1], axis=1)))
    longest = min(_FAN_MM, _FAN_SHARE * along[-1], _FAN_LEAST_MM + _FAN_PER_SPREAD * spread)
    bent = (to_end > _STRAIGHT * chord) & (to_end > _FAN_LEAST_MM)
    first = int(np.flatnonzero(bent)[-1]) + 1 if bent.any() else 0
    return min(max(first, int(np.searchsorted(along, along[-1] - longest))), len(core_line) - 2)


def _eased(line: NDArray[np.float64], at: int) -> NDArray[np.float64]:
    """Smooth the bend where the fan leaves the trunk."""
    first, last = max(0, at - 12), min(len(line), at + 25)
    eased = line.copy()
    part = line[first:last]
    width = np.hanning(len(part) + 2)[1:-1, None]
    eased[first:last] = part + width * (gaussian_filter1d(part, 5.0, axis=0, mode="nearest") - part)
    return eased
