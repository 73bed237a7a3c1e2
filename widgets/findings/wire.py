"""Signs and findings as plain values for the browser."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

__all__ = ["expected_of", "findings_of", "signs_of"]


def signs_of(graph: Any) -> list[dict[str, Any]]:
    """Every sign of the graph with how it is examined, how well, and on which sides it can be found."""
    rows = []
    for key, sign in graph.signs.items():
        sides = [sign_id.rpartition("@")[2] for sign_id in graph.sign_ids(key)]
        source = sign.accuracy_source
        rows.append(
            {
                "key": key,
                "name": sign.name,
                "domain": sign.domain,
                "sides": sorted(sides, reverse=True),
                "examination": sign.examination,
                "minutes": sign.minutes,
                "sensitivity": sign.sensitivity,
                "specificity": sign.specificity,
                "accuracy_source": graph.name_of(source) if source in graph.sources else source,
                "hpo": sign.hpo.id if sign.hpo else None,
                "hpo_label": sign.hpo.label if sign.hpo else None,
                "note": sign.note,
            }
        )
    return rows


def findings_of(findings: Iterable[Any]) -> dict[str, dict[str, Any]]:
    """Findings by sign id; the latest in the list counts where a sign was examined several times."""
    return {
        f"{finding.sign}@{finding.side}": {
            "grade": finding.grade, "test": finding.test, "date": finding.date, "by": finding.by,
        }
        for finding in findings
    }  # fmt: skip


def expected_of(explanation: Any) -> dict[str, list[float]]:
    """Probability of each sign under the full model and under the plain cortical reading, by sign id."""
    if explanation is None:
        return {}
    rows = explanation.signs
    ids = rows["sign"].astype(str) + "@" + rows["side"].astype(str)
    pairs = zip(ids, rows["expected"], rows["expected_cortical"], strict=True)
    return {sign_id: [float(full), float(plain)] for sign_id, full, plain in pairs}
