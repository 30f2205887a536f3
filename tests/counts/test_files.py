"""Files are written whole or not at all."""

from __future__ import annotations

import hashlib
from pathlib import Path

import pytest

from workbench.counts.files import digest_of, text_of, write_text_atomically
from workbench.errors import InputError


def test_a_digest_is_the_sha256_of_the_bytes() -> None:
    # The published test vector for "abc": FIPS 180-2, Secure Hash Standard, 2002, appendix B.1.
    assert digest_of(b"abc") == "sha256:ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
    assert digest_of(b"") == "sha256:" + hashlib.sha256(b"").hexdigest()


def test_a_text_is_written_as_utf_8_and_leaves_nothing_else(tmp_path: Path) -> None:
    write_text_atomically(tmp_path / "a.txt", "σ\n")
    assert (tmp_path / "a.txt").read_bytes() == b"\xcf\x83\n"
    assert [path.name for path in tmp_path.iterdir()] == ["a.txt"]


def test_an_existing_file_keeps_its_permissions_and_a_link_its_target(tmp_path: Path) -> None:
    target, link = tmp_path / "a.txt", tmp_path / "link.txt"
    target.write_text("old")
    target.chmod(0o640)
    link.symlink_to(target)
    write_text_atomically(link, "new")
    assert link.is_symlink()
    assert target.read_text() == "new"
    assert target.stat().st_mode & 0o777 == 0o640


def test_the_old_content_stays_when_the_writing_fails(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = tmp_path / "a.txt"
    path.write_text("old")

    def full(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("os.fsync", full)
    with pytest.raises(InputError, match="no space left on device"):
        write_text_atomically(path, "new")
    assert path.read_text() == "old"
    assert [entry.name for entry in tmp_path.iterdir()] == ["a.txt"]


def test_a_missing_folder_is_said_to_be_missing(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="File can't be written"):
        write_text_atomically(tmp_path / "nowhere" / "a.txt", "")


def test_a_byte_that_is_no_utf_8_is_found_on_its_line() -> None:
    with pytest.raises(InputError, match=r"a\.csv, line 3") as caught:
        text_of(b"one\ntwo\nthr\xe9e", "a.csv")
    assert caught.value.problems[0].found == "byte 0xe9, which starts no UTF-8 character here"
