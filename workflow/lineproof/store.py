"""The only file I/O of the pipeline: every output is written beside its place and renamed into it.

The heavy packages are imported where they are used, because the Snakefile writes text through here at every start.
"""

from __future__ import annotations

import json
import os
from collections.abc import Collection, Iterable, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    import pandas as pd
    import pyarrow as pa


def read_table(path: str | os.PathLike, columns: list[str] | None = None) -> pd.DataFrame:
    """Read a Parquet table of ours, all columns or some."""
    import pyarrow.parquet as pq

    return pq.read_table(path, columns=columns).to_pandas()


def write_table(frame: pd.DataFrame, path: str | os.PathLike, contract: str | None) -> None:
    """Check a frame against its contract and write it as Parquet: the same frame gives the same bytes.

    `contract` names a table of `frames.CONTRACTS`; None is for tables outside the pipeline, such as the demo's truth.
    """
    import pyarrow as pa
    import pyarrow.parquet as pq

    from lineproof.frames import CONTRACTS

    if contract is not None:
        frame = CONTRACTS[contract].validate(frame)
    table = pa.Table.from_pandas(frame, preserve_index=False)
    sink = pa.BufferOutputStream()
    pq.write_table(table, sink, compression="zstd")
    write_bytes(sink.getvalue(), path)


def write_csv(frame: pd.DataFrame, path: str | os.PathLike) -> None:
    """Write a frame as CSV at full precision, with UTF-8 and Unix line ends; no text in it is a formula."""
    from lineproof.spreadsheet import texts_as_text

    write_text(texts_as_text(frame).to_csv(index=False, lineterminator="\n"), path)


def read_json(path: str | os.PathLike) -> Any:
    """Read a JSON file of ours."""
    return json.loads(Path(path).read_text(encoding="utf-8"))


def write_json(content: Any, path: str | os.PathLike) -> None:
    """Write JSON with keys in the order given."""
    write_text(json.dumps(content, indent=1, ensure_ascii=False, allow_nan=False) + "\n", path)


def write_text(text: str, path: str | os.PathLike) -> None:
    """Write UTF-8 text."""
    write_bytes(text.encode("utf-8"), path)


def write_if_changed(text: str, path: str | os.PathLike) -> None:
    """Write UTF-8 text only where it differs from the file, so that an unchanged file keeps its time."""
    path = Path(path)
    if not path.exists() or path.read_bytes() != text.encode("utf-8"):
        write_text(text, path)


def write_bytes(content: bytes | memoryview | pa.Buffer, path: str | os.PathLike) -> None:
    """Write to a file beside `path`, then rename: no reader and no killed run ever sees half a file.

    Raises OSError that names `path`, such as for a disk that is full.
    """
    path = Path(path)
    path.parent.mkdir(parents=True, exist_ok=True)
    beside = path.with_name(f".{path.name}.{os.getpid()}.part")
    try:
        beside.write_bytes(content)
        beside.replace(path)
    except OSError as error:
        raise OSError(error.errno, error.strerror, str(path)) from error
    finally:
        beside.unlink(missing_ok=True)


def write_files(files: Mapping[str, str | bytes], folder: str | os.PathLike) -> None:
    """Write several files into one folder, by name."""
    for name, content in files.items():
        write_bytes(
            content.encode("utf-8") if isinstance(content, str) else content, Path(folder) / name
        )


def keep_only(names: Collection[str], folder: str | os.PathLike) -> None:
    """Remove the Parquet files of a folder whose names, without ending, are not among `names`."""
    for path in Path(folder).glob("*.parquet"):
        if path.stem not in names:
            path.unlink()


def read_files(paths: Iterable[str]) -> dict[str, bytes]:
    """The content of several files by name."""
    return {Path(path).name: Path(path).read_bytes() for path in paths}
