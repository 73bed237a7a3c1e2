"""Ragged tables."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from byway.knowledge.damage.rows import Rows, gather_rows

TABLES = st.lists(st.lists(st.integers(0, 9), max_size=5).map(sorted), min_size=1, max_size=8)


def packed(table: list[list[int]]) -> Rows:
    """A table of lists, packed."""
    offsets = np.cumsum([0, *(len(row) for row in table)]).astype(np.int32)
    return Rows(offsets, np.array([m for row in table for m in row], np.int32))


@given(TABLES, st.data())
def test_gathering_rows_equals_joining_lists(table, data):
    """In the order asked for, with repeats."""
    wanted = data.draw(st.lists(st.integers(0, len(table) - 1), max_size=10))
    rows = packed(table)
    at, count = gather_rows(rows, np.array(wanted, int))
    assert rows.members[at].tolist() == [m for w in wanted for m in table[w]]
    assert count.tolist() == [len(table[w]) for w in wanted]


@given(TABLES, st.integers(0, 5))
def test_without_repeats_keeps_each_member_once(table, shift):
    """Row by row, moved up by the shift."""
    rows = packed(table).without_repeats(shift=shift)
    expected = [[m + shift for m in sorted(set(row))] for row in table]
    assert [rows.members[a:b].tolist() for a, b in zip(rows.offsets[:-1], rows.offsets[1:], strict=True)] == expected


@given(TABLES, st.data())
def test_chosen_members_keep_their_rows(table, data):
    """Only flagged members stay."""
    rows = packed(table)
    keep = np.array(data.draw(st.lists(st.booleans(), min_size=len(rows.members), max_size=len(rows.members))), bool)
    chosen = rows.chosen(keep)
    flags = iter(keep)
    expected = [[m for m in row if next(flags)] for row in table]
    bounds = zip(chosen.offsets[:-1], chosen.offsets[1:], strict=True)
    assert [chosen.members[a:b].tolist() for a, b in bounds] == expected
