"""The disk cache: what comes back, and what happens to damage."""

from __future__ import annotations

import os
from pathlib import Path

import numpy as np
import pytest

from byway.knowledge.space.cache import cache_folder, load_entry, store_entry


@pytest.fixture(autouse=True)
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A cache of the test's own."""
    monkeypatch.setenv("BYWAY_CACHE", str(tmp_path / "cache"))
    return tmp_path / "cache"


ARRAYS = {"points": np.arange(12, dtype=np.float32).reshape(4, 3), "none": np.empty((0, 3)), "core": np.array([True])}


def test_an_entry_comes_back_the_same(folder: Path) -> None:
    """Arrays, also empty ones, and facts are equal after a round trip; nothing else is left in the folder."""
    assert store_entry("entry", ARRAYS, {"ids": ["a@left"]})
    arrays, facts = load_entry("entry") or pytest.fail("nothing stored")
    assert facts == {"ids": ["a@left"]}
    for key, array in ARRAYS.items():
        np.testing.assert_array_equal(arrays[key], array)
        assert arrays[key].dtype == array.dtype
    assert [each.name for each in folder.iterdir()] == ["entry"]


def test_damaged_entries_are_not_used(folder: Path) -> None:
    """A missing folder, a cut file, a broken list or another shape all read as nothing."""
    assert load_entry("entry") is None
    for damage in ("cut", "list", "shape", "gone"):
        store_entry("entry", ARRAYS, {})
        points = folder / "entry" / "points.npy"
        match damage:
            case "cut":
                points.write_bytes(points.read_bytes()[:100])
            case "list":
                (folder / "entry" / "entry.json").write_text("{")
            case "shape":
                np.save(points, np.zeros((2, 3), np.float32))
            case "gone":
                points.unlink()
        assert load_entry("entry") is None, damage


def test_nothing_is_unpickled(folder: Path) -> None:
    """An array of objects, which would need unpickling, reads as nothing."""
    store_entry("entry", ARRAYS, {})
    np.save(folder / "entry" / "points.npy", np.array([{"a": 1}], object), allow_pickle=True)
    assert load_entry("entry") is None


def test_only_the_newest_entries_of_a_kind_stay(folder: Path) -> None:
    """Storing a fifth version drops the oldest; entries of another kind stay."""
    store_entry("other-0", ARRAYS, {})
    for number in range(5):
        store_entry(f"geometry-{number}", ARRAYS, {})
        os.utime(folder / f"geometry-{number}" / "entry.json", (number, number))
    store_entry("geometry-5", ARRAYS, {})
    assert sorted(each.name for each in folder.iterdir()) == [*(f"geometry-{n}" for n in (2, 3, 4, 5)), "other-0"]


def test_a_folder_that_cannot_be_written_does_no_harm(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Where a file stands in the place of the folder, storing says False and loading says None."""
    blocked = tmp_path / "blocked"
    blocked.write_text("")
    monkeypatch.setenv("BYWAY_CACHE", str(blocked))
    assert cache_folder() == blocked
    assert not store_entry("entry", ARRAYS, {})
    assert load_entry("entry") is None
