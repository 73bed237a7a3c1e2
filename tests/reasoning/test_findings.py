"""Findings as values, their checks, and how a report follows from what is there."""

from __future__ import annotations

import numpy as np
import pytest
from toy_graph import toy_graph
from toy_reckoning import absent, found

from byway.knowledge.faults import BywayError
from byway.knowledge.reasoning.findings import GRADES, Finding, check_findings, reading_matrix


def test_reading_matrix_by_hand() -> None:
    """Sensitivity 0.8, specificity 0.9: missed 0.2, false alarm 0.1 of which 0.07 mild; rows sum to 1."""
    matrix = reading_matrix(0.8, 0.9)
    np.testing.assert_allclose(matrix.sum(axis=1), 1.0)
    np.testing.assert_allclose(matrix[:, 0], [0.9, 0.2, 0.2, 0.2])
    np.testing.assert_allclose(matrix[0], [0.9, 0.07, 0.02, 0.01])
    np.testing.assert_allclose(matrix[1], [0.2, 0.48, 0.24, 0.08])


def test_the_likeliest_report_of_each_grade_is_that_grade() -> None:
    """A good test reports what is there more often than any other grade."""
    assert (reading_matrix(0.9, 0.9).argmax(axis=1) == np.arange(4)).all()


def test_all_faults_are_told_together() -> None:
    """An unknown sign with its nearest, a side that the sign lacks and an unknown grade come in one error."""
    bad = [found("hand_weaknes", "right"), found("hand_weakness"), Finding("neglect", "left", "heavy")]  # type: ignore[arg-type]
    with pytest.raises(BywayError, match="did you mean hand_weakness") as caught:
        check_findings(toy_graph(), bad)
    assert [fault.rule for fault in caught.value.faults] == ["unknown-sign", "side", "grade"]


def test_good_findings_pass_unchanged() -> None:
    """What is known comes back as a tuple; ids carry the side."""
    good = [found("hand_weakness", "right"), absent("amnesia")]
    assert check_findings(toy_graph(), good) == tuple(good)
    assert [each.sign_id for each in good] == ["hand_weakness@right", "amnesia@none"]
    assert [each.present for each in good] == [True, False]
    assert GRADES == ("absent", "mild", "moderate", "severe")
