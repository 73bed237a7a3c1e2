"""Mapping tables: every rule has a table that breaks only that rule."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from byway.knowledge.faults import ImageError
from byway.knowledge.space.mapping import parse_plane, read_mapping

ELEMENTS = ("sma@left", "frontal_aslant.sma_limb@left", "frontal_aslant.sma_limb@right")


def table(folder: Path, text: str, name: str = "mapping.csv") -> Path:
    """A mapping table beside a file ``a.trk``."""
    (folder / "a.trk").write_bytes(b"")
    path = folder / name
    path.write_text(text)
    return path


def test_a_table_is_read(tmp_path: Path) -> None:
    """CSV and TSV give the same rows; blank rows are passed over; what is left out takes its default."""
    text = "element,file,label,threshold,from_plane,to_plane\n\nsma@left,a.trk,7,,,\n"
    text += "frontal_aslant.sma_limb@left,a.trk,,0.5,y=-20,0 0 5 / 0 0 2\n"
    rows = read_mapping(table(tmp_path, text), ELEMENTS)
    tabbed = read_mapping(table(tmp_path, text.replace(",", "\t"), "mapping.tsv"), ELEMENTS)
    assert [row.element for row in rows] == [row.element for row in tabbed] == list(ELEMENTS[:2])
    assert (rows[0].label, rows[0].threshold, rows[0].from_plane) == (7, 0.25, None)
    assert rows[1].threshold == 0.5
    assert rows[1].to_plane is not None
    assert rows[1].to_plane.side_of(np.array([[9.0, 9, 8]])).tolist() == [3.0]
    assert rows[0].path == tmp_path / "a.trk"


@pytest.mark.parametrize(
    ("text", "rule", "message"),
    [
        ("element\nsma@left\n", "mapping-columns", "no column 'file'"),
        ("element,file,colour\nsma@left,a.trk,red\n", "mapping-columns", "column 'colour'"),
        ("element,file\nsmaa@left,a.trk\n", "mapping-element", "did you mean sma@left"),
        ("element,file\nsma@left,b.trk\n", "mapping-file", "file 'b.trk' is not there"),
        ("element,file\nsma@left,a.trk\nsma@left,a.trk\n", "mapping-twice", "sma@left a second time"),
        ("element,file,label\nsma@left,a.trk,x\n", "mapping-label", "label 'x'; expected a whole number"),
        ("element,file,threshold\nsma@left,a.trk,2\n", "mapping-threshold", "threshold '2'"),
        ("element,file,from_plane\nsma@left,a.trk,y>3\n", "mapping-plane", "from_plane 'y>3'"),
        ("element,file\n", "mapping-empty", "no row"),
    ],
)
def test_broken_tables_are_told(tmp_path: Path, text: str, rule: str, message: str) -> None:
    """Each broken table raises one fault, of its own rule."""
    with pytest.raises(ImageError) as caught:
        read_mapping(table(tmp_path, text), ELEMENTS)
    assert [fault.rule for fault in caught.value.faults] == [rule]
    assert message in str(caught.value.fault)


def test_all_faults_are_told_at_once(tmp_path: Path) -> None:
    """Two bad rows raise two faults, each with its line."""
    text = "element,file\nnowhere@left,a.trk\nsma@left,b.trk\n"
    with pytest.raises(ImageError) as caught:
        read_mapping(table(tmp_path, text), ELEMENTS)
    assert [fault.where for fault in caught.value.faults] == ["mapping.csv:2", "mapping.csv:3"]


def test_a_table_that_cannot_be_read(tmp_path: Path) -> None:
    """No file, or bytes that are no text."""
    with pytest.raises(ImageError, match="mapping"):
        read_mapping(tmp_path / "mapping.csv", ELEMENTS)
    (tmp_path / "mapping.csv").write_bytes(b"\xff\xfe\x00\xd8")
    with pytest.raises(ImageError, match="a CSV or TSV table"):
        read_mapping(tmp_path / "mapping.csv", ELEMENTS)


@pytest.mark.parametrize("text", ["", "y", "1 2 3", "1 2 3 / 0 0 0", "1 2 / 0 0 1", "q=3"])
def test_what_is_no_plane(text: str) -> None:
    """Anything but the two forms raises."""
    with pytest.raises((ValueError, IndexError)):
        parse_plane(text)
