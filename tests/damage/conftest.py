"""Geometries and indices that the tests of damage share."""

from __future__ import annotations

import pytest
from toy_space import toy_geometry

from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.space.atlas import Template


@pytest.fixture(scope="session")
def toy_index() -> DamageIndex:
    """Index of four mirrored pairs of tubes and balls."""
    return DamageIndex.build(toy_geometry())


@pytest.fixture(scope="session")
def index(template: Template) -> DamageIndex:
    """Index of the template."""
    return DamageIndex.build(template.geometry)
