"""The archive of a case: goes out and comes back whole, and nothing unsafe comes in."""

from __future__ import annotations

import json
import stat
import zipfile
from pathlib import Path

import pytest

from byway.knowledge.cases.archive import MANIFEST, pack_case, unpack_case
from byway.knowledge.cases.pages import Note, Pages
from byway.knowledge.faults import CaseError


@pytest.fixture
def case(tmp_path: Path) -> Path:
    """A small case folder."""
    folder = tmp_path / "case"
    folder.mkdir()
    (folder / "case.yaml").write_text("schema_version: 1\nstage: acute\n")
    Pages(folder).put(Note(author="AB", text="one"))
    return folder


def test_round_trip(case: Path, tmp_path: Path) -> None:
    """What is unpacked equals what was packed, file by file."""
    pack_case(case, tmp_path / "out.zip")
    unpack_case(tmp_path / "out.zip", tmp_path / "back")
    files = {p.relative_to(case): p.read_bytes() for p in case.rglob("*") if p.is_file()}
    assert {
        p.relative_to(tmp_path / "back"): p.read_bytes() for p in (tmp_path / "back").rglob("*") if p.is_file()
    } == files


def test_hidden_files_and_links_stay_behind(case: Path, tmp_path: Path) -> None:
    """Hidden files and links are not packed."""
    (case / ".secret").write_text("x")
    (case / "link.yaml").symlink_to("/etc/hostname")
    assert not {"link.yaml", ".secret"} & set(pack_case(case, tmp_path / "out.zip"))


def _zip(path: Path, entries: dict[str, bytes], *, mode: int = 0o644, version: int = 1) -> Path:
    import hashlib

    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as pack:
        digests = {name: hashlib.sha256(data).hexdigest() for name, data in entries.items()}
        pack.writestr(MANIFEST, json.dumps({"archive_version": version, "schema_version": 1, "sha256": digests}))
        for name, data in entries.items():
            entry = zipfile.ZipInfo(name)
            entry.external_attr = mode << 16
            entry.compress_type = zipfile.ZIP_DEFLATED
            pack.writestr(entry, data)
    return path


@pytest.mark.parametrize(
    ("entries", "said"),
    [
        ({"../case.yaml": b"x"}, "relative path"),
        ({"/etc/case.yaml": b"x"}, "relative path"),
        ({"a/../../case.yaml": b"x"}, "relative path"),
        ({"a\\..\\case.yaml": b"x"}, "relative path"),
        ({"C:case.yaml": b"x"}, "relative path"),
        ({"run.sh": b"x"}, "no kind of file"),
        ({".git/config.yaml": b"x"}, "no kind of file"),
        ({"case.yaml": b"0" * 50_000_000}, "times its size"),
        ({"case.yaml": b"x", "CASE.yaml": b"y"}, "stands twice"),
    ],
)
def test_unsafe_archives_are_refused(entries: dict[str, bytes], said: str, tmp_path: Path) -> None:
    """Each unsafe archive is refused in one line that says why, and nothing is written."""
    archive = _zip(tmp_path / "bad.zip", entries)
    with pytest.raises(CaseError, match=said) as caught:
        unpack_case(archive, tmp_path / "in" / "case")
    assert "\n" not in str(caught.value)
    assert not (tmp_path / "in" / "case").exists()


def test_a_link_is_refused(tmp_path: Path) -> None:
    """A symbolic link in an archive is refused."""
    with pytest.raises(CaseError, match="link"):
        unpack_case(_zip(tmp_path / "l.zip", {"case.yaml": b"/etc"}, mode=stat.S_IFLNK | 0o777), tmp_path / "c")


def test_an_unknown_version_is_refused(tmp_path: Path) -> None:
    """An archive of a later version is refused by its number."""
    with pytest.raises(CaseError, match="version 7"):
        unpack_case(_zip(tmp_path / "v.zip", {"case.yaml": b"x"}, version=7), tmp_path / "c")


def test_a_changed_byte_is_seen(case: Path, tmp_path: Path) -> None:
    """A file that does not match its checksum is refused."""
    archive = _zip(tmp_path / "c.zip", {"case.yaml": b"good"})
    with zipfile.ZipFile(archive) as pack:
        manifest = pack.read(MANIFEST)
    with zipfile.ZipFile(archive, "w") as pack:
        pack.writestr(MANIFEST, manifest)
        pack.writestr("case.yaml", b"evil")
    with pytest.raises(CaseError, match="checksum"):
        unpack_case(archive, tmp_path / "c")


@pytest.mark.parametrize("data", [b"", b"PK\x03\x04 torn", b"not a zip at all"])
def test_no_zip_at_all(data: bytes, tmp_path: Path) -> None:
    """A file that is no zip gets one clear line."""
    (tmp_path / "x.zip").write_bytes(data)
    with pytest.raises(CaseError, match="no readable zip"):
        unpack_case(tmp_path / "x.zip", tmp_path / "c")


def test_nothing_leaves_unlooked_at(case: Path, tmp_path: Path) -> None:
    """A case with a date in it is packed only once somebody says that they have looked; before, nothing is written."""
    (case / "case.yaml").write_text("stage: acute\ntitle: seen on 2020-01-31\n")
    with pytest.raises(CaseError, match="1 things that could identify a person"):
        pack_case(case, tmp_path / "out.zip")
    assert not (tmp_path / "out.zip").exists()
    assert "case.yaml" in pack_case(case, tmp_path / "out.zip", reviewed=True)
