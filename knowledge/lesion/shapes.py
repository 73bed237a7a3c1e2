"""Spheres and ellipsoids on the template grid, by MNI coordinate.

A voxel belongs to a shape when its centre lies in it or on its surface. Nothing is anti-aliased, so that a shape of
integer centre is the exact mirror image of its counterpart on the other side.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.space.grid import TEMPLATE_GRID, Grid

__all__ = ["ellipsoid_mask", "sphere_mask"]


def ellipsoid_mask(
    centre_mm: Sequence[float], radii_mm: Sequence[float], *, grid: Grid = TEMPLATE_GRID
) -> NDArray[np.bool_]:
    """Mask of an axis-aligned ellipsoid.

    Parameters
    ----------
    centre_mm : sequence of 3 floats
        Centre in MNI mm.
    radii_mm : sequence of 3 floats
        Radii along x, y and z, mm, all above 0.
    grid : Grid
        Grid with axes along x, y and z.

    Returns
    -------
    bool array of the grid's shape
        Voxels whose centre c has sum(((c - centre) / radii)^2) <= 1. Empty where the shape lies outside the grid.

    Raises
    ------
    BywayError
        Centre or radii are not three finite numbers, or a radius is not above 0.

    Examples
    --------
    >>> int(ellipsoid_mask((0, 0, 0), (1, 1, 1)).sum())  # the centre and its six neighbours
    7
    """
    centre, radii = np.asarray(centre_mm, float), np.asarray(radii_mm, float)
    if centre.shape != (3,) or radii.shape != (3,) or not np.isfinite([centre, radii]).all():
        raise BywayError(Fault("shape", "ellipsoid", f"centre {list(centre_mm)}, radii {list(radii_mm)}",
                               "three finite numbers each, in mm"))  # fmt: skip
    if (radii <= 0).any():
        raise BywayError(Fault("shape", "ellipsoid", f"radii {radii.tolist()} mm", "radii above 0 mm"))
    mask = np.zeros(grid.shape, bool)
    corners = grid.to_voxel(np.stack([centre - radii, centre + radii]))
    low = np.clip(np.floor(corners.min(axis=0)).astype(int), 0, grid.shape)
    high = np.clip(np.ceil(corners.max(axis=0)).astype(int) + 1, 0, grid.shape)
    if (high <= low).any():
        return mask
    terms = []
    for axis in range(3):
        index = np.arange(low[axis], high[axis])
        position = index * grid.affine[axis, axis] + grid.affine[axis, 3]
        shape = [1, 1, 1]
        shape[axis] = -1
        terms.append((((position - centre[axis]) / radii[axis]) ** 2).reshape(shape))
    # The slack keeps centres that lie exactly on the surface inside in spite of rounding.
    mask[tuple(slice(a, b) for a, b in zip(low, high, strict=True))] = terms[0] + terms[1] + terms[2] <= 1 + 1e-9
    return mask


def sphere_mask(centre_mm: Sequence[float], radius_mm: float, *, grid: Grid = TEMPLATE_GRID) -> NDArray[np.bool_]:
    """Mask of a sphere of ``radius_mm`` about ``centre_mm`` (MNI mm); see :func:`ellipsoid_mask`.

    Examples
    --------
    >>> int(sphere_mask((-40, 10, 20), 1.5).sum())  # all neighbours but the eight corners, which lie at 1.73 mm
    19
    """
    return ellipsoid_mask(centre_mm, (radius_mm,) * 3, grid=grid)
