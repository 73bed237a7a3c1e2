"""Where the team stands towards each account, beside what the posterior says."""

from __future__ import annotations

from collections.abc import Mapping

import pandas as pd

from byway.knowledge.cases.pages import Standing
from byway.knowledge.reasoning.explain import Explanation

__all__ = ["STANDS", "team_standing"]

STANDS = ("held", "doubted", "ruled_out")


def team_standing(standings: Mapping[str, Mapping[str, Standing]], explanation: Explanation | None) -> pd.DataFrame:
    """One row an account that arises or that somebody spoke of.

    Parameters
    ----------
    standings : mapping
        From :meth:`~byway.knowledge.cases.pages.Pages.standings`: account key to person to standing.
    explanation : Explanation, optional
        Gives titles and posteriors; without it only accounts that somebody spoke of are listed.

    Returns
    -------
    DataFrame
        ``account`` (key), ``title``, ``posterior`` (NaN where the account does not arise now), ``held``, ``doubted``,
        ``ruled_out`` (tuples of people), ``differ`` (people stand in different places) and ``against_posterior``
        (somebody rules out the leading account, or holds one below 5 %). Best account first.
    """
    rows: dict[str, tuple[str, float]] = {}
    for account in explanation.accounts if explanation is not None else ():
        rows[account.key] = (account.title, account.posterior)
    for key in standings:
        rows.setdefault(key, (key, float("nan")))
    lead = max((posterior for _, posterior in rows.values() if posterior == posterior), default=float("nan"))
    table = []
    for key, (title, posterior) in rows.items():
        people = standings.get(key, {})
        sorted_out = {word: tuple(sorted(p for p, s in people.items() if s.stands == word)) for word in STANDS}
        odd = bool((sorted_out["ruled_out"] and posterior == lead) or (sorted_out["held"] and posterior < 0.05))
        table.append({"account": key, "title": title, "posterior": posterior, **sorted_out,
                      "differ": sum(bool(names) for names in sorted_out.values()) > 1,
                      "against_posterior": odd})  # fmt: skip
    columns = ["account", "title", "posterior", *STANDS, "differ", "against_posterior"]
    frame = pd.DataFrame(table, columns=columns)
    return frame.sort_values("posterior", ascending=False, na_position="last", ignore_index=True, kind="stable")
