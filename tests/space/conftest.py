"""Fixtures that the tests of space share."""

from __future__ import annotations

import pytest

from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.loading import load_graph


@pytest.fixture(scope="session")
def graph() -> Graph:
    """The curated graph."""
    return load_graph()
