"""Opening image files: everything that a header can tell is checked before any voxel is read."""

from __future__ import annotations

import gzip
import os
import zlib
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import nibabel as nib
import numpy as np
from nibabel.filebasedimages import ImageFileError
from nibabel.spatialimages import HeaderDataError
from numpy.typing import NDArray

from byway.knowledge.faults import Fault, ImageError
from byway.knowledge.space.grid import SPACE, TEMPLATE_GRID

__all__ = ["MOST_BYTES", "MOST_VOXELS_ALONG", "OpenedImage", "box_mm", "open_image", "raw_voxels", "refusal"]

MOST_VOXELS_ALONG = 2048
MOST_BYTES = 1_600_000_000  # a 512 x 512 x 760 scan in 64-bit floats
_BEYOND_MM = 40.0
_WANTED = "a NIfTI file (.nii or .nii.gz)"
_GZIP, _DICOM = b"\x1f\x8b", b"DICM"
_KINDS = "iuf"
_ENDINGS = tuple(f".{ending}{packed}" for ending in ("nii", "hdr", "img") for packed in ("", ".gz"))
_CHUNK = 1 << 24


@dataclass(frozen=True)
class OpenedImage:
    """A three-dimensional image whose header has passed all checks.

    Parameters
    ----------
    path : Path
        The file.
    image : nibabel image
        Its voxels have not been read.
    shape : tuple of int
        Voxels along its axes.
    affine : (4, 4) float array
        Voxel indices to mm, RAS+, template space.
    notes : tuple of str
        What a reader should know about how the header was taken.
    """

    path: Path
    image: Any
    shape: tuple[int, int, int]
    affine: NDArray[np.float64]
    notes: tuple[str, ...]


def refusal(rule: str, path: Path, found: str, expected: str = "", remedy: str = "") -> ImageError:
    """An error about a file, to be raised."""
    return ImageError(Fault(rule, str(path), found, expected, remedy))


def open_image(path: str | os.PathLike[str]) -> OpenedImage:
    """Open a NIfTI file in template space and check its header.

    Raises
    ------
    ImageError
        The file is missing, a folder, no NIfTI, truncated, too large, RGB or complex, has an impossible header, more
        than one volume, no place in space, a left and right that cannot be told, or a field of view that is not the
        template's. The error names the file, what was found and what would do.
    """
    file = Path(path)
    _check_file(file)
    image = _opened(file)
    shape = _checked_shape(file, image)
    affine, notes = _checked_affine(file, image.header)
    _check_field_of_view(file, shape, affine)
    return OpenedImage(file, image, shape, affine, notes)


def raw_voxels(opened: OpenedImage) -> NDArray[Any]:
    """The voxels as stored (slope and intercept not applied), three-dimensional, in memory at most once.

    A file that is not compressed is mapped, not read.

    Raises
    ------
    ImageError
        The file ends early or its compressed data are damaged.
    """
    proxy = opened.image.dataobj
    file = Path(opened.image.file_map["image"].filename)
    try:
        if not file.name.endswith(".gz"):
            mapped: NDArray[Any] = np.memmap(file, proxy.dtype, "r", int(proxy.offset), opened.shape, "F")
            return mapped
        voxels = np.empty(opened.shape, proxy.dtype, "F")
        with gzip.open(file) as stream:
            stream.seek(int(proxy.offset))
            # Straight into place: nibabel's own reader would hold a large packed scan twice while it unpacks.
            flat: Any = voxels.reshape(-1, order="F").view(np.uint8)
            unread = memoryview(flat)
            while len(unread):
                got = stream.readinto(unread[:_CHUNK])
                if not got:
                    raise EOFError
                unread = unread[got:]
    except (EOFError, OSError, ValueError, zlib.error):
        raise refusal(
            "truncated", opened.path, "voxels that break off or are damaged", "a whole file", "copy or export it again"
        ) from None
    return voxels


def box_mm(shape: tuple[int, ...], affine: NDArray[np.float64]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Lowest and highest coordinates (mm) of an image's outer voxel faces."""
    corners = np.array(list(np.ndindex(2, 2, 2))) * np.array(shape[:3]) - 0.5
    mm = corners @ affine[:3, :3].T + affine[:3, 3]
    return mm.min(axis=0), mm.max(axis=0)


def _check_file(file: Path) -> None:
    """Refuse what is plainly no NIfTI, before nibabel sees it."""
    if file.is_dir():
        slices = sum(1 for entry in sorted(file.iterdir())[:200] if entry.is_file() and _is_dicom(entry))
        found = f"a folder with {slices} DICOM files" if slices else "a folder"
        raise refusal("not-nifti", file, found, _WANTED, "convert the series to NIfTI first" if slices else "")
    if not file.is_file():
        raise refusal("missing-file", file, "no such file")
    if file.stat().st_size == 0:
        raise refusal("not-nifti", file, "an empty file", _WANTED)
    if _is_dicom(file):
        raise refusal("not-nifti", file, "a DICOM file", _WANTED, "convert the series to NIfTI first")
    if not file.name.lower().endswith(_ENDINGS):
        raise refusal("not-nifti", file, f"a file of another kind ({file.suffix or 'no suffix'})", _WANTED)
    with file.open("rb") as stream:
        gzipped = stream.read(2) == _GZIP
    if file.name.endswith(".gz") and not gzipped:
        raise refusal("not-nifti", file, "a name that ends in .gz on a file that is not compressed", _WANTED,
               "rename it to .nii if it is a NIfTI file")  # fmt: skip
    if gzipped and not file.name.endswith(".gz"):
        raise refusal("not-nifti", file, "a compressed file without .gz at the end of its name", _WANTED,
               "rename it to .nii.gz if it is a NIfTI file")  # fmt: skip


def _is_dicom(file: Path) -> bool:
    with file.open("rb") as stream:
        return stream.read(132)[128:] == _DICOM


def _opened(file: Path) -> Any:
    """The image, unread."""
    try:
        image = nib.loadsave.load(file)
    except (EOFError, gzip.BadGzipFile, zlib.error):
        raise refusal("truncated", file, "compressed data that break off or are damaged", "a whole file",
               "copy or export it again") from None  # fmt: skip
    except (ImageFileError, HeaderDataError, ValueError, OSError, KeyError):
        raise refusal("not-nifti", file, "not a NIfTI file", _WANTED) from None
    # A NIfTI class of nibabel derives from the older format's class, so the order matters.
    if isinstance(image, (nib.Nifti1Pair, nib.Nifti2Pair)):
        return image
    if isinstance(image, nib.AnalyzeImage):
        raise refusal("orientation", file, "an Analyze file, whose left and right cannot be told", _WANTED)
    raise refusal("not-nifti", file, f"a {type(image).__name__.removesuffix('Image')} file", _WANTED)


def _checked_shape(file: Path, image: Any) -> tuple[int, int, int]:
    """Three dimensions of a size that can be read."""
    shape = tuple(int(n) for n in image.shape)
    words = " x ".join(map(str, shape)) or "0"
    dtype = image.get_data_dtype()
    if dtype.fields is not None:
        raise refusal("voxel-type", file, "colour (RGB) voxels", "one number a voxel", "export it in grey levels")
    if dtype.kind not in _KINDS or dtype.itemsize > 8:
        raise refusal("voxel-type", file, f"voxels of type {dtype}", "whole or real numbers of at most 64 bits")
    if any(n < 1 for n in shape) or any(n > MOST_VOXELS_ALONG for n in shape[:3]):
        raise refusal("dimensions", file, f"a header that announces {words} voxels",
               f"1 to {MOST_VOXELS_ALONG} along each axis")  # fmt: skip
    volumes = int(np.prod(shape[3:], dtype=np.int64))
    if volumes > 1:
        raise refusal(
            "volumes", file, f"{volumes} volumes ({words})", "one three-dimensional volume", "save one of them"
        )
    if len(shape) < 3:
        raise refusal("dimensions", file, f"{len(shape)} dimensions ({words})", "three")
    size = int(np.prod(shape[:3], dtype=np.int64)) * dtype.itemsize
    if size > MOST_BYTES:
        raise refusal("too-large", file, f"{words} voxels, {size / 1e9:.1f} GB", f"at most {MOST_BYTES / 1e9:.1f} GB",
               "crop it, or resample it to 1 mm")  # fmt: skip
    data_file = Path(image.file_map["image"].filename)
    if not data_file.name.endswith(".gz"):
        needed = int(image.dataobj.offset) + size
        if data_file.stat().st_size < needed:
            raise refusal("truncated", file, f"{data_file.stat().st_size} of {needed} bytes", "a whole file",
                   "copy or export it again")  # fmt: skip
    return shape[0], shape[1], shape[2]


def _checked_affine(file: Path, header: Any) -> tuple[NDArray[np.float64], tuple[str, ...]]:
    """The affine to use, and what to say about it."""
    places = {"sform": header.get_sform(coded=True), "qform": _qform(file, header)}
    known = {name: (affine, int(code)) for name, (affine, code) in places.items() if int(code) > 0}
    if not known:
        raise refusal("no-place", file, "neither sform nor qform", "an affine to template space",
               "save it with its sform set")  # fmt: skip
    turns = {}
    for name, (affine, _) in known.items():
        turn = float(np.linalg.det(affine[:3, :3])) if np.isfinite(affine).all() else 0.0
        if abs(turn) < 1e-9:
            raise refusal("orientation", file, f"a {name} that gives voxels no volume: left and right cannot be told",
                   "an affine that can be inverted")  # fmt: skip
        turns[name] = turn
    if len(turns) == 2 and turns["sform"] * turns["qform"] < 0:
        raise refusal("orientation", file, "sform and qform that swap left and right: the sides cannot be told",
               "two that agree", "delete the wrong one")  # fmt: skip
    affine, code = known.get("sform", known.get("qform", (np.eye(4), 0)))
    notes = () if code in (3, 4) else ("the header does not name the template space; its mm were taken to be in it",)
    return np.asarray(affine, float), notes


def _qform(file: Path, header: Any) -> tuple[NDArray[np.float64] | None, int]:
    try:
        affine, code = header.get_qform(coded=True)
    except (ValueError, HeaderDataError):
        if int(header["sform_code"]) > 0:  # the sform goes first anyway
            return None, 0
        raise refusal("orientation", file, "a qform that is no rotation: left and right cannot be told",
               "a valid qform, or an sform alone") from None  # fmt: skip
    return affine, int(code)


def _check_field_of_view(file: Path, shape: tuple[int, ...], affine: NDArray[np.float64]) -> None:
    """Refuse an image that cannot lie in template space."""
    low, high = box_mm(shape, affine)
    want_low, want_high = box_mm(TEMPLATE_GRID.shape, TEMPLATE_GRID.affine)
    shared = np.prod(np.clip(np.minimum(high, want_high) - np.maximum(low, want_low), 0, None))
    beyond = max(float((want_low - low).max()), float((high - want_high).max()))
    if beyond <= _BEYOND_MM and shared >= 0.25 * np.prod(want_high - want_low):
        return
    differ = float(np.abs(np.concatenate([low - want_low, high - want_high])).max())
    raise refusal(
        "template-mismatch",
        file,
        f"a field of view of {_box_words(low, high)}, which differs from the template's by up to {differ:.0f} mm",
        f"about {_box_words(want_low, want_high)}",
        f"register it to {SPACE} first",
    )


def _box_words(low: NDArray[np.float64], high: NDArray[np.float64]) -> str:
    spans = (f"{axis} {a:.0f} to {b:.0f}" for axis, a, b in zip("xyz", low, high, strict=True))
    return ", ".join(spans) + " mm"
