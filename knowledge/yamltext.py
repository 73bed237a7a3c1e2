"""YAML text read safely, with the line of every value, so that a fault can say where it stands.

Only plain mappings, lists and scalars are taken: tags, anchors and repeated keys are refused, and so is a file that
is too large to be text somebody reviewed.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from types import MappingProxyType
from typing import Any, TypeVar, get_args

import yaml
from pydantic import BaseModel, ValidationError

from byway.knowledge.faults import BywayError, Fault, nearest

__all__ = ["Lined", "parse_yaml", "read_yaml", "validate"]

MOST_BYTES = 5_000_000
SEE_FORMAT = "see the README's case format"
Loader: Any = getattr(yaml, "CSafeLoader", yaml.SafeLoader)


@dataclass(frozen=True)
class Lined:
    """A value read from YAML, and the line (from 1) of every place in it.

    Parameters
    ----------
    value : object
        Plain dicts, lists, strings, numbers, booleans, None.
    lines : dict
        Line of each place; a place is a tuple of keys and list positions, ``()`` is the whole text.
    name : str
        What to call the text in a fault.
    """

    value: Any
    lines: dict[tuple[Any, ...], int]
    name: str

    def where(self, place: tuple[Any, ...]) -> str:
        """``file:line key`` of a place, or of its nearest parent that has a line."""
        known = place
        while known not in self.lines and known:
            known = known[:-1]
        key = ".".join(map(str, place))
        return f"{self.name}:{self.lines.get(known, 1)}" + (f" {key}" if key else "")


def parse_yaml(text: str, name: str, error: type[BywayError] = BywayError) -> Lined:
    """Read YAML text.

    Raises
    ------
    BywayError
        (or ``error``) with line: not YAML, a tag, an anchor, or a key that stands twice.
    """
    loader = Loader(text)
    try:
        node = loader.get_single_node()
        if node is None:
            return Lined(None, {(): 1}, name)
        lines: dict[tuple[Any, ...], int] = {}
        if "&" in text or "!" in text:
            _refuse_marks(loader, text, name, error)
        return Lined(_value(loader, node, (), lines, name, error), lines, name)
    except yaml.YAMLError as fault:
        mark = getattr(fault, "problem_mark", None) or getattr(fault, "context_mark", None)
        line = mark.line + 1 if mark is not None else 1
        problem = str(getattr(fault, "problem", None) or fault).splitlines()[0]
        raise error(Fault("yaml", f"{name}:{line}", problem, "plain YAML", "mend that line")) from fault
    except (ValueError, RecursionError) as fault:
        raise error(Fault("yaml", name, str(fault).splitlines()[0], "plain YAML", "mend the value")) from fault
    finally:
        loader.dispose()


def read_yaml(path: Path, error: type[BywayError] = BywayError, name: str | None = None) -> Lined:
    """Read a YAML file; see :func:`parse_yaml`. A missing, unreadable or oversized file raises ``error`` too."""
    called = name or path.name
    try:
        size = path.stat().st_size
        if size > MOST_BYTES:
            raise error(Fault("too-large", called, f"{size:,} bytes", f"at most {MOST_BYTES:,}", "split the file"))
        text = path.read_text("utf-8")
    except UnicodeDecodeError as fault:
        raise error(Fault("encoding", called, f"bytes that are not UTF-8 at {fault.start}", "UTF-8 text")) from fault
    except OSError as fault:
        raise error(Fault("unreadable", str(path), str(fault.strerror), "a readable file", "check the path")) from fault
    return parse_yaml(text, called, error)


def _refuse_marks(loader: Any, text: str, name: str, error: type[BywayError]) -> None:
    event: Any
    for event in yaml.parse(text, Loader=type(loader)):
        anchor = getattr(event, "anchor", None)
        tag = getattr(event, "tag", None)
        if anchor or tag:
            found = f"an anchor or alias ({anchor})" if anchor else f"a tag ({tag})"
            where = f"{name}:{event.start_mark.line + 1}"
            raise error(Fault("yaml-mark", where, found, "plain values", "write the value out"))


def _value(
    loader: Any,
    node: Any,
    place: tuple[Any, ...],
    lines: dict[tuple[Any, ...], int],
    name: str,
    error: type[BywayError],
) -> Any:
    lines[place] = node.start_mark.line + 1
    if isinstance(node, yaml.MappingNode):
        mapping: dict[Any, Any] = {}
        for key_node, value_node in node.value:
            if not isinstance(key_node, yaml.ScalarNode):
                where = f"{name}:{key_node.start_mark.line + 1}"
                raise error(Fault("yaml-key", where, "a key that is no plain word", "a plain key"))
            key = loader.construct_object(key_node)
            if key in mapping:
                where = f"{name}:{key_node.start_mark.line + 1} {key}"
                raise error(Fault("duplicate", where, "a key that stands twice", "each key once", "remove one"))
            mapping[key] = _value(loader, value_node, (*place, key), lines, name, error)
            lines[(*place, key)] = key_node.start_mark.line + 1
        return mapping
    if isinstance(node, yaml.SequenceNode):
        return [_value(loader, item, (*place, i), lines, name, error) for i, item in enumerate(node.value)]
    return loader.construct_object(node)


Model = TypeVar("Model", bound=BaseModel)


def validate(
    model: type[Model],
    read: Lined,
    error: type[BywayError] = BywayError,
    expected: Mapping[str, str] = MappingProxyType({}),
) -> Model:
    """Make a pydantic record of what was read; each of its errors becomes a fault with its line.

    Parameters
    ----------
    model : type
        The record.
    read : Lined
        What was read.
    error : type
        What to raise.
    expected : mapping of field name to str
        What a field holds, in words, where the record's own message would say it in signs.

    Raises
    ------
    BywayError
        (or ``error``) holding every fault.
    """
    try:
        return model.model_validate(read.value if read.value is not None else {})
    except ValidationError as problem:
        faults = []
        for item in problem.errors(include_url=False):
            place = tuple(item["loc"])
            where, name = read.where(place), str(place[-1]) if place else ""
            if item["type"] == "extra_forbidden":
                known = _fields_at(model, place[:-1])
                hint = nearest(name, known) or (f"known: {', '.join(known)}" if known else "")
                faults.append(Fault("unknown-field", where, f"no field {name!r}", "", hint or SEE_FORMAT))
                continue
            found = "" if item["type"] == "missing" else f"{item['input']!r:.60}"
            if found and name in expected:
                faults.append(Fault("type", where, found, expected[name]))
            else:
                said = f"{item['msg']} (found {found})" if found else item["msg"]
                faults.append(Fault("type", where, said, "", SEE_FORMAT))
        raise error(*faults) from problem


def _fields_at(model: type[BaseModel], place: tuple[Any, ...]) -> list[str]:
    """Fields of the record that stands at a place within another; none where no record stands there."""
    here: list[Any] = [model]
    for step in place:
        if isinstance(step, int):
            continue  # the members of a list are of the kind that its field holds
        fields = [each.model_fields[step] for each in here if step in each.model_fields]
        here = [record for field in fields for record in _records_in(field.annotation)]
    return [name for record in here for name in record.model_fields]


def _records_in(annotation: Any) -> list[Any]:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return [annotation]
    return [record for part in get_args(annotation) for record in _records_in(part)]
