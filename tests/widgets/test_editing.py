"""The kernel's half of the editing panel: edits checked, weighed, kept, undone, reviewed, sent and compared."""

from __future__ import annotations

import shutil
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from editing_case import BASE, CLAIM, QuietScience, editing_panel

from byway.knowledge.cases.case import open_case
from byway.knowledge.cases.desk import desk_for
from byway.knowledge.cases.explaining import explain
from byway.knowledge.faults import Fault
from byway.knowledge.graph.graph import graph_from
from byway.knowledge.graph.overlay_files import read_overlay
from byway.knowledge.graph.overlays import overlay_text, parse_overlay
from byway.knowledge.words import section
from byway.widgets.editing import EditingPanel
from byway.widgets.editing.forms import EDITABLE, fields_told, new_block
from byway.widgets.editing.placing import field_of
from byway.widgets.editing.sketch import course_sketch
from byway.widgets.state import BenchState
from byway.widgets.state.live import LiveScience

FIRST_CASE = Path(__file__).resolve().parents[2] / "notebooks" / "cases" / "first_case"
WAYPOINTS = [[-58.0, -38.0, 10.0], [-36.0, -24.0, 32.0], [-50.0, 4.0, 24.0]]
SEGMENT = {
    **new_block("segment"), "name": "Another way", "from": "stg_posterior", "to": "premotor_ventral", "course": "",
    "serves_in_words": "", "waypoints_mni": WAYPOINTS,
}  # fmt: skip
ENTRY = 'name: "Other ward"\nauthor: "B. Other"\ndate: 2026-11-30\n'


def say(panel: EditingPanel, kind: str, **fields: Any) -> None:
    """What the browser would say."""
    panel._heard(panel, {"kind": kind, **fields}, [])


def an_edit(action: str = "add", of: str = "claim", key: str = "bow_two", body: Any = CLAIM, **more: Any) -> Any:
    """An edit as the form sends it."""
    return {"n": 1, "action": action, "of": of, "key": key, "body": body, **more}


@pytest.fixture
def panel(tmp_path: Path) -> Iterator[EditingPanel]:
    """The panel on an invented case on the small graph."""
    made = editing_panel(tmp_path)
    yield made
    made.close()
    made.state.close()


@pytest.fixture
def overlay_file(tmp_path: Path) -> Path:
    """Where the overlay of that case lies."""
    return tmp_path / "overlays" / "a_reader.yaml"


# -- keeping and undoing ---------------------------------------------------------------------------------------------


def test_an_edit_is_kept_in_the_case(panel: EditingPanel, overlay_file: Path) -> None:
    """A kept claim stands in the author's overlay with author and date, in case.yaml's list and in the graph in use."""
    say(panel, "keep", **an_edit())
    assert panel.state.notice == ""
    overlay = read_overlay(overlay_file)
    assert (overlay.name, overlay.author) == ("Edits by A. Reader", "A. Reader")
    assert overlay.date.count("-") == 2
    assert [entry.slot for entry in overlay.entries] == [("add", "claim", "bow_two")]
    assert open_case(overlay_file.parents[1]).spec.overlays == ("overlays/a_reader.yaml",)
    assert "# invented" in (overlay_file.parents[1] / "case.yaml").read_text()
    assert panel.state.science.graph.claims["bow_two"].says == CLAIM["says"]
    assert panel.told["undo"]


def test_undo_gives_equal_bytes(panel: EditingPanel, overlay_file: Path) -> None:
    """Any claim changed, disputed or retired, and undone, leaves the file byte by byte as it was, comments and all."""
    overlay_file.parent.mkdir()
    text = 'name: Ward\nauthor: "A. Reader"\ndate: 2026-12-01\n# by hand\nchange: {signs: {weak_hand: {minutes: 3}}}\n'
    overlay_file.write_text(text)
    say(panel, "reload")
    for key in list(BASE.claims)[:12]:
        for action, body in (("change", {"grade": "strong", "note": "x"}), ("dispute", {}), ("retire", {})):
            say(panel, "keep", **an_edit(action, key=key, body=body, reason="to see"))
            assert overlay_file.read_text() != text, panel.state.notice
            say(panel, "undo")
            assert overlay_file.read_text() == text
            assert panel.state.science.graph.content_hash == panel.session.editing.graph.content_hash
    say(panel, "redo")
    assert overlay_file.read_text() != text


def test_a_draft_is_written_and_not_used(panel: EditingPanel, overlay_file: Path) -> None:
    """A claim without its source cannot be kept, can be kept as a draft, is not used, and is used once it fits."""
    broken = {**CLAIM, "sources": ["lone_2026"]}
    say(panel, "try", **an_edit(body=broken))
    assert not panel.trial["usable"]
    assert panel.trial["faults"][0]["field"] == "sources"
    say(panel, "keep", **an_edit(body=broken))
    assert "lone_2026" in panel.state.notice
    assert not overlay_file.exists()
    say(panel, "draft", **an_edit(body=broken))
    assert read_overlay(overlay_file).drafts[0].key == "bow_two"
    assert "bow_two" not in panel.state.science.graph.claims
    source = {"authors": "Lone L", "year": 2026, "container": "Own", "checked": "memory"}
    say(panel, "keep", **an_edit(of="source", key="lone_2026", body=source))
    say(panel, "use", slot=["add", "claim", "bow_two"])
    assert "bow_two" in panel.state.science.graph.claims


def test_a_file_that_changed_meanwhile_is_left_alone(panel: EditingPanel, overlay_file: Path) -> None:
    """Where somebody else has written the overlay, nothing is kept until it is read again."""
    say(panel, "keep", **an_edit())
    theirs = overlay_file.read_text().replace("weak", "moderate")
    overlay_file.write_text(theirs)
    say(panel, "keep", **an_edit("change", body={"note": "x"}))
    assert "somebody else" in panel.state.notice
    assert overlay_file.read_text() == theirs
    say(panel, "reload")
    say(panel, "keep", **an_edit("change", body={"note": "x"}))
    assert read_overlay(overlay_file).entries[0].body["grade"] == "moderate"


def test_two_authors_write_two_files(panel: EditingPanel, overlay_file: Path) -> None:
    """Another author's edits go to another file, above the first; both are in use."""
    say(panel, "keep", **an_edit())
    say(panel, "author", name="B. Other")
    say(panel, "keep", **an_edit("change", body={"grade": "strong"}))
    case = open_case(overlay_file.parents[1])
    assert case.spec.overlays == ("overlays/a_reader.yaml", "overlays/b_other.yaml")
    assert read_overlay(overlay_file).entries[0].body["grade"] == "weak"
    assert panel.state.science.graph.claims["bow_two"].grade == "strong"
    say(panel, "author", name="  ")
    assert panel.told["author"] == "B. Other"


def test_a_person_changed_keeps_the_history(panel: EditingPanel) -> None:
    """Setting the stage on the bench does not forget what can be undone; opening another case does."""
    say(panel, "keep", **an_edit())
    panel.state.set_case(panel.state.case.with_spec(stage="chronic"))
    assert panel.told["undo"]


def test_without_a_case_edits_live_in_the_panel() -> None:
    """On a bare graph edits work, are used, and are written nowhere."""
    panel = EditingPanel(BenchState(science=QuietScience(graph_from(BASE))), "A. Reader", BASE)
    say(panel, "keep", **an_edit())
    assert "bow_two" in panel.state.science.graph.claims
    assert not panel.told["folder"]
    panel.close()


# -- faults beside their fields --------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("fault", "kind", "body", "field"),
    [
        (Fault("unknown-key", "Ward k", "source 'x' is not there"), "claim", {}, "sources"),
        (Fault("unknown-key", "Ward k", "subject 'x' is not there"), "claim", {}, "subject"),
        (Fault("claim-kinds", "Ward k", "object x is a sign"), "claim", {}, "object"),
        (Fault("unknown-key", "Ward k", "region 'x' is not there"), "segment", {"from": "x"}, "from"),
        (Fault("unknown-key", "Ward k", "region 'x' is not there"), "segment", {"to": "x@other"}, "to"),
        (Fault("place-join", "Ward k", "it ends 40 mm from x@left"), "segment", {}, "to"),
        (Fault("side", "Ward k", "1 waypoints"), "segment", {}, "waypoints_mni"),
        (Fault("side", "Ward k", "a seed at x = 3"), "region", {}, "seeds_mni"),
        (Fault("load-sum", "Ward k", "loads sum to 1.2"), "function", {}, "routes"),
        (Fault("type", "Ward k: radius_mm", "'x'"), "segment", {}, "radius_mm"),
        (Fault("out-of-range", "Ward k: routes.direct.usual_load", "2"), "function", {}, "routes"),
        (Fault("duplicate", "Ward k", "adds a claim that is there"), "claim", {}, "key"),
        (Fault("spelling", "Ward k", "key 'K k'"), "claim", {}, "key"),
        (Fault("thresholds", "Ward k", "thresholds [0.1, 0.5, 0.2] for f"), "sign", {}, "depends"),
        (Fault("orphan", "Ward k", "the segment stands alone"), "segment", {}, ""),
        (Fault("load-sum", "functions/all.yaml:3 other", "loads sum to 1.2"), "function", {}, None),
    ],
)
def test_a_fault_stands_beside_its_field(fault: Fault, kind: str, body: dict[str, Any], field: str | None) -> None:
    """Every kind of fault finds its field; what speaks of the whole, or of another record, does not."""
    names = [each["name"] for each in fields_told()[kind]]
    assert field_of(fault, "k", body, names) == field


def test_missing_fields_are_told_beside_them(panel: EditingPanel) -> None:
    """An almost empty segment names every field that it lacks, at that field."""
    say(panel, "try", **an_edit(of="segment", key="bow.short", body={"name": "x"}))
    fields = {fault["field"] for fault in panel.trial["faults"]}
    assert {"from", "to", "waypoints_mni", "radius_mm", "sources"} <= fields
    say(panel, "try", **an_edit("retire", key=next(iter(BASE.claims)), body={}))
    assert [fault["field"] for fault in panel.trial["faults"]] == ["reason"]


def test_every_field_has_a_label() -> None:
    """Every field of every form, and every word to choose from, has a label; every kind has a beginning."""
    words = section("evidence", "findings", "shared", "editing")
    for kind in EDITABLE:
        assert new_block(kind)
        for field in fields_told()[kind]:
            assert f"field_{field['name']}" in words


def test_a_strange_message_changes_nothing(panel: EditingPanel, overlay_file: Path) -> None:
    """Messages that make no sense become notices; no file is written."""
    for message in (
        {"kind": "keep"}, {"kind": "keep", **an_edit("burn")}, {"kind": "open", "of": "norm", "key": "x", "n": 1},
        {"kind": "keep", **an_edit(of="../x")}, {"kind": "reject", "slot": ["add", "claim", "none"]},
        {"kind": "accept", "slot": ["add", "claim", "none"]}, {"kind": "import", "text": "[", "name": "x"},
        {"kind": "import", "text": "!!python/object:os.system {}", "name": "x"}, {"kind": "switch", "name": "none"},
        {"kind": "compare", "first": "", "second": ""}, {"kind": "model", "name": "m", "overlays": ["../../x"]},
        {"kind": "differ", "older": 99, "newer": 0}, {"kind": "sketch", "n": 1, "body": {"waypoints_mni": "x"}},
        {"kind": "look", "mm": ["x"]}, {"kind": "lay"}, {"kind": "nonsense"},
    ):  # fmt: skip
        panel._heard(panel, message, [])
    assert not overlay_file.exists()
    assert panel.told["entries"] == []


# -- review ----------------------------------------------------------------------------------------------------------


def test_difference_in_words_and_as_a_picture(panel: EditingPanel) -> None:
    """The difference between the base and now names the claim, and draws it with what it touches."""
    say(panel, "keep", **an_edit())
    say(panel, "differ", older=0, newer=len(panel.told["states"]) - 1)
    assert [change["words"] for change in panel.differing["changes"]] == [
        'claim bow_two added: "The bow serves two hands." (Edits by A. Reader)'
    ]
    nodes = {node["id"]: node["how"] for node in panel.differing["picture"]["nodes"]}
    assert nodes["claim:bow_two"] == "added"
    assert nodes["segment:bow.long"] == nodes["source:first_2001"] == "same"
    say(panel, "reject", slot=["add", "claim", "bow_two"])
    assert panel.told["entries"] == []
    assert "bow_two" not in panel.state.science.graph.claims


def test_export_can_be_read_back(panel: EditingPanel) -> None:
    """What is exported is the overlay's text; it reads back as the same overlay."""
    sent: list[Any] = []
    say(panel, "keep", **an_edit())
    panel.send = lambda content, buffers=None: sent.append(content)
    say(panel, "export")
    (file,) = (message for message in sent if message["kind"] == "file")
    assert file["name"] == "a_reader.yaml"
    assert parse_overlay(file["text"]) == panel.session.editing.overlay
    assert file["text"] == overlay_text(panel.session.editing.overlay)


def test_import_with_conflicts(panel: EditingPanel, overlay_file: Path) -> None:
    """An overlay from elsewhere is shown entry by entry, conflicts side by side; entries are accepted one by one."""
    say(panel, "keep", **an_edit("change", "sign", "weak_hand", {"minutes": 3}))
    theirs = ENTRY + "change:\n  signs:\n    weak_hand: {minutes: 4}\n    poor_echo: {minutes: 5}\n"
    say(panel, "import", text=theirs, name="other.yaml")
    (conflict,) = panel.incoming["conflicts"]
    assert (conflict["field"], conflict["first"], conflict["second"]) == ("minutes", "minutes: 3\n", "minutes: 4\n")
    say(panel, "accept_all")
    graph = panel.state.science.graph
    assert (graph.signs["poor_echo"].minutes, graph.signs["weak_hand"].minutes) == (5, 3)
    say(panel, "accept", slot=["change", "sign", "weak_hand"])
    assert panel.state.science.graph.signs["weak_hand"].minutes == 4
    assert {entry.author for entry in read_overlay(overlay_file).entries} == {"B. Other"}
    assert all(entry["accepted"] for entry in panel.incoming["entries"])
    say(panel, "undo")
    assert panel.state.science.graph.signs["weak_hand"].minutes == 3


def test_an_import_that_does_not_fit_says_why(panel: EditingPanel) -> None:
    """An entry whose source is not here cannot be accepted alone, and says so; with its source it can."""
    body = "\n".join(f"      {name}: {value!r}" for name, value in {**CLAIM, "sources": ["theirs_2020"]}.items())
    source = "    theirs_2020: {authors: X, year: 2020, container: Y, checked: memory}\n"
    say(panel, "import", text=f"{ENTRY}add:\n  sources:\n{source}  claims:\n    bow_two:\n{body}\n", name="o.yaml")
    claim = next(row for row in panel.incoming["entries"] if row["slot"][1] == "claim")
    assert not claim["fits"]
    assert "theirs_2020" in claim["why"]
    say(panel, "accept_all")
    assert "bow_two" in panel.state.science.graph.claims
    assert panel.session.editing.undo() is not None
    assert "bow_two" not in panel.session.editing.graph.claims


def test_an_import_can_be_a_layer_of_its_own(panel: EditingPanel, overlay_file: Path) -> None:
    """Laid as a layer, it becomes a file of its own below one's own edits."""
    say(panel, "keep", **an_edit())
    say(panel, "import", text=f"{ENTRY}change: {{signs: {{poor_echo: {{minutes: 5}}}}}}\n", name="other.yaml")
    say(panel, "lay")
    assert open_case(overlay_file.parents[1]).spec.overlays == ("overlays/other_ward.yaml", "overlays/a_reader.yaml")
    assert panel.state.science.graph.signs["poor_echo"].minutes == 5
    assert "bow_two" in panel.state.science.graph.claims
    assert panel.incoming == {}


# -- coverage, models ------------------------------------------------------------------------------------------------


def test_coverage_counts(panel: EditingPanel) -> None:
    """Coverage counts every claim and pathway of the graph in use, and follows an edit."""
    say(panel, "coverage")
    before = panel.coverage["counts"]["claims"]
    assert before == len(BASE.claims)
    assert len(panel.coverage["pathways"]) == len(BASE.pathways)
    say(panel, "keep", **an_edit())
    assert panel.coverage["counts"]["claims"] == before + 1


def test_models_are_named_and_switched(panel: EditingPanel, tmp_path: Path) -> None:
    """A set of overlays gets a name; switching to the base leaves the files and takes the overlays out of use."""
    say(panel, "import", text=f"{ENTRY}change: {{signs: {{poor_echo: {{minutes: 5}}}}}}\n", name="other.yaml")
    say(panel, "lay")
    say(panel, "model", name="Quick echo", overlays=["overlays/other_ward.yaml"])
    assert panel.models["models"] == [{"name": "Quick echo", "overlays": ["overlays/other_ward.yaml"]}]
    say(panel, "switch", name="")
    assert panel.state.science.graph.signs["poor_echo"].minutes == BASE.signs["poor_echo"].minutes
    assert open_case(tmp_path).spec.overlays == ()
    say(panel, "switch", name="Quick echo")
    assert panel.state.science.graph.signs["poor_echo"].minutes == 5
    assert open_case(tmp_path).spec.overlays == ("overlays/other_ward.yaml",)


# -- on the curated graph, with geometry and reasoning ---------------------------------------------------------------


@pytest.fixture(scope="module")
def live(tmp_path_factory: pytest.TempPathFactory) -> Iterator[tuple[EditingPanel, Path]]:
    """The first case on the curated graph."""
    folder = tmp_path_factory.mktemp("live") / "case"
    shutil.copytree(FIRST_CASE, folder)
    state = BenchState(open_case(folder), LiveScience(desk_for(progress=False), draws=60))
    state.settle()
    panel = EditingPanel(state, "A. Reader")
    yield panel, folder
    panel.close()
    state.close()


def test_a_segment_on_a_route_changes_the_ranking(live: tuple[EditingPanel, Path]) -> None:
    """A segment alone changes no account; a route by it does, before it is kept; undoing brings the old ones back."""
    panel, folder = live
    state = panel.state
    before = {account.key: account.posterior for account in state.explanation.accounts}
    files = {path.name: path.read_text() for path in folder.rglob("*.yaml")}
    n_elements = len(state.geometry.element_ids)

    key = "arcuate_fasciculus.another_way"
    say(panel, "try", **an_edit(of="segment", key=key, body=SEGMENT))
    assert panel.trial["usable"], panel.trial["faults"]
    panel.effects.settle()
    assert panel.effect["words"] == "The ranking stays as it is."
    assert [row["change"] for row in panel.effect["rows"]] == pytest.approx([0.0] * len(panel.effect["rows"]), abs=2e-3)
    say(panel, "keep", **an_edit(of="segment", key=key, body=SEGMENT))
    assert len(state.geometry.element_ids) == n_elements + 2
    index = state.science.index

    routes = {route.key: {"name": route.name, "usual_load": route.usual_load * 0.4, "chain": list(route.chain)}
              for route in state.science.graph.functions["repetition"].routes}  # fmt: skip
    routes["another"] = {"name": "Another", "usual_load": 0.6, "chain": ["stg_posterior", key, "premotor_ventral"]}
    edit = an_edit("change", "function", "repetition", {"routes": routes}, reason="to see")
    say(panel, "try", **edit)
    assert panel.trial["usable"], panel.trial["faults"]
    panel.effects.settle()
    assert panel.effect["stage"] == "done"
    assert max(abs(row["change"]) for row in panel.effect["rows"]) > 0.005
    assert {account.key: account.posterior for account in state.explanation.accounts} == before

    say(panel, "keep", **edit)
    assert state.science.index is index  # a route is no geometry
    state.settle()
    after = {account.key: account.posterior for account in state.explanation.accounts}
    assert after != before
    alone = explain(open_case(folder), draws=60)  # the case opened anew gives what the bench shows
    assert {account.key: account.posterior for account in alone.accounts} == pytest.approx(after)

    say(panel, "undo")
    say(panel, "undo")
    state.settle()
    assert {account.key: account.posterior for account in state.explanation.accounts} == pytest.approx(before)
    assert read_overlay(folder / "overlays" / "a_reader.yaml").entries == ()
    assert (folder / "case.yaml").read_text().startswith(files["case.yaml"].rstrip("\n"))


def test_rival_models_on_the_open_case(live: tuple[EditingPanel, Path]) -> None:
    """Two models of repetition on the first case: finding by finding, and both rankings."""
    panel, folder = live
    (folder / "overlays").mkdir(exist_ok=True)
    for path in sorted((FIRST_CASE.parent / "rival_models").glob("*.yaml")):
        shutil.copy(path, folder / "overlays" / path.name)
        say(panel, "model", name=read_overlay(path).name, overlays=[f"overlays/{path.name}"])
    names = [model["name"] for model in panel.models["models"]]
    assert len(names) == 2, panel.state.notice
    say(panel, "compare", first=names[0], second=names[1])
    told = panel.models["compared"]
    assert told["words"]
    assert {row["sign"] for row in told["findings"]} >= {"repetition_deficit", "together"}
    assert [change["key"] for change in told["changes"]] == ["repetition"]
    assert told["ranking"]


def test_the_course_in_the_hand(live: tuple[EditingPanel, Path]) -> None:
    """The sketch runs from the first waypoint to the last; asked for the line alone, it brings no streamlines."""
    geometry = live[0].state.geometry
    arrays = course_sketch({"waypoints_mni": WAYPOINTS, "from": "stg_posterior", "to": "premotor_ventral"}, geometry)
    np.testing.assert_allclose(arrays["line"][[0, -1]], np.array(WAYPOINTS)[[0, -1]], atol=1e-3)
    assert len(arrays["offsets"]) == 41
    assert arrays["offsets"][-1] == len(arrays["points"])
    assert len(course_sketch({"waypoints_mni": WAYPOINTS}, None, streamlines=0)["points"]) == 0
