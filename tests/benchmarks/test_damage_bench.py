"""How long damage takes, beside nilearn's masker and bare numpy gathers in the same run. Prints ratios; asserts none.

Run alone for figures worth quoting: ``python -m pytest tests/benchmarks/test_damage_bench.py -s``.
"""

from __future__ import annotations

import nibabel as nib
import numpy as np
import pytest
from nilearn.maskers import NiftiLabelsMasker, NiftiMapsMasker
from ratios import note, seconds
from toy_space import label_layers, toy_geometry

from byway.knowledge.damage.anatomies import Anatomies
from byway.knowledge.damage.ensemble import VARIANTS, EnsembleSettings, ensemble
from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.damage.nearby import NearSample
from byway.knowledge.damage.point import point_damage
from byway.knowledge.damage.profile import course_profile
from byway.knowledge.damage.words import EffectWords
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.lesion.shapes import sphere_mask
from byway.knowledge.space.grid import TEMPLATE_GRID

THIRTY_ML = 19.3  # radius in mm: 4/3 pi r^3 is 30.1 ml


def lesion() -> Lesion:
    """A fresh 30 ml lesion, so that nothing that is kept from an earlier call helps."""
    return Lesion.from_mask(sphere_mask((-40, -10, 20), THIRTY_ML))


@pytest.fixture(scope="module")
def index(template) -> DamageIndex:
    """Index of the template."""
    return DamageIndex.build(template.geometry)


@pytest.mark.filterwarnings("ignore")
def test_point_damage_beside_nilearns_masker(benchmark, capsys, index):
    """Whole graph, 1 mm, 30 ml; the masker reckons the regions alone. The numbers agree to 1e-3."""
    effect = nib.Nifti1Image(lesion().effect_map(), TEMPLATE_GRID.affine)
    maskers = [
        (NiftiLabelsMasker(nib.Nifti1Image(labels, TEMPLATE_GRID.affine), resampling_target=None).fit(), regions)
        for labels, regions in label_layers(index.geometry)
    ]
    # Parcels overlap here and there; the least number of label volumes is more than one masker's work, so that only
    # the first, which holds nearly all of them, is timed.
    theirs = seconds(lambda: maskers[0][0].transform(effect), rounds=3)
    drawn = [lesion() for _ in range(60)]
    damage = benchmark.pedantic(lambda: point_damage(drawn.pop(), index), rounds=50, warmup_rounds=5)
    again = seconds(lambda: point_damage(drawn[0], index), rounds=20)
    for masker, regions in maskers:
        np.testing.assert_allclose(damage.share[regions], np.ravel(masker.transform(effect)), atol=1e-3)
    ours = benchmark.stats.stats.median
    note(benchmark, capsys, "point damage, regions and segments, over nilearn's labels masker, regions alone",
         ms=ours * 1e3, masker_ms=theirs * 1e3, masker_over_ours=theirs / ours,
         masker_over_ours_once_voxels_are_listed=theirs / again)  # fmt: skip


@pytest.mark.filterwarnings("ignore")
def test_point_damage_beside_nilearns_maps_masker(benchmark, capsys, index):
    """The segments' density maps, ten at a time as memory allows, scaled up to all: the whole graph by maskers."""
    geometry = index.geometry
    maps = np.zeros((*TEMPLATE_GRID.shape, 10), np.float32)
    for i in range(10):
        flat = TEMPLATE_GRID.flat_index(np.concatenate(geometry.streamlines(i * 7)))
        maps[..., i].reshape(-1)[flat[flat >= 0]] = 1
    masker = NiftiMapsMasker(nib.Nifti1Image(maps, TEMPLATE_GRID.affine), resampling_target=None).fit()
    effect = nib.Nifti1Image(lesion().effect_map(), TEMPLATE_GRID.affine)
    theirs = seconds(lambda: masker.transform(effect), rounds=1) * len(geometry.segment_ids) / 10
    drawn = [lesion() for _ in range(60)]
    benchmark.pedantic(lambda: point_damage(drawn.pop(), index), rounds=50, warmup_rounds=5)
    ours = benchmark.stats.stats.median
    note(benchmark, capsys, "point damage over nilearn's maps masker on all segments",
         masker_s=theirs, masker_over_ours=theirs / ours)  # fmt: skip


def test_clearance(benchmark, index):
    """Signed distance to every element."""
    drawn = [point_damage(lesion(), index) for _ in range(12)]
    benchmark.pedantic(lambda: drawn.pop().clearance_mm, rounds=10, warmup_rounds=1)


def test_ensemble_beside_the_bare_gather(benchmark, capsys, index):
    """200 draws and four variants, beside gathering an effect map as often at the points within reach."""
    settings = EnsembleSettings()
    sample = index.sample
    voxels, effects = lesion().effect_voxels
    words = EffectWords.build(
        np.stack(np.unravel_index(voxels, sample.shape), axis=1),
        effects,
        [1.5 * settings.boundary_sd_mm],
        departure=2 * settings.boundary_sd_mm,
        rim=settings.rim_mm,
        rim_effect=settings.rim_effect,
    )
    anatomies = Anatomies(settings.draws, settings.seed, settings.jitter_mm, settings.jitter_deg)
    near = NearSample.build(sample, words, anatomies, 1.0)
    effect = words.decoded(np.pad(words.volumes[0], near.pad).reshape(-1), "as_drawn")
    out = np.empty(len(near.base), np.float32)

    def gather() -> None:
        for _ in range(settings.draws):
            np.take(effect, near.base, out=out, mode="clip")

    bare = seconds(gather, rounds=3)
    drawn = lesion()
    benchmark.pedantic(lambda: ensemble(drawn, index, settings), rounds=7, warmup_rounds=1)
    ours = benchmark.stats.stats.min
    note(
        benchmark,
        capsys,
        f"ensemble of {settings.draws}, four variants, {len(near.base)} points within reach",
        ms=ours * 1e3,
        over_one_gather=ours / bare,
        over_a_gather_for_each_variant=ours / bare / len(VARIANTS),
    )


def test_cost_grows_no_faster_than_the_segments(benchmark, capsys):
    """1,000 segments against 100, of 20 streamlines each, for one lesion."""
    few, many = (DamageIndex.build(toy_geometry(pairs, 20)) for pairs in (50, 500))
    drawn = [lesion() for _ in range(60)]
    for each in drawn:
        assert not each.is_empty
    small = seconds(lambda: point_damage(drawn[0], few), rounds=20)
    benchmark.pedantic(lambda: point_damage(drawn.pop(), many), rounds=20, warmup_rounds=2)
    large = benchmark.stats.stats.min
    note(benchmark, capsys, "1,000 segments over 100", times=large / small)


def test_index_build(benchmark, template):
    """Inverting the template's geometry."""
    benchmark.pedantic(lambda: DamageIndex.build(template.geometry), rounds=3)


def test_profile(benchmark, template):
    """Along one course."""
    drawn = lesion()
    benchmark(lambda: course_profile(drawn, template, "arcuate_fasciculus.long_ventral", "left"))
