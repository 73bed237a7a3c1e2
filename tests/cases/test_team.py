"""Standing beside the posterior, the course over visits, and cases alike."""

from __future__ import annotations

import shutil
from pathlib import Path

import numpy as np
import pytest
from toy_explanation import toy_explanation

from byway.knowledge import course_of_case, explain, open_case, similar_to
from byway.knowledge.cases.case import Case
from byway.knowledge.cases.course import Course
from byway.knowledge.cases.explaining import latest
from byway.knowledge.cases.pages import Pages, Standing
from byway.knowledge.cases.similar import alike_by_damage, alike_by_findings
from byway.knowledge.cases.standing import team_standing
from byway.knowledge.cases.tables import course_tables
from byway.knowledge.reasoning.findings import Finding

CASES = Path(__file__).parents[2] / "notebooks" / "cases"


def test_where_the_team_differs(tmp_path: Path) -> None:
    """Two people in different places differ; ruling out the leader, or holding the unlikely, stands against the
    posterior; an account that no longer arises is listed last, without one."""
    explanation = toy_explanation()
    pages = Pages(tmp_path)
    first, last = explanation.accounts[0].key, explanation.accounts[-1].key
    pages.put(Standing(author="AB", account=first, stands="held"))
    pages.put(Standing(author="CD", account=first, stands="held"))
    pages.put(Standing(author="CD", account=first, stands="ruled_out", reason="second thoughts"))
    pages.put(Standing(author="CD", account=last, stands="doubted"))
    pages.put(Standing(author="CD", account="gone", stands="doubted"))
    table = team_standing(pages.standings(), explanation).set_index("account")
    assert (table.loc[first, "held"], table.loc[first, "ruled_out"]) == (("AB",), ("CD",))
    assert table.loc[first, "differ"]
    assert table.loc[first, "against_posterior"]
    assert not table.loc[last, "differ"]
    assert table.index[-1] == "gone"
    assert np.isnan(table.loc["gone", "posterior"])
    assert table["posterior"].dropna().is_monotonic_decreasing


def test_the_newest_finding_of_a_sign_counts() -> None:
    """A sign that was severe and later absent is absent; other sides, and signs without dates, keep their own."""
    found = [Finding("hemiparesis", "right", "severe", date="2026-08-10"), Finding("amnesia", "none", "mild"),
             Finding("hemiparesis", "left", "mild", date="2026-08-01"),
             Finding("hemiparesis", "right", "absent", date="2026-09-10")]  # fmt: skip
    assert [(f.sign, f.side, f.grade) for f in latest(found)] == [
        ("hemiparesis", "right", "absent"), ("amnesia", "none", "mild"), ("hemiparesis", "left", "mild")]  # fmt: skip


@pytest.fixture(scope="module")
def team() -> Case:
    """The team's case, with three time points."""
    return open_case(CASES / "team_case")


@pytest.fixture(scope="module")
def course(team: Case) -> Course:
    """Its course."""
    return course_of_case(team, draws=20)


def test_a_course_is_the_explanations_side_by_side(team: Case, course: Course) -> None:
    """Every number of the course is that of the case explained as it stood at that visit."""
    assert course.visits == ("2026-08-10", "2026-09-07", "2026-11-16")
    assert course.stages == ("acute", "subacute", "chronic")
    for i, visit in enumerate(course.visits):
        point = team.with_spec(visits=()) if i == 0 else team.at_visit(i - 1)
        alone = explain(point, draws=20)
        assert course.volumes_ml[i] == point.lesion.volume_ml
        share = alone.damage.set_index("element")["share"]
        for element in course.damage.index:
            assert course.number(f"course/damage/{element}/{visit}") == pytest.approx(share[element])
        for account in alone.accounts:
            assert course.accounts.loc[account.key, visit] == pytest.approx(account.posterior)
        capacity = alone.functions.set_index("function")["capacity"]
        assert course.functions[visit].to_dict() == pytest.approx({f: capacity[f] for f in course.functions.index})


def test_what_changed_comes_first(course: Course) -> None:
    """Change is last minus first, the largest on top; the bleed clears, and capacity comes back."""
    for table in (course.damage, course.functions, course.accounts):
        assert table["change"].tolist() == pytest.approx((table[course.visits[-1]] - table[course.visits[0]]).tolist())
        assert table["change"].abs().is_monotonic_decreasing
    assert (course.damage["change"] <= 1e-6).all()
    assert (course.functions["change"] > 0).mean() > 0.9


def test_not_tested_is_not_absent(course: Course) -> None:
    """A sign looked for at one visit only reads "not tested" at the others."""
    row = course.findings.loc[("homonymous_hemianopia", "right")]
    assert [row[f"{visit} found"] for visit in course.visits] == ["absent", "not tested", "not tested"]
    anomia = course.findings.loc[("anomia", "none")]
    assert [anomia[f"{visit} found"] for visit in course.visits] == ["not tested", "not tested", "mild"]
    tables = {f"course_{name}" for name in ("damage", "functions", "signs", "accounts")}
    assert set(course_tables(course)) == tables | {"visits"}


def test_likeness_by_hand() -> None:
    """Cosine of (1, 1) and (1, 0) is 0.71; of signs tested in both, one of two alike gives one half."""
    assert alike_by_damage(np.array([1.0, 1.0]), np.array([1.0, 0.0])) == pytest.approx(0.7071, abs=1e-4)
    one = [Finding("a", "none", "mild"), Finding("b", "none", "absent"), Finding("c", "none", "mild")]
    other = [Finding("a", "none", "severe"), Finding("b", "none", "mild"), Finding("d", "none", "mild")]
    assert alike_by_findings(one, other) == (0.5, 2)


def test_a_copy_is_most_alike(tmp_path: Path) -> None:
    """Among the demo cases and a copy of the first, the copy comes first with likeness 1; the case itself is left out;
    a broken case is named; what was held there is told."""
    shutil.copytree(CASES, tmp_path / "cases")
    shutil.copytree(CASES / "first_case", tmp_path / "cases" / "deep" / "copy")
    (tmp_path / "cases" / "broken").mkdir()
    (tmp_path / "cases" / "broken" / "case.yaml").write_text("stage: never\n")
    table = similar_to(open_case(tmp_path / "cases" / "first_case"), tmp_path / "cases")
    assert table["case"].iloc[0] == "deep/copy"
    assert table["likeness"].iloc[0] == pytest.approx(1.0)
    assert "first_case" not in set(table["case"])
    assert [name for name, _ in table.attrs["left_out"]] == ["broken"]
    team = table.set_index("case").loc["team_case"]
    assert "perilesional.yes (AB)" in team["held"]
    assert "speaks.cortical (AB)" in team["ruled_out"]
