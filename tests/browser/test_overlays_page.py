"""What can lie over the slices: the person's own bundle, a region, uncharted matter, and the chance of being hit."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from browser.bare_page import BarePage
from own_case import LONG, own_case

from byway.knowledge.cases.case import Case
from byway.knowledge.cases.explaining import desk_of
from byway.knowledge.damage.coverage import uncharted_map
from byway.knowledge.space.atlas import Template
from byway.widgets import BenchState
from byway.widgets.slices import SlicesPanel
from byway.widgets.state.live import LiveScience

VIEW = "document.querySelector('#here > div').byway"
FILMS = """() => [...document.querySelectorAll('.bs-film canvas')].map((c) => c.toDataURL()).join('')"""


@pytest.fixture(scope="module")
def case(template: Template, tmp_path_factory: pytest.TempPathFactory) -> Case:
    """The case with its own bundles."""
    return own_case(tmp_path_factory.mktemp("own") / "case", template)


@pytest.fixture
def state(case: Case) -> Iterator[BenchState]:
    """A settled state, the crosshair in the person's own long segment."""
    state = BenchState(case, LiveScience(desk_of(case, progress=False), draws=10))
    state.settle()
    line = state.science.desk.template.core_line(LONG)
    state.cursor_mm = tuple(float(v) for v in line[len(line) // 2])
    yield state
    state.close()


@pytest.fixture
def bare(page: Any, state: BenchState) -> BarePage:
    """The panel on a page, drawn, with the table of elements there."""
    bare = BarePage(page, SlicesPanel(state))
    bare.show()
    page.evaluate(f"{VIEW}.store.volume('elements')")
    bare.settle(0.5)
    page.wait_for_function(f"{VIEW}.store.bits && {VIEW}.store.volumes.get('scan:template') && {VIEW}.store.elements")
    bare.settle(0.5)
    return bare


def redrawn(bare: BarePage, change: str) -> bool:
    """Whether a change of the look changes the films."""
    before = bare.page.evaluate(FILMS)
    bare.page.evaluate(f"{VIEW}.look.set({change})")
    bare.settle(0.6)
    return bool(bare.page.evaluate(FILMS) != before)


@pytest.mark.parametrize("element", [LONG, "sma@left"])
def test_a_bundle_and_a_region_can_be_shown(bare: BarePage, state: BenchState, element: str, artefacts: Path) -> None:
    """Outlined and filled, each changes the films; the bundle's voxels are those of the person's own."""
    geometry = state.geometry
    if element in geometry.region_ids:
        voxel = geometry.parcel_voxels(geometry.region_ids.index(element))[:1]
        place = geometry.grid.to_mm(np.stack(np.unravel_index(voxel, geometry.grid.shape), axis=1))[0]
        state.cursor_mm = tuple(float(v) for v in place)
        bare.settle(0.5)
    position = geometry.index_of[element]
    assert redrawn(bare, f"{{ shown: [{{ position: {position}, fill: false }}] }}")
    assert redrawn(bare, f"{{ shown: [{{ position: {position}, fill: true }}] }}")
    bare.page.screenshot(path=artefacts / f"slices-overlay-{element.partition('@')[0]}.png")
    if element == LONG:
        own = {int(v) for line in geometry.streamlines(geometry.segment_ids.index(LONG))
               for v in geometry.grid.flat_index(line)}  # fmt: skip
        elements = state.elements
        codes = elements.codes.reshape(-1)
        held = [position in elements.members[elements.offsets[c] : elements.offsets[c + 1]]
                for c in range(len(elements.offsets) - 1)]  # fmt: skip
        assert set(np.flatnonzero(np.array(held)[codes]).tolist()) == own


def test_uncharted_matter_and_chance_can_be_shown(bare: BarePage, state: BenchState, artefacts: Path) -> None:
    """Both maps change the films; the browser holds the map that Python has, and the ensemble's chances."""
    assert redrawn(bare, "{ showUncharted: true }")
    held = bare.page.evaluate(f"{VIEW}.store.volume('uncharted').reduce((n, v) => n + (v > 0), 0)")
    assert held == int(uncharted_map(state.science.index).sum())
    assert redrawn(bare, "{ showUncharted: false, showChance: true }")
    chances = bare.page.evaluate(f"[...{VIEW}.store.chance]")
    np.testing.assert_allclose(chances, state.ensemble.hit_probability(), atol=1e-6)
    bare.page.screenshot(path=artefacts / "slices-overlay-chance.png")
