"""Closed surfaces of masks: the faces between inside and outside, smoothed so that steps of the grid do not show."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

__all__ = ["Surface", "mask_surface"]

SHRINK, SWELL = 0.5, -0.53  # alternate steps that smooth without shrinking (Taubin 1995, from memory)


class Surface(NamedTuple):
    """Vertices (n, 3) in mm and triangles (m, 3) as vertex numbers."""

    vertices_mm: NDArray[np.float32]
    triangles: NDArray[np.int32]


def mask_surface(
    mask: NDArray[np.bool_], affine: NDArray[np.float64], *, step: int = 1, smoothing: int = 8
) -> Surface:
    """The boundary of a mask.

    Parameters
    ----------
    mask : (i, j, k) bool array
        Inside.
    affine : (4, 4) array
        Voxel indices to mm.
    step : int
        Voxels along the side of a block; a block is inside where more than half of it is.
    smoothing : int
        Rounds of smoothing; 0 leaves the blocks.

    Returns
    -------
    Surface
        Empty for an empty mask.

    Examples
    --------
    >>> cube = np.zeros((3, 3, 3), bool); cube[1, 1, 1] = True
    >>> surface = mask_surface(cube, np.eye(4), smoothing=0)
    >>> len(surface.vertices_mm), len(surface.triangles)  # eight corners, two triangles a face
    (8, 12)
    """
    where = np.argwhere(mask)
    if len(where) == 0:
        return Surface(np.empty((0, 3), np.float32), np.empty((0, 3), np.int32))
    low, high = where.min(0), where.max(0) + 1
    coarse = _blocks(mask[tuple(slice(a, b) for a, b in zip(low, high, strict=True))], step)
    solid = np.pad(coarse, 1)
    quads = np.concatenate([_faces(solid, axis) for axis in range(3)])
    corners, flat = np.unique(quads.reshape(-1), return_inverse=True)
    quads = flat.reshape(-1, 4).astype(np.int32)
    shape = tuple(n + 1 for n in solid.shape)
    points = np.stack(np.unravel_index(corners, shape), axis=1).astype(float)
    points = _smooth(points, quads, smoothing)
    voxels = (points - 1.0) * step + low - 0.5
    mm = voxels @ affine[:3, :3].T + affine[:3, 3]
    triangles = np.concatenate([quads[:, [0, 1, 2]], quads[:, [0, 2, 3]]])
    return Surface(mm.astype(np.float32), triangles)


def _blocks(mask: NDArray[np.bool_], step: int) -> NDArray[np.bool_]:
    """Blocks that are more than half inside; a mask that would vanish keeps its fullest block."""
    if step == 1:
        return mask
    padded = np.pad(mask, [(0, -n % step) for n in mask.shape])
    i, j, k = (n // step for n in padded.shape)
    share = padded.reshape(i, step, j, step, k, step).mean(axis=(1, 3, 5))
    return np.asarray(share > min(0.5, float(share.max()) - 1e-9))


def _faces(solid: NDArray[np.bool_], axis: int) -> NDArray[np.int64]:
    """Corner numbers, (n, 4), of the faces across one axis, turned so that their normals point outwards."""
    moved = np.moveaxis(solid, axis, 0)
    changes = np.diff(moved.astype(np.int8), axis=0)
    shape = tuple(n + 1 for n in solid.shape)
    others = [a for a in range(3) if a != axis]
    sides = []
    for sign in (-1, 1):
        at = np.argwhere(changes == sign)
        base = np.empty_like(at)
        base[:, axis] = at[:, 0] + 1
        base[:, others[0]], base[:, others[1]] = at[:, 1], at[:, 2]
        ring = [(0, 0), (1, 0), (1, 1), (0, 1)]
        outward = (sign == -1) == (axis != 1)
        corners = []
        for a, b in ring if outward else ring[::-1]:
            corner = base.copy()
            corner[:, others[0]] += a
            corner[:, others[1]] += b
            corners.append(np.ravel_multi_index(tuple(corner.T), shape))
        sides.append(np.stack(corners, axis=1))
    return np.concatenate(sides)


def _smooth(points: NDArray[np.float64], quads: NDArray[np.int32], rounds: int) -> NDArray[np.float64]:
    """Move every vertex towards the mean of its neighbours and back, in turn."""
    if rounds == 0:
        return points
    edges = np.concatenate([quads[:, [i, (i + 1) % 4]] for i in range(4)])
    n = len(points)
    joined = sparse.csr_matrix((np.ones(len(edges)), (edges[:, 0], edges[:, 1])), (n, n))
    joined = ((joined + joined.T) > 0).astype(float)
    mean = sparse.diags(1.0 / np.asarray(joined.sum(axis=1)).ravel()) @ joined
    for _ in range(rounds):
        for amount in (SHRINK, SWELL):
            points = points + amount * (mean @ points - points)
    return points
