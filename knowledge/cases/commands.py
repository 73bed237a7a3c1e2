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
from byway.knowledge.cases.anatomies import anatomies_of_case
from byway.knowledge.cases.archive import pack_case, unpack_case
from byway.knowledge.cases.atlas import write_atlas
from byway.knowledge.cases.case import open_case
from byway.knowledge.cases.course import course_of_case
from byway.knowledge.cases.desk import desk_for, desk_own
from byway.knowledge.cases.explaining import damage_of, desk_of, explain
from byway.knowledge.cases.files import case_path
from byway.knowledge.cases.making import bench_notebook, new_case
from byway.knowledge.cases.own import OwnLayer
from byway.knowledge.cases.pages import Note, Pages
from byway.knowledge.cases.pdf import write_pdf
from byway.knowledge.cases.privacy import identifying_traces, image_traces, traces_table
from byway.knowledge.cases.report import write_report
from byway.knowledge.cases.similar import similar_to
from byway.knowledge.cases.tables import write_tables
from byway.knowledge.cases.wording import explanation_text, whose_words
from byway.knowledge.faults import BywayError, CaseError, Fault, nearest
from byway.knowledge.graph import commands as graph_commands
from byway.knowledge.graph.loading import load_graph
from byway.knowledge.lesion.images import read_lesion
from byway.knowledge.words import word

__all__ = [
    "anatomy_compare",
    "archive_list",
    "archive_pack",
    "archive_unpack",
    "chosen_notes",
    "course",
    "damage_of_mask",
    "explain_case",
    "graph_atlas",
    "graph_check",
    "graph_diff",
    "graph_export",
    "graph_table",
    "new_from_mask",
    "open_notebook",
    "signs",
    "similar",
    "version",
]

# JupyterLab would ask the network for news, newer versions and extensions; hospital networks are closed.
QUIET = ("--LabApp.news_url=None", "--LabApp.check_for_updates_class=jupyterlab.NeverCheckForUpdate",
         "--LabApp.extension_manager=readonly",
         f"--LabApp.app_settings_dir={Path(__file__).parent / 'lab_settings'}")  # fmt: skip
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
    """Build the geometry if it is not there, then run JupyterLab on a notebook, on loopback with its usual token.

    A case folder may be named instead: its ``bench.ipynb`` is opened, and made where there is none.
    """
    path = (notebook or NOTEBOOKS / "first_case.ipynb").resolve()
    if path.is_dir():
        path = bench_notebook(case_path(path).parent)
    if not path.is_file():
        where = "the name of a notebook" if notebook else word("command.no_notebook")
        raise BywayError(Fault("no-notebook", str(path), "no such notebook", where, "name one"))
    desk_for()
    shown = browser and _has_browser()
    command = [sys.executable, "-m", "jupyterlab", str(path.name), "--ServerApp.ip=127.0.0.1",
               f"--ServerApp.root_dir={path.parent}", f"--ServerApp.open_browser={shown}",
               f"--LabApp.default_url=/lab/tree/{path.name}", *QUIET]  # fmt: skip
    if getattr(os, "geteuid", lambda: 1)() == 0:
        command.append("--allow-root")
    os.chdir(path.parent)
    sys.stdout.flush()
    if os.name == "posix":
        os.execv(sys.executable, command)  # JupyterLab takes this process's place: stopping one stops the other
    try:
        return subprocess.call(command)
    except KeyboardInterrupt:
        return 0


def _has_browser() -> bool:
    try:
        webbrowser.get()
    except webbrowser.Error:
        return False
    return True


def explain_case(
    path: Path, *, as_json: bool, report: Path | None, draws: int, pdf: Path | None = None, tables: Path | None = None,
    summary: bool = False, notes: str = "all",
) -> int:  # fmt: skip
    """Explain a case; print words or JSON, and write report, PDF and tables where they are asked for."""
    if summary and report is None and pdf is None:
        raise CaseError(Fault("summary", "explain", "--summary without a report", "--report FILE or --pdf FILE"))
    case = open_case(path)
    explanation = explain(case, draws=draws)
    if as_json:
        print(explanation.to_json(indent=1))
    else:
        print(explanation_text(case, explanation))
    choices = {"full": not summary, "notes": chosen_notes(case.folder, notes, full=not summary)}
    if report is not None:
        write_report(case, explanation, report, **choices)
        _say(f"report written: {report}")
    if pdf is not None:
        write_pdf(case, explanation, pdf, **choices)
        _say(f"report written: {pdf}")
    if tables is not None:
        course = course_of_case(case, draws=draws) if case.spec.visits else None
        write_tables(case, explanation, tables, course)
        _say(f"tables written: {tables}")
    _say(word("command.caution"))
    return 0


def chosen_notes(folder: Path, which: str, *, full: bool) -> list[Note] | None:
    """Notes for a report: ``all`` (in a summary: none), ``none``, ``open`` (not settled), or those with a tag.

    Raises
    ------
    CaseError
        No note carries that tag.
    """
    if which == "all":
        return None
    pages = Pages(folder)
    notes = [page for page in pages.current("note") if isinstance(page, Note)]
    if which == "none":
        return []
    if which == "open":
        settled, origins = pages.settled(), pages.origins("note")
        return [note for note in notes if not settled.get(origins.get(note.id, note.id), False)]
    tagged = [note for note in notes if which in note.tags]
    if not tagged:
        tags = sorted({tag for note in notes for tag in note.tags})
        raise CaseError(Fault("no-notes", str(folder), f"no note with the tag {which!r}",
                              ", ".join(["all", "none", "open", *tags])))  # fmt: skip
    return tagged


def course(path: Path, *, csv: Path | None, draws: int) -> int:
    """Print what changed between the visits of a case."""
    case = open_case(path)
    if not case.spec.visits:
        raise CaseError(Fault("no-visits", str(case.path), "a case with one time point",
                              "`visits:` with a date, stage and findings each", "add them to case.yaml"))  # fmt: skip
    told = course_of_case(case, draws=draws)
    with pd.option_context("display.width", 200, "display.max_rows", None, "display.max_colwidth", 70):
        for visit, stage, volume in zip(told.visits, told.stages, told.volumes_ml, strict=True):
            print(f"{visit}: {stage}, lesion {volume:.1f} ml")
        for table in (told.damage.head(12), told.functions.head(12), told.findings, told.accounts.head(8)):
            print(f"\n{table.round(3).to_string()}")
    if csv is not None:
        write_tables(case, None, csv, told)
        _say(f"tables written: {csv}")
    _say(word("command.caution"))
    return 0


def similar(path: Path, folder: Path) -> int:
    """Print the cases of a folder by likeness to one."""
    table = similar_to(open_case(path), folder)
    with pd.option_context("display.width", 200, "display.max_rows", None, "display.max_colwidth", 60):
        print(table.round(3).to_string(index=False) if len(table) else "no other case there")
    for name, reason in table.attrs["left_out"]:
        _say(f"left out: {name}: {reason}")
    _say(word("command.caution"))
    return 0


def damage_of_mask(path: Path, *, label: int | None, csv: Path | None, layer: OwnLayer | None = None) -> int:
    """Print what a mask reaches, by the template or by own anatomy where it is given."""
    lesion = read_lesion(path, label=label)
    desk = desk_own(desk_for(), () if layer is None else (layer,))
    table = damage_of(lesion, desk=desk)
    for note in lesion.notes:
        _say(f"{path.name}: {note}")
    for note in desk.notes:
        _say(note)
    if csv is not None:
        write_text(csv, table.to_csv(index=False))
        _say(f"table written: {csv}")
    hit = table[(table["share"] > 0.005) | (table["high"] > 0.05)]
    with pd.option_context("display.width", 200, "display.max_rows", None, "display.max_colwidth", 60):
        print(hit.round(3).to_string(index=False))
    print(f"\nvolume_ml {lesion.volume_ml:.1f}   uncharted_share {table.attrs['uncharted_share']:.2f}")
    print(word("command.template_anatomy", whose=whose_words(table["anatomy"])))
    _say(word("command.caution"))
    return 0


def anatomy_compare(path: Path, *, csv: Path | None) -> int:
    """Print what the lesion of a case does by the template's anatomy and by the case's own."""
    case = open_case(path)
    table = anatomies_of_case(case)
    for note in desk_of(case).notes:
        _say(note)
    if csv is not None:
        write_text(csv, table.to_csv(index=False))
        _say(f"table written: {csv}")
    shown = table.drop(columns=["kind", "anatomy", "side", "name"]).round(3)
    with pd.option_context("display.width", 200, "display.max_rows", None, "display.max_colwidth", 60):
        print(shown.to_string(index=False) if len(table) else word("command.anatomy_none"))
    _say(word("command.caution"))
    return 0


def new_from_mask(mask: Path, folder: Path, *, label: int | None) -> int:
    """Make a case folder from a mask."""
    lesion = read_lesion(mask, label=label)
    case = new_case(folder, lesion)
    for note in lesion.notes:
        _say(f"{mask.name}: {note}")
    for trace in image_traces(mask):
        _say(f"left behind, since it could identify a person: {trace.kind} ({trace.place} of {trace.file})")
    print(f"{case.path}\nnext: add findings there or on the bench, then: byway explain {folder}")
    return 0


def signs(words: Sequence[str]) -> int:
    """Print the signs whose key, name or domain has every word, with the sides that a finding of each takes."""
    graph = load_graph()
    rows = []
    for sign in graph.signs.values():
        text = f"{sign.key} {sign.name} {sign.domain} {sign.hpo.id if sign.hpo else ''}".lower().replace("_", " ")
        if all(each.lower().replace("_", " ") in text for each in words):
            sides = " or ".join(one.rpartition("@")[2] for one in graph.sign_ids(sign.key))
            rows.append((sign.key, sides, sign.name, sign.hpo.id if sign.hpo else ""))
    if not rows:
        found = f"no sign with {' '.join(words)!r}"
        close = nearest("_".join(words), graph.signs)
        raise BywayError(Fault("no-signs", "signs", found, "part of a key, name or domain", close))
    table = pd.DataFrame(rows, columns=["sign", "side", "name", "hpo"])
    with pd.option_context("display.width", 200, "display.max_rows", None, "display.max_colwidth", 70):
        print(table.to_string(index=False))
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


def archive_pack(folder: Path, file: Path, *, reviewed: bool = False) -> int:
    """Pack a case, once somebody has looked at what could identify a person; otherwise list it, and pack nothing."""
    traces = identifying_traces(folder)
    if traces:
        _say(traces_table(traces).to_string(index=False))
    names = pack_case(folder, file, reviewed=reviewed)
    print(f"{file}: {len(names)} files")
    return 0


def archive_list(folder: Path) -> int:
    """List what in a case folder could identify a person; 1 where there is something, 0 where nothing was found."""
    case_path(folder)
    traces = identifying_traces(folder)
    print(traces_table(traces).to_string(index=False) if traces else "nothing found; an empty list is no promise")
    return 1 if traces else 0


def archive_unpack(file: Path, folder: Path) -> int:
    """Unpack a case into a new folder, and list what in it could identify a person."""
    print(unpack_case(file, folder))
    traces = identifying_traces(folder)
    if traces:
        _say("it came with these, which could identify a person:")
        _say(traces_table(traces).to_string(index=False))
    return 0
