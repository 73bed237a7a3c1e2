"""An invented case that brings its own bundles: the template's streamlines, jittered and moved, in a native space."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from tract_files import write_tck, write_trk

from byway.knowledge.cases.case import Case, open_case
from byway.knowledge.space.atlas import Template

__all__ = ["LONG", "MIDDLE", "SHIFT_MM", "TO_TEMPLATE", "jittered", "own_case", "write_own"]

LONG = "arcuate_fasciculus.long_ventral@left"
MIDDLE = "slf_2.middle@left"
SHIFT_MM = {LONG: (0.0, 0.0, 8.0), MIDDLE: (0.0, 0.0, 0.0)}
"""How far each of the invented person's bundles lies from the template's."""

_TURN = np.deg2rad(12)
TO_TEMPLATE = np.array([
    [1.05 * np.cos(_TURN), -np.sin(_TURN), 0, 7.0],
    [np.sin(_TURN), 1.05 * np.cos(_TURN), 0, -11.0],
    [0, 0, 0.95, 14.0],
    [0, 0, 0, 1],
])  # fmt: skip
"""Native mm to template mm: a turn, a scale and a shift."""


def jittered(template: Template, element: str, shift_mm: tuple[float, float, float], seed: int = 0) -> list[np.ndarray]:
    """Template streamlines, each moved by the shift and by 1 mm at random; every third runs backwards."""
    rng = np.random.default_rng(seed)
    lines = template.geometry.streamlines(template.geometry.segment_ids.index(element))
    moved = [line + np.float32(shift_mm) + rng.normal(0, 1, 3).astype(np.float32) for line in lines]
    return [line[::-1] if i % 3 == 0 else line for i, line in enumerate(moved)]


def write_own(folder: Path, template: Template, *, native: bool = True) -> Path:
    """A folder of own anatomy: one TRK, one TCK, mapping.csv, and to_template.txt where the bundles are native."""
    folder.mkdir(parents=True)
    back = np.linalg.inv(TO_TEMPLATE) if native else np.eye(4)
    for number, (element, shift) in enumerate(SHIFT_MM.items()):
        lines = [(line @ back[:3, :3].T + back[:3, 3]).astype(np.float32)
                 for line in jittered(template, element, shift, seed=number)]  # fmt: skip
        (write_trk if number == 0 else write_tck)(folder / ("long.trk" if number == 0 else "middle.tck"), lines)
    (folder / "mapping.csv").write_text(f"element,file\n{LONG},long.trk\n{MIDDLE},middle.tck\n")
    if native:
        np.savetxt(folder / "to_template.txt", TO_TEMPLATE)
    return folder


CASE = """schema_version: 1
title: Invented case with its own bundles
invented: true
stage: subacute
cause: infarct
person: {{handedness: right}}
lesion:
  compartments:
  - name: core
    kind: core
    effect: 1.0
    shapes: [{{shape: sphere, centre_mm: [{x:.0f}, {y:.0f}, {z:.0f}], radii_mm: [7]}}]
findings:
- {{sign: repetition_deficit, side: none, grade: moderate}}
anatomy:
- {{name: P-07, kind: bundles, folder: anatomy, affine: to_template.txt}}
"""


def own_case(folder: Path, template: Template) -> Case:
    """A case folder with a small lesion on the template's long segment, which this person's bundle runs above."""
    folder.mkdir(parents=True)
    write_own(folder / "anatomy", template)
    line = template.core_lines[LONG]
    x, y, z = line[len(line) // 2]
    (folder / "case.yaml").write_text(CASE.format(x=x, y=y, z=z))
    return open_case(folder)
