"""Queries against a PostgreSQL server that the test starts: what is kept, what is asked again, what is never said."""

from __future__ import annotations

import datetime
import os
import re
import shutil
import subprocess
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pyarrow.parquet as pq
import pytest

from lineproof.extracts import fetch_extracts
from lineproof.intake.reading import open_files
from lineproof.problems import KnownProblem
from lineproof.specs import Study
from lineproof.study import load_study
from lineproof.wiring import Wiring

PASSWORD = "Rook-and-Gull"
QUERY = "select id, day, ret, grade from returns -- all of them"
STUDY = """\
study: {{name: asked, title: Asked}}
data:
  returns:
    query: {query}
    connection: KESTREL_RETURNS
    columns: {{security: id, date: day, return: ret, grade: grade}}
  market: {{file: m.csv, columns: {{date: d, return: r}}}}
  riskless: {{file: m.csv, columns: {{date: d, rate: r}}}}
betas: {{monthly: {{window: 60, min: 24}}}}
portfolios: {{ten: {{rank_on: monthly}}}}
subperiods: {{full: {{}}}}
"""


def programs() -> Path | None:
    """Where the server's programs are: Debian does not put them on the path."""
    on_path = shutil.which("initdb")
    places = sorted(Path("/usr/lib/postgresql").glob("*/bin/initdb"), key=lambda p: int(p.parts[4]))
    found = [Path(on_path)] if on_path else places
    return found[-1].parent if found else None


def server_command(command: list[object], folder: Path) -> None:
    """Run a program of the server; it refuses to run as root, so there it runs as the user postgres."""
    words = [str(word) for word in command]
    if os.geteuid() == 0:
        words = ["setpriv", "--reuid=postgres", "--regid=postgres", "--clear-groups", *words]
    environ = {"PATH": "/usr/bin:/bin", "LC_ALL": "C.UTF-8", "HOME": str(folder)}
    with (folder / "output").open("a") as output:  # no pipe: the server would keep it open
        subprocess.run(words, check=True, env=environ, cwd=folder, stdout=output, stderr=output)


@pytest.fixture(scope="module")
def server(tmp_path_factory: pytest.TempPathFactory) -> Iterator[str]:
    """How to connect to a server of its own, on a socket in a folder of its own."""
    if (found := programs()) is None:
        pytest.skip("PostgreSQL is not installed: its program initdb is not there")
    # A socket's path must be short, and every folder above it open to the user postgres.
    folder = Path(subprocess.check_output(["mktemp", "-d", "/tmp/pg.XXXXXX"], text=True).strip())
    (folder / "password").write_text(PASSWORD)
    (folder / "output").touch()
    if os.geteuid() == 0:
        for path in (folder, *folder.iterdir()):
            shutil.chown(path, "postgres", "postgres")
    data, is_running = folder / "data", False
    try:
        setup = ["-U", "kestrel", "-A", "scram-sha-256", "--pwfile", folder / "password", "-N"]
        server_command([found / "initdb", "-D", data, "-E", "UTF8", *setup], folder)
        options = f"-c listen_addresses='' -c unix_socket_directories={folder} -c fsync=off"
        server_command([found / "pg_ctl", "-D", data, "-o", options, "-w", "start"], folder)
        is_running = True
        yield f"postgresql://kestrel:{PASSWORD}@/postgres?host={folder}"
    finally:
        if is_running:
            server_command([found / "pg_ctl", "-D", data, "-m", "immediate", "-w", "stop"], folder)
        shutil.rmtree(folder)


@pytest.fixture
def run(server: str, monkeypatch: pytest.MonkeyPatch) -> Callable[[str], None]:
    """Run statements on the server, which begins with five returns in no order."""
    import adbc_driver_postgresql.dbapi as postgres

    def execute(statements: str) -> None:
        with postgres.connect(server) as connection, connection.cursor() as cursor:
            for statement in statements.split(";"):
                cursor.execute(statement)
            connection.commit()

    execute(
        "drop table if exists returns;"
        "create table returns (id text, day date, ret double precision, grade numeric);"
        "insert into returns values ('b', '2000-02-29', 0.1, 2.50), ('b', '2000-01-31', null, 1),"
        " ('007', '2000-01-31', -0.25, null), ('a', null, 1e-9, 0.1), ('B', '2000-01-31', 0.3, 1)"
    )
    monkeypatch.setenv("KESTREL_RETURNS", server)
    return execute


def study(folder: Path, monkeypatch: pytest.MonkeyPatch, query: str = QUERY) -> Study:
    monkeypatch.chdir(folder)
    (folder / "m.csv").write_text("d,r\n")
    (folder / "study.yaml").write_text(
        STUDY.format(query=f"'{query.replace(chr(39), chr(39) * 2)}'")
    )
    return load_study(folder / "study.yaml")


def refused(asked: Study) -> str:
    with pytest.raises(KnownProblem) as caught:
        fetch_extracts(asked)
    return "\n".join(str(problem) for problem in caught.value.problems)


def test_result_is_kept_in_order_and_read_as_a_raw_file(
    tmp_path: Path, run: Callable, monkeypatch: pytest.MonkeyPatch
) -> None:
    asked = study(tmp_path, monkeypatch)
    assert fetch_extracts(asked) == ["results/asked/extracts/returns.parquet"]
    (opened,) = open_files(list(asked.returns.files), asked.returns.reading())
    (block,) = opened.blocks()
    assert opened.label == "query returns"
    day = datetime.date(2000, 1, 31)
    assert list(
        zip(*(block.columns[n].to_pylist() for n in asked.returns.columns), strict=True)
    ) == [
        ("007", day, -0.25, ""),
        ("B", day, 0.3, "1"),
        ("a", None, 1e-9, "0.1"),
        ("b", day, None, "1"),
        ("b", datetime.date(2000, 2, 29), 0.1, "2.50"),
    ]


def test_unchanged_result_leaves_the_file_alone_whatever_the_order_of_the_rows(
    tmp_path: Path, run: Callable, monkeypatch: pytest.MonkeyPatch
) -> None:
    asked = study(tmp_path, monkeypatch)
    (file,) = map(Path, fetch_extracts(asked))
    os.utime(file, (1, 1))
    run("create table other as select * from returns order by ret desc; drop table returns")
    run("alter table other rename to returns")
    fetch_extracts(asked)
    assert file.stat().st_mtime == 1
    run("update returns set ret = 0.31 where id = 'B'")
    fetch_extracts(asked)
    assert file.stat().st_mtime > 1
    assert 0.31 in pq.read_table(file)["ret"].to_pylist()
    assert [path.name for path in file.parent.iterdir()] == ["returns.parquet"]


def test_extract_of_another_query_is_not_read(
    tmp_path: Path, run: Callable, monkeypatch: pytest.MonkeyPatch
) -> None:
    fetch_extracts(study(tmp_path, monkeypatch))
    other = study(tmp_path, monkeypatch, QUERY + " where ret > 0")
    with pytest.raises(KnownProblem, match="the result of another query"):
        list(open_files(list(other.returns.files), other.returns.reading())[0].blocks())


@pytest.mark.parametrize(
    ("query", "said"),
    [
        ("select id from nowhere", 'relation "nowhere" does not exist (SQLSTATE 42P01)'),
        ("select 1 / (ret - ret) from returns", "division by zero"),
        ("selec", 'syntax error at or near "selec" (SQLSTATE 42601)'),
        ("select id::int from returns", "invalid input syntax for type integer"),
    ],
)
def test_what_the_server_says_of_a_query(
    tmp_path: Path, run: Callable, query: str, said: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    found = refused(study(tmp_path, monkeypatch, query))
    assert found.startswith(
        "data.returns, query: the database to which KESTREL_RETURNS leads refused it: "
    )
    assert said in found
    assert not (tmp_path / "results/asked/extracts/returns.parquet").exists()


def test_a_query_cannot_write(
    tmp_path: Path, run: Callable, monkeypatch: pytest.MonkeyPatch
) -> None:
    run("create sequence if not exists counted")
    found = refused(study(tmp_path, monkeypatch, "select nextval('counted') as id"))
    assert "cannot execute nextval() in a read-only transaction" in found


def test_a_query_without_columns(
    tmp_path: Path, run: Callable, monkeypatch: pytest.MonkeyPatch
) -> None:
    assert "its result has no column" in refused(study(tmp_path, monkeypatch, "select"))


@pytest.mark.parametrize("form", ["uri", "words"])
@pytest.mark.parametrize("fault", ["password", "user", "host", "database", "query", "form"])
def test_no_message_shows_how_to_connect(
    tmp_path: Path,
    run: Callable,
    server: str,
    form: str,
    fault: str,
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    folder = server.split("host=")[1]
    parts = {"user": "kestrel", "password": PASSWORD, "host": folder, "dbname": "postgres"}
    wrong = {
        "password": "Wrong-and-Gull",
        "user": "nobody-here",
        "host": "/no/such/place",
        "dbname": "no-base",
    }
    if (key := {"database": "dbname"}.get(fault, fault)) in parts:
        parts[key] = wrong[key]
    secret = " ".join(f"{key}='{value}'" for key, value in parts.items())
    if form == "uri":
        secret = "postgresql://{user}:{password}@/{dbname}?host={host}".format(**parts)
    if fault == "form":
        secret = secret.replace("=", " ").replace("postgresql://", "")
    monkeypatch.setenv("KESTREL_RETURNS", secret)
    query = f"select '{PASSWORD}'::int, '{folder}'" if fault == "query" else QUERY
    found = refused(study(tmp_path, monkeypatch, query))
    assert "KESTREL_RETURNS" in found
    for value in parts.values():
        if value != "postgres":  # that much could be anybody's
            assert value not in found
    assert not re.search(r"postgresql://|password=", found)


def test_connection_is_written_nowhere(
    tmp_path: Path, run: Callable, monkeypatch: pytest.MonkeyPatch
) -> None:
    asked = study(tmp_path, monkeypatch)
    fetch_extracts(asked)
    Wiring(asked).keep_options()
    written = [path.read_bytes() for path in (tmp_path / "results").rglob("*") if path.is_file()]
    assert len(written) > 3
    assert not any(PASSWORD.encode() in content for content in written)


def test_variable_that_is_not_set(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    asked: Any = study(tmp_path, monkeypatch)
    monkeypatch.delenv("KESTREL_RETURNS", raising=False)
    assert refused(asked) == (
        "data.returns, connection: the environment variable KESTREL_RETURNS is not set\n"
        "    → set it to how to connect to the database"
    )
