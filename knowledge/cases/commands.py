"""What each command of the command line does; every function prints its result and returns an exit code."""

from __future__ import annotations

import os
import subprocess
import sys
import webbrowser
from collections.abc import Sequence
from importlib.metadata import PackageNotFoundError
from importlib.metadata import version as installed_version
from pathlib import Path

import pandas as pd

from byway.knowledge.atomic import write_text
from byway.knowledge.cases.archive import pack_case, unpack_case
from byway.knowledge.cases.atlas import write_atlas
from byway.knowledge.cases.case import open_case
from byway.knowledge.cases.desk import desk_for
from byway.knowledge.cases.explaining import damage_of, explain
from byway.knowledge.cases.making import new_case
from byway.knowledge.cases.privacy import identifying_traces, traces_table
from byway.knowledge.cases.report import write_report
from byway.knowledge.cases.wording import explanation_text
from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.graph import commands as graph_commands
from byway.knowledge.lesion.images import read_lesion
from byway.knowledge.words import word

__all__ = [
    "archive_pack",
    "archive_unpack",
    "damage_of_mask",
    "explain_case",
    "graph_atlas",
    "graph_check",
    "graph_diff",
    "graph_export",
    "graph_table",
    "new_from_mask",
    "open_notebook",
    "version",
]

NOTEBOOKS = Path(__file__).resolve().parents[2] / "notebooks"


def version() -> str:
    """The installed version, for ``--version``."""
    try:
        return f"byway {installed_version('byway')}"
    except PackageNotFoundError:
        return "byway (not installed)"


def _say(text: str) -> None:
    print(text, file=sys.stderr)


def open_notebook(notebook: Path | None, *, browser: bool) -> int:
    """Build the geometry if it is not there, then run JupyterLab on a notebook, on loopback with its usual token."""
    path = notebook or NOTEBOOKS / "first_case.ipynb"
    if not path.is_file():
        where = "the name of a notebook" if notebook else word("command.no_notebook")
        raise BywayError(Fault("no-notebook", str(path), "no such notebook", where, "name one"))
    desk_for()
    shown = browser and _has_browser()
    command = [sys.executable, "-m", "jupyterlab", str(path.name), "--ServerApp.ip=127.0.0.1",
               f"--ServerApp.root_dir={path.parent}", f"--ServerApp.open_browser={shown}",
               f"--LabApp.default_url=/lab/tree/{path.name}"]  # fmt: skip
    if getattr(os, "geteuid", lambda: 1)() == 0:
        command.append("--allow-root")
    try:
        return subprocess.call(command, cwd=path.parent)
    except KeyboardInterrupt:
        return 0


def _has_browser() -> bool:
    try:
        webbrowser.get()
    except webbrowser.Error:
        return False
    return True


def explain_case(path: Path, *, as_json: bool, report: Path | None, draws: int) -> int:
    """Explain a case; print words or JSON, and write the report where one is asked for."""
    case = open_case(path)
    explanation = explain(case, draws=draws)
    if as_json:
        print(explanation.to_json(indent=1))
    else:
        print(explanation_text(case, explanation))
    if report is not None:
        write_report(case, explanation, report)
        _say(f"report written: {report}")
    _say(word("command.caution"))
    return 0


def damage_of_mask(path: Path, *, label: int | None, csv: Path | None) -> int:
    """Print what a mask reaches."""
    lesion = read_lesion(path, label=label)
    desk = desk_for()
    table = damage_of(lesion, desk=desk)
    for note in lesion.notes:
        _say(f"{path.name}: {note}")
    if csv is not None:
        write_text(csv, table.to_csv(index=False))
        _say(f"table written: {csv}")
    hit = table[(table["share"] > 0.005) | (table["high"] > 0.05)]
    with pd.option_context("display.width", 200, "display.max_rows", None, "display.max_colwidth", 60):
        print(hit.round(3).to_string(index=False))
    print(f"\nvolume_ml {lesion.volume_ml:.1f}   uncharted_share {table.attrs['uncharted_share']:.2f}")
    print(word("command.template_anatomy", whose=", ".join(sorted(set(table["anatomy"])))))
    _say(word("command.caution"))
    return 0


def new_from_mask(mask: Path, folder: Path, *, label: int | None) -> int:
    """Make a case folder from a mask."""
    case = new_case(folder, mask, label=label)
    print(f"{case.path}\nnext: add findings there or on the bench, then: byway explain {folder}")
    return 0


def graph_check(overlays: Sequence[Path]) -> int:
    """Run every rule over the graph; 0 where no fault is grave."""
    report, text = graph_commands.check(overlays)
    print(text)
    return 1 if report.grave else 0


def graph_table(overlays: Sequence[Path]) -> int:
    """Print the sign-by-segment table."""
    print(graph_commands.table(overlays))
    return 0


def graph_diff(overlays: Sequence[Path]) -> int:
    """Say what overlays change."""
    print(graph_commands.diff(overlays))
    return 0


def graph_export(overlays: Sequence[Path], to: Path) -> int:
    """Write GraphML or tables."""
    print(graph_commands.export(overlays, to))
    return 0


def graph_atlas(overlays: Sequence[Path], to: Path) -> int:
    """Write the printable atlas."""
    desk = desk_for(overlays)
    write_atlas(desk, to)
    print(to)
    return 0


def archive_pack(folder: Path, file: Path) -> int:
    """Pack a case, after listing what could identify a person."""
    traces = identifying_traces(folder)
    names = pack_case(folder, file)
    print(f"{file}: {len(names)} files")
    if traces:
        _say("look at these before it leaves; they could identify a person:")
        _say(traces_table(traces).to_string(index=False))
    return 0


def archive_unpack(file: Path, folder: Path) -> int:
    """Unpack a case into a new folder."""
    print(unpack_case(file, folder))
    return 0
