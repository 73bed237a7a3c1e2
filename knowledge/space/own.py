"""Own anatomy: a template in which a site's maps, or one person's bundles, stand in the place of some elements."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
import pandas as pd
from numpy.typing import NDArray
from scipy.spatial import cKDTree

from byway.knowledge.faults import BywayError, Fault, FaultReport, ImageError
from byway.knowledge.space.atlas import Template
from byway.knowledge.space.curves import arc_length, resample
from byway.knowledge.space.geometry import Geometry
from byway.knowledge.space.mapping import MappingRow, read_mapping
from byway.knowledge.space.own_bundles import OwnSegment, own_bundle
from byway.knowledge.space.own_volumes import OwnRegion, own_membership, region_from, segment_from
from byway.knowledge.space.tractograms import SUFFIXES
from byway.knowledge.space.transforms import Transform

__all__ = ["OWN_SPREAD_MM", "OwnAnatomy", "compare_anatomies", "own_anatomy", "with_own"]

OWN_SPREAD_MM = 1.0
"""Spread of a person's own bundles: no longer that between people, but of tractography itself (judgement)."""


@dataclass(frozen=True)
class OwnAnatomy:
    """A template with own elements, and what was left out while reading them."""

    template: Template
    elements: tuple[str, ...]
    notes: tuple[str, ...]


def own_anatomy(
    template: Template,
    mapping: str | Path,
    *,
    name: str,
    to_template: Transform | None = None,
    spread_mm: float | None = None,
) -> OwnAnatomy:
    """Put a site's atlas or a person's tractogram in the place of the template's elements.

    Parameters
    ----------
    template : Template
        Where all other elements stay as they are.
    mapping : path
        Mapping table beside the files (see :mod:`byway.knowledge.space.mapping`).
    name : str
        Whose anatomy it is, shown wherever a number rests on it.
    to_template : Transform, optional
        From the mm of the tractogram files to template mm. Volumes must lie in template space.
    spread_mm : float, optional
        Spread of the own elements. If left out, bundles from tractogram files get 1 mm, for they are one person's,
        and elements from maps and labels, which describe a group, keep the template's.

    Raises
    ------
    ImageError
        Holding a fault for every row that cannot be used.
    """
    if not name.strip() or name == "template":
        raise BywayError(Fault("own-name", "own anatomy", f"the name {name!r}", "a name that says whose anatomy it is"))
    rows = read_mapping(mapping, template.geometry.element_ids)
    report = FaultReport()
    own: dict[str, OwnRegion | OwnSegment] = {}
    spreads: dict[str, float] = {}
    for row in rows:
        try:
            own[row.element] = _element(row, template, to_template)
        except ImageError as error:
            report.extend(error.faults)
            continue
        if spread_mm is not None or row.path.suffix.lower() in SUFFIXES:
            spreads[row.element] = OWN_SPREAD_MM if spread_mm is None else spread_mm
    report.raise_if_grave(ImageError)
    notes = [note for part in own.values() if isinstance(part, OwnSegment) for note in part.notes]
    return OwnAnatomy(with_own(template, own, name, spreads), tuple(own), tuple(dict.fromkeys(notes)))


def _element(row: MappingRow, template: Template, to_template: Transform | None) -> OwnRegion | OwnSegment:
    is_region = row.element in template.geometry.region_ids
    if row.path.suffix.lower() in SUFFIXES:
        if is_region:
            raise ImageError(Fault("own-kind", row.where, f"streamlines for the region {row.element}", "a segment"))
        return own_bundle(row, template.core_lines[row.element], to_template)
    membership = own_membership(row)
    return region_from(membership) if is_region else segment_from(row, membership, template.core_lines[row.element])


def with_own(
    template: Template,
    own: Mapping[str, OwnRegion | OwnSegment],
    name: str,
    spread_mm: Mapping[str, float] | None = None,
) -> Template:
    """A template with some elements replaced; ``anatomy`` names whose they are.

    Parameters
    ----------
    template : Template
        The base.
    own : mapping of element id to OwnRegion or OwnSegment
        Replacements.
    name : str
        Whose anatomy they are.
    spread_mm : mapping of element id to float, optional
        Spread of replaced elements; the base's where missing.
    """
    base = template.geometry
    regions = [_region(base, i, own.get(element)) for i, element in enumerate(base.region_ids)]
    segments = [_segment(base, i, own.get(element)) for i, element in enumerate(base.segment_ids)]
    lines = [line for part in segments for line in part.streamlines]
    spreads = base.spread_mm.copy()
    for element, spread in (spread_mm or {}).items():
        spreads[base.index_of[element]] = spread
    geometry = replace(
        base,
        region_voxels=np.concatenate([part.voxels for part in regions]),
        region_weights=np.concatenate([part.weights for part in regions]),
        region_offsets=_bounds([len(part.voxels) for part in regions]),
        points_mm=np.concatenate(lines),
        streamline_offsets=_bounds([len(line) for line in lines]),
        segment_offsets=_bounds([len(part.streamlines) for part in segments]),
        core=np.concatenate([part.core for part in segments]),
        streamline_weights=np.concatenate([part.weights for part in segments]),
        spread_mm=spreads,
        anatomy=tuple(
            name if element in own else whose for element, whose in zip(base.element_ids, base.anatomy, strict=True)
        ),
        content_hash="",
    )
    geometry = replace(geometry, content_hash=_hash(geometry))
    core_lines = dict(template.core_lines)
    core_lines.update({element: part.core_line for element, part in own.items() if isinstance(part, OwnSegment)})
    return Template(geometry, core_lines)


def _region(base: Geometry, i: int, own: OwnRegion | OwnSegment | None) -> OwnRegion:
    if isinstance(own, OwnRegion):
        return own
    bounds = slice(base.region_offsets[i], base.region_offsets[i + 1])
    return OwnRegion(base.region_voxels[bounds], base.region_weights[bounds])


def _segment(base: Geometry, i: int, own: OwnRegion | OwnSegment | None) -> OwnSegment:
    if isinstance(own, OwnSegment):
        return own
    bounds = slice(base.segment_offsets[i], base.segment_offsets[i + 1])
    return OwnSegment(
        base.streamlines(i), base.core[bounds], base.streamline_weights[bounds], np.empty((0, 3), np.float32)
    )


def _bounds(lengths: list[int]) -> NDArray[np.int64]:
    return np.concatenate([[0], np.cumsum(lengths)]).astype(np.int64)


def _hash(geometry: Geometry) -> str:
    digest = hashlib.sha256("\0".join((*geometry.element_ids, *geometry.anatomy)).encode())
    for array in (geometry.region_voxels, geometry.region_weights, geometry.points_mm, geometry.streamline_offsets,
                  geometry.streamline_weights, geometry.spread_mm):  # fmt: skip
        digest.update(np.ascontiguousarray(array).tobytes())
    return digest.hexdigest()[:32]


def compare_anatomies(template: Template, own: Template) -> pd.DataFrame:
    """How own elements lie against the template's.

    Returns
    -------
    DataFrame
        One row per element whose anatomy differs: ``element``, ``kind``, ``anatomy`` (whose), ``template_size`` and
        ``own_size`` (median streamline length in mm, or parcel volume in ml), ``apart_mm`` (median distance from own
        core streamlines, or own parcel, to the nearest of the template's).
    """
    base, mine = template.geometry, own.geometry
    rows = []
    for i, element in enumerate(base.element_ids):
        if mine.anatomy[i] == base.anatomy[i]:
            continue
        kind = "region" if i < len(base.region_ids) else "segment"
        parts = [_places(geometry, i) for geometry in (base, mine)]
        sizes = [_size(geometry, i) for geometry in (base, mine)]
        apart = float(np.median(cKDTree(parts[0]).query(parts[1])[0]))
        rows.append((element, kind, mine.anatomy[i], sizes[0], sizes[1], apart))
    return pd.DataFrame(rows, columns=["element", "kind", "anatomy", "template_size", "own_size", "apart_mm"])


def _places(geometry: Geometry, element: int) -> NDArray[np.float64]:
    if element < len(geometry.region_ids):
        voxels = np.column_stack(np.unravel_index(geometry.parcel_voxels(element), geometry.grid.shape))
        return geometry.grid.to_mm(voxels)
    segment = element - len(geometry.region_ids)
    core = geometry.core[geometry.segment_offsets[segment] : geometry.segment_offsets[segment + 1]]
    lines = geometry.streamlines(segment)
    return np.concatenate([resample(line, 2.0) for line, inner in zip(lines, core, strict=True) if inner])


def _size(geometry: Geometry, element: int) -> float:
    if element < len(geometry.region_ids):
        return len(geometry.parcel_voxels(element)) * geometry.grid.voxel_ml
    lines = geometry.streamlines(element - len(geometry.region_ids))
    return float(np.median([arc_length(line)[-1] for line in lines]))
