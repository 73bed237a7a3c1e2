"""The table of words."""

from __future__ import annotations

import pytest

from byway.knowledge.faults import BywayError
from byway.knowledge.words import ORIGINS, section, word, words


def test_every_word_has_text_and_origin() -> None:
    """Every entry has a text and one of the three origins."""
    for entries in words().values():
        for key, entry in entries.items():
            assert entry.text or key.startswith("hint_") or key.endswith("_short")
            assert entry.origin in ORIGINS


def test_the_table_is_frozen() -> None:
    """No caller can change a word for the others."""
    with pytest.raises(TypeError):
        words()["shared"]["caution"] = None  # type: ignore[index]


def test_an_unknown_word_suggests_the_nearest() -> None:
    """A misspelt key raises, naming the key that was meant."""
    with pytest.raises(BywayError, match=r"shared\.caution"):
        word("shared.cautoin")


def test_section_is_plain_text() -> None:
    """A section is a plain mapping of texts, as a trait needs it."""
    assert section("shared")["left_letter"] == "L"
