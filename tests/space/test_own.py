"""Own anatomy in the place of the template's: bundles, maps and labels."""

from __future__ import annotations

from pathlib import Path

import nibabel as nib
import numpy as np
import pytest
from scipy.spatial import cKDTree
from tract_files import NATIVE, invented_bundle, write_trk, write_trx

from byway.knowledge.faults import BywayError, ImageError
from byway.knowledge.space.atlas import Template
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.space.mapping import Plane
from byway.knowledge.space.own import OWN_SPREAD_MM, compare_anatomies, own_anatomy, with_own
from byway.knowledge.space.own_bundles import cut_between
from byway.knowledge.space.transforms import AffineTransform

SEGMENT = "slf_2.middle@left"
REGION = "sma@left"


def mapped(folder: Path, *rows: str, header: str = "element,file,label,threshold,from_plane,to_plane") -> Path:
    """A mapping table."""
    path = folder / "mapping.csv"
    path.write_text("\n".join([header, *rows]))
    return path


def segment_lines(template: Template, element: str) -> list[np.ndarray]:
    """Streamlines of one element."""
    return template.geometry.streamlines(template.geometry.segment_ids.index(element))


def test_a_persons_bundle_replaces_one_segment_and_nothing_else(template: Template, tmp_path: Path) -> None:
    """The segment holds the file's streamlines, all in the template's direction; all else is untouched."""
    write_trx(tmp_path / "left.trx", invented_bundle(60))
    own = own_anatomy(template, mapped(tmp_path, f"{SEGMENT},left.trx"), name="own tractogram")
    geometry, base = own.template.geometry, template.geometry
    assert own.elements == (SEGMENT,)
    lines = segment_lines(own.template, SEGMENT)
    assert len(lines) == 60
    course = template.core_lines[SEGMENT]
    for line in lines:
        assert np.linalg.norm(line[0] - course[0]) < np.linalg.norm(line[-1] - course[0])
        assert np.linalg.norm(np.diff(line, axis=0), axis=1).max() <= 1.001
    whose = dict(zip(geometry.element_ids, geometry.anatomy, strict=True))
    assert whose.pop(SEGMENT) == "own tractogram"
    assert set(whose.values()) == {"template"}
    assert geometry.spread_mm[geometry.index_of[SEGMENT]] == OWN_SPREAD_MM
    assert geometry.content_hash != base.content_hash
    np.testing.assert_array_equal(geometry.region_voxels, base.region_voxels)
    for element in ("slf_2.middle@right", "cingulum.subgenual@left"):
        for mine, theirs in zip(segment_lines(own.template, element), segment_lines(template, element), strict=True):
            np.testing.assert_array_equal(mine, theirs)
    number = geometry.segment_ids.index(SEGMENT)
    core = geometry.core[geometry.segment_offsets[number] : geometry.segment_offsets[number + 1]]
    assert core.sum() == 24


def test_native_bundles_need_their_transform(template: Template, tmp_path: Path) -> None:
    """A native bundle is refused as it stands, and with its affine lands where it belongs."""
    lines = invented_bundle(30)
    native = [line + np.float32([150, 0, 0]) for line in lines]
    shifted = NATIVE.copy()
    shifted[0, 3] += 150
    write_trk(tmp_path / "native.trk", native, shifted)
    table = mapped(tmp_path, f"{SEGMENT},native.trk")
    with pytest.raises(ImageError, match=r"0% of the points of native\.trk lie in the template's brain"):
        own_anatomy(template, table, name="own")
    back = np.eye(4)
    back[0, 3] = -150
    own = own_anatomy(template, table, name="own", to_template=AffineTransform(back))
    centre = np.concatenate(segment_lines(own.template, SEGMENT)).mean(axis=0)
    np.testing.assert_allclose(centre, np.concatenate(lines).mean(axis=0), atol=1.0)


def test_planes_split_a_bundle_into_segments(template: Template, tmp_path: Path) -> None:
    """Two rows share one file: each segment holds the part between its planes, and they meet at the plane."""
    write_trx(tmp_path / "whole.trx", invented_bundle(40))
    table = mapped(
        tmp_path,
        f"{SEGMENT},whole.trx,,,y=-50,y=-20",
        "slf_3.ventral@left,whole.trx,,,y=-20,y=10",
    )
    own = own_anatomy(template, table, name="own")
    hind = np.concatenate(segment_lines(own.template, SEGMENT))[:, 1]
    front = np.concatenate(segment_lines(own.template, "slf_3.ventral@left"))[:, 1]
    np.testing.assert_allclose([hind.min(), hind.max(), front.min(), front.max()], [-50, -20, -20, 10], atol=1e-3)
    assert any("40 of 40 streamlines cross the planes" in note for note in own.notes)
    with pytest.raises(ImageError, match=r"no streamline of whole\.trx is left"):
        own_anatomy(template, mapped(tmp_path, f"{SEGMENT},whole.trx,,,z=-60,z=-50"), name="own")


def test_cutting_takes_the_shortest_stretch_in_order() -> None:
    """Of several crossings of the first plane the last before the second counts; the reverse order is no crossing."""
    line = np.array([[0.0, 0, 0], [0, 4, 0], [0, 1, 0], [0, 9, 0]])
    first, second = Plane(np.array([0.0, 2, 0]), np.array([0.0, 1, 0])), Plane(np.array([0.0, 6, 0]), np.eye(3)[1])
    part = cut_between(line, first, second)
    assert part is not None
    assert part[:, 1].tolist() == [2.0, 6.0]
    assert cut_between(line, second, first) is None


def test_a_map_becomes_streamlines_that_fill_it(template: Template, tmp_path: Path) -> None:
    """Streamlines drawn through a 2 mm map stay in it, run from end to end, and cover a third of its voxels."""
    grid = np.diag([2.0, 2, 2, 1])
    grid[:3, 3] = [-98, -134, -72]
    data = np.zeros((99, 117, 95), np.float32)
    course = template.core_lines[SEGMENT]
    places = np.indices(data.shape).reshape(3, -1).T * 2.0 + grid[:3, 3]
    near = cKDTree(course).query(places, distance_upper_bound=9.0)[0]
    data.reshape(-1)[:] = np.clip(1.2 - np.minimum(near, 9.0) / 7.0, 0, 1)
    nib.save(nib.Nifti1Image(data * 100, grid), tmp_path / "tract.nii.gz")
    own = own_anatomy(template, mapped(tmp_path, f"{SEGMENT},tract.nii.gz,,0.3"), name="site atlas")
    lines = segment_lines(own.template, SEGMENT)
    assert len(lines) >= 200
    points = np.concatenate(lines)
    gap = np.array([np.linalg.norm(course - point, axis=1).min() for point in points[::50]])
    assert np.percentile(gap, 99) < 8.5
    starts, ends = np.array([line[0] for line in lines]), np.array([line[-1] for line in lines])
    assert np.median(np.linalg.norm(starts - course[0], axis=1)) < 15
    assert np.median(np.linalg.norm(ends - course[-1], axis=1)) < 15
    hit = np.unique(TEMPLATE_GRID.flat_index(points))
    assert len(hit) > 0.3 * (data > 0.3).sum() * 8
    base = template.geometry
    assert own.template.geometry.spread_mm[base.index_of[SEGMENT]] == base.spread_mm[base.index_of[SEGMENT]]
    again = own_anatomy(template, mapped(tmp_path, f"{SEGMENT},tract.nii.gz,,0.3"), name="site atlas")
    assert again.template.geometry.content_hash == own.template.geometry.content_hash


def test_labels_and_maps_replace_parcels(template: Template, tmp_path: Path) -> None:
    """A label of a volume becomes a parcel of its voxels; a probability map, a parcel weighed by probability."""
    labels = np.zeros(TEMPLATE_GRID.shape, np.int16)
    labels[90:95, 140:146, 130:134] = 12
    nib.save(nib.Nifti1Image(labels, TEMPLATE_GRID.affine), tmp_path / "labels.nii.gz")
    half = np.where(labels > 0, 0.5, 0.0).astype(np.float32)
    nib.save(nib.Nifti1Image(half, TEMPLATE_GRID.affine), tmp_path / "map.nii.gz")
    table = mapped(tmp_path, f"{REGION},labels.nii.gz,12", "pre_sma@left,map.nii.gz")
    own = own_anatomy(template, table, name="site atlas").template
    assert own.parcel("sma", "left").sum() == 5 * 6 * 4
    geometry = own.geometry
    number = geometry.region_ids.index("pre_sma@left")
    weights = geometry.region_weights[geometry.region_offsets[number] : geometry.region_offsets[number + 1]]
    np.testing.assert_allclose(weights, 0.5)
    assert np.array_equal(own.parcel("sma", "right"), template.parcel("sma", "right"))


def test_volumes_that_cannot_be_used(template: Template, tmp_path: Path) -> None:
    """A missing label, values that are no probability, a volume elsewhere, one of no image: each told, all at once."""
    data = np.zeros((20, 20, 20), np.float32)
    data[5:9, 5:9, 5:9] = 900
    far = np.diag([1.0, 1, 1, 1])
    far[:3, 3] = 500
    nib.save(nib.Nifti1Image(data, far), tmp_path / "counts.nii.gz")
    nib.save(nib.Nifti1Image(data / 900, far), tmp_path / "far.nii.gz")
    (tmp_path / "text.nii.gz").write_bytes(b"no image")
    table = mapped(
        tmp_path,
        "sma@left,counts.nii.gz,3",
        "sma@right,counts.nii.gz",
        "pre_sma@left,far.nii.gz",
        "pre_sma@right,text.nii.gz",
    )
    with pytest.raises(ImageError) as caught:
        own_anatomy(template, table, name="site atlas")
    assert [fault.rule for fault in caught.value.faults] == ["own-label", "own-values", "own-elsewhere", "own-file"]
    assert [fault.where for fault in caught.value.faults] == [f"mapping.csv:{line}" for line in range(2, 6)]


def test_names_and_kinds_are_checked(template: Template, tmp_path: Path) -> None:
    """An empty name, the template's own, or streamlines for a region are refused."""
    write_trx(tmp_path / "left.trx", invented_bundle(5))
    for name in ("", "template"):
        with pytest.raises(BywayError, match="a name that says whose anatomy"):
            own_anatomy(template, mapped(tmp_path, f"{SEGMENT},left.trx"), name=name)
    with pytest.raises(ImageError, match="streamlines for the region sma@left"):
        own_anatomy(template, mapped(tmp_path, f"{REGION},left.trx"), name="own")


def test_replacing_nothing_changes_nothing_but_the_hash(template: Template) -> None:
    """Without replacements every array stays equal."""
    same = with_own(template, {}, "own").geometry
    for field in ("region_voxels", "region_weights", "points_mm", "streamline_offsets", "segment_offsets", "core"):
        np.testing.assert_array_equal(getattr(same, field), getattr(template.geometry, field))
    assert same.anatomy == template.geometry.anatomy


def test_template_and_own_are_compared(template: Template, tmp_path: Path) -> None:
    """One row for the replaced segment; a bundle equal to the template's own lies 0 mm apart, a moved one 10 mm."""
    lines = segment_lines(template, SEGMENT)
    write_trx(tmp_path / "same.trx", lines)
    same = compare_anatomies(
        template, own_anatomy(template, mapped(tmp_path, f"{SEGMENT},same.trx"), name="own").template
    )
    assert same["element"].tolist() == [SEGMENT]
    assert same["apart_mm"][0] < 1.5
    assert same["own_size"][0] == pytest.approx(same["template_size"][0], rel=0.02)
    write_trx(tmp_path / "moved.trx", [line + np.float32([0, 0, -25]) for line in lines])
    moved = compare_anatomies(
        template, own_anatomy(template, mapped(tmp_path, f"{SEGMENT},moved.trx"), name="own").template
    )
    assert moved["apart_mm"][0] > 10
