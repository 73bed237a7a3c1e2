"""The command line: ``byway open | explain | course | similar | damage | anatomy | new | graph | archive``.

Thin: each command calls one room. Results go to stdout, progress and notes to stderr. Bad input prints one line and
exits with 2.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Sequence
from pathlib import Path

from byway.knowledge.cases import commands
from byway.knowledge.cases.own import OwnLayer, folder_layer
from byway.knowledge.faults import BywayError, Fault, nearest
from byway.knowledge.words import word

__all__ = ["main"]


def _help(key: str) -> str:
    return word(f"command.{key}")


def _layer(given: argparse.Namespace) -> OwnLayer | None:
    """The own anatomy that the options name; options that lead it to the template mean nothing without it."""
    if given.anatomy is not None:
        return folder_layer(given.anatomy, affine=given.affine, displacement=given.displacement, axes=given.axes)
    if given.affine or given.displacement or given.axes:
        raise BywayError(Fault("own-transform", "damage", "a transform without --anatomy", "a folder of own anatomy"))
    return None


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(prog="byway", description=_help("byway"), epilog=_help("caution"))
    parser.add_argument("--version", action="version", version=commands.version())
    rooms = parser.add_subparsers(dest="command", metavar="COMMAND")

    def add(
        name: str, to: argparse._SubParsersAction[argparse.ArgumentParser] = rooms, key: str = ""
    ) -> argparse.ArgumentParser:
        text = _help(key or name)
        return to.add_parser(name, help=text, description=text, epilog=_help("caution"))

    one = add("open")
    one.add_argument("notebook", nargs="?", type=Path, help=_help("open_notebook"))
    one.add_argument("--no-browser", action="store_true", help=_help("open_no_browser"))
    one.set_defaults(run=lambda a: commands.open_notebook(a.notebook, browser=not a.no_browser))

    one = add("explain")
    one.add_argument("case", type=Path, metavar="CASE", help=_help("explain_case"))
    one.add_argument("--json", action="store_true", help=_help("explain_json"))
    one.add_argument("--report", type=Path, metavar="FILE", help=_help("explain_report"))
    one.add_argument("--draws", type=int, default=200, help=_help("explain_draws"))
    one.add_argument("--pdf", type=Path, metavar="FILE", help=_help("explain_pdf"))
    one.add_argument("--tables", type=Path, metavar="FOLDER", help=_help("explain_tables"))
    one.add_argument("--summary", action="store_true", help=_help("explain_summary"))
    one.add_argument("--notes", default="all", metavar="WHICH", help=_help("explain_notes"))
    one.set_defaults(run=lambda a: commands.explain_case(
        a.case, as_json=a.json, report=a.report, draws=a.draws, pdf=a.pdf, tables=a.tables, summary=a.summary,
        notes=a.notes))  # fmt: skip

    one = add("course")
    one.add_argument("case", type=Path, metavar="CASE", help=_help("explain_case"))
    one.add_argument("--csv", type=Path, metavar="FOLDER", help=_help("course_csv"))
    one.add_argument("--draws", type=int, default=200, help=_help("explain_draws"))
    one.set_defaults(run=lambda a: commands.course(a.case, csv=a.csv, draws=a.draws))

    one = add("similar")
    one.add_argument("case", type=Path, metavar="CASE", help=_help("explain_case"))
    one.add_argument("folder", type=Path, metavar="FOLDER", help=_help("similar_folder"))
    one.set_defaults(run=lambda a: commands.similar(a.case, a.folder))

    one = add("damage")
    one.add_argument("mask", type=Path, metavar="MASK", help=_help("damage_mask"))
    one.add_argument("--label", type=int, help=_help("damage_label"))
    one.add_argument("--csv", type=Path, metavar="FILE", help=_help("damage_csv"))
    one.add_argument("--anatomy", type=Path, metavar="FOLDER", help=_help("damage_anatomy"))
    one.add_argument("--affine", type=Path, metavar="FILE", help=_help("damage_affine"))
    one.add_argument("--displacement", type=Path, metavar="FILE", help=_help("damage_displacement"))
    one.add_argument("--axes", choices=("ras", "lps"), help=_help("damage_axes"))
    one.set_defaults(run=lambda a: commands.damage_of_mask(a.mask, label=a.label, csv=a.csv, layer=_layer(a)))

    anatomy = add("anatomy").add_subparsers(dest="what", required=True, metavar="WHAT")
    one = add("compare", anatomy, "anatomy_compare")
    one.add_argument("case", type=Path, metavar="CASE", help=_help("explain_case"))
    one.add_argument("--csv", type=Path, metavar="FILE", help=_help("damage_csv"))
    one.set_defaults(run=lambda a: commands.anatomy_compare(a.case, csv=a.csv))

    one = add("new")
    one.add_argument("mask", type=Path, metavar="MASK", help=_help("damage_mask"))
    one.add_argument("folder", type=Path, metavar="FOLDER", help=_help("explain_case"))
    one.add_argument("--label", type=int, help=_help("damage_label"))
    one.set_defaults(run=lambda a: commands.new_from_mask(a.mask, a.folder, label=a.label))

    one = add("signs")
    one.add_argument("words", nargs="*", metavar="WORD", help=_help("signs_words"))
    one.set_defaults(run=lambda a: commands.signs(a.words))

    graph = add("graph").add_subparsers(dest="what", required=True, metavar="WHAT")
    for name in ("check", "table", "diff", "export", "atlas"):
        one = add(name, graph, f"graph_{name}")
        one.add_argument("--overlay", action="append", type=Path, default=[], help=_help("graph_overlay"))
        if name in ("export", "atlas"):
            one.add_argument("to", type=Path, metavar="TO")
    graph_run = {"check": commands.graph_check, "table": commands.graph_table, "diff": commands.graph_diff}
    written = {"export": commands.graph_export, "atlas": commands.graph_atlas}
    for name, one in graph.choices.items():
        if name in graph_run:
            one.set_defaults(run=lambda a, f=graph_run[name]: f(a.overlay))
        else:
            one.set_defaults(run=lambda a, f=written[name]: f(a.overlay, a.to))

    archive = add("archive").add_subparsers(dest="what", required=True, metavar="WHAT")
    one = add("pack", archive, "archive_pack")
    one.add_argument("folder", type=Path)
    one.add_argument("file", type=Path)
    one.add_argument("--reviewed", action="store_true", help=_help("archive_reviewed"))
    one.set_defaults(run=lambda a: commands.archive_pack(a.folder, a.file, reviewed=a.reviewed))
    one = add("list", archive, "archive_list")
    one.add_argument("folder", type=Path)
    one.set_defaults(run=lambda a: commands.archive_list(a.folder))
    one = add("unpack", archive, "archive_unpack")
    one.add_argument("file", type=Path)
    one.add_argument("folder", type=Path)
    one.set_defaults(run=lambda a: commands.archive_unpack(a.file, a.folder))
    return parser


def _misunderstood(parser: argparse.ArgumentParser, command: str | None, rest: Sequence[str]) -> Fault:
    """What to say of words that no command takes."""
    rooms = next(action for action in parser._actions if isinstance(action, argparse._SubParsersAction))
    if command is None:
        found = f"no option {rest[0]!r}" if rest else "no command"
        return Fault("command", "command line", found, ", ".join(rooms.choices), "byway --help says what each does")
    options = rooms.choices[command]._option_string_actions
    close = nearest(rest[0], options) or f"byway {command} --help"
    return Fault("option", command, f"no option {rest[0]!r}", "", close)


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command; returns the exit code (0 done, 1 a check found faults, 2 bad input, 130 stopped)."""
    parser = _parser()
    given, rest = parser.parse_known_args(arguments)
    if rest or given.command is None:
        print(f"byway: {_misunderstood(parser, given.command, rest)}", file=sys.stderr)
        return 2
    try:
        return int(given.run(given))
    except BywayError as error:
        for fault in error.faults:
            print(f"byway: {fault}", file=sys.stderr)
        return 2
    except KeyboardInterrupt:
        print("byway: stopped; nothing was written", file=sys.stderr)
        return 130
    except BrokenPipeError:
        return 0


if __name__ == "__main__":
    sys.exit(main())
