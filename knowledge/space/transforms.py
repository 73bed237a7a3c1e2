"""Transforms of points from a person's own space (native mm) to the template's mm, given by the site, never guessed."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Literal, Protocol

import nibabel as nib
import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import map_coordinates

from byway.knowledge.faults import Fault, ImageError
from byway.knowledge.space.grid import Grid

__all__ = ["AffineTransform", "Axes", "DisplacementField", "Transform", "read_affine", "read_displacement"]

Axes = Literal["ras", "lps"]
_FLIP = np.array([-1.0, -1.0, 1.0])


class Transform(Protocol):
    """Anything that takes (n, 3) points in native mm to template mm."""

    def apply(self, points_mm: NDArray[np.floating]) -> NDArray[np.float64]:
        """Points in template mm; NaN where the transform is not defined."""
        ...


@dataclass(frozen=True)
class AffineTransform:
    """Native RAS+ mm to template RAS+ mm by a 4 x 4 matrix.

    >>> shift = AffineTransform(np.array([[1.0, 0, 0, 5], [0, 1, 0, 0], [0, 0, 1, 0], [0, 0, 0, 1]]))
    >>> shift.apply(np.array([[1.0, 2.0, 3.0]])).tolist()
    [[6.0, 2.0, 3.0]]
    """

    matrix: NDArray[np.float64]

    def apply(self, points_mm: NDArray[np.floating]) -> NDArray[np.float64]:
        """Points in template mm."""
        return np.asarray(np.asarray(points_mm, float) @ self.matrix[:3, :3].T + self.matrix[:3, 3])


@dataclass(frozen=True)
class DisplacementField:
    """Native RAS+ mm to template RAS+ mm by a vector, in mm, that is added to each native point.

    Parameters
    ----------
    grid : Grid
        Grid of the field in native mm.
    vectors_mm : (x, y, z, 3) float array
        Displacements in mm along R, A, S.
    """

    grid: Grid
    vectors_mm: NDArray[np.floating]

    def apply(self, points_mm: NDArray[np.floating]) -> NDArray[np.float64]:
        """Points in template mm; NaN outside the field."""
        points = np.asarray(points_mm, float)
        voxels = self.grid.to_voxel(points)
        parts = [
            map_coordinates(self.vectors_mm[..., axis], voxels.T, order=1, mode="constant", cval=np.nan)
            for axis in range(3)
        ]
        return np.asarray(points + np.column_stack(parts))


def read_affine(path: str | Path) -> AffineTransform:
    """Read a 4 x 4 matrix, native RAS+ mm to template RAS+ mm, from a text file of numbers.

    Raises
    ------
    ImageError
        If the file is not such a matrix, or the matrix cannot be inverted.
    """
    path = Path(path)
    try:
        matrix = np.loadtxt(path, dtype=float, ndmin=2, delimiter="," if "," in path.read_text("utf-8") else None)
    except (OSError, ValueError) as error:
        raise ImageError(
            Fault("transform-text", str(path), str(error), "four rows of four numbers", "write the matrix as text")
        ) from error
    problem = _affine_problem(matrix)
    if problem:
        raise ImageError(
            Fault("transform-affine", str(path), problem, "a 4 x 4 matrix that can be inverted, last row 0 0 0 1")
        )
    return AffineTransform(matrix)


def _affine_problem(matrix: NDArray[np.float64]) -> str:
    if matrix.shape != (4, 4):
        return f"a table of {matrix.shape[0]} x {matrix.shape[1]} numbers"
    if not np.isfinite(matrix).all():
        return "numbers that are not finite"
    if not np.allclose(matrix[3], [0, 0, 0, 1]):
        return f"last row {matrix[3].tolist()}"
    size = abs(float(np.linalg.det(matrix[:3, :3])))
    return f"a scale of {size:.3g} in volume" if not 0.05 < size < 20.0 else ""


def read_displacement(path: str | Path, axes: Axes) -> DisplacementField:
    """Read a displacement field from a NIfTI volume of three components (in mm) on the native grid.

    Parameters
    ----------
    path : path
        A volume of shape (x, y, z, 3) or (x, y, z, 1, 3).
    axes : {"ras", "lps"}
        Directions of the three components. Tools differ, and the file does not say, so it must be told.

    Raises
    ------
    ImageError
        If the file cannot be read, has another shape, or holds no finite number.
    """
    try:
        image = nib.Nifti1Image.from_filename(str(path))
        vectors = np.asarray(image.dataobj, np.float32)
    except (OSError, ValueError, nib.filebasedimages.ImageFileError) as error:
        raise ImageError(Fault("transform-file", str(path), str(error), "a NIfTI volume")) from error
    if vectors.ndim == 5 and vectors.shape[3] == 1:
        vectors = vectors[:, :, :, 0]
    if vectors.ndim != 4 or vectors.shape[3] != 3:
        raise ImageError(
            Fault("transform-shape", str(path), f"shape {vectors.shape}", "three components a voxel, in mm")
        )
    if not np.isfinite(vectors).any():
        raise ImageError(Fault("transform-values", str(path), "no finite number", "displacements in mm"))
    if axes == "lps":
        vectors = vectors * _FLIP.astype(np.float32)
    shape = (int(vectors.shape[0]), int(vectors.shape[1]), int(vectors.shape[2]))
    return DisplacementField(Grid(shape, np.asarray(image.affine, float), "native"), vectors)
