"""What people write in a case: notes, accounts of their own and standings, one immutable file each.

Nothing is ever rewritten. An edit is a new page that names the page it ``replaces``; two people who edit the same
page at once leave two pages that replace it, and both are shown. File names start with a time-ordered unique id, so
that folders merge by themselves on a shared drive or in git and a listing reads as a timeline.
"""

from __future__ import annotations

import json
import re
import secrets
import time
from collections.abc import Iterable, Mapping
from datetime import UTC, datetime
from pathlib import Path
from typing import Annotated, Literal

from pydantic import BaseModel, ConfigDict, Field, ValidationError

from byway.knowledge.atomic import write_text
from byway.knowledge.faults import CaseError, Fault, FaultReport

__all__ = ["Anchor", "Note", "OwnAccount", "Page", "Pages", "Resolution", "Standing", "new_id", "now", "thread"]

ID = re.compile(r"^[0-9a-f]{12}-[0-9a-f]{10}$")
FOLDERS = {"note": "notes", "resolution": "notes", "account": "accounts", "standing": "standing"}
MOST_BYTES = 1_000_000


def new_id() -> str:
    """A unique id that sorts by time: milliseconds since 1970 in hexadecimal, then random digits."""
    return f"{time.time_ns() // 1_000_000:012x}-{secrets.token_hex(5)}"


def now() -> str:
    """The time in UTC, ISO 8601, to the second."""
    return datetime.now(UTC).isoformat(timespec="seconds")


class Anchor(BaseModel):
    """What a note speaks of: a voxel (MNI mm), or a region, segment, sign, claim or account by key."""

    model_config = ConfigDict(frozen=True, extra="forbid")
    kind: Literal["voxel", "region", "segment", "function", "sign", "claim", "account", "case"]
    key: str | None = None
    mm: tuple[float, float, float] | None = None


class Page(BaseModel):
    """Base of what people write: who, when, and what it replaces (several pages where it settles rivals)."""

    model_config = ConfigDict(frozen=True, extra="forbid")
    id: str = Field(default_factory=new_id, pattern=ID.pattern)
    author: Annotated[str, Field(min_length=1, max_length=80)]
    time: str = Field(default_factory=now)
    replaces: str | None = None
    also_replaces: tuple[str, ...] = ()


class Note(Page):
    """A note in markdown, anchored, perhaps an answer to another."""

    kind: Literal["note"] = "note"
    text: Annotated[str, Field(min_length=1, max_length=50_000)]
    anchor: Anchor = Anchor(kind="case")
    reply_to: str | None = None
    tags: tuple[str, ...] = ()

    @property
    def mentions(self) -> tuple[str, ...]:
        """Names written as ``@name`` in the text.

        >>> Note(author="KL", text="@AB, does the edge hold?").mentions
        ('AB',)
        """
        return tuple(re.findall(r"(?<![\w@])@([\w.-]+)", self.text))


class Resolution(Page):
    """A note is settled, or open again."""

    kind: Literal["resolution"] = "resolution"
    note: str
    settled: bool = True


class OwnAccount(Page):
    """A person's own account: the elements it blames and the scenario it supposes, scored on the same ledger."""

    kind: Literal["account"] = "account"
    title: Annotated[str, Field(min_length=1, max_length=200)]
    elements: tuple[str, ...] = ()
    scenario: dict[str, str] = {}
    text: str = ""


class Standing(Page):
    """Where one person stands towards an account: held, doubted or ruled out, with a reason."""

    kind: Literal["standing"] = "standing"
    account: str
    stands: Literal["held", "doubted", "ruled_out"]
    reason: str = ""


KINDS: dict[str, type[Page]] = {"note": Note, "resolution": Resolution, "account": OwnAccount, "standing": Standing}


class Pages:
    """The pages of one case folder.

    Parameters
    ----------
    folder : Path
        The case folder. Sub-folders are made when the first page is written.
    """

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self.unreadable = FaultReport()
        self._whole: dict[Path, Page] = {}  # a page never changes, so each is read once

    def put(self, page: Page) -> Path:
        """Write one page durably and return its path; an existing page is never overwritten."""
        kind: str = page.kind  # type: ignore[attr-defined]
        path = self.folder / FOLDERS[kind] / f"{page.id}.{kind}.json"
        if path.exists():
            raise CaseError(Fault("page-exists", str(path), "a page of that id", "a new id", "nothing was written"))
        write_text(path, page.model_dump_json(indent=1, exclude_none=True) + "\n")
        return path

    def all(self, kind: str | None = None) -> list[Page]:
        """Every readable page, oldest first; unreadable files are listed in ``unreadable`` and left alone."""
        self.unreadable = FaultReport()
        found: list[Page] = []
        for folder in sorted(set(FOLDERS.values()) if kind is None else {FOLDERS[kind]}):
            for path in sorted((self.folder / folder).glob("*.json")):
                page = self._whole.get(path) or self._read(path)
                if page is not None:
                    self._whole[path] = page
                if page is not None and (kind is None or page.kind == kind):  # type: ignore[attr-defined]
                    found.append(page)
        return sorted(found, key=lambda page: page.id)

    def current(self, kind: str) -> list[Page]:
        """Pages that no later page replaces. Two that replace the same page both stand."""
        pages = self.all(kind)
        replaced = {old for page in pages for old in (page.replaces, *page.also_replaces) if old}
        return [page for page in pages if page.id not in replaced]

    def rivals(self, kind: str) -> list[tuple[Page, ...]]:
        """Groups of current pages that replace the same page: written at once, to be looked at side by side."""
        groups: dict[str, list[Page]] = {}
        for page in self.current(kind):
            if page.replaces:
                groups.setdefault(page.replaces, []).append(page)
        return [tuple(group) for group in groups.values() if len(group) > 1]

    def settle_rivals(self, kept: Page, author: str) -> Page:
        """Keep one of several versions of a page: a new page with its words replaces them all.

        Raises
        ------
        CaseError
            The page has no rival now.
        """
        kind: str = kept.kind  # type: ignore[attr-defined]
        group = next((g for g in self.rivals(kind) if kept.id in {page.id for page in g}), ())
        if not group:
            raise CaseError(Fault("no-rival", kept.id, "a page that has no other version", "", "nothing was written"))
        ids = [page.id for page in group if page.id != kept.id]
        fresh = {"id": new_id(), "time": now(), "author": author, "replaces": kept.id, "also_replaces": tuple(ids)}
        settled = kept.model_copy(update=fresh)
        self.put(settled)
        return settled

    def origins(self, kind: str) -> dict[str, str]:
        """For every page that replaces another, the id of the page that was first in its line."""
        above = {page.id: page.replaces for page in self.all(kind) if page.replaces}
        first: dict[str, str] = {}
        for page in above:
            oldest, seen = page, {page}
            while (older := above.get(oldest)) and older not in seen:
                oldest = older
                seen.add(older)
            first[page] = oldest
        return first

    def settled(self) -> dict[str, bool]:
        """For every note with a resolution, by the id of the first in its line: whether the newest settles it."""
        first = self.origins("note")
        return {first.get(page.note, page.note): page.settled
                for page in self.all("resolution") if isinstance(page, Resolution)}  # fmt: skip

    def standings(self) -> dict[str, dict[str, Standing]]:
        """For each account, each person's newest standing."""
        table: dict[str, dict[str, Standing]] = {}
        for page in self.all("standing"):
            if isinstance(page, Standing):
                table.setdefault(page.account, {})[page.author] = page
        return table

    def _read(self, path: Path) -> Page | None:
        kind = path.name.rsplit(".", 2)[-2]
        where = f"{path.parent.name}/{path.name}"
        if kind not in KINDS or path.stat().st_size > MOST_BYTES:
            self.unreadable.add("page", where, "no page of a known kind", ", ".join(KINDS), "left as it is")
            return None
        try:
            return KINDS[kind].model_validate(json.loads(path.read_text("utf-8")))
        except (ValueError, ValidationError) as error:
            first = str(error).splitlines()[0]
            self.unreadable.add("page", where, f"cannot be read: {first}", "", "left as it is")
            return None


def thread(notes: Iterable[Note], origins: Mapping[str, str] | None = None) -> list[tuple[int, Note]]:
    """Notes with the depth of each in its thread, answers below what they answer, oldest first.

    Parameters
    ----------
    notes : iterable of Note
        Usually the current ones.
    origins : mapping, optional
        From :meth:`Pages.origins`: an edited note keeps its place and its answers.
    """
    first = origins or {}
    below: dict[str | None, list[Note]] = {}
    listed = list(notes)
    ids = {first.get(note.id, note.id) for note in listed}
    for note in sorted(listed, key=lambda n: (first.get(n.id, n.id), n.id)):
        above = first.get(note.reply_to, note.reply_to) if note.reply_to else None
        below.setdefault(above if above in ids else None, []).append(note)
    rows: list[tuple[int, Note]] = []
    seen: set[str] = set()

    def walk(parent: str | None, depth: int) -> None:
        for note in below.get(parent, []):
            if note.id not in seen:
                seen.add(note.id)
                rows.append((depth, note))
                walk(first.get(note.id, note.id), depth + 1)

    walk(None, 0)
    return rows
