"""The drawing: edits, and undo and redo bit for bit."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import nibabel as nib
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from byway.knowledge.cases.making import new_case
from byway.knowledge.faults import BywayError
from byway.knowledge.lesion.images import read_lesion
from byway.knowledge.lesion.lesion import Compartment, Lesion
from byway.knowledge.lesion.shapes import ellipsoid_mask, sphere_mask
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.space.template import brain_mask
from byway.widgets.state import BenchState
from byway.widgets.state.casefiles import unsaved_edits
from byway.widgets.state.drawing import Drawing, drawing_of
from byway.widgets.state.edits import EDITS, apply_edit
from byway.widgets.state.scans import Scans

place = st.tuples(st.integers(-50, 50), st.integers(-80, 50), st.integers(-30, 60)).map(list)
lay = st.fixed_dictionaries({"compartment": st.integers(0, 1), "mode": st.sampled_from(["add", "cut"]),
                             "spare": st.booleans()})  # fmt: skip
strokes = st.builds(
    lambda plane, index, line, radius, ball, how: {"op": "stroke", "plane": plane, "index": index, "radius": radius,
                                                   "ball": ball, "points": [x / 16 for x in line], **how},
    st.integers(0, 2), st.integers(60, 120), st.lists(st.integers(900, 1900), min_size=4, max_size=4),
    st.integers(1, 6), st.booleans(), lay,
)  # fmt: skip
solids = st.builds(
    lambda centre, radius, how: {"op": "ellipsoid", "centre_mm": centre, "radii_mm": [radius, radius + 2, radius],
                                 **how},
    place, st.integers(2, 9), lay,
)  # fmt: skip
others = st.sampled_from([
    {"op": "resize", "mm": 2, "compartment": 0}, {"op": "resize", "mm": -1, "compartment": 1},
    {"op": "mirror", "compartment": None}, {"op": "mirror", "compartment": 1}, {"op": "clear", "compartment": 0},
    {"op": "remove_graded"},
    {"op": "compartment", "compartment": 1, "effect": 0.75, "name": "halo"},
    {"op": "add_compartment", "name": "scar", "kind": "other", "effect": 0.5},
])  # fmt: skip
moves = st.one_of(strokes, strokes, solids, others, st.sampled_from([{"op": "undo"}, {"op": "redo"}]))


@pytest.fixture(scope="module")
def scans() -> Scans:
    """The template alone."""
    return Scans()


def snapshot(drawing: Drawing) -> tuple[bytes, Any]:
    """All that undo must give back."""
    return drawing.bits.tobytes(), drawing.styles


@given(st.lists(moves, min_size=1, max_size=12))
@settings(max_examples=15, deadline=None)
def test_undo_and_redo_give_everything_back(scans: Scans, edits: list[dict[str, Any]]) -> None:
    """After any edits: undoing all gives every earlier state bit for bit, redoing all gives every later one."""
    drawing = Drawing()
    past, future = [snapshot(drawing)], []
    for edit in edits:
        depth = len(drawing.history.done)
        apply_edit(drawing, edit, scans)
        if edit["op"] == "undo":
            future += [past.pop()] if len(past) > 1 else []
        elif edit["op"] == "redo":
            past += [future.pop()] if future else []
        elif len(drawing.history.done) > depth:
            past, future = [*past, snapshot(drawing)], []
        assert snapshot(drawing) == past[-1]
        bits = drawing.bits
        assert drawing.counts() == [int(np.count_nonzero(bits & drawing.bit(c))) for c in range(len(drawing.styles))]
    while drawing.undo():
        future.append(past.pop())
        assert snapshot(drawing) == past[-1]
    while drawing.redo():
        past.append(future.pop())
        assert snapshot(drawing) == past[-1]
    assert not future


@given(st.lists(st.one_of(strokes, solids, st.just({"op": "undo"})), min_size=1, max_size=8))
@settings(max_examples=8, deadline=None)
def test_a_journal_makes_the_same_drawing(edits: list[dict[str, Any]]) -> None:
    """What the journal holds, after a trip through JSON, makes the same drawing and the same history again."""
    entries: list[dict[str, Any]] = []
    state = BenchState(journal=lambda entry: entries.append({"author": "a", **json.loads(json.dumps(entry))}))
    for edit in edits:
        state.edit(edit)
    again = BenchState()
    again.recover(entries, "a")
    assert snapshot(again.drawing) == snapshot(state.drawing)
    assert len(again.drawing.history.done) == len(state.drawing.history.done)


def test_edits_that_lean_on_a_scan_are_journalled_as_bytes() -> None:
    """Growing from a click and thresholding can be replayed where the scan is not loaded: same bytes, no scan named."""
    entries: list[dict[str, Any]] = []
    state = BenchState(journal=entries.append)
    at = np.rint(TEMPLATE_GRID.to_voxel(np.array([[-25.0, -20.0, 25.0]]))[0]).astype(int).tolist()
    state.edit({"op": "spread", "seed": at, "scan": "template", "tolerance": 8.0, "reach_mm": 12, "compartment": 0})
    state.edit({"op": "threshold", "scan": "template", "low": 100, "high": 140, "within": "sphere", "centre": at,
                "reach_mm": 10, "compartment": 1})  # fmt: skip
    assert sum(state.drawing.counts()) > 100
    assert "scan" not in json.dumps(entries)
    again = BenchState()
    assert again.recover([{"author": "a", **entry} for entry in entries], "a") == 2
    assert np.array_equal(again.drawing.bits, state.drawing.bits)


def test_only_unsaved_edits_of_the_author_come_back() -> None:
    """Edits before the last save, and those of another author, are left alone."""
    entries = [
        {"author": "a", "kind": "edit", "edit": {"op": "clear", "compartment": 0}},
        {"author": "a", "kind": "saved"},
        {"author": "b", "kind": "edit", "edit": {"op": "clear", "compartment": 1}},
        {"author": "a", "kind": "edit", "edit": {"op": "undo"}},
    ]
    assert unsaved_edits(entries, "a") == [{"op": "undo"}]


def test_a_lesion_survives_the_drawing() -> None:
    """Overlapping compartments of a loaded lesion come out as they went in, with their effects."""
    core, halo = sphere_mask((-40, 0, 20), 8), sphere_mask((-40, 0, 20), 14)
    lesion = Lesion((Compartment("core", "core", 1.0, core), Compartment("halo", "oedema", 0.3, halo)))
    out = drawing_of(lesion).lesion()
    assert [c.name for c in out.compartments] == ["core", "halo"]
    for before, after in zip(lesion.compartments, out.compartments, strict=True):
        assert np.array_equal(before.mask, after.mask)
    assert np.array_equal(lesion.effect_map(), out.effect_map())


def test_what_is_saved_comes_back(tmp_path: Path) -> None:
    """Masks and graded map written to a folder are read back bit for bit, under BIDS derivative names."""
    state = BenchState()
    state.edit({"op": "ellipsoid", "centre_mm": [-40, 0, 20], "radii_mm": [6, 9, 5], "compartment": 0})
    state.edit({"op": "ellipsoid", "centre_mm": [-30, 9, 20], "radii_mm": [6, 9, 5], "compartment": 1, "spare": True})
    names = state.save_masks(tmp_path)
    assert names == [f"space-MNI152NLin2009aSym_label-{label}_desc-drawn_mask.nii.gz" for label in ("core", "oedema")]
    for c, name in enumerate(names):
        assert np.array_equal(read_lesion(tmp_path / name).mask, state.drawing.bits & (1 << c) != 0)


def test_painting_moves_a_voxel_to_the_compartment(scans: Scans) -> None:
    """A voxel that is painted belongs to that compartment alone, unless others are spared."""
    drawing = Drawing()
    ball = {"op": "ellipsoid", "centre_mm": [-40, 0, 20], "radii_mm": [6, 6, 6]}
    apply_edit(drawing, {**ball, "compartment": 0}, scans)
    apply_edit(drawing, {**ball, "compartment": 1, "spare": True}, scans)
    assert drawing.counts()[1] == 0
    apply_edit(drawing, {**ball, "compartment": 1}, scans)
    assert drawing.counts() == [0, int(sphere_mask((-40, 0, 20), 6).sum())]


def test_fill_between_makes_an_ellipsoid_of_its_slices(scans: Scans) -> None:
    """An ellipsoid drawn on every fifth slice is filled to a Dice of at least 0.95."""
    whole = ellipsoid_mask((-35, -10, 20), (16, 22, 20))
    drawing = Drawing()
    kept = np.zeros_like(whole)
    kept[:, :, ::5] = whole[:, :, ::5]
    drawing.set("test", np.flatnonzero(kept), 1)
    apply_edit(drawing, {"op": "fill_between", "plane": 2, "compartment": 0}, scans)
    filled = drawing.bits > 0
    drawn = np.flatnonzero(kept.any((0, 1)))
    span = np.zeros_like(whole)
    span[:, :, drawn[0] : drawn[-1] + 1] = whole[:, :, drawn[0] : drawn[-1] + 1]
    dice = 2 * (filled & span).sum() / (filled.sum() + span.sum())
    assert dice >= 0.95


def test_move_and_back_is_the_identity(scans: Scans) -> None:
    """Moving by whole voxels there and back gives the drawing bit for bit."""
    drawing = Drawing()
    apply_edit(drawing, {"op": "ellipsoid", "centre_mm": [-40, 0, 20], "radii_mm": [6, 9, 5], "compartment": 0}, scans)
    before = drawing.bits.copy()
    move = {"op": "place", "scale": 1, "compartment": None}
    apply_edit(drawing, {**move, "shift": [3, -4, 5]}, scans)
    assert not np.array_equal(drawing.bits, before)
    apply_edit(drawing, {**move, "shift": [-3, 4, -5]}, scans)
    assert np.array_equal(drawing.bits, before)


def test_mirrored_twice_is_the_identity(scans: Scans) -> None:
    """A mirror is exact on the symmetric grid."""
    drawing = Drawing()
    apply_edit(drawing, {"op": "ellipsoid", "centre_mm": [-31, 4, 20], "radii_mm": [6, 9, 5], "compartment": 0}, scans)
    before = drawing.bits.copy()
    apply_edit(drawing, {"op": "mirror", "compartment": None}, scans)
    assert np.array_equal(drawing.bits, before[::-1])
    apply_edit(drawing, {"op": "mirror", "compartment": None}, scans)
    assert np.array_equal(drawing.bits, before)


def test_removing_a_compartment_moves_the_others_up(scans: Scans) -> None:
    """The voxels of later compartments stay with them."""
    drawing = Drawing()
    for c, x in enumerate((-40, -20)):
        apply_edit(
            drawing, {"op": "ellipsoid", "centre_mm": [x, 0, 20], "radii_mm": [4, 4, 4], "compartment": c}, scans
        )
    second = drawing.bits == 2
    apply_edit(drawing, {"op": "remove_compartment", "compartment": 0}, scans)
    assert [s.name for s in drawing.styles] == ["oedema"]
    assert np.array_equal(drawing.bits == 1, second)


@pytest.mark.parametrize("edit", [
    {"op": "brushh"}, {"op": "stroke"}, {"op": "resize", "mm": 99, "compartment": 0},
    {"op": "stroke", "plane": 5, "index": 0, "points": [1, 1], "radius": 2, "compartment": 0},
    {"op": "stroke", "plane": 1, "index": 0, "points": [1, 1], "radius": 2, "compartment": 7},
    {"op": "compartment", "compartment": 0, "effect": 1.5}, {"op": "fill_between", "plane": 2, "compartment": 0},
    {"op": "place", "shift": [1, 0, 0], "scale": 1, "compartment": None},
    {"op": "spread", "seed": [500, 0, 0], "scan": "template", "tolerance": 1, "reach_mm": 5, "compartment": 0},
    {"op": "threshold", "scan": "flair", "low": 0, "high": 1, "compartment": 0},
])  # fmt: skip
def test_a_bad_edit_changes_nothing(scans: Scans, edit: dict[str, Any]) -> None:
    """An edit that cannot be made raises a fault in words, and leaves voxels and history as they were."""
    drawing = Drawing()
    with pytest.raises(BywayError):
        apply_edit(drawing, edit, scans)
    assert not drawing.bits.any()
    assert not drawing.history.done


def test_every_edit_is_tested_here() -> None:
    """Each edit by name is used by a test in this file."""
    text = Path(__file__).read_text("utf-8")
    assert [name for name in EDITS if f'"{name}"' not in text and name not in ("bytes", "polygon")] == []


def test_history_stays_small() -> None:
    """A thousand strokes hold less than a megabyte of history."""
    state = BenchState()
    rng = np.random.default_rng(0)
    for _ in range(1000):
        a, b = rng.integers(60, 140, 2).tolist()
        state.edit({"op": "stroke", "plane": 2, "index": int(rng.integers(60, 110)), "points": [a, b, a + 8, b + 3],
                    "radius": 4, "compartment": int(rng.integers(0, 2))})  # fmt: skip
    assert len(state.drawing.history.done) > 900
    assert state.drawing.history.size_bytes < 1_000_000


def test_a_case_brings_its_scans(tmp_path: Path) -> None:
    """Scans named in case.yaml are loaded as backgrounds with their unit; one that is missing is told of in words."""
    image = nib.Nifti1Image(np.where(brain_mask(), 35.0, -1000.0).astype(np.float32), TEMPLATE_GRID.affine)
    image.set_sform(TEMPLATE_GRID.affine, "mni")
    nib.save(image, tmp_path / "ct.nii.gz")
    case = new_case(tmp_path / "case", stage="acute", lesion={"compartments": []})
    (tmp_path / "ct.nii.gz").rename(case.folder / "ct.nii.gz")
    scans = [{"name": "first CT", "file": "ct.nii.gz", "sequence": "ct"},
             {"name": "gone", "file": "gone.nii.gz", "sequence": "t1"}]  # fmt: skip
    state = BenchState(case.with_spec(scans=scans))
    assert [(s.name, s.unit) for s in state.scans] == [("MNI152 2009", ""), ("first CT", "HU")]
    assert state.scans["ct"].value((98, 134, 90)) == 35.0
    assert "gone.nii.gz" in state.notice
