"""Rules of routes: from region to region, joined by geometry, loads that sum to 1, no cycle."""

from __future__ import annotations

import itertools
import math
from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import FaultReport, GraphError
from byway.knowledge.graph.content import Content
from byway.knowledge.graph.networks import function_network
from byway.knowledge.graph.records import Function, Point
from byway.knowledge.graph.references import Hemisphere, copy_sides, resolve_reference, resolved_chains, split_reference

__all__ = ["HANDOVER_MM", "REACH_MM", "check_routes"]

REACH_MM = 15.0
"""How far a segment's end may lie from the nearest seed or parcel voxel of the region that it joins."""
HANDOVER_MM = 10.0
"""How far apart the ends of two segments may lie where one hands over to the other."""

Geometry = Mapping[str, NDArray[np.floating]]


def check_routes(graph: Content, geometry: Geometry, report: FaultReport) -> None:
    """Add the faults of all routes, and of the places that segments name, to a report."""
    places = _Places(graph, geometry)
    for function in graph.functions.values():
        _check_function(graph, function, places, report)
    for segment in graph.segments.values():
        if len(segment.waypoints_mni) < 2:
            continue
        side: Hemisphere = "left"
        ends = places.ends(f"{segment.key}@{'left' if segment.sides == 'paired' else 'midline'}")
        for place, end, word in ((segment.from_place, ends[0], "begins"), (segment.to_place, ends[1], "ends")):
            if place.startswith("wm:") or split_reference(place)[0] not in graph.regions:
                continue
            where = graph.where("segment", segment.key)
            try:
                region = resolve_reference(graph, place, side)
            except GraphError as error:
                report.add("side", where, error.fault.found, error.fault.expected)
                continue
            away = places.distance(region, end)
            if away > REACH_MM:
                found = f"it {word} {away:.0f} mm from {region}"
                report.add(
                    "place-join",
                    where,
                    found,
                    f"at most {REACH_MM:g} mm",
                    "move the waypoint or the place",
                    grave=False,
                )


def _check_function(graph: Content, function: Function, places: _Places, report: FaultReport) -> None:
    where = graph.where("function", function.key)
    if not function.routes:
        report.add("no-route", where, "no route", "at least one route", "add a route")
        return
    total = sum(route.usual_load for route in function.routes)
    if not math.isclose(total, 1.0, abs_tol=1e-6):
        report.add("load-sum", where, f"usual loads sum to {total:g}", "1", "change the routes' loads")
    known = True
    for route in function.routes:
        if not route.chain:
            report.add("no-route", where, f"route {route.key} is empty", "at least one region", "give its chain")
            known = False
        for reference in route.chain:
            try:
                resolve_reference(graph, reference, "left")
            except GraphError as error:
                fault = error.fault
                report.add(
                    fault.rule, where, f"route {route.key}: {reference}: {fault.found}", fault.expected, fault.remedy
                )
                known = False
    if not known:
        return
    for copy_id, sides in copy_sides(function).items():
        try:
            if math.isclose(total, 1.0, abs_tol=1e-6):
                function_network(graph, function, copy_id, sides)
        except GraphError as error:
            report.add(error.fault.rule, where, f"{copy_id}: {error.fault.found}", "routes without a cycle")
            break
    # Both hemispheres mirror each other in the curated text, so one copy's joints are all copies' joints.
    _check_chains(graph, function, next(iter(copy_sides(function).values()))[:1], places, where, report)


def _check_chains(
    graph: Content, function: Function, sides: tuple[Hemisphere, ...], places: _Places, where: str, report: FaultReport
) -> None:
    broken: list[tuple[str, str]] = []
    chains = resolved_chains(graph, function, sides)
    for key, _, ids in chains:
        if len(ids) == 1 and _joins_regions_only(graph, ids[0]):
            report.add("chain-order", where, f"route {key} is a lone segment", "a region", "add the regions it joins")
        for before, after in itertools.pairwise(ids):
            if {split_reference(before)[0], split_reference(after)[0]} <= set(graph.regions):
                found = f"route {key}: {before} is followed by {after}"
                report.add("chain-order", where, found, "a segment between two regions", "name the segment")
        fault = _broken_joint(ids, graph, places)
        if fault:
            broken.append((key, fault))
    for key, fault in broken:
        grave = len(broken) == len(chains)
        report.add("route-join", where, f"route {key}: {fault}", remedy="mend the chain or the course", grave=grave)


def _joins_regions_only(graph: Content, element: str) -> bool:
    """Whether an element is a segment between two regions; one that leads out of the graph may be a route alone."""
    segment = graph.segments.get(split_reference(element)[0])
    return segment is not None and not (segment.from_place.startswith("wm:") or segment.to_place.startswith("wm:"))


def _broken_joint(ids: tuple[str, ...], graph: Content, places: _Places) -> str:
    """The first joint of a chain that geometry does not bear out, in words; empty if there is none.

    Each segment is passed from one end to the other, in either direction; the direction that suits its neighbours
    better is taken.
    """
    free_end: NDArray[np.float64] | None = None
    for i, element in enumerate(ids):
        if split_reference(element)[0] in graph.regions:
            if free_end is not None and (away := places.distance(element, free_end)) > REACH_MM:
                return f"{ids[i - 1]} ends {away:.0f} mm from {element}, at most {REACH_MM:g} mm"
            free_end = None
            continue
        ends = places.ends(element)
        following = ids[i + 1] if i + 1 < len(ids) else None
        best: tuple[float, str, NDArray[np.float64]] | None = None
        for entry, leave in ((ends[0], ends[1]), (ends[1], ends[0])):
            excess, words = 0.0, ""
            if i and free_end is not None:
                gap = float(np.linalg.norm(entry - free_end))
                if gap > HANDOVER_MM:
                    excess, words = gap - HANDOVER_MM, _gap(ids[i - 1], element, gap, HANDOVER_MM)
            elif i:
                gap = places.distance(ids[i - 1], entry)
                if gap > REACH_MM:
                    excess, words = gap - REACH_MM, _gap(element, ids[i - 1], gap, REACH_MM)
            ahead = places.distance_to(following, leave, graph) if following else 0.0
            if best is None or excess + max(0.0, ahead) < best[0]:
                best = (excess + max(0.0, ahead), words, leave)
        assert best is not None
        if best[1]:
            return best[1]
        free_end = best[2]
    return ""


def _gap(first: str, second: str, gap_mm: float, most_mm: float) -> str:
    return f"{first} lies {gap_mm:.0f} mm from {second}, at most {most_mm:g} mm"


class _Places:
    """Where elements lie: given geometry where there is some, else seeds and outer waypoints, mirrored by side."""

    def __init__(self, graph: Content, geometry: Geometry) -> None:
        self._graph = graph
        self._geometry = geometry
        self._held: dict[str, NDArray[np.float64]] = {}

    def distance(self, region: str, point: NDArray[np.float64]) -> float:
        """Distance in mm from a point to the nearest known point of a region."""
        return float(np.linalg.norm(self._points(region) - point, axis=1).min())

    def distance_to(self, element: str, point: NDArray[np.float64], graph: Content) -> float:
        """Distance in mm by which a point misses the reach of an element."""
        if split_reference(element)[0] in graph.regions:
            return self.distance(element, point) - REACH_MM
        return float(np.linalg.norm(self.ends(element) - point, axis=1).min()) - HANDOVER_MM

    def ends(self, segment: str) -> NDArray[np.float64]:
        """Both ends of a segment, (2, 3) MNI mm."""
        points = self._points(segment)
        return points[[0, -1]]

    def _points(self, element: str) -> NDArray[np.float64]:
        held = self._held.get(element)
        if held is None:
            given = self._geometry.get(element)
            held = self._curated(element) if given is None else np.asarray(given, float).reshape(-1, 3)
            self._held[element] = held
        return held

    def _curated(self, element: str) -> NDArray[np.float64]:
        key, side = split_reference(element)
        region = self._graph.regions.get(key)
        points: tuple[Point, ...] = region.seeds_mni if region else self._graph.segments[key].waypoints_mni
        array = np.array(points or [(np.inf, np.inf, np.inf)], float)
        return array * (-1.0, 1.0, 1.0) if side == "right" else array
