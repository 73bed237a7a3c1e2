"""Overlays read, written, laid on a base; bad ones refused with the base untouched."""

from __future__ import annotations

from pathlib import Path

import pytest
from small_graph import SMALL

from byway.knowledge.faults import GraphError
from byway.knowledge.graph.files import read_curated
from byway.knowledge.graph.graph import graph_from
from byway.knowledge.graph.layers import apply_overlays, clashes, diff
from byway.knowledge.graph.loading import graph_with, joint_faults, load_graph
from byway.knowledge.graph.overlay_files import read_overlay, save_overlay
from byway.knowledge.graph.overlays import overlay_text, parse_overlay

HEAD = "name: Ward\nauthor: A. Reader\ndate: 2026-12-01\n"
GOOD = (
    HEAD
    + """
# a comment that a reader left
add:
  sources:
    local_2026: {authors: "Local A", year: 2026, container: "Own notes", checked: read}
  claims:
    bow_serves_two_hands:
      says: "The bow serves two hands."
      subject: bow.long
      relation: serves
      object: two_hands
      grade: weak
      kind: lesion_study
      population: patients
      stance: supports
      sources: [local_2026]
change:
  signs:
    weak_hand: {minutes: 3, author: "B. Writer", date: 2026-12-02}
retire:
  claims:
    bow_exists: {reason: "nobody doubts it"}
dispute:
  claims:
    bow_long_serves_echo: {reason: "seen otherwise", sources: [local_2026]}
drafts:
  change:
    norms:
      finding_lapse: {value: 7}
"""
)


@pytest.fixture
def good(tmp_path: Path) -> Path:
    """A good overlay as a file."""
    path = tmp_path / "ward.yaml"
    path.write_text(GOOD)
    return path


def test_effect(good: Path) -> None:
    """Added, changed, retired and disputed records are in effect, with their layer; drafts are not."""
    graph = load_graph([good], folder=SMALL)
    assert graph.signs["weak_hand"].minutes == 3
    assert graph.origin("sign", "weak_hand").layer == "Ward"
    assert graph.origin("sign", "poor_echo").layer == "base"
    assert "bow_exists" not in graph.claims
    dispute = graph.disputes["claim", "bow_long_serves_echo"][0]
    assert (dispute.reason, dispute.author, dispute.date) == ("seen otherwise", "A. Reader", "2026-12-01")
    assert graph.norm("finding_lapse") == 0.05
    assert graph.layers == ("base", "Ward")


def test_base_is_untouched(good: Path) -> None:
    """Laying overlays on a base leaves every record of the base as it was."""
    base = read_curated(SMALL)
    before = list(base.every_record())
    apply_overlays(base, [read_overlay(good)])
    assert before == list(base.every_record())
    assert base.layers == ("base",)


def test_diff_in_words(good: Path) -> None:
    """Every change is told once, with its layer."""
    words = [change.words for change in diff(load_graph(folder=SMALL), load_graph([good], folder=SMALL))]
    assert words == [
        "sign weak_hand changed: minutes from 1.0 to 3.0 (Ward)",
        "claim bow_long_serves_echo disputed by A. Reader: seen otherwise (Ward)",
        'claim bow_serves_two_hands added: "The bow serves two hands." (Ward)',
        'claim bow_exists retired: "The bow is a bundle.", nobody doubts it (Ward)',
        'source local_2026 added: "Local A" (Ward)',
    ]
    back = {change.action for change in diff(load_graph([good], folder=SMALL), load_graph(folder=SMALL))}
    assert back == {"added", "changed", "retired", "undisputed"}


def test_written_text_reads_back_equal(good: Path) -> None:
    """Writing and reading is the identity, and writing twice gives equal bytes."""
    overlay = read_overlay(good)
    text = overlay_text(overlay)
    again = parse_overlay(text)
    assert again == overlay
    assert overlay_text(again) == text
    assert (
        graph_from(apply_overlays(read_curated(SMALL), [again])).content_hash
        == load_graph([good], folder=SMALL).content_hash
    )


def test_unchanged_overlay_keeps_its_bytes(good: Path) -> None:
    """Saving what was read leaves the file as it stood, comments and all."""
    save_overlay(read_overlay(good), good)
    assert good.read_text() == GOOD


def test_folder_round_trip(good: Path, tmp_path: Path) -> None:
    """As a folder, every entry gets a file; a removed entry takes its file along, and nothing else is rewritten."""
    folder = tmp_path / "ward"
    overlay = read_overlay(good)
    save_overlay(overlay, folder)
    names = sorted(path.relative_to(folder).as_posix() for path in folder.rglob("*.yaml"))
    assert names == [
        "claims/bow_exists.retire.yaml",
        "claims/bow_long_serves_echo.dispute.yaml",
        "claims/bow_serves_two_hands.add.yaml",
        "norms/finding_lapse.change.yaml",
        "overlay.yaml",
        "signs/weak_hand.change.yaml",
        "sources/local_2026.add.yaml",
    ]
    read = read_overlay(folder)
    assert read == overlay
    sign = folder / "signs/weak_hand.change.yaml"
    sign.write_text("# kept\n" + sign.read_text())
    read = read_overlay(folder)
    save_overlay(read.with_entry(("retire", "claim", "bow_exists"), None), folder)
    assert not (folder / "claims/bow_exists.retire.yaml").exists()
    assert sign.read_text().startswith("# kept\n")


BAD = {
    "dangling key": ("dispute: {claims: {bow_exsts: {reason: x}}}", "did you mean bow_exists"),
    "dangling source": ("change: {claims: {bow_exists: {sources: [nobody]}}}", "source 'nobody' is not there"),
    "cycle": (
        "change: {functions: {echo: {routes: {a: {name: A, usual_load: 0.5, chain: [speech_back, bow.long, "
        "speech_front]}, b: {name: B, usual_load: 0.5, chain: [speech_front, bow.long, speech_back]}}}}}",
        "routes form a cycle",
    ),
    "duplicate": (
        "add: {sources: {first_2001: {authors: A, year: 2001, container: B, checked: read}}}",
        "ward.yaml:4 first_2001: adds a source that is there",
    ),
    "probability above 1": ("change: {norms: {finding_lapse: {value: 1.2}}}", r"within \[0, 1\]"),
    "weight below 0": (
        "change: {signs: {weak_hand: {depends: [{function: hand_movement, weight: -0.1}]}}}",
        "depends.0.weight: -0.1; expected greater than or equal to 0",
    ),
    "not finite": ("change: {norms: {perilesional_rim_mm: {value: .nan}}}", "finite number"),
    "tag": ("retire: !!python/object/apply:os.system ['true']", "a tag"),
    "anchor": ("retire: &a {}\ndispute: *a", "an anchor or alias"),
    "list": ("- a", "did not find expected"),
    "unknown action": ("ad: {}", "did you mean add"),
    "unknown kind": ("add: {sign: {}}", "did you mean signs"),
    "no reason": ("retire: {claims: {bow_exists: {}}}", "a retire without a reason"),
    "field of another kind": ("change: {claims: {bow_exists: {minutes: 3}}}", "field 'minutes' is not known here"),
    "retired while in use": (
        "retire: {functions: {echo: {reason: x}}}",
        "function 'echo' is not there; Ward retired it: x",
    ),
    "loads": (
        "change: {functions: {balance: {routes: {only: {name: W, usual_load: 0.4, chain: [worm]}}}}}",
        "usual loads sum to 0.4",
    ),
    "draft date": ("retire: {claims: {bow_exists: {reason: x, date: yesterday}}}", "a date such as"),
    "empty change": ("change: {claims: {bow_exists: {}}}", "nothing to change"),
    "pathway with segments": ("change: {pathways: {bow: {segments: {}}}}", "segments inside a pathway"),
    "twice": ("retire: {claims: {bow_exists: {reason: x}, bow_exists: {reason: y}}}", "a key that stands twice"),
}


@pytest.mark.parametrize("name", BAD)
def test_bad_overlay_is_refused(name: str, tmp_path: Path) -> None:
    """A clear error, and the base is as it was."""
    text, message = BAD[name]
    path = tmp_path / "ward.yaml"
    path.write_text(HEAD + text + "\n")
    base = read_curated(SMALL)
    before = graph_from(base).content_hash
    with pytest.raises(GraphError, match=message):
        graph_with(base, [read_overlay(path)])
    assert graph_from(base).content_hash == before == load_graph(folder=SMALL).content_hash


def test_large_file_is_refused_before_it_is_read(tmp_path: Path) -> None:
    """50 MB are no text that somebody reviewed."""
    path = tmp_path / "ward.yaml"
    with path.open("w") as file:
        file.write(HEAD)
        file.writelines("# padding padding padding padding padding\n" for _ in range(1_250_000))
    with pytest.raises(GraphError, match="expected at most 5,000,000"):
        read_overlay(path)


def test_deep_nesting_is_refused(tmp_path: Path) -> None:
    """Brackets by the hundred thousand give an error, no crash."""
    path = tmp_path / "ward.yaml"
    path.write_text(HEAD + "add: " + "[" * 100_000)
    with pytest.raises(GraphError):
        read_overlay(path)


def test_missing_and_headless_overlays(tmp_path: Path) -> None:
    """A path that leads nowhere, and a folder without its header, are errors that name the path."""
    with pytest.raises(GraphError, match=r"none\.yaml"):
        read_overlay(tmp_path / "none.yaml")
    with pytest.raises(GraphError, match=r"no overlay\.yaml"):
        read_overlay(tmp_path)


def test_two_layers_of_one_name(good: Path) -> None:
    """Layers are told apart by their names."""
    with pytest.raises(GraphError, match="two layers of this name"):
        load_graph([good, parse_overlay(HEAD)], folder=SMALL)


def test_conflicts_are_listed() -> None:
    """Different values of one field, and a change of what the other retires; disputes stand together."""
    first = parse_overlay(
        HEAD + "change: {signs: {weak_hand: {minutes: 3, specificity: 0.9}, poor_echo: {minutes: 1}}}\n"
        "dispute: {claims: {bow_exists: {reason: x}}}\n"
    )
    second = parse_overlay(
        HEAD.replace("Ward", "Lab") + "change: {signs: {weak_hand: {minutes: 4, specificity: 0.9}}}\n"
        "retire: {signs: {poor_echo: {reason: y}}}\ndispute: {claims: {bow_exists: {reason: z}}}\n"
    )
    assert [each.words for each in clashes(first, second)] == [
        "sign poor_echo: Lab retires what Ward changes",
        "sign weak_hand: minutes is 3 in Ward and 4 in Lab",
    ]


def test_new_segment_joins_its_pathway() -> None:
    """A segment added by an overlay is listed by its pathway, and the diff tells it once."""
    block = (
        'add: {segments: {bow.short: {name: "Short part", sides: paired, from: speech_back, to: speech_front, '
        "course: x, waypoints_mni: [[-58, -38, 8], [-40, -20, 20], [-48, 10, 14]], radius_mm: 2, variability: high, "
        "studied: hardly, crossing: none, fit: drawn, serves_in_words: x, sources: [first_2001]}}}\n"
    )
    graph = load_graph([parse_overlay(HEAD + block)], folder=SMALL)
    assert graph.pathways["bow"].segments == ("bow.long", "bow.short")
    words = [change.words for change in diff(load_graph(folder=SMALL), graph)]
    assert words == ['segment bow.short added: "Short part" (Ward)']


def test_overlays_that_fit_apart_and_not_together() -> None:
    """One retires the function that the other's sign depends on: told as the fault that both together have."""
    base = read_curated(SMALL)
    cut = parse_overlay(
        HEAD + "retire: {functions: {balance: {reason: x}}, signs: {unsteady: {reason: x}},"
        " claims: {worm_serves_balance: {reason: x}, balance_shows_as_unsteady: {reason: x}}}\n"
    )
    lean = parse_overlay(
        HEAD.replace("Ward", "Lab")
        + "change: {signs: {clumsy_pair: {depends: [{function: two_hands}, {function: balance}]}}}\n"
    )
    faults = joint_faults(base, cut, lean)
    assert [fault.rule for fault in faults] == ["unknown-key"]
    assert "function 'balance' is not there" in str(faults.faults[0])
    assert len(joint_faults(base, lean, parse_overlay(HEAD))) == 0
