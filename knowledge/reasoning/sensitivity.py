"""How easily the ranking turns over: priors halved and doubled, each finding left out, the mask larger or smaller."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from functools import partial

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from byway.knowledge.reasoning.explanation import Explanation
from byway.knowledge.reasoning.grouping import Grouping, regroup
from byway.knowledge.reasoning.posterior import Reckoning, reckon, without_finding
from byway.knowledge.reasoning.scenarios import AXES, AxisPriors
from byway.knowledge.reasoning.wording import DEPARTURE_WORDS, join

__all__ = ["EASILY", "NARROW_ODDS", "Sensitivity", "sensitivity"]

EASILY = 0.1
"""Share of the changes from which a ranking that turns over is said to turn over easily."""
NARROW_ODDS = 1.5
"""Odds of the first account against the second below which one change is enough to say so."""


@dataclass(frozen=True, eq=False)
class Sensitivity:
    """What becomes of the first account under many small changes.

    Parameters
    ----------
    table : DataFrame
        ``kind`` (prior, finding, mask), ``change`` in words, ``first`` (title of the account that then leads),
        ``p_first``, ``p_usual_first`` (posterior of the account that leads now), ``flips``.
    flips_easily : bool
        Whether at least a share :data:`EASILY` of the changes puts another account first, or one does while the first
        leads the second by less than :data:`NARROW_ODDS`.
    words : str
        One sentence.
    """

    table: pd.DataFrame
    flips_easily: bool
    words: str


def sensitivity(
    explanation: Explanation,
    *,
    masks: Mapping[str, Mapping[str, NDArray[np.floating]]] | None = None,
    progress: Callable[[int, int], object] | None = None,
) -> Sensitivity:
    """How the ranking moves.

    Parameters
    ----------
    explanation : Explanation
        What is examined.
    masks : mapping, optional
        Ensembles of a changed mask by words, for example ``{"mask 2 mm larger": draws, "mask 2 mm smaller": draws}``.
        Without it the boundary variants of the explanation's own ensemble stand in.
    progress : callable, optional
        Called with changes done and in all; when it returns False, what is done so far is returned.
    """
    reckoning, grouping = explanation.reckoning, explanation.grouping
    changes = _prior_changes(reckoning) + _finding_changes(reckoning) + _mask_changes(reckoning, masks)
    first = grouping.groups[0]
    titles = dict(zip(grouping.groups, explanation.titles, strict=True))
    rows = []
    for done, (kind, words, make) in enumerate(changes):
        changed = regroup(make(), grouping.groups)
        usual = changed.groups.index(first)
        rows.append((kind, words, titles[changed.groups[0]], float(changed.posterior[0]),
                     float(changed.posterior[usual]), usual != 0))  # fmt: skip
        if progress is not None and progress(done + 1, len(changes)) is False:
            break
    table = pd.DataFrame(rows, columns=["kind", "change", "first", "p_first", "p_usual_first", "flips"])
    easily = _easily(table, grouping)
    return Sensitivity(table, easily, _words(table, easily))


def _prior_changes(reckoning: Reckoning) -> list[tuple[str, str, Callable[[], Reckoning]]]:
    """Every departure of every axis, half and twice as likely (in odds)."""
    changes: list[tuple[str, str, Callable[[], Reckoning]]] = []
    for axis, values in AXES.items():
        for value in values[1:]:
            for factor, words in ((0.5, "half"), (2.0, "twice")):
                priors = _scaled(reckoning.priors, axis, value, factor)
                said = f"{words} as likely beforehand that {DEPARTURE_WORDS[axis, value]}"
                changes.append(("prior", said, partial(replace, reckoning, priors=priors)))
    return changes


def _finding_changes(reckoning: Reckoning) -> list[tuple[str, str, Callable[[], Reckoning]]]:
    """Every finding left out."""
    names = reckoning.prepared.graph.signs
    return [("finding", f"without {names[finding.sign].name}, {finding.grade}", partial(without_finding, reckoning, f))
            for f, finding in enumerate(reckoning.findings)]  # fmt: skip


def _mask_changes(
    reckoning: Reckoning, masks: Mapping[str, Mapping[str, NDArray[np.floating]]] | None
) -> list[tuple[str, str, Callable[[], Reckoning]]]:
    """A larger and a smaller mask."""
    if masks is None:
        drawn = reckoning.draws
        masks = {
            "mask as large as its edge allows": {
                **drawn, "as_drawn": drawn["too_small"], "too_large": drawn["as_drawn"],
                "perilesional": np.maximum(drawn["too_small"], drawn["perilesional"]),
            },
            "mask as small as its edge allows": {
                **drawn, "as_drawn": drawn["too_large"], "too_small": drawn["as_drawn"],
            },
        }  # fmt: skip
    again = partial(reckon, findings=reckoning.findings, headroom=reckoning.headroom, priors=reckoning.priors)
    return [("mask", words, partial(again, reckoning.prepared, draws)) for words, draws in masks.items()]


def _scaled(priors: AxisPriors, axis: str, value: str, factor: float) -> AxisPriors:
    """Priors with one value's odds multiplied."""
    values = priors[axis]
    p = values[value]
    new = factor * p / (1.0 - p + factor * p)
    scaled = {each: (new if each == value else q * (1.0 - new) / (1.0 - p)) for each, q in values.items()}
    return {**priors, axis: scaled}


def _easily(table: pd.DataFrame, grouping: Grouping) -> bool:
    flips = int(table["flips"].sum())
    narrow = len(grouping.groups) > 1 and grouping.posterior[0] < NARROW_ODDS * grouping.posterior[1]
    return flips > 0 and (bool(narrow) or flips >= EASILY * len(table))


def _words(table: pd.DataFrame, easily: bool) -> str:
    flips = table[table["flips"].astype(bool)]
    if flips.empty:
        return f"The first account stays first under all {len(table)} changes."
    changes = join([str(change) for change in flips["change"].head(3)])
    more = f" and {len(flips) - 3} more" if len(flips) > 3 else ""
    start = "The ranking turns over easily" if easily else "The first account is mostly steady"
    return f"{start}: {len(flips)} of {len(table)} changes put another first ({changes}{more})."
