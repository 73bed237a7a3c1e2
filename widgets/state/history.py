"""Undo and redo without limit: what an edit changed, kept small, given back bit for bit."""

from __future__ import annotations

import zlib
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["History", "Step", "packed_indices", "unpacked_indices"]


def packed_indices(indices: NDArray[np.integer]) -> bytes:
    """Ascending indices below 2^32 as compressed differences.

    >>> unpacked_indices(packed_indices(np.array([3, 4, 900]))).tolist()
    [3, 4, 900]
    """
    return zlib.compress(np.diff(indices, prepend=0).astype("<u4").tobytes(), 1)


def unpacked_indices(packed: bytes) -> NDArray[np.int64]:
    """The inverse of :func:`packed_indices`."""
    return np.cumsum(np.frombuffer(zlib.decompress(packed), "<u4"), dtype=np.int64)


@dataclass
class Step:
    """One edit, as what must be put back to cross it.

    Parameters
    ----------
    label : str
        The edit's name, for the screen.
    indices : bytes
        Changed voxels (C order), packed.
    values : bytes
        The values that these voxels have on the other side of the step, compressed.
    settings : object
        The settings (compartments and the like) on the other side, or None where the edit left them alone.
    """

    label: str
    indices: bytes
    values: bytes
    settings: Any = None

    @classmethod
    def of(cls, label: str, indices: NDArray[np.int64], old: NDArray[np.uint8], settings: Any = None) -> Step:
        """The step that an edit made, from the values before it."""
        return cls(label, packed_indices(indices), zlib.compress(old.tobytes(), 1), settings)

    @property
    def size_bytes(self) -> int:
        """What the step holds."""
        return len(self.indices) + len(self.values)

    def other_side(self) -> NDArray[np.uint8]:
        """The values that the voxels have on the other side of the step."""
        return np.frombuffer(zlib.decompress(self.values), np.uint8)

    def cross(self, flat: NDArray[np.uint8], settings: Any) -> tuple[NDArray[np.int64], Any]:
        """Swap values with ``flat`` in place; the step then leads back. Returns changed voxels, and settings to use."""
        indices = unpacked_indices(self.indices)
        here = flat[indices]
        flat[indices] = self.other_side()
        self.values = zlib.compress(here.tobytes(), 1)
        if self.settings is None:
            return indices, settings
        there, self.settings = self.settings, settings
        return indices, there


class History:
    """The steps behind and ahead of now."""

    def __init__(self) -> None:
        self.done: list[Step] = []
        self.undone: list[Step] = []

    def add(self, step: Step) -> None:
        """Add what was just done; what had been undone is gone."""
        self.done.append(step)
        self.undone.clear()

    def back(self, flat: NDArray[np.uint8], settings: Any) -> tuple[Step, NDArray[np.int64], Any] | None:
        """Undo one step; None where there is none."""
        return self._cross(self.done, self.undone, flat, settings)

    def forth(self, flat: NDArray[np.uint8], settings: Any) -> tuple[Step, NDArray[np.int64], Any] | None:
        """Redo one step; None where there is none."""
        return self._cross(self.undone, self.done, flat, settings)

    @staticmethod
    def _cross(source: list[Step], target: list[Step], flat: NDArray[np.uint8], settings: Any
               ) -> tuple[Step, NDArray[np.int64], Any] | None:  # fmt: skip
        if not source:
            return None
        step = source.pop()
        indices, there = step.cross(flat, settings)
        target.append(step)
        return step, indices, there

    @property
    def size_bytes(self) -> int:
        """What all steps hold."""
        return sum(step.size_bytes for step in (*self.done, *self.undone))
