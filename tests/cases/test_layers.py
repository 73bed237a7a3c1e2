"""Overlays and models of a case: named in case.yaml without touching the rest of it, kept as small files."""

from __future__ import annotations

from pathlib import Path

import pytest

from byway.knowledge.cases.case import Case, open_case
from byway.knowledge.cases.layers import CaseModel, keep_model, mention_overlay, overlay_path, overlays_of, read_models
from byway.knowledge.faults import CaseError, GraphError

TEXT = "# by hand\nstage: acute\nperson: {handedness: left}  # said so himself\n"
OVERLAY = 'name: Ward\nauthor: "A. Reader"\ndate: 2026-12-01\n'


@pytest.fixture
def case(tmp_path: Path) -> Case:
    """A case with a comment by hand."""
    (tmp_path / "case.yaml").write_text(TEXT)
    return open_case(tmp_path)


def test_comments_outlive_the_list(case: Case) -> None:
    """The list of overlays is put at the end, changed and emptied in place; every other byte stays."""
    first = mention_overlay(case, ["overlays/ward.yaml"])
    assert case.path.read_text() == f'{TEXT}overlays: ["overlays/ward.yaml"]\n'
    assert first.spec == open_case(case.folder).spec
    second = mention_overlay(first, ["overlays/other.yaml", "overlays/ward.yaml"])
    assert case.path.read_text() == f'{TEXT}overlays: ["overlays/other.yaml", "overlays/ward.yaml"]\n'
    assert mention_overlay(second, []).spec.overlays == ()
    assert case.path.read_text() == f"{TEXT}overlays: []\n"


def test_a_list_in_another_form_is_written_anew(case: Case) -> None:
    """A list over several lines is replaced too, at the price of the comments."""
    case.path.write_text(TEXT + "overlays:\n- overlays/a.yaml\n")
    mention_overlay(open_case(case.folder), ["overlays/b.yaml"])
    assert open_case(case.folder).spec.overlays == ("overlays/b.yaml",)


def test_unsaved_changes_stay_unsaved(case: Case) -> None:
    """What was changed on the bench and not saved does not slip into the file with the list."""
    changed = case.with_spec(stage="chronic")
    now = mention_overlay(changed, ["overlays/ward.yaml"])
    assert now.spec.stage == "chronic"
    assert open_case(case.folder).spec.stage == "acute"
    assert now.save().spec.stage == "chronic"


def test_a_rival_change_is_not_overwritten(case: Case) -> None:
    """Where somebody wrote case.yaml meanwhile, the list is refused and theirs stays."""
    case.path.write_text(TEXT + "cause: infarct\n")
    with pytest.raises(CaseError):
        mention_overlay(case, ["overlays/ward.yaml"])
    assert open_case(case.folder).spec.cause == "infarct"


def test_overlays_are_read_in_order(case: Case) -> None:
    """The overlays that a case names come with their paths, lowest first; a missing one is told."""
    (case.folder / "overlays").mkdir()
    for name in ("ward", "other"):
        (case.folder / f"overlays/{name}.yaml").write_text(OVERLAY.replace("Ward", name))
    named = case.with_spec(overlays=("overlays/other.yaml", "overlays/ward.yaml"))
    assert [(path, overlay.name) for path, overlay in overlays_of(named)] == [
        ("overlays/other.yaml", "other"),
        ("overlays/ward.yaml", "ward"),
    ]
    with pytest.raises((GraphError, CaseError)):
        overlays_of(case.with_spec(overlays=("overlays/none.yaml",)))


def test_models_come_back(case: Case) -> None:
    """A model is kept under its name and read back; one of the same name is replaced; a path outside is refused."""
    keep_model(case.folder, CaseModel("Direct route", ("overlays/ward.yaml",)))
    path = keep_model(case.folder, CaseModel("Direct route", ()))
    assert read_models(case.folder) == [CaseModel("Direct route", ())]
    assert path.read_text() == 'name: "Direct route"\noverlays: []\n'
    with pytest.raises(CaseError):
        keep_model(case.folder, CaseModel("Elsewhere", ("../x.yaml",)))
    with pytest.raises(CaseError):
        keep_model(case.folder, CaseModel("  "))
    path.write_text("[1]\n")
    with pytest.raises(CaseError, match="no model"):
        read_models(case.folder)


def test_names_of_files() -> None:
    """An author's overlay lies under plain letters and digits, whatever the name holds."""
    assert overlay_path("Ä. Löwe / ../x") == "overlays/a_lowe_x.yaml"
