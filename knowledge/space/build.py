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
from byway.knowledge.space.reuse import Earlier
from byway.knowledge.space.template import template_hash

__all__ = ["BUILD_VERSION", "build_geometry", "geometry_hash", "sketch_segment"]

BUILD_VERSION = 5
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
    earlier: Earlier | None = None,
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
    earlier : Earlier, optional
        An earlier build by the same method, which lends what has not changed.

    Returns
    -------
    geometry : Geometry
        All elements, ``anatomy`` being ``"template"``.
    core_lines : dict of element id to (n, 3) float32
        Core line of each segment, MNI mm.
    """
    bar = tqdm(total=len(segments) + 10, desc="template geometry", unit="step", disable=not progress)
    with bar:
        lent = earlier.parcels(regions) if earlier is not None else None
        parcels = grow_parcels(regions) if lent is None else lent
        bar.update(10)
        lines = _core_lines(segments, earlier)
        loans = _loans(segments, lines, parcels, earlier)
        bundles: dict[str, Bundle] = {}
        core_lines: dict[str, NDArray[np.float32]] = {}
        for segment in segments.values():
            elements = loans.get(segment.key)
            if elements is None:
                lines[segment.key] = _core_line(segment)  # a lent line is rounded
                elements = _both_sides(segment, lines, segments, parcels, bundles)
            for element, line, bundle in elements:
                core_lines[element] = line.astype(np.float32)
                bundles[element] = bundle
            bar.update()
    geometry = _pack(parcels, bundles, spread_mm, geometry_hash(regions, segments, spread_mm))
    return geometry, core_lines


_Elements = list[tuple[str, NDArray[np.floating], Bundle]]


def _core_lines(segments: Mapping[str, Segment], earlier: Earlier | None) -> dict[str, NDArray[np.float64]]:
    if earlier is None:
        return {key: _core_line(segment) for key, segment in segments.items()}
    return {
        key: earlier.line(segment) if earlier.same_course(segment) else _core_line(segment)
        for key, segment in segments.items()
    }


def _loans(
    segments: Mapping[str, Segment],
    lines: Mapping[str, NDArray[np.float64]],
    parcels: Mapping[str, NDArray[np.int32]],
    earlier: Earlier | None,
) -> dict[str, _Elements]:
    """Elements of the segments that an earlier build can lend."""
    if earlier is None:
        return {}
    old_lines = {key: earlier.line(segment) for key, segment in earlier.segments.items()}
    loans: dict[str, _Elements] = {}
    made: set[str] = set()
    for key, segment in segments.items():
        elements = None
        if earlier.same_course(segment):
            now = (_meeting(key, False, lines, segments), _meeting(key, True, lines, segments))
            then = (_meeting(key, False, old_lines, earlier.segments), _meeting(key, True, old_lines, earlier.segments))
            elements = earlier.lent(segment, now, then, parcels, made)
        if elements is None:
            made.add(key)
        else:
            loans[key] = [*elements]
    return loans


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
) -> _Elements:
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


def sketch_segment(
    segment: Segment, parcels: Mapping[str, NDArray[np.int32]], *, streamlines: int = 40
) -> tuple[NDArray[np.float64], Bundle | None]:
    """A segment by itself, thin and at once, while its waypoints are in the hand.

    Parameters
    ----------
    segment : Segment
        Its record; on the left or the midline.
    parcels : mapping of element id to (n,) int32
        Voxels of the regions at its ends; an end that is missing stays in white matter.
    streamlines : int
        How many; 0 for the core line alone.

    Returns
    -------
    line : (n, 3) float
        The core line that a build would give, MNI mm.
    bundle : Bundle or None
        Streamlines about it; what other segments do at its ends is left out.
    """
    line = _core_line(segment)
    if streamlines == 0:
        return line, None
    places = {segment.from_place.partition("@")[0], segment.to_place.partition("@")[0]}
    nowhere = {f"{place}@{side}": np.empty(0, np.int32) for place in places for side in ("left", "right")}
    known = {**nowhere, **parcels}
    alone = ({segment.key: line}, {segment.key: segment})
    endings = (_ending(segment, False, *alone, known, {}), _ending(segment, True, *alone, known, {}))
    rng = np.random.default_rng(zlib.crc32(segment.key.encode()))
    return line, make_bundle(line, segment.radius_mm, endings, rng, streamlines)
