"""Parcels: their tissue, size, and the fissures they keep to."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.ndimage import label

from byway.knowledge.graph.graph import Graph
from byway.knowledge.space.atlas import Template
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.space.parcels import mirror_flat
from byway.knowledge.space.template import brain_mask, template_volume


def test_mirroring_twice_is_the_identity() -> None:
    """The mirror of a mirror is the voxel itself, and x changes its sign."""
    flat = TEMPLATE_GRID.flat_index(np.array([[-30.0, 4, 9], [0, 1, 2]])).astype(np.int32)
    assert mirror_flat(mirror_flat(flat)).tolist() == sorted(flat.tolist())
    assert TEMPLATE_GRID.flat_index(np.array([[30.0, 4, 9]]))[0] in mirror_flat(flat)


def test_no_voxel_belongs_to_two_grey_regions(template: Template, graph: Graph) -> None:
    """Parcels of grey matter do not overlap; left parcels lie at x < 0 and right ones at x > 0."""
    geometry = template.geometry
    seen = np.zeros(geometry.grid.size, np.int16)
    for number, element in enumerate(geometry.region_ids):
        key, _, side = element.partition("@")
        voxels = geometry.parcel_voxels(number)
        assert len(voxels)
        if graph.regions[key].tissue != "white_matter":
            seen[voxels] += 1
        x = np.unravel_index(voxels, geometry.grid.shape)[0] - 98
        assert {"left": (x < 0).all(), "right": (x > 0).all(), "midline": True}[side], element
    assert seen.max() == 1


def test_cortex_is_grey_and_no_parcel_leaves_the_brain(template: Template, graph: Graph) -> None:
    """Cortical parcels hold voxels of at least 45 % grey matter; nothing but the chiasm leaves the brain mask."""
    grey, brain = template_volume("gm").reshape(-1), brain_mask().reshape(-1)
    for number, element in enumerate(template.geometry.region_ids):
        region = graph.regions[element.partition("@")[0]]
        voxels = template.geometry.parcel_voxels(number)
        if region.tissue == "cortex":
            assert grey[voxels].min() > 0.44
        if region.key != "optic_chiasm":
            assert brain[voxels].mean() > 0.99, element


def test_volumes_are_near_their_targets(template: Template, graph: Graph) -> None:
    """No parcel exceeds 1.4 times its curated volume, and nine in ten reach half of that."""
    volumes = {
        element: len(template.geometry.parcel_voxels(number)) / 1000
        for number, element in enumerate(template.geometry.region_ids)
    }
    ratio = {
        element: volume / graph.regions[element.partition("@")[0]].volume_ml for element, volume in volumes.items()
    }
    assert max(ratio.values()) < 1.41 * 1.1
    assert np.mean([each > 0.7 for each in ratio.values()]) > 0.9


@pytest.mark.parametrize("tissue", ["deep_grey", "brainstem"])
def test_nuclei_are_in_one_piece(template: Template, graph: Graph, tissue: str) -> None:
    """At least 95 % of a nucleus hangs together by faces, edges or corners."""

    for key, region in graph.regions.items():
        if region.tissue == tissue:
            side = template.sides(key)[0]
            pieces, count = label(template.parcel(key, side), np.ones((3, 3, 3)))
            assert count
            sizes = np.bincount(pieces.ravel())[1:]
            assert sizes.max() > 0.95 * sizes.sum(), key
