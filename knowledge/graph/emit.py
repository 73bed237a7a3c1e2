"""Plain values to YAML text: one way to write each value, so that equal values give equal bytes and diffs read well."""

from __future__ import annotations

import json
import re
from collections.abc import Mapping
from typing import Any

__all__ = ["emit_yaml"]

# Words that stand without quotes: no YAML reader takes them for anything but a word. (y, n, yes, no, on, off, true,
# false, null and the like are words to us and switches to some readers.)
PLAIN = re.compile(r"[A-Za-z_][A-Za-z0-9_.@-]*\Z")
SWITCHES = {"y", "n", "yes", "no", "on", "off", "true", "false", "null"}
# Characters that JSON leaves as they are and YAML does not take raw.
ESCAPED = re.compile("[\x7f-\x9f\u2028\u2029\ufeff\ufffe\uffff]")
LONE_SURROGATE = re.compile("[\ud800-\udfff]")


def emit_yaml(values: Mapping[str, Any]) -> str:
    r"""YAML text of a mapping of plain values.

    Mappings stand one field a line, lists in one line, text in double quotes (bare where it is a plain key-like
    word). The order of the mapping is kept.

    Raises
    ------
    TypeError
        A value that is no mapping, list, string, number, boolean or None.
    ValueError
        A number that is not finite, or text that is no Unicode.

    >>> print(emit_yaml({"reason": "too broad", "sources": ["a_2001"], "weight": 1e-5}), end="")
    reason: "too broad"
    sources: [a_2001]
    weight: 1.0e-05
    """
    return "".join(f"{line}\n" for line in _lines(values, ""))


def _lines(values: Mapping[str, Any], indent: str) -> list[str]:
    lines = []
    for key, value in values.items():
        if isinstance(value, Mapping) and value:
            lines.append(f"{indent}{_text(str(key), bare=True)}:")
            lines += _lines(value, indent + "  ")
        else:
            lines.append(f"{indent}{_text(str(key), bare=True)}: {_inline(value)}")
    return lines


def _inline(value: Any) -> str:
    match value:
        case None:
            return "null"
        case bool():
            return "true" if value else "false"
        case int():
            return str(value)
        case float():
            return _number(value)
        case str():
            return _text(value, bare=bool(re.fullmatch(r"[a-z][a-z0-9_]*", value)))
        case Mapping():
            inside = ", ".join(f"{_text(str(key), bare=True)}: {_inline(item)}" for key, item in value.items())
            return f"{{{inside}}}"
        case list() | tuple():
            return f"[{', '.join(_inline(item) for item in value)}]"
    raise TypeError(f"{type(value).__name__} cannot stand in an overlay")


def _number(value: float) -> str:
    text = repr(value)
    if text in ("nan", "inf", "-inf"):
        raise ValueError(f"{text} is no number that a graph can hold")
    # YAML takes "1e-05" for a word; "1.0e-05" it takes for the number.
    return text.replace("e", ".0e") if "e" in text and "." not in text else text


def _text(value: str, *, bare: bool) -> str:
    if LONE_SURROGATE.search(value):
        raise ValueError("text with half of a character")
    if bare and PLAIN.match(value) and value.lower() not in SWITCHES:
        return value
    quoted = json.dumps(value, ensure_ascii=False)
    return ESCAPED.sub(lambda match: f"\\u{ord(match[0]):04x}", quoted)
