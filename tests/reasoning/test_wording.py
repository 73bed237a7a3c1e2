"""Words: the verbal scale and lists."""

from __future__ import annotations

import pytest

from byway.knowledge.reasoning.scenarios import AXES, USUAL
from byway.knowledge.reasoning.wording import DEPARTURE_WORDS, VERBAL_SCALE, in_words, join


@pytest.mark.parametrize("bound", range(len(VERBAL_SCALE) - 1))
def test_each_bound_starts_the_next_word(bound: int) -> None:
    """A probability just below a bound has its word, at the bound the next."""
    limit, words = VERBAL_SCALE[bound]
    assert in_words(limit - 1e-9) == words
    assert in_words(limit) == VERBAL_SCALE[bound + 1][1]


def test_every_departure_has_words() -> None:
    """No value of an axis but the usual one is without a clause."""
    departures = {(axis, value) for axis, values in AXES.items() for value in values if value != USUAL[axis]}
    assert set(DEPARTURE_WORDS) == departures


def test_lists() -> None:
    """None, one, two, three."""
    assert [join([]), join(["a"]), join(["a", "b"]), join(["a", "b", "c"])] == ["", "a", "a and b", "a, b and c"]
