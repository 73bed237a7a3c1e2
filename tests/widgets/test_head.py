"""The 3-D head: surfaces of masks, and bundles parted into cut and spared streamlines."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from toy_space import toy_geometry

from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.damage.point import point_damage
from byway.widgets.head.surface import mask_surface
from byway.widgets.head.wire import CUT, bundle_lines


def volume(surface: object) -> float:
    """Volume enclosed by triangles whose normals point outwards (divergence theorem)."""
    corners = surface.vertices_mm[surface.triangles].astype(float)
    return float(np.einsum("ij,ij->i", corners[:, 0], np.cross(corners[:, 1], corners[:, 2])).sum() / 6)


@given(st.integers(0, 2**31), st.floats(0.05, 0.9))
def test_blocks_enclose_the_mask(seed: int, density: float) -> None:
    """Unsmoothed, the surface of any mask encloses exactly its volume, with normals outwards."""
    mask = np.random.default_rng(seed).random((5, 4, 6)) < density
    affine = np.diag([2.0, 1.0, 3.0, 1.0])
    assert volume(mask_surface(mask, affine, smoothing=0)) == pytest.approx(mask.sum() * 6.0, abs=1e-3)


def test_smoothing_keeps_the_volume() -> None:
    """A smoothed sphere of radius 8 keeps its volume to 5 %."""
    ball = np.square(np.indices((24, 24, 24)) - 11.5).sum(axis=0) <= 64
    assert volume(mask_surface(ball, np.eye(4), smoothing=10)) == pytest.approx(ball.sum(), rel=0.05)


def test_coarse_blocks_stay_in_place() -> None:
    """Blocks of four voxels leave a large box where it is, to half a block."""
    box = np.zeros((40, 40, 40), bool)
    box[8:32, 8:32, 8:32] = True
    surface = mask_surface(box, np.eye(4), step=4, smoothing=0)
    np.testing.assert_allclose(surface.vertices_mm.min(0), 7.5, atol=2)
    np.testing.assert_allclose(surface.vertices_mm.max(0), 31.5, atol=2)


def test_an_empty_mask_has_no_surface() -> None:
    """Nothing inside gives no vertex and no triangle."""
    surface = mask_surface(np.zeros((4, 4, 4), bool), np.eye(4))
    assert surface.vertices_mm.shape == (0, 3)
    assert surface.triangles.shape == (0, 3)


def test_cut_lines_are_those_that_meet_the_lesion() -> None:
    """Parted line by line with a plain loop, the same streamlines are cut."""
    geometry = toy_geometry(n_pairs=1, n_streamlines=30)
    index = DamageIndex.build(geometry)
    effect = np.zeros(geometry.grid.size, np.float32)
    lines = geometry.streamlines(0)
    middle = lines[0][len(lines[0]) // 2]
    every = geometry.grid.to_mm(np.stack(np.unravel_index(np.arange(geometry.grid.size), geometry.grid.shape), axis=1))
    effect[np.square(every - middle).sum(axis=1) <= 9] = 1.0
    damage = point_damage(effect.reshape(geometry.grid.shape), index)
    bundle = bundle_lines(damage, geometry.segment_ids[0])
    cut = sum(effect[geometry.grid.flat_index(line)].max() >= CUT for line in lines)
    assert 0 < cut < len(lines)
    assert np.isnan(bundle.cut_mm[:, 0]).sum() == cut
    assert np.isnan(bundle.spared_mm[:, 0]).sum() == len(lines) - cut
