"""Curated text to records, with lines."""

from __future__ import annotations

from pathlib import Path

import pytest
from small_graph import SMALL

from byway.knowledge.faults import GraphError
from byway.knowledge.graph.files import curated_folder, read_curated
from byway.knowledge.graph.grammar import fields_of, to_block, to_record
from byway.knowledge.graph.loading import base_content


@pytest.mark.parametrize("folder", [SMALL, curated_folder()], ids=["small", "curated"])
def test_block_and_record_are_inverse(folder: Path) -> None:
    """Every record, written as a block and read again, is itself."""
    content = read_curated(folder)
    for kind, key, record in content.every_record():
        block = to_block(record)
        assert set(block) <= set(fields_of(kind))
        if kind == "pathway":
            block["segments"] = list(content.pathways[key].segments)
        assert to_record(kind, key, block) == record


def test_lines_are_those_of_the_keys() -> None:
    """The line of each record holds its key, in the curated text too."""
    content = base_content()
    texts: dict[str, list[str]] = {}
    for (_, key), origin in content.origins.items():
        lines = texts.setdefault(origin.file, (curated_folder() / origin.file).read_text("utf-8").splitlines())
        assert lines[origin.line - 1].strip().startswith(f"{key.rpartition('.')[2]}:")


def test_segments_follow_their_pathway() -> None:
    """Segments nested in a pathway become records of their own, and the pathway lists their keys."""
    content = read_curated(SMALL)
    assert content.pathways["descending"].segments == ("descending.corona", "descending.lower")
    assert content.segments["descending.corona"].pathway == "descending"
    assert content.segments["descending.corona"].from_place == "motor_hand"


def test_faults_of_several_files_come_together(tmp_path: Path) -> None:
    """One file that is no YAML does not hide the faults of another."""
    (tmp_path / "sources").mkdir()
    (tmp_path / "norms").mkdir()
    (tmp_path / "sources" / "a.yaml").write_text("a_2001: {authors: [")
    (tmp_path / "norms" / "b.yaml").write_text("c: {name: C}\n")
    with pytest.raises(GraphError) as caught:
        read_curated(tmp_path)
    assert [fault.rule for fault in caught.value.faults] == ["yaml", "missing-field", "missing-field", "missing-field"]


def test_missing_title_stays_missing() -> None:
    """A title that is not recalled is None, never an invented one or an empty word."""
    assert read_curated(SMALL).sources["second_2002"].title is None
