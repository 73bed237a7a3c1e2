"""Faults: what went wrong, where, and what would mend it.

Every checker gathers :class:`Fault` values in a :class:`FaultReport` and raises once, so that a reader sees all of
them. Bad input raises :class:`BywayError` (or a subclass), whose ``str()`` is one line fit for a screen.
"""

from __future__ import annotations

import difflib
import re
from collections.abc import Iterable, Iterator
from dataclasses import dataclass, field

__all__ = ["BywayError", "CaseError", "Fault", "FaultReport", "GraphError", "ImageError", "nearest"]


SHORTEST_PART = 3
"""Letters that a part of a key has at least to suggest the key: nearly every key contains any two letters."""


@dataclass(frozen=True)
class Fault:
    """One fault.

    Parameters
    ----------
    rule : str
        Name of the rule that is broken, for example ``"unknown-key"``.
    where : str
        File, and line and key where known (``"signs/motor.yaml:12 hemiparesis"``).
    found, expected, remedy : str
        What stood there, what would be right, and what the reader can do.
    grave : bool
        Whether the input cannot be used; otherwise it is a warning.
    """

    rule: str
    where: str
    found: str
    expected: str = ""
    remedy: str = ""
    grave: bool = True

    def __str__(self) -> str:
        parts = [f"{self.where}: {self.found}"]
        if self.expected:
            parts.append(f"expected {self.expected}")
        if self.remedy:
            parts.append(self.remedy)
        return "; ".join(parts)


class BywayError(Exception):
    """Bad input, told in one line; the pieces are in ``fault``.

    Raises nothing itself. The command line prints ``str(error)`` and exits with 2.
    """

    def __init__(self, fault: Fault | str, *more: Fault) -> None:
        first = fault if isinstance(fault, Fault) else Fault("input", "byway", fault)
        self.faults: tuple[Fault, ...] = (first, *more)
        text = str(first) if isinstance(fault, Fault) else fault
        super().__init__(text + (f" (and {len(more)} more)" if more else ""))

    @property
    def fault(self) -> Fault:
        """The first fault."""
        return self.faults[0]


class GraphError(BywayError):
    """The curated text, or an overlay on it, breaks a rule of the graph."""


class ImageError(BywayError):
    """An image file cannot be used as a lesion, a scan or a map."""


class CaseError(BywayError):
    """A case folder or case.yaml cannot be read."""


@dataclass
class FaultReport:
    """All faults found by a check, in the order in which they were found."""

    faults: list[Fault] = field(default_factory=list)

    def add(
        self, rule: str, where: str, found: str, expected: str = "", remedy: str = "", *, grave: bool = True
    ) -> None:
        """Add one fault."""
        self.faults.append(Fault(rule, where, found, expected, remedy, grave))

    def extend(self, faults: Iterable[Fault]) -> None:
        """Add many faults."""
        self.faults.extend(faults)

    def __iter__(self) -> Iterator[Fault]:
        return iter(self.faults)

    def __len__(self) -> int:
        return len(self.faults)

    @property
    def grave(self) -> list[Fault]:
        """The faults that forbid use."""
        return [fault for fault in self.faults if fault.grave]

    def raise_if_grave(self, error: type[BywayError] = BywayError) -> None:
        """Raise ``error`` with every grave fault, if there is one."""
        if self.grave:
            raise error(*self.grave)


def nearest(word: str, known: Iterable[str], count: int = 3) -> str:
    """Suggest known keys near a misspelt or shortened one, as ``"did you mean a, b?"``, or an empty string.

    Keys with a word that starts with the given one come first, then those that contain it, then those spelt alike.

    >>> nearest("hemipareses", ["hemiparesis", "apathy"])
    'did you mean hemiparesis?'
    >>> nearest("hemianopia", ["hemiplegia", "homonymous_hemianopia"])
    'did you mean homonymous_hemianopia, hemiplegia?'
    """
    keys, part = list(dict.fromkeys(known)), word.casefold()
    holding = [key for key in keys if part in key.casefold()] if len(part) >= SHORTEST_PART else []
    starting = [key for key in holding if any(each.startswith(part) for each in _starts(key.casefold()))]
    alike = difflib.get_close_matches(word, keys, n=count, cutoff=0.6)
    close = list(dict.fromkeys([*starting, *holding, *alike]))[:count]
    return f"did you mean {', '.join(close)}?" if close else ""


def _starts(key: str) -> list[str]:
    """A key from each of its words on, so that several words of it are found too."""
    breaks = [match.end() for match in re.finditer(r"[^a-z0-9]+", key)]
    return [key[at:] for at in (0, *breaks)]
