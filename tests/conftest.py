"""Fixtures that many tests share: built once a session."""

from __future__ import annotations

import pytest

from byway.knowledge.space.atlas import Template, load_template


@pytest.fixture(scope="session")
def template() -> Template:
    """Geometry of the template for the curated graph, from the user's cache where it was built before."""
    return load_template(progress=False)
