"""The template volumes: where they come from, their grid, and what they show at known places."""

from __future__ import annotations

import importlib.util
import subprocess
import sys

import numpy as np
import pytest

from byway.knowledge.faults import ImageError
from byway.knowledge.space import template as module
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.space.template import brain_mask, template_files, template_hash, template_volume


def value(volume: np.ndarray, *place_mm: float) -> float:
    """Value at the voxel nearest to a place in mm."""
    i, j, k = np.rint(TEMPLATE_GRID.to_voxel(np.array([place_mm]))).astype(int)[0]
    return float(volume[i, j, k])


def test_volumes_are_scaled_read_only_and_exactly_symmetric() -> None:
    """Each volume lies on the grid, in [0, 1], cannot be written, and is its own mirror image about x = 0."""
    for tissue in ("t1", "gm", "wm"):
        volume = template_volume(tissue)
        assert volume.shape == TEMPLATE_GRID.shape
        assert volume.dtype == np.float32
        assert 0.0 == volume.min() < volume.max() <= 1.0
        assert not volume.flags.writeable
        assert np.array_equal(volume, volume[::-1])


def test_tissues_lie_where_anatomy_has_them() -> None:
    """Genu and capsule are white, head of the caudate grey (common practice, no source); outside there is no brain."""
    assert value(template_volume("wm"), 0, 27, 4) > 0.9
    assert value(template_volume("wm"), -25, -18, 11) > 0.8
    assert value(template_volume("gm"), -12, 14, 8) > 0.8
    assert value(brain_mask(), -12, 14, 8) == 1
    assert value(brain_mask(), -90, 90, 90) == 0


def test_nilearn_itself_is_never_imported() -> None:
    """Reading the template leaves nilearn out of the interpreter: its import is slow."""
    code = (
        "import sys; from byway.knowledge.space.template import template_volume; template_volume('t1'); "
        "sys.exit('nilearn' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


def test_a_missing_package_is_told(monkeypatch: pytest.MonkeyPatch) -> None:
    """Without nilearn the error names the package and the remedy."""
    monkeypatch.setattr(importlib.util, "find_spec", lambda name: None)
    with pytest.raises(ImageError, match="nilearn: the package is not installed; install nilearn"):
        template_files.__wrapped__()


def test_missing_volumes_are_told(monkeypatch: pytest.MonkeyPatch) -> None:
    """A wheel without the volumes is told by the names of the files."""
    names = {tissue: f"absent_{tissue}.nii.gz" for tissue in ("t1", "gm", "wm")}
    monkeypatch.setattr(module, "_NAMES", names)
    with pytest.raises(ImageError, match=r"no absent_t1\.nii\.gz"):
        template_files.__wrapped__()


def test_hash_is_stable() -> None:
    """The hash of the files is a SHA-256 and does not change within a session."""
    assert template_hash() == template_hash.__wrapped__()
    assert len(template_hash()) == 64
