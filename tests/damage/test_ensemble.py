"""The ensemble of virtual anatomies."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from strategies import ellipsoids

from byway.knowledge.damage.ensemble import VARIANTS, EnsembleSettings, EnsembleStoppedError, ensemble
from byway.knowledge.damage.point import point_damage
from byway.knowledge.damage.sample import Sample
from byway.knowledge.faults import BywayError
from byway.knowledge.lesion.lesion import Compartment, Lesion
from byway.knowledge.lesion.morphology import grow_mm
from byway.knowledge.lesion.shapes import ellipsoid_mask, sphere_mask
from byway.knowledge.space.grid import TEMPLATE_GRID

STILL = EnsembleSettings(draws=4, boundary_sd_mm=0, jitter_mm=0, jitter_deg=0, spread_scale=0)
TEMPORAL = Lesion.from_mask(ellipsoid_mask((-43, -38, 15), (16, 20, 14)))


def all_points(index) -> Sample:
    """Every point of every streamline, and every voxel."""
    return Sample.build(index.geometry, streamlines=None, step=1, voxels=None)


@settings(max_examples=8, deadline=None)
@given(ellipsoids(), st.sampled_from([0.4, 1.0]))
def test_without_spread_every_draw_is_the_point_estimate(toy_index, mask, effect):
    """No displacement, no jitter, no boundary error, all points: equal to single precision."""
    lesion = Lesion.from_mask(mask, effect=effect)
    found = ensemble(lesion, toy_index, STILL, sample=all_points(toy_index))
    expected = point_damage(lesion, toy_index).share
    for draw in found.draws["as_drawn"]:
        np.testing.assert_allclose(draw, expected, atol=1e-5)


def test_without_spread_the_usual_sample_is_near_the_point_estimate(index):
    """100 of 200 streamlines, every second point and 300 voxels: within 0.08, and 0.03 in the mean of those hit."""
    found = ensemble(TEMPORAL, index, STILL).draws["as_drawn"][0]
    expected = point_damage(TEMPORAL, index).share
    assert np.abs(found - expected).max() < 0.08
    assert np.abs(found - expected)[expected > 0].mean() < 0.03


def test_without_spread_the_variants_are_moved_boundaries(toy_index):
    """too_small equals the point estimate of the grown lesion; the rim adds half of its own."""
    mask = sphere_mask((-40, -20, 15), 12)
    settings_ = EnsembleSettings(
        draws=1, boundary_sd_mm=0, jitter_mm=0, jitter_deg=0, spread_scale=0, departure_mm=3, rim_mm=6, rim_effect=0.5
    )
    found = ensemble(Lesion.from_mask(mask), toy_index, settings_, sample=all_points(toy_index)).draws
    grown = point_damage(Lesion.from_mask(grow_mm(mask, 3)), toy_index).share
    np.testing.assert_allclose(found["too_small"][0], grown, atol=1e-5)
    rim = Compartment("rim", "other", 0.5, grow_mm(mask, 6))
    around = point_damage(Lesion((Compartment("core", "core", 1.0, mask), rim)), toy_index).share
    np.testing.assert_allclose(found["perilesional"][0], around, atol=1e-5)
    assert (found["too_large"][0] <= found["as_drawn"][0] + 1e-6).all()


def test_intervals_cover_the_point_estimate(index):
    """Nearly everywhere: the point estimate is one anatomy among those that are drawn."""
    found = ensemble(TEMPORAL, index)
    low, high = found.interval()
    share = point_damage(TEMPORAL, index).share
    assert ((low >= 0) & (high <= 1) & (low <= high)).all()
    covered = (share >= low - 0.03) & (share <= high + 0.03)
    assert covered.mean() >= 0.97


def test_variants_are_ordered(index):
    """In every draw: too_large <= as_drawn <= too_small, and as_drawn <= perilesional."""
    draws = ensemble(TEMPORAL, index, EnsembleSettings(draws=40)).draws
    assert set(draws) == set(VARIANTS)
    assert (draws["too_large"] <= draws["as_drawn"] + 1e-6).all()
    assert (draws["as_drawn"] <= draws["too_small"] + 1e-6).all()
    assert (draws["as_drawn"] <= draws["perilesional"] + 1e-6).all()


def test_more_spread_widens_intervals(toy_index):
    """Twice the between-subject spread gives wider intervals on the whole."""
    lesion = Lesion.from_mask(sphere_mask((-40, -20, 15), 14))
    width = [
        np.subtract(*ensemble(lesion, toy_index, EnsembleSettings(spread_scale=scale)).interval()[::-1]).sum()
        for scale in (0.5, 1.0)
    ]
    assert width[1] > width[0]


@settings(max_examples=5, deadline=None)
@given(ellipsoids(15), ellipsoids(15))
def test_a_larger_lesion_never_lowers_damage_in_any_draw(toy_index, mask, more):
    """Drawn boundaries that only move outwards: each person's damage can only rise."""
    chosen = EnsembleSettings(draws=20, boundary_sd_mm=0, departure_mm=2)
    less = ensemble(Lesion.from_mask(mask), toy_index, chosen).draws
    most = ensemble(Lesion.from_mask(mask | more), toy_index, chosen).draws
    for variant in ("as_drawn", "too_small", "perilesional"):
        assert (most[variant] >= less[variant] - 1e-6).all()


@settings(max_examples=4, deadline=None)
@given(ellipsoids())
def test_flipping_the_mask_flips_the_intervals(toy_index, mask):
    """The draws are mirror images of one another in pairs, so that the intervals are too."""
    geometry = toy_index.geometry
    turn = {"left": "right", "right": "left"}
    other = [geometry.index_of[f"{e.split('@')[0]}@{turn[e.split('@')[1]]}"] for e in geometry.element_ids]
    chosen = EnsembleSettings(draws=40)
    one = ensemble(Lesion.from_mask(mask), toy_index, chosen)
    flipped = ensemble(Lesion.from_mask(mask[::-1].copy()), toy_index, chosen)
    for variant in VARIANTS:
        for mine, theirs in zip(one.interval(variant), flipped.interval(variant), strict=True):
            np.testing.assert_allclose(theirs[other], mine, atol=1e-5)


def test_the_same_settings_give_the_same_numbers(toy_index):
    """Bit for bit; another seed gives others."""
    lesion = Lesion.from_mask(sphere_mask((-40, -20, 15), 14))
    one, same = (ensemble(lesion, toy_index, EnsembleSettings(draws=30)) for _ in range(2))
    other = ensemble(lesion, toy_index, EnsembleSettings(draws=30, seed=1))
    np.testing.assert_array_equal(one.draws["as_drawn"], same.draws["as_drawn"])
    assert (one.draws["as_drawn"] != other.draws["as_drawn"]).any()


def test_progress_is_told_and_can_stop_the_work(toy_index):
    """The last report is complete; False stops."""
    seen = []
    lesion = Lesion.from_mask(sphere_mask((-40, -20, 15), 14))
    ensemble(lesion, toy_index, EnsembleSettings(draws=35), progress=lambda done, total: seen.append((done, total)))
    assert seen[-1] == (35, 35)
    assert seen == sorted(seen)
    with pytest.raises(EnsembleStoppedError):
        ensemble(lesion, toy_index, progress=lambda done, total: done < 20)


def test_lesions_that_meet_nothing(toy_index):
    """An empty lesion, and one in a corner of the grid, leave every share at 0."""
    corner = np.zeros(TEMPLATE_GRID.shape, bool)
    corner[:2, :2, :2] = True
    for lesion in (Lesion(), Lesion.from_mask(corner)):
        found = ensemble(lesion, toy_index, EnsembleSettings(draws=5))
        assert all(not shares.any() and shares.shape == (5, 16) for shares in found.draws.values())


def test_graded_maps_are_rounded_to_fifteenths(toy_index):
    """More effects than fit a word: within a thirtieth of the point estimate."""
    graded = np.where(sphere_mask((-40, -20, 15), 20), np.random.default_rng(0).random(TEMPLATE_GRID.shape), 0)
    lesion = Lesion((), graded.astype(np.float32))
    found = ensemble(lesion, toy_index, STILL, sample=all_points(toy_index)).draws["as_drawn"][0]
    np.testing.assert_allclose(found, point_damage(lesion, toy_index).share, atol=1 / 30)


def test_hit_probability_is_the_share_of_draws(toy_index):
    """Counted by hand from the draws."""
    found = ensemble(Lesion.from_mask(sphere_mask((-40, -20, 15), 14)), toy_index, EnsembleSettings(draws=20))
    expected = (found.draws["as_drawn"] > 0.2).mean(axis=0)
    np.testing.assert_allclose(found.hit_probability(0.2), expected)
    np.testing.assert_allclose(found.mean(), found.draws["as_drawn"].mean(axis=0), atol=1e-6)


def test_settings_come_from_the_norms():
    """The lesion's own boundary goes before its sequence's; an unknown sequence has a norm of its own."""
    values = {"boundary_mm.flair": 2.0, "boundary_mm.unknown": 3.0, "registration_jitter_mm": 1.2,
              "registration_jitter_deg": 0.7, "perilesional_rim_mm": 9.0, "perilesional_effect": 0.4}  # fmt: skip

    class Norms:
        """What the graph offers."""

        def norm(self, key: str, member: str | None = None) -> float:
            """Look a number up."""
            return values[key if member is None else f"{key}.{member}"]

    mask = sphere_mask((-40, -20, 15), 5)
    parts = (Compartment("core", "core", 1.0, mask),)
    assert EnsembleSettings.from_norms(Norms(), Lesion(parts, drawn_on="flair")) == EnsembleSettings(
        boundary_sd_mm=2.0, jitter_mm=1.2, jitter_deg=0.7, rim_mm=9.0, rim_effect=0.4
    )
    assert EnsembleSettings.from_norms(Norms(), Lesion(parts)).boundary_sd_mm == 3.0
    assert EnsembleSettings.from_norms(Norms(), Lesion(parts, drawn_on="flair", boundary_mm=0.5)).boundary_sd_mm == 0.5


@pytest.mark.parametrize("wrong", [{"draws": 0}, {"boundary_sd_mm": -1}, {"rim_effect": 2}, {"jitter_mm": np.nan}])
def test_impossible_settings_are_refused(wrong):
    """With the ranges."""
    with pytest.raises(BywayError, match="at least one draw"):
        EnsembleSettings(**wrong)
