"""Two rival models of repetition, laid on the curated graph as overlays, on invented cases."""

from __future__ import annotations

from pathlib import Path

import pytest
from toy_reckoning import absent, found, toy_explanation

from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.loading import load_graph
from byway.knowledge.reasoning.models import ModelComparison, compare_models

FOLDER = Path(__file__).parents[1] / "data" / "rivals"
DIRECT, INDIRECT = "direct decisive", "indirect decisive"


@pytest.fixture(scope="module")
def rivals() -> dict[str, Graph]:
    """The curated graph with each overlay on it."""
    return {DIRECT: load_graph([FOLDER / "direct.yaml"]), INDIRECT: load_graph([FOLDER / "indirect.yaml"])}


def compared(rivals: dict[str, Graph], element: str, grade: str) -> ModelComparison:
    """Both models on one nearly lost place, with repetition found at a grade and comprehension spared."""
    findings = [found("repetition_deficit", grade=grade), absent("auditory_comprehension_deficit"),
                absent("hemiparesis", "right")]  # fmt: skip
    return compare_models({
        name: toy_explanation({f"{element}@left": 0.95}, findings, graph=graph, spread=0.03)
        for name, graph in rivals.items()
    })  # fmt: skip


PLACES = {
    "anterior segment": ("arcuate_fasciculus.anterior_indirect", INDIRECT),
    "posterior segment": ("arcuate_fasciculus.posterior_indirect", INDIRECT),
    "supramarginal gyrus": ("smg_posterior", INDIRECT),
    "direct segment": ("arcuate_fasciculus.long_ventral", DIRECT),
}


@pytest.mark.parametrize("place", PLACES)
def test_a_deficit_fits_the_model_whose_route_was_cut(rivals: dict[str, Graph], place: str) -> None:
    """Repetition lost after damage of one route speaks for the model in which it decides, by more than 1.5 to 1."""
    element, expected = PLACES[place]
    result = compared(rivals, element, "moderate")
    row = result.table.set_index("sign").loc["repetition_deficit"]
    assert row["fits"] == expected
    assert row["by"] > 0.405  # log of 1.5
    assert result.words.startswith(f"The findings speak for {expected}")


@pytest.mark.parametrize("place", PLACES)
def test_a_sparing_fits_the_other(rivals: dict[str, Graph], place: str) -> None:
    """Repetition spared after the same damage speaks against that model."""
    element, expected = PLACES[place]
    row = compared(rivals, element, "absent").table.set_index("sign").loc["repetition_deficit"]
    assert row["fits"] == ({DIRECT, INDIRECT} - {expected}).pop()


def test_frontal_damage_does_not_tell_them_apart(rivals: dict[str, Graph]) -> None:
    """Both routes end in the frontal lobe: the models foresee the same."""
    result = compared(rivals, "ifg_opercularis", "moderate")
    assert result.odds(DIRECT, INDIRECT) == pytest.approx(1.0, abs=0.25)
    assert result.words == "These findings do not tell the models apart."
