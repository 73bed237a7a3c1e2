"""Transforms to template space."""

from __future__ import annotations

from pathlib import Path

import nibabel as nib
import numpy as np
import pytest

from byway.knowledge.faults import ImageError
from byway.knowledge.space.transforms import read_affine, read_displacement

POINTS = np.array([[0.0, 0, 0], [10, -20, 30], [-5, 5, 5]])
GRID = np.array([[4.0, 0, 0, -40], [0, 4, 0, -40], [0, 0, 4, -40], [0, 0, 0, 1]])


@pytest.mark.parametrize("separator", [" ", ", "])
def test_an_affine_is_read_from_text(tmp_path: Path, separator: str) -> None:
    """Four rows of four numbers, separated by blanks or commas, move points by hand arithmetic."""
    rows = ["1 0 0 5", "0 2 0 0", "0 0 1 -1", "0 0 0 1"]
    path = tmp_path / "to_template.txt"
    path.write_text("\n".join(row.replace(" ", separator) for row in rows))
    np.testing.assert_allclose(read_affine(path).apply(POINTS), [[5, 0, -1], [15, -40, 29], [0, 10, 4]])


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("1 0 0\n0 1 0\n0 0 1", "a table of 3 x 3 numbers"),
        ("1 0 0 0\n0 1 0 0\n0 0 0 0\n0 0 0 1", "a scale of 0 in volume"),
        ("1 0 0 0\n0 1 0 0\n0 0 1 0\n5 0 0 1", "last row"),
        ("1 0 0 nan\n0 1 0 0\n0 0 1 0\n0 0 0 1", "not finite"),
        ("a b c d", "could not convert"),
    ],
)
def test_what_is_no_affine_is_refused(tmp_path: Path, text: str, message: str) -> None:
    """The error says what stands there."""
    path = tmp_path / "to_template.txt"
    path.write_text(text)
    with pytest.raises(ImageError, match=message):
        read_affine(path)


@pytest.mark.parametrize("axes", ["ras", "lps"])
def test_a_displacement_field_is_added_in_its_own_axes(tmp_path: Path, axes: str) -> None:
    """A constant field moves every point by it; told as LPS, its first two components change their sign."""
    vectors = np.zeros((21, 21, 21, 1, 3), np.float32)
    vectors[...] = (3.0, -2.0, 1.0)
    path = tmp_path / "warp.nii.gz"
    nib.save(nib.Nifti1Image(vectors, GRID), path)
    field = read_displacement(path, axes)  # type: ignore[arg-type]
    expected = POINTS + ([3, -2, 1] if axes == "ras" else [-3, 2, 1])
    np.testing.assert_allclose(field.apply(POINTS), expected, atol=1e-5)
    assert np.isnan(field.apply(np.array([[200.0, 0, 0]]))).all()


def test_what_is_no_displacement_field_is_refused(tmp_path: Path) -> None:
    """Another shape, no finite number, or no NIfTI."""
    path = tmp_path / "warp.nii.gz"
    nib.save(nib.Nifti1Image(np.zeros((5, 5, 5), np.float32), GRID), path)
    with pytest.raises(ImageError, match="three components a voxel"):
        read_displacement(path, "ras")
    nib.save(nib.Nifti1Image(np.full((5, 5, 5, 3), np.nan, np.float32), GRID), path)
    with pytest.raises(ImageError, match="no finite number"):
        read_displacement(path, "ras")
    path.write_bytes(b"no image")
    with pytest.raises(ImageError, match=r"warp\.nii\.gz"):
        read_displacement(path, "ras")
