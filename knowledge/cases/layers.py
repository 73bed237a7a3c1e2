"""Overlays and rival models of a case: which lie on the base, in which order, and where they are kept.

An overlay of the case lies in ``overlays/`` beside case.yaml, one file an author, so that two people never write the
same file; a model is a name for a set of them, one small file a model in ``models/``.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from byway.knowledge.atomic import fingerprint, write_text
from byway.knowledge.cases.case import Case, open_case
from byway.knowledge.cases.files import inside
from byway.knowledge.cases.model import CaseFile
from byway.knowledge.faults import CaseError, Fault
from byway.knowledge.graph.emit import emit_yaml
from byway.knowledge.graph.overlay_files import read_overlay
from byway.knowledge.graph.overlays import Overlay
from byway.knowledge.yamltext import parse_yaml, read_yaml, validate

__all__ = ["CaseModel", "keep_model", "mention_overlay", "overlay_path", "overlays_of", "read_models", "slug"]

OVERLAYS, MODELS = "overlays", "models"
ANY = re.compile(r"^overlays\s*:", re.M)
ONE_LINE = re.compile(r"^overlays: ?\[[^\[\]\n#]*\][ \t]*\n", re.M)


def slug(text: str) -> str:
    """Letters and digits of a name, for a file.

    >>> slug("Dr. Émile B."), slug("??")
    ('dr_emile_b', 'unnamed')
    """
    plain = unicodedata.normalize("NFKD", text).encode("ascii", "ignore").decode().lower()
    return re.sub(r"[^a-z0-9]+", "_", plain).strip("_")[:60] or "unnamed"


def overlay_path(name: str) -> str:
    """Where an overlay of this name lies, relative to the case folder."""
    return f"{OVERLAYS}/{slug(name)}.yaml"


def overlays_of(case: Case) -> list[tuple[str, Overlay]]:
    """The overlays that a case names, lowest first, with their paths relative to its folder.

    Raises
    ------
    GraphError, CaseError
        One of them cannot be read, or lies outside the folder.
    """
    return [(name, read_overlay(inside(case.folder, name))) for name in case.spec.overlays]


def mention_overlay(case: Case, names: Iterable[str]) -> Case:
    """Write to case.yaml which overlays it uses; its comments stay, and other unsaved changes of ``case`` unsaved.

    Raises
    ------
    CaseError
        Somebody changed case.yaml since it was read.
    """
    listed = tuple(names)
    on_disk = open_case(case.folder)
    changed = case.with_spec(overlays=listed)
    if on_disk.seen != case.seen:
        return changed.save()  # tells of the rival version
    wanted = on_disk.with_spec(overlays=listed)
    line = emit_yaml({"overlays": list(listed)})
    text = case.path.read_text("utf-8")
    if ONE_LINE.search(text):
        text = ONE_LINE.sub(lambda _: line, text, count=1)
    elif not ANY.search(text):
        text = f"{text.rstrip()}\n{line}"
    if validate(CaseFile, parse_yaml(text, case.path.name, CaseError), CaseError) == wanted.spec:
        write_text(case.path, text)
        seen = fingerprint(case.path)
    else:  # the list is written in some other way: let the whole file be written anew
        seen = wanted.save().seen
    return Case(changed.spec, case.folder, seen, case.where)


@dataclass(frozen=True)
class CaseModel:
    """A named set of overlays of a case: paths relative to its folder, the lowest first."""

    name: str
    overlays: tuple[str, ...] = ()

    def read(self, folder: Path) -> tuple[Overlay, ...]:
        """The overlays themselves.

        Raises
        ------
        GraphError, CaseError
            One of them cannot be read, or lies outside the folder.
        """
        return tuple(read_overlay(inside(folder, path)) for path in self.overlays)


def keep_model(folder: Path, model: CaseModel) -> Path:
    """Write a model; one of the same name is replaced.

    Raises
    ------
    CaseError
        A model without a name, or a path that leads out of the folder.
    """
    if not model.name.strip():
        raise CaseError(Fault("model", "models", "a model without a name", "a name"))
    for overlay in model.overlays:
        inside(folder, overlay)
    path = folder / MODELS / f"{slug(model.name)}.yaml"
    write_text(path, emit_yaml({"name": model.name, "overlays": list(model.overlays)}))
    return path


def read_models(folder: Path) -> list[CaseModel]:
    """All models of a case folder, by name.

    Raises
    ------
    CaseError
        A file that is no model.
    """
    models = []
    for path in sorted((folder / MODELS).glob("*.yaml")):
        values = read_yaml(path, CaseError).value
        name, overlays = (values.get("name"), values.get("overlays")) if isinstance(values, dict) else (None, None)
        if not isinstance(name, str) or not isinstance(overlays, list) or not all(isinstance(o, str) for o in overlays):
            raise CaseError(Fault("model", f"{MODELS}/{path.name}", "no model", "name: and overlays: [paths]"))
        models.append(CaseModel(name, tuple(overlays)))
    return models
