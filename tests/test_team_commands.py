"""Commands of the team: reports in every form, visits, cases alike, and what must be looked at before it leaves."""

from __future__ import annotations

import io
import shutil
from pathlib import Path

import pytest
from pypdf import PdfReader

from byway.knowledge.__main__ import main

CASES = Path(__file__).parents[1] / "notebooks" / "cases"


def run(capsys: pytest.CaptureFixture[str], *arguments: object) -> tuple[int, str, str]:
    """Run a command in this process: exit code, stdout, stderr."""
    code = main([str(argument) for argument in arguments])
    out, err = capsys.readouterr()
    return code, out, err


@pytest.fixture
def team(tmp_path: Path) -> Path:
    """A copy of the team's case."""
    return Path(shutil.copytree(CASES / "team_case", tmp_path / "cases" / "team_case"))


def test_a_report_in_every_form(team: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """One command writes HTML, PDF and tables, with the visits' tables too; --notes chooses by tag."""
    code, _, err = run(capsys, "explain", team, "--draws", 20, "--report", tmp_path / "r.html", "--pdf",
                       tmp_path / "r.pdf", "--tables", tmp_path / "tables", "--notes", "prediction")  # fmt: skip
    assert code == 0
    assert "no diagnosis" in err
    assert (tmp_path / "r.html").read_text().count('class="note"') == 2
    assert len(PdfReader(io.BytesIO((tmp_path / "r.pdf").read_bytes())).pages) > 3
    written = {path.name for path in (tmp_path / "tables").iterdir()}
    assert {"damage.csv", "ledger.csv", "course_accounts.csv", "about.txt"} <= written


def test_a_summary_is_one_page(team: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """--summary gives one page."""
    assert run(capsys, "explain", team, "--draws", 20, "--summary", "--pdf", tmp_path / "s.pdf")[0] == 0
    assert len(PdfReader(io.BytesIO((tmp_path / "s.pdf").read_bytes())).pages) == 1


def test_an_unknown_tag_is_named(team: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A tag that no note carries gives the tags there are, and writes nothing."""
    code, _, err = run(capsys, "explain", team, "--draws", 20, "--report", tmp_path / "r.html", "--notes", "tpyo")
    assert code == 2
    assert "prediction" in err
    assert not (tmp_path / "r.html").exists()


def test_course(team: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Visits are printed side by side; a case with one time point is told so."""
    code, out, _ = run(capsys, "course", team, "--draws", 20, "--csv", tmp_path / "csv")
    assert code == 0
    assert "2026-11-16: chronic" in out
    assert (tmp_path / "csv" / "course_damage.csv").read_text().startswith("element,2026-08-10")
    code, _, err = run(capsys, "course", CASES / "first_case")
    assert code == 2
    assert "one time point" in err


def test_similar(team: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A folder's cases are ranked; an empty one says so."""
    code, out, _ = run(capsys, "similar", team, CASES)
    assert code == 0
    assert "first_case" in out
    code, out, _ = run(capsys, "similar", team, team.parent)
    assert code == 0
    assert "no other case" in out


def test_nothing_leaves_unlooked_at(team: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Packing lists what could identify a person and refuses, until --reviewed; what comes in is listed as well."""
    archive = tmp_path / "case.zip"
    code, out, _ = run(capsys, "archive", "list", team)
    assert code == 1
    assert "2026-08-10" in out
    code, _, err = run(capsys, "archive", "pack", team, archive)
    assert code == 2
    assert "2026-08-10" in err
    assert not archive.exists()
    assert run(capsys, "archive", "pack", team, archive, "--reviewed")[0] == 0
    code, _, err = run(capsys, "archive", "unpack", archive, tmp_path / "back")
    assert code == 0
    assert "could identify" in err
    assert sorted(p.name for p in (tmp_path / "back" / "notes").iterdir()) == sorted(
        p.name for p in (team / "notes").iterdir())  # fmt: skip
