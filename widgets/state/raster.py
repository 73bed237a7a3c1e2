"""Strokes and polygons to voxels, in float32 arithmetic that the browser repeats step for step.

The front end paints at once and the kernel paints again from the same points; both must give the same voxels. So every
intermediate value here is rounded to float32 in the order in which ``slices/raster.js`` rounds it, points come
quantised to sixteenths of a voxel, and nothing is left to a library's own order of summation.

Plane coordinates: a plane is named by its normal axis (0 sagittal, 1 coronal, 2 axial). A point (a, b) on it lies
along the two other axes in ascending order: (y, z), (x, z), (x, y), in voxels; voxel centres have whole numbers.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

__all__ = ["in_plane_axes", "polygon_voxels", "stroke_voxels"]

_F = np.float32


def in_plane_axes(plane: int) -> tuple[int, int]:
    """The two axes of a plane, ascending.

    >>> in_plane_axes(1)
    (0, 2)
    """
    first, second = (axis for axis in range(3) if axis != plane)
    return first, second


def _points(points: Sequence[float]) -> NDArray[np.float32]:
    return np.asarray(points, np.float32).reshape(-1, 2)


def stroke_voxels(
    shape: tuple[int, int, int], plane: int, index: int, points: Sequence[float], radius: float, *, ball: bool
) -> NDArray[np.int64]:
    """Voxels whose centre lies within a radius of a polyline drawn on one slice.

    Parameters
    ----------
    shape : tuple of int
        Voxels of the grid along x, y, z.
    plane, index : int
        Normal axis of the slice, and its position along it.
    points : sequence of float
        Plane coordinates a0, b0, a1, b1, ... in voxels.
    radius : float
        In voxels, at most 64.
    ball : bool
        A sphere that is drawn along the line, rather than a disc on the slice.

    Returns
    -------
    (n,) int64 array
        C-order indices, ascending, each once.

    Examples
    --------
    >>> stroke_voxels((5, 5, 5), 2, 0, [2, 2], 1.0, ball=False).tolist()  # the centre and its four neighbours
    [35, 55, 60, 65, 85]
    """
    line = _points(points)
    first, second = in_plane_axes(plane)
    reach = int(np.ceil(radius)) if ball else 0
    layers = range(max(0, index - reach), min(shape[plane] - 1, index + reach) + 1)
    low = np.maximum(np.floor(line.min(0)).astype(int) - int(np.ceil(radius)), 0)
    high = np.minimum(np.ceil(line.max(0)).astype(int) + int(np.ceil(radius)), [shape[first] - 1, shape[second] - 1])
    if (high < low).any() or not len(layers):
        return np.empty(0, np.int64)
    nearest = np.full(tuple(high - low + 1), np.inf, np.float32)
    for p, q in zip(line, line[1:] if len(line) > 1 else line, strict=False):
        _nearer(nearest, low, p, q, radius)
    square = _F(radius) * _F(radius)
    hits = []
    for layer in layers:
        gap = _F(layer - index)
        a, b = np.nonzero(nearest + gap * gap <= square)
        hits.append(_flat(shape, plane, layer, a + low[0], b + low[1]))
    return np.sort(np.concatenate(hits))


def _nearer(nearest: NDArray[np.float32], low: NDArray[np.int_], p: NDArray[np.float32], q: NDArray[np.float32],
            radius: float) -> None:  # fmt: skip
    """Lower ``nearest`` (squared distances, from corner ``low``) where the segment p-q is nearer."""
    pad = int(np.ceil(radius))
    start = np.maximum(np.floor(np.minimum(p, q)).astype(int) - pad - low, 0)
    stop = np.minimum(np.ceil(np.maximum(p, q)).astype(int) + pad + 1 - low, nearest.shape)
    if (stop <= start).any():
        return
    a = (np.arange(start[0], stop[0]) + low[0]).astype(np.float32)[:, None]
    b = (np.arange(start[1], stop[1]) + low[1]).astype(np.float32)[None, :]
    da, db = q[0] - p[0], q[1] - p[1]
    length = da * da + db * db
    if length > 0:
        along = ((a - p[0]) * da + (b - p[1]) * db) / length
        along = np.minimum(np.maximum(along, _F(0)), _F(1))
        ea, eb = a - (p[0] + along * da), b - (p[1] + along * db)
    else:
        ea, eb = a - p[0], b - p[1]
    window = nearest[start[0] : stop[0], start[1] : stop[1]]
    np.minimum(window, ea * ea + eb * eb, out=window)


def polygon_voxels(shape: tuple[int, int, int], plane: int, index: int, points: Sequence[float]) -> NDArray[np.int64]:
    """Voxels of a slice whose centre lies inside a closed polygon (even-odd rule).

    Parameters and return value are those of :func:`stroke_voxels`. Fewer than three points give no voxel.

    Examples
    --------
    >>> polygon_voxels((5, 5, 5), 2, 0, [0.5, 0.5, 2.5, 0.5, 2.5, 2.5, 0.5, 2.5]).tolist()  # (1..2, 1..2, 0)
    [30, 35, 55, 60]
    """
    corners = _points(points)
    first, second = in_plane_axes(plane)
    if len(corners) < 3:
        return np.empty(0, np.int64)
    low = np.maximum(np.floor(corners.min(0)).astype(int), 0)
    high = np.minimum(np.ceil(corners.max(0)).astype(int), [shape[first] - 1, shape[second] - 1])
    if (high < low).any():
        return np.empty(0, np.int64)
    a = np.arange(low[0], high[0] + 1).astype(np.float32)[:, None]
    b = np.arange(low[1], high[1] + 1).astype(np.float32)[None, :]
    inside = np.zeros((a.size, b.size), bool)
    for (pa, pb), (qa, qb) in zip(corners, np.roll(corners, -1, axis=0), strict=True):
        if pb == qb:
            continue
        spans = (pb > b) != (qb > b)
        crossing = (qa - pa) * (b - pb) / (qb - pb) + pa
        inside ^= spans & (a < crossing)
    hit_a, hit_b = np.nonzero(inside)
    return np.sort(_flat(shape, plane, index, hit_a + low[0], hit_b + low[1]))


def _flat(
    shape: tuple[int, int, int], plane: int, index: int, a: NDArray[np.int64], b: NDArray[np.int64]
) -> NDArray[np.int64]:
    """C-order indices of plane positions."""
    first, second = in_plane_axes(plane)
    ijk = np.empty((3, len(a)), np.int64)
    ijk[plane], ijk[first], ijk[second] = index, a, b
    return np.asarray((ijk[0] * shape[1] + ijk[1]) * shape[2] + ijk[2])
