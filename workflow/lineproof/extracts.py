"""Ask databases for raw data: the result of each query of a study is kept as a Parquet file, which the intake reads.

How to connect stands in an environment variable that the study file names. It is written nowhere, and no message shows
it or a part of it.
"""

from __future__ import annotations

import os
import re
from collections.abc import Iterator
from typing import TYPE_CHECKING, Any
from urllib.parse import parse_qsl, unquote, urlsplit

from lineproof import store
from lineproof.intake.stopping import stop
from lineproof.problems import KnownProblem

if TYPE_CHECKING:
    import pyarrow as pa

    from lineproof.specs import Source, Study

# Types that are kept and sorted as they are; everything else is taken as text, numeric too, so that no digit is lost.
_KEPT = {"int2", "int4", "int8", "float4", "float8", "bool", "date", "timestamp", "timestamptz"}
_SETTINGS = ("transaction read only", "local time zone 'UTC'", "local datestyle to 'ISO, YMD'")
_PARTS = ("host", "hostaddr", "port", "user", "password", "passfile", "dbname", "service")
_ERROR = re.compile(r"\bERROR:\s+(.+)")  # a refused connection is FATAL
_WORD = re.compile(r"(\w+)\s*=\s*('(?:[^'\\]|\\.)*'|\S+)")


def fetch_extracts(study: Study) -> list[str]:
    """Ask every query of a study; returns the files of the results, in the order of the study file.

    A result that is the same as before leaves its file, and the file's time, alone. Rows are ordered by all columns, so
    the order in which a server finds them does not show.

    Raises KnownProblem when a variable is not set, the server cannot be reached, or a query fails.
    """
    asked = [(place, s) for place, s in study.sources().items() if s.query is not None]
    for place, source in asked:
        _fetch(place, source)
    return [source.files[0] for _, source in asked]


def _fetch(place: str, source: Source) -> None:
    variable = source.connection or ""
    secret = os.environ.get(variable, "")
    if not secret.strip():
        found = f"the environment variable {variable} is not set"
        raise stop(f"{place}, connection", found, "set it to how to connect to the database")
    import adbc_driver_postgresql.dbapi as postgres
    import pyarrow as pa

    try:
        with postgres.connect(secret) as connection, connection.cursor() as cursor:
            for setting in _SETTINGS:
                cursor.execute(f"set {setting}")
            schema, batches = _ask(cursor, source.query or "", place)
            store.write_batches_if_changed(schema, batches, source.files[0])
            connection.rollback()
    except (postgres.Error, pa.ArrowException, _BrokenOff) as error:
        raise _refused(place, variable, secret, error) from None


def _ask(cursor: Any, query: str, place: str) -> tuple[pa.Schema, Iterator[pa.RecordBatch]]:
    """The result's columns as they are called in the query, and its rows in order."""
    import pyarrow as pa

    inner = f"({query.strip().rstrip(';')}\n) as extract"
    fields = list(cursor.adbc_execute_schema(query))
    if not fields:
        raise stop(f"{place}, query", "its result has no column", "name the columns to select")
    kinds = [(field.metadata or {}).get(b"POSTGRESQL:type", b"").decode() for field in fields]
    names = [f"column_{number}" for number in range(len(fields))]
    taken = [
        name if kind in _KEPT else f'{name}::text collate "C"'
        for name, kind in zip(names, kinds, strict=True)
    ]
    cursor.execute(
        f"select {', '.join(taken)} from {inner}({', '.join(names)}) order by {', '.join(taken)}"
    )
    rows = cursor.fetch_record_batch()
    schema = pa.schema(
        [pa.field(f.name, g.type) for f, g in zip(fields, rows.schema, strict=True)],
        metadata={"query": query},
    )
    return schema, (pa.RecordBatch.from_arrays(b.columns, schema=schema) for b in _streamed(rows))


class _BrokenOff(Exception):
    """The server ended a result with an error; the text is what the driver says."""


def _streamed(rows: pa.RecordBatchReader) -> Iterator[pa.RecordBatch]:
    import pyarrow as pa

    while True:
        try:
            batch = rows.read_next_batch()
        except StopIteration:
            return
        except (OSError, pa.ArrowException) as error:  # told apart from a full disk
            raise _BrokenOff(str(error)) from None
        yield batch


def _refused(place: str, variable: str, secret: str, error: Exception) -> KnownProblem:
    """What the server said, without anything that `secret` says; a failed connection is not quoted at all."""
    details = dict(getattr(error, "details", None) or [])
    quoted = _ERROR.search(str(error))
    said = details.get(b"PG_DIAG_MESSAGE_PRIMARY", b"").decode("utf-8", "replace")
    said = said or (quoted[1] if quoted else "")
    if not said:
        found = f"no answer could be had from the database to which {variable} leads"
        change = f"check {variable} (server, database, user, password) and that the server is up"
        return stop(f"{place}, connection", found, change)
    state = f" (SQLSTATE {error.sqlstate})" if getattr(error, "sqlstate", None) else ""
    found = f"the database to which {variable} leads refused it: {_masked(said, secret)}{state}"
    return stop(f"{place}, query", found, "mend the query, or what the user may read")


def _masked(said: str, secret: str) -> str:
    """A message in which every part of a connection is an ellipsis, the longest first."""
    for part in sorted(_parts(secret), key=len, reverse=True):
        said = re.sub(rf"(?<!\w){re.escape(part)}(?!\w)", "…", said)
    return said


def _parts(secret: str) -> set[str]:
    """Everything a URI, or words of the form key=value, say of a connection, as written and as meant."""
    found = {secret, *(os.environ.get(f"PG{part.upper()}", "") for part in _PARTS)}
    found |= {value.strip("'") for key, value in _WORD.findall(secret) if key in _PARTS}
    try:
        uri = urlsplit(secret)
        found |= {uri.username or "", uri.password or "", uri.path.strip("/")}
        found |= set((uri.hostname or "").split(","))
        found |= {value for key, value in parse_qsl(uri.query) if key in _PARTS}
    except ValueError:
        pass
    return {part for part in found | {unquote(part) for part in found} if part}
