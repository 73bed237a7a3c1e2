"""Which elements lie at a voxel, as one code a voxel: read-outs and overlays then need no question to the kernel."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.damage.index import DamageIndex

__all__ = ["ElementMap"]


@dataclass(frozen=True, eq=False)
class ElementMap:
    """Codes of voxels, and the elements behind each code.

    Parameters
    ----------
    codes : uint16 or uint32 array of the grid's shape
        0 where no element lies; otherwise a row of the ragged table below.
    offsets : (C + 1,) uint32
        Row ``c`` holds ``members[offsets[c]:offsets[c + 1]]``; row 0 is empty.
    members : (M,) uint16
        Positions in ``element_ids``.
    element_ids : tuple of str
        Ids of the geometry's elements, regions first.
    """

    codes: NDArray[np.uint16] | NDArray[np.uint32] = field(repr=False)
    offsets: NDArray[np.uint32] = field(repr=False)
    members: NDArray[np.uint16] = field(repr=False)
    element_ids: tuple[str, ...] = field(repr=False)

    @classmethod
    def build(cls, index: DamageIndex) -> ElementMap:
        """From the damage index: parcels that hold the voxel, segments with a streamline through it."""
        tables = (index.regions, index.segments)
        n_rows = len(index.voxel_of_row)
        marks = np.random.default_rng(0).integers(1, 2**63, len(index.geometry.element_ids), np.int64)
        signature = np.zeros(n_rows, np.int64)  # the sum of its members' marks tells a set, whatever its order
        for table in tables:
            running = np.concatenate([[0], np.cumsum(marks[table.members])])  # wraps around, as sums of marks may
            signature += running[table.offsets[1:]] - running[table.offsets[:-1]]
        _, first, code = np.unique(signature, return_index=True, return_inverse=True)
        rows = [np.concatenate([t.members[t.offsets[row] : t.offsets[row + 1]] for t in tables]) for row in first]
        offsets = np.cumsum([0, 0, *(len(row) for row in rows)]).astype(np.uint32)
        codes: Any = np.zeros(index.geometry.grid.size, np.uint16 if len(rows) < 65_535 else np.uint32)
        codes[index.voxel_of_row] = code.reshape(-1) + 1
        members = np.concatenate(rows) if rows else np.empty(0)
        return cls(codes.reshape(index.geometry.grid.shape), offsets, members.astype(np.uint16),
                   index.geometry.element_ids)  # fmt: skip

    def at(self, voxel: tuple[int, int, int]) -> list[int]:
        """Positions of the elements at a voxel."""
        code = int(self.codes[voxel])
        return [int(m) for m in self.members[self.offsets[code] : self.offsets[code + 1]]]
