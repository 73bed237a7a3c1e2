"""Values to YAML and back."""

from __future__ import annotations

from typing import Any

import pytest
from hypothesis import given, settings
from strategies import plain_mappings

from byway.knowledge.graph.emit import emit_yaml
from byway.knowledge.yamltext import parse_yaml


@settings(max_examples=400, deadline=None)
@given(plain_mappings)
def test_reading_back_is_the_identity(values: dict[str, Any]) -> None:
    """Whatever is written is read back as the same values, and written again as the same bytes."""
    text = emit_yaml(values)
    read = parse_yaml(text, "text").value or {}
    assert read == values
    assert emit_yaml(read) == text


@pytest.mark.parametrize("value", [float("nan"), float("inf"), "half \ud800"])
def test_what_cannot_be_written_is_refused(value: object) -> None:
    """Numbers that are not finite and broken text raise instead of being written."""
    with pytest.raises(ValueError, match=r"no number|half of a character"):
        emit_yaml({"a": [value]})


def test_other_objects_are_refused() -> None:
    """A set is no plain value."""
    with pytest.raises(TypeError, match="set"):
        emit_yaml({"a": {1, 2}})
