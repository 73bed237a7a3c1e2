"""What was observed: findings as values, checked against the graph, and how a report follows from what is there."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Literal, get_args

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import BywayError, FaultReport, nearest
from byway.knowledge.graph.graph import Graph

__all__ = ["GRADES", "BodySide", "Finding", "FoundGrade", "check_findings", "reading_matrix"]

FoundGrade = Literal["absent", "mild", "moderate", "severe"]
BodySide = Literal["left", "right", "none"]
GRADES: tuple[FoundGrade, ...] = get_args(FoundGrade)

_AGREEMENT = np.array([0.6, 0.3, 0.1])  # weight of a reported grade that is 0, 1, 2 steps from the true one
_FALSE_GRADES = np.array([0.7, 0.2, 0.1])  # grades that a false positive is reported with


@dataclass(frozen=True)
class Finding:
    """One observation. A sign that has no finding was not tested, which says nothing.

    Parameters
    ----------
    sign : str
        Sign key.
    side : {'left', 'right', 'none'}
        Side of the body or of the field; ``none`` for signs without one.
    grade : {'absent', 'mild', 'moderate', 'severe'}
        What was found.
    test, date, by : str, optional
        How, when and by whom.
    """

    sign: str
    side: BodySide
    grade: FoundGrade
    test: str | None = None
    date: str | None = None
    by: str | None = None

    @property
    def sign_id(self) -> str:
        """``key@side``, as the graph names it."""
        return f"{self.sign}@{self.side}"

    @property
    def present(self) -> bool:
        """Whether the sign was found."""
        return self.grade != "absent"


def check_findings(graph: Graph, findings: Iterable[Finding]) -> tuple[Finding, ...]:
    """The findings, if the graph knows them all.

    Raises
    ------
    BywayError
        An unknown sign, a side that the sign does not have, an unknown grade; all faults together.
    """
    report = FaultReport()
    kept = []
    for finding in findings:
        where = f"finding {finding.sign}@{finding.side}"
        if finding.sign not in graph.signs:
            report.add("unknown-sign", where, "no sign has this key", remedy=nearest(finding.sign, graph.signs))
        elif finding.sign_id not in graph.sign_ids(finding.sign):
            sides = ", ".join(each.partition("@")[2] for each in graph.sign_ids(finding.sign))
            report.add("side", where, f"side {finding.side}", f"side {sides}")
        if finding.grade not in GRADES:
            report.add("grade", where, f"grade {finding.grade!r}", ", ".join(GRADES))
        kept.append(finding)
    report.raise_if_grave(BywayError)
    return tuple(kept)


def reading_matrix(sensitivity: float, specificity: float) -> NDArray[np.float64]:
    """Probability of each reported grade (columns) given each true one (rows), absent to severe; rows sum to 1.

    A sign that is there is missed with ``1 - sensitivity``; when it is seen, the reported grade is near the true one.
    A sign that is not there is reported with ``1 - specificity``, mostly as mild. The spread over grades is the
    authors' judgement.

    >>> reading_matrix(1.0, 1.0)[0].tolist()
    [1.0, 0.0, 0.0, 0.0]
    >>> bool(np.allclose(reading_matrix(0.8, 0.9).sum(axis=1), 1.0))
    True
    """
    matrix = np.zeros((4, 4))
    matrix[0, 0] = specificity
    matrix[0, 1:] = (1.0 - specificity) * _FALSE_GRADES
    for true in (1, 2, 3):
        near = _AGREEMENT[np.abs(np.arange(1, 4) - true)]
        matrix[true, 0] = 1.0 - sensitivity
        matrix[true, 1:] = sensitivity * near / near.sum()
    return matrix
