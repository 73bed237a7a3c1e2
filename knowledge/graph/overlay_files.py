"""Overlays on disk: one file, or a folder in which each new entry gets a file of its own, so that edits merge well."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path

from byway.knowledge.atomic import write_bytes
from byway.knowledge.faults import Fault, FaultReport, GraphError
from byway.knowledge.graph.content import PLURALS
from byway.knowledge.graph.emit import emit_yaml
from byway.knowledge.graph.overlays import Entry, Overlay, blocks, entries_in, overlay_from, overlay_text, parse_overlay
from byway.knowledge.yamltext import parse_yaml, read_yaml

__all__ = ["folder_texts", "read_overlay", "save_overlay"]

HEADER = "overlay.yaml"


def read_overlay(path: Path | str) -> Overlay:
    """An overlay from a YAML file, or from a folder with an ``overlay.yaml`` and any other ``*.yaml`` in it.

    Raises
    ------
    GraphError
        No such file, larger than 5 MB, no plain YAML (tags, anchors, repeated keys), or blocks out of place.
    """
    path = Path(path)
    if not path.is_dir():
        return replace(overlay_from([read_yaml(path, GraphError)]), texts={"": path.read_text("utf-8")})
    files = sorted(path.rglob("*.yaml"), key=lambda file: (file != path / HEADER, file.as_posix()))
    if not files or files[0] != path / HEADER:
        form = "a folder with the overlay's name, author and date in it"
        raise GraphError(Fault("overlay-form", str(path), f"no {HEADER}", form))
    names = [file.relative_to(path).as_posix() for file in files]
    read = [read_yaml(file, GraphError, name=name) for file, name in zip(files, names, strict=True)]
    texts = {name: file.read_text("utf-8") for file, name in zip(files, names, strict=True)}
    return replace(overlay_from(read), texts=texts)


def save_overlay(overlay: Overlay, path: Path | str) -> None:
    """Write an overlay to a file, or to a folder (an existing one, or a path without the suffix .yaml).

    What says the same as the text that the overlay was read from is written back as that text. In a folder, entries
    stay in the files they came from and a new entry gets ``claims/key.add.yaml``; files left without entries go.
    Each file is replaced as a whole or not at all.
    """
    path = Path(path)
    if path.is_dir() or (path.suffix != ".yaml" and not path.exists()):
        texts = folder_texts(overlay)
        for name, text in texts.items():
            _write(path / name, text)
        for name in overlay.texts:
            if name and name not in texts:
                (path / name).unlink(missing_ok=True)
        return
    _write(path, _as_read(overlay) or overlay_text(overlay))


def folder_texts(overlay: Overlay) -> dict[str, str]:
    """File names (relative to the folder) and texts of an overlay kept as a folder."""
    by_file: dict[str, list[Entry]] = {HEADER: []}
    for entry in overlay.entries:
        by_file.setdefault(_file_of(entry, overlay.texts), []).append(entry)
    texts = {}
    for name, entries in by_file.items():
        header = {"name": overlay.name, "author": overlay.author, "date": overlay.date} if name == HEADER else {}
        old = overlay.texts.get(name)
        kept = old is not None and _says_the_same(old, name, header, entries)
        texts[name] = old if kept and old is not None else emit_yaml({**header, **blocks(entries)})
    return texts


def _file_of(entry: Entry, texts: Mapping[str, str]) -> str:
    if entry.origin.file in texts:
        return entry.origin.file
    return f"{PLURALS[entry.kind]}/{entry.key}.{entry.action}.yaml"


def _says_the_same(text: str, name: str, header: Mapping[str, str], entries: list[Entry]) -> bool:
    if header:
        old = parse_overlay(text, name)
        return (old.name, old.author, old.date) == tuple(header.values()) and list(old.entries) == entries
    found = entries_in(parse_yaml(text, name, GraphError), "", False, FaultReport())
    return sorted(found, key=lambda entry: entry.slot) == sorted(entries, key=lambda entry: entry.slot)


def _as_read(overlay: Overlay) -> str:
    text = overlay.texts.get("", "")
    return text if text and parse_overlay(text) == overlay else ""


def _write(path: Path, text: str) -> None:
    """Replace a file in one step; a file that holds these bytes already is left alone."""
    data = text.encode("utf-8")
    try:
        if path.is_file() and path.read_bytes() == data:
            return
        write_bytes(path, data)
    except OSError as error:
        raise GraphError(
            Fault("unwritable", str(path), str(error.strerror), "a writable folder", "check it")
        ) from error
