"""What the notes panel sends: pages as plain dicts, their markdown already made safe."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any, cast

from byway.knowledge.cases.case import open_case
from byway.knowledge.cases.course import Course
from byway.knowledge.cases.pages import Anchor, Note, Page, Pages, Standing, thread
from byway.knowledge.cases.report import markdown_html
from byway.knowledge.cases.standing import STANDS, team_standing
from byway.knowledge.cases.versions import beside_versions, differences
from byway.knowledge.faults import BywayError
from byway.knowledge.graph.references import split_reference

__all__ = ["course_told", "label_of", "notes_told", "places_of", "standing_told", "versions_told"]


def label_of(anchor: Anchor, graph: Any, titles: Mapping[str, str]) -> str:
    """What an anchor speaks of, in words; the key where it has no name (any more)."""
    if anchor.kind == "voxel" and anchor.mm is not None:
        return "({:.0f}, {:.0f}, {:.0f}) mm".format(*anchor.mm)
    key = anchor.key or ""
    if anchor.kind == "account":
        return titles.get(key, key)
    if graph is None or anchor.kind == "case":
        return key
    bare, side = split_reference(key)
    if anchor.kind == "claim":
        return str(graph.claims[bare].says) if bare in graph.claims else key
    known = bare in graph.regions or bare in graph.segments or bare in graph.functions or bare in graph.signs
    name = graph.name_of(bare) if known else bare
    return f"{name}, {side}" if side and side not in ("none", "midline") else str(name)


def notes_told(pages: Pages, graph: Any, titles: Mapping[str, str]) -> dict[str, Any]:
    """All current notes in threads, versions written at once, and who and what can be filtered by."""
    pages.all()
    broken = [str(fault) for fault in pages.unreadable]
    notes = [page for page in pages.current("note") if isinstance(page, Note)]
    settled, origins = pages.settled(), pages.origins("note")
    rows: list[dict[str, Any]] = []
    for depth, note in thread(notes, origins):
        first = origins.get(note.id, note.id)
        rows.append({
            "id": note.id, "first": first, "depth": depth, "author": note.author, "time": note.time,
            "html": markdown_html(note.text), "text": note.text, "tags": list(note.tags),
            "mentions": list(note.mentions), "settled": settled.get(first, False), "edited": note.replaces is not None,
            "anchor": {"kind": note.anchor.kind, "key": note.anchor.key,
                       "mm": list(note.anchor.mm) if note.anchor.mm else None,
                       "label": label_of(note.anchor, graph, titles)},
        })  # fmt: skip
    groups: list[tuple[Page, ...]] = [*pages.rivals("note"), *pages.rivals("account")]
    rivals: list[list[dict[str, Any]]] = [[_version(page) for page in group] for group in groups]
    return {
        "notes": rows,
        "rivals": rivals,
        "authors": sorted({row["author"] for row in rows}),
        "tags": sorted({tag for row in rows for tag in row["tags"]}),
        "kinds": sorted({row["anchor"]["kind"] for row in rows}),
        "unreadable": broken,
    }


def _version(page: Page) -> dict[str, Any]:
    text = page.text if isinstance(page, Note) else f"**{getattr(page, 'title', '')}**\n\n{getattr(page, 'text', '')}"
    return {"id": page.id, "author": page.author, "time": page.time, "html": markdown_html(text)}


def standing_told(standings: Mapping[str, Mapping[str, Standing]], explanation: Any) -> list[dict[str, Any]]:
    """Where everybody stands on every account, with reasons; ``index`` is the account's rank, None if unranked."""
    ranks = {account.key: i for i, account in enumerate(explanation.accounts)} if explanation is not None else {}
    rows = []
    for row in team_standing(standings, explanation).to_dict("records"):
        people = standings.get(row["account"], {})
        rows.append({
            "account": row["account"], "title": row["title"], "index": ranks.get(row["account"]),
            "posterior": row["posterior"] if row["posterior"] == row["posterior"] else None,
            "differ": bool(row["differ"]), "odd": bool(row["against_posterior"]),
            **{word: [{"who": who, "reason": people[who].reason, "time": people[who].time} for who in row[word]]
               for word in STANDS},
        })  # fmt: skip
    return rows


def versions_told(folder: Path) -> list[dict[str, Any]]:
    """Versions of case.yaml that wait beside it: their name and the fields that differ, theirs and in place."""
    told = []
    for name in beside_versions(folder):
        try:
            rows = differences(open_case(folder).spec, open_case(folder / name).spec)
            told.append({"name": name, "rows": [vars(row) for row in rows], "fault": ""})
        except BywayError as error:
            told.append({"name": name, "rows": [], "fault": str(error)})
    return told


def places_of(graph: Any, explanation: Any) -> list[list[str]]:
    """What a note can be anchored to: kind, key and label; elements and signs once a side."""
    rows: list[list[str]] = []
    if explanation is not None:
        rows += [["account", account.key, account.title] for account in explanation.accounts]
    if graph is None:
        return rows
    for kind, table in (("region", graph.regions), ("segment", graph.segments)):
        for key in table:
            for element in graph.element_ids(key):
                side = element.rpartition("@")[2]
                rows.append([kind, element, graph.name_of(key) + ("" if side == "midline" else f", {side}")])
    for sign_id in graph.sign_ids():
        key, _, side = sign_id.rpartition("@")
        rows.append(["sign", sign_id, graph.name_of(key) + ("" if side == "none" else f", {side}")])
    rows += [["claim", key, claim.says] for key, claim in graph.claims.items()]
    return rows


def course_told(course: Course) -> dict[str, Any]:
    """A course as plain tables: columns by visit, rows with what they speak of; the largest changes first."""
    tables = [(one.damage, one.functions, one.signs) for one in course.explanations]
    names = {row["element"]: f"{row['name']}, {row['side']}" for d, _, _ in tables for row in d.to_dict("records")}
    functions = {str(row["function"]): str(row["name"]) for _, f, _ in tables for row in f.to_dict("records")}
    signs = {(row["sign"], row["side"]): str(row["name"]) for *_, s in tables for row in s.to_dict("records")}
    titles = {str(key): str(title) for key, title in course.accounts["title"].items()}
    found = []
    for place, row in course.findings.iterrows():
        sign, side = cast("tuple[str, str]", place)
        found.append({"key": f"{sign}@{side}", "label": signs[sign, side] + ("" if side == "none" else f", {side}"),
                      "found": [row[f"{visit} found"] for visit in course.visits],
                      "expected": [float(row[f"{visit} expected"]) for visit in course.visits]})  # fmt: skip
    visits = list(course.visits)
    return {
        "visits": visits, "stages": list(course.stages), "volumes_ml": list(course.volumes_ml),
        "damage": _rows(course.damage.head(12), visits, names),
        "functions": _rows(course.functions.head(12), visits, functions),
        "accounts": _rows(course.accounts.head(8), visits, titles),
        "signs": found,
    }  # fmt: skip


def _rows(table: Any, visits: list[str], names: Mapping[str, str]) -> list[dict[str, Any]]:
    return [{"key": str(key), "label": names.get(str(key), str(key)), "values": [float(row[visit]) for visit in visits]}
            for key, row in table.iterrows()]  # fmt: skip
