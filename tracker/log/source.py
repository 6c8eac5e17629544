"""Find a file and bring its bytes in: folders, encodings, and files that are not logs at all."""

from __future__ import annotations

import codecs
import hashlib
from concurrent.futures import Future, ThreadPoolExecutor
from dataclasses import dataclass
from pathlib import Path

from tracker.errors import InputError
from tracker.log.facts import FACTS_FILE

PARQUET_MAGIC = b"PAR1"
_FOREIGN = {
    b"\x1f\x8b": ("compressed (gzip)", "Decompress it first."),
    b"PK\x03\x04": ("a zip archive or spreadsheet", "Export the table as CSV."),
    b"BZh": ("compressed (bzip2)", "Decompress it first."),
    b"\x28\xb5\x2f\xfd": ("compressed (zstd)", "Decompress it first."),
    b"\xfd7zXZ": ("compressed (xz)", "Decompress it first."),
    b"SQLite format 3": ("a SQLite database", "Export the table as CSV."),
}


@dataclass(frozen=True, slots=True)
class Source:
    """A file's content: Parquet as it is, or text.

    Text is UTF-8 without byte order mark, its lines ended by LF or CR LF.
    """

    path: Path
    data: bytes
    is_parquet: bool
    hashing: Future[str]

    @property
    def digest(self) -> str:
        """SHA-256 of the file as it is on disk, hexadecimal."""
        return self.hashing.result()


def locate(path: str | Path, stem: str) -> Path:
    """The file to read: `path`, or in a folder the one file named ``stem.*``.

    Raises InputError if there is none, or several.
    """
    path = Path(path)
    try:
        if not path.is_dir():
            return path
        files = sorted(item for item in path.iterdir() if item.is_file())
    except (OSError, ValueError) as error:
        raise InputError(f"cannot be read: {_why(error)}", path=path) from None
    matches = [item for item in files if item.stem == stem]
    if len(matches) == 1:
        return matches[0]
    if stem == "tracks" and (path / "tracks.csv") in matches:
        return path / "tracks.csv"  # a run folder has the same rows in tracks.parquet
    names = [item.name for item in (matches or files) if item.name != FACTS_FILE]
    listed = ", ".join(names[:8]) + (", …" if len(names) > 8 else "")
    raise InputError(
        f"this is a folder with {'more than one' if matches else 'no'} file named '{stem}.*'",
        path=path,
        found=listed or "nothing",
        remedy="Name the file itself.",
    )


def open_source(path: Path) -> Source:
    """Read the whole file and make sure that it is text in a known encoding, or Parquet.

    Raises InputError for a file that is missing, empty, not readable or of another nature.
    """
    try:
        raw = path.read_bytes()
    except FileNotFoundError:
        raise InputError("there is no such file", path=path, remedy=_nearby(path)) from None
    except PermissionError:
        raise InputError(
            "permission denied", path=path, remedy="You need the right to read this file."
        ) from None
    except (OSError, ValueError) as error:
        raise InputError(f"cannot be read: {_why(error)}", path=path) from None
    if not raw:
        raise InputError("the file is empty", path=path)
    hashing = _hash_beside(raw)
    if raw.startswith(PARQUET_MAGIC):
        return Source(path, raw, True, hashing)
    data = _as_utf8(raw, path)
    if b"\r" in data and data.count(b"\r") != data.count(b"\r\n"):
        data = data.replace(b"\r\n", b"\n").replace(b"\r", b"\n")
    return Source(path, data, False, hashing)


def _hash_beside(raw: bytes) -> Future[str]:
    """Hash on a thread of its own: hashlib lets go of the interpreter lock."""
    pool = ThreadPoolExecutor(max_workers=1)
    hashing = pool.submit(lambda: hashlib.sha256(raw).hexdigest())
    pool.shutdown(wait=False)
    return hashing


def _as_utf8(raw: bytes, path: Path) -> bytes:
    for magic, (what, remedy) in _FOREIGN.items():
        if raw.startswith(magic):
            raise InputError(f"this file is {what}, not a table", path=path, remedy=remedy)
    if raw.startswith((codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE)):
        try:
            return raw.decode("utf-16").encode("utf-8")
        except UnicodeError as error:
            offset = getattr(error, "start", 0)
            raise _unreadable(raw, offset, "UTF-16", path) from None
    zero = raw.find(b"\0")
    if zero >= 0:
        raise InputError(
            f"this is a binary file (a zero byte at offset {zero})",
            path=path,
            remedy="Logs are CSV, Parquet, NDJSON or the public benchmark text layout.",
        )
    start = len(codecs.BOM_UTF8) if raw.startswith(codecs.BOM_UTF8) else 0
    if not raw.isascii():
        try:
            raw.decode("utf-8")
        except UnicodeDecodeError as error:
            raise _unreadable(raw, error.start, "UTF-8", path) from None
    return raw[start:] if start else raw


def _unreadable(raw: bytes, offset: int, encoding: str, path: Path) -> InputError:
    newline = "\n".encode("utf-16-le" if raw[:2] == codecs.BOM_UTF16_LE else "utf-16-be")
    line = 1 + raw.count(newline if encoding == "UTF-16" else b"\n", 0, offset)
    return InputError(
        f"not {encoding} text: the byte 0x{raw[offset]:02X} at offset {offset} cannot be read",
        path=path,
        line=line,
        remedy="Save the file as UTF-8 (with or without byte order mark) or UTF-16 with one.",
    )


def _nearby(path: Path) -> str:
    """A remedy for a mistyped path: what is there instead."""
    import difflib

    try:
        names = [item.name for item in path.parent.iterdir()]
    except OSError:
        return f"The folder {path.parent} is not there either."
    near = difflib.get_close_matches(path.name, names, n=1, cutoff=0.6)
    return f"Did you mean {path.with_name(near[0])}?" if near else ""


def _why(error: Exception) -> str:
    return getattr(error, "strerror", None) or str(error)
