"""The kernel's half of the slices panel, without a browser."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from toy_space import toy_geometry

from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.damage.point import point_damage
from byway.knowledge.faults import BywayError
from byway.knowledge.lesion.lesion import Lesion
from byway.widgets.slices import SlicesPanel
from byway.widgets.slices.uploads import Uploads
from byway.widgets.state import BenchState
from byway.widgets.state.elements import ElementMap
from byway.widgets.state.science import NoScience
from byway.widgets.wire import receive


class ToyScience(NoScience):
    """Damage on an invented geometry; no reasoning."""

    def __init__(self) -> None:
        self.geometry = toy_geometry()
        self.index = DamageIndex.build(self.geometry)

    def damage(self, lesion: Lesion) -> Any:
        """Point damage."""
        return point_damage(lesion, self.index)


class Heard(list[tuple[dict[str, Any], list[Any]]]):
    """Messages of a panel, by kind."""

    def of(self, kind: str) -> list[tuple[dict[str, Any], list[Any]]]:
        """Those of one kind."""
        return [(m, b) for m, b in self if m["kind"] == kind]


@pytest.fixture(scope="module")
def science() -> ToyScience:
    """Built once."""
    return ToyScience()


@pytest.fixture
def panel(science: ToyScience) -> SlicesPanel:
    """A panel on an empty drawing."""
    return SlicesPanel(BenchState(science=science))


@pytest.fixture
def heard(panel: SlicesPanel, monkeypatch: pytest.MonkeyPatch) -> Heard:
    """What the panel sends."""
    heard = Heard()
    monkeypatch.setattr(panel, "send", lambda message, buffers=None: heard.append((message, buffers or [])))
    return heard


STROKE = {"op": "stroke", "plane": 2, "index": 90, "points": [60, 120, 70, 125], "radius": 4, "compartment": 0}


def say(panel: SlicesPanel, kind: str, buffers: list[Any] | None = None, **fields: Any) -> None:
    """A message from the browser."""
    panel._heard(panel, {"kind": kind, **fields}, buffers or [])


def test_a_stroke_is_answered_by_its_patch_and_the_shares(panel: SlicesPanel, heard: Heard) -> None:
    """One patch with the changed box, the sender and the next revision; then the shares of all elements."""
    before = panel.revision
    say(panel, "edit", edit=STROKE, origin={"view": "x", "n": 7})
    assert [m["kind"] for m, _ in heard] == ["patch", "shares"]
    message, buffers = heard.of("patch")[0]
    assert (message["revision"], message["origin"]) == (before + 1, {"view": "x", "n": 7})
    i0, i1, j0, j1, k0, k1 = message["box"]
    assert np.array_equal(receive(message, buffers)["bits"], panel.state.drawing.bits[i0:i1, j0:j1, k0:k1])
    assert (k0, k1) == (90, 91)
    assert message["ml"][0] == pytest.approx(panel.state.drawing.counts()[0] / 1000)


def test_a_refused_edit_gives_back_the_drawing(panel: SlicesPanel, heard: Heard) -> None:
    """A stroke that cannot be made changes nothing; the browser gets what holds, and the reason in words."""
    say(panel, "edit", edit={**STROKE, "radius": 900}, origin={"view": "x", "n": 1})
    assert [m["kind"] for m, _ in heard] == ["volume", "fault"]
    assert "900" in heard.of("fault")[0][0]["text"]
    assert not panel.state.drawing.bits.any()


def test_nothing_to_undo_is_said(panel: SlicesPanel, heard: Heard) -> None:
    """An undo at the start is answered, and is no fault."""
    say(panel, "edit", edit={"op": "undo"}, origin={"view": "x", "n": 1})
    assert [(m["kind"], m["op"]) for m, _ in heard] == [("nothing", "undo")]


def test_two_panels_hear_of_one_stroke(panel: SlicesPanel, heard: Heard) -> None:
    """A stroke in one panel is patched into the other, on the same state."""
    other = SlicesPanel(panel.state)
    say(other, "edit", edit=STROKE, origin={"view": "y", "n": 1})
    assert len(heard.of("patch")) == 1
    other.close()


def test_a_closed_panel_hears_nothing(panel: SlicesPanel, heard: Heard) -> None:
    """After closing, the state no longer calls the panel."""
    panel.close()
    panel.state.edit(STROKE)
    assert heard == []


def test_volumes_by_name(panel: SlicesPanel, heard: Heard) -> None:
    """The template, the drawing and the elements come when wanted; what is not known is said to be absent."""
    for name in ("scan:template", "bits", "elements", "uncharted", "graded"):
        say(panel, "want", volume=name)
    assert [m["kind"] for m, _ in heard] == ["volume", "volume", "elements", "absent", "absent"]
    message, buffers = heard.of("volume")[0]
    assert receive(message, buffers)["data"].shape == (197, 233, 189)


def test_the_element_map_agrees_with_the_index(science: ToyScience) -> None:
    """At every voxel that holds something, the code stands for exactly the elements that the index has there."""
    index = science.index
    elements = ElementMap.build(index)
    rng = np.random.default_rng(0)
    for row in rng.integers(0, len(index.voxel_of_row), 300):
        expected = {int(m) for table in (index.regions, index.segments)
                    for m in table.members[table.offsets[row] : table.offsets[row + 1]]}  # fmt: skip
        voxel = np.unravel_index(int(index.voxel_of_row[row]), elements.codes.shape)
        assert set(elements.at((int(voxel[0]), int(voxel[1]), int(voxel[2])))) == expected
    assert np.count_nonzero(elements.codes) == len(index.voxel_of_row)


def test_an_upload_comes_in_parts() -> None:
    """Parts in turn make one file under a harmless name, which is gone after its use."""
    uploads = Uploads()
    head = {"upload": "a", "name": "../../evil name.nii.gz", "parts": 2, "size": 6}
    assert uploads.add({**head, "part": 0}, [b"abc"]) is None
    lent = uploads.add({**head, "part": 1}, [memoryview(b"def")])
    assert lent is not None
    with lent as path:
        assert path.name == "evil_name.nii.gz"
        assert path.read_bytes() == b"abcdef"
    assert not path.exists()


def test_an_upload_out_of_turn_or_too_large_is_refused() -> None:
    """A part that is missing, or a size beyond the limit, is refused in words."""
    uploads = Uploads()
    head = {"upload": "a", "name": "x.nii", "parts": 3, "size": 6}
    uploads.add({**head, "part": 0}, [b"abc"])
    with pytest.raises(BywayError, match="out of turn"):
        uploads.add({**head, "part": 2}, [b"abc"])
    with pytest.raises(BywayError, match="GB"):
        uploads.add({**head, "part": 0, "size": 2e9}, [b"abc"])
