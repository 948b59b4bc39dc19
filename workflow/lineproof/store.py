"""The only file I/O of the pipeline: every output is written beside its place and renamed into it.

The heavy packages are imported where they are used, because the Snakefile writes text through here at every start.
"""

from __future__ import annotations

import filecmp
import json
import os
from collections.abc import Collection, Iterable, Iterator, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    import pandas as pd
    import pyarrow as pa

_GROUP = 1 << 19  # rows in a row group of a file that is written as it comes


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


def write_batches_if_changed(
    schema: pa.Schema, batches: Iterable[pa.RecordBatch], path: str | os.PathLike
) -> None:
    """Write rows as Parquet as they come, unless the file holds them already: then it keeps its time.

    The same rows give the same bytes, however they are cut into batches.
    """
    import pyarrow.parquet as pq

    path = Path(path)
    path.parent.mkdir(parents=True, exist_ok=True)
    beside = path.with_name(f".{path.name}.{os.getpid()}.part")
    try:
        with pq.ParquetWriter(beside, schema, compression="zstd") as writer:
            for table in _evenly(schema, batches):
                writer.write_table(table, row_group_size=_GROUP)
        if not path.exists() or not filecmp.cmp(beside, path, shallow=False):
            beside.replace(path)
    finally:
        beside.unlink(missing_ok=True)


def _evenly(schema: pa.Schema, batches: Iterable[pa.RecordBatch]) -> Iterator[pa.Table]:
    """The same rows in tables of `_GROUP` rows, the last one shorter."""
    import pyarrow as pa

    waiting = pa.Table.from_batches([], schema)
    for batch in batches:
        waiting = pa.concat_tables([waiting, pa.Table.from_batches([batch], schema)])
        while len(waiting) >= _GROUP:
            yield waiting.slice(0, _GROUP).combine_chunks()
            waiting = waiting.slice(_GROUP)
    if len(waiting):
        yield waiting.combine_chunks()


def write_csv(frame: pd.DataFrame, path: str | os.PathLike) -> None:
    """Write a frame as CSV at full precision, with UTF-8 and Unix line ends."""
    write_text(frame.to_csv(index=False, lineterminator="\n"), path)


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
    """Write to a file beside `path`, then rename: no reader and no killed run ever sees half a file."""
    path = Path(path)
    path.parent.mkdir(parents=True, exist_ok=True)
    beside = path.with_name(f".{path.name}.{os.getpid()}.part")
    try:
        beside.write_bytes(content)
        beside.replace(path)
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
