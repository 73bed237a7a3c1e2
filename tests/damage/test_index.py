"""The inverted index."""

from __future__ import annotations

import numpy as np
import pytest
from toy_space import toy_geometry

from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.damage.point import point_damage
from byway.knowledge.faults import BywayError
from byway.knowledge.space.geometry import Geometry
from byway.knowledge.space.grid import TEMPLATE_GRID


def changed(geometry: Geometry, **fields) -> Geometry:
    """The geometry with some fields replaced."""
    return Geometry(**{**{k: v for k, v in geometry.__dict__.items() if k in Geometry.__match_args__}, **fields})


def test_every_point_is_found_at_its_voxel(toy_index):
    """The streamlines listed at a voxel are those with a point in it."""
    geometry = toy_index.geometry
    line_of_point = np.repeat(np.arange(len(geometry.core)), np.diff(geometry.streamline_offsets))
    voxel = TEMPLATE_GRID.flat_index(geometry.points_mm)
    for v in np.unique(voxel)[::97]:
        row = toy_index.row_of_voxel[v]
        low, high = toy_index.streamlines.offsets[row : row + 2]
        assert set(toy_index.streamlines.members[low:high]) == set(line_of_point[voxel == v])
        low, high = toy_index.segments.offsets[row : row + 2]
        found = {geometry.element_ids[i] for i in toy_index.segments.members[low:high]}
        assert found == {geometry.segment_ids[toy_index.segment_of_streamline[s]] for s in line_of_point[voxel == v]}


def test_every_parcel_voxel_is_found(toy_index):
    """Each region's voxels list it, with its weight."""
    geometry = toy_index.geometry
    for region in range(len(geometry.region_ids)):
        row = toy_index.row_of_voxel[geometry.parcel_voxels(region)[0]]
        low, high = toy_index.regions.offsets[row : row + 2]
        assert region in toy_index.regions.members[low:high]


def test_points_off_the_grid_are_left_out():
    """A streamline that leaves the grid is listed where it is inside, and nowhere else."""
    geometry = toy_geometry(1, 5)
    points = geometry.points_mm.copy()
    points[:3] = 500
    index = DamageIndex.build(changed(geometry, points_mm=points))
    assert index.streamlines.members.max() < len(geometry.core)
    assert (index.voxel_of_row >= 0).all()


def test_points_that_are_no_numbers_are_refused():
    """NaN in a tractogram is told before anything is reckoned on it."""
    geometry = toy_geometry(1, 5)
    points = geometry.points_mm.copy()
    points[7, 1] = np.nan
    with pytest.raises(BywayError, match="not a finite number"):
        DamageIndex.build(changed(geometry, points_mm=points))


def test_empty_streamlines_and_parcels_are_allowed():
    """They count in the denominators and are never hit."""
    geometry = toy_geometry(1, 3)
    offsets = np.append(geometry.streamline_offsets, [geometry.streamline_offsets[-1]] * 2)
    index = DamageIndex.build(
        changed(
            geometry,
            streamline_offsets=offsets,
            segment_offsets=np.append(geometry.segment_offsets, len(offsets) - 1),
            segment_ids=(*geometry.segment_ids, "empty.part@left"),
            region_ids=(*geometry.region_ids, "nowhere@left"),
            region_offsets=np.append(geometry.region_offsets, geometry.region_offsets[-1]),
            core=np.append(geometry.core, [True, True]),
            streamline_weights=np.append(geometry.streamline_weights, [1, 1]).astype(np.float32),
            spread_mm=np.append(geometry.spread_mm, [2, 2]).astype(np.float32),
            anatomy=(*geometry.anatomy, "template", "template"),
        )
    )
    assert index.region_weight[-1] == 0
    damage = point_damage(np.ones(TEMPLATE_GRID.shape, np.float32), index)
    assert damage.of("empty.part@left") == damage.of("nowhere@left") == 0
    assert damage.of("tube.part_0@left") == 1
