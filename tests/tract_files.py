"""Tractogram files for tests, written as the open formats have them. All invented."""

from __future__ import annotations

import json
import zipfile
from pathlib import Path

import nibabel as nib
import numpy as np

__all__ = ["NATIVE", "invented_bundle", "write_big_trk", "write_tck", "write_trk", "write_trx"]

NATIVE = np.array([[2.0, 0, 0, -90], [0, 2, 0, -120], [0, 0, 2, -70], [0, 0, 0, 1]])
SHAPE = (91, 110, 91)


def invented_bundle(count: int = 60, seed: int = 1, noise_mm: float = 2.0) -> list[np.ndarray]:
    """Streamlines about a bent line in the left hemisphere, some of them backwards."""
    rng = np.random.default_rng(seed)
    t = np.linspace(0, 1, 70)[:, None]
    line = (1 - t) * [-30.0, -60, 10] + t * [-30.0, 20, 10] + 4 * t * (1 - t) * [-6.0, 0, 15]
    lines = [(line + rng.normal(0, noise_mm, 3)).astype(np.float32) for _ in range(count)]
    return [each[::-1] if i % 3 == 0 else each for i, each in enumerate(lines)]


def write_trk(path: Path, lines: list[np.ndarray], affine: np.ndarray = NATIVE, shape: tuple = SHAPE) -> Path:
    """A TRK of an image with this matrix and shape."""
    header = {
        "voxel_to_rasmm": affine.astype(np.float32),
        "dimensions": np.array(shape, np.int16),
        "voxel_sizes": np.sqrt((affine[:3, :3] ** 2).sum(axis=0)).astype(np.float32),
        "voxel_order": "".join(nib.aff2axcodes(affine)).encode(),
    }
    tractogram = nib.streamlines.Tractogram(lines, affine_to_rasmm=np.eye(4))
    nib.streamlines.save(nib.streamlines.TrkFile(tractogram, header), str(path))
    return path


def write_tck(path: Path, lines: list[np.ndarray]) -> Path:
    """A TCK."""
    nib.streamlines.save(nib.streamlines.Tractogram(lines, affine_to_rasmm=np.eye(4)), str(path))
    return path


def write_trx(path: Path, lines: list[np.ndarray], kind: str = "float32", *, deflate: bool = False) -> Path:
    """A TRX: a zip of a JSON header and raw arrays, as its open specification has it."""
    points = np.concatenate(lines) if lines else np.empty((0, 3))
    header = {
        "DIMENSIONS": list(SHAPE),
        "VOXEL_TO_RASMM": NATIVE.tolist(),
        "NB_VERTICES": len(points),
        "NB_STREAMLINES": len(lines),
    }
    offsets = np.concatenate([[0], np.cumsum([len(line) for line in lines])])[: len(lines)].astype(np.uint64)
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED if deflate else zipfile.ZIP_STORED) as archive:
        archive.writestr("header.json", json.dumps(header))
        archive.writestr("offsets.uint64", offsets.tobytes())
        archive.writestr(f"positions.3.{kind}", points.astype(kind).tobytes())
    return path


def write_big_trk(path: Path, count: int, length: int) -> Path:
    """A TRK of ``count`` equal streamlines of ``length`` points, written without holding them."""
    write_trk(path, invented_bundle(1))
    header = bytearray(path.read_bytes()[:1000])
    header[988:992] = np.int32(count).tobytes()
    voxelmm = np.linspace([40, 80, 60], [120, 160, 120], length, dtype=np.float32)
    record = np.int32(length).tobytes() + voxelmm.tobytes()
    with path.open("wb") as stream:
        stream.write(header)
        for _ in range(count // 100):
            stream.write(record * 100)
    return path
