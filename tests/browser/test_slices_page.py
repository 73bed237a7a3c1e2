"""The slices panel in a real browser, on a bare page: what is painted, what is said, and that both halves agree."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import nibabel as nib
import numpy as np
import pytest
from browser.bare_page import BarePage

from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.widgets.slices import SlicesPanel
from byway.widgets.state import BenchState

VIEW = "document.querySelector('#here > div').byway"


@pytest.fixture
def state() -> BenchState:
    """A small drawn lesion; the crosshair in its middle."""
    state = BenchState()
    state.edit({"op": "ellipsoid", "centre_mm": [-42, 6, 18], "radii_mm": [12, 16, 11], "compartment": 1})
    state.cursor_mm = (-44.0, 8.0, 16.0)
    return state


@pytest.fixture
def bare(page: Any, state: BenchState) -> BarePage:
    """The panel on a page, drawn."""
    bare = BarePage(page, SlicesPanel(state))
    bare.show()
    page.wait_for_function(f"{VIEW}.store.bits && {VIEW}.store.volumes.get('scan:template')")
    bare.settle(0.3)
    return bare


def bits_here(bare: BarePage) -> np.ndarray[Any, np.dtype[np.uint8]]:
    """The drawing as the browser holds it."""
    pairs = bare.page.evaluate(
        f"(() => {{ const b = {VIEW}.store.bits; const out = [];"
        "for (let i = 0; i < b.length; i++) if (b[i]) out.push(i, b[i]); return out; })()"
    )
    bits = np.zeros(TEMPLATE_GRID.size, np.uint8)
    if pairs:
        found = np.array(pairs).reshape(-1, 2)
        bits[found[:, 0]] = found[:, 1]
    return bits.reshape(TEMPLATE_GRID.shape)


def drag(bare: BarePage, plane: str, path: list[tuple[float, float]], **how: Any) -> None:
    """Drag over a film, by shares of its width and height."""
    box = bare.page.locator(f".bs-film[data-plane={plane}]").first.bounding_box()
    spots = [(box["x"] + x * box["width"], box["y"] + y * box["height"]) for x, y in path]
    bare.page.mouse.move(*spots[0])
    bare.page.mouse.down(**how)
    for spot in spots[1:]:
        bare.page.mouse.move(*spot, steps=6)
    bare.page.mouse.up(**how)


def test_paint_is_here_at_once_and_the_same_in_the_kernel(bare: BarePage, state: BenchState) -> None:
    """A stroke stands in the browser before the kernel hears of it; afterwards both hold the same voxels."""
    bare.page.keyboard.press("Tab")
    bare.page.evaluate(f"{VIEW}.look.set({{ tool: 'brush', radius: 3 }})")
    before = state.drawing.bits.copy()
    drag(bare, "axial", [(0.3, 0.4), (0.4, 0.45), (0.45, 0.6)])
    painted = bits_here(bare)
    assert (painted == 1).sum() > 50
    assert np.array_equal(state.drawing.bits, before)
    bare.pump()
    assert np.array_equal(state.drawing.bits, painted)


@pytest.mark.parametrize("plane", ["axial", "coronal", "sagittal"])
def test_every_plane_paints_where_the_pointer_is(bare: BarePage, state: BenchState, plane: str) -> None:
    """A dab on a plane changes voxels of the slice shown there only, and browser and kernel agree."""
    bare.page.evaluate(f"{VIEW}.look.set({{ tool: 'brush', radius: 2 }})")
    before = state.drawing.bits.copy()
    drag(bare, plane, [(0.42, 0.4), (0.5, 0.42)])
    bare.pump()
    axis = ["sagittal", "coronal", "axial"].index(plane)
    changed = np.argwhere(state.drawing.bits != before)
    cursor = np.rint(TEMPLATE_GRID.to_voxel(np.array([state.cursor_mm]))[0]).astype(int)
    assert len(changed)
    assert set(changed[:, axis]) == {cursor[axis]}
    assert np.array_equal(bits_here(bare), state.drawing.bits)


def test_many_strokes_while_the_kernel_is_busy(bare: BarePage, state: BenchState) -> None:
    """Strokes made while the kernel does not listen all stand, are worked in in order, and none is painted over."""
    bare.page.evaluate(f"{VIEW}.look.set({{ tool: 'brush', radius: 4 }})")
    for k in range(4):
        bare.page.evaluate(f"{VIEW}.look.set({{ tool: '{['brush', 'eraser'][k % 2]}', compartment: {k // 2} }})")
        drag(bare, "axial", [(0.3 + 0.04 * k, 0.35), (0.5, 0.55 - 0.03 * k)])
    here = bits_here(bare)
    bare.pump()
    assert np.array_equal(here, state.drawing.bits)
    assert np.array_equal(bits_here(bare), state.drawing.bits)


def test_undo_and_redo_by_key(bare: BarePage, state: BenchState) -> None:
    """Ctrl+Z takes the stroke back everywhere, Ctrl+Shift+Z makes it again."""
    before = state.drawing.bits.copy()
    bare.page.evaluate(f"{VIEW}.look.set({{ tool: 'brush', ball: true }})")
    drag(bare, "axial", [(0.35, 0.5), (0.4, 0.52)])
    bare.pump()
    after = state.drawing.bits.copy()
    bare.page.keyboard.press("Control+z")
    bare.pump()
    assert np.array_equal(state.drawing.bits, before)
    assert np.array_equal(bits_here(bare), before)
    bare.page.keyboard.press("Control+Shift+Z")
    bare.pump()
    assert np.array_equal(bits_here(bare), after)


def test_escape_takes_back_the_stroke_in_hand(bare: BarePage, state: BenchState) -> None:
    """Escape while the pointer is down leaves no trace here and sends nothing."""
    before = state.drawing.bits.copy()
    bare.page.evaluate(f"{VIEW}.look.set({{ tool: 'brush' }})")
    box = bare.page.locator(".bs-film[data-plane=axial]").bounding_box()
    bare.page.mouse.move(box["x"] + 200, box["y"] + 200)
    bare.page.mouse.down()
    bare.page.mouse.move(box["x"] + 260, box["y"] + 220, steps=5)
    bare.page.keyboard.press("Escape")
    bare.page.mouse.up()
    bare.pump()
    assert np.array_equal(bits_here(bare), before)
    assert np.array_equal(state.drawing.bits, before)


def test_a_refused_edit_gives_back_what_holds(bare: BarePage, state: BenchState) -> None:
    """Where the kernel refuses, the browser shows the kernel's drawing again, and the reason stands below."""
    bare.page.evaluate(f"{VIEW}.store.bits.fill(1)")
    bare.page.evaluate(f"{VIEW}.command({{ op: 'resize', mm: 500, compartment: 0 }})")
    bare.settle(0.3)
    assert np.array_equal(bits_here(bare), state.drawing.bits)
    assert "500" in bare.page.locator(".bs-status").inner_text()


def test_two_views_and_two_panels_stay_in_step(bare: BarePage, state: BenchState, chromium: Any) -> None:
    """A stroke in one view shows in another view of the model, and in another panel on the same state."""
    bare.show()
    assert bare.page.evaluate("document.querySelectorAll('.byway-slices').length") == 2
    other_page = chromium.new_page()
    other = BarePage(other_page, SlicesPanel(state))
    other.show()
    other_page.wait_for_function(f"{VIEW}.store.bits")
    bare.page.evaluate(f"{VIEW}.look.set({{ tool: 'brush' }})")
    drag(bare, "axial", [(0.3, 0.5), (0.4, 0.5)])
    bare.pump()
    other.settle(0.2)
    assert np.array_equal(bits_here(other), state.drawing.bits)
    assert np.array_equal(bits_here(bare), state.drawing.bits)
    seconds = bare.page.evaluate("[...document.querySelectorAll('#here > div')].map((d) => d.byway.films[0].version)")
    assert min(seconds) > 0
    other_page.close()


def test_a_missed_patch_is_made_good(bare: BarePage, state: BenchState) -> None:
    """Where a patch is lost on the way, the browser asks for the drawing again."""
    state.edit({"op": "clear", "compartment": None})
    bare.sent.clear()
    state.edit({"op": "ellipsoid", "centre_mm": [30, 0, 30], "radii_mm": [5, 5, 5], "compartment": 0})
    bare.settle(0.3)
    assert np.array_equal(bits_here(bare), state.drawing.bits)


def test_sides_are_written_on_every_plane_and_switch(bare: BarePage) -> None:
    """L and R stand on axial, coronal and projection, swap with the display, and name the sagittal plane's side."""

    def at(plane: str) -> list[str]:
        film = bare.page.locator(f".bs-film[data-plane={plane}], .bs-projection" if plane == "projection"
                                 else f".bs-film[data-plane={plane}]").last  # fmt: skip
        return [film.locator(f".bs-at-{side}").inner_text() for side in ("left", "right")]

    for plane in ("axial", "coronal", "projection"):
        assert at(plane) == ["R", "L"], plane
    assert bare.page.locator(".bs-film[data-plane=sagittal] .bs-place").inner_text().strip().endswith("L")
    bare.page.get_by_role("button", name="Radiological").click()
    bare.settle(0.3)
    for plane in ("axial", "coronal", "projection"):
        assert at(plane) == ["L", "R"], plane


def test_the_pointer_names_its_place(bare: BarePage) -> None:
    """In radiological display the left of the image is the person's right: x is positive there."""
    bare.page.evaluate(f"{VIEW}.look.set({{ tool: 'look' }})")
    box = bare.page.locator(".bs-film[data-plane=axial]").bounding_box()
    bare.page.mouse.move(box["x"] + 0.3 * box["width"], box["y"] + 0.5 * box["height"])
    bare.settle(0.2)
    text = bare.page.locator(".bs-mm").inner_text()
    x = int(text.split()[1].replace("\u2212", "-"))
    assert x > 10
    assert text.split()[5] == "16"


def test_keys_work_and_stay_in_the_panel(bare: BarePage) -> None:
    """? lists the commands with their keys; arrows move the crosshair; no key reaches the notebook around the panel."""
    bare.page.evaluate("window.leaked = []; document.addEventListener('keydown', (e) => leaked.push(e.key))")
    bare.page.locator(".bs-film[data-plane=axial]").focus()
    before = bare.panel.state.cursor_mm
    bare.page.keyboard.press("ArrowUp")
    bare.page.keyboard.press("PageUp")
    bare.settle(0.2)
    after = bare.panel.state.cursor_mm
    assert (after[1] - before[1], after[2] - before[2]) == (1, 1)
    bare.page.keyboard.press("b")
    assert bare.page.get_by_role("button", name="Brush", exact=True).get_attribute("aria-pressed") == "true"
    bare.page.keyboard.press("?")
    help_text = bare.page.get_by_role("dialog").inner_text()
    assert "Undo" in help_text
    assert "CTRL Z" in help_text.upper()
    bare.page.keyboard.press("Escape")
    assert bare.page.get_by_role("dialog").count() == 0
    assert bare.page.evaluate("leaked") == []


def test_a_dab_by_keyboard(bare: BarePage, state: BenchState) -> None:
    """Enter uses the tool at the crosshair, so that drawing needs no pointer."""
    state.edit({"op": "clear", "compartment": None})
    bare.page.locator(".bs-film[data-plane=axial]").focus()
    bare.page.keyboard.press("b")
    bare.page.keyboard.press("Enter")
    bare.pump()
    cursor = np.rint(TEMPLATE_GRID.to_voxel(np.array([state.cursor_mm]))[0]).astype(int)
    assert state.drawing.bits[tuple(cursor)] == 1


def test_polygon_drop_and_move(bare: BarePage, state: BenchState) -> None:
    """A polygon of clicks, a dropped ellipsoid and a move by handle each make one edit that both halves share."""
    state.edit({"op": "clear", "compartment": None})
    bare.page.evaluate(f"{VIEW}.look.set({{ tool: 'polygon' }})")
    box = bare.page.locator(".bs-film[data-plane=axial]").bounding_box()
    for x, y in [(0.3, 0.3), (0.5, 0.3), (0.5, 0.5), (0.3, 0.5)]:
        bare.page.mouse.click(box["x"] + x * box["width"], box["y"] + y * box["height"])
    bare.page.keyboard.press("Shift+Enter")
    bare.pump()
    assert state.drawing.history.done[-1].label == "polygon"
    assert np.array_equal(bits_here(bare), state.drawing.bits)

    bare.page.evaluate(f"{VIEW}.look.set({{ tool: 'drop', compartment: 1 }})")
    bare.page.mouse.click(box["x"] + 0.6 * box["width"], box["y"] + 0.6 * box["height"])
    bare.page.get_by_role("button", name="Lay it").first.click()
    bare.pump()
    assert state.drawing.history.done[-1].label == "ellipsoid"

    counts = state.drawing.counts()
    bare.page.evaluate(f"{VIEW}.look.set({{ tool: 'move' }})")
    drag(bare, "axial", [(0.35, 0.35), (0.38, 0.4)])
    bare.page.keyboard.press("Shift+Enter")
    bare.pump()
    assert state.drawing.history.done[-1].label == "place"
    assert state.drawing.counts() == counts
    assert np.array_equal(bits_here(bare), state.drawing.bits)


def test_compartments_are_told_apart_and_weighed(bare: BarePage, state: BenchState) -> None:
    """Name, kind, effect and volume stand beside a hatched swatch; the slider changes the effect as one step."""
    rows = bare.page.locator(".bs-compartment")
    assert rows.count() == 2
    assert "ml" in rows.nth(1).inner_text()
    slider = rows.nth(1).get_by_role("slider")
    slider.focus()
    bare.page.keyboard.press("ArrowRight")
    bare.pump()
    assert state.drawing.styles[1].effect == pytest.approx(0.35)


def test_a_file_from_the_browser(bare: BarePage, state: BenchState, tmp_path: Path) -> None:
    """A mask chosen in the browser arrives whole, in parts, and becomes the drawing; a bad file says what it is."""
    written = state.save_masks(tmp_path)
    state.edit({"op": "clear", "compartment": None})
    bare.pump()
    bare.page.get_by_text("Load a file").click()
    bare.page.locator("input[type=file]").set_input_files(tmp_path / written[0])
    bare.settle(1.0)
    assert state.drawing.counts()[0] > 1000
    bad = tmp_path / "words.nii.gz"
    bad.write_bytes(b"no image at all")
    bare.page.locator("input[type=file]").set_input_files(bad)
    bare.settle(0.6)
    assert "words.nii.gz" in bare.page.locator(".bs-status").inner_text()


def test_nothing_is_fetched(bare: BarePage) -> None:
    """The panel asks nothing of any network."""
    assert bare.page.strays == []


def test_it_looks_right_from_narrow_to_wide(bare: BarePage, artefacts: Path) -> None:
    """At 1,000 to 2,500 px nothing overflows; screenshots are kept for eyes."""
    for width in (1000, 1500, 2500):
        bare.page.set_viewport_size({"width": width, "height": 1100})
        bare.settle(0.4)
        assert bare.page.evaluate("document.documentElement.scrollWidth") <= width
        bare.page.screenshot(path=artefacts / f"slices-{width}.png", full_page=True)
    bare.page.evaluate(f"{VIEW}.look.set({{ contrast: true }})")
    bare.settle(0.2)
    bare.page.screenshot(path=artefacts / "slices-contrast.png", full_page=True)


def test_the_wheel_turns_slices_and_ctrl_zooms(bare: BarePage, state: BenchState) -> None:
    """A wheel step moves one slice; with Ctrl it zooms about the pointer and leaves the slice alone."""
    box = bare.page.locator(".bs-film[data-plane=axial]").bounding_box()
    bare.page.mouse.move(box["x"] + 200, box["y"] + 200)
    z = state.cursor_mm[2]
    bare.page.mouse.wheel(0, -100)
    bare.settle(0.2)
    assert abs(state.cursor_mm[2] - z) >= 1
    z = state.cursor_mm[2]
    zoom = bare.page.evaluate(f"{VIEW}.films[0].sight.zoom")
    bare.page.keyboard.down("Control")
    bare.page.mouse.wheel(0, -100)
    bare.page.keyboard.up("Control")
    bare.settle(0.2)
    assert bare.page.evaluate(f"{VIEW}.films[0].sight.zoom") > zoom
    assert state.cursor_mm[2] == z


def test_fingers(chromium: Any, state: BenchState) -> None:
    """On a touch screen one finger draws, two zoom and draw nothing, and buttons are large enough to hit."""
    context = chromium.new_context(viewport={"width": 1100, "height": 1000}, has_touch=True)
    page = context.new_page()
    bare = BarePage(page, SlicesPanel(state))
    bare.show()
    page.wait_for_function(f"{VIEW}.store.bits && {VIEW}.store.volumes.get('scan:template')")
    bare.settle(0.2)
    page.evaluate(f"{VIEW}.look.set({{ tool: 'brush' }})")
    box = page.locator(".bs-film[data-plane=axial]").bounding_box()
    touch = page.context.new_cdp_session(page)

    def fingers(kind: str, *spots: tuple[float, float]) -> None:
        points = [{"x": box["x"] + x, "y": box["y"] + y, "id": n} for n, (x, y) in enumerate(spots)]
        touch.send("Input.dispatchTouchEvent", {"type": kind, "touchPoints": points})

    fingers("touchStart", (150, 200))
    fingers("touchMove", (190, 220))
    fingers("touchEnd")
    bare.pump()
    assert state.drawing.history.done[-1].label == "stroke"
    steps, zoom = len(state.drawing.history.done), page.evaluate(f"{VIEW}.films[0].sight.zoom")
    fingers("touchStart", (200, 200))
    fingers("touchStart", (200, 200), (260, 260))
    fingers("touchMove", (170, 170), (300, 300))
    fingers("touchMove", (140, 140), (330, 330))
    fingers("touchEnd")
    bare.pump()
    assert page.evaluate(f"{VIEW}.films[0].sight.zoom") > 1.3 * zoom
    assert len(state.drawing.history.done) == steps
    assert np.array_equal(bits_here(bare), state.drawing.bits)
    context.close()


def test_a_large_file_is_refused_before_it_is_sent(bare: BarePage) -> None:
    """A file above the limit is refused in words without a byte sent."""
    big = "{ size: 2e9, name: 'big.nii' }"
    text = bare.page.evaluate(f"{VIEW}.store.upload({big}, 'scan', {{}}, () => 0, 'too large').catch((e) => e.message)")
    assert text == "too large"
    assert not [m for m in bare.heard if m["kind"] == "upload"]


def test_a_graded_map_shows_its_own_scale(bare: BarePage, state: BenchState, tmp_path: Path) -> None:
    """A z-map loaded with its ends lies beside the drawing, shows what its values meant, and can be taken away."""
    volume = np.zeros(TEMPLATE_GRID.shape, np.float32)
    volume[40:60, 130:150, 80:95] = -2.0
    volume[45:55, 135:145, 84:90] = -4.0
    image = nib.Nifti1Image(volume, TEMPLATE_GRID.affine)
    image.set_sform(TEMPLATE_GRID.affine, "mni")
    nib.save(image, tmp_path / "z.nii.gz")
    drawn = state.drawing.counts()
    state.load_file(tmp_path / "z.nii.gz", "graded", scale=(0, -4))
    bare.settle(0.4)
    assert state.drawing.counts() == drawn
    assert state.lesion.effect_map()[50, 140, 87] == 1.0
    bare.page.locator("summary", has_text="Overlays").click()
    assert "-4" in bare.page.locator(".bs-side").inner_text()
    bare.page.get_by_role("button", name="Remove the graded map").click()
    bare.pump()
    assert state.lesion.effect_volume is None
    assert state.undo() is not None
    assert state.lesion.effect_volume is not None
