"""The rules that hold between records, and the check that gathers every breach of them.

A grave fault forbids the graph's use (a key that does not resolve, a cycle, loads that do not sum to 1 ...). The others
say that something is incomplete (an orphan, a route element without a claim ...): a reviewed graph has none of
them, while an overlay in the making may.
"""

from __future__ import annotations

import math
import re
from collections import Counter
from collections.abc import Iterable, Mapping

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import FaultReport, nearest
from byway.knowledge.graph.content import PLURALS, Content, Kind
from byway.knowledge.graph.joins import check_routes
from byway.knowledge.graph.records import Claim
from byway.knowledge.graph.references import split_reference

__all__ = ["NORMS", "RULES", "check_graph"]

# Every rule of the checks: its name in faults, and what it demands.
RULES: dict[str, str] = {
    "unknown-key": "every key that a record names is there",
    "spelling": "keys are lower_snake; a segment's key is pathway.segment",
    "ambiguous-key": "no two regions, pathways, functions or signs share a key, since claims name them bare",
    "repeated": "nothing is named twice in one list",
    "side": "references, seeds and waypoints lie on the side that the record says",
    "side-rule": "a sign with a side rests on functions that have a copy in each hemisphere",
    "thresholds": "thresholds of a dependence fall from mild to severe",
    "claim-kinds": "the relation of a claim fits the kinds of its subject and object",
    "missing-norm": "every norm that the code relies on is there, with its members",
    "norm-value": "probabilities and shares lie in [0, 1]; exclusive alternatives sum to 1",
    "no-route": "every function has a route",
    "chain-order": "a route goes from region to region by way of segments",
    "route-join": "consecutive elements of a route are joined by geometry",
    "place-join": "a segment ends near the regions that it names",
    "cycle": "the routes of a function form no cycle",
    "load-sum": "the usual loads of a function's routes sum to 1",
    "unclaimed-route": "every element of a route has a claim that it serves the function",
    "unclaimed-sign": "every dependence of a sign on a function has a claim that its loss shows as the sign",
    "orphan": "every record is used by another",
    "unused-source": "every source is cited",
}

# Norms that the code reads, with the members that it asks for.
NORMS: dict[str, tuple[str, ...]] = {
    "language_dominance_right": ("right", "ambidextrous", "left", "unknown"),
    "arcuate_long_lateralisation": (),
    "spread_mm": ("cortex", "deep_grey", "brainstem", "cerebellum"),
    "registration_jitter_mm": (),
    "registration_jitter_deg": (),
    "boundary_mm": ("dwi", "flair", "t1", "t2", "t1_contrast", "ct", "swi", "perfusion", "unknown"),
    "headroom": ("acute", "subacute", "chronic", "slow_growing"),
    "scenario_prior_speaks": ("cortical", "segments", "both"),
    "scenario_prior_perilesional": ("unknown",),
    "scenario_prior_remote": ("acute", "subacute", "chronic", "slow_growing"),
    "scenario_prior_boundary": ("as_drawn", "too_small", "too_large"),
    "scenario_prior_reliance": ("usual", "second"),
    "scenario_prior_outside": (),
    "remote_input_loss_threshold": (),
    "perilesional_rim_mm": (),
    "perilesional_effect": (),
    "remote_effect_size": (),
    "finding_lapse": (),
}
EXCLUSIVE = ("scenario_prior_speaks", "scenario_prior_boundary", "scenario_prior_reliance")
WORD = re.compile(r"[a-z][a-z0-9]*(_[a-z0-9]+)*")
# What may stand as subject and object of each relation; an empty tuple lets any of these kinds stand there.
RELATIONS: dict[str, tuple[tuple[Kind, ...], tuple[Kind, ...]]] = {
    "serves": (("region", "segment", "pathway"), ("function",)),
    "shows_as": (("function",), ("sign",)),
    "joins": (("segment", "pathway"), ("region",)),
    "compensates": (("region", "segment", "pathway"), ("function",)),
    "lateralised": (("function", "segment", "pathway", "region"), ()),
    "exists": (("segment", "pathway"), ()),
}
Geometry = Mapping[str, NDArray[np.floating]]


def check_graph(graph: Content, geometry_ends: Geometry | None = None) -> FaultReport:
    """Check every rule of :data:`RULES`.

    Parameters
    ----------
    graph : Content
        Records in effect.
    geometry_ends : mapping of str to (n, 3) array, optional
        Where elements lie in fact, MNI mm: of a region's element id the points of its parcel, of a segment's its two
        ends (2, 3). For elements that it does not hold, the seeds and the outer waypoints stand in.

    Returns
    -------
    FaultReport
        All faults, grave and other, each naming file, line and key. Empty for a graph that breaks no rule.
    """
    report = FaultReport()
    _check_spelling(graph, report)
    _check_keys(graph, report)
    _check_sides(graph, report)
    _check_signs(graph, report)
    _check_norms(graph, report)
    check_routes(graph, geometry_ends or {}, report)
    _check_claims(graph, report)
    _check_use(graph, report)
    return report


def _check_spelling(graph: Content, report: FaultReport) -> None:
    holders: dict[str, list[Kind]] = {}
    for kind, key, _ in graph.every_record():
        where = graph.where(kind, key)
        words = key.split(".")
        if len(words) != (2 if kind == "segment" else 1) or not all(WORD.fullmatch(word) for word in words):
            form = "pathway.segment in lower_snake" if kind == "segment" else "lower_snake letters and digits"
            report.add("spelling", where, f"key {key!r}", form, "rename it")
        if kind in ("region", "pathway", "function", "sign"):
            holders.setdefault(key, []).append(kind)
    for function in graph.functions.values():
        keys = [route.key for route in function.routes]
        for key in keys:
            if not WORD.fullmatch(key):
                where = graph.where("function", function.key)
                report.add("spelling", where, f"route key {key!r}", "lower_snake letters and digits", "rename it")
        _check_repeats(graph, "function", function.key, "route", keys, report)
    for norm in graph.norms.values():
        for member in norm.value if isinstance(norm.value, dict) else ():
            if not WORD.fullmatch(member):
                where = graph.where("norm", norm.key)
                report.add("spelling", where, f"member {member!r}", "lower_snake letters and digits", "rename it")
    for key, kinds in holders.items():
        if len(kinds) > 1:
            also = ", ".join(graph.where(kind, key) for kind in kinds[:-1])
            where = graph.where(kinds[-1], key)
            report.add("ambiguous-key", where, f"{kinds[-1]} shares its key", "a key of its own", f"see {also}")


def _check_keys(graph: Content, report: FaultReport) -> None:
    for kind, key, record in graph.every_record():
        where = graph.where(kind, key)
        sources: tuple[str, ...] = getattr(record, "sources", ())
        _check_known(sources, "source", graph, where, report)
        _check_repeats(graph, kind, key, "source", sources, report)
    for (_, key), disputes in graph.disputes.items():
        for dispute in disputes:
            _check_known(dispute.sources, "source", graph, f"{dispute.origin} {key}", report)
    for segment in graph.segments.values():
        where = graph.where("segment", segment.key)
        _check_known((segment.pathway,), "pathway", graph, where, report)
        places = (segment.from_place, segment.to_place)
        regions = [split_reference(place)[0] for place in places if not place.startswith("wm:")]
        _check_known(regions, "region", graph, where, report)
    for sign in graph.signs.values():
        where = graph.where("sign", sign.key)
        functions = [dependence.function for dependence in sign.depends]
        _check_known(functions, "function", graph, where, report)
        _check_repeats(graph, "sign", sign.key, "function", functions, report)
        if sign.accuracy_source != "memory":
            _check_known((sign.accuracy_source,), "source", graph, where, report)


def _check_known(keys: Iterable[str], kind: Kind, graph: Content, where: str, report: FaultReport) -> None:
    known = graph.records(kind)
    for key in keys:
        if key not in known:
            gone = graph.retired.get((kind, key))
            remedy = f"{gone.origin.layer} retired it: {gone.reason}" if gone else nearest(key, known)
            report.add("unknown-key", where, f"{kind} {key!r} is not there", remedy=remedy or "check the key")


def _check_repeats(graph: Content, kind: Kind, key: str, what: str, words: Iterable[str], report: FaultReport) -> None:
    for word, count in Counter(words).items():
        if count > 1:
            report.add("repeated", graph.where(kind, key), f"{what} {word!r} {count} times", "each once", "remove one")


def _check_sides(graph: Content, report: FaultReport) -> None:
    for region in graph.regions.values():
        across = [point[0] for point in region.seeds_mni]
        where = graph.where("region", region.key)
        if not across:
            report.add("side", where, "no seed", "at least one seed", "give seeds_mni")
        elif region.sides == "paired" and max(across) >= 0:
            report.add("side", where, f"a seed at x = {max(across):g}", "x < 0 (the left side)", "mirror it")
        elif region.sides == "midline" and max(map(abs, across)) > 12:
            report.add("side", where, f"a seed at |x| = {max(map(abs, across)):g}", "within 12 mm of the midline")
    for segment in graph.segments.values():
        where = graph.where("segment", segment.key)
        across = [point[0] for point in segment.waypoints_mni]
        if len(across) < 2:
            report.add("side", where, f"{len(across)} waypoints", "at least two", "give waypoints_mni")
        elif segment.sides == "paired" and sum(across) >= 0:
            report.add("side", where, "most of the course lies at x > 0", "the left side (x < 0)", "mirror it")
        elif segment.sides == "midline" and min(map(abs, across)) > 3:
            report.add("side", where, "a midline segment that stays off the midline", "a point within 3 mm of it")


def _check_signs(graph: Content, report: FaultReport) -> None:
    for sign in graph.signs.values():
        where = graph.where("sign", sign.key)
        for dependence in sign.depends:
            mild, moderate, severe = dependence.thresholds
            if not mild >= moderate >= severe:
                found = f"thresholds {list(dependence.thresholds)} for {dependence.function}"
                report.add("thresholds", where, found, "mild >= moderate >= severe", "order them")
            function = graph.functions.get(dependence.function)
            if function and sign.side_rule in ("contralateral", "ipsilateral") and function.laterality != "each_side":
                found = f"{sign.side_rule} sign, {function.key} is {function.laterality}"
                report.add("side-rule", where, found, "functions with laterality each_side", "change one of the two")


def _check_norms(graph: Content, report: FaultReport) -> None:
    for key, members in NORMS.items():
        norm = graph.norms.get(key)
        if norm is None:
            report.add("missing-norm", f"norms {key}", "the norm is not there", "a norm with this key", "add it")
            continue
        known = norm.value if isinstance(norm.value, dict) else {}
        for member in members:
            if member not in known:
                report.add("missing-norm", graph.where("norm", key), f"no member {member!r}", remedy="add it")
    _check_spreads(graph, report)
    for norm in graph.norms.values():
        where = graph.where("norm", norm.key)
        values = norm.value if isinstance(norm.value, dict) else {"value": norm.value}
        if norm.unit.startswith(("probability", "share")):
            for member, value in values.items():
                if not 0 <= value <= 1:
                    report.add(
                        "norm-value", where, f"{member} is {value:g}", f"a {norm.unit} within [0, 1]", "correct it"
                    )
        if norm.key in EXCLUSIVE and not math.isclose(sum(values.values()), 1, abs_tol=1e-6):
            report.add("norm-value", where, f"members sum to {sum(values.values()):g}", "1", "they exclude each other")


def _check_spreads(graph: Content, report: FaultReport) -> None:
    """Every kind and variability of a segment has a between-subject spread."""
    norm = graph.norms.get("spread_mm")
    known = norm.value if norm and isinstance(norm.value, dict) else {}
    needed: set[str] = {region.tissue for region in graph.regions.values()}
    for segment in graph.segments.values():
        if segment.pathway in graph.pathways:
            needed.add(f"{graph.pathways[segment.pathway].kind}_{segment.variability}")
    for member in sorted(needed - set(known) - set(NORMS["spread_mm"])):
        report.add("missing-norm", graph.where("norm", "spread_mm"), f"no member {member!r}", remedy="add it")


def _check_claims(graph: Content, report: FaultReport) -> None:
    kinds: dict[str, list[Kind]] = {}
    for kind in ("region", "pathway", "segment", "function", "sign"):
        for key in graph.records(kind):
            kinds.setdefault(key, []).append(kind)
    for claim in graph.claims.values():
        _check_claim(claim, kinds, graph, report)
    told = {(claim.subject, claim.relation, claim.object) for claim in graph.claims.values()}
    for function in graph.functions.values():
        elements = {split_reference(reference)[0]: None for route in function.routes for reference in route.chain}
        for element in elements:
            if (element, "serves", function.key) not in told:
                where = graph.where("function", function.key)
                found = f"no claim that {element} serves it"
                report.add("unclaimed-route", where, found, "a claim for every element of a route", grave=False)
    for sign in graph.signs.values():
        for dependence in sign.depends:
            if (dependence.function, "shows_as", sign.key) not in told:
                where = graph.where("sign", sign.key)
                found = f"no claim that loss of {dependence.function} shows as it"
                report.add("unclaimed-sign", where, found, "a claim for every dependence", grave=False)


def _check_claim(claim: Claim, kinds: Mapping[str, list[Kind]], graph: Content, report: FaultReport) -> None:
    where = graph.where("claim", claim.key)
    allowed = dict(zip(("subject", "object"), RELATIONS[claim.relation], strict=True))
    for end, fitting in allowed.items():
        key: str = getattr(claim, end)
        if key not in kinds:
            near = nearest(key, (each for each, its in kinds.items() if not fitting or set(its) & set(fitting)))
            report.add("unknown-key", where, f"{end} {key!r} is not there", remedy=near or "check the key")
        elif fitting and not set(kinds[key]) & set(fitting):
            found = f"{end} {key} is a {kinds[key][0]}"
            report.add("claim-kinds", where, found, f"a {' or '.join(fitting)} ({claim.relation})", "change it")


def _check_use(graph: Content, report: FaultReport) -> None:
    spoken_of = {key for claim in graph.claims.values() for key in (claim.subject, claim.object)}
    routed = {split_reference(each)[0] for f in graph.functions.values() for r in f.routes for each in r.chain}
    ends = {split_reference(end)[0] for s in graph.segments.values() for end in (s.from_place, s.to_place)}
    shown = {dependence.function for sign in graph.signs.values() for dependence in sign.depends}
    used: dict[Kind, set[str]] = {
        "region": spoken_of | routed | ends,
        "segment": spoken_of | routed,
        "pathway": {segment.pathway for segment in graph.segments.values()},
        "function": shown,
        "sign": {sign.key for sign in graph.signs.values() if sign.depends},
    }
    needs = {
        "region": "a route, a segment's end or a claim that names it",
        "segment": "a route or a claim that names it",
        "pathway": "a segment of it",
        "function": "a sign that depends on it",
        "sign": "a function that it depends on",
    }
    for kind, keys in used.items():
        for key in graph.records(kind):
            if key not in keys:
                report.add("orphan", graph.where(kind, key), f"the {kind} stands alone", needs[kind], grave=False)
    cited = {key for _, _, record in graph.every_record() for key in getattr(record, "sources", ())}
    cited |= {sign.accuracy_source for sign in graph.signs.values()}
    cited |= {key for disputes in graph.disputes.values() for dispute in disputes for key in dispute.sources}
    for key in graph.sources:
        if key not in cited:
            where = graph.where("source", key)
            report.add("unused-source", where, "no record cites it", PLURALS["claim"], "cite or retire it", grave=False)
