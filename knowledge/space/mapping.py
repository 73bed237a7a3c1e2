"""Mapping tables: which file, or label of a file, stands for which element. One CSV or TSV beside the files.

Columns, in any order, found by their names in the first row:

``element``     ``key@side`` of a region or segment (needed in every row)
``file``        path of the file, from the table's own folder (needed)
``label``       whole number: the file is a label volume, and this is the element's value in it
``threshold``   probability from which a voxel counts (only for probability maps of tracts; 0.25 if left out)
``from_plane``  plane that the streamlines of the element start at (only for tractograms; may be left out)
``to_plane``    plane that they end at

A plane is ``x=-20``, ``y=0`` or ``z=15`` in template mm, or ``x y z / a b c``: a point in it and its normal.
"""

from __future__ import annotations

import csv
import re
from collections.abc import Collection
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import FaultReport, ImageError, nearest

__all__ = ["MappingRow", "Plane", "parse_plane", "read_mapping"]

_COLUMNS = ("element", "file", "label", "threshold", "from_plane", "to_plane")
_AXIS_PLANE = re.compile(r"^([xyz])\s*=\s*([-+]?\d+(?:\.\d+)?)$")


@dataclass(frozen=True)
class Plane:
    """A plane in template mm: a point in it and its unit normal."""

    point_mm: NDArray[np.float64]
    normal: NDArray[np.float64]

    def side_of(self, points_mm: NDArray[np.floating]) -> NDArray[np.float64]:
        """Signed distance (mm) of (n, 3) points from the plane."""
        return np.asarray((np.asarray(points_mm, float) - self.point_mm) @ self.normal)


@dataclass(frozen=True)
class MappingRow:
    """One row of a mapping table; ``where`` is the table and its line, for messages."""

    where: str
    element: str
    path: Path
    label: int | None = None
    threshold: float = 0.25
    from_plane: Plane | None = None
    to_plane: Plane | None = None


def parse_plane(text: str) -> Plane:
    """Read a plane.

    Raises
    ------
    ValueError
        If the text is neither form.

    Examples
    --------
    >>> parse_plane("y=-20").side_of(np.array([[0.0, -15.0, 3.0]])).tolist()
    [5.0]
    """
    found = _AXIS_PLANE.match(text.strip())
    if found:
        axis = "xyz".index(found[1])
        normal = np.eye(3)[axis]
        return Plane(normal * float(found[2]), normal)
    point, _, normal_text = text.partition("/")
    numbers = [np.array([float(word) for word in part.split()]) for part in (point, normal_text)]
    length = float(np.linalg.norm(numbers[1]))
    if numbers[0].shape != (3,) or numbers[1].shape != (3,) or not length > 0:
        raise ValueError(f"{text!r} is no plane")
    return Plane(numbers[0], numbers[1] / length)


def read_mapping(path: str | Path, elements: Collection[str]) -> tuple[MappingRow, ...]:
    """Read and check a mapping table.

    Parameters
    ----------
    path : path
        The table (``.csv`` or ``.tsv``).
    elements : collection of str
        The element ids that exist.

    Raises
    ------
    ImageError
        Holding every fault: missing columns or files, unknown elements, one element twice, unreadable numbers.
    """
    path = Path(path)
    report = FaultReport()
    try:
        text = path.read_text("utf-8-sig")
    except (OSError, UnicodeDecodeError) as error:
        report.add("mapping-file", str(path), str(error), "a CSV or TSV table")
        report.raise_if_grave(ImageError)
        raise
    reader = csv.DictReader(text.splitlines(), delimiter="\t" if path.suffix.lower() == ".tsv" else ",")
    columns = [name.strip() for name in reader.fieldnames or []]
    reader.fieldnames = columns
    for name in ("element", "file"):
        if name not in columns:
            report.add("mapping-columns", str(path), f"no column {name!r}", f"columns {', '.join(_COLUMNS)}")
    for name in columns:
        if name not in _COLUMNS:
            report.add("mapping-columns", str(path), f"column {name!r}", f"columns {', '.join(_COLUMNS)}")
    report.raise_if_grave(ImageError)
    rows: list[MappingRow] = []
    for number, values in enumerate(reader, start=2):
        row = _row(f"{path.name}:{number}", path.parent, values, report)
        if row is None:
            continue
        if row.element not in elements:
            report.add("mapping-element", row.where, row.element, "an element", nearest(row.element, elements))
        if row.element in {other.element for other in rows}:
            report.add("mapping-twice", row.where, f"{row.element} a second time", "one row an element")
        rows.append(row)
    if not rows and not len(report):
        report.add("mapping-empty", str(path), "no row", "one row an element")
    report.raise_if_grave(ImageError)
    return tuple(rows)


def _row(where: str, folder: Path, values: dict[str, str], report: FaultReport) -> MappingRow | None:
    cells = {name: (value or "").strip() for name, value in values.items() if name in _COLUMNS}
    if not any(cells.values()):
        return None
    before = len(report)
    file = folder / cells["file"]
    if not cells["file"] or not file.exists():
        report.add("mapping-file", where, f"file {cells['file']!r} is not there", f"a file in {folder.name}")
    label: int | None = None
    threshold = MappingRow.threshold
    planes: dict[str, Plane | None] = {"from_plane": None, "to_plane": None}
    for name, expected in (("label", "a whole number"), ("threshold", "a probability above 0, at most 1")):
        if not cells.get(name):
            continue
        try:
            if name == "label":
                label = int(cells[name])
            else:
                threshold = float(cells[name])
                if not 0.0 < threshold <= 1.0:
                    raise ValueError
        except ValueError:
            report.add(f"mapping-{name}", where, f"{name} {cells[name]!r}", expected)
    for name in planes:
        if cells.get(name):
            try:
                planes[name] = parse_plane(cells[name])
            except (ValueError, IndexError):
                report.add("mapping-plane", where, f"{name} {cells[name]!r}", "y=-20, or x y z / a b c")
    if len(report) > before:
        return None
    return MappingRow(where, cells["element"], file, label, threshold, planes["from_plane"], planes["to_plane"])
