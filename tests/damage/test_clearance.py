"""Clearance against the full distance transform, against dipy, and by hand."""

from __future__ import annotations

import numpy as np
import pytest
from dipy.tracking.distances import track_roi_intersection_check
from hypothesis import given, settings
from scipy import ndimage
from scipy.spatial import cKDTree
from strategies import ellipsoids

from byway.knowledge.damage.clearance import clearance_mm
from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.damage.point import point_damage
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.lesion.shapes import ellipsoid_mask, sphere_mask
from byway.knowledge.space.geometry import Geometry
from byway.knowledge.space.grid import TEMPLATE_GRID


def core_voxels(geometry: Geometry, element: str) -> np.ndarray:
    """C-order indices of the voxels of a segment's core streamlines, or of a parcel."""
    if element in geometry.region_ids:
        region = geometry.region_ids.index(element)
        low, high = geometry.region_offsets[region : region + 2]
        return geometry.region_voxels[low:high][geometry.region_weights[low:high] >= 0.5]
    segment = geometry.segment_ids.index(element)
    first = geometry.segment_offsets[segment]
    core = [line for i, line in enumerate(geometry.streamlines(segment)) if geometry.core[first + i]]
    flat = TEMPLATE_GRID.flat_index(np.concatenate([np.asarray(line, float) for line in core]))
    return np.unique(flat[flat >= 0])


def plain_clearance(mask: np.ndarray, geometry: Geometry) -> np.ndarray:
    """The definition, from two distance transforms of the whole grid."""
    inside = ndimage.distance_transform_edt(np.pad(mask, 1))[1:-1, 1:-1, 1:-1]
    signed = np.where(mask, 0.5 - inside, ndimage.distance_transform_edt(~mask) - 0.5).reshape(-1)
    return np.array([signed[core_voxels(geometry, element)].min() for element in geometry.element_ids])


@settings(max_examples=10, deadline=None)
@given(ellipsoids())
def test_clearance_equals_all_pairs_on_the_toy_geometry(toy_index, mask):
    """From each core voxel to the nearest voxel inside, or outside; exact for convex lesions however far."""
    geometry = toy_index.geometry
    shell = ndimage.binary_dilation(mask) & ~mask
    to_lesion, to_outside = (cKDTree(np.argwhere(voxels)) for voxels in (mask, shell))
    expected = []
    for element in geometry.element_ids:
        core = np.stack(np.unravel_index(core_voxels(geometry, element), TEMPLATE_GRID.shape), axis=1)
        within = mask[tuple(core.T)]
        depth = to_outside.query(core[within])[0].max(initial=0)
        expected.append(0.5 - depth if within.any() else to_lesion.query(core)[0].min() - 0.5)
    np.testing.assert_allclose(clearance_mm(np.flatnonzero(mask), toy_index), expected, atol=1e-4)


def test_clearance_equals_the_distance_transform_on_the_template(index):
    """For a lesion with folds and two parts, over all elements."""
    mask = ellipsoid_mask((-43, -38, 15), (16, 20, 14)) & ~sphere_mask((-35, -30, 20), 9)
    mask |= sphere_mask((-20, 40, 10), 5)
    found = clearance_mm(np.flatnonzero(mask), index)
    expected = plain_clearance(mask, index.geometry)
    near = expected < 12
    np.testing.assert_allclose(found[near], expected[near], atol=1e-4)
    assert (found - expected > -1e-4).all()
    assert (found - expected < 0.5).all()


def test_clearance_equals_dipys_distance_check(toy_index):
    """No core voxel lies within the distance less a hair, one does within the distance and a hair."""
    geometry = toy_index.geometry
    mask = sphere_mask((-40, -20, 10), 7)
    # dipy reads its arrays as if they were in C order.
    voxels = np.ascontiguousarray(np.argwhere(mask & ~ndimage.binary_erosion(mask)), np.float32)
    found = clearance_mm(np.flatnonzero(mask), toy_index)
    tested = 0
    for element, clearance in zip(geometry.element_ids, found, strict=True):
        if clearance < 0:
            continue
        tested += 1
        cores = np.stack(np.unravel_index(core_voxels(geometry, element), TEMPLATE_GRID.shape), axis=1)
        # A track of one voxel, twice: dipy measures to the stretches between points too.
        tracks = [np.repeat(core[None], 2, axis=0).astype(np.float32) for core in cores]
        for slack, expected in ((-0.01, False), (0.01, True)):
            distance = float(clearance) + 0.5 + slack
            assert any(track_roi_intersection_check(t, voxels, distance**2) for t in tracks) is expected
    assert tested >= 8


def test_sign_and_edge_by_hand():
    """One streamline along y at x = -40: a ball beside it, touching it, and over it."""
    points = np.stack([np.full(41, -40.0), np.arange(-20, 21), np.full(41, 20.0)], axis=1).astype(np.float32)
    geometry = Geometry(
        grid=TEMPLATE_GRID,
        region_ids=(),
        segment_ids=("line.whole@left",),
        region_voxels=np.empty(0, np.int32),
        region_weights=np.empty(0, np.float32),
        region_offsets=np.zeros(1, np.int64),
        points_mm=points,
        streamline_offsets=np.array([0, 41]),
        segment_offsets=np.array([0, 1]),
        core=np.ones(1, bool),
        streamline_weights=np.ones(1, np.float32),
        spread_mm=np.ones(1, np.float32),
        anatomy=("template",),
        content_hash="by hand",
    )
    index = DamageIndex.build(geometry)
    # The ball of 5 mm about x = -30 reaches x = -35, its edge -35.5: 4.5 mm from -40.
    assert point_damage(Lesion.from_mask(sphere_mask((-30, 0, 20), 5)), index).clearance_mm[0] == pytest.approx(4.5)
    # About x = -35 its outermost voxel is the streamline's: half a millimetre inside.
    assert point_damage(Lesion.from_mask(sphere_mask((-35, 0, 20), 5)), index).clearance_mm[0] == pytest.approx(-0.5)
    # Over the streamline: the voxel outside that is nearest to the centre lies at (5, 1, 0), sqrt(26) from it.
    assert point_damage(Lesion.from_mask(sphere_mask((-40, 0, 20), 5)), index).clearance_mm[0] == pytest.approx(
        0.5 - np.sqrt(26), abs=1e-5
    )


def test_an_element_without_core_has_no_clearance(toy_index):
    """NaN, not 0: it is not known."""
    geometry = toy_index.geometry
    fields = {k: v for k, v in geometry.__dict__.items() if k in Geometry.__match_args__}
    core = geometry.core.copy()
    core[: geometry.segment_offsets[1]] = False
    index = DamageIndex.build(Geometry(**{**fields, "core": core}))
    found = point_damage(Lesion.from_mask(sphere_mask((-40, 0, 20), 5)), index).clearance_mm
    missing = geometry.index_of[geometry.segment_ids[0]]
    assert np.isnan(found[missing])
    assert np.isfinite(np.delete(found, missing)).all()
