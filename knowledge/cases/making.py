"""New cases: a folder with a case.yaml, and the lesion saved beside it under its standard name."""

from __future__ import annotations

from pathlib import Path

from byway.knowledge.cases.case import Case, open_case
from byway.knowledge.cases.files import write_case
from byway.knowledge.cases.model import CaseFile
from byway.knowledge.faults import CaseError, Fault
from byway.knowledge.lesion.images import read_lesion, write_mask

__all__ = ["new_case"]


def new_case(folder: str | Path, mask: str | Path | None = None, *, label: int | None = None, **fields: object) -> Case:
    """Make a case folder.

    Parameters
    ----------
    folder : str or Path
        A folder that does not exist yet, or is empty.
    mask : str or Path, optional
        A NIfTI mask in template space; it is copied without free text in its header.
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
    lesion = read_lesion(Path(mask), label=label) if mask is not None else None
    if lesion is not None:
        name = "space-MNI152NLin2009aSym_label-lesion_desc-core_mask.nii.gz"
        data["lesion"] = {"compartments": [{"name": "core", "kind": "core", "effect": 1.0, "file": name}]}
        spec = CaseFile.model_validate(data)
        write_mask(place / name, lesion.mask)
    else:
        spec = CaseFile.model_validate(data)
    write_case(place / "case.yaml", spec, None)
    return open_case(place)
