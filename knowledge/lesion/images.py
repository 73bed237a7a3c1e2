"""Lesions, label volumes and scans from NIfTI files, and masks back to them.

Whatever cannot be used is refused with one line that names the file, what was found and what would do. Free text in
headers is never kept: it may name a person.
"""

from __future__ import annotations

import gzip
import os
import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import nibabel as nib
import numpy as np
from numpy.typing import NDArray

from byway.knowledge.atomic import write_bytes
from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.lesion.headers import OpenedImage, open_image, raw_voxels, refusal
from byway.knowledge.lesion.lesion import Compartment, CompartmentKind, Lesion
from byway.knowledge.lesion.resample import grid_words, on_same_voxels, to_grid
from byway.knowledge.lesion.values import Values, survey
from byway.knowledge.space.grid import SPACE, TEMPLATE_GRID
from byway.knowledge.space.template import brain_mask

__all__ = ["Scan", "mask_name", "read_labels", "read_lesion", "read_volume", "write_mask"]

_MOST_OUTSIDE = 0.30
nifti1: Any = nib.Nifti1Image  # its constructor carries no types


@dataclass(frozen=True, eq=False)
class Scan:
    """A scan on the template grid, as background.

    Parameters
    ----------
    data : float32 array
        Intensities in the file's own scale (Hounsfield units for CT); 0 where the scan has no voxel.
    notes : tuple of str
        What was done on the way in.
    """

    data: NDArray[np.float32] = field(repr=False)
    notes: tuple[str, ...] = ()


def read_lesion(
    path: str | os.PathLike[str],
    *,
    label: int | None = None,
    graded: bool = False,
    scale: tuple[float, float] | None = None,
    name: str = "lesion",
    kind: CompartmentKind = "core",
    effect: float = 1.0,
    drawn_on: str | None = None,
    boundary_mm: float | None = None,
) -> Lesion:
    """Read a lesion from a NIfTI file in template space.

    Parameters
    ----------
    path : path
        A mask, a label volume (give ``label``) or a graded map (give ``graded``).
    label : int, optional
        Which label of a label volume is the lesion.
    graded : bool
        Read an effect map: values from 0 to 1 as they are, others divided by the largest one.
    scale : pair of float, optional
        For a graded map: the values that mean no effect and full effect, for example ``(-1, -4)`` for z-values of
        atrophy. Values beyond are cut. Negative values are allowed only with it.
    name, kind, effect
        Of the compartment that a mask becomes.
    drawn_on, boundary_mm
        Passed on to the lesion.

    Returns
    -------
    Lesion
        ``notes`` says what was done on the way in, for instance that another grid was resampled (nearest voxel for
        masks, linear for graded maps).

    Raises
    ------
    ImageError
        The file cannot be used: see :func:`byway.knowledge.lesion.headers.open_image`; or it holds NaN or negative
        values, no voxel, labels where a mask was meant, no such label, or lies outside the brain by more than 30 %.
    """
    opened = open_image(path)
    voxels = raw_voxels(opened)
    values = survey(voxels, opened.image.dataobj.slope, opened.image.dataobj.inter)
    _check_values(opened.path, values, negative_allowed=graded and scale is not None)
    if graded:
        return _graded(opened, voxels, values, scale, drawn_on, boundary_mm)
    stored, notes = _mask_value(opened.path, values, label)
    notes += _grid_notes(opened, "nearest voxel")
    mask = _placed(opened, voxels, stored)
    _check_place(opened.path, mask)
    return Lesion((Compartment(name, kind, effect, mask),), None, drawn_on, boundary_mm, (*opened.notes, *notes))


def read_labels(
    path: str | os.PathLike[str],
    *,
    names: Mapping[int, str] | None = None,
    kinds: Mapping[int, CompartmentKind] | None = None,
    effects: Mapping[int, float] | None = None,
) -> Lesion:
    """Read a label volume as a lesion of one compartment a label.

    Parameters
    ----------
    path : path
        A NIfTI file of whole numbers; 0 is background.
    names, kinds, effects : mappings by label, optional
        ``"label 3"``, ``"other"`` and 1 where not given.

    Raises
    ------
    ImageError
        As for :func:`read_lesion`.
    """
    opened = open_image(path)
    voxels = raw_voxels(opened)
    values = survey(voxels, opened.image.dataobj.slope, opened.image.dataobj.inter)
    _check_values(opened.path, values)
    if values.counts is None or not values.whole:
        raise refusal("labels", opened.path, "values that are not whole numbers", "labels", "read it as a graded map")
    placed = {int(value): _placed(opened, voxels, values.stored[value]) for value in values.counts}
    _check_place(opened.path, np.logical_or.reduce(list(placed.values())))
    parts = tuple(
        Compartment((names or {}).get(k, f"label {k}"), (kinds or {}).get(k, "other"), (effects or {}).get(k, 1.0), m)
        for k, m in placed.items()
    )
    return Lesion(parts, None, None, None, (*opened.notes, *_grid_notes(opened, "nearest voxel")))


def read_volume(path: str | os.PathLike[str]) -> Scan:
    """Read a scan in template space, as background.

    The scan is held in memory once as stored (mapped, when it is not compressed) beside its copy on the template
    grid. Voxels that are not numbers read 0, and a note says so.

    Raises
    ------
    ImageError
        The header forbids it: see :func:`byway.knowledge.lesion.headers.open_image`.
    """
    opened = open_image(path)
    voxels = raw_voxels(opened)
    data = _scaled(opened, to_grid(voxels, opened.affine, TEMPLATE_GRID, linear=True))
    notes = (*opened.notes, *_grid_notes(opened, "linear interpolation"))
    broken = ~np.isfinite(data)
    if broken.any():
        data[broken] = 0
        notes += ("voxels that are not finite numbers read 0",)
    return Scan(data, notes)


def mask_name(label: str, *, desc: str | None = None, prefix: str = "") -> str:
    """File name of a mask in BIDS derivative style; anything but letters and digits is left out of its parts.

    Examples
    --------
    >>> mask_name("tumour core", desc="drawn")
    'space-MNI152NLin2009aSym_label-tumourcore_desc-drawn_mask.nii.gz'
    """
    parts = [_plain(prefix)] if _plain(prefix) else []
    parts += [f"space-{SPACE}", f"label-{_plain(label) or 'lesion'}"]
    if desc is not None and _plain(desc):
        parts.append(f"desc-{_plain(desc)}")
    return "_".join([*parts, "mask.nii.gz"])


def write_mask(
    path: str | os.PathLike[str], mask: NDArray[np.bool_], *, label: str = "lesion", desc: str | None = None
) -> Path:
    """Write a mask on the template grid, with sform, qform and their code (MNI152) set and no free text.

    Parameters
    ----------
    path : path
        A folder, in which the file is named by :func:`mask_name`; or a file name that ends in ``.nii.gz``.
    mask : bool array
        On the template grid.
    label, desc : str
        For the name.

    Returns
    -------
    Path
        The file, which is complete or absent, never half written. The same mask gives the same bytes.

    Raises
    ------
    BywayError
        The mask is not on the template grid.
    """
    target = Path(path)
    if not target.name.endswith(".nii.gz"):
        target = target / mask_name(label, desc=desc)
    if mask.shape != TEMPLATE_GRID.shape:
        raise BywayError(Fault("mask-shape", str(target), f"a mask of shape {mask.shape}",
                               f"shape {TEMPLATE_GRID.shape}"))  # fmt: skip
    image: Any = nifti1(mask.astype(np.uint8), TEMPLATE_GRID.affine)
    image.header.set_xyzt_units("mm")
    image.set_sform(TEMPLATE_GRID.affine, "mni")
    image.set_qform(TEMPLATE_GRID.affine, "mni")
    write_bytes(target, gzip.compress(image.to_bytes(), 6, mtime=0))
    return target


def _plain(text: str) -> str:
    return re.sub(r"[^A-Za-z0-9]", "", text)


def _check_values(file: Path, values: Values, *, negative_allowed: bool = False) -> None:
    """Refuse values that no lesion has."""
    if values.broken:
        raise refusal("not-finite", file, f"{values.broken} voxels that are not finite numbers", "numbers of 0 or more")
    if values.least < 0 and not negative_allowed:
        raise refusal("negative", file, f"negative values (down to {values.least:g})", "values of 0 or more",
               "for a map of z-values, give the values that mean no and full effect")  # fmt: skip
    if values.nonzero == 0:
        raise refusal("empty", file, "an empty mask", "at least one voxel that is not 0")


def _mask_value(file: Path, values: Values, label: int | None) -> tuple[list[Any], tuple[str, ...]]:
    """The stored values that are the lesion."""
    if label is not None:
        if values.counts is None or label not in values.counts:
            raise refusal("no-label", file, f"no label {label}", _label_words(values))
        return values.stored[float(label)], ()
    if values.counts is not None and len(values.counts) == 1:
        (only,) = values.counts
        return values.stored[only], () if only == 1 else (f"voxels of value {only:g} were taken as the mask",)
    if values.counts is None or not values.whole:
        raise refusal("graded", file, f"a graded map (values from {values.least:g} to {values.most:g})",
               "a mask of 0 and 1", "read it as a graded effect map, or threshold it")  # fmt: skip
    raise refusal("labels", file, f"{len(values.counts)} labels ({_label_words(values)})", "a mask of 0 and 1",
           "choose one with label= (on the command line --label)")  # fmt: skip


def _label_words(values: Values) -> str:
    if values.counts is None or not values.whole:
        return "no whole-number labels"
    listed = [f"{value:g}: {count} voxels" for value, count in list(values.counts.items())[:12]]
    return ", ".join(listed) + (f" and {len(values.counts) - 12} more" if len(values.counts) > 12 else "")


def _placed(opened: OpenedImage, voxels: NDArray[Any], stored: list[Any]) -> NDArray[np.bool_]:
    """A mask of some stored values on the template grid."""
    chosen = to_grid(voxels, opened.affine, TEMPLATE_GRID, linear=False)
    # Nothing outside the image belongs to it, even where the stored value for "outside" is a label.
    mask = np.isin(chosen, stored)
    if np.isin(0, stored):
        ones = np.broadcast_to(np.uint8(1), opened.shape)
        mask &= to_grid(ones, opened.affine, TEMPLATE_GRID, linear=False).astype(bool)
    if not mask.any():
        raise refusal("empty", opened.path, "a mask that has no voxel left on the template grid", "at least one")
    return mask


def _check_place(file: Path, mask: NDArray[np.bool_]) -> None:
    outside = 1 - np.count_nonzero(mask & brain_mask()) / np.count_nonzero(mask)
    if outside > _MOST_OUTSIDE:
        raise refusal("outside-brain", file, f"a mask of which {outside:.0%} lies outside the brain",
               f"at most {_MOST_OUTSIDE:.0%}", f"check its registration to {SPACE}")  # fmt: skip


def _grid_notes(opened: OpenedImage, how: str) -> tuple[str, ...]:
    if on_same_voxels(opened.shape, opened.affine, TEMPLATE_GRID):
        return ()
    return (f"resampled from {grid_words(opened.shape, opened.affine)} to the template's 1 mm grid ({how})",)


def _scaled(opened: OpenedImage, data: NDArray[np.float32]) -> NDArray[np.float32]:
    """Apply the file's slope and intercept, in place, where the image has voxels."""
    slope, inter = float(opened.image.dataobj.slope), float(opened.image.dataobj.inter)
    if slope != 1:
        data *= np.float32(slope)
    if inter != 0:
        ones = np.broadcast_to(np.uint8(1), opened.shape)
        data[to_grid(ones, opened.affine, TEMPLATE_GRID, linear=False).astype(bool)] += np.float32(inter)
    return data


def _graded(
    opened: OpenedImage,
    voxels: NDArray[Any],
    values: Values,
    scale: tuple[float, float] | None,
    drawn_on: str | None,
    boundary_mm: float | None,
) -> Lesion:
    """A lesion of a graded map."""
    data = _scaled(opened, to_grid(voxels, opened.affine, TEMPLATE_GRID, linear=True))
    if scale is None:
        scale = (0.0, max(1.0, values.most))
    none, full = scale
    if none == full or not np.isfinite(scale).all():
        raise refusal("scale", opened.path, f"a scale from {none:g} to {full:g}", "two different numbers")
    covered = to_grid(np.broadcast_to(np.uint8(1), opened.shape), opened.affine, TEMPLATE_GRID, linear=False) > 0
    data -= np.float32(none)
    data /= np.float32(full - none)
    np.clip(data, 0, 1, out=data)
    data[~covered] = 0
    if not data.any():
        raise refusal("empty", opened.path, "a map without effect anywhere on the template grid", "at least one voxel")
    _check_place(opened.path, data > 0)
    words = f"{none:g} (no effect) to {full:g} (full effect) in the file"
    notes = (*opened.notes, *_grid_notes(opened, "linear interpolation"))
    if (none, full) != (0.0, 1.0):
        notes += (f"graded map read on its own scale: {words}",)
    return Lesion((), data, drawn_on, boundary_mm, notes, words)
