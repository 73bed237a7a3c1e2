"""Cases alike: among a folder of cases, those nearest by damage and by findings, with what was held there.

Likeness by damage is the cosine between the vectors of lost and severed shares; likeness by findings is the share of
signs tested in both that were seen alike (simple matching over presence). Both are in [0, 1].
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from pathlib import Path

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from byway.knowledge.cases.case import Case, open_case
from byway.knowledge.cases.desk import Desk
from byway.knowledge.cases.explaining import desk_of, latest
from byway.knowledge.cases.pages import Pages
from byway.knowledge.damage.point import point_damage
from byway.knowledge.faults import BywayError
from byway.knowledge.reasoning.findings import Finding

__all__ = ["alike_by_damage", "alike_by_findings", "similar_cases", "similar_to"]


def alike_by_damage(one: NDArray[np.floating], other: NDArray[np.floating]) -> float:
    """Cosine between two vectors of shares; 0 where either has no damage.

    >>> alike_by_damage(np.array([1.0, 0.0]), np.array([1.0, 0.0]))
    1.0
    """
    size = float(np.linalg.norm(one) * np.linalg.norm(other))
    return float(np.dot(one, other)) / size if size else 0.0


def alike_by_findings(one: Iterable[Finding], other: Iterable[Finding]) -> tuple[float, int]:
    """Share of signs tested in both cases that were both seen or both not seen, and how many were tested in both.

    Signs that only one case tested say nothing: not tested is not absent.
    """
    first = {(f.sign, f.side): f.grade != "absent" for f in one}
    second = {(f.sign, f.side): f.grade != "absent" for f in other}
    both = first.keys() & second.keys()
    return (sum(first[key] == second[key] for key in both) / len(both) if both else 0.0), len(both)


def similar_cases(
    share: NDArray[np.floating],
    findings: Iterable[Finding],
    others: Mapping[Path, tuple[NDArray[np.floating], tuple[Finding, ...]]],
    *,
    below: Path | None = None,
) -> pd.DataFrame:
    """Rank other cases by likeness to this one.

    Parameters
    ----------
    share : (E,) float array
        Lost and severed shares of this case, in the order of the geometry's element ids.
    findings : iterable of Finding
        This case's findings.
    others : mapping
        Case folder to its shares (same order) and findings.
    below : Path, optional
        Name cases by their path below this folder, instead of by the folder's name.

    Returns
    -------
    DataFrame
        ``case``, ``by_damage``, ``by_findings``, ``signs_in_both``, ``likeness`` (mean of the two, or damage alone
        where no sign was tested in both), ``held``, ``doubted``, ``ruled_out``: accounts by what people said there.
    """
    mine, rows = tuple(findings), []
    for folder, (other_share, other_findings) in others.items():
        damage = alike_by_damage(share, other_share)
        seen, count = alike_by_findings(mine, other_findings)
        said: dict[str, list[str]] = {"held": [], "doubted": [], "ruled_out": []}
        for account, people in Pages(folder).standings().items():
            for author, standing in people.items():
                said[standing.stands].append(f"{account} ({author})")
        name = folder.relative_to(below).as_posix() if below is not None else folder.name
        rows.append({"case": name, "by_damage": damage, "by_findings": seen, "signs_in_both": count,
                     "likeness": (damage + seen) / 2 if count else damage,
                     **{word: "; ".join(names) for word, names in said.items()}})  # fmt: skip
    columns = ["case", "by_damage", "by_findings", "signs_in_both", "likeness", "held", "doubted", "ruled_out"]
    return pd.DataFrame(rows, columns=columns).sort_values("likeness", ascending=False, ignore_index=True)


def similar_to(case: Case, folder: str | Path, *, desk: Desk | None = None) -> pd.DataFrame:
    """Rank the cases of a folder by likeness to this one, on this one's graph.

    Parameters
    ----------
    case : Case
        The case in hand; it is left out of the ranking.
    folder : str or Path
        A folder of case folders, looked through to any depth.
    desk : Desk, optional
        Graph and geometry; by default this case's.

    Returns
    -------
    DataFrame
        As :func:`similar_cases`; ``case`` is the path below ``folder``. ``attrs["left_out"]`` lists cases that could
        not be read, with the reason.
    """
    desk, place = desk or desk_of(case), Path(folder)
    desk = desk.usual or desk  # one person's own anatomy says nothing of the others'
    others, left_out = {}, []
    for path in sorted(place.rglob("case.yaml")):
        if path.resolve() == case.path.resolve() or any(part.startswith(".") for part in path.relative_to(place).parts):
            continue
        try:
            other = open_case(path)
            others[path.parent] = _likeness_of(other, desk)
        except BywayError as error:
            left_out.append((path.parent.relative_to(place).as_posix(), str(error)))
    table = similar_cases(*_likeness_of(case, desk), others, below=place)
    table.attrs["left_out"] = left_out
    return table


def _likeness_of(case: Case, desk: Desk) -> tuple[NDArray[np.floating], tuple[Finding, ...]]:
    return point_damage(case.lesion, desk.index).share, latest(case.findings(desk.graph))
