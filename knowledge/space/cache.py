"""A disk cache of built arrays, keyed by the hash of what they were built from. It may be deleted at any time.

One folder an entry: a JSON list of the arrays and one uncompressed ``.npy`` for each, written to a temporary folder
and moved into place, so that a reader never sees half an entry. Nothing is unpickled.
"""

from __future__ import annotations

import json
import os
import shutil
import tempfile
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray
from platformdirs import user_cache_dir

__all__ = ["KEPT", "cache_folder", "load_entry", "store_entry"]

KEPT = 4
"""Entries of one kind that stay: a few versions of the graph can be used in turn without building anew."""

_LIST = "entry.json"


def cache_folder() -> Path:
    """Folder of the cache: ``$BYWAY_CACHE``, else the user's cache folder of the platform."""
    return Path(os.environ.get("BYWAY_CACHE") or user_cache_dir("byway"))


def load_entry(name: str) -> tuple[dict[str, NDArray[Any]], dict[str, Any]] | None:
    """Arrays (memory-mapped, read-only) and facts of one entry, or None where it is missing or damaged."""
    folder = cache_folder() / name
    try:
        listed = json.loads((folder / _LIST).read_text("utf-8"))
        arrays = {}
        for key, (shape, dtype) in listed["arrays"].items():
            array = np.load(folder / f"{key}.npy", mmap_mode="r" if np.prod(shape) else None, allow_pickle=False)
            if list(array.shape) != shape or array.dtype.str != dtype:
                return None
            arrays[key] = array
    except (OSError, ValueError, KeyError, TypeError, AttributeError, EOFError):
        return None
    return arrays, listed["facts"]


def store_entry(name: str, arrays: Mapping[str, NDArray[Any]], facts: Mapping[str, Any], *, kept: int = KEPT) -> bool:
    """Write one entry, replacing what was there; False (and no harm) where the folder cannot be written.

    Of entries of the same kind (the same word before the first hyphen) the ``kept`` newest stay.
    """
    root = cache_folder()
    try:
        root.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryDirectory(dir=root) as scratch:
            building = Path(scratch) / "entry"
            building.mkdir()
            for key, array in arrays.items():
                np.save(building / f"{key}.npy", np.ascontiguousarray(array), allow_pickle=False)
            listed = {
                "arrays": {key: [list(array.shape), array.dtype.str] for key, array in arrays.items()},
                "facts": dict(facts),
            }
            (building / _LIST).write_text(json.dumps(listed), "utf-8")
            shutil.rmtree(root / name, ignore_errors=True)
            building.rename(root / name)
        _prune(root, name.partition("-")[0], kept)
    except OSError:
        return False
    return True


def _prune(root: Path, kind: str, kept: int) -> None:
    entries = [folder for folder in root.glob(f"{kind}*") if (folder / _LIST).is_file()]
    entries.sort(key=lambda folder: (folder / _LIST).stat().st_mtime, reverse=True)
    for folder in entries[kept:]:
        shutil.rmtree(folder, ignore_errors=True)
