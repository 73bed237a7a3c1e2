"""How the ranking of accounts differs between two explanations of the same case, as before and after an edit."""

from __future__ import annotations

import pandas as pd

from byway.knowledge.reasoning.explanation import Explanation

__all__ = ["ranking_change", "ranking_words"]

_SAME = 0.005


def ranking_change(before: Explanation, after: Explanation) -> pd.DataFrame:
    """Every account that either explanation shows, by its departures.

    Returns
    -------
    DataFrame
        ``account`` (its key), ``title`` (as after, or as before where it is gone), ``rank_before``, ``rank_after``
        (from 1; NaN where it is not shown), ``before``, ``after`` (posterior; NaN likewise), ``change``; in the order
        of the ranking after.
    """
    first = {account.key: (rank, account) for rank, account in enumerate(before.accounts, 1)}
    second = {account.key: (rank, account) for rank, account in enumerate(after.accounts, 1)}
    rows = []
    for key in (*second, *(key for key in first if key not in second)):
        old, new = first.get(key), second.get(key)
        named = new or old
        assert named is not None
        rows.append(
            {
                "account": key,
                "title": named[1].title,
                "rank_before": old[0] if old else float("nan"),
                "rank_after": new[0] if new else float("nan"),
                "before": old[1].posterior if old else float("nan"),
                "after": new[1].posterior if new else float("nan"),
            }
        )
    columns = ["account", "title", "rank_before", "rank_after", "before", "after"]
    table = pd.DataFrame(rows, columns=columns)
    table["change"] = table["after"].fillna(0.0) - table["before"].fillna(0.0)
    return table


def ranking_words(table: pd.DataFrame) -> str:
    """One sentence about a table of :func:`ranking_change`."""
    if table.empty:
        return "There is no account to rank."
    largest = table.iloc[int(table["change"].abs().to_numpy().argmax())]
    if abs(float(largest["change"])) < _SAME:
        return "The ranking stays as it is."
    led, leads = table[table["rank_before"] == 1], table[table["rank_after"] == 1]
    size = f"from {_percent(largest['before'])} to {_percent(largest['after'])}"
    if len(led) and len(leads) and led["account"].iloc[0] != leads["account"].iloc[0]:
        return f"Another account leads now: {leads['title'].iloc[0]}. The largest change goes {size}."
    return f"The same account leads; the largest change goes {size} ({largest['title']})."


def _percent(value: float) -> str:
    return "not shown" if pd.isna(value) else f"{100 * value:.1f} %"
