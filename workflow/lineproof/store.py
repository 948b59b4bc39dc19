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
    """Read a Parquet table of ours, all columns or some; `security` is a categorical, its names held once."""
    import pyarrow.parquet as pq

    return pq.read_table(path, columns=columns, read_dictionary=["security"]).to_pandas()


def write_table(
    frame: pd.DataFrame,
    path: str | os.PathLike,
    contract: str | None,
    frequency: str = "monthly",
) -> None:
    """Check a frame against its contract and write it as Parquet: the same content gives the same bytes.

    `contract` names a table of `frames.CONTRACTS`, and `frequency` says how its rows are dated; None is for tables
    outside the pipeline, such as the demo's truth. A categorical of text is written as the text.
    """
    import pyarrow as pa
    import pyarrow.parquet as pq

    from lineproof import frames

    if contract is not None:
        frame = frames.contract(contract, frequency).validate(frame)
    table = _plain(pa.Table.from_pandas(frame, preserve_index=False))
    sink = pa.BufferOutputStream()
    pq.write_table(table, sink, compression="zstd")
    write_bytes(sink.getvalue(), path)


def _plain(table: pa.Table) -> pa.Table:
    """The table without dictionaries, with the notes that pandas leaves for a frame of plain text."""
    import pyarrow as pa

    coded = [field.name for field in table.schema if pa.types.is_dictionary(field.type)]
    if not coded:
        return table
    for name in coded:
        place = table.column_names.index(name)
        table = table.set_column(place, name, table[name].cast(pa.large_string()))
    like = pa.Table.from_pandas(
        table.slice(0, 0).to_pandas(ignore_metadata=True), preserve_index=False
    )
    return table.cast(like.schema)


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
