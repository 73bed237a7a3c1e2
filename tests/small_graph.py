"""Breaking files: the small graph with one thing spoilt, and the faults that come of it."""

from __future__ import annotations

import shutil
from pathlib import Path

import yaml

from byway.knowledge.faults import Fault, GraphError
from byway.knowledge.graph.checks import check_graph
from byway.knowledge.graph.files import read_curated

__all__ = ["BREAKING", "CLAIM", "SMALL", "faults_of", "spoil"]

SMALL = Path(__file__).parent / "graph" / "fixtures" / "small"
CLAIM = {
    "says": "The bow serves two hands.",
    "subject": "bow.long",
    "relation": "serves",
    "object": "two_hands",
    "grade": "weak",
    "kind": "lesion_study",
    "population": "patients",
    "stance": "supports",
    "sources": ["first_2001"],
}
BREAKING = Path(__file__).parent / "graph" / "fixtures" / "breaking"


def spoil(recipe: Path, to: Path) -> str:
    """Copy the small graph to a folder and spoil it as a breaking file says; returns the expected message."""
    what = yaml.safe_load(recipe.read_text("utf-8"))
    shutil.rmtree(to, ignore_errors=True)
    shutil.copytree(SMALL, to)
    for edit in what.get("edits", ()):
        file = to / edit["file"]
        text = file.read_text("utf-8") if file.exists() else ""
        assert edit["find"] in text, f"{recipe.name}: nothing to replace"
        file.write_text(text.replace(edit["find"], edit["put"], 1) if edit["find"] else text + edit["put"], "utf-8")
    norms = to / "norms" / "all.yaml"
    if "pad_bytes" in what:
        norms.write_text("#" * what["pad_bytes"] + "\n" + norms.read_text("utf-8"), "utf-8")
    if what.get("latin_1"):
        norms.write_bytes("# caf\xe9\n".encode("latin-1") + norms.read_bytes())
    if what.get("empty"):
        shutil.rmtree(to)
        to.mkdir()
    return str(what["message"]).replace("{folder}", str(to))


def faults_of(recipe: Path, to: Path) -> list[Fault]:
    """All faults of the graph that a breaking file spoils."""
    spoil(recipe, to)
    try:
        return list(check_graph(read_curated(to)))
    except GraphError as error:
        return list(error.faults)
