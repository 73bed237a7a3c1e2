"""Tractogram files: what is read, what is left out, and what is refused."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from tract_files import NATIVE, invented_bundle, write_big_trk, write_tck, write_trk, write_trx

from byway.knowledge.faults import ImageError
from byway.knowledge.space.tractograms import read_tractogram

PEAK = """
import resource, sys
from byway.knowledge.space.tractograms import read_tractogram
from byway.knowledge.space.template import brain_mask
before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
read = read_tractogram(sys.argv[1])
print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before, len(read.streamlines), read.total)
"""


@pytest.mark.parametrize("kind", ["trk", "tck", "trx", "trx_deflated", "trx_folder"])
def test_points_come_back_in_mm(tmp_path: Path, kind: str) -> None:
    """Every format gives back the same points, RAS+ mm, within single precision."""
    lines = invented_bundle(12)
    match kind:
        case "trk":
            path = write_trk(tmp_path / "a.trk", lines)
        case "tck":
            path = write_tck(tmp_path / "a.tck", lines)
        case "trx_folder":
            zipped = write_trx(tmp_path / "zipped.trx", lines)
            path = tmp_path / "a.trx"
            subprocess.run([sys.executable, "-m", "zipfile", "-e", str(zipped), str(path)], check=True)
        case _:
            path = write_trx(tmp_path / "a.trx", lines, deflate=kind == "trx_deflated")
    read = read_tractogram(path)
    assert read.total == 12
    assert read.notes == ()
    for ours, theirs in zip(read.streamlines, lines, strict=True):
        np.testing.assert_allclose(ours, theirs, atol=1e-3)


def test_half_precision_is_read(tmp_path: Path) -> None:
    """A TRX with 16-bit positions is read to within their precision (1/16 mm below 128 mm)."""
    lines = invented_bundle(3)
    read = read_tractogram(write_trx(tmp_path / "a.trx", lines, "float16"))
    np.testing.assert_allclose(read.streamlines[0], lines[0], atol=0.07)


def test_more_streamlines_than_the_limit_are_thinned_evenly(tmp_path: Path) -> None:
    """Of 100 with a limit of 30 every fourth stays, and the note says so."""
    lines = [np.array([[-30.0, i, 0], [-30, i, 9]], np.float32) for i in range(100)]
    read = read_tractogram(write_tck(tmp_path / "a.tck", lines), limit=30)
    assert [float(line[0, 1]) for line in read.streamlines] == list(range(0, 100, 4))
    assert read.total == 100
    assert read.notes == ("a.tck: 25 of 100 streamlines kept, evenly spaced",)


def test_numbers_that_are_not_finite_are_left_out_and_counted(tmp_path: Path) -> None:
    """A streamline with NaN is left out and noted; a file of nothing else is refused."""
    lines = invented_bundle(4)
    lines[1] = lines[1].copy()
    lines[1][5] = np.nan
    for path in (write_trk(tmp_path / "a.trk", lines), write_trx(tmp_path / "a.trx", lines)):
        read = read_tractogram(path)
        assert len(read.streamlines) == 3
        assert read.notes == (f"{path.name}: 1 of 4 streamlines left out (a single point, or one not finite)",)
    with pytest.raises(ImageError, match="1 streamlines, none with two or more finite points"):
        read_tractogram(write_trx(tmp_path / "b.trx", [lines[1]]))


@pytest.mark.parametrize("suffix", ["trk", "tck", "trx"])
def test_a_file_without_streamlines_is_refused(tmp_path: Path, suffix: str) -> None:
    """Zero streamlines: an error that says so and what to check."""
    path = tmp_path / f"empty.{suffix}"
    {"trk": write_trk, "tck": write_tck, "trx": write_trx}[suffix](path, [])
    with pytest.raises(ImageError, match="no streamline; expected at least one; check that the export was complete"):
        read_tractogram(path)


def test_points_outside_the_volume(tmp_path: Path) -> None:
    """A few points outside are noted; more than 5 % mean a wrong matrix, and the file is refused."""
    lines = invented_bundle(40)
    stray = np.array([[-30.0, 0, 10], [-30, 0, 300.0]], np.float32)
    read = read_tractogram(write_trk(tmp_path / "a.trk", [*lines, stray]))
    assert read.notes == ("a.trk: 1 of 2802 points lie outside the file's volume",)
    moved = [line + np.float32([200, 0, 0]) for line in lines]
    with pytest.raises(ImageError, match="100% of the points lie outside the volume"):
        read_tractogram(write_trk(tmp_path / "b.trk", moved))


def test_a_matrix_that_cannot_be_inverted_is_refused(tmp_path: Path) -> None:
    """A flat voxel-to-mm matrix, or none, in the header of a TRK is an error of its own."""
    path = write_trk(tmp_path / "a.trk", invented_bundle(3))
    flat = NATIVE.copy()
    flat[2, 2] = 0.0
    for matrix in (flat, np.zeros((4, 4))):
        data = bytearray(path.read_bytes())
        data[440:504] = matrix.astype(np.float32).tobytes()
        broken = tmp_path / "broken.trk"
        broken.write_bytes(bytes(data))
        with pytest.raises(ImageError) as caught:
            read_tractogram(broken)
        assert caught.value.fault.rule == "tractogram-affine"


@pytest.mark.parametrize("suffix", ["trk", "tck", "trx"])
def test_damaged_files_are_refused_in_one_line(tmp_path: Path, suffix: str) -> None:
    """A file cut in the middle, or of other content, raises one error that names the file."""
    path = tmp_path / f"a.{suffix}"
    {"trk": write_trk, "tck": write_tck, "trx": write_trx}[suffix](path, invented_bundle(30))
    whole = path.read_bytes()
    for content in (whole[: len(whole) // 2 + 1], b"not a tractogram at all", b""):
        path.write_bytes(content)
        with pytest.raises(ImageError) as caught:
            read_tractogram(path)
        assert path.name in str(caught.value)
        assert "\n" not in str(caught.value)


def test_other_files_are_refused(tmp_path: Path) -> None:
    """Another suffix, or no file, is told."""
    with pytest.raises(ImageError, match=r"one of \.trk, \.tck, \.trx"):
        read_tractogram(tmp_path / "a.vtk")
    with pytest.raises(ImageError, match="no such file"):
        read_tractogram(tmp_path / "a.trk")


def test_streamlines_of_very_many_points_are_resampled(tmp_path: Path) -> None:
    """50,000 points over 100 mm become points 0.5 mm apart, from the same first to the same last."""
    line = np.linspace([-60, -40, 0], [-60, 60, 0], 50_000).astype(np.float32)
    read = read_tractogram(write_trx(tmp_path / "a.trx", [line])).streamlines[0]
    assert len(read) == 201
    np.testing.assert_allclose(read[[0, -1]], line[[0, -1]], atol=1e-4)


def test_five_million_points_take_at_most_twice_the_file(tmp_path: Path) -> None:
    """Reading a TRK of 5 million points raises the peak memory of a process by less than twice the file's size."""
    path = write_big_trk(tmp_path / "big.trk", 50_000, 100)
    size_kb = path.stat().st_size / 1024
    run = subprocess.run([sys.executable, "-c", PEAK, str(path)], capture_output=True, text=True, check=True)
    grown_kb, kept, total = (int(word) for word in run.stdout.split())
    assert total == 50_000
    assert 1000 < kept <= 3000
    assert grown_kb < 2 * size_kb
