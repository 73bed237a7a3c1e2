"""A case as one file to send: a zip of the case folder, with a manifest of versions and checksums.

Import trusts nothing: no absolute or climbing paths, no links, no more than a bounded size, ratio and count, no
unknown version, and every file must match its checksum. It unpacks beside the goal and moves it there in one step.
"""

from __future__ import annotations

import hashlib
import json
import os
import shutil
import stat
import tempfile
import zipfile
from pathlib import Path, PurePosixPath

from byway.knowledge.cases.model import SCHEMA_VERSION
from byway.knowledge.cases.privacy import identifying_traces
from byway.knowledge.faults import CaseError, Fault

__all__ = ["ARCHIVE_VERSION", "pack_case", "unpack_case"]

ARCHIVE_VERSION = 1
MANIFEST = "byway-archive.json"
MOST_FILES = 10_000
MOST_BYTES = 2_000_000_000
MOST_RATIO = 200.0
MOST_MANIFEST = 5_000_000
KEPT = (".yaml", ".json", ".jsonl", ".nii", ".gz", ".md", ".csv", ".tsv", ".txt", ".html", ".pdf",
        ".trk", ".tck", ".trx")  # fmt: skip


def pack_case(folder: Path, archive: Path, *, reviewed: bool = False) -> list[str]:
    """Pack a case folder into ``archive`` (zip) and return the names it holds.

    Hidden files, links and files of other kinds than a case has stay behind. Times inside the archive are set to a
    fixed date, since file dates can identify a person.

    Parameters
    ----------
    folder, archive : Path
        The case folder, and the file to write.
    reviewed : bool
        Say that somebody has looked at :func:`~byway.knowledge.cases.privacy.identifying_traces`; needed where that
        list is not empty. Whether a date or a name may leave is a person's decision, not a program's.

    Raises
    ------
    CaseError
        There is no case, or something in it could identify a person and nobody has looked; nothing is written.
    """
    if not (folder / "case.yaml").is_file():
        raise CaseError(Fault("no-case", str(folder), "no case.yaml", "a case folder", "name the folder that holds it"))
    traces = [] if reviewed else identifying_traces(folder)
    if traces:
        raise CaseError(Fault("traces", str(folder), f"{len(traces)} things that could identify a person",
                              "a look at each of them", "read the list, then pack it with --reviewed "
                              "(reviewed=True); nothing was written"))  # fmt: skip
    files = [path for path in sorted(folder.rglob("*")) if path.is_file() and not path.is_symlink()
             and path.name.endswith(KEPT) and not any(part.startswith(".") for part in path.relative_to(folder).parts)
             and path.resolve() != archive.resolve()]  # fmt: skip
    names = [path.relative_to(folder).as_posix() for path in files]
    manifest = {"archive_version": ARCHIVE_VERSION, "schema_version": SCHEMA_VERSION,
                "sha256": {name: _digest(path) for name, path in zip(names, files, strict=True)}}  # fmt: skip
    handle, beside = tempfile.mkstemp(dir=archive.parent, suffix=".part")
    os.close(handle)
    try:
        with zipfile.ZipFile(beside, "w", zipfile.ZIP_DEFLATED) as pack:
            pack.writestr(zipfile.ZipInfo(MANIFEST), json.dumps(manifest, indent=1))
            for name, path in zip(names, files, strict=True):
                entry = zipfile.ZipInfo(name)
                entry.compress_type = zipfile.ZIP_DEFLATED
                entry.external_attr = 0o644 << 16
                with path.open("rb") as source, pack.open(entry, "w", force_zip64=True) as target:
                    shutil.copyfileobj(source, target)
        os.replace(beside, archive)
    except BaseException:
        Path(beside).unlink(missing_ok=True)
        raise
    return names


def unpack_case(archive: Path, folder: Path) -> Path:
    """Unpack an archive into a new case folder, or say why not; nothing is left behind where it fails.

    Raises
    ------
    CaseError
        Where the file is no such archive, of an unknown version, unsafe, too large, or damaged; or the folder exists.
    """
    if folder.exists():
        raise CaseError(Fault("folder-exists", str(folder), "a folder or file of that name", "a new name",
                              "nothing was written"))  # fmt: skip
    try:
        with zipfile.ZipFile(archive) as pack:
            return _unpack(pack, archive, folder)
    except (zipfile.BadZipFile, zipfile.LargeZipFile, EOFError, NotImplementedError, RuntimeError) as error:
        raise _refusal(archive, f"no readable zip ({error})") from error
    except OSError as error:
        raise _refusal(archive, str(error.strerror or error)) from error


def _refusal(archive: Path, found: str, expected: str = "an archive made by `byway archive`") -> CaseError:
    return CaseError(Fault("archive", archive.name, found, expected, "nothing was written"))


def _unpack(pack: zipfile.ZipFile, archive: Path, folder: Path) -> Path:
    entries = pack.infolist()
    _check_entries(entries, archive)
    manifest = _manifest(pack, archive)
    digests: dict[str, str] = manifest["sha256"]
    names = {entry.filename for entry in entries} - {MANIFEST}
    if names != set(digests):
        odd = sorted(names ^ set(digests))[0]
        raise _refusal(archive, f"{odd} is in the archive or its manifest alone")
    folder.parent.mkdir(parents=True, exist_ok=True)
    beside = Path(tempfile.mkdtemp(dir=folder.parent, prefix=f".{folder.name}."))
    try:
        spent = 0
        for entry in entries:
            if entry.filename == MANIFEST:
                continue
            target = beside / entry.filename
            target.parent.mkdir(parents=True, exist_ok=True)
            spent += _extract(pack, entry, target, MOST_BYTES - spent, archive)
            if _digest(target) != digests[entry.filename]:
                raise _refusal(archive, f"{entry.filename} does not match its checksum", "an undamaged archive")
        os.replace(beside, folder)
    except BaseException:
        shutil.rmtree(beside, ignore_errors=True)
        raise
    return folder


def _check_entries(entries: list[zipfile.ZipInfo], archive: Path) -> None:
    if len(entries) > MOST_FILES:
        raise _refusal(archive, f"{len(entries):,} files", f"at most {MOST_FILES:,}")
    total, packed = sum(e.file_size for e in entries), sum(e.compress_size for e in entries)
    if total > MOST_BYTES:
        raise _refusal(archive, f"{total:,} bytes unpacked", f"at most {MOST_BYTES:,}")
    if total > 1_000_000 and total > MOST_RATIO * max(packed, 1):
        raise _refusal(archive, f"unpacks to {total / max(packed, 1):.0f} times its size", f"at most {MOST_RATIO:.0f}")
    seen: set[str] = set()
    for entry in entries:
        name, path = entry.filename, PurePosixPath(entry.filename)
        mode = entry.external_attr >> 16
        if stat.S_ISLNK(mode) or (mode and stat.S_IFMT(mode) not in (0, stat.S_IFREG)):
            raise _refusal(archive, f"{name} is a link or a special file", "plain files")
        climbs = path.is_absolute() or ".." in path.parts or "\\" in name or ":" in name or "\0" in name
        if climbs or name.endswith("/") or name != path.as_posix():
            raise _refusal(archive, f"{name!r} is no plain relative path", "names inside the case folder")
        if name != MANIFEST and (not name.endswith(KEPT) or any(part.startswith(".") for part in path.parts)):
            raise _refusal(archive, f"{name} is no kind of file that a case has", ", ".join(KEPT))
        if name.casefold() in seen:
            raise _refusal(archive, f"{name} stands twice", "each name once")
        seen.add(name.casefold())


def _manifest(pack: zipfile.ZipFile, archive: Path) -> dict[str, dict[str, str]]:
    try:
        info = pack.getinfo(MANIFEST)
    except KeyError as error:
        raise _refusal(archive, f"no {MANIFEST}") from error
    if info.file_size > MOST_MANIFEST:
        raise _refusal(archive, f"a manifest of {info.file_size:,} bytes", f"at most {MOST_MANIFEST:,}")
    try:
        manifest = json.loads(pack.read(MANIFEST))
        version, schema = manifest["archive_version"], manifest["schema_version"]
        digests = manifest["sha256"]
        sound = isinstance(digests, dict) and all(isinstance(v, str) for v in digests.values())
    except (ValueError, KeyError, TypeError) as error:
        raise _refusal(archive, "a manifest that cannot be read") from error
    if version != ARCHIVE_VERSION or not isinstance(schema, int) or schema > SCHEMA_VERSION or not sound:
        raise _refusal(archive, f"archive version {version!r}, case schema {schema!r}",
                       f"version {ARCHIVE_VERSION}, schema up to {SCHEMA_VERSION}")  # fmt: skip
    return manifest  # type: ignore[no-any-return]


def _extract(pack: zipfile.ZipFile, entry: zipfile.ZipInfo, target: Path, left: int, archive: Path) -> int:
    """Copy one entry, counting real bytes: a header may lie about its size."""
    spent = 0
    with pack.open(entry) as source, target.open("xb") as out:
        while chunk := source.read(1 << 20):
            spent += len(chunk)
            if spent > min(left, entry.file_size):
                raise _refusal(archive, f"{entry.filename} is larger than it says")
            out.write(chunk)
    return spent


def _digest(path: Path) -> str:
    with path.open("rb") as handle:
        return hashlib.file_digest(handle, "sha256").hexdigest()
