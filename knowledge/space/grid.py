"""The template grid: MNI152 2009, 1 mm, as nilearn carries it. Space name after TemplateFlow."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

__all__ = ["SPACE", "TEMPLATE_GRID", "Grid"]

SPACE = "MNI152NLin2009aSym"


@dataclass(frozen=True)
class Grid:
    """A voxel grid in a named space.

    Parameters
    ----------
    shape : tuple of int
        Voxels along x, y, z.
    affine : (4, 4) float array
        Voxel indices to mm, RAS+.
    space : str
        Name of the space that the mm are in.
    """

    shape: tuple[int, int, int]
    affine: NDArray[np.float64]
    space: str = SPACE
    inverse: NDArray[np.float64] = field(init=False, repr=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "inverse", np.linalg.inv(self.affine))

    @property
    def voxel_ml(self) -> float:
        """Volume of a voxel in ml."""
        return float(abs(np.linalg.det(self.affine[:3, :3]))) / 1000.0

    @property
    def size(self) -> int:
        """Number of voxels."""
        return int(np.prod(self.shape))

    def to_voxel(self, points_mm: NDArray[np.floating]) -> NDArray[np.float64]:
        """Voxel coordinates (float) of (n, 3) points in mm."""
        return np.asarray(points_mm, float) @ self.inverse[:3, :3].T + self.inverse[:3, 3]

    def to_mm(self, voxels: NDArray[np.floating] | NDArray[np.integer]) -> NDArray[np.float64]:
        """Coordinates in mm of (n, 3) voxel indices."""
        return np.asarray(voxels, float) @ self.affine[:3, :3].T + self.affine[:3, 3]

    def flat_index(self, points_mm: NDArray[np.floating]) -> NDArray[np.int64]:
        """C-order index of the voxel that holds each of (n, 3) points in mm; -1 outside the grid."""
        ijk = np.rint(self.to_voxel(points_mm)).astype(np.int64)
        inside = np.all((ijk >= 0) & (ijk < np.array(self.shape)), axis=-1)
        flat = (ijk[..., 0] * self.shape[1] + ijk[..., 1]) * self.shape[2] + ijk[..., 2]
        return np.where(inside, flat, -1)


TEMPLATE_GRID = Grid(
    (197, 233, 189),
    np.array([[1.0, 0, 0, -98], [0, 1, 0, -134], [0, 0, 1, -72], [0, 0, 0, 1]]),
)
