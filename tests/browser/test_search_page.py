"""The search for a sign, on the packaged graph, in a real browser."""

from __future__ import annotations

from typing import Any

import pytest
from browser.bare import Bare

from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.loading import load_graph
from byway.widgets import BenchState, FindingsPanel

SHOWN = "() => [...document.querySelectorAll('.bw-find-sign')].map((sign) => sign.dataset.sign)"


class GraphScience:
    """Gives the packaged graph, and reasons about nothing."""

    geometry = None
    names: dict[str, str] = {}  # noqa: RUF012 - nothing writes to it

    def __init__(self, graph: Graph) -> None:
        self.graph = graph


@pytest.fixture
def ask(page: Any) -> Any:
    """Type something into the search; returns the keys of the signs shown, in their order."""
    Bare(page, FindingsPanel(BenchState(science=GraphScience(load_graph()))))

    def asked(text: str) -> list[str]:
        page.locator(".bw-search").first.fill(text)
        return list(page.evaluate(SHOWN))

    return asked


@pytest.mark.parametrize(
    ("text", "first"),
    [
        ("numb", "hemihypoesthesia"),
        ("numbness", "hemihypoesthesia"),
        ("sensation", "hemihypoesthesia"),
        ("hypoesth", "hemihypoesthesia"),
        ("hypoaesth", "hemihypoesthesia"),
        ("arm", "arm_weakness"),
        ("weak arm", "arm_weakness"),
        ("hemianopia", "homonymous_hemianopia"),
        ("blind", "homonymous_hemianopia"),
        ("writing", "agraphia"),
        ("clumsy", "limb_ataxia"),
        ("naming", "anomia"),
    ],
)
def test_plain_words_find_the_sign_first(ask: Any, text: str, first: str) -> None:
    """What people type in plain words, or begin to type of the name, lists the sign that it means first."""
    assert ask(text)[0] == first


def test_face_lists_facial_weakness(ask: Any) -> None:
    """Facial weakness of the central type is among the first three for "face"."""
    assert "facial_weakness_central" in ask("face")[:3]


def test_letters_inside_a_word_do_not_count(ask: Any) -> None:
    """Pieces of words find nothing where a word begins so, and something where none does."""
    assert "loss_of_empathy" not in ask("arm")
    assert "mania" not in ask("hemianopia")
    assert "acalculia" not in ask("numb")  # "numbers", in how it is examined
    assert "prosopagnosia" in ask("opagnos")
    assert ask("(((") == []
