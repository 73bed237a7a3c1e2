"""From a case to its explanation, and from a lesion to its damage: the two calls that most people need."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path

import pandas as pd

from byway.knowledge.cases.case import Case
from byway.knowledge.cases.desk import Desk, desk_for, desk_own
from byway.knowledge.cases.files import inside
from byway.knowledge.cases.own import layers_of
from byway.knowledge.damage.coverage import uncharted_share
from byway.knowledge.damage.ensemble import Ensemble, EnsembleSettings, Progress, ensemble
from byway.knowledge.damage.point import Damage, point_damage
from byway.knowledge.graph.graph import Graph
from byway.knowledge.lesion.images import read_lesion
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.reasoning.explain import Explanation, explain_findings
from byway.knowledge.reasoning.findings import Finding

__all__ = ["damage_of", "desk_of", "element_names", "explain", "latest", "reckon_damage"]


def element_names(graph: Graph) -> dict[str, str]:
    """Readable names of all regions and segments by bare key."""
    return {key: graph.name_of(key) for key in (*graph.regions, *graph.segments)}


def desk_of(case: Case, *, progress: bool = True) -> Desk:
    """The desk with the overlays that the case names, on the case's own anatomy where it brings any.

    Raises
    ------
    GraphError, CaseError, ImageError
        An overlay, or a file of the own anatomy, cannot be used.
    """
    desk = desk_for([inside(case.folder, name) for name in case.spec.overlays], progress=progress)
    return desk_own(desk, layers_of(case.spec.anatomy, case.folder))


def reckon_damage(
    lesion: Lesion, desk: Desk, *, draws: int = 200, seed: int = 0, progress: Progress | None = None
) -> tuple[Damage, Ensemble, pd.DataFrame]:
    """Point damage, its ensemble, and both as one table (columns: :func:`~byway.knowledge.damage.tables.damage_frame`).

    ``table.attrs["uncharted_share"]`` holds the share of the lesion's white matter that lies in no segment.
    """
    damage = point_damage(lesion, desk.index)
    many = ensemble(lesion, desk.index, EnsembleSettings.from_norms(desk.graph, lesion, draws=draws, seed=seed),
                    progress=progress)  # fmt: skip
    table = damage.table(many.interval(), names=element_names(desk.graph))
    table.attrs["uncharted_share"] = uncharted_share(lesion, desk.index)
    return damage, many, table


def latest(findings: Iterable[Finding]) -> tuple[Finding, ...]:
    """The newest finding of each sign and side, in their order; an older one of the same sign is its history.

    A finding without a date counts as older than any with one.

    >>> [f.grade for f in latest([Finding("amnesia", "none", "severe", date="2026-11-03"),
    ...                           Finding("amnesia", "none", "mild", date="2026-12-01")])]
    ['mild']
    """
    newest: dict[str, Finding] = {}
    for finding in findings:
        old = newest.get(finding.sign_id)
        if old is None or (finding.date or "") >= (old.date or ""):
            newest[finding.sign_id] = finding
    return tuple(newest.values())


def damage_of(
    lesion: Lesion | str | Path, *, desk: Desk | None = None, draws: int = 200, seed: int = 0
) -> pd.DataFrame:
    """What a lesion reaches, most damaged first.

    Parameters
    ----------
    lesion : Lesion or path
        A lesion, or a NIfTI mask in template space.
    desk : Desk, optional
        Graph and geometry; the curated ones by default.
    draws, seed : int
        Virtual anatomies behind the 5-95 % intervals.

    Returns
    -------
    DataFrame
        ``element``, ``kind``, ``name``, ``side``, ``share`` (lost or severed, 0 to 1), ``low``, ``high``,
        ``overlap_ml``, ``clearance_mm``, ``anatomy``.
    """
    if not isinstance(lesion, Lesion):
        lesion = read_lesion(Path(lesion))
    return reckon_damage(lesion, desk or desk_for(), draws=draws, seed=seed)[2]


def explain(
    case: Case, *, desk: Desk | None = None, draws: int = 200, seed: int = 0,
    progress: Progress | None = None,
) -> Explanation:  # fmt: skip
    """Explain a case's findings by its lesion.

    Parameters
    ----------
    case : Case
        From :func:`~byway.knowledge.cases.case.open_case`.
    desk : Desk, optional
        Graph and geometry to use; by default the curated ones with the overlays and the own anatomy of the case.
    draws, seed : int
        Virtual anatomies to average over; the same numbers each time.
    progress : callable, optional
        Called with draws done and draws in all; where it returns False the work stops.

    Raises
    ------
    CaseError
        A finding that the graph does not know.
    ImageError
        A volume of the case that cannot be used.
    """
    desk = desk or desk_of(case)
    findings = latest(case.findings(desk.graph))
    damage, many, table = reckon_damage(case.lesion, desk, draws=draws, seed=seed, progress=progress)
    return explain_findings(
        desk.graph,
        many,
        damage,
        case.spec.person,
        case.spec.stage,
        case.spec.cause,
        findings,
        priors=case.spec.priors or None,
        damage_table=table,
        uncharted_share=table.attrs["uncharted_share"],
    )
