"""How long own anatomy takes: reading bundles, putting them in place, comparing. Prints figures; asserts none."""

from __future__ import annotations

import time
from pathlib import Path

import numpy as np
import pytest
from own_case import write_own
from ratios import note
from tract_files import invented_bundle, write_trk

from byway.knowledge.cases.own import folder_layer, laid_on
from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.space.atlas import Template
from byway.knowledge.space.own import compare_anatomies
from byway.knowledge.space.tractograms import read_tractogram

pytestmark = pytest.mark.benchmark(group="space")


def test_own_bundles(benchmark, capsys, template: Template, tmp_path: Path) -> None:
    """Two native bundles of 208 streamlines each: read, led to the template, oriented, put in place."""
    layer = folder_layer(write_own(tmp_path / "own", template, native=False))
    own, _ = benchmark.pedantic(lambda: laid_on(template, (layer,)), rounds=3, warmup_rounds=1)
    start = time.perf_counter()
    DamageIndex.build(own.geometry)
    index = time.perf_counter() - start
    start = time.perf_counter()
    assert len(compare_anatomies(template, own)) == 2
    note(benchmark, capsys, "own bundles", s=benchmark.stats.stats.min, index_s=index,
         comparison_s=time.perf_counter() - start)  # fmt: skip


@pytest.mark.parametrize("count", [1_000, 10_000])
def test_reading_streamlines(benchmark, capsys, tmp_path: Path, count: int) -> None:
    """Time a streamline must not grow with the file."""
    path = write_trk(tmp_path / "many.trk", invented_bundle(count))
    read = benchmark.pedantic(lambda: read_tractogram(path), rounds=2)
    assert np.isfinite(read.streamlines[0]).all()
    note(benchmark, capsys, f"{count} streamlines", us_a_streamline=1e6 * benchmark.stats.stats.min / count)
