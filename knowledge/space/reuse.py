"""What an earlier build can lend to a new one, so that a change of one segment builds that segment and its neighbours.

An element is lent only where everything that it was made from is the same: its own record, the parcels at its ends,
which segments take over there, and those of them that were made before it. A build with loans then gives the same
geometry as one without, but for core lines that were rounded to single precision on the way.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.graph.records import Region, Segment
from byway.knowledge.space.bundles import Bundle
from byway.knowledge.space.geometry import Geometry

__all__ = ["Earlier", "course_facts", "region_facts"]

Partners = tuple[Sequence[str], Sequence[str]]


def region_facts(region: Region) -> tuple[object, ...]:
    """What a parcel is grown from."""
    return (region.sides, region.tissue, region.seeds_mni, region.volume_ml)


def course_facts(segment: Segment) -> tuple[object, ...]:
    """What a bundle is made from, as far as its own record goes."""
    return (segment.sides, segment.from_place, segment.to_place, segment.waypoints_mni, segment.radius_mm, segment.fit)


@dataclass(frozen=True, eq=False)
class Earlier:
    """An earlier build of the template, by the same method.

    Parameters
    ----------
    regions, segments : mapping of key to record
        What it was built from.
    geometry : Geometry
        What came of it; every element's anatomy is ``"template"``.
    core_lines : mapping of element id to (n, 3) float32
        Core lines, MNI mm.
    """

    regions: Mapping[str, Region]
    segments: Mapping[str, Segment]
    geometry: Geometry = field(repr=False)
    core_lines: Mapping[str, NDArray[np.float32]] = field(repr=False)

    @property
    def all_parcels(self) -> dict[str, NDArray[np.int32]]:
        """Voxels of every parcel."""
        return {element: self.geometry.parcel_voxels(i) for i, element in enumerate(self.geometry.region_ids)}

    def parcels(self, regions: Mapping[str, Region]) -> dict[str, NDArray[np.int32]] | None:
        """All parcels, if every region grows as it did (regions compete, so one change moves its neighbours)."""
        if list(regions) != list(self.regions):
            return None
        same = all(region_facts(region) == region_facts(self.regions[key]) for key, region in regions.items())
        return self.all_parcels if same else None

    def same_course(self, segment: Segment) -> bool:
        """Whether a segment's own record asks for the same bundle."""
        old = self.segments.get(segment.key)
        return old is not None and course_facts(old) == course_facts(segment)

    def line(self, segment: Segment) -> NDArray[np.float64]:
        """Core line of a segment of the same course, on the side that was curated."""
        side = "midline" if segment.sides == "midline" else "left"
        return self.core_lines[f"{segment.key}@{side}"].astype(np.float64)

    def lent(
        self,
        segment: Segment,
        partners: Partners,
        old_partners: Partners,
        parcels: Mapping[str, NDArray[np.int32]],
        made: Collection[str],
    ) -> list[tuple[str, NDArray[np.float32], Bundle]] | None:
        """Element id, core line and bundle on each side of a segment; None where it must be made anew.

        Parameters
        ----------
        segment : Segment
            Of the same course.
        partners, old_partners : pair of lists of keys
            Segments that take over at its first and at its last point, now and in the earlier build.
        parcels : mapping of element id to voxels
            Parcels now.
        made : collection of keys
            Segments that this build has made anew so far.
        """
        if partners != old_partners or any(key in made for end in partners for key in end):
            return None
        old = self.all_parcels
        for place in (segment.from_place, segment.to_place):
            bare = place.partition("@")[0]
            for element in (f"{bare}@left", f"{bare}@right", f"{bare}@midline"):
                if (element in parcels) != (element in old):
                    return None
                if element in parcels and not np.array_equal(parcels[element], old[element]):
                    return None
        sides = ("midline",) if segment.sides == "midline" else ("left", "right")
        return [self._element(f"{segment.key}@{side}") for side in sides]

    def _element(self, element: str) -> tuple[str, NDArray[np.float32], Bundle]:
        geometry = self.geometry
        number = geometry.segment_ids.index(element)
        first, last = geometry.segment_offsets[number], geometry.segment_offsets[number + 1]
        return element, self.core_lines[element], Bundle(geometry.streamlines(number), geometry.core[first:last])
