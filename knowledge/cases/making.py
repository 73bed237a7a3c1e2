"""New cases: a folder with a case.yaml, and the lesion saved beside it under its standard name."""

from __future__ import annotations

import itertools
import json
import re
from pathlib import Path

from byway.knowledge.atomic import write_text
from byway.knowledge.cases.case import Case, open_case
from byway.knowledge.cases.files import write_case
from byway.knowledge.cases.model import CaseFile
from byway.knowledge.cases.privacy import Trace, stripped_image
from byway.knowledge.faults import CaseError, Fault
from byway.knowledge.lesion.images import mask_name, read_lesion, read_volume, write_mask
from byway.knowledge.lesion.lesion import Lesion

__all__ = ["add_scan", "bench_notebook", "new_case"]


def new_case(
    folder: str | Path, mask: str | Path | Lesion | None = None, *, label: int | None = None, **fields: object
) -> Case:
    """Make a case folder.

    Parameters
    ----------
    folder : str or Path
        A folder that does not exist yet, or is empty.
    mask : str, Path or Lesion, optional
        A NIfTI mask in template space, or one read already; it is copied without free text in its header.
    label : int, optional
        The label to take, where the file holds several.
    **fields
        Fields of case.yaml (``stage``, ``cause``, ``person``, ``findings`` ...); ``stage`` is "acute" if left out.

    Raises
    ------
    CaseError
        The folder holds something already.
    ImageError
        The mask cannot be used; nothing is written.
    """
    place = Path(folder)
    if place.exists() and (not place.is_dir() or any(place.iterdir())):
        raise CaseError(Fault("folder-exists", str(place), "a folder that holds something", "a new or empty folder",
                              "choose another name; nothing was written"))  # fmt: skip
    data: dict[str, object] = {"stage": "acute", **fields}
    lesion = mask if isinstance(mask, Lesion) or mask is None else read_lesion(Path(mask), label=label)
    if lesion is not None:
        name = mask_name("lesion", desc="core")
        data["lesion"] = {"compartments": [{"name": "core", "kind": "core", "effect": 1.0, "file": name}]}
        spec = CaseFile.model_validate(data)
        write_mask(place / name, lesion.mask)
    else:
        spec = CaseFile.model_validate(data)
    write_case(place / "case.yaml", spec, None)
    return open_case(place)


def add_scan(case: Case, path: str | Path, sequence: str = "unknown") -> tuple[Case, list[Trace]]:
    """Copy a scan into a case folder, under a name that tells nothing and without free text in its header.

    Parameters
    ----------
    case : Case
        A case that lies on disk; case.yaml is written.
    path : str or Path
        A NIfTI volume in template space; it is not changed.
    sequence : str
        ``t1``, ``flair``, ``ct`` ...

    Returns
    -------
    Case
        The case with the scan.
    list of Trace
        What could identify a person and was left behind.

    Raises
    ------
    ImageError
        The file cannot be used; nothing is written.
    CaseError
        Somebody changed case.yaml in between.
    """
    source = Path(path)
    read_volume(source)
    word = re.sub(r"[^a-z0-9]", "", sequence.lower()) or "unknown"
    taken = {scan.file for scan in case.spec.scans}
    names = (f"space-MNI152NLin2009aSym_desc-{word}{number or ''}_scan.nii.gz" for number in itertools.count())
    name = next(name for name in names if name not in taken and not (case.folder / name).exists())
    left = stripped_image(source, case.folder / name)
    scans = [*(scan.model_dump() for scan in case.spec.scans), {"name": word, "file": name, "sequence": sequence}]
    return case.with_spec(scans=scans).save(), left


def bench_notebook(folder: Path) -> Path:
    """The notebook of a case folder that shows the bench on it; made where there is none, else left as it is."""
    path = folder / "bench.ipynb"
    if not path.exists():
        source = 'from byway.widgets import bench\n\nbench(".")'
        empty: dict[str, object] = {"execution_count": None, "id": "bench", "metadata": {}, "outputs": []}
        cell = {"cell_type": "code", "source": source, **empty}
        kernel = {"name": "python3", "display_name": "Python 3", "language": "python"}
        book = {"cells": [cell], "metadata": {"kernelspec": kernel}, "nbformat": 4, "nbformat_minor": 5}
        write_text(path, json.dumps(book, indent=1) + "\n")
    return path
