"""case.yaml: read with lines, written without loss."""

from __future__ import annotations

import json
from pathlib import Path
from typing import get_args

import jsonschema
import pytest
import yaml

from byway.knowledge.atomic import fingerprint
from byway.knowledge.cases import files
from byway.knowledge.cases.files import dump_case, inside, read_case, write_case
from byway.knowledge.cases.model import CaseFile, case_schema
from byway.knowledge.faults import CaseError
from byway.knowledge.graph.loading import load_graph

VIGNETTES = json.loads((Path(__file__).parents[1] / "data" / "vignettes.json").read_text())
SCHEMA = Path(__file__).parents[2] / "knowledge" / "cases" / "case.schema.json"


def test_the_schema_file_is_current() -> None:
    """The JSON Schema in the package is the one that the model makes."""
    assert json.loads(SCHEMA.read_text()) == json.loads(json.dumps(case_schema()))


@pytest.mark.parametrize("vignette", VIGNETTES, ids=lambda v: v["id"])
def test_vignettes_are_cases(vignette: dict, tmp_path: Path) -> None:
    """Each vignette's case opens as it stands, obeys the schema (jsonschema, draft 2020-12), and round-trips."""
    jsonschema.validate(vignette["case"], json.loads(SCHEMA.read_text()))
    path = tmp_path / "case.yaml"
    path.write_text(yaml.safe_dump(vignette["case"]))
    case, _ = read_case(path)
    write_case(tmp_path / "again.yaml", case, None)
    assert read_case(tmp_path / "again.yaml")[0] == case
    assert dump_case(case) == (tmp_path / "again.yaml").read_text()


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("stage: later\n", r"case\.yaml:1 stage: .*acute.*later"),
        ("stage: acute\nlesions: {}\n", r"case\.yaml:2 lesions"),
        ("stage: acute\nfinding: []\n", r"case\.yaml:2 finding: no field 'finding'; did you mean findings\?$"),
        (
            "stage: acute\nlesion:\n  compartments:\n  - {name: a, kind: core, efect: 1, effect: 1, file: a.nii}\n",
            r"yaml:4 .*no field 'efect'; did you mean effect\?",
        ),
        ("stage: acute\nperson: {x: 1}\n", r"no field 'x'; known: handedness, age_band, pseudonym"),
        ("stage: acute\nperson: {age_band: sixty}\n", r"age_band: 'sixty'; expected an age band such as 60-69 or 80\+"),
        ("stage: acute\nperson: {age_band: 64}\n", r"age_band: 64; expected an age band such as 60-69 or 80\+"),
        ("stage: acute\nperson:\n  handedness: both\n", r"case\.yaml:3 person\.handedness"),
        ("stage: acute\nfindings:\n- {sign: aphasia}\n", r"case\.yaml:3 findings\.0\.grade"),
        ("stage: acute\nstage: acute\n", r"case\.yaml:2 stage: a key that stands twice"),
        ("stage: !!python/name:os.system x\n", r"case\.yaml:1: a tag"),
        ("stage: &a acute\ncause: *a\n", r"case\.yaml:1: an anchor"),
        ("stage: [acute\n", r"case\.yaml:2: .*expected"),
        ("- acute\n", r"case\.yaml:1: no mapping"),
        ("", r"case\.yaml:1: no mapping"),
        ("schema_version: 9\nstage: acute\n", r"case\.yaml:1 schema_version: schema 9; expected at most 1"),
        (
            "stage: acute\nlesion:\n  compartments:\n  - {name: a, kind: core, effect: 2, file: a.nii}\n",
            r"yaml:4 .*effect",
        ),
        (
            "stage: acute\nlesion:\n  compartments:\n  - {name: a, kind: core, effect: 1}\n",
            r"either `file` or `shapes`",
        ),
    ],
)
def test_bad_cases_say_where(text: str, said: str, tmp_path: Path) -> None:
    """A bad case.yaml gets one line with file, line and key."""
    path = tmp_path / "case.yaml"
    path.write_text(text)
    with pytest.raises(CaseError, match=said) as caught:
        read_case(path)
    assert "\n" not in str(caught.value)


def test_a_change_by_somebody_else_is_kept(tmp_path: Path) -> None:
    """Where case.yaml changed since it was read, theirs stays in place and ours is kept beside it."""
    path = tmp_path / "case.yaml"
    first = CaseFile(stage="acute")
    seen = write_case(path, first, None)
    theirs = dump_case(CaseFile(stage="chronic"))
    path.write_text(theirs)
    with pytest.raises(CaseError, match="somebody wrote"):
        write_case(path, CaseFile(stage="subacute"), seen)
    assert path.read_text() == theirs
    beside = list(tmp_path.glob("case.*.yaml"))
    assert [read_case(p)[0].stage for p in beside] == ["subacute"]
    assert write_case(path, CaseFile(stage="subacute"), fingerprint(path)) == fingerprint(path)


@pytest.mark.parametrize("name", ["../x.nii", "/etc/passwd", "a/../../x.nii"])
def test_volumes_stay_inside(name: str, tmp_path: Path) -> None:
    """A file name that leads out of the case folder is refused."""
    with pytest.raises(CaseError, match="inside the case folder"):
        inside(tmp_path, name)


def test_every_cause_has_its_perilesional_prior() -> None:
    """The causes of case.yaml are the members of the norm that the perilesional prior is read from."""
    prior = load_graph().norms["scenario_prior_perilesional"].value
    assert isinstance(prior, dict)
    assert set(get_args(CaseFile.model_fields["cause"].annotation)) == set(prior)


def test_an_older_schema_is_migrated_in_memory(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A case of an invented version 0, which said ``phase`` for stage, opens as version 1; the file stays as it was."""
    monkeypatch.setattr(files, "MIGRATIONS", {0: lambda old: {**{k: v for k, v in old.items() if k != "phase"},
                                                              "stage": old["phase"]}})  # fmt: skip
    path = tmp_path / "case.yaml"
    path.write_text("schema_version: 0\nphase: chronic\ncause: trauma\n")
    before = path.read_bytes()
    case, _ = read_case(path)
    assert (case.schema_version, case.stage, case.cause) == (1, "chronic", "trauma")
    assert path.read_bytes() == before
    write_case(path, case, fingerprint(path))
    assert read_case(path)[0] == case


def test_migrations_run_one_after_the_other(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """From version -1 by way of 0 to 1: each step sees what the step before made."""
    steps = {-1: lambda old: {**old, "title": "one"}, 0: lambda old: {**old, "title": old["title"] + ", two"}}
    monkeypatch.setattr(files, "MIGRATIONS", steps)
    path = tmp_path / "case.yaml"
    path.write_text("schema_version: -1\nstage: acute\n")
    assert read_case(path)[0].title == "one, two"


def test_a_version_that_nothing_leads_from_is_refused(tmp_path: Path) -> None:
    """A schema older than any migration is named with its line; nothing is guessed."""
    path = tmp_path / "case.yaml"
    path.write_text("schema_version: 0\nstage: acute\n")
    with pytest.raises(CaseError, match=r"case\.yaml:1 schema_version: schema 0"):
        read_case(path)
