"""The team's panel: what it sends, and what it does with what it hears."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest
from toy_explanation import TOY_FINDINGS, toy_explanation
from toy_graph import toy_graph

from byway.knowledge.cases.case import open_case
from byway.knowledge.cases.files import write_case
from byway.knowledge.cases.model import CaseFile
from byway.knowledge.cases.pages import Note, OwnAccount, Pages, Standing
from byway.widgets.notes import NotesPanel
from byway.widgets.state import BenchState
from byway.widgets.state.following import Following
from byway.widgets.state.science import NoScience


class ToyScience(NoScience):
    """Knows the toy graph."""

    def __init__(self) -> None:
        self.graph = toy_graph()


@pytest.fixture
def state(tmp_path: Path) -> BenchState:
    """An explained toy case in a folder, with AB before it."""
    write_case(tmp_path / "case.yaml", CaseFile(stage="acute"), None)
    state = BenchState(open_case(tmp_path), ToyScience())
    state.findings = TOY_FINDINGS
    state.explanation = toy_explanation()
    state.author = "AB"
    return state


def say(panel: NotesPanel, kind: str, **fields: Any) -> None:
    """Say something to the panel, as the browser does."""
    panel._heard(panel, {"kind": kind, **fields}, [])


def notes(panel: NotesPanel) -> list[dict[str, Any]]:
    """The notes shown."""
    return list(panel.told["notes"])


def test_a_note_is_written_where_it_points(state: BenchState) -> None:
    """A note about the crosshair keeps its place in mm; author, tags and mentions are told."""
    panel = NotesPanel(state)
    state.cursor_mm = (-36.0, -31.0, 27.0)
    say(panel, "write", text="**edge?** @CD", anchor={"kind": "voxel"}, tags=["edge", " ", "edge"])
    (note,) = notes(panel)
    assert (note["author"], note["tags"], note["mentions"]) == ("AB", ["edge"], ["CD"])
    assert note["anchor"]["mm"] == [-36.0, -31.0, 27.0]
    assert note["html"] == "<p><strong>edge?</strong> @CD</p>\n"


def test_threads_edits_and_settling(state: BenchState) -> None:
    """An answer stands below; an edit replaces; settling marks the whole line, and can be taken back."""
    panel = NotesPanel(state)
    say(panel, "write", text="one")
    first = notes(panel)[0]["id"]
    say(panel, "write", text="answer", reply_to=first)
    say(panel, "write", text="one, better", replaces=first)
    assert [(note["depth"], note["text"]) for note in notes(panel)] == [(0, "one, better"), (1, "answer")]
    say(panel, "settle", note=notes(panel)[0]["first"], settled=True)
    assert [note["settled"] for note in notes(panel)] == [True, False]
    say(panel, "settle", note=notes(panel)[0]["first"], settled=False)
    assert not notes(panel)[0]["settled"]


def test_nobody_writes_without_a_name(state: BenchState) -> None:
    """Without initials nothing is written, and the user is told why."""
    panel = NotesPanel(state)
    say(panel, "author", name=" ")
    say(panel, "write", text="one")
    assert notes(panel) == []
    assert "initials" in state.notice


@pytest.mark.parametrize("bad", [{"text": ""}, {"text": "x", "anchor": {"kind": "planet"}}, {"text": "x" * 60_000}, {}])
def test_a_bad_message_writes_nothing(state: BenchState, bad: dict[str, Any]) -> None:
    """An empty text, an unknown anchor, a text without end: a notice, and no file."""
    panel = NotesPanel(state)
    say(panel, "write", **bad)
    assert notes(panel) == []
    assert state.notice


def test_standing_beside_the_posterior(state: BenchState) -> None:
    """What two people hold stands with the account's own posterior, and where they differ is marked."""
    panel = NotesPanel(state)
    key = state.explanation.accounts[0].key
    say(panel, "stand", account=key, stands="held", reason="fits")
    Pages(state.case.folder).put(Standing(author="CD", account=key, stands="ruled_out"))
    state.pages_seq += 1
    row = panel.told["standing"][0]
    assert (row["account"], row["posterior"]) == (key, state.explanation.accounts[0].posterior)
    assert row["differ"]
    assert row["held"][0]["reason"] == "fits"
    say(panel, "stand", account=key, stands="maybe")
    assert len(panel.told["standing"][0]["held"]) == 1


@pytest.mark.parametrize(
    ("anchor", "seen"),
    [
        ({"kind": "voxel", "mm": [1.0, 2.0, 3.0]}, ("cursor_mm", (1.0, 2.0, 3.0))),
        ({"kind": "segment", "key": "arc.long@left"}, ("selected", "arc.long@left")),
        ({"kind": "region", "key": "parietal@left"}, ("selected", "parietal@left")),
        ({"kind": "sign", "key": "repetition_loss@none"}, ("place", "repetition_loss")),
    ],
)
def test_an_anchor_opens(state: BenchState, anchor: dict[str, Any], seen: tuple[str, Any]) -> None:
    """A voxel moves the crosshair, an element is pointed out, a sign is asked for in the graph."""
    panel = NotesPanel(state)
    say(panel, "open", anchor=anchor)
    assert getattr(state, seen[0]) == seen[1]


def test_a_claim_opens_at_its_subject(state: BenchState) -> None:
    """The graph has places, not claims: a claim opens where it speaks of."""
    claim = next(iter(state.science.graph.claims.values()))
    panel = NotesPanel(state)
    say(panel, "write", text="doubtful", anchor={"kind": "claim", "key": claim.key})
    assert notes(panel)[0]["anchor"]["label"] == claim.says
    say(panel, "open", anchor=notes(panel)[0]["anchor"])
    assert state.place == claim.subject


def test_everything_offered_can_be_anchored_to(state: BenchState) -> None:
    """Each place offered makes a note whose label is the one offered."""
    panel = NotesPanel(state)
    assert {place[0] for place in panel.places} == {"account", "region", "segment", "sign", "claim"}
    for kind, key, label in panel.places[::5]:
        say(panel, "write", text="x", anchor={"kind": kind, "key": key})
        assert notes(panel)[-1]["anchor"]["label"] == label


def test_rivals_are_offered_and_one_is_kept(state: BenchState) -> None:
    """Two versions of one own account written at once stand side by side until one is kept."""
    pages = Pages(state.case.folder)
    first = OwnAccount(author="AB", title="one")
    for page in (first, OwnAccount(author="AB", title="left", replaces=first.id),
                 OwnAccount(author="CD", title="right", replaces=first.id)):  # fmt: skip
        pages.put(page)
    panel = NotesPanel(state)
    (group,) = panel.told["rivals"]
    assert {version["author"] for version in group} == {"AB", "CD"}
    say(panel, "keep", page=group[1]["id"])
    assert panel.told["rivals"] == []
    assert len(pages.current("account")) == 1


def test_versions_of_the_case_are_offered_and_one_is_kept(state: BenchState) -> None:
    """What lies beside case.yaml is shown field by field; keeping it makes it the case."""
    following = Following(state)
    other = state.case.with_spec(stage="chronic")
    with pytest.raises(Exception, match="yours is kept"):
        write_case(state.case.path, other.spec, "not seen")
    following.poll()
    panel = NotesPanel(state)
    (version,) = panel.told["versions"]
    assert version["rows"] == [{"field": "stage", "one": "acute", "other": "chronic"}]
    say(panel, "version", name=version["name"], keep="beside")
    assert panel.told["versions"] == []
    assert state.case.spec.stage == "chronic"
    state.close()


def test_a_broken_page_is_named(state: BenchState) -> None:
    """A file that cannot be read is told, and the others are shown."""
    Pages(state.case.folder).put(Note(author="AB", text="whole"))
    (state.case.folder / "notes" / "zzz.note.json").write_text("{")
    panel = NotesPanel(state)
    assert len(notes(panel)) == 1
    assert "zzz.note.json" in panel.told["unreadable"][0]


def test_without_a_folder_it_says_so() -> None:
    """On an explanation, and on an empty state, there is nothing to write to."""
    for source in (toy_explanation(), BenchState()):
        panel = NotesPanel(source)
        assert panel.told == {"folder": False}
        say(panel, "write", text="x")
        panel.close()


def test_what_is_sent_is_plain_json(state: BenchState) -> None:
    """Every trait is JSON without NaN, also where an account that somebody spoke of arises no more."""
    Pages(state.case.folder).put(Standing(author="AB", account="gone", stands="held"))
    panel = NotesPanel(state)
    for name in ("told", "places", "here", "course", "words"):
        json.dumps(getattr(panel, name), allow_nan=False)
    assert panel.told["standing"][-1]["posterior"] is None
