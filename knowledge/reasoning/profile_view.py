"""Expected against found, function by function: the mismatch at one glance, the plain reading beside the full model."""

from __future__ import annotations

import numpy as np
import pandas as pd

from byway.knowledge.reasoning.explanation import Explanation
from byway.knowledge.reasoning.findings import GRADES

__all__ = ["profile"]


def profile(explanation: Explanation) -> pd.DataFrame:
    """One row a function copy that is damaged, or that a tested sign depends on.

    Returns
    -------
    DataFrame
        ``function`` (copy id), ``name``, ``domain``; ``capacity_cortical``, ``capacity`` with ``low`` and ``high``;
        over the tested signs that depend on it: ``expected_cortical``, ``expected`` (largest probability), ``found``
        (worst grade, ``absent``, or None where none was tested), ``signs`` (tuple of tested sign ids);
        ``mismatch_cortical``, ``mismatch``: found (1 or 0) minus expected, largest in size over those signs; positive
        for an unexpected deficit, negative for unexpected sparing; NaN where nothing was tested.
    """
    reckoning = explanation.reckoning
    table = {f"{row['sign']}@{row['side']}": row for row in explanation.signs.to_dict("records")}
    tested: dict[str, list[str]] = {}
    for finding in reckoning.findings:
        for copy in reckoning.model(0, finding.sign_id).copies:
            tested.setdefault(copy, []).append(finding.sign_id)
    rows = []
    for function in explanation.functions.to_dict("records"):
        signs = tuple(dict.fromkeys(tested.get(function["function"], ())))
        if not signs and function["capacity"] > 0.98 and function["capacity_cortical"] > 0.98:
            continue
        seen = [table[sign] for sign in signs]
        grades = [str(each["found"]) for each in seen]
        worst = max(grades, key=lambda grade: [*map(str, GRADES)].index(grade)) if grades else None
        gaps = {
            column: [float(grade != "absent") - float(each[column]) for grade, each in zip(grades, seen, strict=True)]
            for column in ("expected_cortical", "expected")
        }
        rows.append((
            function["function"], function["name"], function["domain"], function["capacity_cortical"],
            function["capacity"], function["low"], function["high"],
            max((float(each["expected_cortical"]) for each in seen), default=np.nan),
            max((float(each["expected"]) for each in seen), default=np.nan),
            worst, signs, max(gaps["expected_cortical"], key=abs, default=np.nan),
            max(gaps["expected"], key=abs, default=np.nan),
        ))  # fmt: skip
    view = pd.DataFrame(rows, columns=[
        "function", "name", "domain", "capacity_cortical", "capacity", "low", "high", "expected_cortical", "expected",
        "found", "signs", "mismatch_cortical", "mismatch",
    ])  # fmt: skip
    view["found"] = pd.Series([row[9] for row in rows], dtype=object)
    return view
