"""What could identify a person is listed, and what byway itself writes is not."""

from __future__ import annotations

from pathlib import Path

import nibabel as nib
import numpy as np

from byway.knowledge.cases.files import dump_case
from byway.knowledge.cases.model import CaseFile
from byway.knowledge.cases.pages import Note, Pages
from byway.knowledge.cases.privacy import identifying_traces, traces_table


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


def test_a_clean_case_lists_nothing(tmp_path: Path) -> None:
    """A case as byway writes it, with a note, has no trace; the times of its own pages are not counted."""
    (tmp_path / "case.yaml").write_text(dump_case(CaseFile(stage="acute")))
    Pages(tmp_path).put(Note(author="AB", text="edge uncertain"))
    assert traces_table(identifying_traces(tmp_path)).empty
