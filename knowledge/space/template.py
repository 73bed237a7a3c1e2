"""Template volumes: T1, grey and white matter of the MNI152 2009 symmetric average, read from nilearn's wheel.

nilearn itself is never imported (its import costs more than everything here together): the files are found beside
its package. The volumes are exactly symmetric about x = 0, so anything built on the left can be mirrored.
"""

from __future__ import annotations

import hashlib
import importlib.util
from functools import cache
from pathlib import Path
from typing import Any, Literal, cast

import nibabel as nib
import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import Fault, ImageError
from byway.knowledge.space.grid import TEMPLATE_GRID

__all__ = ["Tissue", "brain_mask", "template_files", "template_hash", "template_volume"]

Tissue = Literal["t1", "gm", "wm"]
_NAMES = {tissue: f"mni_icbm152_{tissue}_tal_nlin_sym_09a_converted.nii.gz" for tissue in ("t1", "gm", "wm")}
_FULL_SCALE = 255.0
_BRAIN_TISSUE = 0.3


@cache
def template_files() -> dict[Tissue, Path]:
    """Paths of the three template volumes inside the installed nilearn package.

    Raises
    ------
    ImageError
        If nilearn is not installed, or its wheel no longer carries the volumes.
    """
    spec = importlib.util.find_spec("nilearn")
    if spec is None or spec.origin is None:
        raise ImageError(Fault("template-missing", "nilearn", "the package is not installed", remedy="install nilearn"))
    folder = Path(spec.origin).parent / "datasets" / "data"
    files: dict[Tissue, Path] = {"t1": folder / _NAMES["t1"], "gm": folder / _NAMES["gm"], "wm": folder / _NAMES["wm"]}
    missing = [path.name for path in files.values() if not path.is_file()]
    if missing:
        raise ImageError(
            Fault(
                "template-missing",
                str(folder),
                f"no {', '.join(missing)}",
                "the MNI152 2009 volumes that nilearn 0.11 and later carry",
                "install such a version of nilearn",
            )
        )
    return files


@cache
def template_hash() -> str:
    """Hash of the template files' bytes, part of the key of everything built from them."""
    digest = hashlib.sha256()
    for path in template_files().values():
        digest.update(path.read_bytes())
    return digest.hexdigest()


@cache
def template_volume(tissue: Tissue) -> NDArray[np.float32]:
    """One volume of the template on ``TEMPLATE_GRID``, read-only.

    Parameters
    ----------
    tissue : {"t1", "gm", "wm"}
        ``"t1"`` is the skull-stripped T1 average scaled to [0, 1]; ``"gm"`` and ``"wm"`` are tissue probabilities.

    Returns
    -------
    (197, 233, 189) float32 array in [0, 1]

    Raises
    ------
    ImageError
        If the file is missing or lies on another grid.

    Examples
    --------
    The middle of the callosal genu is white matter:

    >>> i, j, k = 0 + 98, 27 + 134, 4 + 72
    >>> bool(template_volume("wm")[i, j, k] > 0.9)
    True
    """
    path = template_files()[tissue]
    image = nib.Nifti1Image.from_filename(path)
    if image.shape != TEMPLATE_GRID.shape or not np.allclose(image.affine, TEMPLATE_GRID.affine):
        raise ImageError(
            Fault("template-grid", str(path), f"grid {image.shape}", f"the 1 mm grid {TEMPLATE_GRID.shape}")
        )
    stored = cast(Any, image.dataobj).get_unscaled()
    volume = np.asarray(stored, np.float32) / np.float32(_FULL_SCALE)
    volume.setflags(write=False)
    return volume


@cache
def brain_mask() -> NDArray[np.bool_]:
    """Voxels of brain tissue or of fluid inside it: wherever the skull-stripped T1 average has signal, or tissue."""
    tissue = template_volume("gm") + template_volume("wm")
    mask = (template_volume("t1") > 0) | (tissue > _BRAIN_TISSUE)
    mask.setflags(write=False)
    return np.asarray(mask)
