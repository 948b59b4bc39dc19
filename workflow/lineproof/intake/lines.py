"""Text files as blocks of whole lines, and for each line whether its fields fit the header.

One line is one row: a quoted field may hold the separator and doubled quotes, but no line end. So
an unbalanced quote spoils its own line only, and no row's fate depends on the rows around it.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import pyarrow as pa

from lineproof.intake.stopping import stop

_BLOCK = 1 << 23  # bytes read at a time
_BOM = b"\xef\xbb\xbf"
_LINE_FEED, _RETURN, _QUOTE, _BLANK = b'\n\r" '

# First bytes of files that are not the text their name says.
_OTHER_FORMATS = {
    b"PAR1\x15": "a Parquet file",
    b"\x1f\x8b": "compressed with gzip",
    b"\x28\xb5\x2f\xfd": "compressed with zstandard",
    b"PK\x03\x04": "a spreadsheet or a zip archive",
    b"\xff\xfe": "UTF-16 text",
    b"\xfe\xff": "UTF-16 text",
}


@dataclass(frozen=True)
class Block:
    """Whole lines of a file.

    Line i, numbered `first` + i in the file, is `text[start[i]:end[i]]` without its line end;
    `start` and `end` are int64 arrays (n_lines,).
    """

    text: bytes
    start: np.ndarray
    end: np.ndarray
    first: int

    def __len__(self) -> int:
        return len(self.start)

    def line(self, index: int) -> str:
        """One line as text."""
        return self.text[self.start[index] : self.end[index]].decode("utf-8")

    def only(self, wanted: np.ndarray) -> bytes:
        """The lines marked in a mask (n_lines,), with their line ends."""
        edges = np.append(self.start, len(self.text))
        turns = np.flatnonzero(np.diff(wanted.astype(np.int8), prepend=0, append=0))
        runs = edges[turns].reshape(-1, 2).tolist()
        view = memoryview(self.text)
        return b"".join(view[start:end] for start, end in runs)


def read_blocks(file: str, label: str) -> Iterator[Block]:
    """The lines of a text file, compressed or not by its ending; no block for an empty file.

    A byte-order mark is left out of the first line. Raises KnownProblem at the first byte that is
    not UTF-8, and OSError when a compressed file is broken.
    """
    number, position = 1, 0
    for text in _whole_lines(file):
        if number == 1:
            _check_format(text, label)
        block = _block(text, number)
        _check_utf8(block, position, label)
        yield block
        number, position = number + len(block), position + len(text)


def _whole_lines(file: str) -> Iterator[bytes]:
    rest = b""
    with pa.input_stream(file, compression="detect") as stream:
        while chunk := stream.read(_BLOCK):
            text = rest + chunk
            cut = text.rfind(b"\n") + 1
            rest = text[cut:]
            if cut:
                yield text[:cut]
    if rest:
        yield rest


def _block(text: bytes, first: int) -> Block:
    data = np.frombuffer(text, np.uint8)
    end = np.flatnonzero(data == _LINE_FEED)
    if data[-1] != _LINE_FEED:
        end = np.append(end, len(data))
    start = np.append(0, end[:-1] + 1)
    end = end - ((end > start) & (data[end - 1] == _RETURN))
    if first == 1 and text.startswith(_BOM):
        start[0] = len(_BOM)
    return Block(text, start, end, first)


def _check_format(text: bytes, label: str) -> None:
    for beginning, what in _OTHER_FORMATS.items():
        if text.startswith(beginning):
            found = f"its ending says plain text, but its first bytes say it is {what}"
            raise stop(label, found, "name it as what it is, or save it as CSV")


def _check_utf8(block: Block, position: int, label: str) -> None:
    try:
        block.text.decode("utf-8")
    except UnicodeDecodeError as error:
        line = block.first + int(np.searchsorted(block.start, error.start, "right")) - 1
        found = f"byte {position + error.start + 1:,} is not UTF-8 text"
        raise stop(f"{label}, line {line}", found, "save the file as UTF-8") from None


def find_misfits(block: Block, separator: str, n_fields: int) -> tuple[np.ndarray, dict[int, str]]:
    """Which lines are blank, a mask (n_lines,), and what is wrong with lines that do not fit.

    The reasons are by index of the line; a line without one splits into `n_fields` fields.
    """
    data = np.frombuffer(block.text, np.uint8)
    separators = np.flatnonzero(data == ord(separator))
    quotes = np.flatnonzero(data == _QUOTE)
    odd = stray = np.zeros(len(block), bool)
    if len(quotes):
        odd = _per_line(quotes, block) % 2 == 1
        stray = _has_stray_quote(data, quotes, block, separator)
        separators = separators[~_is_quoted(separators, quotes, block)]
    n_found = _per_line(separators, block) + 1
    returns = np.flatnonzero(data == _RETURN)
    inside = returns[np.append(data[1:], _LINE_FEED)[returns] != _LINE_FEED]
    reasons: dict[int, str] = {}
    blank = block.start == block.end
    for index in np.flatnonzero((n_found != n_fields) & ~blank).tolist():
        blank[index] = not block.text[block.start[index] : block.end[index]].strip()
        reasons[index] = f"{n_found[index]} fields instead of {n_fields}"
    for mask, said in (
        (_per_line(inside, block) > 0, "a carriage return inside the row"),
        (stray, "a quote that is not at the edge of its field"),
        (odd, "a quote that is opened and not closed"),
    ):
        reasons.update(dict.fromkeys(np.flatnonzero(mask).tolist(), said))
    return blank, {i: said for i, said in sorted(reasons.items()) if not blank[i]}


def _per_line(positions: np.ndarray, block: Block) -> np.ndarray:
    """How many of the ascending positions lie in each line: int64 (n_lines,)."""
    edges = np.append(block.start, len(block.text))
    return np.diff(np.searchsorted(positions, edges))


def _line_of(positions: np.ndarray, block: Block) -> np.ndarray:
    return np.repeat(np.arange(len(block)), _per_line(positions, block))


def _is_quoted(positions: np.ndarray, quotes: np.ndarray, block: Block) -> np.ndarray:
    """Whether an odd number of quotes stands before each position in its line."""
    before_line = np.searchsorted(quotes, block.start)[_line_of(positions, block)]
    return (np.searchsorted(quotes, positions) - before_line) % 2 == 1


def _has_stray_quote(
    data: np.ndarray, quotes: np.ndarray, block: Block, separator: str
) -> np.ndarray:
    """Lines with a quote elsewhere than at the edge of a field or beside another quote.

    Blanks may stand between a closing quote and the end of its field.
    """
    line = _line_of(quotes, block)
    closes = _is_quoted(quotes, quotes, block)
    edge = np.isin(data, np.frombuffer(f'{separator}"'.encode(), np.uint8))
    begins = (quotes == block.start[line]) | edge[quotes - 1]
    after = quotes + 1
    end = block.end[line]
    while (blank := (after < end) & (data[np.minimum(after, len(data) - 1)] == _BLANK)).any():
        after = after + blank
    ends = (after >= end) | edge[np.minimum(after, len(data) - 1)]
    found = np.zeros(len(block), bool)
    found[line[~np.where(closes, ends, begins)]] = True
    return found
