"""Files of the drawing: what is loaded, what is saved to the case folder, what a lost kernel left behind."""

from __future__ import annotations

import gzip
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any

import nibabel as nib
import numpy as np
from numpy.typing import NDArray

from byway.knowledge.atomic import write_bytes
from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.lesion.images import mask_name, read_labels, read_lesion, read_volume, write_mask
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.space.grid import SPACE, TEMPLATE_GRID
from byway.widgets.state.drawing import Drawing
from byway.widgets.state.scans import Scan, quantised

__all__ = ["EFFECT_MAP", "findings_spec", "load_lesion", "load_scan", "save_drawing", "unsaved_edits"]

EFFECT_MAP = f"space-{SPACE}_desc-effect_map.nii.gz"


def load_lesion(path: Path, *, graded: bool, label: int | None, scale: tuple[float, float] | None) -> Lesion:
    """A mask, one label of a label volume, or a graded map, in template space.

    Raises
    ------
    ImageError
        See :func:`byway.knowledge.lesion.images.read_lesion`.
    """
    if label == 0:
        return read_labels(path)
    return read_lesion(path, label=label, graded=graded, scale=scale)


def load_scan(path: Path, sequence: str) -> Scan:
    """A scan in template space, on the template grid, as it will be held.

    Raises
    ------
    ImageError
        See :func:`byway.knowledge.lesion.images.read_volume`.
    """
    read = read_volume(path)
    stem = path.name.removesuffix(".gz").removesuffix(".nii")
    return quantised(stem, stem, sequence, read.data, read.notes)


def save_drawing(drawing: Drawing, folder: Path) -> dict[str, Any]:
    """Write a mask for each compartment that is not empty, and the graded map, under BIDS derivative names.

    Returns
    -------
    dict
        ``compartments`` and ``effect_map`` as case.yaml words them.

    Raises
    ------
    BywayError
        If nothing is drawn.
    """
    entries: list[dict[str, Any]] = []
    taken: set[str] = set()
    for c, style in enumerate(drawing.styles):
        mask = (drawing.bits & np.uint8(drawing.bit(c))) != 0
        if not mask.any():
            continue
        name = mask_name(style.name, desc="drawn")
        if name in taken:
            name = mask_name(f"{style.name}{c + 1}", desc="drawn")
        taken.add(name)
        write_mask(folder / name, mask)
        entries.append({**vars(style), "file": name})
    graded = drawing.settings.effect_volume
    if not entries and graded is None:
        raise BywayError(Fault("nothing-drawn", "save", "an empty drawing", "", "draw or load a lesion first"))
    if graded is not None:
        _write_map(folder / EFFECT_MAP, graded)
    return {"compartments": entries, "effect_map": EFFECT_MAP if graded is not None else None}


def _write_map(path: Path, volume: NDArray[np.float32]) -> None:
    made: Any = nib.Nifti1Image
    image = made(volume, TEMPLATE_GRID.affine)
    image.header.set_xyzt_units("mm")
    image.set_sform(TEMPLATE_GRID.affine, "mni")
    image.set_qform(TEMPLATE_GRID.affine, "mni")
    write_bytes(path, gzip.compress(image.to_bytes(), 4, mtime=0))


def findings_spec(findings: Iterable[Any]) -> list[dict[str, Any]]:
    """Findings as case.yaml words them."""
    return [{"sign": f.sign, "side": f.side, "grade": f.grade, "test": f.test, "date": f.date, "by": f.by}
            for f in findings]  # fmt: skip


def unsaved_edits(entries: Iterable[Mapping[str, Any]], author: str) -> list[dict[str, Any]]:
    """Edits of one author that were journalled since the drawing was last saved, in order.

    >>> unsaved_edits([{"author": "a", "kind": "edit", "edit": {"op": "undo"}}, {"author": "a", "kind": "saved"},
    ...                {"author": "a", "kind": "edit", "edit": {"op": "clear"}}], "a")
    [{'op': 'clear'}]
    """
    edits: list[dict[str, Any]] = []
    for entry in entries:
        if entry.get("author") != author:
            continue
        if entry.get("kind") == "saved":
            edits.clear()
        elif entry.get("kind") == "edit":
            edits.append(dict(entry["edit"]))
    return edits
