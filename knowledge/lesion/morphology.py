"""Changing masks: grow, shrink, mirror, move, scale, threshold, grow from a click, fill between slices.

Values in, values out: no mask is changed in place. Distances are mm; the grid has cubic voxels.
"""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage

from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.lesion.distance import LevelSet
from byway.knowledge.space.grid import TEMPLATE_GRID, Grid

__all__ = [
    "fill_between",
    "grow_from_click",
    "grow_mm",
    "mirror",
    "move_mm",
    "scaled",
    "shrink_mm",
    "threshold",
]

Mask = NDArray[np.bool_]
_MOST_MM = 60.0


def grow_mm(mask: Mask, by_mm: float, *, grid: Grid = TEMPLATE_GRID) -> Mask:
    """The mask and all that lies within ``by_mm`` of its edge.

    Raises
    ------
    BywayError
        ``by_mm`` is not between 0 and 60.

    Examples
    --------
    >>> mask = np.zeros(TEMPLATE_GRID.shape, bool)
    >>> mask[98, 134, 72] = True
    >>> int(grow_mm(mask, 0.5).sum())  # the faces lie half a millimetre from the centre
    7
    """
    _checked_distance(by_mm)
    return _moved_edge(mask, by_mm, grid)


def shrink_mm(mask: Mask, by_mm: float, *, grid: Grid = TEMPLATE_GRID) -> Mask:
    """The mask without what lies within ``by_mm`` of its edge; it may vanish. See :func:`grow_mm`."""
    _checked_distance(by_mm)
    return _moved_edge(mask, -by_mm, grid)


def mirror(mask: NDArray[np.generic], *, grid: Grid = TEMPLATE_GRID) -> NDArray[np.generic]:
    """The same mask, or map, on the other side of the midline (x to -x).

    Raises
    ------
    BywayError
        The grid is not symmetric about x = 0, so that voxels have no counterpart.
    """
    first, last = grid.affine[0, 3], grid.affine[0, 3] + grid.affine[0, 0] * (grid.shape[0] - 1)
    if abs(first + last) > 1e-6 or np.abs(grid.affine[0, 1:3]).max() > 1e-6:
        raise BywayError(Fault("mirror", "grid", f"x from {first:g} to {last:g} mm", "a grid symmetric about x = 0"))
    return np.ascontiguousarray(mask[::-1])


def move_mm(mask: Mask, by_mm: Sequence[float], *, grid: Grid = TEMPLATE_GRID) -> Mask:
    """The mask moved along x, y and z, to the nearest whole voxel; what leaves the grid is lost."""
    _checked_vector(by_mm)
    steps = np.rint(np.linalg.solve(grid.affine[:3, :3], np.asarray(by_mm, float))).astype(int)
    moved = np.zeros_like(mask)
    from_, to = [], []
    for step, length in zip(steps.tolist(), mask.shape, strict=True):
        step = int(np.clip(step, -length, length))
        from_.append(slice(max(0, -step), length - max(0, step)))
        to.append(slice(max(0, step), length - max(0, -step)))
    moved[tuple(to)] = mask[tuple(from_)]
    return moved


def scaled(mask: Mask, factors: float | Sequence[float], *, centre_mm: Sequence[float] | None = None,
           grid: Grid = TEMPLATE_GRID) -> Mask:  # fmt: skip
    """The mask scaled about its centroid, or about ``centre_mm``.

    Parameters
    ----------
    mask : bool array
        On the grid, whose axes run along x, y and z.
    factors : float or 3 floats
        Above 0; along x, y and z.
    centre_mm : 3 floats, optional
        What stays where it is, MNI mm.

    Notes
    -----
    The signed distance to the edge is sampled, not the mask, so that surfaces stay smooth.
    """
    factor = np.broadcast_to(np.asarray(factors, float), (3,))
    if not (np.isfinite(factor).all() and (factor > 0).all() and (factor <= 100).all()):
        raise BywayError(Fault("scale", "mask", f"factors {factor.tolist()}", "factors above 0"))
    if not mask.any():
        return mask.copy()
    voxels = np.argwhere(mask)
    if centre_mm is None:
        centre = voxels.mean(axis=0)
    else:
        _checked_vector(centre_mm)
        centre = grid.to_voxel(np.asarray(centre_mm, float)[None])[0]
    low, high = voxels.min(axis=0), voxels.max(axis=0) + 1
    box = tuple(slice(a, b) for a, b in zip(low, high, strict=True))
    inner = _signed_distance(np.pad(mask[box], 2))
    new_low = np.clip(np.floor(centre + (low - 2 - centre) * factor).astype(int), 0, mask.shape)
    new_high = np.clip(np.ceil(centre + (high + 1 - centre) * factor).astype(int) + 1, 0, mask.shape)
    out = np.zeros_like(mask)
    if (new_high <= new_low).any():
        return out
    origin = centre + (new_low - centre) / factor - (low - 2)
    sampled = ndimage.affine_transform(
        inner, 1 / factor, origin, tuple(int(n) for n in new_high - new_low), order=1, cval=1e3
    )
    out[tuple(slice(a, b) for a, b in zip(new_low, new_high, strict=True))] = sampled < 0
    return out


def threshold(volume: NDArray[np.floating], low: float, high: float = np.inf, *, within: Mask | None = None) -> Mask:
    """Voxels whose value lies in [low, high], within a mask if one is given."""
    chosen = np.asarray((volume >= low) & (volume <= high))
    return chosen if within is None else chosen & within


def grow_from_click(
    volume: NDArray[np.floating],
    at_mm: Sequence[float],
    *,
    tolerance: float | None = None,
    limits: tuple[float, float] | None = None,
    most_mm: float = 40.0,
    within: Mask | None = None,
    grid: Grid = TEMPLATE_GRID,
) -> Mask:
    """What hangs together with a clicked voxel and has a like intensity.

    Parameters
    ----------
    volume : float array
        The scan, on the grid.
    at_mm : 3 floats
        Where the click fell, MNI mm.
    tolerance : float, optional
        Intensities within this of the click's (mean over its 27 neighbours) belong. Where neither this nor ``limits``
        is given: two standard deviations of those neighbours, at least 5 % of the scan's range.
    limits : pair of float, optional
        Intensities that belong, instead.
    most_mm : float
        Nothing farther from the click belongs, so that a leak stays bounded.
    within : bool array, optional
        Nothing outside it belongs.

    Returns
    -------
    bool array
        Voxels joined to the click through faces. Empty where the click's own voxel does not belong.

    Raises
    ------
    BywayError
        The click lies outside the grid.
    """
    _checked_vector(at_mm)
    click = np.rint(grid.to_voxel(np.asarray(at_mm, float)[None])[0]).astype(int)
    if (click < 0).any() or (click >= grid.shape).any():
        raise BywayError(Fault("click", "scan", f"a click at {list(at_mm)} mm", "a place on the template grid"))
    reach = int(np.ceil(most_mm / grid.affine[0, 0] if grid.affine[0, 0] > 0 else most_mm))
    low, high = np.maximum(click - reach, 0), np.minimum(click + reach + 1, grid.shape)
    box = tuple(slice(a, b) for a, b in zip(low, high, strict=True))
    part = volume[box]
    if limits is None:
        near = volume[tuple(slice(max(0, c - 1), c + 2) for c in click)]
        middle = float(near.mean())
        if tolerance is None:
            tolerance = max(2 * float(near.std()), 0.05 * float(part.max() - part.min()))
        limits = (middle - tolerance, middle + tolerance)
    belongs = (part >= limits[0]) & (part <= limits[1])
    offsets = [np.arange(a, b) - c for a, b, c in zip(low, high, click, strict=True)]
    distance = offsets[0][:, None, None] ** 2 + offsets[1][:, None] ** 2 + offsets[2] ** 2
    belongs &= distance <= reach**2
    if within is not None:
        belongs &= within[box]
    out = np.zeros(grid.shape, bool)
    clusters, _ = ndimage.label(belongs)
    own = clusters[tuple(click - low)]
    if own:
        out[box] = clusters == own
    return out


def fill_between(mask: Mask, axis: int) -> Mask:
    """Fill the slices between drawn ones (shape-based interpolation).

    Parameters
    ----------
    mask : bool array, 3-D
        A lesion drawn on some slices.
    axis : int
        The axis across which the slices lie: 0 sagittal, 1 coronal, 2 axial.

    Returns
    -------
    bool array
        The drawn slices as they were; between each two that follow one another, the sign of the interpolated signed
        distance to the drawn outlines. Gaps beyond the first and last drawn slice stay empty.

    Raises
    ------
    BywayError
        The axis is not 0, 1 or 2, or fewer than two slices are drawn.

    Notes
    -----
    After Raya and Udupa (1990), shape-based interpolation of multidimensional objects, IEEE Trans Med Imaging
    9:32-42 (from memory), with three changes. Distances are exact. They are interpolated by a cubic through the drawn
    slices, so that a rounded end does not become a cone. Two outlines that do not overlap are brought onto one
    moving centroid, so that a lesion that runs obliquely is not cut through between them.
    """
    if axis not in (0, 1, 2):
        raise BywayError(Fault("axis", "fill", f"axis {axis}", "0, 1 or 2"))
    stack = np.moveaxis(mask, axis, 0)
    drawn = np.flatnonzero(stack.any(axis=(1, 2)))
    if len(drawn) < 2:
        raise BywayError(Fault("slices", "fill", f"{len(drawn)} drawn slices", "at least two"))
    rows, columns = (np.flatnonzero(stack.any(axis=(0, other))) for other in (2, 1))
    box = (slice(int(rows[0]), int(rows[-1]) + 1), slice(int(columns[0]), int(columns[-1]) + 1))
    outlines = stack[drawn][:, box[0], box[1]]
    distance = np.stack([_signed_distance(np.pad(outline, 1))[1:-1, 1:-1] for outline in outlines])
    slope = _slopes(drawn.astype(float), distance)
    out = stack.copy()
    for k, (first, last) in enumerate(pairwise(drawn.tolist())):
        apart = not (outlines[k] & outlines[k + 1]).any()
        for place in range(first + 1, last):
            part = (place - first) / (last - first)
            if apart:
                between = _carried(outlines[k], outlines[k + 1], part)
            else:
                between = _hermite(distance[k : k + 2], slope[k : k + 2] * (last - first), part) < 0
            out[(place, *box)] = between
    return np.ascontiguousarray(np.moveaxis(out, 0, axis))


def _checked_distance(by_mm: float) -> None:
    if not 0 <= by_mm <= _MOST_MM:
        raise BywayError(Fault("distance", "mask", f"{by_mm} mm", f"0 to {_MOST_MM:.0f} mm"))


def _checked_vector(mm: Sequence[float]) -> None:
    if len(mm) != 3 or not np.isfinite(mm).all():
        raise BywayError(Fault("place", "mask", f"{list(mm)}", "three finite numbers, in mm"))


def _moved_edge(mask: Mask, by_mm: float, grid: Grid) -> Mask:
    """The mask with its edge moved, reckoned in the smallest box that holds the answer."""
    if by_mm == 0 or not mask.any():
        return mask.copy()
    by = by_mm / float(np.cbrt(grid.voxel_ml * 1000))
    margin = max(1, int(np.ceil(by + 1)))
    box = []
    for axis in range(3):
        there = np.flatnonzero(mask.any(axis=tuple(a for a in range(3) if a != axis)))
        box.append(slice(max(0, int(there[0]) - margin), int(there[-1]) + margin + 1))
    out = np.zeros_like(mask)
    out[tuple(box)] = LevelSet(mask[tuple(box)], max(by, 0.0), max(-by, 0.0)).moved(by)
    return out


def _signed_distance(mask: Mask) -> NDArray[np.float64]:
    """Distance (voxels) to the edge: negative inside, positive outside, 0 on the faces between."""
    outside = ndimage.distance_transform_edt(~mask)
    inside = ndimage.distance_transform_edt(mask)
    return np.asarray(np.where(mask, 0.5 - inside, outside - 0.5))


def _slopes(place: NDArray[np.float64], value: NDArray[np.float64]) -> NDArray[np.float64]:
    """Slope of the parabola through each sample and its two neighbours (at an end, through the three last)."""
    step = np.diff(place)[:, None, None]
    secant = np.diff(value, axis=0) / step
    if len(place) == 2:
        return np.concatenate([secant, secant])
    inner = (secant[:-1] * step[1:] + secant[1:] * step[:-1]) / (step[1:] + step[:-1])
    first = 2 * secant[:1] - inner[:1]
    last = 2 * secant[-1:] - inner[-1:]
    return np.asarray(np.concatenate([first, inner, last]))


def _hermite(value: NDArray[np.float64], slope: NDArray[np.float64], part: float) -> NDArray[np.float64]:
    """Cubic between two samples with given slopes (over the whole step) at ``part`` of the way."""
    t = part
    weights = (2 * t**3 - 3 * t**2 + 1, t**3 - 2 * t**2 + t, 3 * t**2 - 2 * t**3, t**3 - t**2)
    blend: NDArray[np.float64] = (
        weights[0] * value[0] + weights[1] * slope[0] + weights[2] * value[1] + weights[3] * slope[1]
    )
    return blend


def _carried(one: Mask, other: Mask, part: float) -> Mask:
    """An outline between two that lie apart: their shapes are interpolated about a centroid that moves."""
    centre = [np.argwhere(outline).mean(axis=0) for outline in (one, other)]
    middle = centre[0] + part * (centre[1] - centre[0])
    far = float(sum(one.shape))
    moved = [
        ndimage.shift(_signed_distance(np.pad(outline, 1))[1:-1, 1:-1], middle - c, order=1, cval=far)
        for outline, c in zip((one, other), centre, strict=True)
    ]
    return np.asarray((1 - part) * moved[0] + part * moved[1] < 0)
