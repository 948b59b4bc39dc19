"""What the intake costs, against DuckDB reading, sorting and writing the same file in the same run. Prints; asserts no
time.

LINEPROOF_BENCH_ROWS sets the number of daily rows, 100 million by default.
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
import textwrap
import time
from pathlib import Path

import numpy as np
import pytest
from tests.bench.made_files import write_returns, write_series
from tests.pipeline.conftest import ROOT

N_DAYS = 7500
DAILY_ROWS = int(os.environ.get("LINEPROOF_BENCH_ROWS", "100000000"))
PEER = textwrap.dedent(
    """\
    import sys, duckdb
    raw, out, scratch = sys.argv[1:]
    duckdb.execute(f"SET memory_limit = '3GB'; SET temp_directory = '{scratch}'; SET threads = 2")
    source = f"read_parquet('{raw}')" if raw.endswith(".parquet") else (
        f"read_csv('{raw}', header=true, store_rejects=true, columns={{'security': 'VARCHAR', 'date': 'DATE',"
        "'return': 'DOUBLE', 'size': 'DOUBLE'}, ignore_errors=true)")
    rows = f"SELECT * FROM {source} ORDER BY security, date"
    duckdb.execute(f"COPY ({rows}) TO '{out}' (FORMAT parquet, COMPRESSION zstd)")
    """
)
OURS = textwrap.dedent(
    """\
    import sys
    from pathlib import Path
    from lineproof import store
    from lineproof.study import load_study
    from lineproof.validation import validate_returns
    from lineproof.wiring import Wiring
    study, out = sys.argv[1:]
    wiring = Wiring(load_study(study))
    options = wiring.options("validate_returns")
    with store.Scratch(out) as scratch:
        found = validate_returns(wiring.raw_files, scratch, **options)
        store.write_together(found.tables(), {"panel": f"{out}/panel.parquet"}, options["frequency"])
        for name, market in found.markets().items():
            store.write_table(market, f"{out}/{name}.parquet", name, options["frequency"])
        store.write_together(found.set_aside(), {"set_aside": f"{out}/set_aside.parquet"})
        store.write_json(found.counts(), f"{out}/intake.json")
    """
)
STUDY = """\
study: {{name: bench, title: Bench, frequency: {frequency}}}
data:
  returns:
    file: {raw}
    columns: {{security: security, date: date, return: return, size: size}}
    dates: "%Y-%m-%d"
  market: {{file: market.csv, columns: {{date: date, return: market}}, dates: "%Y-%m-%d"}}
  riskless: {{file: riskless.csv, columns: {{date: date, rate: riskless}}, dates: "%Y-%m-%d"}}
intake: {{screens: [{{column: size, at_least: 10}}], allow_partial_last_month: yes}}
betas: {{b: {{window: 60, min: 24}}}}
portfolios: {{ten: {{rank_on: b}}}}
subperiods: {{full: {{}}}}
"""


def measured(code: str, *arguments: str) -> tuple[float, float, float]:
    """Wall seconds, CPU seconds and peak memory in GiB of a Python program."""
    timed = textwrap.dedent(
        f"""\
        import resource, sys
        exec(compile({code!r}, "timed", "exec"))
        used = resource.getrusage(resource.RUSAGE_SELF)
        print(used.ru_utime + used.ru_stime, used.ru_maxrss / 2**20)
        """
    )
    environ = {**os.environ, "PYTHONPATH": str(ROOT / "workflow")}
    began = time.perf_counter()
    done = subprocess.run(
        [sys.executable, "-c", timed, *arguments],
        env=environ,
        cwd=ROOT,
        capture_output=True,
        text=True,
        check=False,
    )
    taken = time.perf_counter() - began
    assert done.returncode == 0, done.stderr
    cpu, memory = done.stdout.split()[-2:]
    return taken, float(cpu), float(memory)


def compare(folder: Path, raw: str, n_securities: int, dates: np.ndarray, frequency: str) -> None:
    """Print what the intake and DuckDB need for a file of that name."""
    rows = write_returns(folder / raw, n_securities, dates)
    write_series(folder / "market.csv", dates, "market", 0.005)
    write_series(folder / "riskless.csv", dates, "riskless", 0.0001)
    study = folder / "study.yaml"
    study.write_text(STUDY.format(raw=raw, frequency=frequency), encoding="utf-8")
    (folder / "out").mkdir(exist_ok=True)
    peer, peer_cpu, peer_memory = measured(
        PEER, str(folder / raw), str(folder / "peer.parquet"), str(folder / "scratch")
    )
    ours, cpu, memory = measured(OURS, str(study), str(folder / "out"))
    counts = json.loads((folder / "out" / "intake.json").read_text(encoding="utf-8"))
    assert counts["rows_read"] == rows == counts["rows_kept"] + counts["rows_set_aside"]
    size = (folder / raw).stat().st_size / 2**30
    print(
        f"\n{rows:,} {frequency} rows, {raw} of {size:.1f} GiB: {ours:.1f} s, {ours / peer:.2f} × "
        f"DuckDB ({peer:.1f} s), {cpu / peer_cpu:.2f} × its CPU time; "
        f"peak {memory:.2f} GiB, DuckDB {peer_memory:.2f} GiB"
    )


@pytest.mark.parametrize("raw", ["returns.csv", "returns.parquet"])
def test_monthly_rows(tmp_path: Path, raw: str) -> None:
    months = np.arange("1927-01", "2022-11", dtype="datetime64[M]")
    ends = (months + 1).astype("datetime64[D]") - 1
    compare(tmp_path, raw, 8200, ends, "monthly")


@pytest.mark.parametrize("raw", ["returns.csv", "returns.parquet"])
def test_daily_rows(tmp_path: Path, raw: str) -> None:
    days = np.arange("1990-01-01", "2030-01-01", dtype="datetime64[D]")
    days = days[np.is_busday(days)][:N_DAYS]
    alive = 0.57 * N_DAYS  # rows of a security, on average
    compare(tmp_path, raw, int(DAILY_ROWS / alive), days, "daily")
