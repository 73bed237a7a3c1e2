"""What if: expected signs before and after a change of stage, of the lesion, or of single elements."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from byway.knowledge.faults import BywayError, Fault, nearest
from byway.knowledge.reasoning.explanation import Explanation
from byway.knowledge.reasoning.posterior import Reckoning, reckon
from byway.knowledge.reasoning.prepared import Prepared
from byway.knowledge.reasoning.scenarios import axis_priors, headroom_of
from byway.knowledge.reasoning.tables import function_table, sign_table

__all__ = ["Change", "WhatIf", "changed_draws", "what_if"]

Draws = Mapping[str, NDArray[np.floating]]


@dataclass(frozen=True, eq=False)
class Change:
    """What is imagined to be different.

    Parameters
    ----------
    stage : str, optional
        Another stage.
    draws : mapping, optional
        The damage ensemble of another lesion: grown, shrunk, or with its oedema resolved.
    restored, severed : tuple of str
        Element ids made intact, and put out of action.
    """

    stage: str | None = None
    draws: Draws | None = None
    restored: tuple[str, ...] = ()
    severed: tuple[str, ...] = ()


@dataclass(frozen=True, eq=False)
class WhatIf:
    """Before and after.

    Parameters
    ----------
    signs : DataFrame
        ``sign``, ``side``, ``name``, ``found``, ``before``, ``after``, ``change`` (in the expected probability),
        largest change first.
    functions : DataFrame
        ``function``, ``name``, ``before``, ``after``, ``change`` (in capacity), largest change first.
    reckoning : Reckoning
        The changed one, findings as they were.
    """

    signs: pd.DataFrame
    functions: pd.DataFrame
    reckoning: Reckoning


def what_if(explanation: Explanation, change: Change, *, given_findings: bool = False) -> WhatIf:
    """Expected signs and capacities before and after a change.

    Parameters
    ----------
    given_findings : bool
        Whether scenarios are weighed by the findings (the person at hand) or by their priors (people in general).

    Raises
    ------
    BywayError
        An element that is not known.
    """
    before = explanation.reckoning
    prepared, situation = before.prepared, explanation.situation
    stage = change.stage or situation.stage
    draws = changed_draws(prepared, change.draws or before.draws, change.restored, change.severed)
    after = reckon(
        prepared,
        draws,
        before.findings,
        headroom=headroom_of(prepared.graph, stage, situation.cause),
        priors=axis_priors(prepared.graph, situation.handedness, stage, situation.cause, situation.priors),
    )
    column = "expected_given_findings" if given_findings else "expected"
    signs = _side_by_side(sign_table(before), sign_table(after), column, ["sign", "side", "name", "found"])
    functions = _side_by_side(function_table(before), function_table(after), "capacity", ["function", "name"])
    return WhatIf(signs, functions, after)


def changed_draws(
    prepared: Prepared, draws: Draws, restored: tuple[str, ...] = (), severed: tuple[str, ...] = ()
) -> dict[str, NDArray[np.float32]]:
    """A copy of the draws with some elements intact and others out of action in every variant.

    Raises
    ------
    BywayError
        An element that is not known.
    """
    for element in (*restored, *severed):
        if element not in prepared.number:
            raise BywayError(Fault("unknown-element", element, "no such element", "key@side",
                                   nearest(element, prepared.element_ids)))  # fmt: skip
    changed = {}
    for variant, array in draws.items():
        own = np.array(array, np.float32)
        own[:, [prepared.number[element] for element in restored]] = 0.0
        own[:, [prepared.number[element] for element in severed]] = 1.0
        changed[variant] = own
    return changed


def _side_by_side(before: pd.DataFrame, after: pd.DataFrame, column: str, keys: list[str]) -> pd.DataFrame:
    """One column of two tables with equal rows, and their difference, largest first."""
    table = before[keys].copy()
    table["before"], table["after"] = before[column], after[column]
    table["change"] = table["after"] - table["before"]
    order = table["change"].abs().sort_values(ascending=False, kind="stable").index
    return table.loc[order].reset_index(drop=True)
