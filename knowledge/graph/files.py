"""The curated text: YAML files to records, each with its file and line, and every fault of all files at once."""

from __future__ import annotations

import gc
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from pydantic import ValidationError

import byway.knowledge.curated
from byway.knowledge.faults import Fault, FaultReport, GraphError
from byway.knowledge.graph.content import KINDS, PLURALS, Content, Kind, Origin
from byway.knowledge.graph.grammar import Place, record_faults, to_record
from byway.knowledge.graph.records import Record
from byway.knowledge.yamltext import Lined, read_yaml

__all__ = ["FILE_RULES", "Block", "blocks_in", "curated_folder", "read_curated", "record_of"]

# Every rule of reading: its name in faults, and what it demands. The first ones are those of byway.knowledge.yamltext.
FILE_RULES: dict[str, str] = {
    "yaml": "the text is plain YAML, one document",
    "yaml-mark": "no tags, no anchors, no aliases",
    "yaml-key": "keys are plain words",
    "too-large": "a file holds at most 5 MB",
    "encoding": "text is UTF-8",
    "unreadable": "the file or folder is there",
    "duplicate": "a key stands once",
    "not-a-mapping": "keys stand where keys belong",
    "missing-field": "required fields are there",
    "unknown-field": "fields are those of the kind",
    "unknown-word": "a field with a fixed choice holds one of the choices",
    "out-of-range": "numbers lie in their range",
    "too-few": "lists that need a member have one",
    "type": "numbers are numbers, lists are lists",
}


@dataclass(frozen=True)
class Block:
    """One block of text: kind, key, what stands under the key, and where it stands."""

    kind: Kind
    key: str
    body: Mapping[str, Any]
    read: Lined
    place: Place

    @property
    def where(self) -> str:
        """File, line and key."""
        return f"{self.read.name}:{self.line} {self.key}"

    @property
    def line(self) -> int:
        """Line of the key, from 1."""
        return self.read.lines.get(self.place, 1)

    def origin(self, layer: str) -> Origin:
        """Origin of the record made from this block."""
        return Origin(layer, self.read.name, self.line)


def curated_folder() -> Path:
    """Folder of the base graph's text, as installed."""
    return Path(byway.knowledge.curated.__file__).parent


def read_curated(folder: Path | None = None) -> Content:
    """Read all YAML files of a folder laid out as the curated one (one subfolder a kind).

    Parameters
    ----------
    folder : Path, optional
        By default the curated text that comes with the package.

    Raises
    ------
    GraphError
        Holding every fault of every file: text that is no plain YAML, repeated keys, unknown, missing or
        ill-typed fields. References between records are not looked at here.
    """
    with _collection_paused():
        return _read(folder or curated_folder())


@contextmanager
def _collection_paused() -> Iterator[None]:
    """Reading makes half a million values that all stay; looking for garbage among them takes as long again."""
    running = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if running:
            gc.enable()


def _read(folder: Path) -> Content:
    report = FaultReport()
    records: dict[Kind, dict[str, Record]] = {kind: {} for kind in KINDS}
    origins: dict[tuple[Kind, str], Origin] = {}
    files = {kind: sorted((folder / PLURALS[kind]).glob("*.yaml")) for kind in KINDS}
    if not any(files.values()):
        raise GraphError(Fault("unreadable", str(folder), "no curated text", "folders regions, pathways, ..."))
    for kind, paths in files.items():
        for path in paths:
            try:
                read = read_yaml(path, GraphError, name=f"{PLURALS[kind]}/{path.name}")
                blocks = list(blocks_in(kind, read, report))
            except GraphError as error:
                report.extend(error.faults)
                continue
            for block in blocks:
                first = origins.get((block.kind, block.key))
                if first is not None:
                    there = f"it already stands in {first.file}:{first.line}"
                    report.add("duplicate", block.where, f"a second {block.kind} with this key", "each key once", there)
                    continue
                record = record_of(block, report)
                if record is not None:
                    records[block.kind][block.key] = record
                    origins[block.kind, block.key] = block.origin("base")
    report.raise_if_grave(GraphError)
    return Content.of(records, origins)


def blocks_in(kind: Kind, read: Lined, report: FaultReport) -> Iterator[Block]:
    """Blocks of one curated file; the segments nested in a pathway come after it as blocks of their own."""
    top = read.value if read.value is not None else {}
    if not isinstance(top, Mapping):
        found = f"a {type(top).__name__} at the top"
        report.add("not-a-mapping", read.where(()), found, "keys, each with its block under it")
        return
    for key, body in top.items():
        block = _block(kind, key, body, read, (key,), report)
        if block is None:
            continue
        segments = block.body.get("segments", {}) if kind == "pathway" else {}
        if not isinstance(segments, Mapping):
            where = read.where((key, "segments"))
            report.add("not-a-mapping", where, f"segments is a {type(segments).__name__}", "segment keys and blocks")
            continue
        if kind == "pathway":
            names = [f"{key}.{segment}" for segment in segments]
            block = Block(kind, block.key, {**block.body, "segments": names}, read, block.place)
        yield block
        for segment, inner in segments.items():
            nested = _block("segment", segment, inner, read, (key, "segments", segment), report)
            if nested is not None:
                yield Block("segment", f"{key}.{segment}", nested.body, read, nested.place)


def record_of(block: Block, report: FaultReport) -> Record | None:
    """The record of a block; None where it has faults, which go to the report with file, line, key and field."""
    try:
        return to_record(block.kind, block.key, block.body)
    except ValidationError as error:
        for place, fault in record_faults(error, block.kind, block.body):
            where = block.read.where((*block.place, *place)).partition(" ")[0]
            field = f" {block.key}: {fault.where}" if fault.where else f" {block.key}"
            report.add(fault.rule, where + field, fault.found, fault.expected, fault.remedy)
        return None


def _block(kind: Kind, key: object, body: object, read: Lined, place: Place, report: FaultReport) -> Block | None:
    where = read.where(place)
    if not isinstance(key, str):
        report.add("spelling", where, f"key {key!r} is no word", "lower_snake letters and digits", "quote or rename it")
        return None
    if not isinstance(body, Mapping):
        report.add("not-a-mapping", where, f"a {type(body).__name__} under the key", "fields and values")
        return None
    if not all(isinstance(field, str) for field in body):
        report.add("spelling", where, "a field name that is no word", "the field names of this kind")
        return None
    return Block(kind, key, body, read, place)
