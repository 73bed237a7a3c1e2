"""Files that the browser sends in parts, put together on disk and never held in memory as a whole."""

from __future__ import annotations

import contextlib
import re
import tempfile
from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path
from typing import IO, Any

from byway.knowledge.faults import BywayError, Fault

__all__ = ["MOST_BYTES", "Uploads"]

MOST_BYTES = 1_600_000_000


class Uploads:
    """Files on their way.

    Each part is a message with ``upload`` (an id), ``name``, ``part``, ``parts``, ``size`` and one buffer.
    """

    def __init__(self) -> None:
        self._open: dict[str, tuple[tempfile.TemporaryDirectory[str], IO[bytes], int]] = {}

    def add(self, message: Mapping[str, Any], buffers: Sequence[Any]) -> contextlib.AbstractContextManager[Path] | None:
        """Take a part; with the last one, a context that gives the file and removes it at its end.

        Raises
        ------
        BywayError
            If the file is too large, or a part is missing.
        """
        key, part, size = str(message["upload"]), int(message["part"]), int(message["size"])
        if size > MOST_BYTES:
            raise BywayError(Fault("upload-size", str(message["name"]), f"{size / 1e9:.1f} GB",
                                   f"at most {MOST_BYTES / 1e9:.0f} GB through the browser",
                                   "give the file's path on the kernel's machine instead"))  # fmt: skip
        if part == 0:
            folder = tempfile.TemporaryDirectory(prefix="byway-")
            name = re.sub(r"[^\w.+-]", "_", Path(str(message["name"])).name)[-80:] or "file"
            self._open[key] = (folder, (Path(folder.name) / name).open("wb"), 0)
        if key not in self._open or self._open[key][2] != part:
            self.drop(key)
            raise BywayError(
                Fault("upload-part", str(message["name"]), f"part {part} out of turn", "", "load it again")
            )
        folder, file, _ = self._open[key]
        file.write(buffers[0])
        self._open[key] = (folder, file, part + 1)
        if part + 1 < int(message["parts"]):
            return None
        del self._open[key]
        file.close()
        return self._lent(folder, Path(file.name))

    def drop(self, key: str) -> None:
        """Forget a file that will not be completed."""
        if key in self._open:
            folder, file, _ = self._open.pop(key)
            file.close()
            folder.cleanup()

    @staticmethod
    @contextlib.contextmanager
    def _lent(folder: tempfile.TemporaryDirectory[str], path: Path) -> Iterator[Path]:
        try:
            yield path
        finally:
            folder.cleanup()
