"""Which format a raw file has, told by its ending and checked against its first bytes; and which files a name means."""

from __future__ import annotations

import re
from pathlib import Path
from urllib.parse import unquote

from lineproof.catalog import Entry
from lineproof.intake.stopping import stop

COMPRESSED = (".gz", ".zst", ".bz2", ".zip")
_KINDS = {
    ".parquet": "parquet",
    ".feather": "feather",
    ".arrow": "feather",
    ".dta": "stata",
    ".sas7bdat": "sas",
    ".xlsx": "excel",
}
FORMATS = {
    "text": Entry("lineproof.intake.textfile:TextFormat", "plain text"),
    "parquet": Entry("lineproof.intake.columnar:ParquetFormat", "a Parquet file"),
    "feather": Entry("lineproof.intake.columnar:FeatherFormat", "a Feather (Arrow IPC) file"),
    "stata": Entry("lineproof.intake.packaged:StataFormat", "a Stata file"),
    "sas": Entry("lineproof.intake.packaged:SasFormat", "a SAS data set"),
    "excel": Entry("lineproof.intake.packaged:ExcelFormat", "an Excel workbook (.xlsx)"),
}
# Formats that cannot be read, by ending.
_UNREAD = {
    ".xls": "an old Excel workbook",
    ".xlsb": "a binary Excel workbook",
    ".ods": "an OpenDocument sheet",
    ".xpt": "a SAS transport file",
    ".sav": "an SPSS file",
    ".rds": "an R object",
    ".rdata": "R objects",
    ".7z": "a 7z archive",
    ".xz": "compressed with xz",
    ".tar": "a tar archive",
    ".tgz": "a tar archive",
}
_SAS = b"\0" * 12 + b"\xc2\xea\x81\x60\xb3\x14\x11\xcf\xbd\x92\x08\x00\x09\xc7\x31\x8c"
# First bytes, and what they say a file is.
_BEGINNINGS = {
    b"PAR1": "a Parquet file",
    b"ARROW1": "a Feather (Arrow IPC) file",
    b"<stata_dta>": "a Stata file",
    _SAS: "a SAS data set",
    b"PK\x03\x04": "a spreadsheet or a zip archive",
    b"\x1f\x8b": "compressed with gzip",
    b"\x28\xb5\x2f\xfd": "compressed with zstandard",
    b"BZh": "compressed with bzip2",
    b"\xd0\xcf\x11\xe0": "an old Excel workbook",
    b"FEA1": "a Feather file of version 1",
    b"%PDF": "a PDF",
}
_ENCODED = {b"\xff\xfe": "utf-16", b"\xfe\xff": "utf-16"}
# Version and byte order of the Stata formats before 117.
_OLD_STATA = [bytes([version, order]) for version in range(102, 116) for order in (1, 2)]
_EXPECTED = {
    "parquet": (b"PAR1",),
    "feather": (b"ARROW1",),
    "stata": (b"<stata_dta>", *_OLD_STATA),
    "sas": (_SAS,),
    "excel": (b"PK\x03\x04",),
}


def kind_of(path: Path, label: str) -> str:
    """`text`, `parquet`, `feather`, `stata`, `sas` or `excel`; an unknown ending is text.

    Raises KnownProblem for an ending that says a format which is not read.
    """
    endings = [suffix.lower() for suffix in path.suffixes[-2:]]
    last = endings[-1] if endings else ""
    if last in _UNREAD:
        raise stop(label, f"it is {_UNREAD[last]}, which is not read", "save it as CSV or Parquet")
    if last in COMPRESSED and len(endings) == 2 and endings[0] in _KINDS:
        found = f"it is {FORMATS[_KINDS[endings[0]]].label} inside a compressed file"
        raise stop(label, found, "unpack it first; only text is read compressed")
    return _KINDS.get(last, "text")


def check_beginning(first: bytes, kind: str, label: str, encoding: str | None = None) -> None:
    """Stop when the first bytes of a file are not those of its format.

    A file cut off at its end is found by its reader; this finds a wrong name.
    """
    if kind == "text":
        for beginning, what in _BEGINNINGS.items():
            if first.startswith(beginning):
                found = f"its ending says plain text, but its first bytes say it is {what}"
                raise stop(label, found, "name it as what it is, or save it as CSV")
        if encoding is None and first[:2] in _ENCODED:
            found = "its first bytes say it is UTF-16 text"
            raise stop(label, found, f"set encoding: {_ENCODED[first[:2]]}")
        return
    if not first.startswith(_EXPECTED[kind]):
        said = [what for beginning, what in _BEGINNINGS.items() if first.startswith(beginning)]
        other = f"say it is {said[0]}" if said else "are those of something else"
        found = f"its ending says {FORMATS[kind].label}, but its first bytes {other}"
        raise stop(label, found, "name it as what it is, or deliver it again")


def given_files(file: str | list[str]) -> list[str]:
    """What `file` of the study file lists."""
    return [file] if isinstance(file, str) else file


def members(path: Path, label: str) -> list[tuple[Path, str]]:
    """The files that a path of the study file means, each with what messages call it, in order of their names.

    A file is itself, there or not; a folder means the Parquet files in it and below, apart from those whose
    names, or whose folders' names, begin with _ or a full stop; otherwise * ? [ ] are a pattern.
    """
    if path.is_dir():
        inside = sorted(path.rglob("*.parquet"), key=lambda file: file.relative_to(path).parts)
        inside = [f for f in inside if f.is_file() and not _is_hidden(f.relative_to(path))]
        base = label.rstrip("/")
        return [(file, f"{base}/{file.relative_to(path).as_posix()}") for file in inside]
    if path.exists() or not is_pattern(label):
        return [(path, label)]
    root, pattern = (
        Path(path.anchor),
        str(path.relative_to(path.anchor)) if path.anchor else str(path),
    )
    found = sorted(root.glob(pattern))
    above = _fixed_part(label)
    start = _fixed_part(str(path))
    return [(file, above + str(file)[len(start) :]) for file in found if file.is_file()]


def is_pattern(label: str) -> bool:
    """Whether a path of the study file may mean several files."""
    return bool(re.search(r"[*?\[]", label))


def _fixed_part(pattern: str) -> str:
    """What stands before the first part of a path that has a pattern."""
    at = re.search(r"[*?\[]", pattern).start()
    return pattern[: pattern.rfind("/", 0, at) + 1]


def _is_hidden(inside: Path) -> bool:
    return any(part.startswith(("_", ".")) for part in inside.parts)


def partition_keys(label: str) -> dict[str, str]:
    """The columns that the folders of a file give, as in `year=2000/part-0.parquet`; "" where there is no value."""
    found = {}
    for part in label.split("/")[:-1]:
        key, equals, value = part.partition("=")
        if equals and key:
            missing = value == "__HIVE_DEFAULT_PARTITION__"
            found[unquote(key)] = "" if missing else unquote(value)
    return found
