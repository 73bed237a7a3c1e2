"""Lesions as values."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from strategies import lesions

from byway.knowledge.faults import BywayError
from byway.knowledge.lesion.lesion import Compartment, Lesion
from byway.knowledge.lesion.shapes import sphere_mask
from byway.knowledge.space.grid import TEMPLATE_GRID


def plain_effect_map(lesion: Lesion) -> np.ndarray:
    """The definition: the largest effect of all compartments, and of the graded map, at every voxel."""
    effect = np.zeros(TEMPLATE_GRID.shape, np.float32)
    for compartment in lesion.compartments:
        effect = np.maximum(effect, np.where(compartment.mask, np.float32(compartment.effect), np.float32(0)))
    return effect if lesion.effect_volume is None else np.maximum(effect, lesion.effect_volume)


@settings(max_examples=15, deadline=None)
@given(lesions())
def test_effect_map_is_the_maximum_over_compartments(lesion):
    """Where compartments overlap, the larger effect holds; voxels of effect 0 are not in the lesion."""
    expected = plain_effect_map(lesion)
    np.testing.assert_array_equal(lesion.effect_map(), expected)
    np.testing.assert_array_equal(lesion.mask, expected > 0)
    assert lesion.volume_ml == pytest.approx(np.count_nonzero(expected) / 1000)
    voxels, effects = lesion.effect_voxels
    assert (np.diff(voxels) > 0).all()
    np.testing.assert_array_equal(effects, expected.reshape(-1)[voxels])


def test_graded_map_joins_the_compartments():
    """A graded effect map and a compartment combine by the larger effect."""
    graded = np.zeros(TEMPLATE_GRID.shape, np.float32)
    graded[90:100, 100, 100] = np.linspace(0, 0.9, 10)
    core = np.zeros(TEMPLATE_GRID.shape, bool)
    core[95:105, 100, 100] = True
    lesion = Lesion((Compartment("core", "core", 0.7, core),), graded)
    np.testing.assert_array_equal(lesion.effect_map(), plain_effect_map(lesion))


def test_an_empty_lesion_is_allowed():
    """Before anything is drawn there is a lesion without voxels."""
    lesion = Lesion()
    assert lesion.is_empty
    assert lesion.volume_ml == 0
    assert not lesion.effect_map().any()
    assert lesion.volumes_ml == {}


def test_volumes_are_told_by_compartment():
    """A 10 x 10 x 10 mm cube holds 1 ml; compartments count their own voxels though they overlap."""
    cube = np.zeros(TEMPLATE_GRID.shape, bool)
    cube[100:110, 100:110, 100:110] = True
    lesion = Lesion((Compartment("core", "core", 1.0, cube), Compartment("oedema", "oedema", 0.3, cube)))
    assert lesion.volumes_ml == {"core": 1.0, "oedema": 1.0}
    assert lesion.volume_ml == 1.0


@pytest.mark.parametrize("effect", [-0.1, 1.1, float("nan")])
def test_an_effect_outside_0_to_1_is_refused(effect):
    """The error names the compartment and the range."""
    with pytest.raises(BywayError, match=r"'core'.*between 0 and 1"):
        Compartment("core", "core", effect, sphere_mask((0, 0, 0), 3))


def test_a_mask_off_the_grid_is_refused():
    """Shape and type are told."""
    with pytest.raises(BywayError, match="float64 mask of shape"):
        Compartment("core", "core", 1.0, np.zeros(TEMPLATE_GRID.shape))
    with pytest.raises(BywayError, match=r"shape \(3, 3, 3\)"):
        Compartment("core", "core", 1.0, np.zeros((3, 3, 3), bool))


@pytest.mark.parametrize("value", [-0.5, 1.5, np.nan])
def test_an_effect_volume_out_of_range_is_refused(value):
    """NaN and values outside [0, 1] are refused, with the range found."""
    volume = np.zeros(TEMPLATE_GRID.shape, np.float32)
    volume[5, 5, 5] = value
    with pytest.raises(BywayError, match="between 0 and 1"):
        Lesion((), volume)
    with pytest.raises(BywayError, match="shape"):
        Lesion((), volume[1:])
