"""Everyday words of the search for a sign."""

from __future__ import annotations

import re

from byway.knowledge.graph.loading import load_graph
from byway.widgets.findings.everyday import EVERYDAY


def flat(text: str) -> str:
    """Lower case, words parted by spaces, "hemi-" left out, "ae" as "e"."""
    words = re.sub(r"[^a-z0-9]+", " ", text.lower()).split()
    return "".join(f" {word.removeprefix('hemi')}" for word in words).replace("ae", "e")


def test_every_term_leads_to_a_sign() -> None:
    """Each clinic's term that an everyday word stands for begins words of some sign's name, key or domain."""
    signs = load_graph().signs.values()
    texts = [flat(text) for sign in signs for text in (sign.name, sign.key, sign.domain)]
    for word, terms in EVERYDAY.items():
        for term in terms:
            assert any(flat(term) in text for text in texts), (word, term)
