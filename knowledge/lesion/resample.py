"""Resampling to the template grid, a slab at a time, from voxels as they are stored."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage

from byway.knowledge.space.grid import Grid

__all__ = ["grid_words", "on_same_voxels", "to_grid"]

_SLAB = 16
_CLOSE = 1e-3  # voxels


def on_same_voxels(shape: tuple[int, ...], affine: NDArray[np.float64], grid: Grid) -> bool:
    """Whether the image has the very voxels of the grid, in any order of its axes and in any direction."""
    matrix, offset = _grid_to_image(affine, grid)
    corners = np.array(list(np.ndindex(2, 2, 2))) * (np.array(grid.shape) - 1)
    places = corners @ matrix.T + offset
    whole = _is_reordering(matrix) and bool(np.abs(places - np.rint(places)).max() < _CLOSE)
    size = np.rint(places.max(axis=0)).astype(int) + 1
    return whole and bool((np.rint(places.min(axis=0)) == 0).all()) and tuple(size) == tuple(shape)


def to_grid(voxels: NDArray[Any], affine: NDArray[np.float64], grid: Grid, *, linear: bool) -> NDArray[Any]:
    """Stored voxels on the grid; 0 outside the image.

    Parameters
    ----------
    voxels : 3-D array
        As stored, possibly mapped from a file.
    affine : (4, 4) float array
        Their indices to mm.
    grid : Grid
        Where to put them.
    linear : bool
        Linear interpolation to float32; otherwise the nearest voxel in the stored type.

    Notes
    -----
    Where the image's voxels are the grid's, or a shift and a reordering of them, they are copied, bit for bit. A place
    halfway between two voxels takes the one nearer to the midline, so that mirrored images give mirrored masks.
    """
    matrix, offset = _grid_to_image(affine, grid)
    dtype = np.dtype(np.float32) if linear else voxels.dtype.newbyteorder("=")
    out = np.zeros(grid.shape, dtype)
    if _is_reordering(matrix) and np.abs(offset - np.rint(offset)).max() < _CLOSE:
        _copy(voxels, np.rint(matrix).astype(int), np.rint(offset).astype(int), out)
        return out
    if not linear:
        matrix, offset = _grid_to_image(affine, grid, towards_midline=_CLOSE / 1000)
        for first in range(0, grid.shape[0], _SLAB):
            origin = offset + matrix @ np.array([first, 0.0, 0.0])
            _nearest(voxels, matrix, origin, out[first : first + _SLAB])
    elif (np.abs(matrix) > _CLOSE / 256).sum() == 3:
        _separable(voxels, matrix, offset, out)
    else:
        # Files run fastest along their first axis, so both sides are turned round for the sake of the memory's cache.
        turned = np.empty(grid.shape[::-1], np.float32)
        for first in range(0, grid.shape[2], _SLAB):
            origin = offset + matrix @ np.array([0.0, 0.0, first])
            slab = turned[first : first + _SLAB]
            ndimage.affine_transform(voxels.T, matrix[::-1, ::-1], origin[::-1], output=slab, order=1,
                                     mode="grid-constant", cval=0)  # fmt: skip
        out[:] = turned.T
    return out


def grid_words(shape: tuple[int, ...], affine: NDArray[np.float64]) -> str:
    """A grid in a few words: ``"a 2 mm grid of 91 x 109 x 91"``."""
    sizes = np.sqrt((affine[:3, :3] ** 2).sum(axis=0))
    each = [f"{size:.3g}" for size in sizes]
    size = each[0] if len(set(each)) == 1 else " x ".join(each)
    return f"a {size} mm grid of {' x '.join(str(n) for n in shape)}"


def _grid_to_image(
    affine: NDArray[np.float64], grid: Grid, *, towards_midline: float = 0.0
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Matrix and offset from the grid's voxel indices to the image's, after a pull of x towards 0."""
    both = np.linalg.inv(affine) @ np.diag([1.0 - towards_midline, 1.0, 1.0, 1.0]) @ grid.affine
    return both[:3, :3], both[:3, 3]


def _is_reordering(matrix: NDArray[np.float64]) -> bool:
    """Whether a matrix only swaps axes and turns their direction (over the length of a brain)."""
    whole = np.rint(matrix)
    return bool(
        np.abs(matrix - whole).max() < _CLOSE / 256
        and (np.abs(whole).sum(axis=0) == 1).all()
        and (np.abs(whole).sum(axis=1) == 1).all()
    )


def _copy(voxels: NDArray[Any], turn: NDArray[np.int_], offset: NDArray[np.int_], out: NDArray[Any]) -> None:
    """Copy the shared part; ``turn`` is a signed permutation from axes of ``out`` to axes of ``voxels``."""
    source_axis = np.abs(turn).argmax(axis=0)  # of each axis of out
    taken: list[slice] = [slice(None)] * 3
    put: list[slice] = []
    for axis in range(3):
        image_axis = int(source_axis[axis])
        step, start, length = int(turn[image_axis, axis]), int(offset[image_axis]), voxels.shape[image_axis]
        # Image index = start + step * index on the grid, and must lie in [0, length).
        low = max(0, -start) if step > 0 else max(0, start - length + 1)
        high = min(out.shape[axis], length - start if step > 0 else start + 1)
        if high <= low:
            return
        put.append(slice(low, high))
        first, last = start + step * low, start + step * (high - 1)
        taken[image_axis] = slice(first, last + 1) if step > 0 else slice(first, last - 1 if last > 0 else None, -1)
    out[tuple(put)] = voxels[tuple(taken)].transpose(source_axis)


def _nearest(
    voxels: NDArray[Any], matrix: NDArray[np.float64], origin: NDArray[np.float64], slab: NDArray[Any]
) -> None:
    """Fill a slab with the nearest voxels."""
    index = []
    inside = np.ones(slab.shape, bool)
    steps = [np.arange(n, dtype=np.float64) for n in slab.shape]
    for axis in range(3):
        place = matrix[axis, 0] * steps[0][:, None, None] + matrix[axis, 1] * steps[1][:, None]
        place = place + matrix[axis, 2] * steps[2] + origin[axis]
        nearest = np.floor(place + 0.5).astype(np.int32)
        inside &= (nearest >= 0) & (nearest < voxels.shape[axis])
        index.append(nearest)
    slab[inside] = voxels[index[0][inside], index[1][inside], index[2][inside]]


def _separable(
    voxels: NDArray[Any], matrix: NDArray[np.float64], offset: NDArray[np.float64], out: NDArray[np.float32]
) -> None:
    """Linear interpolation where the axes run along the grid's: plane by plane, in the order of the file."""
    grid_axis = np.abs(matrix).argmax(axis=1)  # of each axis of the image
    planes = out.transpose(grid_axis)
    low, high, keep_low, keep_high = [], [], [], []
    for axis, length in enumerate(voxels.shape):
        place = matrix[axis, grid_axis[axis]] * np.arange(planes.shape[axis]) + offset[axis]
        below = np.floor(place).astype(int)
        part = place - below
        low.append(np.clip(below, 0, length - 1))
        high.append(np.clip(below + 1, 0, length - 1))
        keep_low.append(np.where((below >= 0) & (below < length), 1 - part, 0).astype(np.float32))
        keep_high.append(np.where((below >= -1) & (below < length - 1), part, 0).astype(np.float32))
    for k in range(planes.shape[2]):
        if keep_low[2][k] == 0 and keep_high[2][k] == 0:
            continue
        plane = voxels[:, :, low[2][k]].T * keep_low[2][k]
        if keep_high[2][k] > 0:
            plane = plane + voxels[:, :, high[2][k]].T * keep_high[2][k]
        plane = plane[low[1]] * keep_low[1][:, None] + plane[high[1]] * keep_high[1][:, None]
        plane = plane[:, low[0]] * keep_low[0] + plane[:, high[0]] * keep_high[0]
        planes[:, :, k] = plane.T
