"""What in a case folder could identify a person: listed before anything leaves, so that somebody looks.

It finds free text in image headers, dates, long numbers, mail addresses and telling file names. It cannot know a
name when it sees one: the list is for a reader, and an empty list is no promise.
"""

from __future__ import annotations

import gzip
import re
import zipfile
import zlib
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import nibabel as nib
import numpy as np
import pandas as pd
from nibabel.filebasedimages import ImageFileError

from byway.knowledge.atomic import write_bytes
from byway.knowledge.faults import Fault, ImageError

__all__ = ["Trace", "identifying_traces", "image_traces", "stripped_image", "traces_table"]

PATTERNS = {
    "a date": re.compile(r"(?<!\d)(?:19|20)\d\d[-_/.]?(?:0[1-9]|1[0-2])[-_/.]?(?:0[1-9]|[12]\d|3[01])(?!\d)"
                         r"|\b\d{1,2}[./]\d{1,2}[./](?:19|20)?\d\d\b"),
    "a long number": re.compile(r"(?<!\d)(?<!\d\.)\d{6,}(?!\d|\.\d)"),
    "a mail address": re.compile(r"\b[\w.+-]+@[\w-]+\.[\w.]+\b"),
    "a DICOM name": re.compile(r"\b\w+\^\w+"),
    "a title with a name": re.compile(r"\b(?:Mr|Mrs|Ms|Dr|Prof|Herr|Frau|Mme)\.? [A-Z][a-z]+"),
}  # fmt: skip
FREE_TEXT = ("descrip", "aux_file", "intent_name", "db_name", "data_type")
TEXT_FILES = {".yaml", ".json", ".jsonl", ".md", ".csv", ".tsv", ".txt"}
# Times of our own pages and journals are the record of who wrote when; ids and checksums are random or derived.
OUR_FIELDS = re.compile(r'"(?:time|id|note|replaces|reply_to|process|from|indices|values)": ?(?:"[^"]*"|\d+)'
                        r"|^[0-9a-f]{8} ", re.M)  # fmt: skip
# A version of case.yaml kept beside somebody else's; see byway.knowledge.cases.files.write_case.
KEPT_BESIDE = re.compile(r"case\.[0-9a-f]{12}-[0-9a-f]{10}\.yaml")
MOST_TEXT = 2_000_000


@dataclass(frozen=True)
class Trace:
    """One thing that could identify a person: in which file, where in it, what kind, and the text itself."""

    file: str
    place: str
    kind: str
    found: str


def identifying_traces(folder: Path) -> list[Trace]:
    """Everything in a case folder that could identify a person.

    Parameters
    ----------
    folder : Path
        A case folder. Nothing in it is changed.
    """
    traces: list[Trace] = []
    for path in sorted(p for p in folder.rglob("*") if p.is_file() and not p.is_symlink()):
        name = path.relative_to(folder).as_posix()
        if path.parent == folder and not KEPT_BESIDE.fullmatch(name):
            traces += [Trace(name, "file name", kind, text) for kind, text in _matches(path.name)]
        if name.endswith((".nii", ".nii.gz")):
            traces += _in_header(path, name)
        elif path.suffix.lower() in (".trk", ".tck", ".trx"):
            traces += _in_tractogram(path, name)
        elif path.suffix in TEXT_FILES and path.stat().st_size <= MOST_TEXT:
            traces += _in_text(path, name)
    return traces


def _matches(text: str) -> Iterator[tuple[str, str]]:
    for kind, pattern in PATTERNS.items():
        for match in pattern.finditer(text):
            yield kind, match.group()


def _in_header(path: Path, name: str) -> list[Trace]:
    try:
        header: Any = nib.load(path).header
    except (ImageFileError, OSError, ValueError) as error:
        return [Trace(name, "header", "an unreadable header", str(error).splitlines()[0])]
    traces = []
    for field in FREE_TEXT:
        if field in header:
            text = bytes(header[field].tobytes()).split(b"\0")[0].decode("latin-1").strip()
            if text:
                traces.append(Trace(name, field, "free text in the header", text))
    for extension in getattr(header, "extensions", ()):
        text = str(extension.get_content())[:60]
        traces.append(Trace(name, f"extension {extension.get_code()}", "a header extension", text))
    return traces


def _in_tractogram(path: Path, name: str) -> list[Trace]:
    """Free text that the header of streamlines may hold: commands and paths of the tool that made them, mostly."""
    try:
        if path.suffix.lower() == ".trx":
            if path.is_dir():
                return []
            with zipfile.ZipFile(path) as archive:
                lines = [archive.read("header.json")[:MOST_TEXT].decode("utf-8", "replace")]
            return [Trace(name, "header.json", kind, text) for line in lines for kind, text in _matches(line)]
        with path.open("rb") as stream:
            head = stream.read(1000 if path.suffix.lower() == ".trk" else 65_536)
    except (OSError, KeyError, zipfile.BadZipFile) as error:
        return [Trace(name, "header", "an unreadable header", str(error).splitlines()[0])]
    if path.suffix.lower() == ".trk":  # reserved and property fields, which tools fill as they like
        return [Trace(name, "header", kind, text) for kind, text in _matches(head.decode("latin-1").replace("\0", " "))]
    traces = []
    for line in head.partition(b"\nEND")[0].decode("utf-8", "replace").splitlines()[1:]:
        key, _, value = line.partition(": ")
        if key not in ("count", "total_count", "datatype", "file"):
            traces.append(Trace(name, key, "free text in the header", value.strip()[:200]))
    return traces


def _in_text(path: Path, name: str) -> list[Trace]:
    text = path.read_text("utf-8", errors="replace")
    traces = []
    for number, line in enumerate(text.splitlines(), start=1):
        shown = OUR_FIELDS.sub("", line)
        traces += [Trace(name, f"line {number}", kind, found) for kind, found in _matches(shown)]
    return traces


def image_traces(path: Path) -> list[Trace]:
    """What in an image's name and header could identify a person; see :func:`identifying_traces`."""
    named = [Trace(path.name, "file name", kind, text) for kind, text in _matches(path.name)]
    return named + _in_header(path, path.name)


def stripped_image(source: Path, target: Path) -> list[Trace]:
    """Copy a NIfTI image without free text, extensions or a telling name, and say what was left behind.

    Parameters
    ----------
    source : Path
        Any NIfTI file; it is not changed.
    target : Path
        Where the copy goes; voxels and their place in space are the same.

    Raises
    ------
    ImageError
        The file is no image that can be read.
    """
    found = image_traces(source)
    try:
        image: Any = nib.load(source)
        data = np.asanyarray(image.dataobj)
    except (ImageFileError, OSError, ValueError, EOFError, zlib.error) as error:
        raise ImageError(Fault("not-an-image", source.name, str(error).splitlines()[0], "a NIfTI file", "")) from error
    made: Any = nib.Nifti1Image
    copy = made(data, image.affine)
    copy.header.set_xyzt_units("mm")
    for get, put in ((image.get_sform, copy.set_sform), (image.get_qform, copy.set_qform)):
        affine, code = get(coded=True)
        put(affine, int(code))
    packed = copy.to_bytes()
    write_bytes(target, gzip.compress(packed, 4, mtime=0) if target.name.endswith(".gz") else packed)
    return found


def traces_table(traces: list[Trace]) -> pd.DataFrame:
    """The traces as a table: file, place, kind, found."""
    return pd.DataFrame([(t.file, t.place, t.kind, t.found) for t in traces],
                        columns=["file", "place", "kind", "found"])  # fmt: skip
