"""An explanation of a toy case, with all that a panel shows; made in a fraction of a second."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pandas as pd
from toy_graph import toy_draws, toy_graph

from byway.knowledge.graph.graph import Graph
from byway.knowledge.reasoning.explain import Explanation, explain_findings
from byway.knowledge.reasoning.findings import Finding

__all__ = ["TOY_FINDINGS", "toy_explanation"]

TOY_DAMAGE = {"arc.long@left": 0.8, "arc.anterior@left": 0.7, "parietal@left": 0.3}
TOY_FINDINGS = (
    Finding("repetition_loss", "none", "moderate"),
    Finding("comprehension_loss", "none", "absent"),
    Finding("hand_weakness", "right", "absent"),
)


def toy_explanation(
    graph: Graph | None = None, damage: dict[str, float] | None = None, findings: tuple[Finding, ...] | None = None
) -> Explanation:
    """Explain findings by invented damage, given by element id.

    By default two segments of the arcuate are cut, repetition is lost and comprehension is spared.
    """
    graph = toy_graph() if graph is None else graph
    ids, drawn, share = toy_draws(graph, TOY_DAMAGE if damage is None else damage)
    found = TOY_FINDINGS if findings is None else findings
    low, high = np.quantile(drawn["as_drawn"], [0.05, 0.95], axis=0)
    table = pd.DataFrame(
        {
            "element": ids,
            "kind": ["region" if element.partition("@")[0] in graph.regions else "segment" for element in ids],
            "name": [graph.name_of(element.partition("@")[0]) for element in ids],
            "side": [element.partition("@")[2] for element in ids],
            "share": share, "low": low, "high": high,
            "overlap_ml": share * 2, "clearance_mm": np.where(share > 0, -share * 8, 15.0),
            "anatomy": "template",
        }
    )  # fmt: skip
    return explain_findings(
        graph, SimpleNamespace(draws=drawn), SimpleNamespace(share=share, element_ids=ids),
        SimpleNamespace(handedness="right"), "subacute", "tumour", found,
        damage_table=table, uncharted_share=0.25,
    )  # fmt: skip
