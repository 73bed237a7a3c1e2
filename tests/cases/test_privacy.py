"""What could identify a person is listed, and what byway itself writes is not."""

from __future__ import annotations

from pathlib import Path

import nibabel as nib
import numpy as np
import pytest

from byway.knowledge.cases.files import dump_case, write_case
from byway.knowledge.cases.journal import Journal
from byway.knowledge.cases.making import add_scan, new_case
from byway.knowledge.cases.model import CaseFile
from byway.knowledge.cases.pages import Note, Pages
from byway.knowledge.cases.privacy import identifying_traces, stripped_image, traces_table
from byway.knowledge.faults import CaseError, ImageError
from byway.knowledge.space.grid import TEMPLATE_GRID


def test_an_invented_leak_is_listed(tmp_path: Path) -> None:
    """Header free text, a date in a file name, a number and a DICOM-style name are each found with their place."""
    image = nib.Nifti1Image(np.zeros((2, 2, 2), np.uint8), np.eye(4))
    image.header["descrip"] = b"DOE^JANE"
    nib.save(image, tmp_path / "scan_20200131.nii.gz")
    (tmp_path / "case.yaml").write_text("title: seen by Dr. Example, record 12345678\n")
    kinds = {(trace.file, trace.kind) for trace in identifying_traces(tmp_path)}
    assert ("scan_20200131.nii.gz", "free text in the header") in kinds
    assert ("case.yaml", "a long number") in kinds
    assert ("case.yaml", "a title with a name") in kinds
    assert ("scan_20200131.nii.gz", "a date") in kinds


def test_a_version_kept_beside_is_no_trace(tmp_path: Path) -> None:
    """The name that byway gives to the version that lost a race is its own, and no number of a person's."""
    path = tmp_path / "case.yaml"
    write_case(path, CaseFile(stage="acute"), None)
    for _ in range(20):
        with pytest.raises(CaseError, match="yours is kept"):
            write_case(path, CaseFile(stage="chronic"), None)
    assert len(list(tmp_path.iterdir())) == 21
    assert identifying_traces(tmp_path) == []
    (tmp_path / "case.0190123456.yaml").write_text("title: record 7654321.\n")
    assert [trace.found for trace in identifying_traces(tmp_path)] == ["0190123456", "7654321"]


def test_a_clean_case_lists_nothing(tmp_path: Path) -> None:
    """A case as byway writes it, with a note, has no trace; the times of its own pages are not counted."""
    (tmp_path / "case.yaml").write_text(dump_case(CaseFile(stage="acute")))
    Pages(tmp_path).put(Note(author="AB", text="edge uncertain"))
    assert traces_table(identifying_traces(tmp_path)).empty


def test_a_stripped_copy_keeps_the_voxels_and_nothing_that_tells(tmp_path: Path) -> None:
    """Voxels and affine are the same; free text, an extension and the telling name are gone, and were listed."""
    affine = np.diag([2.0, 2.0, 3.0, 1.0])
    affine[:3, 3] = (-10, 4, 7)
    image = nib.Nifti1Image(np.arange(24, dtype=np.int16).reshape(2, 3, 4), affine)
    image.header["descrip"] = b"DOE^JANE 19700131"
    image.header["db_name"] = b"ward 7"
    image.header.extensions.append(nib.nifti1.Nifti1Extension("comment", b"seen by Dr. Example"))
    source = tmp_path / "doe_19700131.nii.gz"
    nib.save(image, source)
    before = source.read_bytes()
    left = stripped_image(source, tmp_path / "case" / "scan.nii.gz")
    assert {trace.kind for trace in left} >= {"a date", "free text in the header", "a header extension"}
    assert source.read_bytes() == before
    copy = nib.load(tmp_path / "case" / "scan.nii.gz")
    assert np.array_equal(np.asanyarray(copy.dataobj), np.asanyarray(image.dataobj))
    assert np.array_equal(copy.affine, affine)
    assert identifying_traces(tmp_path / "case") == []


def test_what_is_no_image_is_not_copied(tmp_path: Path) -> None:
    """A file that is no NIfTI raises, and nothing is written."""
    (tmp_path / "x.nii").write_text("no image")
    with pytest.raises(ImageError, match=r"x\.nii"):
        stripped_image(tmp_path / "x.nii", tmp_path / "y.nii")
    assert not (tmp_path / "y.nii").exists()


def test_a_journal_of_strokes_is_no_trace(tmp_path: Path) -> None:
    """Coordinates, packed voxels and times of a journal are not taken for long numbers or dates; a date in text is."""
    journal = Journal(tmp_path, "AB")
    journal.append({"kind": "edit", "edit": {"op": "stroke", "points": [45.1234567, 101.7654321], "radius": 4}})
    journal.append({"kind": "edit", "edit": {"op": "bytes", "indices": "eJx1234567890AAA", "values": "20200131"}})
    journal.append({"kind": "taken", "from": journal.writer})
    assert identifying_traces(tmp_path) == []
    journal.append({"kind": "findings", "findings": [{"test": "on 2020-01-31"}]})
    assert [trace.kind for trace in identifying_traces(tmp_path)] == ["a date"]


def test_a_scan_comes_in_stripped(tmp_path: Path) -> None:
    """A scan added to a case is named by its sequence, its header is clean, and what was left behind is told."""
    image = nib.Nifti1Image(np.ones(TEMPLATE_GRID.shape, np.uint8), TEMPLATE_GRID.affine)
    image.header["descrip"] = b"DOE^JANE"
    nib.save(image, tmp_path / "doe_19700131.nii.gz")
    case = new_case(tmp_path / "case")
    for _ in range(2):
        case, left = add_scan(case, tmp_path / "doe_19700131.nii.gz", "flair")
    assert {trace.kind for trace in left} >= {"a date", "free text in the header"}
    assert len({scan.file for scan in case.spec.scans}) == 2
    assert all("doe" not in scan.file for scan in case.spec.scans)
    assert identifying_traces(case.folder) == []
