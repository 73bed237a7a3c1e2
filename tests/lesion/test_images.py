"""Lesions, labels and scans from files, and every kind of file that is refused."""

from __future__ import annotations

import gzip
import itertools
import tracemalloc
from pathlib import Path

import nibabel as nib
import numpy as np
import pytest

from byway.knowledge.faults import BywayError, ImageError
from byway.knowledge.lesion.headers import box_mm, open_image
from byway.knowledge.lesion.images import mask_name, read_labels, read_lesion, read_volume, write_mask
from byway.knowledge.lesion.shapes import ellipsoid_mask, sphere_mask
from byway.knowledge.space.grid import TEMPLATE_GRID

AFFINE = TEMPLATE_GRID.affine
TWO_MM = np.array([[-2.0, 0, 0, 90], [0, 2, 0, -126], [0, 0, 2, -72], [0, 0, 0, 1]])
DEEP = (-28, -13, 22)
ORIENTATIONS = [
    np.array(list(zip(axes, flips, strict=True)), float)
    for axes in itertools.permutations(range(3))
    for flips in itertools.product((1, -1), repeat=3)
]


def saved(path: Path, data: np.ndarray, affine: np.ndarray | None = AFFINE, code: int = 4) -> Path:
    """Write an image with a set sform."""
    image = nib.Nifti1Image(data, affine)
    if affine is not None:
        image.set_sform(affine, code)
        image.set_qform(affine, code)
    nib.save(image, path)
    return path


def ball(radius: float = 9) -> np.ndarray:
    """An asymmetric mask deep in the left hemisphere."""
    return ellipsoid_mask(DEEP, (radius, radius + 3, radius - 2))


def refusal(path: Path, **options) -> str:
    """What is said when a lesion is refused: one line that names the file."""
    with pytest.raises(ImageError) as caught:
        read_lesion(path, **options)
    words = str(caught.value)
    assert "\n" not in words
    assert path.name in words
    return words


# What can be read


@pytest.mark.parametrize("orientation", ORIENTATIONS, ids=lambda o: "".join(nib.orientations.ornt2axcodes(o)))
def test_a_mask_comes_back_bit_for_bit_in_every_orientation(tmp_path, orientation):
    """All 48 orders and directions of the axes that nibabel can write."""
    mask = ball()
    mask[60, 100:140, 90] = True
    written = nib.load(write_mask(tmp_path, mask))
    nib.save(written.as_reoriented(orientation), tmp_path / "turned.nii")
    lesion = read_lesion(tmp_path / "turned.nii")
    np.testing.assert_array_equal(lesion.mask, mask)
    assert not any("resampled" in note for note in lesion.notes)


def test_a_written_mask_says_where_it_is_and_nothing_else(tmp_path):
    """sform and qform of the template, code 4 (MNI152), BIDS derivative name, no free text, the same bytes twice."""
    path = write_mask(tmp_path, ball(), label="tumour core", desc="drawn")
    assert path.name == "space-MNI152NLin2009aSym_label-tumourcore_desc-drawn_mask.nii.gz"
    header = nib.load(path).header
    for affine, code in (header.get_sform(coded=True), header.get_qform(coded=True)):
        assert code == 4
        np.testing.assert_array_equal(affine, AFFINE)
    for field in ("descrip", "aux_file", "db_name", "intent_name"):
        assert header[field].item() == b""
    assert not header.extensions
    first = path.read_bytes()
    assert write_mask(tmp_path, ball(), label="tumour core", desc="drawn").read_bytes() == first
    assert [p.name for p in tmp_path.iterdir()] == [path.name]


def test_mask_names_follow_bids_derivatives():
    """Parts hold letters and digits alone; an empty label becomes "lesion"."""
    assert mask_name("core") == "space-MNI152NLin2009aSym_label-core_mask.nii.gz"
    assert mask_name("__", prefix="round 2") == "round2_space-MNI152NLin2009aSym_label-lesion_mask.nii.gz"


def test_a_mask_off_the_grid_is_not_written(tmp_path):
    """Nothing is left behind."""
    with pytest.raises(BywayError, match="shape"):
        write_mask(tmp_path, np.zeros((4, 4, 4), bool))
    assert not list(tmp_path.iterdir())


def test_another_grid_is_resampled_and_said_so(tmp_path):
    """A 2 mm mask keeps its volume within 5 % and its place within half a millimetre."""
    mask = np.zeros((91, 109, 91), np.uint8)
    index = np.moveaxis(np.indices(mask.shape), 0, -1)
    centres = index @ TWO_MM[:3, :3].T + TWO_MM[:3, 3]
    mask[((centres - DEEP) ** 2).sum(axis=-1) <= 100] = 1
    lesion = read_lesion(saved(tmp_path / "coarse.nii.gz", mask, TWO_MM))
    assert lesion.notes == ("resampled from a 2 mm grid of 91 x 109 x 91 to the template's 1 mm grid (nearest voxel)",)
    assert lesion.volume_ml == pytest.approx(mask.sum() * 8 / 1000, rel=0.05)
    # Every second template voxel lies halfway between two of the file's, so that the mask moves by up to that half.
    np.testing.assert_allclose(TEMPLATE_GRID.to_mm(np.argwhere(lesion.mask)).mean(axis=0), DEEP, atol=0.51)


def test_mirrored_coarse_masks_give_mirrored_masks(tmp_path):
    """A 2 mm grid is symmetric about the midline, and so is what is read from it."""
    coarse = np.random.default_rng(0).random((91, 109, 91)) < 0.5
    coarse[:, :20] = coarse[:, 90:] = coarse[:, :, :20] = coarse[:, :, 70:] = coarse[:15] = coarse[76:] = False
    one = read_lesion(saved(tmp_path / "one.nii", coarse.astype(np.uint8), TWO_MM)).mask
    other = read_lesion(saved(tmp_path / "other.nii", coarse[::-1].astype(np.uint8), TWO_MM)).mask
    np.testing.assert_array_equal(one, other[::-1])


def test_a_part_of_the_grid_is_copied(tmp_path):
    """A cropped image of the same voxels loses nothing inside it."""
    mask = ball()
    affine = AFFINE.copy()
    affine[:3, 3] += (20, 30, 20)
    lesion = read_lesion(saved(tmp_path / "part.nii", mask[20:180, 30:210, 20:170].astype(np.uint8), affine))
    np.testing.assert_array_equal(lesion.mask, mask)


def test_an_oblique_grid_is_resampled(tmp_path):
    """A mask drawn on a grid turned by 10 degrees about z lands where it was (Dice of at least 0.95)."""
    turn = np.deg2rad(10)
    affine = AFFINE.copy()
    affine[:2, :2] = [[np.cos(turn), -np.sin(turn)], [np.sin(turn), np.cos(turn)]]
    affine[:3, 3] = -affine[:3, :3] @ np.array([98, 116, 72])
    place = np.moveaxis(np.indices(TEMPLATE_GRID.shape), 0, -1) @ affine[:3, :3].T + affine[:3, 3]
    data = ((place - DEEP) ** 2).sum(axis=-1) <= 100
    mask = read_lesion(saved(tmp_path / "oblique.nii", data.astype(np.uint8), affine)).mask
    exact = sphere_mask(DEEP, 10)
    assert 2 * (mask & exact).sum() / (mask.sum() + exact.sum()) >= 0.95
    scan = read_volume(saved(tmp_path / "oblique_scan.nii", (data * 100).astype(np.float32), affine))
    assert ((scan.data > 50) ^ exact).sum() < 0.1 * exact.sum()


def test_a_label_is_chosen(tmp_path):
    """label=2 takes that label alone; read_labels takes each as a compartment."""
    data = ball().astype(np.int16)
    data[sphere_mask((-28, -13, 22), 4)] = 2
    path = saved(tmp_path / "labels.nii.gz", data)
    np.testing.assert_array_equal(read_lesion(path, label=2).mask, data == 2)
    lesion = read_labels(path, names={2: "core"}, kinds={2: "core"}, effects={1: 0.4})
    assert [(c.name, c.kind, c.effect) for c in lesion.compartments] == [
        ("label 1", "other", 0.4),
        ("core", "core", 1.0),
    ]
    np.testing.assert_array_equal(lesion.compartments[1].mask, data == 2)


def test_a_mask_of_255_is_a_mask(tmp_path):
    """One value beside 0 is a mask whatever it is, and a note says which."""
    lesion = read_lesion(saved(tmp_path / "m.nii", ball().astype(np.uint8) * 255))
    np.testing.assert_array_equal(lesion.mask, ball())
    assert lesion.notes == ("voxels of value 255 were taken as the mask",)


def test_slope_and_intercept_are_applied(tmp_path):
    """Stored 10 and 30 that mean 0 and 1 are a mask; outside the image there is none of it."""
    image = nib.Nifti1Image(np.where(ball(), 30, 10).astype(np.int16)[30:170], np.eye(4))
    affine = AFFINE.copy()
    affine[0, 3] += 30
    image.set_sform(affine, 4)
    image.header.set_slope_inter(0.05, -0.5)
    path = tmp_path / "scaled.nii"
    # nibabel rescales on saving, so the header's numbers are written by hand.
    raw = bytearray(image.to_bytes())
    raw[112:120] = np.array([0.05, -0.5], "<f4").tobytes()
    body = np.where(ball(), 30, 10).astype("<i2")[30:170].tobytes(order="F")
    path.write_bytes(bytes(raw[:352]) + body)
    np.testing.assert_array_equal(read_lesion(path).mask, ball())
    np.testing.assert_allclose(read_volume(path).data, ball(), atol=1e-6)


def test_a_graded_map_is_taken_as_it_is(tmp_path):
    """Values from 0 to 1 are effects."""
    graded = np.where(ball(), np.linspace(0.1, 0.9, 189, dtype=np.float32), 0).astype(np.float32)
    lesion = read_lesion(saved(tmp_path / "graded.nii.gz", graded), graded=True)
    np.testing.assert_array_equal(lesion.effect_volume, graded)
    assert lesion.compartments == ()


def test_z_values_are_put_on_the_scale_given(tmp_path):
    """z of -1 is no effect, -4 full effect: -2.5 is one half; the scale stays with the lesion."""
    z = np.where(ball(), np.float32(-2.5), np.float32(0))
    path = saved(tmp_path / "z.nii.gz", z)
    lesion = read_lesion(path, graded=True, scale=(-1, -4))
    np.testing.assert_array_equal(lesion.effect_map(), np.where(ball(), np.float32(0.5), 0))
    assert lesion.scale == "-1 (no effect) to -4 (full effect) in the file"
    assert "negative values" in refusal(path, graded=True)


def test_a_scan_keeps_its_units(tmp_path):
    """Hounsfield units, with negative values, come back as they were; NaN reads 0 and is noted."""
    scan = np.random.default_rng(0).integers(-1000, 2000, TEMPLATE_GRID.shape).astype(np.float32)
    scan[0, 0, 0] = np.nan
    read = read_volume(saved(tmp_path / "ct.nii.gz", scan))
    scan[0, 0, 0] = 0
    np.testing.assert_array_equal(read.data, scan)
    assert read.notes == ("voxels that are not finite numbers read 0",)


def test_a_header_that_does_not_name_the_space_is_noted(tmp_path):
    """Code 2 (aligned) is read as template mm, and the note says so."""
    assert read_lesion(saved(tmp_path / "m.nii", ball().astype(np.uint8), code=2)).notes == (
        "the header does not name the template space; its mm were taken to be in it",
    )


@pytest.mark.parametrize("ending", [".nii", ".nii.gz"])
def test_a_large_scan_is_never_held_twice(tmp_path, ending):
    """A 512 x 512 x 400 float scan: at the peak less than one and a half of its 419 MB; mapped, a fraction of it."""
    data = np.zeros((512, 512, 400), np.float32)
    data[100:400, 100:400, 100:300] = np.arange(200)
    affine = np.diag([0.4, 0.45, 0.45, 1])
    affine[:3, 3] = [-102, -134, -72]
    path = saved(tmp_path / f"scan{ending}", data, affine)
    size = data.nbytes
    del data
    tracemalloc.start()
    scan = read_volume(path)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert peak < (1.5 if ending.endswith("gz") else 0.5) * size
    assert scan.data[98, 134, 72] == pytest.approx(160 - 100, abs=1.0)  # z = 0 lies at voxel 160


# What is refused


def test_no_such_file(tmp_path):
    """The name and no more."""
    assert refusal(tmp_path / "gone.nii").endswith("no such file")


def test_text_is_no_nifti(tmp_path):
    """Whatever its name says."""
    path = tmp_path / "letter.nii"
    path.write_text("no image here\n" * 100)
    assert "not a NIfTI file; expected a NIfTI file (.nii or .nii.gz)" in refusal(path)
    (tmp_path / "image.png").write_bytes(b"\x89PNG")
    assert "another kind (.png)" in refusal(tmp_path / "image.png")
    (tmp_path / "none.nii").touch()
    assert "an empty file" in refusal(tmp_path / "none.nii")


def test_an_ending_that_does_not_fit_the_content(tmp_path):
    """Compressed without .gz, and .gz without compression."""
    plain = saved(tmp_path / "a.nii", ball().astype(np.uint8))
    plain.rename(tmp_path / "b.nii.gz")
    assert "rename it to .nii" in refusal(tmp_path / "b.nii.gz")
    packed = saved(tmp_path / "c.nii.gz", ball().astype(np.uint8))
    packed.rename(tmp_path / "d.nii")
    assert "rename it to .nii.gz" in refusal(tmp_path / "d.nii")


def test_a_truncated_file(tmp_path):
    """Compressed or not, in the header or in the voxels."""
    noise = np.random.default_rng(0).integers(0, 2, TEMPLATE_GRID.shape).astype(np.uint8)
    for ending in (".nii", ".nii.gz"):
        path = saved(tmp_path / f"cut{ending}", noise)
        whole = path.read_bytes()
        path.write_bytes(whole[: len(whole) // 2])
        assert "a whole file" in refusal(path)
    path.write_bytes(whole[:100])
    assert "copy or export it again" in refusal(path) or "not a NIfTI" in refusal(path)


def test_damaged_compression(tmp_path):
    """A flipped byte in the compressed stream."""
    path = saved(tmp_path / "bad.nii.gz", np.random.default_rng(0).integers(0, 2, TEMPLATE_GRID.shape).astype(np.uint8))
    raw = bytearray(path.read_bytes())
    raw[len(raw) // 2] ^= 0xFF
    path.write_bytes(raw)
    assert "a whole file" in refusal(path)


def test_more_than_one_volume(tmp_path):
    """4-D with one volume is fine, with two it is not."""
    data = np.stack([ball(), ball()], axis=-1).astype(np.uint8)
    words = refusal(saved(tmp_path / "two.nii.gz", data))
    assert "2 volumes (197 x 233 x 189 x 2); expected one three-dimensional volume" in words
    one = read_lesion(saved(tmp_path / "one.nii.gz", data[..., :1]))
    np.testing.assert_array_equal(one.mask, ball())


def test_two_dimensions(tmp_path):
    """A slice is no volume."""
    assert "2 dimensions" in refusal(saved(tmp_path / "slice.nii", ball()[:, :, 90].astype(np.uint8)))


def test_an_empty_mask(tmp_path):
    """No voxel but 0."""
    assert "an empty mask" in refusal(saved(tmp_path / "e.nii.gz", np.zeros(TEMPLATE_GRID.shape, np.uint8)))


def test_nan_and_negative_values(tmp_path):
    """Counted, and the least told."""
    data = ball().astype(np.float32)
    data[0, 0, :3] = np.nan
    assert "3 voxels that are not finite numbers" in refusal(saved(tmp_path / "nan.nii.gz", data))
    assert "negative values (down to -1)" in refusal(saved(tmp_path / "minus.nii.gz", -ball().astype(np.float32)))


def test_labels_where_a_mask_was_meant(tmp_path):
    """The labels are offered with their sizes, and how to choose one."""
    data = np.zeros(TEMPLATE_GRID.shape, np.int16)
    data[80, 120, 90:100] = 3
    data[80, 121, 90:95] = 7
    path = saved(tmp_path / "labels.nii.gz", data)
    assert "2 labels (3: 10 voxels, 7: 5 voxels)" in refusal(path)
    assert "label=" in refusal(path)
    assert "no label 5; expected 3: 10 voxels, 7: 5 voxels" in refusal(path, label=5)


def test_a_graded_map_where_a_mask_was_meant(tmp_path):
    """Fractions are no mask."""
    data = np.where(ball(), np.random.default_rng(0).random(TEMPLATE_GRID.shape), 0).astype(np.float32)
    assert "read it as a graded effect map" in refusal(saved(tmp_path / "p.nii.gz", data))


def test_neither_sform_nor_qform(tmp_path):
    """A file that does not say where it lies."""
    path = saved(tmp_path / "nowhere.nii", ball().astype(np.uint8))
    raw = bytearray(path.read_bytes())
    raw[252:256] = bytes(4)  # qform_code, sform_code
    path.write_bytes(raw)
    assert "neither sform nor qform" in refusal(path)


def test_left_and_right_that_cannot_be_told(tmp_path):
    """sform and qform that swap the sides; an affine without volume; an Analyze file."""
    image = nib.Nifti1Image(ball().astype(np.uint8), AFFINE)
    image.set_sform(AFFINE, 4)
    image.set_qform(np.diag([-1, 1, 1, 1]) @ AFFINE, 4)
    nib.save(image, tmp_path / "swapped.nii")
    assert "swap left and right" in refusal(tmp_path / "swapped.nii")
    flat = AFFINE.copy()
    flat[0, 0] = 0
    image.set_sform(flat, 4)
    image.set_qform(None, 0)
    nib.save(image, tmp_path / "flat.nii")
    assert "left and right cannot be told" in refusal(tmp_path / "flat.nii")
    nib.save(nib.AnalyzeImage(ball().astype(np.uint8), AFFINE), tmp_path / "old.hdr")
    assert "Analyze file, whose left and right cannot be told" in refusal(tmp_path / "old.hdr")


def test_another_space_is_told_by_its_field_of_view(tmp_path):
    """A scanner's own grid: by how many mm the field of view differs, and what would do."""
    affine = np.diag([1.0, 1, 1, 1])
    words = refusal(saved(tmp_path / "native.nii", np.ones((256, 256, 180), np.uint8), affine))
    assert "x -0 to 256" in words or "x 0 to 256" in words
    # The lowest face lies 134.5 - 0.5 mm above the template's along y.
    assert "differs from the template's by up to 157 mm" in words
    assert "register it to MNI152NLin2009aSym" in words


def test_a_mask_outside_the_brain(tmp_path):
    """More than 30 % outside, and the share is told."""
    words = refusal(saved(tmp_path / "out.nii.gz", sphere_mask((-90, 60, 60), 12).astype(np.uint8)))
    assert "100% lies outside the brain; expected at most 30%" in words


def test_colour_voxels(tmp_path):
    """An RGB NIfTI."""
    data = np.zeros((9, 9, 9), np.dtype([("R", "u1"), ("G", "u1"), ("B", "u1")]))
    assert "colour (RGB) voxels" in refusal(saved(tmp_path / "rgb.nii", data))
    assert "complex64" in refusal(saved(tmp_path / "complex.nii", np.zeros((9, 9, 9), np.complex64)))


def test_dicom(tmp_path):
    """A DICOM file, and a folder of them."""
    (tmp_path / "series").mkdir()
    for n in range(3):
        (tmp_path / "series" / f"{n}.dcm").write_bytes(bytes(128) + b"DICM" + bytes(50))
    assert "a folder with 3 DICOM files" in refusal(tmp_path / "series")
    assert "convert the series to NIfTI" in refusal(tmp_path / "series" / "0.dcm")


def test_absurd_and_huge_headers(tmp_path):
    """Dimensions are judged before any voxel is read: no memory is asked for."""
    path = saved(tmp_path / "absurd.nii", np.zeros((4, 4, 4), np.uint8))
    raw = bytearray(path.read_bytes())
    raw[42:48] = np.array([32767, 32767, 32767], "<i2").tobytes()
    path.write_bytes(raw)
    assert "announces 32767 x 32767 x 32767 voxels; expected 1 to 2048 along each axis" in refusal(path)
    raw[42:48] = np.array([-3, 4, 4], "<i2").tobytes()
    path.write_bytes(raw)
    assert refusal(path)
    raw[42:48] = np.array([1000, 1000, 2000], "<i2").tobytes()
    packed = tmp_path / "huge.nii.gz"
    packed.write_bytes(gzip.compress(bytes(raw)))
    assert "2.0 GB; expected at most 1.6 GB" in refusal(packed)


def test_box_runs_to_the_outer_faces():
    """The template's box reaches half a millimetre beyond its outer voxel centres."""
    low, high = box_mm(TEMPLATE_GRID.shape, AFFINE)
    assert low.tolist() == [-98.5, -134.5, -72.5]
    assert high.tolist() == [98.5, 98.5, 116.5]


def test_opening_reads_no_voxel(tmp_path):
    """The proxy is untouched after the header's checks."""
    opened = open_image(saved(tmp_path / "m.nii.gz", ball().astype(np.uint8)))
    assert not opened.image.in_memory
    assert opened.shape == TEMPLATE_GRID.shape
