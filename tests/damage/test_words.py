"""The effect map packed into words."""

from __future__ import annotations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from byway.knowledge.damage.words import MOST_LEVELS, VARIANTS, EffectWords, effect_levels
from byway.knowledge.lesion.distance import shifted

PLACE = st.tuples(*[st.integers(0, 7)] * 3)


@settings(deadline=None)
@given(st.dictionaries(PLACE, st.sampled_from([0.25, 0.5, 1.0]), min_size=1, max_size=40), st.data())
def test_an_or_of_words_decodes_to_the_maximum(lesion, data):
    """For every variant and shift: OR over voxels, then decoded, is the largest of the voxels' own effects."""
    ijk = np.array(list(lesion))
    words = EffectWords.build(
        ijk, np.array(list(lesion.values()), np.float32), [-1.0, 0.0, 1.0], departure=1.0, rim=2.0, rim_effect=0.6
    )
    for volume in words.volumes:
        flat = volume.reshape(-1)
        chosen = flat[data.draw(st.lists(st.integers(0, len(flat) - 1), min_size=1, max_size=6))]
        together = np.bitwise_or.reduce(chosen, keepdims=True)
        for variant in VARIANTS:
            each = words.decoded(chosen, variant)
            assert words.decoded(together, variant)[0] == each.max()


@settings(deadline=None, max_examples=40)
@given(st.dictionaries(PLACE, st.sampled_from([0.25, 0.5, 1.0]), min_size=1, max_size=40))
def test_without_a_shift_the_map_is_as_drawn(lesion):
    """The variant as_drawn is the effect map; too_small is nowhere less, too_large nowhere more; the rim adds."""
    ijk, effects = np.array(list(lesion)), np.array(list(lesion.values()), np.float32)
    words = EffectWords.build(ijk, effects, [0.0], departure=1.0, rim=2.0, rim_effect=0.6)
    volume = words.volumes[0]
    drawn = np.zeros(volume.shape, np.float32)
    drawn[tuple((ijk - words.origin).T)] = effects
    found = {variant: words.decoded(volume, variant) for variant in VARIANTS}
    np.testing.assert_array_equal(found["as_drawn"], drawn)
    assert (found["too_small"] >= drawn).all()
    np.testing.assert_array_equal(found["too_small"] > 0, shifted(drawn > 0, 1.0))
    rim = shifted(drawn > 0, 2.0)
    np.testing.assert_array_equal(found["perilesional"], np.maximum(drawn, np.where(rim, np.float32(0.6), 0)))
    if shifted(drawn > 0, -1.0).any():
        assert (found["too_large"] <= drawn).all()


def test_a_lesion_is_never_shrunk_to_nothing():
    """A single voxel stays whatever the boundary error is."""
    words = EffectWords.build(
        np.array([[5, 5, 5]]), np.ones(1, np.float32), [-3.0], departure=3.0, rim=0.0, rim_effect=0.5
    )
    assert np.count_nonzero(words.decoded(words.volumes[0], "too_large")) == 1


def test_words_are_as_short_as_they_can_be():
    """One effect fits a byte, three fit two, fifteen fit eight."""
    for count, size in ((1, 1), (3, 2), (7, 4), (15, 8)):
        effects = (np.arange(count) + 1).astype(np.float32) / count
        ijk = np.stack([np.arange(count)] * 3, axis=1)
        words = EffectWords.build(ijk, effects, [0.0], departure=0.0, rim=0.0, rim_effect=1.0)
        assert words.volumes[0].dtype.itemsize == size


@given(st.lists(st.floats(0, 1, width=32), min_size=1, max_size=60))
def test_levels_lie_within_half_a_step_of_every_effect(effects):
    """Exact up to 15 distinct effects; else no effect is farther than a thirtieth from its level."""
    values = np.array(effects, np.float32)
    levels = effect_levels(values)
    assert len(levels) <= MOST_LEVELS
    above = values[values > 0]
    if len(np.unique(above)) <= MOST_LEVELS:
        assert set(levels) == set(above)
    else:
        gap = np.abs(above[:, None] - levels).min(axis=1)
        assert (gap[above > levels[0]] <= 1 / 30 + 1e-6).all()
