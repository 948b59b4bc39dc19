"""The only file I/O of the pipeline: every output is written beside its place and renamed into it.

The heavy packages are imported where they are used, because the Snakefile writes text through here at every start.
"""

from __future__ import annotations

import filecmp
import json
import os
import shutil
import tempfile
from collections.abc import Collection, Iterable, Iterator, Mapping
from concurrent.futures import Future, ThreadPoolExecutor
from contextlib import ExitStack
from pathlib import Path
from typing import TYPE_CHECKING, Any

from lineproof.ahead import ahead

if TYPE_CHECKING:
    import numpy as np
    import pandas as pd
    import pyarrow as pa

_ROW_GROUP = 1 << 20  # rows
_AT_ONCE = 1 << 22  # rows of whole securities
_IN_MEMORY = 1 << 28  # bytes of scratch before it goes to disk
_SCRATCH = ".scratch-"


def read_table(path: str | os.PathLike, columns: list[str] | None = None) -> pd.DataFrame:
    """Read a Parquet table of ours, all columns or some; `security` is a categorical, its names held once."""
    import pyarrow.parquet as pq

    return pq.read_table(path, columns=columns, read_dictionary=["security"]).to_pandas()


def read_securities(
    path: str | os.PathLike, columns: list[str], rows: int = _AT_ONCE
) -> Iterator[pd.DataFrame]:
    """A table sorted by security in pieces of whole securities, each of about so many rows or one security."""
    import pyarrow as pa
    import pyarrow.parquet as pq

    with pq.ParquetFile(path, read_dictionary=["security"]) as file:
        held = file.schema_arrow.empty_table().select(columns)
        for group in range(file.num_row_groups):
            table = file.read_row_group(group, columns)
            held = pa.concat_tables([held, table]) if len(held) else table
            if len(held) < rows or group == file.num_row_groups - 1:
                continue
            codes = held["security"].unify_dictionaries().to_pandas().cat.codes.to_numpy()
            last = int((codes != codes[-1]).nonzero()[0].max(initial=-1)) + 1
            if last:
                yield held.slice(0, last).to_pandas()
                held = held.slice(last)
        yield held.to_pandas()


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
    pq.write_table(table, sink, row_group_size=_ROW_GROUP, **_encoding(table.schema))
    write_bytes(sink.getvalue(), path)


def _encoding(schema: pa.Schema) -> dict[str, Any]:
    """Numbers seldom repeat: looking for repetitions costs more than writing them, split by byte, does."""
    import pyarrow as pa

    floats = [field.name for field in schema if pa.types.is_floating(field.type)]
    others = [field.name for field in schema if field.name not in floats]
    return {"compression": "zstd", "use_dictionary": others, "use_byte_stream_split": floats}


def write_together(
    batches: Iterable[Mapping[str, pd.DataFrame]],
    paths: Mapping[str, str | os.PathLike],
    frequency: str = "monthly",
) -> None:
    """Write tables larger than memory, each under the contract of its name, from batches that hold a piece of each.

    The same rows give the same bytes however they are cut into batches. When the batches raise an error, no file is
    left behind. They are made in a thread of their own, while those before them are checked and written.
    """
    with ExitStack() as stack:
        writers = {
            name: stack.enter_context(_Writer(name, frequency, Path(path)))
            for name, path in paths.items()
        }
        for batch in ahead(iter(batches)):
            for name, frame in batch.items():
                writers[name].add(frame)
        for writer in writers.values():
            writer.finish()
        for writer in writers.values():
            writer.place()


class _Writer:
    """A table on its way to disk; it takes its place only when it is finished."""

    def __init__(self, contract: str, frequency: str, path: Path) -> None:
        self._contract, self._frequency, self._path = contract, frequency, path
        self._beside = _beside(path)
        self._groups = _RowGroups()
        self._last: pd.DataFrame | None = None
        self._writer: Any = None
        self._writing = ThreadPoolExecutor(1)  # one at a time, so in order
        self._pending: Future | None = None

    def __enter__(self) -> _Writer:
        self._path.parent.mkdir(parents=True, exist_ok=True)
        return self

    def __exit__(self, *raised: object) -> None:
        self._writing.shutdown()
        try:
            if self._writer is not None:
                self._writer.close()
        finally:  # closing fails where the disk is full
            self._beside.unlink(missing_ok=True)

    def add(self, frame: pd.DataFrame) -> None:
        """Check rows against the contract, together with the row before them, and write what fills a row group."""
        import pyarrow as pa

        from lineproof.frames import check_batch

        check_batch(self._contract, self._frequency, frame, self._last)
        self._last = frame.iloc[-1:] if len(frame) else self._last
        for group in self._groups.add(pa.Table.from_pandas(frame, preserve_index=False)):
            self._write(group)

    def finish(self) -> None:
        """Write what is left."""
        rest = self._groups.rest
        if rest is None:
            raise ValueError(f"no rows for {self._path}, not even an empty batch")
        if len(rest) or self._writer is None:
            self._write(rest)
        self._wait()
        self._writer.close()
        self._writer = None

    def place(self) -> None:
        """Put the finished file in its place."""
        self._beside.replace(self._path)

    def _write(self, table: pa.Table) -> None:
        """Write while the next rows are made; an error shows with the next write."""
        import pyarrow.parquet as pq

        self._wait()
        if self._writer is None:
            self._writer = pq.ParquetWriter(self._beside, table.schema, **_encoding(table.schema))
        self._pending = self._writing.submit(
            self._writer.write_table, table, row_group_size=_ROW_GROUP
        )

    def _wait(self) -> None:
        if self._pending is not None:
            self._pending.result()
            self._pending = None


class _RowGroups:
    """Rows as they come, given back in row groups of one size, so that the cut into batches does not show.

    Each is in one piece: a page may otherwise end where a batch does.
    """

    def __init__(self) -> None:
        self._held: pa.Table | None = None

    def add(self, table: pa.Table) -> list[pa.Table]:
        """The row groups that these rows fill."""
        import pyarrow as pa

        held = table if self._held is None else pa.concat_tables([self._held, table])
        n_full = len(held) // _ROW_GROUP
        self._held = held.slice(n_full * _ROW_GROUP)
        return [held.slice(at * _ROW_GROUP, _ROW_GROUP).combine_chunks() for at in range(n_full)]

    @property
    def rest(self) -> pa.Table | None:
        """The rows after the last full group; None where none were ever added."""
        return None if self._held is None else self._held.combine_chunks()


class Scratch:
    """Arrays by name for the length of a stage, in memory or, where they are many, in a folder that goes with it."""

    def __init__(self, folder: str | os.PathLike) -> None:
        self._where = Path(folder)
        self._arrays: dict[str, np.ndarray] = {}
        self._files: dict[str, np.dtype] = {}
        self._n_bytes = 0
        self._folder: Path | None = None

    def __enter__(self) -> Scratch:
        for stale in self._where.glob(f"{_SCRATCH}*"):  # of a run that was killed
            shutil.rmtree(stale, ignore_errors=True)
        return self

    def __exit__(self, *raised: object) -> None:
        self._arrays.clear()
        if self._folder is not None:
            shutil.rmtree(self._folder, ignore_errors=True)

    def keep(self, name: str, values: np.ndarray) -> None:
        """Keep an array (n,) under a name."""
        self._n_bytes += values.nbytes
        if self._n_bytes <= _IN_MEMORY:
            self._arrays[name] = values
            return
        if self._folder is None:
            self._where.mkdir(parents=True, exist_ok=True)
            self._folder = Path(tempfile.mkdtemp(prefix=_SCRATCH, dir=self._where))
        values.tofile(self._folder / name)
        self._files[name] = values.dtype

    def part(self, name: str, first: int, last: int) -> np.ndarray:
        """Elements `first` to `last` (exclusive) of an array."""
        import numpy as np

        if name in self._arrays:
            return self._arrays[name][first:last]
        dtype = self._files[name]
        assert self._folder is not None
        return np.fromfile(self._folder / name, dtype, last - first, offset=first * dtype.itemsize)


def copy_as_csv(table: str | os.PathLike, path: str | os.PathLike) -> None:
    """Write a Parquet table of ours as CSV too, as `write_csv` does, a row group at a time."""
    import pyarrow.parquet as pq

    with pq.ParquetFile(table) as file:
        frames = (batch.to_pandas() for batch in file.iter_batches(_ROW_GROUP))
        empty = file.schema_arrow.empty_table().to_pandas()
        texts = [_as_csv(empty), *(_as_csv(frame, header=False) for frame in frames)]
    write_text("".join(texts), path)


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


def write_batches_if_changed(
    schema: pa.Schema, batches: Iterable[pa.RecordBatch], path: str | os.PathLike
) -> None:
    """Write rows as Parquet as they come, unless the file holds them already: then it keeps its time.

    The same rows give the same bytes, however they are cut into batches.
    """
    import pyarrow as pa
    import pyarrow.parquet as pq

    path, groups = Path(path), _RowGroups()
    path.parent.mkdir(parents=True, exist_ok=True)
    beside = _beside(path)
    try:
        with pq.ParquetWriter(beside, schema, compression="zstd") as writer:
            for batch in batches:
                for group in groups.add(pa.Table.from_batches([batch], schema)):
                    writer.write_table(group, row_group_size=_ROW_GROUP)
            if rest := groups.rest:
                writer.write_table(rest, row_group_size=_ROW_GROUP)
        if not path.exists() or not filecmp.cmp(beside, path, shallow=False):
            beside.replace(path)
    finally:
        beside.unlink(missing_ok=True)


def write_csv(frame: pd.DataFrame, path: str | os.PathLike) -> None:
    """Write a frame as CSV at full precision, with UTF-8 and Unix line ends; no text in it is a formula."""
    write_text(_as_csv(frame), path)


def _as_csv(frame: pd.DataFrame, header: bool = True) -> str:
    from lineproof.spreadsheet import texts_as_text

    return texts_as_text(frame).to_csv(index=False, lineterminator="\n", header=header)


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


def _beside(path: Path) -> Path:
    """Where a file is written before it is renamed into its place."""
    return path.with_name(f".{path.name}.{os.getpid()}.part")


def write_bytes(content: bytes | memoryview | pa.Buffer, path: str | os.PathLike) -> None:
    """Write to a file beside `path`, then rename: no reader and no killed run ever sees half a file.

    Raises OSError that names `path`, such as for a disk that is full.
    """
    path = Path(path)
    path.parent.mkdir(parents=True, exist_ok=True)
    beside = _beside(path)
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
