"""Ragged tables: the members of every row, packed into flat arrays."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

__all__ = ["Rows", "gather_rows", "gather_runs", "stretches"]


@dataclass(frozen=True, eq=False)
class Rows:
    """A ragged table: row ``r`` holds ``members[offsets[r]:offsets[r + 1]]``, ascending.

    Parameters
    ----------
    offsets : (N + 1,) int32
        Bounds of the rows.
    members : (M,) int32
        Members of all rows.
    weights : (M,) float32, optional
        Weight of each member in its row; 1 where None.
    """

    offsets: NDArray[np.int32] = field(repr=False)
    members: NDArray[np.int32] = field(repr=False)
    weights: NDArray[np.float32] | None = field(default=None, repr=False)

    @classmethod
    def inverted(cls, matrix: sparse.csr_matrix, *, weighted: bool = False) -> Rows:
        """Rows by the columns of a (member, column) matrix."""
        turned = matrix.tocsc()
        return cls(
            turned.indptr.astype(np.int32),
            turned.indices.astype(np.int32),
            turned.data.astype(np.float32) if weighted else None,
        )

    def without_repeats(self, *, shift: int = 0) -> Rows:
        """The same rows with each member once, moved up by ``shift``; weights are dropped."""
        first = np.ones(len(self.members), bool)
        first[1:] = self.members[1:] != self.members[:-1]
        starts = self.offsets[:-1]
        first[starts[starts < len(self.members)]] = True
        kept = np.concatenate([[0], np.cumsum(first)])
        return Rows(kept[self.offsets].astype(np.int32), self.members[first] + np.int32(shift))

    def chosen(self, keep: NDArray[np.bool_]) -> Rows:
        """The same rows with only the members where ``keep`` (one flag a member of the table) is true."""
        kept = np.concatenate([[0], np.cumsum(keep)])
        weights = None if self.weights is None else self.weights[keep]
        return Rows(kept[self.offsets].astype(np.int32), self.members[keep], weights)


def gather_rows(rows: Rows, wanted: NDArray[np.integer]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Positions in ``rows.members`` of all members of the rows ``wanted``, in turn, and how many each row has.

    Examples
    --------
    >>> rows = Rows(np.array([0, 2, 2, 3], np.int32), np.array([7, 9, 8], np.int32))
    >>> at, count = gather_rows(rows, np.array([2, 0]))
    >>> rows.members[at].tolist(), count.tolist()
    ([8, 7, 9], [1, 2])
    """
    return gather_runs(rows.offsets, wanted)


def stretches(offsets: NDArray[np.integer], rows: NDArray[np.integer]) -> NDArray[np.int64]:
    """Positions of all members of ``rows`` (ascending), like :func:`gather_rows`, but row by row of neighbours.

    A lesion's voxels follow one another in columns, and so do their rows: a whole column is one stretch of members.

    Examples
    --------
    >>> stretches(np.array([0, 2, 3, 3, 6]), np.array([0, 1, 3])).tolist()
    [0, 1, 2, 3, 4, 5]
    """
    if len(rows) == 0:
        return np.empty(0, np.int64)
    breaks = np.flatnonzero(np.diff(rows) != 1)
    first = offsets[rows[np.append(0, breaks + 1)]].astype(np.int64)
    count = offsets[rows[np.append(breaks, len(rows) - 1)] + 1] - first
    ends = np.cumsum(count)
    places: NDArray[np.int64] = np.arange(int(ends[-1])) + np.repeat(first - (ends - count), count)
    return places


def gather_runs(
    offsets: NDArray[np.integer], wanted: NDArray[np.integer]
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Whole numbers of the runs ``offsets[w]`` to ``offsets[w + 1]``, in turn, and the length of each run."""
    start = offsets[wanted].astype(np.int64)
    count = offsets[wanted + 1].astype(np.int64) - start
    ends = np.cumsum(count)
    total = int(ends[-1]) if len(ends) else 0
    return np.arange(total) + np.repeat(start - (ends - count), count), count
