"""Two versions of case.yaml: compared, merged where that is safe, and settled without loss."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from byway.knowledge.atomic import fingerprint
from byway.knowledge.cases.case import open_case
from byway.knowledge.cases.files import dump_case, write_case
from byway.knowledge.cases.model import CaseFile
from byway.knowledge.cases.versions import beside_versions, differences, merged, settle_version
from byway.knowledge.faults import CaseError

ABSENT = {"sign": "anomia", "grade": "absent"}
MILD = {"sign": "anomia", "grade": "mild"}
CHANGES = st.fixed_dictionaries({}, optional={
    "title": st.sampled_from(["a", "b"]), "cause": st.sampled_from(["infarct", "trauma"]),
    "stage": st.sampled_from(["subacute", "chronic"]),
})  # fmt: skip


def case(**fields: Any) -> CaseFile:
    """A small case."""
    return CaseFile.model_validate({"stage": "acute", **fields})


def test_lists_differ_by_entry() -> None:
    """Of two lists of findings, only the entries that differ are shown."""
    one = case(findings=[ABSENT, {"sign": "apraxia_of_speech", "grade": "mild"}])
    other = case(findings=[MILD, {"sign": "apraxia_of_speech", "grade": "mild"}])
    (row,) = differences(one, other)
    assert row.field == "findings"
    assert "absent" in row.one
    assert "mild" in row.other
    assert "apraxia" not in row.one + row.other


@given(CHANGES, CHANGES)
def test_a_merge_takes_what_only_one_side_changed(mine: dict[str, str], theirs: dict[str, str]) -> None:
    """Every field is ours where we changed it, else theirs; it clashes exactly where both changed it differently."""
    base = case()
    made, clashing = merged(base, case(**mine), case(**theirs))
    for name in ("title", "cause", "stage"):
        wanted = mine.get(name, theirs.get(name, getattr(base, name)))
        assert getattr(made, name) == wanted
    assert set(clashing) == {name for name in mine.keys() & theirs.keys() if mine[name] != theirs[name]}


@pytest.fixture
def clash(tmp_path: Path) -> Path:
    """A folder in which somebody else's version is in place, and ours lies beside it."""
    path = tmp_path / "case.yaml"
    seen = write_case(path, case(), None)
    write_case(path, case(title="theirs"), seen)
    with pytest.raises(CaseError, match="somebody wrote"):
        write_case(path, case(title="ours"), seen)
    return tmp_path


@pytest.mark.parametrize(("keep", "title"), [("in_place", "theirs"), ("beside", "ours")])
def test_settling_keeps_both_texts(clash: Path, keep: Any, title: str) -> None:
    """The chosen version is case.yaml; the other's text lies in the versions folder; nothing waits any more."""
    (name,) = beside_versions(clash)
    assert [row.field for row in differences(open_case(clash).spec, open_case(clash / name).spec)] == ["title"]
    settle_version(clash, name, keep)
    assert open_case(clash).spec.title == title
    assert beside_versions(clash) == []
    kept = {path.read_text() for path in (clash / "versions").iterdir()} | {(clash / "case.yaml").read_text()}
    assert {dump_case(case(title="theirs")), dump_case(case(title="ours"))} <= kept


@pytest.mark.parametrize("name", ["case.yaml", "../case.yaml", "case.x.yaml", "case.000000000000-0000000000.yaml"])
def test_no_other_file_is_settled(clash: Path, name: str) -> None:
    """A name that is no waiting version is refused, and nothing moves."""
    before = fingerprint(clash / "case.yaml")
    with pytest.raises(CaseError, match="no such version"):
        settle_version(clash, name, "beside")
    assert fingerprint(clash / "case.yaml") == before
    assert len(beside_versions(clash)) == 1
