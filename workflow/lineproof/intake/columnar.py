"""Parquet and Feather (Arrow IPC) files, a stretch of rows at a time."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from functools import cached_property, partial

import pyarrow as pa
import pyarrow.ipc
import pyarrow.parquet as pq

from lineproof.intake.stopping import stop
from lineproof.intake.typedfile import PIECE, TypedFormat

Stretches = Iterator[tuple[int | None, Callable[[], Iterator[pa.Table]]]]


class ParquetFormat(TypedFormat):
    """A Parquet file; its stretches are the row groups."""

    @cached_property
    def _names(self) -> list[str]:
        with pq.ParquetFile(self._file) as parquet:
            schema = parquet.schema_arrow
        query = self._reading.get("query")
        if query is not None and (schema.metadata or {}).get(b"query") != query.encode():
            found = "the extract that is there is the result of another query"
            raise stop(self._label, found, "run make study or make check, which ask the database")
        return schema.names

    def names(self) -> list[str]:
        return self._names

    def stretches(self, columns: list[int] | None) -> Stretches:
        own = self.names()
        asked = range(len(own)) if columns is None else columns
        wanted = [own[position] for position in asked]
        # A row group may be as large as the file, so it is not fetched in one.
        with pq.ParquetFile(self._file, pre_buffer=False, buffer_size=1 << 20) as parquet:
            for group in range(parquet.num_row_groups):
                n_rows = parquet.metadata.row_group(group).num_rows
                yield n_rows, partial(_row_group, parquet, group, wanted, n_rows)


def _row_group(
    parquet: pq.ParquetFile, group: int, wanted: list[str], n_rows: int
) -> Iterator[pa.Table]:
    if not wanted:
        yield pa.table({"": pa.nulls(n_rows)}).select([])
        return
    for batch in parquet.iter_batches(PIECE, row_groups=[group], columns=wanted):
        batch.validate(full=True)
        yield pa.Table.from_batches([batch]).select(wanted)


class FeatherFormat(TypedFormat):
    """An Arrow IPC file; its stretches are the record batches."""

    @cached_property
    def _names(self) -> list[str]:
        with pa.memory_map(self._file) as source, pa.ipc.open_file(source) as reader:
            return reader.schema.names

    def names(self) -> list[str]:
        return self._names

    def stretches(self, columns: list[int] | None) -> Stretches:
        asked = list(range(len(self.names()))) if columns is None else columns
        options = pa.ipc.IpcReadOptions(included_fields=asked)
        with (
            pa.memory_map(self._file) as source,
            pa.ipc.open_file(source, options=options) as reader,
        ):
            names = [self.names()[position] for position in asked]
            for number in range(reader.num_record_batches):
                yield None, partial(_batch, reader, number, names)


def _batch(
    reader: pa.ipc.RecordBatchFileReader, number: int, names: list[str]
) -> Iterator[pa.Table]:
    batch = reader.get_batch(number)
    batch.validate(full=True)  # the file's word for where its texts begin is not taken
    table = pa.Table.from_batches([batch]).select(names)
    for start in range(0, len(table), PIECE):
        yield table.slice(start, PIECE).combine_chunks()
