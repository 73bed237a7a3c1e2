"""What ``byway graph`` prints: the check, the table for reviewers, differences in words, and exports."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from itertools import combinations
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import FaultReport, GraphError
from byway.knowledge.graph.checks import RULES, check_graph
from byway.knowledge.graph.content import Content
from byway.knowledge.graph.export import export_graph
from byway.knowledge.graph.layers import apply_overlays, clashes
from byway.knowledge.graph.layers import diff as differences
from byway.knowledge.graph.loading import base_content, load_graph
from byway.knowledge.graph.overlay_files import read_overlay
from byway.knowledge.graph.overlays import Overlay
from byway.knowledge.graph.tables import segment_text

__all__ = ["check", "diff", "export", "table"]

Paths = Iterable[Overlay | Path | str]


def check(
    overlays: Paths = (), geometry_ends: Mapping[str, NDArray[np.floating]] | None = None
) -> tuple[FaultReport, str]:
    """Run every rule over the base with overlays on it.

    Returns
    -------
    report : FaultReport
        All faults; ``report.grave`` are those that forbid use. A file that cannot be read is a fault too.
    text : str
        Counts by kind, share of sources that were read, every fault, and a verdict.
    """
    report = FaultReport()
    content: Content | None = None
    try:
        content = base_content()
        content = apply_overlays(content, _read(overlays))
        report.extend(check_graph(content, geometry_ends))
    except GraphError as error:
        report.extend(error.faults)
    lines = _count_lines(content) if content else []
    lines += [f"{'fault' if fault.grave else 'incomplete'}  {fault.rule}  {fault}" for fault in report]
    if len(report):
        lines.append(f"{len(report.grave)} faults that forbid use, {len(report) - len(report.grave)} things incomplete")
    else:
        lines.append(f"clean: {len(RULES)} rules hold")
    return report, "\n".join(lines)


def table(overlays: Paths = ()) -> str:
    """The sign-by-segment table, to be read from top to bottom."""
    return segment_text(load_graph(_read(overlays)))


def diff(overlays: Paths) -> str:
    """What overlays change, in words; drafts that are not used; overlays that contradict each other."""
    layers = _read(overlays)
    lines = [change.words for change in differences(base_content(), load_graph(layers))]
    lines += [f"draft, not used ({layer.name}): {entry.words}" for layer in layers for entry in layer.drafts]
    lines += [f"conflict: {each.words}" for pair in combinations(layers, 2) for each in clashes(*pair)]
    return "\n".join(lines) or "no difference from the base"


def export(overlays: Paths, to: Path | str) -> str:
    """Write GraphML (a name ending in .graphml) or a folder of GraphML and tables; says what was written."""
    return "\n".join(f"written: {path}" for path in export_graph(load_graph(_read(overlays)), to))


def _read(overlays: Paths) -> list[Overlay]:
    return [each if isinstance(each, Overlay) else read_overlay(each) for each in overlays]


def _count_lines(content: Content) -> list[str]:
    counts = content.counts()
    lines = [f"{name:<10} {count:>5}" for name, count in counts.items()]
    read = sum(source.checked == "read" for source in content.sources.values())
    if content.sources:
        lines.append(f"{'read':<10} {read / len(content.sources):>5.0%} of sources")
    lines.append(f"{'layers':<10} {' < '.join(content.layers)}")
    return lines
