"""Backgrounds to draw on: scans in template space, held once, in the numbers that the browser shows.

A scan is held as int16 on the template grid with a slope and an intercept, so that a CT keeps its Hounsfield units and
nothing is held twice; the template is held as uint8.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import BywayError, Fault, nearest
from byway.knowledge.space.template import template_volume

__all__ = ["TEMPLATE", "Scan", "Scans", "quantised"]

TEMPLATE = "template"
_LEVELS = 4000.0


@dataclass(frozen=True, eq=False)
class Scan:
    """One background.

    Parameters
    ----------
    key, name, sequence : str
        Its id, what the user reads, and the sequence (``t1``, ``flair``, ``dwi``, ``ct`` ...).
    stored : int16 or uint8 array
        On the template grid.
    slope, intercept : float
        Value = stored * slope + intercept.
    window : tuple of float
        Values shown as black and as white at first.
    unit : str
        ``HU`` for a CT, otherwise empty (arbitrary).
    notes : tuple of str
        What was done to it on the way in.
    """

    key: str
    name: str
    sequence: str
    stored: NDArray[np.int16] | NDArray[np.uint8] = field(repr=False)
    slope: float
    intercept: float
    window: tuple[float, float]
    unit: str = ""
    notes: tuple[str, ...] = ()

    def in_range(self, low: float, high: float) -> NDArray[np.bool_]:
        """Voxels whose value lies in [low, high]."""
        a = np.ceil((low - self.intercept) / self.slope - 1e-6)
        b = np.floor((high - self.intercept) / self.slope + 1e-6)
        limits = np.iinfo(self.stored.dtype)
        if b < limits.min or a > limits.max or b < a:
            return np.zeros(self.stored.shape, bool)
        first, last = (int(np.clip(x, limits.min, limits.max)) for x in (a, b))
        return np.asarray((self.stored >= first) & (self.stored <= last))

    def value(self, voxel: tuple[int, int, int]) -> float:
        """Value at a voxel."""
        return float(self.stored[voxel]) * self.slope + self.intercept


def quantised(key: str, name: str, sequence: str, volume: NDArray[np.floating], notes: tuple[str, ...] = ()) -> Scan:
    """A scan from values on the template grid (NaN counts as the lowest value)."""
    finite = np.isfinite(volume)
    whole = bool(finite.all())
    low = float(volume.min() if whole else volume[finite].min(initial=0))
    high = float(volume.max() if whole else volume[finite].max(initial=1))
    if sequence == "ct" and low >= -32000 and high <= 32000:
        slope, intercept, unit = 1.0, 0.0, "HU"
    else:
        slope, intercept, unit = max((high - low) / _LEVELS, 1e-12), low, ""
    stored = np.empty(volume.shape, np.int16)
    for i in range(volume.shape[0]):  # a layer at a time: no second copy of the whole scan
        layer = volume[i] if whole else np.where(finite[i], volume[i], low)
        stored[i] = np.rint((layer - intercept) / slope)
    brain = stored[::2, ::2, ::2]
    lit = brain[brain > brain.min()]
    first, last = np.percentile(lit, [2, 99.5]) if lit.size else (0, 1)
    window = (0.0, 80.0) if unit else (float(first) * slope + intercept, float(last) * slope + intercept)
    return Scan(key, name, sequence, stored, slope, intercept, window, unit, notes)


class Scans:
    """The backgrounds of a case, by key, the template first."""

    def __init__(self) -> None:
        stored = np.rint(template_volume("t1") * 255).astype(np.uint8)
        self._scans = {TEMPLATE: Scan(TEMPLATE, "MNI152 2009", "t1", stored, 1.0, 0.0, (0.0, 262.0))}

    def __iter__(self) -> Iterator[Scan]:
        return iter(self._scans.values())

    def __getitem__(self, key: str) -> Scan:
        try:
            return self._scans[key]
        except KeyError:
            raise BywayError(
                Fault("unknown-scan", "scans", f"no scan {key!r}", "", nearest(key, self._scans))
            ) from None

    def add(self, scan: Scan) -> None:
        """Add a background, or replace the one with the same key."""
        self._scans[scan.key] = scan

    def remove(self, key: str) -> None:
        """Forget a background; the template stays."""
        if key != TEMPLATE:
            self._scans.pop(key, None)
