"""Numbers about the sample, against a slow count on a random panel and by hand."""

from __future__ import annotations

from statistics import mean, stdev
from typing import Any

import numpy as np
import pandas as pd
import pytest

from lineproof.frames import ESTIMATES
from lineproof.sampling import describe_sample

INTAKE: dict[str, Any] = {
    "rows_read": 100,
    "rows_kept": 90,
    "rows_set_aside": 7,
    "exact_duplicates": 3,
    "rows_screened": 12,
    "faults": [{"number": 4, "n": 5}, {"number": 28, "n": 2}],
    "screens": [{"n_rows": 8, "n_securities": 3}, {"n_rows": 4, "n_securities": 2}],
}


def panel_of(alive: dict[str, list[str]], seed: int = 0) -> pd.DataFrame:
    rows = [(security, month) for security, months in alive.items() for month in months]
    frame = pd.DataFrame(rows, columns=["security", "month"])
    date = pd.PeriodIndex(frame.pop("month"), freq="M").to_timestamp(how="end").normalize()
    returns = np.random.default_rng(seed).normal(0.01, 0.1, len(frame))
    return frame.assign(date=date.as_unit("ms"), total_return=returns)


def span(first: str, last: str) -> list[str]:
    return [str(month) for month in pd.period_range(first, last, freq="M")]


def subperiod(name: str, first: str, last: str) -> dict[str, Any]:
    return {"name": name, "first": first, "last": last, "n_periods": len(span(first, last))}


def numbers(frame: pd.DataFrame, name: str) -> dict[str, float]:
    rows = frame[(frame["subperiod"] == name) & (frame["variant"] == "panel")]
    return dict(zip(rows["term"], rows["estimate"], strict=True))


def count_slowly(panel: pd.DataFrame, sub: dict[str, Any]) -> dict[str, float]:
    """The same numbers from plain lists and dictionaries, month by month."""
    rows = [
        (s, d.strftime("%Y-%m"), r)
        for s, d, r in zip(panel["security"], panel["date"], panel["total_return"], strict=True)
    ]
    months = span(sub["first"], sub["last"])
    inside = [row for row in rows if row[1] in months]
    alive = [sum(row[1] == month for row in inside) for month in months]
    averages = []
    for month in months:
        known = [r for _, m, r in inside if m == month and r == r]
        if known:
            averages.append(mean(known))
    histories = {s: sorted(m for name, m, _ in rows if name == s) for s, _, _ in rows}
    begin, end = min(m for _, m, _ in rows), max(m for _, m, _ in rows)
    return {
        "n_periods": len(months),
        "n_securities": len({s for s, _, _ in inside}),
        "n_security_periods": len(inside),
        "mean_alive": mean(alive),
        "min_alive": min(alive),
        "max_alive": max(alive),
        "n_entries": sum(h[0] in months and h[0] != begin for h in histories.values()),
        "n_exits": sum(h[-1] in months and h[-1] != end for h in histories.values()),
        "mean_return": mean(averages),
        "sd_return": stdev(averages),
    }


@pytest.mark.parametrize("seed", range(4))
def test_counts_equal_a_slow_count(seed: int) -> None:
    rng = np.random.default_rng(seed)
    all_months = span("1990-01", "1993-12")
    alive: dict[str, list[str]] = {}
    for k in range(25):
        first, last = np.sort(rng.integers(0, len(all_months), 2))
        history = all_months[first : last + 1]
        alive[f"S{k:02d}"] = [m for m in history if rng.random() > 0.1] or history[:1]
    panel = panel_of(alive, seed)
    panel.loc[rng.random(len(panel)) < 0.1, "total_return"] = np.nan
    subs = [
        subperiod("full", "1990-01", "1993-12"),
        subperiod("mid", "1991-03", "1992-02"),
        subperiod("last", "1993-01", "1993-12"),
    ]
    table = describe_sample(panel, None, subs, INTAKE)
    ESTIMATES.validate(table)
    for sub in subs:
        found, want = numbers(table, sub["name"]), count_slowly(panel, sub)
        assert list(found) == list(want)
        # Counts are exact; the means are of 48 months at most, with the rounding of other sums.
        assert found == pytest.approx(want, rel=1e-12, abs=1e-15)


def test_entries_and_exits_by_hand() -> None:
    """The panel runs from 2000-01 to 2000-12, and the subperiod from April to September."""
    alive = {
        "always": span("2000-01", "2000-12"),
        "enters at the start": span("2000-04", "2000-12"),
        "leaves at the end": span("2000-01", "2000-09"),
        "inside": span("2000-05", "2000-06"),
        "has a hole": span("2000-01", "2000-04") + span("2000-08", "2000-12"),
        "before": span("2000-02", "2000-03"),
        "after": span("2000-10", "2000-11"),
    }
    subs = [subperiod("mid", "2000-04", "2000-09"), subperiod("all", "2000-01", "2000-12")]
    table = describe_sample(panel_of(alive), None, subs, INTAKE)
    mid, whole = numbers(table, "mid"), numbers(table, "all")
    assert (mid["n_entries"], mid["n_exits"]) == (2, 2)
    # Neither those there when the panel begins nor those still there when it ends.
    assert (whole["n_entries"], whole["n_exits"]) == (4, 4)
    assert mid["n_securities"] == 5
    assert (mid["min_alive"], mid["max_alive"]) == (3, 4)


def test_a_month_without_any_security_is_a_month_with_none() -> None:
    panel = panel_of({"A": [*span("2000-01", "2000-03"), *span("2000-06", "2000-08")]})
    sub = subperiod("all", "2000-01", "2000-08")
    found = numbers(describe_sample(panel, None, [sub], INTAKE), "all")
    assert (found["min_alive"], found["max_alive"], found["mean_alive"]) == (0, 1, 6 / 8)


def test_a_spread_of_one_month_is_undefined() -> None:
    panel = panel_of({"A": span("2000-01", "2000-12")})
    table = describe_sample(panel, None, [subperiod("one", "2000-05", "2000-05")], INTAKE)
    row = table[(table["term"] == "sd_return")].iloc[0]
    assert row["status"] == "undefined"
    assert row["reason"]
    assert np.isnan(row["estimate"])
    assert (table.loc[table["term"] != "sd_return", "status"] == "ok").all()


def test_securities_and_betas_of_each_month() -> None:
    panel = panel_of({"A": span("2000-01", "2000-03"), "B": ["2000-02", "2000-05"]})
    estimated = panel.loc[[1, 2, 3], ["security", "date"]]
    table = describe_sample(panel, estimated, [], INTAKE)
    rows = table[table["variant"] == "month"]
    got = {(a, t): e for a, t, e in zip(rows["asset"], rows["term"], rows["estimate"], strict=True)}
    assert got == {
        ("2000-01", "n_securities"): 1,
        ("2000-01", "n_with_beta"): 0,
        ("2000-02", "n_securities"): 2,
        ("2000-02", "n_with_beta"): 2,
        ("2000-03", "n_securities"): 1,
        ("2000-03", "n_with_beta"): 1,
        ("2000-05", "n_securities"): 1,
        ("2000-05", "n_with_beta"): 0,
    }
    none = describe_sample(panel, None, [], INTAKE)
    assert not none.loc[none["term"] == "n_with_beta", "estimate"].any()


def test_what_came_in() -> None:
    table = describe_sample(panel_of({"A": span("2000-01", "2000-02")}), None, [], INTAKE)
    rows = table[table["analysis"] == "intake"]
    addresses = zip(rows["variant"], rows["asset"], rows["term"], strict=True)
    got = dict(zip(addresses, rows["estimate"], strict=True))
    assert got == {
        ("rows", "all", "rows_read"): 100,
        ("rows", "all", "rows_kept"): 90,
        ("rows", "all", "rows_set_aside"): 7,
        ("rows", "all", "exact_duplicates"): 3,
        ("rows", "all", "rows_screened"): 12,
        ("fault", "fault-04", "n_rows"): 5,
        ("fault", "fault-28", "n_rows"): 2,
        ("screen", "screen-1", "n_rows"): 8,
        ("screen", "screen-1", "n_securities"): 3,
        ("screen", "screen-2", "n_rows"): 4,
        ("screen", "screen-2", "n_securities"): 2,
    }


def test_a_study_without_total_returns_says_why_it_has_no_mean() -> None:
    panel = panel_of({"a": span("2000-01", "2000-06"), "b": span("2000-01", "2000-06")})
    found = describe_sample(
        panel.assign(total_return=np.nan), None, [subperiod("all", "2000-01", "2000-06")], INTAKE
    )
    ESTIMATES.validate(found)
    undefined = found[found["status"] == "undefined"]
    assert undefined["term"].tolist() == ["mean_return", "sd_return"]
    assert set(undefined["reason"]) == {
        "the returns are in excess of a riskless rate that is not known"
    }
