"""Point estimates against plain loops, nilearn's label masker and dipy's streamline functions."""

from __future__ import annotations

import nibabel as nib
import numpy as np
import pytest
from dipy.tracking.utils import density_map, target
from hypothesis import given, settings
from hypothesis import strategies as st
from nilearn.maskers import NiftiLabelsMasker
from strategies import ellipsoids, lesions
from toy_space import label_layers, toy_geometry

from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.damage.point import Damage, point_damage
from byway.knowledge.faults import BywayError
from byway.knowledge.lesion.lesion import Compartment, Lesion
from byway.knowledge.lesion.shapes import ellipsoid_mask, sphere_mask
from byway.knowledge.space.geometry import Geometry
from byway.knowledge.space.grid import TEMPLATE_GRID

TEMPORAL = Lesion(
    (
        Compartment("core", "core", 1.0, ellipsoid_mask((-43, -38, 15), (16, 20, 14))),
        Compartment("oedema", "oedema", 0.35, ellipsoid_mask((-43, -38, 15), (24, 30, 22))),
    )
)


def plain_severed_share(effect: np.ndarray, geometry: Geometry, segment: int) -> float:
    """The definition, streamline by streamline: the largest D met along it, averaged by weight."""
    lines = geometry.streamlines(segment)
    first = geometry.segment_offsets[segment]
    weights = geometry.streamline_weights[first : first + len(lines)]
    worst = []
    for line in lines:
        voxels = np.rint(np.asarray(line, float) - TEMPLATE_GRID.affine[:3, 3]).astype(int)
        inside = ((voxels >= 0) & (voxels < TEMPLATE_GRID.shape)).all(axis=1)
        worst.append(effect[tuple(voxels[inside].T)].max(initial=0.0))
    return float(np.average(worst, weights=weights))


def plain_lost_share(effect: np.ndarray, geometry: Geometry, region: int) -> float:
    """The definition: mean of D over the parcel, by membership."""
    low, high = geometry.region_offsets[region : region + 2]
    return float(
        np.average(effect.reshape(-1)[geometry.region_voxels[low:high]], weights=geometry.region_weights[low:high])
    )


def check_against_loops(lesion: Lesion | np.ndarray, index: DamageIndex) -> Damage:
    """All shares equal the plain loops to single precision."""
    geometry = index.geometry
    effect = lesion.effect_map() if isinstance(lesion, Lesion) else lesion
    damage = point_damage(lesion, index)
    n_regions = len(geometry.region_ids)
    expected = [plain_lost_share(effect, geometry, r) for r in range(n_regions)]
    expected += [plain_severed_share(effect, geometry, g) for g in range(len(geometry.segment_ids))]
    np.testing.assert_allclose(damage.share, expected, atol=2e-6)
    return damage


@settings(max_examples=15, deadline=None)
@given(lesions())
def test_shares_equal_plain_loops_on_the_toy_geometry(toy_index, lesion):
    """Any number of overlapping compartments of any effect."""
    check_against_loops(lesion, toy_index)


def test_shares_equal_plain_loops_on_the_template(index):
    """A lesion with oedema in the temporal lobe, over all regions and segments of the graph."""
    damage = check_against_loops(TEMPORAL, index)
    assert damage.share.max() > 0.5


def test_a_graded_map_is_reckoned_exactly(toy_index):
    """As many effects as voxels; the map can be given as an array."""
    graded = np.random.default_rng(1).random(TEMPLATE_GRID.shape, np.float32)
    graded[sphere_mask((30, -10, 20), 30)] = 0
    damage = check_against_loops(graded, toy_index)
    again = point_damage(Lesion((), graded), toy_index)
    np.testing.assert_array_equal(damage.share, again.share)


def test_weights_of_streamlines_and_voxels_count():
    """A streamline of weight 3 counts three times, a voxel of membership one half counts half."""
    geometry = toy_geometry(2, 12, seed=3)
    rng = np.random.default_rng(0)
    weighted = Geometry(
        **{
            **{k: v for k, v in geometry.__dict__.items() if k in Geometry.__match_args__},
            "streamline_weights": rng.integers(1, 4, len(geometry.streamline_weights)).astype(np.float32),
            "region_weights": rng.choice([0.25, 0.5, 1.0], len(geometry.region_weights)).astype(np.float32),
        }
    )
    check_against_loops(Lesion.from_mask(ellipsoid_mask((-35, -20, 15), (20, 50, 20))), DamageIndex.build(weighted))


@pytest.mark.filterwarnings("ignore")
def test_region_shares_equal_nilearns_label_masker(index):
    """Mean of the effect map over each parcel, to 1e-3 (single precision)."""
    damage = point_damage(TEMPORAL, index)
    effect = nib.Nifti1Image(TEMPORAL.effect_map(), TEMPLATE_GRID.affine)
    seen = 0
    for labels, regions in label_layers(index.geometry):
        image = nib.Nifti1Image(labels, TEMPLATE_GRID.affine)
        means = NiftiLabelsMasker(image, resampling_target=None, standardize=None).fit().transform(effect)
        np.testing.assert_allclose(damage.share[regions], np.ravel(means), atol=1e-3)
        seen += len(regions)
    assert seen == len(index.geometry.region_ids)


@pytest.mark.parametrize("element", ["arcuate_fasciculus.long_ventral@left", "uncinate_fasciculus.main@left"])
def test_severed_share_and_overlap_equal_dipys(index, element):
    """Streamlines that pass the mask (dipy ``target``) and lesion voxels that the bundle passes (``density_map``)."""
    geometry = index.geometry
    segments = [s for s in geometry.segment_ids if s.split(".")[0] == element.split(".")[0] and s.endswith("@left")]
    element = element if element in segments else segments[0]
    mask = TEMPORAL.mask
    lesion = Lesion.from_mask(mask)
    lines = [np.asarray(line, float) for line in geometry.streamlines(geometry.segment_ids.index(element))]
    damage = point_damage(lesion, index)
    cut = sum(1 for _ in target(lines, TEMPLATE_GRID.affine, mask))
    assert damage.of(element) == pytest.approx(cut / len(lines), abs=1e-6)
    passed = density_map(lines, TEMPLATE_GRID.affine, TEMPLATE_GRID.shape) > 0
    at = geometry.index_of[element]
    assert damage.overlap_ml[at] == pytest.approx((passed & mask).sum() / 1000, abs=1e-6)


def test_overlap_of_a_region_is_the_shared_volume(index):
    """Voxels in both the parcel and the lesion, whatever the effect there."""
    geometry = index.geometry
    damage = point_damage(TEMPORAL, index)
    for region, element in enumerate(geometry.region_ids):
        parcel = np.zeros(TEMPLATE_GRID.size, bool)
        parcel[geometry.parcel_voxels(region)] = True
        shared = np.count_nonzero(parcel & TEMPORAL.mask.reshape(-1)) / 1000
        assert damage.overlap_ml[geometry.index_of[element]] == pytest.approx(shared, abs=1e-4)


def test_a_fibre_cut_at_one_point_is_cut(toy_index):
    """A thin plate across a tube severs it wholly, though it overlaps little of it."""
    geometry = toy_index.geometry
    segment = geometry.segment_ids[0]
    middle = np.mean([line[len(line) // 2] for line in geometry.streamlines(0)], axis=0)
    ends = [np.mean([line[i] for line in geometry.streamlines(0)], axis=0) for i in (0, -1)]
    axis = int(np.abs(ends[1] - ends[0]).argmax())
    plate = np.zeros(TEMPLATE_GRID.shape, bool)
    at = int(np.rint(middle[axis] - TEMPLATE_GRID.affine[axis, 3]))
    plate[(slice(None),) * axis + (slice(at, at + 2),)] = True
    damage = point_damage(Lesion.from_mask(plate), toy_index)
    assert damage.of(segment) == 1
    assert damage.overlap_ml[geometry.index_of[segment]] < 0.5


def mirrored_share(share: np.ndarray, geometry: Geometry) -> np.ndarray:
    """Shares with every element's partner in its place."""
    turn = {"left": "right", "right": "left", "midline": "midline"}
    other = ["@".join((e.rsplit("@", 1)[0], turn[e.rsplit("@", 1)[1]])) for e in geometry.element_ids]
    return share[[geometry.index_of[e] for e in other]]


@settings(max_examples=10, deadline=None)
@given(ellipsoids())
def test_flipping_the_mask_flips_the_result(toy_index, mask):
    """Left for right, to the last digit."""
    one = point_damage(Lesion.from_mask(mask), toy_index)
    other = point_damage(Lesion.from_mask(mask[::-1].copy()), toy_index)
    np.testing.assert_allclose(mirrored_share(other.share, toy_index.geometry), one.share, atol=1e-7)
    np.testing.assert_allclose(mirrored_share(other.overlap_ml, toy_index.geometry), one.overlap_ml, atol=1e-6)
    np.testing.assert_array_equal(mirrored_share(other.clearance_mm, toy_index.geometry), one.clearance_mm)


def test_flipping_the_mask_flips_the_result_on_the_template(index):
    """The template is symmetric, so that a mirrored lesion has mirrored shares, overlaps and clearances."""
    one = point_damage(TEMPORAL, index)
    flipped = Lesion(tuple(Compartment(c.name, c.kind, c.effect, c.mask[::-1].copy()) for c in TEMPORAL.compartments))
    other = point_damage(flipped, index)
    np.testing.assert_allclose(mirrored_share(other.share, index.geometry), one.share, atol=0.01)
    np.testing.assert_allclose(mirrored_share(other.clearance_mm, index.geometry), one.clearance_mm, atol=0.5)


@settings(max_examples=15, deadline=None)
@given(lesions(), ellipsoids(), st.floats(0, 1, width=32))
def test_a_larger_lesion_never_lowers_damage(toy_index, lesion, mask, effect):
    """Adding a compartment raises or keeps every share and overlap, and never widens a clearance."""
    more = Lesion((*lesion.compartments, Compartment("more", "other", effect, mask)))
    less, most = point_damage(lesion, toy_index), point_damage(more, toy_index)
    assert (most.share >= less.share - 1e-6).all()
    assert (most.overlap_ml >= less.overlap_ml - 1e-6).all()
    assert not (most.clearance_mm > less.clearance_mm + 1e-4).any()


def test_no_lesion_is_no_damage(toy_index):
    """Shares and overlaps are 0; a clearance from nothing is not known."""
    damage = point_damage(Lesion(), toy_index)
    assert not damage.share.any()
    assert not damage.overlap_ml.any()
    assert np.isnan(damage.clearance_mm).all()


def test_a_lesion_of_the_whole_brain_takes_everything(toy_index):
    """Every share is 1."""
    everything = np.ones(TEMPLATE_GRID.shape, np.float32)
    np.testing.assert_array_equal(point_damage(everything, toy_index).share, 1)


def test_effect_maps_are_checked(toy_index):
    """Shape and range are told."""
    with pytest.raises(BywayError, match="effect map of shape"):
        point_damage(np.zeros((3, 3, 3), np.float32), toy_index)
    for value in (2.0, -0.5, np.nan):
        volume = np.zeros(TEMPLATE_GRID.shape, np.float32)
        volume[5, 5, 5] = value
        with pytest.raises(BywayError, match="between 0 and 1"):
            point_damage(volume, toy_index)
