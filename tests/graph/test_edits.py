"""Edits: tried, kept, undone; whatever is asked for, the graph in use stays valid."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from small_graph import CLAIM, SMALL
from strategies import Wish, edit_wishes

from byway.knowledge.faults import GraphError
from byway.knowledge.graph.checks import check_graph
from byway.knowledge.graph.edits import Editing, make_edit, take_over, use_draft, withdraw
from byway.knowledge.graph.files import read_curated
from byway.knowledge.graph.graph import graph_from
from byway.knowledge.graph.networks import function_networks
from byway.knowledge.graph.overlay_files import read_overlay, save_overlay
from byway.knowledge.graph.overlays import Overlay, overlay_text, parse_overlay

BASE = read_curated(SMALL)
EMPTY = Overlay("Ward", "A. Reader", "2026-12-01")


@settings(max_examples=40, deadline=None, suppress_health_check=[HealthCheck.too_slow, HealthCheck.data_too_large])
@given(st.lists(edit_wishes(graph_from(BASE)), min_size=8, max_size=8), st.randoms(use_true_random=False))
def test_random_edits_never_leave_an_invalid_graph_in_use(wishes: list[Wish], random: object) -> None:
    """320 random edits, kept, kept as drafts, refused or undone: no grave fault is ever in effect."""
    editing = Editing(BASE, EMPTY)
    for number, (action, kind, key, body, reason) in enumerate(wishes):
        try:
            edit = make_edit(editing.overlay, action, kind, key, body, reason=reason)
        except GraphError:
            continue
        before = editing.graph
        trial = editing.try_edit(edit)
        assert editing.graph is before
        if trial.usable:
            editing.keep(edit)
        else:
            with pytest.raises(GraphError):
                editing.keep(edit)
            assert editing.graph is before
            if edit.as_draft().steps:
                draft = editing.try_edit(edit.as_draft())
                if draft.usable:
                    editing.keep_draft(edit)
        if number % 3 == 2:
            editing.undo()
        assert check_graph(editing.graph).grave == []
        function_networks(editing.graph, "left")
        assert parse_overlay(overlay_text(editing.overlay)) == editing.overlay


@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(st.lists(edit_wishes(graph_from(BASE)), max_size=4), edit_wishes(graph_from(BASE)))
def test_undo_gives_equal_bytes(earlier: list[Wish], wish: Wish) -> None:
    """Whatever stands in the overlay, an edit (also as a draft) and its inverse leave its bytes as they were."""
    overlay = EMPTY
    for action, kind, key, body, reason in earlier:
        if reason:
            overlay = make_edit(overlay, action, kind, key, body, reason=reason).apply(overlay)
    action, kind, key, body, _ = wish
    edit = make_edit(overlay, action, kind, key, body, reason="x")
    for each in (edit, edit.as_draft()):
        after = each.apply(overlay)
        assert overlay_text(each.inverse.apply(after)) == overlay_text(overlay)
        assert each.inverse.inverse == each


def test_every_claim_edited_and_undone(tmp_path: Path) -> None:
    """Changing, disputing or retiring any claim and undoing leaves the file byte by byte as it was."""
    path = tmp_path / "ward.yaml"
    text = 'name: Ward\nauthor: "A. Reader"\ndate: 2026-12-01\n# by hand\nchange: {signs: {weak_hand: {minutes: 3}}}\n'
    path.write_text(text)
    for key in BASE.claims:
        editing = Editing(BASE, read_overlay(path))
        for action, body in (("change", {"grade": "strong"}), ("dispute", {}), ("retire", {})):
            edit = make_edit(editing.overlay, action, "claim", key, body, reason="x")
            editing.keep(edit)
            save_overlay(editing.overlay, path)
            assert path.read_text() != text
            assert editing.undo() == edit
            save_overlay(editing.overlay, path)
            assert path.read_text() == text


def test_undo_and_redo() -> None:
    """Redo brings back what undo took; a new edit forgets what was undone."""
    editing = Editing(BASE, EMPTY)
    editing.keep(make_edit(editing.overlay, "change", "sign", "weak_hand", {"minutes": 3}))
    editing.keep(make_edit(editing.overlay, "change", "sign", "weak_hand", {"leak": 0.01}))
    whole = editing.overlay
    editing.undo()
    assert editing.graph.signs["weak_hand"].leak == 0.02
    assert editing.graph.signs["weak_hand"].minutes == 3
    editing.redo()
    assert editing.overlay == whole
    editing.undo()
    editing.keep(make_edit(editing.overlay, "change", "sign", "poor_echo", {"minutes": 3}))
    assert editing.redo() is None
    editing.undo()
    editing.undo()
    assert editing.overlay == EMPTY
    assert editing.undo() is None


def test_changes_fold_into_what_the_overlay_added() -> None:
    """Changing an own addition rewrites it; retiring it takes it back without a trace."""
    editing = Editing(BASE, EMPTY)
    editing.keep(make_edit(editing.overlay, "add", "claim", "bow_two", CLAIM))
    editing.keep(make_edit(editing.overlay, "change", "claim", "bow_two", {"grade": "strong"}))
    assert [entry.slot for entry in editing.overlay.entries] == [("add", "claim", "bow_two")]
    assert editing.graph.claims["bow_two"].grade == "strong"
    editing.keep(make_edit(editing.overlay, "retire", "claim", "bow_two", reason="no"))
    assert editing.overlay == EMPTY


def test_trial_tells_faults_and_changes() -> None:
    """A trial names what the edit would break or leave incomplete, and what it would change, keeping nothing."""
    editing = Editing(BASE, EMPTY)
    bad = editing.try_edit(make_edit(EMPTY, "add", "claim", "bow_two", {**CLAIM, "sources": ["first_2002"]}))
    assert not bad.usable
    assert [str(fault) for fault in bad.report] == [
        "Ward bow_two: source 'first_2002' is not there; did you mean first_2001?"
    ]
    lone = {"authors": "Lone L", "year": 2026, "container": "Own", "checked": "memory"}
    incomplete = editing.try_edit(make_edit(EMPTY, "add", "source", "lone_2026", lone))
    assert incomplete.usable
    assert [fault.rule for fault in incomplete.report] == ["unused-source"]
    assert [change.words for change in incomplete.changes] == ['source lone_2026 added: "Lone L" (Ward)']
    assert editing.overlay == EMPTY


def test_drafts_wait_until_they_fit() -> None:
    """A claim whose source is missing is kept as a draft, and used once the source is there."""
    editing = Editing(BASE, EMPTY)
    edit = make_edit(editing.overlay, "add", "claim", "bow_two", {**CLAIM, "sources": ["lone_2026"]})
    editing.keep_draft(edit)
    assert "bow_two" not in editing.graph.claims
    with pytest.raises(GraphError, match="lone_2026"):
        editing.keep(use_draft(editing.overlay, ("add", "claim", "bow_two")))
    lone = {"authors": "Lone L", "year": 2026, "container": "Own", "checked": "memory"}
    editing.keep(make_edit(editing.overlay, "add", "source", "lone_2026", lone))
    editing.keep(use_draft(editing.overlay, ("add", "claim", "bow_two")))
    assert editing.graph.sources_of("bow_two")[0].authors == "Lone L"
    editing.keep(withdraw(editing.overlay, ("add", "claim", "bow_two")))
    assert "bow_two" not in editing.graph.claims


def test_edit_of_another_state_is_refused() -> None:
    """An edit made before somebody else's change says so and changes nothing."""
    editing = Editing(BASE, EMPTY)
    stale = make_edit(editing.overlay, "change", "sign", "weak_hand", {"minutes": 3})
    editing.keep(make_edit(editing.overlay, "change", "sign", "weak_hand", {"minutes": 4}))
    with pytest.raises(GraphError, match="changed meanwhile"):
        editing.keep(stale)
    assert editing.graph.signs["weak_hand"].minutes == 4


def test_author_and_date_of_an_edit() -> None:
    """Author and date stand in the entry only where they are not the overlay's own."""
    edit = make_edit(EMPTY, "dispute", "claim", "bow_exists", reason="x", author="B. Writer", date="2026-12-01")
    entry = edit.apply(EMPTY).entries[0]
    assert (entry.author, entry.date) == ("B. Writer", "")
    graph = Editing(BASE, edit.apply(EMPTY)).graph
    assert graph.disputes["claim", "bow_exists"][0].author == "B. Writer"
    assert graph.disputes["claim", "bow_exists"][0].date == "2026-12-01"


def test_entries_of_another_overlay_are_taken_one_by_one() -> None:
    """An accepted entry keeps its author and date, replaces what stood in its slot, and can be undone."""
    theirs = parse_overlay(
        "name: Lab\nauthor: C. Other\ndate: 2026-11-01\n"
        "change: {signs: {weak_hand: {minutes: 4}, poor_echo: {minutes: 4}}}\n"
    )
    editing = Editing(BASE, EMPTY)
    editing.keep(make_edit(editing.overlay, "change", "sign", "weak_hand", {"minutes": 3}))
    mine = editing.overlay
    editing.keep(take_over(editing.overlay, theirs.entries[1], theirs))
    entry = editing.overlay.entries[0]
    assert (entry.author, entry.date, entry.body) == ("C. Other", "2026-11-01", {"minutes": 4})
    assert editing.graph.signs["weak_hand"].minutes == 4
    assert editing.graph.signs["poor_echo"].minutes == 2
    editing.undo()
    assert editing.overlay == mine
