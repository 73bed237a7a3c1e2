"""Tractogram files: TRK, TCK and TRX read one streamline at a time, in a bounded amount of memory.

The file is never held whole. Of more than ``limit`` streamlines an evenly spaced part is kept; streamlines that hold
a number that is not finite are left out; both are counted in the notes. A streamline of more than 2,000 points is
resampled at 0.5 mm. Points are RAS+ mm of the file's own space.
"""

from __future__ import annotations

import json
import warnings
import zipfile
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import IO, Any

import nibabel as nib
import numpy as np
from nibabel.streamlines.tractogram_file import HeaderError, HeaderWarning
from numpy.typing import NDArray

from byway.knowledge.faults import Fault, ImageError
from byway.knowledge.space.curves import resample

__all__ = ["KEPT", "SUFFIXES", "Tractogram", "read_tractogram"]

SUFFIXES = (".trk", ".tck", ".trx")
KEPT = 3000
"""Streamlines kept of one file."""

_OUTSIDE_SHARE = 0.05
_LONGEST_MM = 1000.0
_MANY_POINTS = 2000
_FINE_MM = 0.5


@dataclass(frozen=True)
class Tractogram:
    """Streamlines of one file.

    Parameters
    ----------
    streamlines : list of (n, 3) float32
        Points in RAS+ mm of the file's own space.
    total : int
        Streamlines that the file holds.
    notes : tuple of str
        What was left out, and how many.
    """

    streamlines: list[NDArray[np.float32]]
    total: int
    notes: tuple[str, ...]


def read_tractogram(path: str | Path, limit: int = KEPT) -> Tractogram:
    """Read at most ``limit`` streamlines of a TRK, TCK or TRX file.

    Parameters
    ----------
    path : path
        The file; a TRX may also be a folder of its arrays.
    limit : int
        Of more streamlines than this, every second, fourth, eighth ... is kept, so that at most ``limit`` remain.

    Raises
    ------
    ImageError
        The file cannot be read; it holds no usable streamline; its matrix cannot be inverted; more than 5 % of its
        points lie outside the volume that it declares.
    """
    path = Path(path)
    if path.suffix.lower() not in SUFFIXES:
        raise ImageError(
            Fault("tractogram-kind", str(path), f"a file called {path.name}", f"one of {', '.join(SUFFIXES)}")
        )
    if not path.exists():
        raise ImageError(Fault("tractogram-missing", str(path), "no such file"))
    try:
        with _opened(path) as (streamlines, volume):
            return _gathered(path, streamlines, volume, limit)
    except ImageError:
        raise
    except Exception as error:  # readers of damaged files raise almost anything
        raise ImageError(
            Fault(
                "tractogram-damaged",
                str(path),
                f"{type(error).__name__}: {' '.join(str(error).split())}",
                "a whole TRK, TCK or TRX file",
                "write the file again with the tool that made it",
            )
        ) from error


Volume = tuple[NDArray[np.float64], NDArray[np.float64]]
"""Shape of the declared volume, and RAS+ mm to voxel indices."""


@contextmanager
def _opened(path: Path) -> Iterator[tuple[Iterator[NDArray[np.floating]], Volume | None]]:
    if path.suffix.lower() == ".trx":
        with _trx(path) as opened:
            yield opened
        return
    with warnings.catch_warnings():
        # Of a header without matrix or orientation nibabel warns and assumes one; here that is an error.
        warnings.simplefilter("error", HeaderWarning)
        try:
            load: Any = nib.streamlines.load
            lazy = load(str(path), lazy_load=True)
        except HeaderWarning as error:
            raise _bad_affine(path, "no voxel-to-mm matrix or no orientation") from error
        except HeaderError as error:
            if "affine" in str(error):
                raise _bad_affine(path, "a voxel-to-mm matrix that cannot be inverted") from error
            raise
    volume = None
    if path.suffix.lower() == ".trk":
        volume = _volume(path, lazy.header["dimensions"], lazy.header["voxel_to_rasmm"])
    yield iter(lazy.streamlines), volume


def _volume(path: Path, shape: Any, affine: Any) -> Volume:
    matrix = np.asarray(affine, float)
    whole = matrix.shape == (4, 4) and bool(np.isfinite(matrix).all())
    if not whole or abs(np.linalg.det(matrix[:3, :3])) < 1e-6:
        raise _bad_affine(path, "a voxel-to-mm matrix that cannot be inverted")
    return np.asarray(shape, float), np.linalg.inv(matrix)


def _bad_affine(path: Path, found: str) -> ImageError:
    return ImageError(
        Fault(
            "tractogram-affine",
            str(path),
            found,
            "the voxel-to-mm matrix of the image that the fibres were tracked on",
            "write the file again with that image as its reference",
        )
    )


@contextmanager
def _trx(path: Path) -> Iterator[tuple[Iterator[NDArray[np.floating]], Volume | None]]:
    """A TRX: a zip, or a folder, of ``header.json``, ``positions.3.<type>`` and ``offsets.<type>``."""
    if path.is_dir():
        names = [each.name for each in path.iterdir()]

        @contextmanager
        def entry(name: str) -> Iterator[IO[bytes]]:
            with (path / name).open("rb") as stream:
                yield stream

        with _trx_entries(path, names, entry) as opened:
            yield opened
        return
    with zipfile.ZipFile(path) as archive, _trx_entries(path, archive.namelist(), archive.open) as opened:
        yield opened


@contextmanager
def _trx_entries(path: Path, names: list[str], entry: Any) -> Iterator[tuple[Iterator[NDArray[np.floating]], Volume]]:
    with entry("header.json") as stream:
        header = json.loads(stream.read())
    offsets_name = next(name for name in names if name.startswith("offsets."))
    positions_name = next(name for name in names if name.startswith("positions.3."))
    with entry(offsets_name) as stream:
        offsets = np.frombuffer(stream.read(), np.dtype(offsets_name.rsplit(".", 1)[1]))
    count, vertices = int(header["NB_STREAMLINES"]), int(header["NB_VERTICES"])
    bounds = np.concatenate([offsets[:count].astype(np.int64), [vertices]])
    kind = np.dtype(positions_name.rsplit(".", 1)[1])

    with entry(positions_name) as stream:

        def streamlines() -> Iterator[NDArray[np.floating]]:
            for length in np.diff(bounds):
                data = stream.read(int(length) * 3 * kind.itemsize)
                yield np.frombuffer(data, kind).reshape(int(length), 3)

        yield streamlines(), _volume(path, header["DIMENSIONS"], header["VOXEL_TO_RASMM"])


def _gathered(path: Path, streamlines: Iterator[NDArray[np.floating]], volume: Volume | None, limit: int) -> Tractogram:
    kept: list[NDArray[np.float32]] = []
    stride = 1
    total = unsound = points = outside = 0
    for number, raw in enumerate(streamlines):
        total += 1
        line = np.array(raw, np.float32)
        if len(line) < 2 or not np.isfinite(line).all() or np.abs(line).max() > _LONGEST_MM:
            unsound += 1
            continue
        points += len(line)
        if volume is not None:
            outside += _outside(line, volume)
        if number % stride == 0:
            kept.append(line if len(line) <= _MANY_POINTS else resample(line, _FINE_MM).astype(np.float32))
            if len(kept) > limit:
                kept = kept[::2]
                stride *= 2
    _refuse(path, total, unsound, points, outside)
    notes = []
    if unsound:
        notes.append(f"{path.name}: {unsound} of {total} streamlines left out (a single point, or one not finite)")
    if outside:
        notes.append(f"{path.name}: {outside} of {points} points lie outside the file's volume")
    if stride > 1:
        notes.append(f"{path.name}: {len(kept)} of {total} streamlines kept, evenly spaced")
    return Tractogram(kept, total, tuple(notes))


def _outside(line: NDArray[np.float32], volume: Volume) -> int:
    shape, inverse = volume
    voxels = line @ inverse[:3, :3].T + inverse[:3, 3]
    return int(((voxels < -0.5) | (voxels > shape - 0.5)).any(axis=1).sum())


def _refuse(path: Path, total: int, unsound: int, points: int, outside: int) -> None:
    if total == 0:
        raise ImageError(
            Fault("tractogram-empty", str(path), "no streamline", "at least one", "check that the export was complete")
        )
    if unsound == total:
        raise ImageError(
            Fault(
                "tractogram-values",
                str(path),
                f"{total} streamlines, none with two or more finite points",
                "points in mm",
            )
        )
    if outside > _OUTSIDE_SHARE * points:
        raise ImageError(
            Fault(
                "tractogram-outside",
                str(path),
                f"{outside / points:.0%} of the points lie outside the volume that the file declares",
                "at most 5 %",
                "the matrix in its header is wrong: write the file with the image that the fibres were tracked on",
            )
        )
