"""The text of a raw file as UTF-8, whatever it is packed in and however it is encoded."""

from __future__ import annotations

import codecs
import lzma
import struct
import zipfile
import zlib
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import pyarrow as pa

from lineproof.intake.formats import check_beginning
from lineproof.intake.stopping import stop

_BROKEN_ZIP = (
    *(zipfile.BadZipFile, zlib.error, lzma.LZMAError, struct.error),
    *(EOFError, RuntimeError, ValueError, OverflowError),
)


def text_of(file: str, label: str, encoding: str | None, size: int) -> Iterator[bytes]:
    """The file's text in UTF-8, about `size` bytes at a time, cut anywhere. UTF-8 itself is passed on unchecked.

    Raises KnownProblem when the file is not what its ending says, or holds a byte that its encoding has not,
    and OSError when a compressed file is broken.
    """
    with _opened(file, label) as stream:
        chunks = iter(lambda: bytes(stream.read(size)), b"")
        first = next(chunks, None)
        if first is None:
            return
        check_beginning(first, "text", label, encoding)
        yield from _recoded(_chained(first, chunks), label, encoding)


def _chained(first: bytes, chunks: Iterator[bytes]) -> Iterator[bytes]:
    yield first
    yield from chunks


@contextmanager
def _opened(file: str, label: str) -> Iterator[Any]:
    if not file.lower().endswith(".zip"):
        with pa.input_stream(file, compression="detect") as stream:
            yield stream
        return
    with (
        _saying_what_is_broken(),
        zipfile.ZipFile(file) as archive,
        archive.open(member_of(archive, label)) as stream,
    ):
        yield stream


@contextmanager
def _saying_what_is_broken() -> Iterator[None]:
    try:
        yield
    except _BROKEN_ZIP as error:
        raise OSError(str(error) or type(error).__name__) from None


def member_of(archive: zipfile.ZipFile, label: str) -> str:
    """The one file of a zip archive, what a Macintosh adds left aside.

    Raises KnownProblem when there is none, or more than one.
    """
    names = [n for n in archive.namelist() if not n.endswith("/") and not n.startswith("__MACOSX/")]
    if len(names) != 1:
        shown = ", ".join(names[:12]) + (f" and {len(names) - 12:,} more" if names[12:] else "")
        found = (
            f"the zip archive holds {len(names):,} files: {shown}"
            if names
            else "the zip archive is empty"
        )
        raise stop(label, found, "pack one file, or unpack it and name the files under file:")
    return names[0]


def member_name(file: str, label: str) -> str:
    """The name that says the format of a text file: that of the member, in a zip archive."""
    if not file.lower().endswith(".zip"):
        return Path(file).name
    with _saying_what_is_broken(), zipfile.ZipFile(file) as archive:
        return member_of(archive, label)


def _recoded(chunks: Iterator[bytes], label: str, encoding: str | None) -> Iterator[bytes]:
    if encoding is None:
        yield from chunks
        return
    try:
        decoder = codecs.getincrementaldecoder(encoding)()
    except LookupError:
        raise stop(
            f"{label}, encoding", f"no encoding is called {encoding!r}", "as in latin-1 or cp1252"
        ) from None
    position, line = 0, 1
    for chunk in _chained_end(chunks):
        pending = decoder.getstate()[0]
        try:
            text = decoder.decode(chunk or b"", final=chunk is None)
        except UnicodeError as error:
            start = getattr(error, "start", 0)
            before = (pending + (chunk or b""))[:start].decode(encoding, "ignore")
            found = f"byte {position - len(pending) + start + 1:,} is not {encoding} text"
            where = f"{label}, line {line + before.count(chr(10))}"
            raise stop(where, found, "check encoding:") from None
        line += text.count("\n")
        position += len(chunk or b"")
        if text:
            yield text.encode("utf-8", "surrogatepass")


def _chained_end(chunks: Iterator[bytes]) -> Iterator[bytes | None]:
    """The chunks, then None for the end of the file."""
    yield from chunks
    yield None


def check_utf8(text: bytes, first: int, position: int, label: str) -> None:
    """Stop at the first byte that is not UTF-8. `first` is the number of the text's first line, `position` that of
    its first byte in the file, from 0."""
    if text.isascii():
        return
    try:
        text.decode("utf-8")
    except UnicodeDecodeError as error:
        line = first + text.count(b"\n", 0, error.start)
        found = f"byte {position + error.start + 1:,} is not UTF-8 text"
        change = "save the file as UTF-8, or set encoding: as in latin-1 or cp1252"
        raise stop(f"{label}, line {line}", found, change) from None
