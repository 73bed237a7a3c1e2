"""What one lesion and some findings come to, as one frozen value."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np
import pandas as pd

from byway.knowledge.reasoning.accounts import Account, title_of
from byway.knowledge.reasoning.grouping import Grouping, kind_of
from byway.knowledge.reasoning.next_tests import Outlook
from byway.knowledge.reasoning.posterior import Reckoning
from byway.knowledge.reasoning.scenarios import Priors

__all__ = ["Explanation", "Situation"]


@dataclass(frozen=True)
class Situation:
    """The person and the disease, as far as reasoning asks."""

    handedness: str
    stage: str
    cause: str
    priors: Priors | None = None


@dataclass(frozen=True, eq=False)
class Explanation:
    """What one lesion and some findings come to.

    Parameters
    ----------
    damage : DataFrame
        Damage by element with its interval, as the damage room gives it.
    functions : DataFrame
        ``function`` (copy id), ``key``, ``name``, ``domain``, ``capacity`` with ``low`` and ``high`` (5-95 % over
        draws; as drawn, typical organisation), ``capacity_cortical`` (regions alone), ``limited_by`` (element ids).
    signs : DataFrame
        ``sign``, ``side``, ``name``, ``domain``, ``expected_cortical`` (plain cortical reading), ``expected`` (all
        scenarios by their priors), ``low``, ``high`` (5-95 % over draws, as drawn), ``expected_given_findings``,
        ``found`` (grade, absent, or None where not tested).
    accounts : tuple of Account
        Best first; the plain cortical reading is always among them.
    other_posterior : float
        Posterior of accounts too unlikely to be shown.
    next_tests, next_images, next_axes : DataFrame
        See :mod:`~byway.knowledge.reasoning.next_tests`.
    remote : DataFrame
        Regions that lost input; see :mod:`~byway.knowledge.reasoning.remote`.
    uncharted_share : float
        Share of the lesion's white matter that lies in no segment of the graph; NaN where not reckoned.
    caution : str
        One line that goes with every display.
    remarks : tuple of str
        Sentences about this case as a whole: signs on the lesion's own side, tests that would tell little.
    situation : Situation
        Handedness, stage, cause and the case's own priors.
    reckoning, grouping, outlook
        The reckoning behind it, for sensitivity, what-if and the user's own account.
    """

    damage: pd.DataFrame
    functions: pd.DataFrame
    signs: pd.DataFrame
    accounts: tuple[Account, ...]
    other_posterior: float
    next_tests: pd.DataFrame
    next_images: pd.DataFrame
    next_axes: pd.DataFrame
    remote: pd.DataFrame
    uncharted_share: float
    caution: str
    remarks: tuple[str, ...]
    situation: Situation
    reckoning: Reckoning = field(repr=False)
    grouping: Grouping = field(repr=False)
    outlook: Outlook = field(repr=False)

    @cached_property
    def titles(self) -> list[str]:
        """Title of every account in the order of the grouping, shown or not."""
        shown = {account.scenario: account.title for account in self.accounts}
        graph = self.reckoning.prepared.graph
        return [
            shown.get(group.scenario) or title_of(graph, group.scenario, kind_of(self.reckoning, group), ())
            for group in self.grouping.groups
        ]

    def ranking_if(self, sign: str, side: str, found: bool) -> pd.DataFrame:
        """What the ranking would become if an untested sign were found, or not: ``account``, ``now``, ``then``.

        Raises
        ------
        KeyError
            The sign was tested, or depends on nothing that is damaged.
        """
        if f"{sign}@{side}" not in self.outlook.signs:
            raise KeyError(f"{sign}@{side}")
        row = self.outlook.signs.index(f"{sign}@{side}")
        then = (self.outlook.if_present if found else self.outlook.if_absent)[row]
        table = pd.DataFrame({"account": self.titles, "now": self.grouping.posterior, "then": then})
        return table.sort_values("then", ascending=False, kind="stable").reset_index(drop=True)

    def to_json(self, *, indent: int | None = None) -> str:
        """Everything as JSON, by the same names; NaN becomes null."""
        plain = {
            "caution": self.caution,
            "remarks": list(self.remarks),
            "accounts": [account.to_dict() for account in self.accounts],
            "other_posterior": self.other_posterior,
            "uncharted_share": self.uncharted_share,
            "situation": vars(self.situation).copy(),
        }
        for name in ("damage", "functions", "signs", "next_tests", "next_images", "next_axes", "remote"):
            plain[name] = getattr(self, name).to_dict("records")
        return json.dumps(_plain(plain), indent=indent, ensure_ascii=False, allow_nan=False)


def _plain(value: Any) -> Any:
    """JSON values: numpy scalars become numbers, tuples lists, NaN and infinities None."""
    if isinstance(value, Mapping):
        return {str(key): _plain(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [_plain(item) for item in value]
    if isinstance(value, np.generic):
        value = value.item()
    if isinstance(value, float) and not np.isfinite(value):
        return None
    return value
