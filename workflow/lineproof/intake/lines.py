"""Text files as blocks of whole lines, and for each line whether its fields fit the header.

One line is one row: a quoted field may hold the separator and doubled quotes, but no line end. So
an unbalanced quote spoils its own line only, and no row's fate depends on the rows around it.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numba import njit

from lineproof.intake.decoding import check_utf8, text_of
from lineproof.intake.stopping import stop

_BLOCK = 1 << 24  # bytes read at a time
_LONGEST = 1 << 28  # bytes that one line may have
_N_MISFITS = 1 << 10  # room for lines that do not fit, at first
_BOM = b"\xef\xbb\xbf"

_LINE_FEED, _RETURN, _QUOTE, _BLANK = 10, 13, 34, 32
_PLAIN, _IS_SEPARATOR, _IS_LINE_FEED, _IS_RETURN, _IS_QUOTE = 0, 1, 2, 3, 4
_IS_BLANK, _FIELDS, _INSIDE, _STRAY, _ODD = 0, 1, 2, 3, 4
_REASONS = {
    _INSIDE: "a carriage return inside the row",
    _STRAY: "a quote that is not at the edge of its field",
    _ODD: "a quote that is opened and not closed",
}


@dataclass(frozen=True)
class Block:
    """Whole lines of a file in UTF-8, the first of them numbered `first`; a byte-order mark is left out."""

    text: bytes
    first: int


def read_blocks(file: str, label: str, encoding: str | None = None) -> Iterator[Block]:
    """The lines of a text file, compressed or not by its ending; no block for an empty file.

    Raises KnownProblem at the first byte that the encoding has not, and OSError when a compressed file is broken.
    """
    number, position = 1, 0
    for text in _whole_lines(text_of(file, label, encoding, _BLOCK), label):
        check_utf8(text, number, position, label)
        yield Block(text.removeprefix(_BOM) if number == 1 else text, number)
        number, position = number + text.count(b"\n"), position + len(text)


def _whole_lines(chunks: Iterator[bytes], label: str) -> Iterator[bytes]:
    """The same bytes, cut behind line ends only."""
    rest: list[bytes] = []
    waiting = 0
    for chunk in chunks:
        cut = chunk.rfind(b"\n") + 1
        if not cut:
            rest.append(chunk)
            waiting += len(chunk)
            if waiting > _LONGEST:
                found = f"a line is longer than {_LONGEST >> 20} MB"
                raise stop(label, found, "are there line ends, and is it text?")
            continue
        yield b"".join([*rest, chunk[:cut]]) if rest else chunk[:cut]
        rest = [chunk[cut:]] if cut < len(chunk) else []
        waiting = len(chunk) - cut
    if rest:
        yield b"".join(rest)


@dataclass(frozen=True)
class Misfits:
    """What is known of the lines of a block.

    `n_lines` counts them and `longest` is the length of the longest in bytes. The arrays, each (n_misfits,), describe
    the lines that are no row or do not fit the header: `index` from 0, `start` and `stop` in the text, the
    number of fields, and what is wrong.
    """

    n_lines: int
    longest: int
    index: np.ndarray
    start: np.ndarray
    stop: np.ndarray
    n_fields: np.ndarray
    wrong: np.ndarray

    def rejects(self, first: int, n_fields: int) -> list[tuple[int, str]]:
        """Line and reason of each line that is not blank; the block begins with line `first`."""
        return [
            (first + index, _REASONS.get(wrong, f"{found} fields instead of {n_fields}"))
            for index, found, wrong in zip(
                self.index.tolist(), self.n_fields.tolist(), self.wrong.tolist(), strict=True
            )
            if wrong != _IS_BLANK
        ]

    def fitting(self, text: bytes) -> bytes:
        """The text without these lines."""
        if not len(self.index):
            return text
        view = memoryview(text)
        starts = [0, *self.stop.tolist()]
        stops = [*self.start.tolist(), len(text)]
        return b"".join(view[a:b] for a, b in zip(starts, stops, strict=True) if b > a)


def find_misfits(text: bytes, separator: str, n_fields: int) -> Misfits:
    """Find the lines that are blank, and those that do not split into `n_fields` fields.

    A line of blanks is blank unless it has as many separators as the header.
    """
    data = np.frombuffer(text, np.uint8)
    kind = np.zeros(256, np.uint8)
    kind[[_LINE_FEED, _RETURN, _QUOTE]] = _IS_LINE_FEED, _IS_RETURN, _IS_QUOTE
    kind[ord(separator)] = _IS_SEPARATOR
    room = _N_MISFITS
    while True:
        found = np.empty((5, room), np.int64)
        n_lines, longest, n_misfits = _scan(data, kind, n_fields, found)
        if n_misfits <= room:
            return Misfits(n_lines, longest, *found[:, :n_misfits])
        room = n_misfits


@njit(cache=True, nogil=True)
def _scan(data, kind, n_fields, found):  # pragma: no cover - compiled
    """Go through the text once; of the misfits, as many are written as there is room for in `found`."""
    n_lines, longest, n_misfits = 0, 0, 0
    start, separators, quotes, returns = 0, 0, 0, 0
    for at in range(len(data) + 1):
        if at < len(data):
            what = kind[data[at]]
            if what == _PLAIN:
                continue
            if what == _IS_SEPARATOR:
                separators += 1
                continue
            if what == _IS_QUOTE:
                quotes += 1
                continue
            if what == _IS_RETURN:
                returns += 1
                continue
        elif start == at:
            break
        end = at
        if end > start and data[end - 1] == _RETURN:
            end -= 1
            returns -= 1
        wrong, fields = -1, separators + 1
        if quotes or returns:
            wrong, fields = _quoted(data, kind, start, end, quotes, returns)
        if wrong < 0 and fields != n_fields:
            wrong = _FIELDS
        if start == end or (fields != n_fields and _all_blank(data, start, end)):
            wrong = _IS_BLANK
        if wrong >= 0:
            if n_misfits < found.shape[1]:
                found[0, n_misfits], found[1, n_misfits] = n_lines, start
                found[2, n_misfits] = min(at + 1, len(data))
                found[3, n_misfits], found[4, n_misfits] = fields, wrong
            n_misfits += 1
        longest = max(longest, at + 1 - start)
        n_lines += 1
        start, separators, quotes, returns = at + 1, 0, 0, 0
    return n_lines, longest, n_misfits


@njit(cache=True, nogil=True)
def _quoted(data, kind, start, end, quotes, returns):  # pragma: no cover - compiled
    """What is wrong with a line that has quotes or carriage returns, or -1, and how many fields it has.

    A quote stands at the edge of a field or beside another quote; blanks may stand between a closing quote and the
    end of its field.
    """
    fields, inside, stray = 1, False, False
    for at in range(start, end):
        what = kind[data[at]]
        if what == _IS_SEPARATOR and not inside:
            fields += 1
        elif what == _IS_QUOTE:
            if inside:
                after = at + 1
                while after < end and data[after] == _BLANK and kind[data[after]] == _PLAIN:
                    after += 1
                fits = after >= end
                if not fits:
                    fits = kind[data[after]] == _IS_SEPARATOR or kind[data[after]] == _IS_QUOTE
            else:
                fits = at == start
                if not fits:
                    before = kind[data[at - 1]]
                    fits = before in (_IS_SEPARATOR, _IS_QUOTE)
            stray = stray or not fits
            inside = not inside
    if quotes % 2:
        return _ODD, fields
    if stray:
        return _STRAY, fields
    return (_INSIDE if returns else -1), fields


@njit(cache=True, nogil=True)
def _all_blank(data, start, end):  # pragma: no cover - compiled
    n_blank = 0
    for at in range(start, end):
        n_blank += data[at] == _BLANK or 9 <= data[at] <= 13
    return n_blank == end - start


@njit(cache=True, nogil=True)
def has_blanks(data: np.ndarray) -> bool:  # pragma: no cover - compiled
    """Whether UTF-8 text, uint8 (n_bytes,), may hold a blank of any kind; no false no."""
    found = 0
    for at in range(len(data)):
        byte = data[at]
        found |= (byte >= 128) | ((byte <= _BLANK) & (byte >= 9))
    return found != 0


def pick_lines(blocks: Iterator[Block], wanted: np.ndarray) -> Iterator[list[str]]:
    """The text of the lines with the numbers `wanted` (ascending), without line ends, some at a time."""
    done = 0
    for block in blocks:
        if done == len(wanted):
            return
        n_lines = block.text.count(b"\n") + (not block.text.endswith(b"\n"))
        upto = int(np.searchsorted(wanted, block.first + n_lines))
        if upto > done:
            ends = np.flatnonzero(np.frombuffer(block.text, np.uint8) == _LINE_FEED)
            ends = np.append(ends, len(block.text))
            yield [
                _line(block.text, ends, index)
                for index in (wanted[done:upto] - block.first).tolist()
            ]
            done = upto


def _line(text: bytes, ends: np.ndarray, index: int) -> str:
    start = int(ends[index - 1]) + 1 if index else 0
    return text[start : int(ends[index])].removesuffix(b"\r").decode("utf-8")
