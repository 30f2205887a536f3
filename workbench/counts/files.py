"""Bytes in, bytes out: reading with the reason why not, writing whole or not at all, digests."""

from __future__ import annotations

import codecs
import contextlib
import difflib
import hashlib
import os
import tempfile
from pathlib import Path

from workbench.errors import InputError, Problem, quoted


def digest_of(data: bytes) -> str:
    """Return the digest that names these bytes in every record: "sha256:" and 64 hexadecimal digits."""
    return "sha256:" + hashlib.sha256(data).hexdigest()


def read_bytes(path: Path, shown: str) -> bytes:
    """Return what a file holds.

    Args:
        path: the file.
        shown: its name as the user gave it.

    Raises:
        InputError: if there is no such file or it can't be read.
    """
    try:
        return path.read_bytes()
    except (OSError, ValueError) as error:
        raise InputError(_unreadable(path, shown, error)) from error


def text_of(data: bytes, shown: str) -> str:
    r"""Return bytes as text: UTF-8, a byte order mark dropped, every line ended by \n.

    Args:
        data: the file's bytes.
        shown: its name as the user gave it.

    Raises:
        InputError: if the bytes are no UTF-8.
    """
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise InputError(_undecodable(data, shown, error.start)) from error
    return text.replace("\r\n", "\n").replace("\r", "\n")


def write_text_atomically(path: Path, text: str) -> None:
    """Write a UTF-8 text file so that whoever looks sees the old content or the new, never a part.

    Args:
        path: the file; a link is followed, an existing file keeps its permissions.
        text: what it shall hold.

    Raises:
        InputError: if the folder is missing or can't be written to.
    """
    write_bytes_atomically(path, text.encode("utf-8"))


def write_bytes_atomically(path: Path, data: bytes) -> None:
    """Write a file so that whoever looks sees the old content or the new, never a part.

    Args:
        path: the file; a link is followed, an existing file keeps its permissions.
        data: what it shall hold.

    Raises:
        InputError: if the folder is missing or can't be written to.
    """
    target = path.resolve()
    try:
        handle, name = tempfile.mkstemp(dir=target.parent, prefix=f".{target.name}.")
        scratch = Path(name)
        try:
            with os.fdopen(handle, "wb") as stream:
                stream.write(data)
                stream.flush()
                os.fsync(stream.fileno())
            scratch.chmod(_mode_for(target))
            scratch.replace(target)
        except BaseException:
            with contextlib.suppress(OSError):
                scratch.unlink()
            raise
    except OSError as error:
        raise InputError(_unwritable(path, error)) from error


def _mode_for(target: Path) -> int:
    try:
        return target.stat().st_mode & 0o777
    except FileNotFoundError:
        return 0o644


def _unreadable(path: Path, shown: str, error: OSError | ValueError) -> Problem:
    if isinstance(error, FileNotFoundError):
        names = [entry.name for entry in path.parent.iterdir()] if path.parent.is_dir() else []
        close = difflib.get_close_matches(path.name, names, n=1)
        remedy = f"use {quoted(close[0])}, which is there" if close else "check the name and the folder"
        return Problem("File not found", shown, "no such file", "a file that exists", remedy)
    if isinstance(error, IsADirectoryError):
        return Problem("A folder where a file is needed", shown, "a folder", "a file", "name a file in it")
    found = (error.strerror if isinstance(error, OSError) else None) or str(error)
    return Problem(
        "File can't be read", shown, found.lower(), "a file that can be read", "check its permissions"
    )


def _unwritable(path: Path, error: OSError) -> Problem:
    return Problem(
        "File can't be written",
        str(path),
        (error.strerror or str(error)).lower(),
        "a folder that exists and can be written to",
        "make the folder, or choose another",
    )


def _undecodable(data: bytes, shown: str, start: int) -> Problem:
    line = data.count(b"\n", 0, start) + 1
    is_utf16 = data.startswith((codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE))
    return Problem(
        "Text in another encoding than UTF-8",
        f"{shown}, line {line}",
        "UTF-16" if is_utf16 else f"byte 0x{data[start]:02x}, which starts no UTF-8 character here",
        "UTF-8",
        "save the file again with the encoding UTF-8",
    )
