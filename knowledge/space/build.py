"""Build the geometry of all elements from curated records: parcels, courses, bundles, packed into flat arrays."""

from __future__ import annotations

import hashlib
import json
import zlib
from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray
from tqdm.auto import tqdm

from byway.knowledge.graph.records import Region, Segment
from byway.knowledge.space.bundles import STREAMLINES, Bundle, Ending, make_bundle
from byway.knowledge.space.courses import is_mirror_image_of_itself, pull_course
from byway.knowledge.space.geometry import Geometry
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.space.parcels import grow_parcels
from byway.knowledge.space.template import template_hash

__all__ = ["BUILD_VERSION", "build_geometry", "geometry_hash"]

BUILD_VERSION = 3
"""Raised whenever the method changes, so that caches of older builds are not used."""

_MIRROR = np.array([-1.0, 1.0, 1.0])
_MIDLINE_GAP_MM = 0.6
_SAME_PLACE_MM = 6.0
_THIN_MM = 2.0
_UNPULLED = ("template_limited", "thin_partial_volume", "does_not_fit")


def geometry_hash(
    regions: Mapping[str, Region], segments: Mapping[str, Segment], spread_mm: Mapping[str, float]
) -> str:
    """Hash of all that the geometry is built from: seeds, waypoints, sizes, spreads, template and method."""
    facts = [
        BUILD_VERSION,
        template_hash(),
        [[k, r.sides, r.tissue, r.seeds_mni, r.volume_ml, spread_mm[k]] for k, r in regions.items()],
        [
            [k, s.sides, s.from_place, s.to_place, s.waypoints_mni, s.radius_mm, s.fit, spread_mm[k]]
            for k, s in segments.items()
        ],
    ]
    return hashlib.sha256(json.dumps(facts).encode()).hexdigest()[:32]


def build_geometry(
    regions: Mapping[str, Region],
    segments: Mapping[str, Segment],
    spread_mm: Mapping[str, float],
    *,
    progress: bool = True,
) -> tuple[Geometry, dict[str, NDArray[np.float32]]]:
    """Build parcels and bundles of every element on both sides.

    Parameters
    ----------
    regions, segments : mapping of key to record
        Curated records; the left side or the midline is given, the right is its mirror image.
    spread_mm : mapping of region and segment key to float
        Between-subject spread of each, standard deviation in mm.
    progress : bool
        Whether to show a progress bar.

    Returns
    -------
    geometry : Geometry
        All elements, ``anatomy`` being ``"template"``.
    core_lines : dict of element id to (n, 3) float32
        Core line of each segment, MNI mm.
    """
    bar = tqdm(total=len(segments) + 10, desc="template geometry", unit="step", disable=not progress)
    with bar:
        parcels = grow_parcels(regions)
        bar.update(10)
        lines = {key: _core_line(segment) for key, segment in segments.items()}
        bundles: dict[str, Bundle] = {}
        core_lines: dict[str, NDArray[np.float32]] = {}
        for segment in segments.values():
            for element, line, bundle in _both_sides(segment, lines, segments, parcels, bundles):
                core_lines[element] = line.astype(np.float32)
                bundles[element] = bundle
            bar.update()
    geometry = _pack(parcels, bundles, spread_mm, geometry_hash(regions, segments, spread_mm))
    return geometry, core_lines


def _core_line(segment: Segment) -> NDArray[np.float64]:
    pulled = segment.fit not in _UNPULLED and segment.radius_mm >= _THIN_MM
    line = pull_course(np.array(segment.waypoints_mni), pulled=pulled)
    return line if _may_cross(segment) else _one_sided(line)


def _may_cross(segment: Segment) -> bool:
    return segment.sides == "midline" or "@other" in segment.from_place + segment.to_place


def _one_sided(points: NDArray[np.floating]) -> NDArray[np.float64]:
    return np.column_stack([np.minimum(points[:, 0], -_MIDLINE_GAP_MM), points[:, 1:]])


def _meeting(
    key: str, last: bool, lines: Mapping[str, NDArray[np.float64]], segments: Mapping[str, Segment]
) -> list[str]:
    """Keys of segments that take over at one end of a segment (at its last point, or at its first)."""
    here = lines[key][-1 if last else 0]
    place = segments[key].to_place if last else segments[key].from_place
    found = []
    for other, line in lines.items():
        if other == key:
            continue
        segment = segments[other]
        same_junction = place.startswith("wm:") and place in (segment.from_place, segment.to_place)
        if not same_junction and segment.pathway != segments[key].pathway:
            continue
        end = line[0 if last else -1]
        mirrored = end * _MIRROR
        near = min(np.linalg.norm(end - here), np.linalg.norm(mirrored - here))
        if near <= _SAME_PLACE_MM:
            found.append(other)
    return found


def _ending(
    segment: Segment,
    last: bool,
    lines: Mapping[str, NDArray[np.float64]],
    segments: Mapping[str, Segment],
    parcels: Mapping[str, NDArray[np.int32]],
    bundles: Mapping[str, Bundle],
) -> Ending:
    place = segment.to_place if last else segment.from_place
    partners = _meeting(segment.key, last, lines, segments)
    here = lines[segment.key][-1 if last else 0]
    ends = [
        streamline[end]
        for element, bundle in bundles.items()
        if element.partition("@")[0] in partners
        for streamline in bundle.streamlines
        for end in (0, -1)
    ]
    through = np.array(ends, float).reshape(-1, 3)
    through = through[np.linalg.norm(through - here, axis=1) <= _SAME_PLACE_MM + 2 * segment.radius_mm]
    if place.startswith("wm:"):
        return Ending(hands_over=bool(partners), through_mm=through)
    bare, _, asked = place.partition("@")
    side = {"": "left", "other": "right"}.get(asked, asked)
    element = f"{bare}@midline" if f"{bare}@midline" in parcels else f"{bare}@{side}"
    voxels = np.column_stack(np.unravel_index(parcels[element], TEMPLATE_GRID.shape))
    return Ending(TEMPLATE_GRID.to_mm(voxels), bool(partners), through)


def _both_sides(
    segment: Segment,
    lines: Mapping[str, NDArray[np.float64]],
    segments: Mapping[str, Segment],
    parcels: Mapping[str, NDArray[np.int32]],
    bundles: Mapping[str, Bundle],
) -> list[tuple[str, NDArray[np.float64], Bundle]]:
    key, line = segment.key, lines[segment.key]
    endings = (
        _ending(segment, False, lines, segments, parcels, bundles),
        _ending(segment, True, lines, segments, parcels, bundles),
    )
    rng = np.random.default_rng(zlib.crc32(key.encode()))
    if segment.sides == "midline":
        half = make_bundle(line, segment.radius_mm, endings, rng, STREAMLINES // 2)
        turned = is_mirror_image_of_itself(np.array(segment.waypoints_mni)) or not segment.from_place.startswith("wm:")
        mirrored = [(s * _MIRROR.astype(np.float32))[:: -1 if turned else 1] for s in half.streamlines]
        both = Bundle(half.streamlines + mirrored, np.concatenate([half.core, half.core]))
        return [(f"{key}@midline", line, both)]
    left = make_bundle(line, segment.radius_mm, endings, rng)
    if not _may_cross(segment):
        left = Bundle([_one_sided(s).astype(np.float32) for s in left.streamlines], left.core)
    right = Bundle([s * _MIRROR.astype(np.float32) for s in left.streamlines], left.core)
    return [(f"{key}@left", line, left), (f"{key}@right", line * _MIRROR, right)]


def _offsets(lengths: list[int]) -> NDArray[np.int64]:
    return np.concatenate([[0], np.cumsum(lengths)]).astype(np.int64)


def _pack(
    parcels: Mapping[str, NDArray[np.int32]],
    bundles: Mapping[str, Bundle],
    spread_mm: Mapping[str, float],
    content_hash: str,
) -> Geometry:
    streamlines = [s for bundle in bundles.values() for s in bundle.streamlines]
    voxels = np.concatenate(list(parcels.values()))
    elements = (*parcels, *bundles)
    return Geometry(
        grid=TEMPLATE_GRID,
        region_ids=tuple(parcels),
        segment_ids=tuple(bundles),
        region_voxels=voxels,
        region_weights=np.ones(len(voxels), np.float32),
        region_offsets=_offsets([len(v) for v in parcels.values()]),
        points_mm=np.concatenate(streamlines).astype(np.float32),
        streamline_offsets=_offsets([len(s) for s in streamlines]),
        segment_offsets=_offsets([len(b.streamlines) for b in bundles.values()]),
        core=np.concatenate([b.core for b in bundles.values()]),
        streamline_weights=np.ones(len(streamlines), np.float32),
        spread_mm=np.array([spread_mm[e.partition("@")[0]] for e in elements], np.float32),
        anatomy=("template",) * len(elements),
        content_hash=content_hash,
    )
